//! Restricted maximum likelihood against Newton steps in 30-digit arithmetic and against lme4.

use std::sync::Once;

use restudy_engine::quantile::{Side, chi_square};
use restudy_engine::{Interval, Reml, reml};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{Fixture, PART_APPRAISER, fixture, name_of_line, settings, values};

/// What is asked of components and covariances; the likelihood has its own.
const COMPONENT_DIGITS: f64 = 9.0;
const LIKELIHOOD_DIGITS: f64 = 11.0;
/// lme4's search ends earlier.
const LME4_DIGITS: f64 = 7.0;

struct Case {
    fixture: Fixture,
    block: &'static str,
    factors: &'static [(&'static str, &'static [&'static str])],
    interaction: bool,
}

fn fitted(case: &Case) -> Reml {
    let placed = case.fixture.placed(case.factors);
    reml(
        &placed.design,
        &placed.cells,
        &placed.values,
        case.interaction,
    )
    .unwrap()
}

fn cases() -> Vec<Case> {
    let case = |fixture, block, factors, interaction| Case {
        fixture,
        block,
        factors,
        interaction,
    };
    let mut cases = Vec::new();
    for fixture in [
        || fixture!("e_aiag_unbalanced"),
        || fixture!("e_mr_unbalanced"),
        || fixture!("e_synthetic_unbalanced"),
    ] as [fn() -> Fixture; 3]
    {
        cases.push(case(
            fixture(),
            "reml_with_interaction",
            PART_APPRAISER,
            true,
        ));
        cases.push(case(
            fixture(),
            "reml_without_interaction",
            PART_APPRAISER,
            false,
        ));
    }
    for fixture in [fixture!("a_aiag_10x3x3"), fixture!("b_mr_20x3x2")] {
        cases.push(case(fixture, "reml", PART_APPRAISER, true));
    }
    cases.push(case(
        fixture!("f_three_factor_8x3x2x2"),
        "reml",
        &[("part", &[]), ("appraiser", &[]), ("fixture", &[])],
        true,
    ));
    cases.push(case(
        fixture!("f_nested_3x8x3"),
        "reml",
        &[("appraiser", &[]), ("part", &["appraiser"])],
        true,
    ));
    cases
}

/// Places of the reference's components among ours.
fn places(order: &Value, fit: &Reml) -> Vec<usize> {
    let place = |name: &Value| {
        let name = name_of_line(compared(name).as_str().unwrap());
        fit.order.iter().position(|n| *n == name).unwrap()
    };
    order.as_array().unwrap().iter().map(place).collect()
}

fn matrix(
    check: &mut Check,
    field: &str,
    found: &Option<Vec<Vec<f64>>>,
    expected: &Value,
    places: &[usize],
) {
    let found = found.as_ref().unwrap();
    let expected = |i: usize, j: usize| compared(&expected[i][j]).as_f64().unwrap();
    // An entry far below its row and column holds rounding alone.
    for (i, &a) in places.iter().enumerate() {
        for (j, &b) in places.iter().enumerate() {
            let scale = (expected(i, i) * expected(j, j)).abs().sqrt();
            let away = expected(i, j) - found[a][b];
            check.number(&format!("{field}[{i}][{j}]"), Some(scale + away), scale);
        }
    }
}

