//! Simulated limits against percentiles of 2,000,000 draws made elsewhere, within four Monte Carlo errors of both;
//! Satterthwaite's limits to nine digits.

use std::sync::Once;

use restudy_engine::{
    DRAWS, Figure, Interval, Prepared, Process, Quantity, Settings, Simulation, Study,
};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{Factors, Fixture, PART_APPRAISER, PART_ONLY, fixture, pooling, settings};

/// Enough for most data sets, and quick without optimisation; the allowed distance grows accordingly.
const FEWER: u32 = 20_000;

const NESTED: Factors = &[("appraiser", &[]), ("part", &["appraiser"])];
const NIST_NESTED: Factors = &[("part", &[]), ("appraiser", &["part"])];
const THREE: Factors = &[("part", &[]), ("appraiser", &[]), ("fixture", &[])];

const VARIANCES: [(Quantity, &str); 5] = [
    (Quantity::Repeatability, "repeatability"),
    (Quantity::Reproducibility, "reproducibility"),
    (Quantity::Gauge, "gauge"),
    (Quantity::Part, "part"),
    (Quantity::Total, "total"),
];

/// Confidence, and its name in the reference.
const LEVELS: [(f64, &str); 2] = [(0.90, "0.90"), (0.95, "0.95")];

/// Interaction kept or pooled.
type Choice = fn(Settings) -> Settings;

/// Each choice with its block of the reference.
const CHOICES: [(Choice, &str); 2] = [(|s| s, "with_interaction"), (pooling, "pooled")];

fn crossed() -> [Fixture; 6] {
    [
        fixture!("a_aiag_10x3x3"),
        fixture!("a_aiag_10x3x3", "a_aiag_10x3x3_one_sided"),
        fixture!("b_mr_20x3x2"),
        fixture!("c_nist_crossed_5x2x5"),
        fixture!("g_aiag_within_times_1_5"),
        fixture!("edge_two_appraisers"),
    ]
}

/// Limits by a stated method, of one figure after the other.
fn by(
    fixture: &Fixture,
    factors: Factors,
    settings: Settings,
) -> impl Fn(Quantity, Interval) -> Option<Figure> {
    let placed = fixture.placed(factors);
    let trials = placed.values.len() / placed.design.cells();
    let prepared = Prepared::new(&placed.design, trials, &settings)
        .unwrap()
        .simulated(Simulation {
            draws: FEWER,
            seed: 7,
        });
    move |quantity, interval| {
        let figure = prepared.figure(&placed.cells, &placed.values, quantity, interval);
        figure.unwrap()
    }
}

/// How many fields were near the reference; all must be.
struct Near {
    name: String,
    draws: u32,
    fields: usize,
    far: Vec<String>,
}

impl Near {
    fn new(fixture: &Fixture, block: &str, draws: u32) -> Near {
        Near {
            draws,
            name: format!("{} {block}", fixture.name),
            fields: 0,
            far: Vec::new(),
        }
    }

    fn limits(&mut self, field: &str, figure: &Figure, expected: &Value) {
        assert_eq!(figure.interval, Some(Interval::Generalized), "{field}");
        for (end, found) in [("lower", figure.lower), ("upper", figure.upper)] {
            let wanted = compared(&expected[end]).as_f64().unwrap();
            let error = compared(&expected[format!("{end}_mcse")]).as_f64().unwrap();
            let allowed = 4.0 * error * (1.0 + 2e6 / f64::from(self.draws)).sqrt();
            self.fields += 1;
            let found = found.unwrap_or(f64::NAN);
            let apart = (found - wanted).abs();
            if apart.is_nan() || apart > allowed + 1e-5 * wanted.abs() {
                self.far.push(format!(
                    "{field} {end}: found {found:e}, expected {wanted:e} ± {allowed:e}"
                ));
            }
        }
    }

    fn finish(self, fields_at_least: usize) {
        assert!(
            self.fields >= fields_at_least,
            "{}: {} fields",
            self.name,
            self.fields
        );
        assert!(
            self.far.is_empty(),
            "{}\n{}",
            self.name,
            self.far.join("\n")
        );
    }
}

/// The sums are listed under `gci_linear`, what has one component under `gci`.
fn simulated<'a>(block: &'a Value, field: &str, level: &str) -> Option<&'a Value> {
    ["gci_linear", "gci"]
        .into_iter()
        .find_map(|kind| block["simulated"].get(kind)?.get(field)?.get(level))
}

/// A function of a figure.
type Of = fn(f64) -> f64;

/// Increasing functions of the ratio of part to gauge and of the gauge variance.
const FOLLOWING: &[(&str, Quantity, Of)] = &[
    ("sd.gauge", Quantity::Gauge, f64::sqrt),
    ("share_of_total_variance.part", Quantity::PartToGauge, |r| {
        r / (1.0 + r)
    }),
    ("ndc_untruncated", Quantity::PartToGauge, |r| {
        (2.0 * r).sqrt()
    }),
];

