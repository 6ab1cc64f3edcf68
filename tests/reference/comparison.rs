//! Two studies of one gauge: the second has every deviation from its cell mean times 1.5.
//!
//! The exact ratio of repeatabilities to at least 9 digits; the simulated ratio of gauge sds to four Monte Carlo
//! errors of both simulations together.

use std::sync::Once;

use restudy_engine::over_time::{OverTime, Ratio, Ratios, Round};
use restudy_engine::quantile::f_above;
use restudy_engine::{Interval, Recorded, Simulation};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{Fixture, PART_APPRAISER, PART_ONLY, fixture, pooling, settings};

const BLOCK: &str = "comparison_with_a_aiag_10x3x3";
const DRAWS: u32 = 100_000;
const REFERENCE_DRAWS: f64 = 2e6;

fn recorded(fixture: &Fixture, factors: &[(&str, &[&str])]) -> Recorded {
    Recorded::try_from(&fixture.study(factors, &settings(0.95, 6.0))).unwrap()
}

fn ratio(confidence: f64) -> Ratio {
    let (now, earlier) = (
        fixture!("g_aiag_within_times_1_5"),
        fixture!("a_aiag_10x3x3"),
    );
    let simulation = Simulation {
        draws: DRAWS,
        seed: 1,
    };
    Ratios::new(confidence, simulation).of(
        &recorded(&now, PART_APPRAISER),
        &recorded(&earlier, PART_APPRAISER),
    )
}

#[test]
pub(crate) fn repeatability_over_repeatability() {
    let expected = &fixture!("g_aiag_within_times_1_5").expected[BLOCK];
    let expected = &expected["repeatability_study2_over_study1"];
    for (confidence, level) in [(0.90, "0.90"), (0.95, "0.95")] {
        let ratio = ratio(confidence);
        let mut check = Check::new(&format!("repeatability ratio at {level}"), 9.0);
        check.digits("f", ratio.f, &expected["variance_ratio"]);
        check.digits("p", ratio.p, &expected["p_two_sided"]);
        let df = ratio.df.unwrap();
        check.digits("df now", Some(df.0), &expected["df"][0]);
        check.digits("df earlier", Some(df.1), &expected["df"][1]);
        let limits = &expected[level]["sd_ratio"];
        check.digits("lower", ratio.repeatability.lower, &limits["lower"]);
        check.digits("upper", ratio.repeatability.upper, &limits["upper"]);
        let squared = |x: Option<f64>| x.map(|x| x * x);
        let limits = &expected[level]["variance_ratio"];
        let (lower, upper) = (ratio.repeatability.lower, ratio.repeatability.upper);
        check.digits("lower squared", squared(lower), &limits["lower"]);
        check.digits("upper squared", squared(upper), &limits["upper"]);
        let p_upper = ratio.f.map(|f| f_above(f, df.0, df.1));
        check.digits("p above", p_upper, &expected["p_upper"]);
        check.number("estimate", ratio.repeatability.estimate, 1.5);
        check.same(
            "method",
            ratio.repeatability.interval,
            Some(Interval::Exact),
        );
        check.finish(8);
    }
    // A one-sided limit at 95 % is the lower end of the two-sided limits at 90 %.
    let mut check = Check::new("repeatability ratio at least", 9.0);
    let at_least = ratio(0.95).repeatability.at_least;
    check.digits("at least", at_least, &expected["0.90"]["sd_ratio"]["lower"]);
    check.finish(1);
}

#[test]
pub(crate) fn gauge_over_gauge() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let expected = &fixture!("g_aiag_within_times_1_5").expected[BLOCK];
        let expected = &expected["gauge_sd_study2_over_study1"];
        let both = (1.0 + REFERENCE_DRAWS / f64::from(DRAWS)).sqrt();
        for (confidence, level) in [(0.90, "0.90"), (0.95, "0.95")] {
            let ratio = ratio(confidence);
            let mut check = Check::new(&format!("gauge ratio at {level}"), 12.0);
            check.digits("estimate", ratio.gauge.estimate, &expected["estimate"]);
            check.same("method", ratio.gauge.interval, Some(Interval::Generalized));
            check.finish(2);
            let limits = &expected["gci_linear"][level];
            near(ratio.gauge.lower, limits, "lower", both);
            near(ratio.gauge.upper, limits, "upper", both);
        }
        let limits = &expected["gci_linear"]["0.90"];
        near(ratio(0.95).gauge.at_least, limits, "lower", both);
    });
}

fn near(found: Option<f64>, limits: &Value, side: &str, both: f64) {
    let expected = compared(&limits[side]).as_f64().unwrap();
    let error = compared(&limits[format!("{side}_mcse")]).as_f64().unwrap() * both;
    let gap = (found.unwrap() - expected).abs();
    assert!(
        gap < 4.0 * error,
        "{side}: {found:?}, expected {expected} ± {error}"
    );
}