#[test]
pub(crate) fn components_likelihood_slopes_and_covariances() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        for case in cases() {
            let fit = fitted(&case);
            let expected = &case.fixture.expected[case.block];
            let name = format!("{} {}", case.fixture.name, case.block);
            let places_of = places(&expected["order"], &fit);
            let mut check = Check::new(&name, COMPONENT_DIGITS);
            let mut at_zero: Vec<String> = Vec::new();
            for (key, &place) in expected["order"].as_array().unwrap().iter().zip(&places_of) {
                let key = key.as_str().unwrap();
                let value = &expected["estimates"][key];
                check.digits(key, Some(fit.estimates[place]), value);
                let score = fit.score.as_ref().unwrap()[place];
                if value.as_f64() == Some(0.0) {
                    at_zero.push(fit.order[place].clone());
                    check.digits(
                        &format!("score of {key}"),
                        Some(score),
                        &expected["score_at_estimate"][key],
                    );
                } else {
                    // Zero, in units of the score's own sd.
                    let information = &fit.expected_information.as_ref().unwrap()[place][place];
                    compared(&expected["score_at_estimate"][key]);
                    check.number(
                        &format!("score of {key}"),
                        Some(1.0 + score / information.sqrt()),
                        1.0,
                    );
                }
            }
            let named = expected["at_zero"].as_array().unwrap();
            let named: Vec<String> = (named.iter())
                .map(|n| name_of_line(compared(n).as_str().unwrap()))
                .collect();
            check.same("at zero, by name", fit.at_zero.clone(), named);
            check.same("at zero", fit.at_zero.clone(), at_zero.clone());
            for (field, found) in [
                ("expected_information", &fit.expected_information),
                ("observed_information", &fit.observed_information),
                ("covariance_from_expected", &fit.covariance),
            ] {
                matrix(&mut check, field, found, &expected[field], &places_of);
            }
            if !at_zero.is_empty() {
                let free = &expected["covariance_free_components"];
                let kept: Vec<&String> =
                    fit.order.iter().filter(|n| !at_zero.contains(n)).collect();
                let places: Vec<usize> = free["order"]
                    .as_array()
                    .unwrap()
                    .iter()
                    .map(|n| {
                        let name = name_of_line(compared(n).as_str().unwrap());
                        kept.iter().position(|k| **k == name).unwrap()
                    })
                    .collect();
                matrix(
                    &mut check,
                    "covariance_free_components",
                    &fit.covariance_above_zero,
                    &free["from_expected"],
                    &places,
                );
            }
            if case.block == "reml" {
                let study = case.fixture.study(case.factors, &settings(0.95, 6.0));
                check.digits("mean", Some(study.grand_mean), &expected["mean"]);
            }
            observed(&mut check, &fit, expected, &places_of);
            gauge_variance(&mut check, &fit, &expected["gauge_variance"]);
            check.digits(
                "readings",
                Some(case.fixture.placed(case.factors).values.len() as f64),
                &expected["readings"],
            );
            check.finish(30);

            let mut check = Check::new(&name, LIKELIHOOD_DIGITS);
            check.digits("loglik", fit.log_likelihood, &expected["loglik"]);
            let criterion = fit.log_likelihood.map(|l| -2.0 * l);
            check.digits("criterion", criterion, &expected["reml_criterion"]);
            check.finish(2);
        }
    });
}

/// The reference's covariance undoes our information, both in units of the components' sds.
fn undoes(check: &mut Check, information: &[Vec<f64>], covariance: &Value, places: &[usize]) {
    let covariance = |i: usize, j: usize| compared(&covariance[i][j]).as_f64().unwrap();
    let n = places.len();
    let scale: Vec<f64> = (0..n).map(|i| covariance(i, i).abs().sqrt()).collect();
    for i in 0..n {
        for j in 0..n {
            let product: f64 = (0..n)
                .map(|k| information[places[i]][places[k]] * covariance(k, j))
                .sum();
            let one = if i == j { 2.0 } else { 1.0 };
            let found = 1.0 + product * scale[i] / scale[j];
            check.number(
                &format!("covariance from observed[{i}][{j}]"),
                Some(found),
                one,
            );
        }
    }
}

fn observed(check: &mut Check, fit: &Reml, expected: &Value, places_of: &[usize]) {
    let information = fit.observed_information.as_ref().unwrap();
    undoes(
        check,
        information,
        &expected["covariance_from_observed"],
        places_of,
    );
    if let Some(free) = expected.get("covariance_free_components") {
        let places = places(&free["order"], fit);
        undoes(check, information, &free["from_observed"], &places);
    }
}