/// Decreasing functions of the ratio of part to gauge.
const FALLING: &[(&str, Of)] = &[
    ("share_of_total_variance.gauge", |r| 1.0 / (1.0 + r)),
    ("share_of_study_variation.gauge", |r| {
        (1.0 / (1.0 + r)).sqrt()
    }),
];

fn under(figure: &Figure, f: Of) -> Figure {
    Figure {
        lower: figure.lower.map(f),
        upper: figure.upper.map(f),
        ..figure.clone()
    }
}

fn swapped(figure: Figure) -> Figure {
    Figure {
        lower: figure.upper,
        upper: figure.lower,
        ..figure
    }
}

fn times(figure: Figure, factor: f64) -> Figure {
    Figure {
        lower: figure.lower.map(|x| x * factor),
        upper: figure.upper.map(|x| x * factor),
        ..figure
    }
}

fn compare(fixture: &Fixture, factors: Factors, choice: Choice, block: &str, at_least: usize) {
    let mut near = Near::new(fixture, block, FEWER);
    let expected = &fixture.expected[block];
    for (confidence, level) in LEVELS {
        let by = by(fixture, factors, choice(settings(confidence, 6.0)));
        let study = fixture.drawn(factors, &settings(confidence, 6.0), 10);
        for (quantity, name) in VARIANCES {
            if let Some(limits) = simulated(expected, &format!("variance.{name}"), level) {
                let figure = by(quantity, Interval::Generalized).unwrap();
                near.limits(name, &figure, limits);
            }
        }
        let ratio = by(Quantity::PartToGauge, Interval::Generalized).unwrap();
        let wanted = simulated(expected, "part_to_gauge_variance_ratio", level).unwrap();
        near.limits("part to gauge", &ratio, wanted);
        let gauge = by(Quantity::Gauge, Interval::Generalized).unwrap();
        for (field, from, rising) in FOLLOWING {
            if let Some(wanted) = simulated(expected, field, level) {
                let from = if *from == Quantity::Gauge {
                    &gauge
                } else {
                    &ratio
                };
                near.limits(field, &under(from, *rising), wanted);
            }
        }
        for (field, falling) in FALLING {
            if let Some(wanted) = simulated(expected, field, level) {
                near.limits(field, &swapped(under(&ratio, *falling)), wanted);
            }
        }
        let total = &study.figures.total;
        let shares =
            (total.share_of_tolerance.estimate).filter(|_| study.tolerance_rule == "two-sided");
        if let Some(per_sd) = shares.map(|share| share / total.sd.estimate.unwrap()) {
            for (quantity, name) in VARIANCES {
                let field = format!("share_of_tolerance_6.{name}");
                if let (Some(figure), Some(wanted)) = (
                    by(quantity, Interval::Generalized),
                    simulated(expected, &field, level),
                ) {
                    near.limits(&field, &times(under(&figure, f64::sqrt), per_sd), wanted);
                }
            }
        }
    }
    near.finish(at_least);
}

#[test]
pub(crate) fn variances_and_their_ratio() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        for fixture in crossed() {
            for (choice, block) in CHOICES {
                compare(&fixture, PART_APPRAISER, choice, block, 24);
            }
        }
        compare(
            &fixture!("edge_one_trial"),
            PART_APPRAISER,
            |s| s,
            "additive",
            24,
        );
        compare(&fixture!("f_nested_3x8x3"), NESTED, |s| s, "model", 24);
        compare(
            &fixture!("c_nist_nested_5x2x5"),
            NIST_NESTED,
            |s| s,
            "model",
            24,
        );
        compare(
            &fixture!("f_three_factor_8x3x2x2"),
            THREE,
            |s| s,
            "model",
            24,
        );
        compare(&fixture!("d_strd_AtmWtAg"), PART_ONLY, |s| s, "model", 20);
        compare(&fixture!("d_strd_SiRstv"), PART_ONLY, |s| s, "model", 20);
    });
}

fn study(fixture: &Fixture, factors: Factors, settings: Settings) -> Study {
    let process = Some(Process::StudyParts);
    fixture.drawn(
        factors,
        &Settings {
            process,
            ..settings
        },
        FEWER,
    )
}

fn risks(near: &mut Near, study: &Study, block: &Value, level: &str) {
    let risk = study.risk.as_ref().unwrap();
    for (name, figure) in [
        ("producer_joint", &risk.producer.joint),
        ("producer_given_good", &risk.producer.given_good),
        ("consumer_joint", &risk.consumer.joint),
        ("consumer_given_bad", &risk.consumer.given_bad),
    ] {
        let expected = simulated(block, &format!("misclassification.{name}"), level).unwrap();
        near.limits(name, figure, expected);
    }
    assert_eq!(study.draws, Some(FEWER));
    assert!(study.seed == Some(7));
}

