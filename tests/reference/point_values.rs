//! Sums of squares, F, p, components, sds and shares of every complete data set: at least 11 digits.

use restudy_engine::{Settings, Spread, Study};
use serde_json::Value;

use crate::check::Check;
use crate::data::{Fixture, PART_APPRAISER, PART_ONLY, fixture, name_of_line, pooling, settings};

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
    compare_table(&mut check, &study, &fixture.expected[table]);
    compare_estimates(&mut check, &study, &fixture.expected[block]["estimates"]);
    check.finish(20);
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
            expected["df"].as_u64().unwrap(),
        );
        check.digits(&format!("{name} ms"), line.ms, &expected["ms"]);
        check.digits(&format!("{name} f"), line.f, &expected["f"]);
        check.digits(&format!("{name} p"), line.p, &expected["p"]);
        if let Some(df) = expected.get("denominator_df") {
            check.digits(&format!("{name} against_df"), line.against_df, df);
        }
        let against = line.against.clone().unwrap_or_default();
        match &expected["denominator"] {
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
                        weight.as_str(),
                    );
                }
            }
            _ => {}
        }
    }
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
        } else {
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
    check.same(
        "whole ndc",
        study.ndc.whole,
        expected["ndc"]["handbook_1_41_floor"].as_u64(),
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
            fixture.expected["pooling"][key].as_bool().unwrap(),
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
fn published_example_of_10_parts_3_appraisers_3_trials() {
    kept_and_pooled(&fixture!("a_aiag_10x3x3"));
}

#[test]
fn the_same_example_with_an_upper_limit_only() {
    kept_and_pooled(&fixture!("a_aiag_10x3x3", "a_aiag_10x3x3_one_sided"));
}

#[test]
fn published_example_of_20_parts_3_appraisers_2_trials() {
    kept_and_pooled(&fixture!("b_mr_20x3x2"));
}

#[test]
fn handbook_example_of_5_machines_2_operators_5_pins() {
    kept_and_pooled(&fixture!("c_nist_crossed_5x2x5"));
}

#[test]
fn published_example_with_wider_repeats() {
    kept_and_pooled(&fixture!("g_aiag_within_times_1_5"));
}

#[test]
fn two_appraisers() {
    kept_and_pooled(&fixture!("edge_two_appraisers"));
}

#[test]
fn handbook_example_with_operators_nested_in_machines() {
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
fn parts_nested_in_appraisers() {
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
fn three_crossed_factors() {
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
fn one_trial_leaves_the_interaction_in_the_error() {
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
fn certified_data_sets_of_one_factor() {
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
