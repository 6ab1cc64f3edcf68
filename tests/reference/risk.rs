//! Misclassification against 30-digit quadrature: at least nine digits.

use std::sync::Once;

use restudy_engine::risk::{Judged, Misclassification, guarded, misclassification};
use restudy_engine::{Figure, Process, Settings};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{Fixture, PART_APPRAISER, fixture, pooling, settings, values};

const DIGITS: f64 = 9.0;

fn number(value: &Value) -> Option<f64> {
    match compared(value) {
        Value::String(text) => Some(text.parse().unwrap()),
        _ => value.as_f64(),
    }
}

fn judged(point: &Value) -> Judged {
    let required = |key: &str| number(&point[key]).unwrap();
    Judged {
        mean: required("mean"),
        part_sd: required("part_variance").sqrt(),
        gauge_sd: required("gauge_variance").sqrt(),
        lower: number(&point["lower"]),
        upper: number(&point["upper"]),
    }
}

fn by_name(risks: &Misclassification) -> [(&'static str, Option<f64>); 8] {
    [
        ("bad_part", Some(risks.bad)),
        ("accepted", Some(risks.accepted)),
        ("producer_joint", Some(risks.producer_joint)),
        ("producer_given_good", risks.producer_given_good),
        ("producer_given_rejected", risks.producer_given_rejected),
        ("consumer_joint", Some(risks.consumer_joint)),
        ("consumer_given_bad", risks.consumer_given_bad),
        ("consumer_given_accepted", risks.consumer_given_accepted),
    ]
}

#[test]
pub(crate) fn points_from_easy_to_far_out() {
    let constants = values!("constants");
    let points = constants["misclassification"].as_array().unwrap();
    let mut check = Check::new("misclassification", DIGITS);
    for (i, point) in points.iter().enumerate() {
        let risks = misclassification(&judged(point)).unwrap();
        for (name, found) in by_name(&risks) {
            if let Some(expected) = point.get(name) {
                check.digits(&format!("point {i} {name}"), found, expected);
            }
        }
    }
    check.finish(8 * points.len().min(8));
}

#[test]
pub(crate) fn guard_bands() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        let table = values!("guard_bands");
        let mut check = Check::new("guard bands", DIGITS);
        for (i, point) in table["points"].as_array().unwrap().iter().enumerate() {
            let wanted = number(&point["wanted"]).unwrap();
            let found = guarded(&judged(point), wanted).unwrap();
            for (name, found) in [
                ("guard", found.guard),
                ("consumer_joint", found.consumer_joint),
                ("producer_joint", found.producer_joint),
                ("accepted", found.accepted),
            ] {
                check.digits(&format!("point {i} {name}"), Some(found), &point[name]);
            }
        }
        check.finish(24);
    });
}

fn estimates(fixture: &Fixture, factors: &[(&str, &[&str])], settings: Settings, block: &str) {
    let process = Some(Process::StudyParts);
    let study = fixture.drawn(
        factors,
        &Settings {
            process,
            ..settings
        },
        100,
    );
    let risk = study.risk.unwrap();
    assert_eq!(risk.process.from, "study parts");
    let expected = &fixture.expected[block]["estimates"]["misclassification"];
    let mut check = Check::new(&format!("{} {block}", fixture.name), DIGITS);
    let figures: [(&str, &Figure); 8] = [
        ("bad_part", &risk.bad),
        ("accepted", &risk.accepted),
        ("producer_joint", &risk.producer.joint),
        ("producer_given_good", &risk.producer.given_good),
        ("producer_given_rejected", &risk.producer.given_rejected),
        ("consumer_joint", &risk.consumer.joint),
        ("consumer_given_bad", &risk.consumer.given_bad),
        ("consumer_given_accepted", &risk.consumer.given_accepted),
    ];
    for (name, figure) in figures {
        check.digits(name, figure.estimate, &expected[name]);
    }
    check.finish(8);
}

#[test]
pub(crate) fn every_data_set_with_a_tolerance() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        for fixture in [
            fixture!("a_aiag_10x3x3"),
            fixture!("a_aiag_10x3x3", "a_aiag_10x3x3_one_sided"),
            fixture!("b_mr_20x3x2"),
            fixture!("c_nist_crossed_5x2x5"),
            fixture!("g_aiag_within_times_1_5"),
            fixture!("edge_two_appraisers"),
            fixture!("edge_equal_trials"),
        ] {
            estimates(
                &fixture,
                PART_APPRAISER,
                settings(0.95, 6.0),
                "with_interaction",
            );
            if fixture.name != "edge_equal_trials" {
                estimates(
                    &fixture,
                    PART_APPRAISER,
                    pooling(settings(0.95, 6.0)),
                    "pooled",
                );
            }
        }
        let one_trial = fixture!("edge_one_trial");
        estimates(&one_trial, PART_APPRAISER, settings(0.95, 6.0), "additive");
        let nested: &[(&str, &[&str])] = &[("appraiser", &[]), ("part", &["appraiser"])];
        estimates(
            &fixture!("f_nested_3x8x3"),
            nested,
            settings(0.95, 6.0),
            "model",
        );
        let nist: &[(&str, &[&str])] = &[("part", &[]), ("appraiser", &["part"])];
        estimates(
            &fixture!("c_nist_nested_5x2x5"),
            nist,
            settings(0.95, 6.0),
            "model",
        );
        let three: &[(&str, &[&str])] = &[("part", &[]), ("appraiser", &[]), ("fixture", &[])];
        estimates(
            &fixture!("f_three_factor_8x3x2x2"),
            three,
            settings(0.95, 6.0),
            "model",
        );
    });
}
