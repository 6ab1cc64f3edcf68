//! Whole exports read by rules of the configuration: `fixtures/exports/tables`.
//!
//! Beside each rule `NAME.toml` stand the exports `NAME.csv` and `NAME.xlsx` that one writer was told to
//! write, and in `NAME.txt` what it was told, or the sentence that is expected.

mod common;

use std::fmt::Write as _;
use std::fs;
use std::path::{Path, PathBuf};

use restudy_config::read;
use restudy_parsers::{Export, Parsed, Refused, Rule};

use common::{Memory, shown};

/// A configuration of one instrument with the rule, and a plan that fits every rule of the folder.
fn rule(name: &str, text: &str) -> Rule {
    let whole = format!(
        "[site]\nname = \"Halden Pump Works\"\nzone = \"Europe/Oslo\"\n[state]\nfolder = \"/state\"\n\
         [[instrument]]\nname = \"bridge-1\"\nfolders = [\"/exports\"]\nfiles = [\"*.csv\", \"*.xlsx\"]\nsettle = \"2s\"\n\
         [instrument.read]\n{text}\n\
         [[plan]]\nname = \"hub\"\ninstruments = [\"bridge-1\"]\nparts = 3\nappraisers = [\"KL\", \"MO\"]\ntrials = 2\n\
         interaction = \"keep\"\n[plan.limits]\nwatch = 0.1\nact = 0.3\n"
    );
    let disk = Memory::with_folders(&["/state", "/exports"]);
    match read(&whole, name, Path::new("/etc/restudy"), &disk) {
        Ok((config, _)) => config.instruments.into_iter().next().unwrap().rule,
        Err(faults) => panic!("{name}: {}", shown(&faults)),
    }
}

/// The readings in alphabetical order, then what was set aside, a line each; or the refusal.
fn told(outcome: &Result<Parsed, Refused>) -> String {
    let hinted = |hint: &Option<String>| match hint {
        Some(hint) => format!("; hint: {hint}"),
        None => String::new(),
    };
    let parsed = match outcome {
        Ok(parsed) => parsed,
        Err(refused) => return format!("refused: {}{}\n", refused.sentence, hinted(&refused.hint)),
    };
    let mut lines: Vec<String> = Vec::new();
    for reading in &parsed.readings {
        let run = &parsed.runs[reading.run];
        let mut line = format!(
            "{} | {} | {} | {}: {:?}",
            run.part,
            run.appraiser.as_deref().unwrap_or("-"),
            run.trial.as_deref().unwrap_or("-"),
            reading.characteristic,
            reading.value
        );
        if let Some(unit) = &reading.unit {
            write!(line, " {unit}").unwrap();
        }
        let bounds = [reading.lower, reading.nominal, reading.upper];
        if bounds.iter().any(Option::is_some) {
            let shown = bounds.map(|b| b.map_or("-".to_owned(), |b| b.to_string()));
            write!(line, " [{}]", shown.join(" ")).unwrap();
        }
        lines.push(line);
    }
    lines.sort();
    for aside in &parsed.set_aside {
        lines.push(format!(
            "set aside ({}): {}; expected {}{}",
            aside.readings,
            aside.reason,
            aside.expected,
            hinted(&aside.hint)
        ));
    }
    lines.join("\n") + "\n"
}

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../fixtures/exports/tables")
}

#[test]
fn every_export_gives_what_its_writer_was_told() {
    let mut names: Vec<PathBuf> = fs::read_dir(folder())
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|ending| ending == "toml"))
        .collect();
    names.sort();
    let mut differ = String::new();
    let mut exports = 0;
    for rule_path in names {
        let name = rule_path.file_stem().unwrap().to_str().unwrap().to_owned();
        let rule = rule(&name, &fs::read_to_string(&rule_path).unwrap());
        let expected = fs::read_to_string(rule_path.with_extension("txt")).unwrap();
        for ending in ["csv", "xlsx"] {
            let path = rule_path.with_extension(ending);
            let Ok(bytes) = fs::read(&path) else { continue };
            exports += 1;
            let outcome = restudy_parsers::read(
                Export {
                    path: path.file_name().unwrap().to_str().unwrap(),
                    bytes: &bytes,
                },
                &rule,
            );
            let told = told(&outcome);
            if told != expected {
                write!(
                    differ,
                    "\n{name}.{ending} told:\n{told}expected:\n{expected}"
                )
                .unwrap();
            }
        }
    }
    assert_eq!(differ, "");
    assert_eq!(exports, 31);
}

#[test]
fn a_rule_survives_the_way_to_the_child_process() {
    for entry in fs::read_dir(folder()).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_some_and(|ending| ending == "toml") {
            let rule = rule("restudy.toml", &fs::read_to_string(&path).unwrap());
            let text = serde_json::to_string(&rule).unwrap();
            assert_eq!(serde_json::from_str::<Rule>(&text).unwrap(), rule);
        }
    }
}
