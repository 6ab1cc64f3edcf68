//! What a design can show, against simulations by another program, closed forms, and figures from the trade.

#![allow(clippy::unwrap_used, reason = "a test stops at its first surprise")]

use restudy_engine::planning::{Assumption, Candidate, Outlook, PlanningError};
use restudy_engine::quantile::{Side, chi_square, chi_square_above};
use restudy_engine::{Design, Factor, Interaction, Judge, Settings, Tolerance, analyse};
use serde_json::Value;

/// The mix of the figures from the trade, in parts of the gauge's variance.
const MIX: [(&str, f64); 3] = [
    ("within cells", 60.0),
    ("part × appraiser", 10.0),
    ("appraiser", 30.0),
];

fn assumption(mix: &[(&str, f64)], studies: u32) -> Assumption {
    Assumption {
        mix: mix.iter().map(|&(n, v)| (n.to_owned(), v)).collect(),
        share: 0.25,
        limit: 0.30,
        confidence: 0.95,
        studies,
        seed: 3,
    }
}

fn outlook(assumed: &Assumption, parts: usize, appraisers: usize, trials: usize) -> Outlook {
    let candidate = Candidate::crossed(parts, appraisers, trials).unwrap();
    assumed.outlook(&candidate).unwrap()
}

/// Medians and ninetieth percentiles of limits in 100,000 studies that numpy drew and scipy limited: 16 gauges.
///
/// One Monte Carlo error of both simulations together is at most 0.6 %.
#[test]
fn limits_of_studies_simulated_elsewhere() {
    let text = include_str!("../../../fixtures/planning/limits_of_simulated_studies.json");
    let reference: Value = serde_json::from_str(text).unwrap();
    let results = reference["results"].as_array().unwrap();
    assert_eq!(results.len(), 16);
    for result in results {
        let variances = result["variances"].as_object().unwrap();
        let mix: Vec<(&str, f64)> = variances
            .iter()
            .map(|(n, v)| (n.as_str(), v.as_f64().unwrap()))
            .collect();
        let gauge: f64 = mix
            .iter()
            .filter(|(n, _)| *n != "part")
            .map(|(_, v)| v)
            .sum();
        let count = |key: &str| result[key].as_u64().unwrap() as usize;
        let outlook = outlook(
            &assumption(&mix, 30_000),
            count("parts"),
            count("appraisers"),
            count("trials"),
        );
        let limits = &result["gauge_variance_limits"];
        for (found, key) in [
            (outlook.lower, "median_lower"),
            (outlook.upper, "median_upper"),
            (outlook.upper_in_ten, "p90_upper"),
        ] {
            let expected = (limits[key].as_f64().unwrap() / gauge).sqrt();
            assert!(
                (found / expected - 1.0).abs() < 0.024,
                "{key}: found {found}, expected {expected} for {result}"
            );
        }
    }
}

/// From 400,000 simulated studies of another program, printed in whole per cent: a true 25 % shows above 30 % in 11 % of
/// studies with 10 parts, 3 appraisers and 3 trials, 10 % with six trials, 5 % with six appraisers and two trials; 90 % of
/// studies land between 0.79 and 1.30 of the truth.
#[test]
fn luck_at_a_quarter_of_the_tolerance() {
    let assumed = assumption(&MIX, 60_000);
    let usual = outlook(&assumed, 10, 3, 3);
    for (wrong, printed) in [
        (1.0 - usual.right, 0.11),
        (1.0 - outlook(&assumed, 10, 3, 6).right, 0.10),
        (1.0 - outlook(&assumed, 10, 6, 2).right, 0.05),
    ] {
        // Half a unit of the last digit, and three Monte Carlo errors.
        assert!((wrong - printed).abs() < 0.005 + 0.004, "{wrong} {printed}");
    }
    assert!((usual.estimate_low - 0.79).abs() < 0.008, "{usual:?}");
    assert!((usual.estimate_high - 1.30).abs() < 0.010, "{usual:?}");
}

