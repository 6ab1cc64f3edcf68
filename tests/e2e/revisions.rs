//! What comes after a round is complete: corrected values, copies, surplus runs, the next round.

use serde_json::{Value, json};

use crate::export::{Run, small_study, time_of};
use crate::plant::{Design, Plant};
use crate::program::{Service, log, record, records};

const DESIGN: Design<'_> = Design {
    parts: 5,
    appraisers: &["KL", "MO"],
    trials: 2,
};
/// Readings of the round: 5 × 2 × 2 runs of two features.
const READINGS: i64 = 40;

fn put(plant: &Plant, run: &Run) {
    plant.put(&format!("{}.csv", run.name()), &run.text());
}

fn count(status: &Value, place: &str) -> i64 {
    status["readings"][place].as_i64().expect("a count")
}

#[test]
fn a_changed_value_makes_a_revision() {
    let plant = Plant::new(DESIGN, None);
    let mut service = Service::start(&plant);
    let runs = small_study(DESIGN.parts, DESIGN.appraisers, DESIGN.trials, 3);
    // A third trial of a cell that wants two, taken before the last planned run.
    let third = Run {
        trial: 3,
        taken: time_of(3, 17),
        ..runs[0].clone()
    };
    put(&plant, &third);
    for run in &runs[..19] {
        put(&plant, run);
    }
    let missing = json!([{
        "part": "HP-05", "appraiser": "MO", "factors": {}, "trials": [2], "characteristics": [],
    }]);
    let status = service.wait_until("all but one run", |s| s["rounds"][0]["missing"] == missing);
    assert_eq!(status["rounds"][0]["state"], "open");
    put(&plant, &runs[19]);
    let status = service.wait_for_round(1, 1);
    assert_eq!(
        (count(&status, "used"), count(&status, "surplus")),
        (READINGS, 2)
    );
    let before = record(&plant, "bore A");
    assert_eq!(before["standing"]["now"], "watch");
    assert_eq!(log(&plant).matches("WATCH:").count(), 1, "{}", log(&plant));

    plant.put(&format!("copy of {}.csv", runs[4].name()), &runs[4].text());
    let status = service.wait_until("the copy", |s| count(s, "copy") == 2);
    assert_eq!(status["rounds"][0]["revision"], 1);
    assert_eq!(count(&status, "used"), READINGS);

    let mut corrected = runs[4].clone();
    corrected.features[0].value += 0.02;
    put(&plant, &corrected);
    let status = service.wait_for_round(1, 2);
    assert_eq!(count(&status, "used"), READINGS);
    assert_eq!(count(&status, "superseded"), 1);
    let after = record(&plant, "bore A");
    assert_eq!(
        (&after["round"], &after["revision"]),
        (&json!(1), &json!(2))
    );
    assert_eq!(after["readings"]["superseded"], 1);
    let share = |r: &Value| r["figures"]["gauge"]["share_of_tolerance"]["estimate"].as_f64();
    assert!(
        share(&after) > share(&before),
        "{:?} and {:?}",
        share(&before),
        share(&after)
    );
    assert_eq!(
        log(&plant).matches("CORRECTED:").count(),
        1,
        "{}",
        log(&plant)
    );

    let next = Run {
        trial: 1,
        taken: time_of(6, 0),
        ..runs[0].clone()
    };
    plant.put(&format!("June {}.csv", next.name()), &next.text());
    let status = service.wait_until("the next round", |s| s["rounds"][1].is_object());
    assert_eq!(status["rounds"][1]["state"], "pending");
    assert_eq!(status["rounds"][0]["revision"], 2);

    let late = Run {
        trial: 1,
        taken: time_of(2, 0),
        ..runs[0].clone()
    };
    plant.put(&format!("February {}.csv", late.name()), &late.text());
    let status = service.wait_until("the late run", |s| count(s, "late") == 2);
    assert_eq!(status["rounds"][0]["revision"], 2);
    assert_eq!(records(&plant).len(), 2);
    service.stop();
}
