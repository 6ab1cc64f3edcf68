//! Closed-form limits of every complete data set at 90 % and 95 %: at least 9 digits.

use std::sync::Once;

use restudy_engine::{Figure, Interval, Settings, Study};
use serde_json::Value;

use crate::check::Check;
use crate::data::{
    Fixture, PART_APPRAISER, PART_ONLY, fixture, name_of_line, pooling, settings, values,
};

const DIGITS: f64 = 9.0;

/// Interaction kept or pooled.
type Choice = fn(Settings) -> Settings;

fn compare(fixture: &Fixture, factors: &[(&str, &[&str])], interaction: Choice, block: &str) {
    for (confidence, level) in [(0.90, "0.90"), (0.95, "0.95")] {
        for spread_sds in [6.0, 5.15] {
            let study = fixture.study(factors, &interaction(settings(confidence, spread_sds)));
            let mut check = Check::new(&format!("{} {block} at {level}", fixture.name), DIGITS);
            compare_level(
                &mut check,
                &study,
                &fixture.expected[block]["intervals"][level],
            );
            check.finish(12);
        }
    }
    // A one-sided limit at 95 % is the lower end of the two-sided limits at 90 %.
    let study = fixture.study(factors, &interaction(settings(0.95, 6.0)));
    let mut check = Check::new(&format!("{} {block} at least", fixture.name), DIGITS);
    compare_at_least(
        &mut check,
        &study,
        &fixture.expected[block]["intervals"]["0.90"],
    );
    check.finish(4);
}

fn compare_level(check: &mut Check, study: &Study, expected: &Value) {
    let exact = &expected["exact_chi2"]["repeatability"];
    both(
        check,
        "repeatability",
        &study.figures.repeatability.variance,
        exact,
    );
    for (reference, limits) in expected["mls"].as_object().unwrap() {
        if reference == "gauge_share_of_tolerance" && study.tolerance_rule != "two-sided" {
            // The reference takes the mean as known; the limits with its uncertainty stand in `generalized`.
            continue;
        }
        if reference == "gauge_share_of_tolerance" {
            let limits = &limits[study.spread_sds.to_string()];
            both(
                check,
                "gauge share of tolerance",
                &study.figures.gauge.share_of_tolerance,
                limits,
            );
            continue;
        }
        if reference == "repeatability" {
            if exact.is_object() {
                let repeatability = &study.figures.repeatability.variance;
                both(check, "repeatability by mls", repeatability, limits);
            }
            check.same(
                "repeatability method",
                study.figures.repeatability.variance.interval,
                exact.as_object().map(|_| Interval::Exact),
            );
            continue;
        }
        let variance = variance(study, reference);
        both(check, reference, variance, limits);
    }
    let (ratio, method) = ratio(expected);
    check.same(
        "part to gauge method",
        study.part_to_gauge.interval,
        Some(method),
    );
    both(check, "part to gauge", &study.part_to_gauge, ratio);
    both(
        check,
        "gauge share of total",
        &study.figures.gauge.share_of_tv,
        &ratio["gauge_share_of_study_variation"],
    );
    check.digits(
        "ndc lower",
        study.ndc.lower,
        &ratio["ndc_untruncated"]["lower"],
    );
    check.digits(
        "ndc upper",
        study.ndc.upper,
        &ratio["ndc_untruncated"]["upper"],
    );
    for (end, found) in [("lower", study.ndc.lower), ("upper", study.ndc.upper)] {
        let floor = found.map(f64::floor);
        check.digits(&format!("whole ndc {end}"), floor, &ratio["ndc_floor"][end]);
    }
    let gauge = &ratio["gauge_share_of_total_variance"];
    let squared = (study.figures.gauge.share_of_tv).rising_for_test(|share| share * share);
    both(check, "gauge share of total variance", &squared, gauge);
    let part = &ratio["part_share_of_total_variance"];
    let squared = study
        .figures
        .part
        .share_of_tv
        .rising_for_test(|share| share * share);
    both(check, "part share of total variance", &squared, part);
}

fn compare_at_least(check: &mut Check, study: &Study, expected: &Value) {
    let figures = &study.figures;
    check.digits(
        "repeatability",
        figures.repeatability.variance.at_least,
        &expected["exact_chi2"]["repeatability"]["lower"],
    );
    for reference in ["reproducibility", "gauge", "part", "total"] {
        if let Some(limits) = expected["mls"].get(reference) {
            check.digits(
                reference,
                variance(study, reference).at_least,
                &limits["lower"],
            );
        }
    }
    let (ratio, _) = ratio(expected);
    check.digits(
        "part to gauge",
        study.part_to_gauge.at_least,
        &ratio["lower"],
    );
    let share = &ratio["gauge_share_of_study_variation"]["lower"];
    check.digits(
        "gauge share of total",
        figures.gauge.share_of_tv.at_least,
        share,
    );
}