/// A study written out and read back compares as the study itself, pooled or not, with one factor or three.
#[test]
pub(crate) fn a_written_record_compares_as_the_study_does() {
    let three: &[(&str, &[&str])] = &[("part", &[]), ("appraiser", &[]), ("fixture", &[])];
    let nested: &[(&str, &[&str])] = &[("part", &["appraiser"]), ("appraiser", &[])];
    let keep = settings(0.95, 6.0);
    let table = [
        (fixture!("a_aiag_10x3x3"), PART_APPRAISER, keep),
        (fixture!("a_aiag_10x3x3"), PART_APPRAISER, pooling(keep)),
        (fixture!("edge_one_trial"), PART_APPRAISER, keep),
        (fixture!("edge_two_appraisers"), PART_APPRAISER, keep),
        (fixture!("d_strd_SiRstv"), PART_ONLY, keep),
        (fixture!("f_three_factor_8x3x2x2"), three, keep),
        (fixture!("f_three_factor_8x3x2x2"), three, pooling(keep)),
        (fixture!("f_nested_3x8x3"), nested, keep),
    ];
    for (fixture, factors, settings) in table {
        let study = fixture.study(factors, &settings);
        let written = serde_json::to_string(&study).unwrap();
        let read: Recorded = serde_json::from_str(&written).unwrap();
        assert_eq!(read, Recorded::try_from(&study).unwrap());
        let (found, expected) = (read.gauge_sd(), study.figures.gauge.sd.estimate);
        assert_eq!(found, expected, "{}", fixture.name);
    }
    let foreign = r#"{"design":{"factors":[{"name":"part","levels":3,"within":[]}],"trials":2},
        "mean_squares":[{"name":"part","ms":1.0},{"name":"fixture","ms":1.0},{"name":"within cells","ms":0.5}]}"#;
    let refused = serde_json::from_str::<Recorded>(foreign)
        .unwrap_err()
        .to_string();
    assert!(refused.contains("part, fixture, within cells"), "{refused}");
}

#[test]
pub(crate) fn what_cannot_be_compared_says_why() {
    let simulation = Simulation {
        draws: 1000,
        seed: 1,
    };
    let mut ratios = Ratios::new(0.95, simulation);
    let (good, once, equal) = (
        recorded(&fixture!("a_aiag_10x3x3"), PART_APPRAISER),
        recorded(&fixture!("edge_one_trial"), PART_APPRAISER),
        recorded(&fixture!("edge_all_equal"), PART_APPRAISER),
    );
    let same_trials = recorded(&fixture!("edge_equal_trials"), PART_APPRAISER);
    for (now, earlier) in [
        (&good, &once),
        (&once, &good),
        (&good, &equal),
        (&good, &same_trials),
    ] {
        let ratio = ratios.of(now, earlier);
        assert_eq!(ratio.repeatability.estimate, None);
        assert!(ratio.repeatability.why.is_some() && ratio.p.is_none());
    }
    assert_eq!(ratios.of(&good, &equal).gauge.estimate, None);
    let nothing_left = ratios.of(&equal, &good);
    assert_eq!(nothing_left.repeatability.estimate, Some(0.0));
    assert_eq!(nothing_left.gauge.estimate, Some(0.0));
    assert_eq!(nothing_left.gauge.upper, Some(0.0));
}

/// A new baseline: the round before is still compared with, the trend and the baseline start anew.
#[test]
pub(crate) fn a_baseline_starts_anew() {
    let (good, worse) = (
        recorded(&fixture!("a_aiag_10x3x3"), PART_APPRAISER),
        recorded(&fixture!("g_aiag_within_times_1_5"), PART_APPRAISER),
    );
    let round = |at: u32, recorded: &Recorded, baseline| Round {
        at: f64::from(at),
        recorded: recorded.clone(),
        baseline,
    };
    let simulation = Simulation {
        draws: 1000,
        seed: 1,
    };
    let mut ratios = Ratios::new(0.95, simulation);
    let mut of = |rounds: &[Round]| OverTime::of(rounds, Some(1.0), 0.95, &mut ratios);
    assert!(of(&[]).is_none());

    let mut rounds = vec![round(0, &good, false)];
    let first = of(&rounds).unwrap();
    assert!(first.to_previous.is_none() && first.to_baseline.is_none() && first.trend.is_none());

    rounds.extend([
        round(1, &worse, false),
        round(2, &good, false),
        round(3, &worse, false),
    ]);
    let fourth = of(&rounds).unwrap();
    assert_eq!(
        fourth.to_previous.unwrap().f.map(|f| (f * 100.0).round()),
        Some(225.0)
    );
    assert_eq!(
        fourth.to_baseline.unwrap().f.map(|f| (f * 100.0).round()),
        Some(225.0)
    );
    assert_eq!(fourth.trend.unwrap().rounds, 4);

    rounds.push(round(4, &good, true));
    let anew = of(&rounds).unwrap();
    assert_eq!(
        anew.to_previous.unwrap().f.map(|f| (f * 100.0).round()),
        Some(44.0)
    );
    assert!(anew.to_baseline.is_none() && anew.trend.is_none());

    rounds.push(round(5, &good, false));
    assert_eq!(of(&rounds).unwrap().to_baseline.unwrap().f, Some(1.0));
}