#[test]
fn appraisers_buy_certainty_and_trials_hardly_any() {
    let assumed = assumption(&MIX, 10_000);
    let base = Candidate::crossed(10, 3, 3).unwrap();
    let now = assumed.outlook(&base).unwrap();
    let trials = assumed.outlook(&base.with_twice_the_trials()).unwrap();
    let appraisers = assumed
        .outlook(&base.with_twice_the("appraiser").unwrap())
        .unwrap();
    assert_eq!(
        (now.readings, trials.readings, appraisers.readings),
        (90, 180, 180)
    );
    assert!(trials.width > 0.9 * now.width, "{trials:?} {now:?}");
    assert!(appraisers.width < 0.5 * now.width, "{appraisers:?} {now:?}");
    assert!(now.right < trials.right && trials.right < appraisers.right);
}

/// Without appraisers the gauge variance is a mean square: chi-square in closed form.
#[test]
fn one_mean_square_in_closed_form() {
    let candidate = Candidate {
        design: Design::new(vec![Factor::crossed("part", 30)]).unwrap(),
        trials: 3,
    };
    let assumed = assumption(&[("within cells", 2.0)], 40_000);
    let outlook = assumed.outlook(&candidate).unwrap();
    let n = 60.0;
    let quantile = |side, p| (chi_square(side, p, n) / n).sqrt();
    let median = quantile(Side::Below, 0.5);
    for (found, expected) in [
        (outlook.estimate_low, quantile(Side::Below, 0.05)),
        (outlook.estimate_high, quantile(Side::Above, 0.05)),
        (outlook.lower, median / quantile(Side::Above, 0.025)),
        (outlook.upper, median / quantile(Side::Below, 0.025)),
    ] {
        assert!((found / expected - 1.0).abs() < 0.004, "{found} {expected}");
    }
    let wrong = chi_square_above(n * (0.30f64 / 0.25).powi(2), n);
    assert!(
        (1.0 - outlook.right - wrong).abs() < 0.002,
        "{outlook:?} {wrong}"
    );
}

/// A study's own estimates: what more trials or more appraisers would buy of it. Readings: two sines, no luck.
#[test]
fn what_more_of_a_study_would_buy() {
    let now = Candidate::crossed(6, 3, 2).unwrap();
    let cells: Vec<usize> = (0..36).map(|i| i / 2).collect();
    let value = |i: usize| {
        let (part, appraiser) = (i / 6, i / 2 % 3);
        10.0 * part as f64 + 2.0 * appraiser as f64 + (7.0 * i as f64).sin()
    };
    let values: Vec<f64> = (0..36).map(value).collect();
    let tolerance = Tolerance {
        lower: Some(0.0),
        upper: Some(60.0),
        one_sided: None,
    };
    let settings = Settings {
        confidence: 0.95,
        spread_sds: 6.0,
        interaction: Interaction::Keep,
        process: None,
        limits: None,
        judge: Judge::Estimate,
    };
    let study = analyse(&now.design, &cells, &values, &tolerance, &settings).unwrap();
    let assumed = Assumption::from_study(&study, 0.3, 5000, 1).unwrap();
    assert_eq!(
        Some(assumed.share),
        study.figures.gauge.share_of_tolerance.estimate
    );
    let base = Candidate::of_study(&study).unwrap();
    assert_eq!(base, now);
    let width = |candidate: &Candidate| assumed.outlook(candidate).unwrap().width;
    let appraisers = base.with_twice_the("appraiser").unwrap();
    assert!(width(&appraisers) < 0.6 * width(&base));
    assert!(width(&base.with_twice_the_trials()) > 0.9 * width(&base));

    let no_tolerance = analyse(
        &now.design,
        &cells,
        &values,
        &Tolerance::default(),
        &settings,
    );
    assert_eq!(
        Assumption::from_study(&no_tolerance.unwrap(), 0.3, 10, 1),
        None
    );
}

/// With one trial the interaction and the repeats are one line, and the gauge is seen whole all the same.
#[test]
fn one_trial_sees_the_whole_gauge() {
    let assumed = assumption(&MIX, 20_000);
    let (once, twice) = (outlook(&assumed, 10, 6, 1), outlook(&assumed, 10, 6, 2));
    assert_eq!(once.readings, 60);
    // The mean of the variance estimates is the variance: their spread is about one.
    for outlook in [once, twice] {
        assert!(outlook.estimate_low < 1.0 && 1.0 < outlook.estimate_high);
        assert!(outlook.lower < 1.0 && 1.0 < outlook.upper);
    }
    assert!(twice.width < once.width);
}

