//! Producer's and consumer's risk: only for a named process, and defined wherever the data are not.

use restudy_engine::risk::{Judged, guarded, misclassification};
use restudy_engine::{
    Factor, Figure, Limits, OneSided, Prepared, Process, Risk, Settings, Simulation, Study,
    Tolerance,
};

use crate::invented::{Readings, crossed, simulated};
use crate::sound::settings;

const STATED: Process = Process::Stated {
    mean: 10.0,
    sd: 1.0,
};
const LIMITS: Tolerance = Tolerance {
    lower: Some(6.0),
    upper: Some(14.0),
    one_sided: None,
};

fn drawn(readings: &Readings, tolerance: &Tolerance, settings: &Settings, seed: u64) -> Study {
    let trials = readings.values.len() / readings.design.cells();
    let simulation = Simulation { draws: 2000, seed };
    Prepared::new(&readings.design, trials, settings)
        .unwrap()
        .simulated(simulation)
        .study(&readings.cells, &readings.values, tolerance)
        .unwrap()
}

fn risk(readings: &Readings, tolerance: &Tolerance, process: Process) -> Risk {
    let settings = Settings {
        process: Some(process),
        ..settings()
    };
    drawn(readings, tolerance, &settings, 7).risk.unwrap()
}

fn figures(risk: &Risk) -> [&Figure; 8] {
    [
        &risk.bad,
        &risk.accepted,
        &risk.producer.joint,
        &risk.producer.given_good,
        &risk.producer.given_rejected,
        &risk.consumer.joint,
        &risk.consumer.given_bad,
        &risk.consumer.given_accepted,
    ]
}

fn absent(risk: &Risk, word: &str) {
    for figure in figures(risk) {
        assert_eq!(
            (figure.estimate, figure.lower, figure.upper),
            (None, None, None)
        );
        assert!(figure.why.as_ref().unwrap().contains(word), "{figure:?}");
    }
    assert!(risk.guarded.is_empty());
}

#[test]
fn without_a_process_there_is_no_risk_and_nothing_is_drawn() {
    let study = drawn(&crossed(1, 8, 3, 2), &LIMITS, &settings(), 7);
    assert_eq!((study.risk, study.draws, study.seed), (None, None, None));
}

#[test]
fn a_stated_process_is_taken_as_known() {
    let readings = crossed(1, 8, 3, 2);
    let risk = risk(&readings, &LIMITS, STATED);
    assert_eq!(risk.process.from, "stated");
    assert_eq!(
        (risk.process.mean, risk.process.sd),
        (Some(10.0), Some(1.0))
    );
    assert_eq!(risk.bad.lower, risk.bad.upper);
    assert!(risk.producer.joint.lower < risk.producer.joint.upper);
    for figure in figures(&risk) {
        let (lower, upper) = (figure.lower.unwrap(), figure.upper.unwrap());
        assert!((0.0..=upper).contains(&lower) && upper <= 1.0, "{figure:?}");
        let at_least = figure.at_least.unwrap();
        assert!((lower..=upper).contains(&at_least), "{figure:?}");
    }
}

#[test]
fn what_cannot_be_told_is_absent_and_says_why() {
    let readings = crossed(1, 8, 3, 2);
    let flat = readings.by_levels(|_| 10.0);
    absent(&risk(&flat, &LIMITS, STATED), "equal");
    let parts_alone = readings.by_levels(|levels| 9.0 + 0.25 * levels[0] as f64);
    absent(&risk(&parts_alone, &LIMITS, Process::StudyParts), "zero");
    absent(&risk(&readings, &Tolerance::default(), STATED), "tolerance");
    let reversed = Tolerance {
        lower: LIMITS.upper,
        upper: LIMITS.lower,
        one_sided: None,
    };
    absent(&risk(&readings, &reversed, STATED), "not above");
    let no_sd = Process::Stated {
        mean: 10.0,
        sd: 0.0,
    };
    absent(&risk(&readings, &LIMITS, no_sd), "above zero");
    let no_mean = Process::Stated {
        mean: f64::NAN,
        sd: 1.0,
    };
    absent(&risk(&readings, &LIMITS, no_mean), "expected numbers");
    let one_trial_of_parts = simulated(4, vec![Factor::crossed("part", 8)], 1);
    absent(&risk(&one_trial_of_parts, &LIMITS, STATED), "one trial");
}

#[test]
fn three_crossed_factors_give_estimates_without_limits() {
    let factors = ["part", "appraiser", "fixture"].map(|name| Factor::crossed(name, 3));
    let risk = risk(
        &simulated(5, factors.into(), 2),
        &LIMITS,
        Process::StudyParts,
    );
    for figure in figures(&risk) {
        assert!(figure.estimate.is_some() && figure.lower.is_none());
        assert!(figure.why.as_ref().unwrap().contains("three factors"));
    }
}

#[test]
fn identical_repeats_and_vanishing_parts_still_have_risks() {
    let readings = crossed(1, 8, 3, 2);
    let steps = [0.02, 0.31, -0.27];
    let repeats = readings
        .by_levels(|l| 9.5 + 0.1 * (l[0] * l[0] % 7) as f64 + steps[l[1]] * (1 + l[0] % 3) as f64);
    let appraisers = readings.by_levels(|l| 10.0 + steps[l[1]]);
    for readings in [repeats, appraisers] {
        for figure in figures(&risk(&readings, &LIMITS, Process::StudyParts)) {
            for number in [figure.estimate, figure.lower, figure.upper, figure.at_least] {
                assert!((0.0..=1.0).contains(&number.unwrap()), "{figure:?}");
            }
        }
    }
}