/// Estimate, its variance, matched degrees of freedom and chi-square limits from the fit.
fn gauge_variance(check: &mut Check, fit: &Reml, expected: &Value) {
    let gauge: Vec<usize> = (0..fit.order.len())
        .filter(|&i| !matches!(&*fit.order[i], "part" | "part within appraiser"))
        .collect();
    let estimate: f64 = gauge.iter().map(|&i| fit.estimates[i]).sum();
    let covariance = fit.covariance.as_ref().unwrap();
    let variance: f64 = (gauge.iter())
        .flat_map(|&i| gauge.iter().map(move |&j| covariance[i][j]))
        .sum();
    let df = 2.0 * estimate * estimate / variance;
    check.digits("gauge", Some(estimate), &expected["estimate"]);
    check.digits(
        "gauge variance",
        Some(variance),
        &expected["variance_of_estimate"],
    );
    check.digits("gauge df", Some(df), &expected["satterthwaite_df"]);
    for (level, tail) in [("0.90", 0.05), ("0.95", 0.025)] {
        let limit = |side| Some(df * estimate / chi_square(side, tail, df));
        check.digits("gauge lower", limit(Side::Above), &expected[level]["lower"]);
        check.digits("gauge upper", limit(Side::Below), &expected[level]["upper"]);
    }
}

#[test]
pub(crate) fn lme4_finds_the_same_maximum() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let lme4 = values!("lme4_values");
        for case in cases() {
            let fit = fitted(&case);
            let name = match case.block {
                "reml_without_interaction" => format!("{}_no_interaction", case.fixture.name),
                _ => case.fixture.name.to_owned(),
            };
            let theirs = &lme4[&name];
            let mut check = Check::new(&name, LME4_DIGITS);
            let largest = fit.estimates.iter().fold(0.0, |a: f64, b| a.max(*b));
            for (key, estimate) in theirs["estimates"].as_object().unwrap() {
                let line = name_of_line(key);
                let place = fit.order.iter().position(|n| *n == line).unwrap();
                let away = fit.estimates[place] - compared(estimate).as_f64().unwrap();
                check.number(key, Some(largest + away), largest);
            }
            check.digits("loglik", fit.log_likelihood, &theirs["loglik"]);
            let singular = compared(&theirs["singular"]).as_bool().unwrap();
            check.same("singular", !fit.at_zero.is_empty(), singular);
            check.finish(5);
        }
    });
}

/// Twice the gain in log-likelihood from the interaction, to the digits that their difference leaves.
#[test]
pub(crate) fn likelihood_ratio_of_the_interaction() {
    let cases = cases();
    for pair in cases.chunks(2).take(3) {
        let likelihood = |case: &Case| fitted(case).log_likelihood.unwrap();
        let (kept, pooled) = (likelihood(&pair[0]), likelihood(&pair[1]));
        let expected = &pair[0].fixture.expected["likelihood_ratio_interaction"]["statistic"];
        let expected = compared(expected).as_f64().unwrap();
        let gap = (2.0 * (kept - pooled) - expected).abs();
        assert!(
            gap < 1e-10 * kept.abs(),
            "{}: {gap:e}",
            pair[0].fixture.name
        );
    }
}

/// Chi-square limits of the gauge variance with matched degrees of freedom, by `analyse`.
#[test]
pub(crate) fn the_gauge_variance_has_its_approximate_limits() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        for case in cases().iter().filter(|case| {
            case.fixture.name.starts_with("e_") && case.block == "reml_with_interaction"
        }) {
            let mut check = Check::new(case.fixture.name, COMPONENT_DIGITS);
            for (level, confidence) in [("0.90", 0.90), ("0.95", 0.95)] {
                let study = case.fixture.study(case.factors, &settings(confidence, 6.0));
                let expected = &case.fixture.expected[case.block]["gauge_variance"];
                let gauge = &study.figures.gauge.variance;
                check.digits("estimate", gauge.estimate, &expected["estimate"]);
                check.digits("lower", gauge.lower, &expected[level]["lower"]);
                check.digits("upper", gauge.upper, &expected[level]["upper"]);
                check.same("interval", gauge.interval, Some(Interval::Satterthwaite));
                let interaction = &case.fixture.expected["likelihood_ratio_interaction"];
                check.digits(
                    "mean",
                    Some(study.grand_mean),
                    &case.fixture.expected[case.block]["mean"],
                );
                // A statistic of zero has its p of one half to the root of its rounding.
                let (p, expected) = (
                    study.interaction.p.unwrap(),
                    compared(&interaction["p_half_chi2_1"]).as_f64().unwrap(),
                );
                assert!((p / expected - 1.0).abs() < 1e-5, "{p:e} for {expected:e}");
            }
            check.finish(8);
        }
    });
}