fn ratio(expected: &Value) -> (&Value, Interval) {
    let ratio = &expected["part_to_gauge_variance_ratio"];
    match ratio.get("exact_f") {
        Some(exact) => (exact, Interval::Exact),
        None => (&ratio["mls_root"], Interval::MlsRoot),
    }
}

fn both(check: &mut Check, name: &str, figure: &Figure, expected: &Value) {
    check.digits(&format!("{name} lower"), figure.lower, &expected["lower"]);
    check.digits(&format!("{name} upper"), figure.upper, &expected["upper"]);
    check.same(
        &format!("{name} open"),
        figure.open.is_some(),
        figure.lower.is_some() && expected["upper"].is_null(),
    );
}

fn variance<'a>(study: &'a Study, reference: &str) -> &'a Figure {
    let figures = &study.figures;
    match reference {
        "reproducibility" => &figures.reproducibility.variance,
        "gauge" => &figures.gauge.variance,
        "part" => &figures.part.variance,
        "total" => &figures.total.variance,
        _ => {
            &study
                .components
                .iter()
                .find(|c| c.name == name_of_line(reference))
                .unwrap()
                .variance
        }
    }
}

/// A figure under an increasing function.
trait Rising {
    fn rising_for_test(&self, f: impl Fn(f64) -> f64) -> Figure;
}

impl Rising for Figure {
    fn rising_for_test(&self, f: impl Fn(f64) -> f64) -> Figure {
        Figure {
            estimate: self.estimate.map(&f),
            lower: self.lower.map(&f),
            upper: self.upper.map(&f),
            ..self.clone()
        }
    }
}

#[test]
pub(crate) fn two_crossed_factors_with_the_interaction_kept_and_pooled() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let fixtures = [
            fixture!("a_aiag_10x3x3"),
            fixture!("a_aiag_10x3x3", "a_aiag_10x3x3_one_sided"),
            fixture!("b_mr_20x3x2"),
            fixture!("c_nist_crossed_5x2x5"),
            fixture!("g_aiag_within_times_1_5"),
            fixture!("edge_two_appraisers"),
        ];
        for fixture in fixtures {
            compare(&fixture, PART_APPRAISER, |s| s, "with_interaction");
            compare(&fixture, PART_APPRAISER, pooling, "pooled");
        }
    });
}

/// The shares of repeatability and reproducibility in the total: limits of a variance over all the others.
#[test]
pub(crate) fn shares_of_the_total() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let table = values!("shares_of_total");
        let fixtures = [
            fixture!("a_aiag_10x3x3"),
            fixture!("b_mr_20x3x2"),
            fixture!("c_nist_crossed_5x2x5"),
            fixture!("g_aiag_within_times_1_5"),
            fixture!("edge_two_appraisers"),
        ];
        let choices: [(&str, Choice); 2] = [("with_interaction", |s| s), ("pooled", pooling)];
        for fixture in fixtures {
            let mut check = Check::new(fixture.name, DIGITS);
            for (block, interaction) in choices {
                for (confidence, level) in [(0.90, "0.90"), (0.95, "0.95")] {
                    let study =
                        fixture.study(PART_APPRAISER, &interaction(settings(confidence, 6.0)));
                    let expected = &table["studies"][fixture.name][block];
                    for (name, spread) in [
                        ("repeatability", &study.figures.repeatability),
                        ("reproducibility", &study.figures.reproducibility),
                    ] {
                        both(
                            &mut check,
                            name,
                            &spread.share_of_tv,
                            &expected[name][level],
                        );
                    }
                }
            }
            check.finish(24);
        }
    });
}

#[test]
pub(crate) fn one_trial() {
    compare(
        &fixture!("edge_one_trial"),
        PART_APPRAISER,
        |s| s,
        "additive",
    );
}

#[test]
pub(crate) fn identical_repeats() {
    compare(
        &fixture!("edge_equal_trials"),
        PART_APPRAISER,
        |s| s,
        "with_interaction",
    );
}

#[test]
pub(crate) fn nested_and_three_factor_designs() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        compare(
            &fixture!("c_nist_nested_5x2x5"),
            &[("part", &[]), ("appraiser", &["part"])],
            |s| s,
            "model",
        );
        compare(
            &fixture!("f_nested_3x8x3"),
            &[("appraiser", &[]), ("part", &["appraiser"])],
            |s| s,
            "model",
        );
        compare(
            &fixture!("f_three_factor_8x3x2x2"),
            &[("part", &[]), ("appraiser", &[]), ("fixture", &[])],
            |s| s,
            "model",
        );
    });
}

#[test]
pub(crate) fn one_factor() {
    for fixture in [
        fixture!("d_strd_AtmWtAg"),
        fixture!("d_strd_SiRstv"),
        fixture!("d_strd_SmLs01"),
    ] {
        compare(&fixture, PART_ONLY, |s| s, "model");
        compare(&fixture, PART_APPRAISER, |s| s, "model");
    }
}
