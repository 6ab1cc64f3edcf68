//! The commands: exit codes, JSON keys, sentences.

use std::process::Output;

use serde_json::{Value, json as value};

use crate::export::{Run, small_study};
use crate::plant::{Design, Plant};
use crate::program::{Service, json, on, restudy, text};
use crate::published::{self, TERMS, assert_agrees, line};
use crate::record_keys::{assert_keys, assert_one_off};

const DESIGN: Design<'_> = Design {
    parts: 3,
    appraisers: &["KL", "MO"],
    trials: 2,
};
const DIGITS: i32 = 10;
/// Digits of confidence limits.
const LIMIT_DIGITS: i32 = 8;

#[track_caller]
fn assert_code(output: &Output, code: i32) {
    assert_eq!(
        output.status.code(),
        Some(code),
        "{}{}",
        text(&output.stdout),
        text(&output.stderr)
    );
}

fn first_run() -> Run {
    small_study(1, &["KL"], 1, 3).remove(0)
}

#[test]
fn check_names_every_fault() {
    let plant = Plant::new(DESIGN, None);
    let sound = on(&plant, "check", &[]);
    assert_code(&sound, 0);
    assert_eq!(
        json(&on(&plant, "check", &["--json"]))["faults"],
        value!([])
    );

    let config = fs_err::read_to_string(plant.config()).expect("a configuration");
    let spoilt = config
        .replace("settle  =", "setle  =")
        .replace("watch = 0.10", "watch = 0.40")
        .replace("[\"exports\"]", "[\"nowhere\"]")
        .replace(r"run-(\d+)", r"run-(\d+");
    fs_err::write(plant.config(), spoilt).expect("a configuration");
    let told = on(&plant, "check", &["--json"]);
    assert_code(&told, 2);
    let faults = json(&told)["faults"].as_array().expect("faults").clone();
    for fault in &faults {
        assert_keys(
            fault,
            &["file", "line", "key", "found", "expected", "hint"],
            "fault",
        );
    }
    let all = faults
        .iter()
        .map(ToString::to_string)
        .collect::<Vec<_>>()
        .join("\n");
    for words in ["setle", "watch 0.4", "nowhere", r"run-(\\d+"] {
        assert!(all.contains(words), "{words} is not in:\n{all}");
    }
    let for_people = on(&plant, "check", &[]);
    assert_code(&for_people, 2);
    let said = text(&for_people.stderr);
    for fault in &faults {
        let place = format!("restudy.toml:{}: ", fault["line"]);
        assert!(said.contains(&place), "{place} is not in:\n{said}");
    }
    assert_code(&on(&plant, "serve", &[]), 2);
    assert_code(&restudy(&["check", "--config", "no such file"]), 2);
    assert_code(&restudy(&["check"]), 2);
}

#[test]
fn preview_shows_how_an_export_maps() {
    let plant = Plant::new(DESIGN, None);
    let run = first_run();
    let short = run.text_ending_in("18.o3");
    plant.put("KL run-1.xlsx", &run.workbook());
    plant.put("KL run-2.csv", &short);
    plant.put("KL run-3.xlsx", b"PK\x03\x04 and no workbook");
    let preview = |name: &str| {
        let file = plant.exports().join("GRR").join(name);
        let file = file.to_str().expect("a plain path");
        on(
            &plant,
            "preview",
            &[file, "--instrument", "bridge-1", "--json"],
        )
    };

    let whole = preview("KL run-1.xlsx");
    assert_code(&whole, 0);
    let whole = json(&whole);
    assert_keys(&whole, &["runs", "readings", "set_aside"], "preview");
    let run = value!({
        "part": "HP-01", "appraiser": "KL", "trial": "1", "factors": {},
        "same": { "program": "hub rev 12" }, "taken": "2026-03-02T07:30:00",
    });
    assert_eq!(whole["runs"], value!([run]));
    assert_eq!(whole["set_aside"], value!([]));
    let readings = whole["readings"].as_array().expect("readings");
    assert_eq!(readings.len(), 2);
    let keys = [
        "run",
        "characteristic",
        "value",
        "unit",
        "nominal",
        "lower",
        "upper",
        "origin",
    ];
    for reading in readings {
        assert_keys(reading, &keys, "reading");
        assert_eq!(
            (&reading["run"], &reading["unit"]),
            (&value!(0), &value!("mm"))
        );
    }
    assert_eq!(readings[0]["characteristic"], "bore A");
    assert_agrees(
        &readings[0]["lower"],
        &value!(49.97),
        14,
        "nominal 50 and deviation -0.03",
    );
    assert_agrees(
        &readings[0]["upper"],
        &value!(50.03),
        14,
        "nominal 50 and deviation 0.03",
    );
    assert!(
        readings[0]["origin"]
            .as_str()
            .is_some_and(|o| o.contains("`Results`, cell F7"))
    );

    let short = preview("KL run-2.csv");
    assert_code(&short, 0);
    let short = json(&short);
    let aside = short["set_aside"].as_array().expect("what was set aside");
    assert_eq!((aside.len(), &short["runs"]), (1, &value!([])));
    assert_keys(
        &aside[0],
        &["place", "found", "expected", "hint", "reason"],
        "set aside",
    );
    assert!(
        aside[0]["found"]
            .as_str()
            .is_some_and(|found| found.contains("18.o3"))
    );

    let refused = preview("KL run-3.xlsx");
    assert_code(&refused, 1);
    let refused = json(&refused);
    assert_keys(&refused, &["refused"], "refused");
    assert!(
        refused["refused"]
            .as_str()
            .is_some_and(|sentence| sentence.contains("workbook"))
    );

    let nobody = on(&plant, "preview", &["x.csv", "--instrument", "bridge-9"]);
    assert_code(&nobody, 2);
    assert!(
        text(&nobody.stderr).contains("bridge-1"),
        "{}",
        text(&nobody.stderr)
    );
}

