//! Whole exports read by rules of the configuration: `fixtures/exports/tables`.
//!
//! Beside each rule `NAME.toml` stand the exports `NAME.csv` and `NAME.xlsx` that one writer was told to
//! write, and in `NAME.txt` what it was told, or the sentence that is expected.

mod common;

use std::path::Path;

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
        Ok((config, _)) => config.instruments[0].rule.clone(),
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
            line += &format!(" {unit}");
        }
        let bounds = [reading.lower, reading.nominal, reading.upper];
        if bounds.iter().any(Option::is_some) {
            let shown = bounds.map(|b| b.map_or("-".to_owned(), |b| b.to_string()));
            line += &format!(" [{}]", shown.join(" "));
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

/// A rule, what it should read, and the exports that it reads.
struct Case {
    name: &'static str,
    rule: &'static str,
    expected: &'static str,
    exports: &'static [(&'static str, &'static [u8])],
}

macro_rules! cases {
    ($($name:literal: $($ending:literal)+;)+) => {
        [$(Case {
            name: $name,
            rule: include_str!(concat!("../../fixtures/exports/tables/", $name, ".toml")),
            expected: include_str!(concat!("../../fixtures/exports/tables/", $name, ".txt")),
            exports: &[$((
                concat!($name, ".", $ending),
                include_bytes!(concat!("../../fixtures/exports/tables/", $name, ".", $ending)),
            )),+],
        }),+]
    };
}

const CASES: [Case; 22] = cases! {
    "a-filter-on-nothing": "csv";
    "all-left-out": "csv";
    "below-labels": "csv" "xlsx";
    "blocks": "csv" "xlsx";
    "broken-off": "csv";
    "characteristics-across": "csv" "xlsx";
    "crosstab": "csv" "xlsx";
    "every-sheet": "xlsx";
    "first-reading-as-heading": "csv";
    "flawed-rows": "csv";
    "lost-label": "csv";
    "no-heading-matches": "csv";
    "no-headings": "csv" "xlsx";
    "no-such-heading": "csv";
    "no-such-row": "csv";
    "page-units": "csv" "xlsx";
    "pages": "csv" "xlsx";
    "sheet-a-characteristic": "xlsx";
    "text-has-no-sheet": "csv";
    "too-many-rows": "csv";
    "trials-across": "csv" "xlsx";
    "two-rows-of-headings": "csv" "xlsx";
};

#[test]
fn every_export_gives_what_its_writer_was_told() {
    let mut differ = String::new();
    for case in CASES {
        let rule = rule(case.name, case.rule);
        for (path, bytes) in case.exports {
            let told = told(&restudy_parsers::read(Export { path, bytes }, &rule));
            if told != case.expected {
                differ += &format!("\n{path} told:\n{told}expected:\n{}", case.expected);
            }
        }
    }
    assert_eq!(differ, "");
}

#[test]
fn a_rule_survives_the_way_to_the_child_process() {
    for case in CASES {
        let rule = rule(case.name, case.rule);
        let text = serde_json::to_string(&rule).unwrap();
        assert_eq!(serde_json::from_str::<Rule>(&text).unwrap(), rule);
    }
}
