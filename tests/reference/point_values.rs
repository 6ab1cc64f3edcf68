//! Sums of squares, F, p, components, sds and shares of every complete data set: at least 11 digits.

use restudy_engine::quantile::f_above;
use restudy_engine::{MeanSquare, Settings, Spread, Study, WITHIN_CELLS};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{
    Fixture, PART_APPRAISER, PART_ONLY, fixture, name_of_line, pooling, rational, settings,
};

const DIGITS: f64 = 11.0;

/// Compares a study with one table of mean squares and one block of estimates.
fn compare(
    fixture: &Fixture,
    factors: &[(&str, &[&str])],
    settings: &Settings,
    table: &str,
    block: &str,
) {
    compare_to(DIGITS, fixture, factors, settings, table, block);
}

fn compare_to(
    digits: f64,
    fixture: &Fixture,
    factors: &[(&str, &[&str])],
    settings: &Settings,
    table: &str,
    block: &str,
) {
    let study = fixture.study(factors, settings);
    let mut check = Check::new(
        &format!("{} {block} at {}", fixture.name, settings.spread_sds),
        digits,
    );
    check.digits(
        "grand mean",
        Some(study.grand_mean),
        &fixture.expected["grand_mean"],
    );
    let exact = rational(
        compared(&fixture.expected["grand_mean_exact"])
            .as_str()
            .unwrap(),
    );
    check.number("exact grand mean", Some(study.grand_mean), exact);
    compare_design(&mut check, &study, &fixture.expected["design"]);
    compare_table(&mut check, &study, &fixture.expected[table]);
    compare_mean_squares(&mut check, &study, &fixture.expected[block]["mean_squares"]);
    compare_estimates(&mut check, &study, &fixture.expected[block]["estimates"]);
    check.finish(20);
}

fn compare_design(check: &mut Check, study: &Study, expected: &Value) {
    check.digits(
        "trials",
        Some(study.design.trials as f64),
        &expected["trials"],
    );
    for factor in &study.design.factors {
        let plural = match &*factor.name {
            "part" => "parts",
            _ => "appraisers",
        };
        let levels = (expected.get(plural)).or_else(|| expected.get("levels")?.get(&factor.name));
        if let Some(levels) = levels {
            check.digits(&factor.name, Some(factor.levels as f64), levels);
        }
        if let Some(nested) = expected.get("nested_in").and_then(|n| n.get(&factor.name)) {
            let outer = compared(&nested[0]).as_str().unwrap();
            check.same(&factor.name, factor.within.clone(), vec![outer.to_owned()]);
        }
    }
}

fn compare_table(check: &mut Check, study: &Study, table: &Value) {
    let lines = table.as_object().unwrap();
    let terms = study.mean_squares.len() - usize::from(!lines.contains_key("total"));
    check.same("lines of the table", terms, lines.len());
    for (reference, expected) in lines {
        let name = name_of_line(reference);
        let line = study.mean_squares.iter().find(|l| l.name == name).unwrap();
        check.digits(&format!("{name} ss"), Some(line.ss), &expected["ss"]);
        check.same(
            &format!("{name} df"),
            line.df as u64,
            compared(&expected["df"]).as_u64().unwrap(),
        );
        let exact = rational(compared(&expected["ss_exact"]).as_str().unwrap());
        check.number(&format!("{name} exact ss"), Some(line.ss), exact);
        check.digits(&format!("{name} ms"), line.ms, &expected["ms"]);
        check.digits(&format!("{name} f"), line.f, &expected["f"]);
        check.digits(&format!("{name} p"), line.p, &expected["p"]);
        if let Some(df) = expected.get("denominator_df") {
            check.digits(&format!("{name} against_df"), line.against_df, df);
        }
        let against = line.against.clone().unwrap_or_default();
        match compared(&expected["denominator"]) {
            Value::String(only) => {
                check.same(
                    &format!("{name} against"),
                    against.iter().map(|a| (a.name.clone(), a.weight)).collect(),
                    vec![(name_of_line(only), 1.0)],
                );
            }
            Value::Object(several) => {
                check.same(&format!("{name} against"), against.len(), several.len());
                for (reference, weight) in several {
                    let found = against
                        .iter()
                        .find(|a| a.name == name_of_line(reference))
                        .map(|a| a.weight.to_string());
                    check.same(
                        &format!("{name} against {reference}"),
                        found.as_deref(),
                        compared(weight).as_str(),
                    );
                }
            }
            _ => {}
        }
    }
}