fn analyse(name: &str, further: &[&str]) -> Output {
    let file = published::path(&format!("{name}.csv"));
    let line = ["analyse", file.to_str().expect("a plain path"), "--json"];
    restudy(&[&line, further].concat())
}

#[test]
fn analyse_gives_the_published_values() {
    for (name, lower, upper) in [("a_aiag_10x3x3", "-4", "4"), ("b_mr_20x3x2", "18", "58")] {
        let values = published::values(name);
        let output = analyse(name, &["--lower", lower, "--upper", upper, "--unit", "mm"]);
        assert_code(&output, 0);
        let records = json(&output);
        assert_eq!(records.as_array().map(Vec::len), Some(1));
        let record = &records[0];
        assert_one_off(record);
        for (term, published) in TERMS {
            let what = format!("{name}, {term}");
            let (line, published) = (line(record, term), &values["anova"][published]);
            for key in ["ss", "df", "ms"] {
                assert_agrees(&line[key], &published[key], DIGITS, &what);
            }
            if term != "within cells" {
                assert_agrees(&line["f"], &published["f"], DIGITS, &what);
                assert_agrees(&line["p"], &published["p"], DIGITS, &what);
            }
        }
        let kept = &values["with_interaction"];
        let limits = &kept["intervals"]["0.95"]["mls"];
        for figure in ["repeatability", "reproducibility", "gauge", "part", "total"] {
            let (found, what) = (&record["figures"][figure], format!("{name}, {figure}"));
            let estimates = &kept["estimates"];
            let agrees =
                |found: &Value, published: &Value| assert_agrees(found, published, DIGITS, &what);
            agrees(
                &found["variance"]["estimate"],
                &estimates["variance"][figure]["truncated"],
            );
            agrees(&found["sd"]["estimate"], &estimates["sd"][figure]);
            let shares = [
                ("share_of_tolerance", &estimates["share_of_tolerance"]["6"]),
                ("share_of_tv", &estimates["share_of_study_variation"]),
            ];
            for (key, published) in shares {
                if !found[key]["estimate"].is_null() {
                    agrees(&found[key]["estimate"], &published[figure]);
                }
            }
            for side in ["lower", "upper"] {
                assert_agrees(
                    &found["variance"][side],
                    &limits[figure][side],
                    LIMIT_DIGITS,
                    &what,
                );
            }
        }
        let share = &record["figures"]["gauge"]["share_of_tolerance"];
        agrees_both(share, &limits["gauge_share_of_tolerance"]["6"], name);
        let ndc = &kept["estimates"]["ndc"];
        assert_eq!(record["ndc"]["whole"], ndc["handbook_1_41_floor"], "{name}");
        assert_agrees(
            &record["ndc"]["estimate"],
            &ndc["sqrt2_untruncated"],
            DIGITS,
            name,
        );
        assert_eq!(record["unit"], "mm");
    }
}

fn agrees_both(found: &Value, published: &Value, what: &str) {
    for side in ["lower", "upper"] {
        assert_agrees(&found[side], &published[side], LIMIT_DIGITS, what);
    }
}

