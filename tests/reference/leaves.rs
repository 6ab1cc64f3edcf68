//! Nothing in the fixtures is left out silently: every value is compared, or stands below with the reason why not.

use std::collections::BTreeSet;

use serde_json::Value;

use crate::check::was_compared;
use crate::data::all_read;
use crate::{
    comparison, consistency, degenerate, design_rules, generalized, ladder, limits, offsets,
    point_values, quantiles, reml, risk,
};

/// Files and paths (`*` for any run of characters) that no test compares, and why.
const LISTED: &[(&str, &str, &str)] = &[];

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
    point_values::two_appraisers,
    point_values::handbook_example_with_operators_nested_in_machines,
    point_values::parts_nested_in_appraisers,
    point_values::three_crossed_factors,
    point_values::one_trial_leaves_the_interaction_in_the_error,
    point_values::certified_data_sets_of_one_factor,
    quantiles::chi_square_quantiles_have_twelve_digits,
    quantiles::f_quantiles_have_twelve_digits,
    quantiles::quantiles_at_the_ends_of_the_range_have_twelve_digits,
    quantiles::tails_agree_with_another_library_where_that_is_accurate,
    reml::components_likelihood_slopes_and_covariances,
    reml::lme4_finds_the_same_maximum,
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
    let (mut compared, mut listed) = (0, 0);
    for (file, values) in all_read() {
        walk(values, String::new(), &mut |path, leaf| {
            if was_compared(leaf) {
                compared += 1;
                return;
            }
            match (LISTED.iter()).position(|(f, p, _)| matches(f, file) && matches(p, path)) {
                Some(place) => {
                    listed += 1;
                    used.insert(place);
                }
                None => left_out.push(format!("{file}: {path}")),
            }
        });
    }
    std::fs::write("/tmp/left.txt", left_out.join("\n")).unwrap();
    panic!(
        "{compared} compared {listed} listed {} left",
        left_out.len()
    );
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