fn compare_mean_squares(check: &mut Check, study: &Study, expected: &Value) {
    for (reference, expected) in expected.as_object().unwrap() {
        let line = line(study, reference);
        check.digits(&format!("{reference} ms"), line.ms, &expected["ms"]);
        check.digits(
            &format!("{reference} df"),
            Some(line.df as f64),
            &expected["df"],
        );
    }
}

/// F and p of each line against the repeats alone, from the table's mean squares.
fn compare_to_repeats(check: &mut Check, study: &Study, expected: &Value) {
    let repeats = line(study, "error");
    for (reference, expected) in expected.as_object().unwrap() {
        let line = line(study, reference);
        let f = line.ms.unwrap() / repeats.ms.unwrap();
        let p = f_above(f, line.df as f64, repeats.df as f64);
        check.digits(
            &format!("{reference} f over repeats"),
            Some(f),
            &expected["f"],
        );
        check.digits(
            &format!("{reference} p over repeats"),
            Some(p),
            &expected["p"],
        );
    }
}

fn line<'a>(study: &'a Study, reference: &str) -> &'a MeanSquare {
    let name = name_of_line(reference);
    study.mean_squares.iter().find(|l| l.name == name).unwrap()
}

/// What follows from a variance, its sd and the total's.
fn compare_shares(
    check: &mut Check,
    study: &Study,
    reference: &str,
    sd: Option<f64>,
    expected: &Value,
) {
    let total = &study.figures.total;
    let of_total = sd.zip(total.sd.estimate).map(|(sd, total)| sd / total);
    let per_sd = total
        .share_of_tolerance
        .estimate
        .zip(total.sd.estimate)
        .map(|(s, sd)| s / sd);
    let of_tolerance = sd.zip(per_sd).map(|(sd, per_sd)| sd * per_sd);
    let shares = &expected["share_of_study_variation"][reference];
    check.digits(&format!("{reference} sd over total sd"), of_total, shares);
    let shares = &expected["share_of_total_variance"][reference];
    check.digits(
        &format!("{reference} over total"),
        of_total.map(|s| s * s),
        shares,
    );
    let shares = &expected["share_of_tolerance"][study.spread_sds.to_string()];
    check.digits(
        &format!("{reference} over tolerance"),
        of_tolerance,
        &shares[reference],
    );
}

