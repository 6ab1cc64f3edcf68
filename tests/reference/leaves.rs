//! Nothing in the fixtures is left out silently: every value is compared, or stands below with the reason why not.

use std::collections::BTreeSet;

use serde_json::Value;

use crate::check::was_compared;
use crate::data::all_read;
use crate::{
    comparison, consistency, degenerate, design_rules, generalized, ladder, limits, offsets,
    point_values, published, quantiles, reml, risk,
};

/// Files and paths (`*` for any run of characters) that no test compares, and why.
const LISTED: &[(&str, &str, &str)] = &[
    ("*", "/name", "a label"),
    ("*", "/units", "a label"),
    ("*", "/columns", "a label"),
    ("*", "/method", "a sentence"),
    ("*", "/data", "the name of the readings"),
    ("*", "/design/kind", "a label"),
    ("*", "/design/part_term", "a label"),
    (
        "*",
        "/removed/*",
        "which readings the table of readings lacks",
    ),
    ("d_strd_*", "/tolerance", "there is none"),
    ("e_*", "/tolerance/origin", "a sentence"),
    (
        "*",
        "/consistency/parts/*",
        "labels; the engine knows levels by their number",
    ),
    ("*", "/consistency/appraisers/*", "labels"),
    ("*", "/consistency/cochran/cell/*", "labels"),
    ("*", "/consistency/range_chart/above/*/part", "labels"),
    ("*", "/consistency/range_chart/above/*/appraiser", "labels"),
    (
        "*",
        "/consistency/repeatability_by_appraiser/*/appraiser",
        "labels",
    ),
    (
        "*",
        "*/intervals/*/mls/*/raw_lower",
        "a step on the way to `lower`",
    ),
    (
        "*",
        "*/intervals/*/mls/*/raw_upper",
        "a step on the way to `upper`",
    ),
    (
        "*",
        "*/intervals/*/mls/*/v_lower",
        "a step on the way to `lower`",
    ),
    (
        "*",
        "*/intervals/*/mls/*/v_upper",
        "a step on the way to `upper`",
    ),
    (
        "*",
        "*/intervals/*/mls_without_star_terms/*",
        "a method that the engine does not offer",
    ),
    (
        "*",
        "*/intervals/*/closed_form/*",
        "a method that the engine does not offer: the root serves every design",
    ),
    (
        "d_strd_*",
        "/model/intervals/*/mls_root/*",
        "one factor has exact limits, which are compared",
    ),
    (
        "*",
        "*/intervals/*/satterthwaite/*/nu",
        "a step on the way to the limits",
    ),
    (
        "*",
        "*/intervals/*/satterthwaite/*",
        "the engine offers the method for figures, not for single components",
    ),
    (
        "a_aiag_10x3x3_one_sided",
        "*/mls/gauge_share_of_tolerance/*",
        "takes the mean as known; the engine's limits hold its uncertainty and stand in `simulated`",
    ),
    (
        "e_*",
        "/reml_without_interaction/mean",
        "the fit of fewer terms hands over no mean; the study's is compared",
    ),
    (
        "edge_equal_trials",
        "/with_interaction/intervals/*/mls/repeatability/*",
        "without spread of repeats the engine states no limits of it",
    ),
    (
        "edge_equal_trials",
        "/pooled/*",
        "without spread of repeats there is no p to pool by; the gauge sd is compared as the other reading",
    ),
    ("edge_equal_trials", "/anova_pooled/*", "as above"),
    ("edge_equal_trials", "/pooling/pool_at_*", "as above"),
    (
        "edge_equal_trials",
        "/anova_error_denominator",
        "not defined",
    ),
    (
        "*",
        "*/simulated/gci/*",
        "a method that the engine does not offer, for it covers too little; single variances are compared under it",
    ),
    (
        "*",
        "*/simulated/*/median",
        "the engine draws for limits alone",
    ),
    ("*", "*/simulated/draws", "what the reference drew"),
    ("*", "*/simulated/seed", "what the reference drew"),
    (
        "*",
        "*/simulated/gci_linear/ndc_floor/*",
        "the whole part of `ndc_untruncated`",
    ),
    (
        "*",
        "*/simulated/gci_linear/share_of_tolerance_6.*",
        "single components: the engine's limits are closed forms; figures are compared",
    ),
    (
        "*",
        "*/simulated/gci_linear/share_of_total_variance.*",
        "the engine's limits are closed forms; part and gauge are compared",
    ),
    (
        "f_three_factor_8x3x2x2",
        "/model/simulated/gci_linear/misclassification.*",
        "draws cover too little with three crossed factors: the engine gives no limits there",
    ),
    (
        "g_aiag_within_times_1_5",
        "*/gauge_sd_study2_over_study1/gci/*",
        "a method that the engine does not offer",
    ),
    (
        "g_aiag_within_times_1_5",
        "*/gauge_sd_study2_over_study1/*/median",
        "the engine draws for limits alone",
    ),
    (
        "g_aiag_within_times_1_5",
        "*/gauge_sd_study2_over_study1/draws",
        "what the reference drew",
    ),
    (
        "g_aiag_within_times_1_5",
        "*/gauge_sd_study2_over_study1/seed",
        "what the reference drew",
    ),
    (
        "constants",
        "/range/*/c4",
        "a constant that the engine does not use",
    ),
    ("lme4_values", "*/tool", "a label"),
    (
        "*",
        "*/last_relative_newton_step",
        "how the reference ended",
    ),
];

