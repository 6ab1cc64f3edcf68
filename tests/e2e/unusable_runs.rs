//! Runs that a plan cannot use: names that it does not know, and what must stay the same and does not.

use serde_json::{Value, json};

use crate::export::small_study;
use crate::plant::{Design, Plant};
use crate::program::{Service, log, on, status, text};

const DESIGN: Design<'_> = Design {
    parts: 3,
    appraisers: &["KL", "MO", "TS"],
    trials: 2,
};

#[test]
fn unknown_names_are_set_aside() {
    let plant = Plant::new(DESIGN, None);
    let mut runs = small_study(DESIGN.parts, DESIGN.appraisers, DESIGN.trials, 3);
    let wrong = runs
        .iter()
        .position(|r| r.appraiser == "MO")
        .expect("a run of MO");
    runs[wrong].appraiser = "M0".to_owned();
    for run in &runs {
        plant.put_by_rename(&format!("{}.xlsx", run.name()), &run.workbook());
    }
    let mut service = Service::start(&plant);
    let is_laid_out = |s: &Value| s["readings"]["used"] == 34 && s["readings"]["set_aside"] == 2;
    let found = service.wait_until("all runs", is_laid_out);
    let aside = found["set_aside"].as_array().expect("what was set aside");
    assert_eq!(aside.len(), 1, "{aside:#?}");
    assert_eq!(
        aside[0]["reason"],
        "loading `M0` is not in the plan (KL, MO, TS); perhaps MO?"
    );
    let name = format!("{}.xlsx", runs[wrong].name());
    assert_eq!(aside[0]["export"], json!(format!("GRR/{name}")));
    assert_eq!(found["rounds"][0]["state"], "open");
    assert_eq!(found["rounds"][0]["missing"][0]["appraiser"], "MO");

    runs[wrong].appraiser = "MO".to_owned();
    plant.put(&name, &runs[wrong].workbook());
    let status = service.wait_for_round(1, 1);
    assert_eq!(status["readings"]["used"], 36);
    assert_eq!(status["readings"]["set_aside"], 2);
    assert_eq!(
        status["set_aside"],
        json!([]),
        "what the export says now can be used"
    );
    service.stop();
}

#[test]
fn two_programs_hold_the_round() {
    let plant = Plant::new(DESIGN, None);
    let mut runs = small_study(DESIGN.parts, DESIGN.appraisers, DESIGN.trials, 3);
    runs[7].program = "hub rev 13".to_owned();
    for run in &runs {
        plant.put(&format!("{}.csv", run.name()), &run.text());
    }
    let mut service = Service::start(&plant);
    let is_held = |s: &Value| s["rounds"][0]["state"] == "held" && s["readings"]["held"] == 36;
    let found = service.wait_until("the held round", is_held);
    let reason = found["rounds"][0]["reason"].as_str().expect("a reason");
    for word in [
        "program",
        "`hub rev 12` in 17 runs",
        "`hub rev 13` in 1 run",
    ] {
        assert!(reason.contains(word), "{word} is not in: {reason}");
    }
    assert_eq!(status(&plant).and_then(|(code, _)| code), Some(1));
    let said = on(&plant, "status", &[]);
    assert_eq!(said.status.code(), Some(1));
    assert!(text(&said.stdout).contains("waits for a person: program must stay the same"));
    service.stop();
    assert!(
        log(&plant).contains("round waits for a person"),
        "{}",
        log(&plant)
    );
}