fn compare_estimates(check: &mut Check, study: &Study, expected: &Value) {
    for (reference, variance) in expected["variance"].as_object().unwrap() {
        let sd = &expected["sd"][reference];
        if let Some(spread) = spread(study, reference) {
            check.digits(
                &format!("{reference} variance"),
                spread.variance.estimate,
                &variance["truncated"],
            );
            check.digits(&format!("{reference} sd"), spread.sd.estimate, sd);
            let shares = &expected["share_of_tolerance"][study.spread_sds.to_string()];
            check.digits(
                &format!("{reference} share of tolerance"),
                spread.share_of_tolerance.estimate,
                &shares[reference],
            );
            let shares = &expected["share_of_study_variation"];
            check.digits(
                &format!("{reference} share of total"),
                spread.share_of_tv.estimate,
                &shares[reference],
            );
        }
        let component = study
            .components
            .iter()
            .find(|c| c.name == name_of_component(study, reference));
        if let Some(component) = component {
            check.digits(
                &format!("{reference} raw component"),
                Some(component.raw),
                &variance["raw"],
            );
            check.digits(
                &format!("{reference} component"),
                component.variance.estimate,
                &variance["truncated"],
            );
            check.digits(
                &format!("{reference} component sd"),
                component.sd.estimate,
                sd,
            );
            compare_shares(check, study, reference, component.sd.estimate, expected);
        } else {
            let figure = &spread(study, reference).unwrap().sd;
            compare_shares(check, study, reference, figure.estimate, expected);
            let raw: f64 = (study.components.iter())
                .filter(|c| match &**reference {
                    "reproducibility" => c.of != ["part"] && c.name != WITHIN_CELLS,
                    "gauge" => c.of != ["part"],
                    _ => true,
                })
                .map(|c| c.raw)
                .sum();
            check.digits(&format!("{reference} raw"), Some(raw), &variance["raw"]);
            check.same(
                &format!("{reference} is a figure of its own"),
                matches!(&**reference, "reproducibility" | "gauge" | "total"),
                true,
            );
        }
    }
    check.digits(
        "part to gauge",
        study.part_to_gauge.estimate,
        &expected["part_to_gauge_variance_ratio"],
    );
    check.digits(
        "ndc",
        study.ndc.estimate,
        &expected["ndc"]["sqrt2_untruncated"],
    );
    let ndc = study.ndc.estimate;
    check.digits(
        "whole ndc by the root of 2",
        ndc.map(f64::floor),
        &expected["ndc"]["sqrt2_floor"],
    );
    let by_handbook = ndc.map(|ndc| ndc * 1.41 / std::f64::consts::SQRT_2);
    check.digits(
        "ndc by 1.41",
        by_handbook,
        &expected["ndc"]["handbook_1_41_untruncated"],
    );
    check.same(
        "whole ndc",
        study.ndc.whole,
        compared(&expected["ndc"]["handbook_1_41_floor"]).as_u64(),
    );
}

/// The reference calls the part's own line `part`, nested or not.
fn name_of_component(study: &Study, reference: &str) -> String {
    let own = |c: &&restudy_engine::Component| c.of == ["part"];
    match reference {
        "part" => study
            .components
            .iter()
            .find(own)
            .map(|c| c.name.to_string())
            .unwrap_or_default(),
        _ => name_of_line(reference),
    }
}

fn spread<'a>(study: &'a Study, reference: &str) -> Option<&'a Spread> {
    match reference {
        "repeatability" => Some(&study.figures.repeatability),
        "reproducibility" => Some(&study.figures.reproducibility),
        "gauge" => Some(&study.figures.gauge),
        "part" => Some(&study.figures.part),
        "total" => Some(&study.figures.total),
        _ => None,
    }
}

fn kept_and_pooled(fixture: &Fixture) {
    for spread_sds in [6.0, 5.15] {
        let settings = settings(0.95, spread_sds);
        compare(
            fixture,
            PART_APPRAISER,
            &settings,
            "anova",
            "with_interaction",
        );
        compare(
            fixture,
            PART_APPRAISER,
            &pooling(settings),
            "anova_pooled",
            "pooled",
        );
    }
    let study = fixture.study(PART_APPRAISER, &settings(0.95, 6.0));
    let mut check = Check::new(&format!("{} over repeats", fixture.name), DIGITS);
    compare_to_repeats(
        &mut check,
        &study,
        &fixture.expected["anova_error_denominator"],
    );
    check.finish(6);
    for (p, key) in [(0.25, "pool_at_0_25"), (0.05, "pool_at_0_05")] {
        let settings = Settings {
            interaction: restudy_engine::Interaction::PoolAbove(p),
            ..settings(0.95, 6.0)
        };
        let study = fixture.study(PART_APPRAISER, &settings);
        let mut check = Check::new(fixture.name, DIGITS);
        check.digits(
            "p of the interaction",
            study.interaction.p,
            &fixture.expected["pooling"]["p_interaction"],
        );
        check.same(
            key,
            !study.interaction.kept,
            compared(&fixture.expected["pooling"][key])
                .as_bool()
                .unwrap(),
        );
        let other = if study.interaction.kept {
            "pooled"
        } else {
            "with_interaction"
        };
        let other_reading = study.interaction.other_reading.unwrap();
        let expected = &fixture.expected[other]["estimates"];
        check.digits(
            "gauge sd of the other reading",
            other_reading.gauge_sd,
            &expected["sd"]["gauge"],
        );
        let share = &expected["share_of_tolerance"]["6"]["gauge"];
        check.digits(
            "share of the other reading",
            other_reading.share_of_tolerance,
            share,
        );
        check.finish(4);
    }
}