/// With the same draws for every characteristic a change of unit changes nothing.
#[test]
fn the_draws_are_common_to_all_characteristics() {
    let readings = crossed(1, 8, 3, 2);
    let doubled = readings.mapped(|y| 2.0 * y);
    let wider = Tolerance {
        lower: Some(12.0),
        upper: Some(28.0),
        one_sided: None,
    };
    let mm = risk(&readings, &LIMITS, Process::StudyParts);
    let half_mm = risk(&doubled, &wider, Process::StudyParts);
    for (a, b) in figures(&mm).into_iter().zip(figures(&half_mm)) {
        assert_eq!(a, b);
    }
    let settings = Settings {
        process: Some(Process::StudyParts),
        ..settings()
    };
    let reseeded = drawn(&readings, &LIMITS, &settings, 8);
    assert_eq!(reseeded.seed, Some(8));
    assert_ne!(reseeded.risk.unwrap().bad.upper, mm.bad.upper);
}

/// `Φ(width / gauge sd) - 1/2`: half of the bad parts lie just outside one limit and read towards it.
#[test]
fn parts_without_spread_have_the_limiting_conditional_risk() {
    let judged = Judged {
        mean: 0.2,
        part_sd: 0.0,
        gauge_sd: 1.5,
        lower: Some(-1.0),
        upper: Some(0.5),
    };
    let risks = misclassification(&judged).unwrap();
    assert_eq!((risks.bad, risks.consumer_joint), (0.0, 0.0));
    // Φ(1) - 1/2, Abramowitz & Stegun table 26.1.
    let limit = 0.841_344_746_068_543 - 0.5;
    assert!((risks.consumer_given_bad.unwrap() - limit).abs() < 1e-9);
}

#[test]
fn no_part_bad_to_working_precision_still_has_conditional_risks() {
    let judged = Judged {
        mean: 0.0,
        part_sd: 1.0,
        gauge_sd: 0.5,
        lower: Some(-60.0),
        upper: Some(60.0),
    };
    let risks = misclassification(&judged).unwrap();
    assert_eq!((risks.bad, risks.consumer_joint), (0.0, 0.0));
    // Far out the distance beyond the limit is exponential with rate 60: ∫ 60 exp(-60 s) Φ(-2 s) ds.
    let given_bad = risks.consumer_given_bad.unwrap();
    let first_terms = 0.5 - 2.0 / 60.0 / (2.0 * std::f64::consts::PI).sqrt();
    assert!((given_bad - first_terms).abs() < 1e-4, "{given_bad}");
    assert!(risks.producer_given_rejected.is_some_and(|p| p > 0.99));
}

#[test]
fn guard_bands_keep_the_wanted_risk_at_a_price() {
    let judged = Judged {
        mean: 0.0,
        part_sd: 1.0,
        gauge_sd: 0.3,
        lower: Some(-3.0),
        upper: Some(3.0),
    };
    let open = misclassification(&judged).unwrap();
    let (tight, tighter) = (
        guarded(&judged, 1e-5).unwrap(),
        guarded(&judged, 1e-6).unwrap(),
    );
    assert!(tight.guard > 0.0 && tighter.guard > tight.guard);
    assert!((tight.consumer_joint / 1e-5 - 1.0).abs() < 1e-9);
    assert!(tighter.producer_joint > tight.producer_joint);
    assert!(tight.producer_joint > open.producer_joint);
    assert_eq!(tight.upper, Some(3.0 - tight.guard));
    let kept = guarded(&judged, 0.5).unwrap();
    assert_eq!(kept.guard, 0.0);
    assert!((kept.producer_joint / open.producer_joint - 1.0).abs() < 1e-9);
    assert_eq!(guarded(&judged, 0.0), None);
    let upside_down = Judged {
        lower: judged.upper,
        upper: judged.lower,
        ..judged
    };
    assert_eq!(guarded(&upside_down, 0.01), None);
    assert_eq!(misclassification(&upside_down), None);
}

/// The chance that the share is above its own one-sided lower limit is the confidence of that limit.
#[test]
fn chance_and_limit_agree_for_the_distance_from_the_study_mean() {
    let readings = crossed(8, 10, 3, 3);
    let tolerance = Tolerance {
        lower: None,
        upper: Some(20.0),
        one_sided: Some(OneSided::ToStudyMean),
    };
    let study = drawn(&readings, &tolerance, &settings(), 7);
    let share = study.figures.gauge.share_of_tolerance;
    assert!(share.lower < share.estimate && share.estimate < share.upper);
    let limits = Limits {
        watch: share.at_least.unwrap(),
        act: 1e9,
        back_below: 0.85,
    };
    let at_limit = Settings {
        limits: Some(limits),
        ..settings()
    };
    let chance = drawn(&readings, &tolerance, &at_limit, 7).chance_above;
    assert!((chance.watch.unwrap() - 0.95).abs() < 1e-3, "{chance:?}");
    // In a few draws the mean lies outside the limit, and the share has no end.
    assert!((0.0..0.02).contains(&chance.act.unwrap()), "{chance:?}");
}