#[test]
pub(crate) fn risks_of_two_crossed_factors() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        for fixture in crossed() {
            for (choice, block) in CHOICES {
                let mut near = Near::new(&fixture, block, FEWER);
                for (confidence, level) in LEVELS {
                    let study = study(&fixture, PART_APPRAISER, choice(settings(confidence, 6.0)));
                    risks(&mut near, &study, &fixture.expected[block], level);
                }
                near.finish(16);
            }
        }
    });
}

#[test]
pub(crate) fn risks_of_other_designs() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let cases: [(Fixture, Factors, &str); 3] = [
            (fixture!("edge_one_trial"), PART_APPRAISER, "additive"),
            (fixture!("f_nested_3x8x3"), NESTED, "model"),
            (fixture!("c_nist_nested_5x2x5"), NIST_NESTED, "model"),
        ];
        for (fixture, factors, block) in cases {
            let mut near = Near::new(&fixture, block, FEWER);
            for (confidence, level) in LEVELS {
                let study = study(&fixture, factors, settings(confidence, 6.0));
                risks(&mut near, &study, &fixture.expected[block], level);
            }
            near.finish(16);
        }
    });
}

/// The limits of a share of the distance from the study's mean hold the uncertainty of that mean.
#[test]
pub(crate) fn shares_of_the_distance_from_the_study_mean() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let fixture = fixture!("a_aiag_10x3x3", "a_aiag_10x3x3_one_sided");
        for (choice, block) in CHOICES {
            let mut near = Near::new(&fixture, block, DRAWS);
            for (confidence, level) in LEVELS {
                let study = fixture.study(PART_APPRAISER, &choice(settings(confidence, 6.0)));
                let figures = &study.figures;
                for (name, spread) in [
                    ("repeatability", &figures.repeatability),
                    ("reproducibility", &figures.reproducibility),
                    ("gauge", &figures.gauge),
                    ("part", &figures.part),
                    ("total", &figures.total),
                ] {
                    let field = format!("share_of_tolerance_6.{name}");
                    let expected = simulated(&fixture.expected[block], &field, level).unwrap();
                    near.limits(&field, &spread.share_of_tolerance, expected);
                }
                assert_eq!(study.draws, Some(DRAWS));
            }
            near.finish(20);
        }
    });
}

#[test]
pub(crate) fn satterthwaite() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let mut cases: Vec<(Fixture, Factors, Choice, &str)> = Vec::new();
        for (choice, block) in CHOICES {
            cases.extend(crossed().map(|fixture| (fixture, PART_APPRAISER, choice, block)));
        }
        let same: Choice = |s| s;
        cases.push((fixture!("edge_one_trial"), PART_APPRAISER, same, "additive"));
        cases.push((fixture!("f_nested_3x8x3"), NESTED, same, "model"));
        cases.push((fixture!("f_three_factor_8x3x2x2"), THREE, same, "model"));
        for fixture in [
            fixture!("d_strd_AtmWtAg"),
            fixture!("d_strd_SiRstv"),
            fixture!("d_strd_SmLs01"),
        ] {
            cases.push((fixture, PART_ONLY, same, "model"));
        }
        cases.push((fixture!("c_nist_nested_5x2x5"), NIST_NESTED, same, "model"));
        cases.push((
            fixture!("edge_equal_trials"),
            PART_APPRAISER,
            same,
            "with_interaction",
        ));
        for (fixture, factors, choice, block) in cases {
            let mut check = Check::new(&format!("{} {block}", fixture.name), 9.0);
            for (confidence, level) in LEVELS {
                let by = by(&fixture, factors, choice(settings(confidence, 6.0)));
                let expected = &fixture.expected[block]["intervals"][level]["satterthwaite"];
                for (quantity, name) in VARIANCES {
                    let Some(figure) = by(quantity, Interval::Satterthwaite) else {
                        continue;
                    };
                    for (end, found) in [("lower", figure.lower), ("upper", figure.upper)] {
                        check.digits(&format!("{name} {end}"), found, &expected[name][end]);
                    }
                }
                for (spread_sds, shares) in [(6.0, "6"), (5.15, "5.15")] {
                    let total = (fixture
                        .drawn(factors, &settings(confidence, spread_sds), 10)
                        .figures)
                        .total;
                    let (Some(gauge), Some(share)) = (
                        by(Quantity::Gauge, Interval::Satterthwaite),
                        total.share_of_tolerance.estimate,
                    ) else {
                        continue;
                    };
                    let per_sd = share / total.sd.estimate.unwrap();
                    let figure = times(under(&gauge, f64::sqrt), per_sd);
                    let wanted = &expected["gauge_share_of_tolerance"][shares];
                    check.digits("share lower", figure.lower, &wanted["lower"]);
                    check.digits("share upper", figure.upper, &wanted["upper"]);
                }
            }
            check.finish(12);
        }
    });
}