#[test]
fn analyse_says_what_a_smaller_design_allows() {
    let one_trial = analyse("edge_one_trial", &["--lower", "-4", "--upper", "4"]);
    assert_code(&one_trial, 0);
    let record = json(&one_trial)[0].clone();
    assert_one_off(&record);
    assert_eq!(
        (&record["design"]["trials"], &record["design"]["readings"]),
        (&value!(1), &value!(30))
    );

    let place = tempfile::tempdir().expect("a temporary folder");
    let write = |name: &str, readings: &dyn Fn(&published::Reading) -> bool| {
        let mut text = "Part;Appraiser;Trial;Value\n".to_owned();
        for r in published::readings("a_aiag_10x3x3")
            .iter()
            .filter(|r| readings(r))
        {
            text.push_str(&format!(
                "{};{};{};{}\n",
                r.part, r.appraiser, r.trial, r.value
            ));
        }
        let path = place.path().join(name);
        fs_err::write(&path, text).expect("a file can be written");
        path.to_str().expect("a plain path").to_owned()
    };
    let one = restudy(&[
        "analyse",
        &write("one.csv", &|r| r.appraiser == "B"),
        "--json",
    ]);
    assert_code(&one, 0);
    let record = json(&one)[0].clone();
    assert_one_off(&record);
    let names: Vec<&Value> = record["design"]["factors"]
        .as_array()
        .expect("factors")
        .iter()
        .map(|f| &f["name"])
        .collect();
    assert_eq!(names, ["part"]);
    let share = &record["figures"]["gauge"]["share_of_tolerance"];
    assert!(
        share["estimate"].is_null() && share["why"].is_string(),
        "{share}"
    );

    let missing = |r: &published::Reading| (r.part, r.appraiser.as_str(), r.trial) != (4, "C", 2);
    let unequal = restudy(&["analyse", &write("unequal.csv", &missing), "--json"]);
    assert_code(&unequal, 0);
    let record = &json(&unequal)[0];
    assert_eq!(record["method"], "reml");
    assert_eq!(record["design"]["missing"], 1);
    assert_eq!(record["design"]["balanced"], false);
    assert_eq!(record["mean_squares"], value!([]));
    let gauge = &record["figures"]["gauge"]["variance"];
    assert!(gauge["estimate"].is_f64(), "{gauge}");
}

#[test]
fn without_a_ledger_there_is_nothing_to_show() {
    let plant = Plant::new(DESIGN, None);
    let says_so = || {
        for command in ["status", "results"] {
            let output = on(&plant, command, &[]);
            assert_code(&output, 3);
            let said = text(&output.stderr);
            assert!(said.contains("there is no ledger at"), "{said}");
        }
    };
    says_so();
    // A service that has only just started: the file is there, its tables are not.
    fs_err::create_dir_all(plant.state()).expect("a state folder");
    let ledger = restudy::ledger::Ledger::path(&plant.state());
    fs_err::write(ledger, b"").expect("an empty ledger");
    says_so();
}

#[test]
fn a_second_service_is_refused() {
    let plant = Plant::new(DESIGN, None);
    let mut first = Service::start(&plant);
    first.wait_until("the first one's ledger", |_| true);
    let second = on(&plant, "serve", &[]);
    assert_code(&second, 3);
    let said = text(&second.stderr);
    assert!(said.contains("another service is running on"), "{said}");
    first.stop();
}

#[test]
fn results_as_a_table_for_spreadsheets() {
    let plant = Plant::new(DESIGN, None);
    for run in small_study(DESIGN.parts, DESIGN.appraisers, DESIGN.trials, 3) {
        plant.put(&format!("{}.csv", run.name()), &run.text());
    }
    let mut service = Service::start(&plant);
    service.wait_for_round(1, 1);
    let output = on(&plant, "results", &["--csv"]);
    assert_code(&output, 0);
    let table = text(&output.stdout);
    let rows: Vec<Vec<&str>> = table
        .lines()
        .map(|line| line.split(',').collect())
        .collect();
    assert_eq!(rows.len(), 3, "{table}");
    assert_eq!(
        rows[0][..6],
        [
            "plan",
            "round",
            "revision",
            "closed",
            "characteristic",
            "standing"
        ]
    );
    assert!(rows.iter().all(|row| row.len() == rows[0].len()), "{table}");
    assert_eq!(
        [rows[1][0], rows[1][1], rows[1][4]],
        ["impeller hub", "1", "bore A"]
    );
    assert_eq!(rows[2][4], "height B");
    assert_code(&on(&plant, "results", &["--plan", "no such plan"]), 2);
    service.stop();
}