/// Compared by the bench, which simulates for minutes.
const IN_THE_BENCH: &str = "coverage";

/// Every test that asks for values.
const TESTS: &[fn()] = &[
    comparison::repeatability_over_repeatability,
    comparison::gauge_over_gauge,
    comparison::a_written_record_compares_as_the_study_does,
    comparison::what_cannot_be_compared_says_why,
    comparison::a_baseline_starts_anew,
    consistency::statistics_of_published_studies,
    consistency::statistics_of_thin_studies,
    consistency::critical_values,
    consistency::tables_of_the_standard,
    consistency::range_of_two_readings,
    degenerate::identical_repeats_have_no_repeatability_of_their_own,
    degenerate::equal_readings_have_no_shares,
    design_rules::eleven_designs_have_the_reference_rules,
    design_rules::larger_studies_have_the_reference_rules,
    generalized::variances_and_their_ratio,
    generalized::risks_of_two_crossed_factors,
    generalized::risks_of_other_designs,
    generalized::shares_of_the_distance_from_the_study_mean,
    generalized::satterthwaite,
    ladder::every_rung_of_three_studies,
    ladder::what_is_left_of_a_pooled_study,
    limits::two_crossed_factors_with_the_interaction_kept_and_pooled,
    limits::shares_of_the_total,
    limits::one_trial,
    limits::identical_repeats,
    limits::nested_and_three_factor_designs,
    limits::one_factor,
    offsets::published_examples_shifted_and_scaled,
    offsets::certified_data_sets_of_every_difficulty,
    offsets::certified_values_as_far_as_the_readings_allow,
    point_values::published_example_of_10_parts_3_appraisers_3_trials,
    point_values::the_same_example_with_an_upper_limit_only,
    point_values::published_example_of_20_parts_3_appraisers_2_trials,
    point_values::handbook_example_of_5_machines_2_operators_5_pins,
    point_values::published_example_with_wider_repeats,
    point_values::identical_repeats,
    point_values::two_appraisers,
    point_values::handbook_example_with_operators_nested_in_machines,
    point_values::parts_nested_in_appraisers,
    point_values::three_crossed_factors,
    point_values::one_trial_leaves_the_interaction_in_the_error,
    point_values::certified_data_sets_of_one_factor,
    published::printed_figures,
    quantiles::chi_square_quantiles_have_twelve_digits,
    quantiles::f_quantiles_have_twelve_digits,
    quantiles::quantiles_at_the_ends_of_the_range_have_twelve_digits,
    quantiles::tails_agree_with_another_library_where_that_is_accurate,
    reml::components_likelihood_slopes_and_covariances,
    reml::lme4_finds_the_same_maximum,
    reml::likelihood_ratio_of_the_interaction,
    reml::the_gauge_variance_has_its_approximate_limits,
    risk::points_from_easy_to_far_out,
    risk::guard_bands,
    risk::every_data_set_with_a_tolerance,
];

#[test]
fn every_value_is_compared_or_listed() {
    for test in TESTS {
        test();
    }
    let mut left_out = Vec::new();
    let mut used = BTreeSet::new();
    let mut compared = 0;
    let files = all_read();
    for (file, values) in &files {
        walk(values, String::new(), &mut |path, leaf| {
            if was_compared(leaf) {
                compared += 1;
                return;
            }
            let listed = |(f, p, _): &(&str, &str, &str)| matches(f, file) && matches(p, path);
            match LISTED.iter().position(listed) {
                Some(place) => drop(used.insert(place)),
                None => left_out.push(format!("{file}{path}")),
            }
        });
    }
    assert!(
        left_out.is_empty(),
        "neither compared nor listed:\n{}",
        left_out.join("\n")
    );
    let idle: Vec<&str> = (LISTED.iter().enumerate())
        .filter(|(place, _)| !used.contains(place))
        .map(|(_, (_, path, _))| *path)
        .collect();
    assert!(idle.is_empty(), "listed for nothing: {idle:?}");
    assert!(compared > 12_900, "only {compared} values were compared");
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/../fixtures/reference");
    for entry in fs_err::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        let name = path.file_stem().unwrap().to_str().unwrap();
        let known = files.contains_key(name) || name == IN_THE_BENCH;
        let values = path.extension().is_some_and(|e| e == "json");
        assert!(known || !values, "{name} is read by no test");
    }
}

fn walk(value: &Value, path: String, leaf: &mut impl FnMut(&str, &Value)) {
    match value {
        Value::Object(fields) => fields
            .iter()
            .for_each(|(key, inner)| walk(inner, format!("{path}/{key}"), leaf)),
        Value::Array(items) => items
            .iter()
            .enumerate()
            .for_each(|(i, inner)| walk(inner, format!("{path}/{i}"), leaf)),
        _ => leaf(&path, value),
    }
}

/// Whether a text is a pattern's, whose `*` stands for any run of characters.
fn matches(pattern: &str, text: &str) -> bool {
    match pattern.split_once('*') {
        None => pattern == text,
        Some((start, rest)) => text.strip_prefix(start).is_some_and(|text| {
            (0..=text.len())
                .filter(|&i| text.is_char_boundary(i))
                .any(|i| matches(rest, &text[i..]))
        }),
    }
}
