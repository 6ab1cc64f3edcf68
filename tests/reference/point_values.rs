//! Sums of squares, F, p, components, sds and shares of every complete data set: at least 11 digits.

use restudy_engine::Settings;

use crate::check::{Check, compared};
use crate::data::{Fixture, PART_APPRAISER, PART_ONLY, fixture, pooling, rational, settings};
use crate::study_values::{
    compare_design, compare_estimates, compare_mean_squares, compare_table, compare_to_repeats,
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
