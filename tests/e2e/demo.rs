//! The demo ends by itself, and leaves a plant that the service can go on with.

use std::path::{Path, PathBuf};

use crate::plant::Plant;
use crate::program::{Service, records, restudy, status, text};

/// Two rounds of 10 × 3 × 3 runs of four characteristics.
const READINGS: i64 = 720;

fn files_below(folder: &Path) -> Vec<PathBuf> {
    let mut files = Vec::new();
    for entry in fs_err::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            files.extend(files_below(&path))
        } else {
            files.push(path)
        }
    }
    files.sort();
    files
}

#[test]
fn the_demo_leaves_a_plant_to_go_on_with() {
    let place = tempfile::tempdir().expect("a temporary folder");
    let folder = place.path().join("halden");
    let folder_text = folder.to_str().expect("a plain path");
    let demo = restudy(&["demo", "--keep", folder_text]);
    let said = text(&demo.stdout);
    assert_eq!(demo.status.code(), Some(0), "{said}{}", text(&demo.stderr));
    for words in [
        "Halden Pump Works",
        "impeller hub",
        "bore A",
        "Subject: ",
        "Reports: ",
        "restudy serve --config",
    ] {
        assert!(said.contains(words), "{words} is not in:\n{said}");
    }
    let names: Vec<String> = files_below(&folder)
        .iter()
        .filter_map(|path| Some(path.file_name()?.to_str()?.to_owned()))
        .collect();
    for name in [
        "round-0001.html",
        "round-0001.json",
        "round-0002.html",
        "round-0002.json",
        "alert-round-2.eml",
    ] {
        assert!(
            names.iter().any(|n| n == name),
            "{name} is not in {names:?}"
        );
    }

    let plant = Plant::kept(folder);
    let (code, left) = status(&plant).expect("a ledger");
    assert_eq!(code, Some(0));
    assert_eq!(left["readings"]["used"], READINGS);
    let mut service = Service::start(&plant);
    let found = service.wait_for_round(2, 1);
    assert_eq!(found["rounds"].as_array().map(Vec::len), Some(2));
    assert_eq!(found["readings"]["used"], READINGS);
    service.stop();

    let records = records(&plant);
    let at = |round: i64, standing: &str| {
        records
            .iter()
            .filter(|r| r["round"] == round && r["standing"]["now"] == standing)
            .count()
    };
    assert_eq!(records.len(), 8);
    assert_eq!(at(1, "act"), 0);
    assert!(at(2, "act") > 0, "the second round is worse");
}