#[test]
pub(crate) fn published_example_of_10_parts_3_appraisers_3_trials() {
    kept_and_pooled(&fixture!("a_aiag_10x3x3"));
}

#[test]
pub(crate) fn the_same_example_with_an_upper_limit_only() {
    kept_and_pooled(&fixture!("a_aiag_10x3x3", "a_aiag_10x3x3_one_sided"));
}

#[test]
pub(crate) fn published_example_of_20_parts_3_appraisers_2_trials() {
    kept_and_pooled(&fixture!("b_mr_20x3x2"));
}

#[test]
pub(crate) fn handbook_example_of_5_machines_2_operators_5_pins() {
    kept_and_pooled(&fixture!("c_nist_crossed_5x2x5"));
}

#[test]
pub(crate) fn published_example_with_wider_repeats() {
    kept_and_pooled(&fixture!("g_aiag_within_times_1_5"));
}

#[test]
pub(crate) fn identical_repeats() {
    for spread_sds in [6.0, 5.15] {
        compare(
            &fixture!("edge_equal_trials"),
            PART_APPRAISER,
            &settings(0.95, spread_sds),
            "anova",
            "with_interaction",
        );
    }
}

#[test]
pub(crate) fn two_appraisers() {
    kept_and_pooled(&fixture!("edge_two_appraisers"));
}

#[test]
pub(crate) fn handbook_example_with_operators_nested_in_machines() {
    let fixture = fixture!("c_nist_nested_5x2x5");
    for spread_sds in [6.0, 5.15] {
        compare(
            &fixture,
            &[("part", &[]), ("appraiser", &["part"])],
            &settings(0.95, spread_sds),
            "anova",
            "model",
        );
    }
}

#[test]
pub(crate) fn parts_nested_in_appraisers() {
    let fixture = fixture!("f_nested_3x8x3");
    for spread_sds in [6.0, 5.15] {
        compare(
            &fixture,
            &[("appraiser", &[]), ("part", &["appraiser"])],
            &settings(0.95, spread_sds),
            "anova",
            "model",
        );
    }
}

#[test]
pub(crate) fn three_crossed_factors() {
    let fixture = fixture!("f_three_factor_8x3x2x2");
    for spread_sds in [6.0, 5.15] {
        compare(
            &fixture,
            &[("part", &[]), ("appraiser", &[]), ("fixture", &[])],
            &settings(0.95, spread_sds),
            "anova",
            "model",
        );
    }
}

#[test]
pub(crate) fn one_trial_leaves_the_interaction_in_the_error() {
    let fixture = fixture!("edge_one_trial");
    for spread_sds in [6.0, 5.15] {
        compare(
            &fixture,
            PART_APPRAISER,
            &settings(0.95, spread_sds),
            "anova",
            "additive",
        );
    }
}

#[test]
pub(crate) fn certified_data_sets_of_one_factor() {
    // AtmWtAg: rounding the printed readings to f64 moves the sums by 6e-11 and p by six times that.
    let fixtures = [
        (fixture!("d_strd_AtmWtAg"), 9.0),
        (fixture!("d_strd_SiRstv"), DIGITS),
        (fixture!("d_strd_SmLs01"), DIGITS),
    ];
    for (fixture, digits) in fixtures {
        compare_to(
            digits,
            &fixture,
            PART_ONLY,
            &settings(0.95, 6.0),
            "anova",
            "model",
        );
        // One appraiser is the same as none.
        compare_to(
            digits,
            &fixture,
            PART_APPRAISER,
            &settings(0.95, 6.0),
            "anova",
            "model",
        );
    }
}