#[test]
fn the_seed_decides_and_nothing_else() {
    let assumed = assumption(&MIX, 500);
    let mut other = assumed.clone();
    other.seed = 4;
    let of = |assumed: &Assumption| outlook(assumed, 5, 3, 2);
    assert_eq!(of(&assumed), of(&assumed));
    assert_ne!(of(&assumed), of(&other));
    let mut scaled = assumed.clone();
    scaled.mix.iter_mut().for_each(|(_, v)| *v *= 1024.0);
    scaled.mix.reverse();
    assert!((of(&assumed).width / of(&scaled).width - 1.0).abs() < 1e-12);
}

#[test]
fn what_does_not_fit_is_refused_with_a_sentence() {
    let good = assumption(&MIX, 10);
    let crossed = |p, a, t| Candidate::crossed(p, a, t).unwrap();
    let refused = |assumed: &Assumption, candidate: &Candidate| {
        assumed.outlook(candidate).unwrap_err().to_string()
    };
    let usual = crossed(10, 3, 3);
    let cases = [
        (assumption(&[("fixture", 1.0)], 10), &usual, "fixture"),
        (assumption(&[("appraiser", -1.0)], 10), &usual, "-1"),
        (assumption(&[("appraiser", f64::NAN)], 10), &usual, "NaN"),
        (assumption(&[("appraiser", 0.0)], 10), &usual, "no variance"),
        (assumption(&MIX, 0), &usual, "number of studies"),
        (
            Assumption {
                limit: 0.0,
                ..good.clone()
            },
            &usual,
            "the limit",
        ),
        (
            Assumption {
                share: f64::NAN,
                ..good.clone()
            },
            &usual,
            "the true share",
        ),
        (
            Assumption {
                confidence: 1.0,
                ..good.clone()
            },
            &usual,
            "the confidence",
        ),
        (good.clone(), &crossed(10, 1, 3), "one level"),
        (good.clone(), &crossed(1, 3, 3), "1 part"),
        (good.clone(), &crossed(10, 3, 0), "0 trial"),
    ];
    for (assumed, candidate, part) in cases {
        let sentence = refused(&assumed, candidate);
        assert!(sentence.contains(part), "{sentence}");
    }
    assert!(Candidate::crossed(10, 0, 3).is_err());

    let nested = Candidate {
        design: Design::new(vec![
            Factor::nested("part", 8, &["appraiser"]),
            Factor::crossed("appraiser", 3),
        ])
        .unwrap(),
        trials: 3,
    };
    let repeats = [("within cells", 1.0), ("appraiser", 1.0)];
    let found = assumption(&repeats, 10).outlook(&nested);
    assert!(
        matches!(found, Err(PlanningError::PartsMatter(_))),
        "{found:?}"
    );
    let with_parts = [repeats[0], repeats[1], ("part within appraiser", 4.0)];
    assert!(assumption(&with_parts, 10).outlook(&nested).is_ok());
}

/// E of the only mean square is part + repeats: a study of this design shows no gauge, so nothing can be foretold of it.
#[test]
fn one_reading_a_part_foretells_no_gauge() {
    let mix = [("part", 1.0), ("within cells", 0.01)];
    let nested = Candidate {
        design: Design::new(vec![
            Factor::crossed("appraiser", 3),
            Factor::nested("part", 8, &["appraiser"]),
        ])
        .unwrap(),
        trials: 1,
    };
    let nested_mix = [("part within appraiser", 1.0), ("within cells", 0.01)];
    for (candidate, mix) in [
        (Candidate::crossed(10, 1, 1).unwrap(), mix),
        (nested, nested_mix),
    ] {
        assert_eq!(
            assumption(&mix, 10).outlook(&candidate),
            Err(PlanningError::NotApart)
        );
    }
    assert!(outlook(&assumption(&mix, 2000), 10, 1, 2).right > 0.5);
}
