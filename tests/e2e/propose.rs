//! `propose`: what a general-purpose writer was told to write comes back by the draft, through `check` and `preview`.

use std::path::PathBuf;

use serde_json::Value;
use tempfile::TempDir;

use crate::program::{json, restudy, text};

/// As `fixtures/exports/propose/write.py` was told: two parts, two appraisers, two trials.
const VALUES: [f64; 8] = [
    50.012, 50.015, 50.011, 50.018, 49.987, 49.981, 49.989, 49.984,
];

/// Samples in a folder of their own, and the draft that was made from them.
struct Proposed {
    folder: TempDir,
    files: Vec<PathBuf>,
    code: Option<i32>,
    draft: String,
}

impl Proposed {
    fn from(names: &[&str]) -> Self {
        let folder = tempfile::tempdir().expect("a folder");
        let exports = folder.path().join("exports");
        fs_err::create_dir(&exports).expect("a folder");
        let fixtures =
            PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../fixtures/exports/propose");
        let files: Vec<PathBuf> = names.iter().map(|name| exports.join(name)).collect();
        for (name, file) in names.iter().zip(&files) {
            fs_err::copy(fixtures.join(name), file).expect("a fixture");
        }
        let output = restudy(&Self::line("propose", &files));
        Self {
            folder,
            files,
            code: output.status.code(),
            draft: text(&output.stdout),
        }
    }

    fn line(command: &str, files: &[PathBuf]) -> Vec<String> {
        let files = files.iter().map(|file| file.display().to_string());
        std::iter::once(command.to_owned()).chain(files).collect()
    }

    /// The value that the draft gives a key, without its comment.
    #[track_caller]
    fn key(&self, key: &str) -> &str {
        let line = self.draft.lines().find(|line| {
            line.split_once('=')
                .is_some_and(|(name, _)| name.trim() == key)
        });
        let line = line.unwrap_or_else(|| panic!("no {key} in\n{}", self.draft));
        let (_, rest) = line.split_once('=').expect("a value");
        rest.split(" # ").next().unwrap_or(rest).trim()
    }

    /// What the comment at a key says.
    #[track_caller]
    fn note(&self, key: &str) -> &str {
        let line = self.draft.lines().find(|line| {
            let line = line.trim_start_matches("# ");
            line.split_once('=')
                .is_some_and(|(name, _)| name.trim() == key)
        });
        let line = line.unwrap_or_else(|| panic!("no {key} in\n{}", self.draft));
        line.rsplit_once(" # ").map_or("", |(_, note)| note)
    }

    /// `check` finds a configuration around the draft sound; `preview` reads every sample by it.
    #[track_caller]
    fn previews(&self) -> Vec<Value> {
        assert_eq!(self.code, Some(0), "{}", self.draft);
        let config = self.folder.path().join("restudy.toml");
        let around = format!(
            "site = {{ name = \"Halden Pump Works\", zone = \"Europe/Oslo\" }}\nstate = {{ folder = \"state\" }}\n{}\n\
             [[plan]]\nname = \"hub\"\ninstruments = [\"new-instrument\"]\nparts = 2\nappraisers = 2\ntrials = 2\n\
             interaction = \"keep\"\nlimits = {{ watch = 0.1, act = 0.3 }}\n",
            self.draft
        );
        fs_err::write(&config, &around).expect("a configuration");
        let config = config.display().to_string();
        let checked = restudy(&["check", "--config", &config]);
        assert_eq!(
            checked.status.code(),
            Some(0),
            "{around}\n{}",
            text(&checked.stderr)
        );
        let files = self.files.iter().map(|file| {
            let file = file.display().to_string();
            let line = [
                "preview",
                &file,
                "--config",
                &config,
                "--instrument",
                "new-instrument",
                "--json",
            ];
            let output = restudy(&line);
            assert_eq!(output.status.code(), Some(0), "{}", text(&output.stdout));
            json(&output)
        });
        files.collect()
    }
}

/// The study comes back as it was written: runs in order, values, nominal, absolute limits, stamps.
#[track_caller]
fn assert_whole_study(preview: &Value, feature: &str) {
    assert_eq!(preview["set_aside"], serde_json::json!([]));
    let runs = preview["runs"].as_array().expect("runs");
    let labels: Vec<String> = runs
        .iter()
        .map(|run| {
            format!("{} {} {}", run["part"], run["appraiser"], run["trial"]).replace('"', "")
        })
        .collect();
    assert_eq!(
        labels,
        [
            "HP-1 KL 1",
            "HP-1 KL 2",
            "HP-1 MO 1",
            "HP-1 MO 2",
            "HP-2 KL 1",
            "HP-2 KL 2",
            "HP-2 MO 1",
            "HP-2 MO 2",
        ]
    );
    let minutes: Vec<&str> = runs
        .iter()
        .map(|run| {
            run["taken"]
                .as_str()
                .expect("a stamp")
                .get(11..16)
                .expect("a time")
        })
        .collect();
    assert_eq!(minutes[7], "14:07");
    let readings: Vec<&Value> = preview["readings"]
        .as_array()
        .expect("readings")
        .iter()
        .filter(|reading| reading["characteristic"] == feature)
        .collect();
    let values: Vec<f64> = readings
        .iter()
        .filter_map(|r| r["value"].as_f64())
        .collect();
    assert_eq!(values, VALUES);
    for reading in readings {
        let number = |key: &str| reading[key].as_f64();
        assert_eq!(
            (number("nominal"), number("lower"), number("upper")),
            (Some(50.0), Some(49.95), Some(50.05)),
            "{reading}"
        );
    }
}

#[test]
fn exports_in_nine_languages_come_back_by_their_drafts() {
    for (file, delimiter, decimal, part, from_nominal) in [
        ("english.csv", "\",\"", "\".\"", "Serial no.", true),
        ("german.csv", "\";\"", "\",\"", "Werkstück-Nr.", true),
        ("french.csv", "\";\"", "\",\"", "N° de pièce", false),
        ("spanish.csv", "\";\"", "\",\"", "Nº de pieza", false),
        ("italian.csv", "\"\\t\"", "\",\"", "Matricola", true),
        ("czech.csv", "\";\"", "\",\"", "Číslo dílu", false),
        ("polish.csv", "\";\"", "\",\"", "Nr detalu", true),
        ("japanese.csv", "\",\"", "\".\"", "部品番号", true),
        ("chinese.csv", "\",\"", "\".\"", "零件编号", true),
    ] {
        let proposed = Proposed::from(&[file]);
        assert_eq!(proposed.key("delimiter"), delimiter, "{file}");
        assert_eq!(proposed.key("decimal"), decimal, "{file}");
        assert_eq!(
            proposed.key("part"),
            format!("{{ column = \"{part}\" }}"),
            "{file}"
        );
        for limit in ["lower", "upper"] {
            let relative = proposed.key(limit).contains("from = \"nominal\"");
            assert_eq!(relative, from_nominal, "{file} {limit}");
        }
        assert!(
            proposed.note("part").ends_with("seen in 1 of 1 file"),
            "{file}"
        );
        assert_whole_study(&proposed.previews()[0], "bore A");
    }
}

#[test]
fn an_encoding_that_was_tried_is_a_line_to_check() {
    for (file, encoding) in [
        ("german.csv", "\"windows-1252\""),
        ("czech.csv", "\"windows-1250\""),
        ("japanese.csv", "\"shift_jis\""),
        ("chinese.csv", "\"gb18030\""),
    ] {
        let proposed = Proposed::from(&[file]);
        assert_eq!(proposed.key("encoding"), encoding);
        assert!(proposed.note("encoding").starts_with("check: "), "{file}");
    }
    let marked = Proposed::from(&["polish.csv"]);
    assert!(!marked.draft.contains("encoding"), "{}", marked.draft);
}

#[test]
fn day_and_month_that_can_be_exchanged_are_said_to_be() {
    let open = Proposed::from(&["spanish.csv"]);
    assert!(
        open.note("taken")
            .contains("%m/%d/%Y %H:%M fits all stamps as well")
    );
    let sure = Proposed::from(&["french.csv"]);
    assert_eq!(
        sure.key("taken"),
        "{ column = \"Horodatage\", format = \"%d/%m/%Y %H:%M:%S\" }"
    );
    assert_eq!(sure.note("taken"), "seen in 1 of 1 file");
}

#[test]
fn a_workbook_is_read_in_its_sheet_below_its_title() {
    let proposed = Proposed::from(&["german.xlsx"]);
    assert_eq!(proposed.key("sheet"), "\"Ergebnisse\"");
    assert_eq!(proposed.key("header"), "{ find = \"Messwert\" }");
    assert!(proposed.note("value").contains("no unit was seen"));
    assert_whole_study(&proposed.previews()[0], "Bohrung A");
}

#[test]
fn xml_is_read_by_the_element_that_repeats() {
    let proposed = Proposed::from(&["runs.xml"]);
    assert_eq!(proposed.key("each"), "\"/export/run/feature\"");
    assert_eq!(proposed.key("part"), "{ xml = \"../@serialNumber\" }");
    assert_eq!(
        proposed.key("same"),
        "{ program = { xml = \"/export/head/program\" } }"
    );
    assert_whole_study(&proposed.previews()[0], "bore A");
}

#[test]
fn several_samples_show_what_one_does_not() {
    let proposed = Proposed::from(&["hub run-1.csv", "hub run-2.csv", "hub run-3.csv"]);
    assert_eq!(proposed.key("header"), "{ find = \"Actual [mm]\" }");
    assert_eq!(proposed.note("header"), "rows 6 to 8; seen in 3 of 3 files");
    assert_eq!(proposed.key("part"), "{ label = \"Serial no.\" }");
    assert_eq!(proposed.key("trial"), r"{ path = '(?i)run[-_ ]?(\d+)' }");
    assert_eq!(
        proposed.key("value"),
        "{ column = \"Actual [mm]\", unit = \"mm\" }"
    );
    assert_eq!(proposed.key("end"), "{ find = \"End of report\" }");
    assert_eq!(proposed.key("no_value"), "[\"---\"]");
    assert!(proposed.note("no_value").starts_with("check: "));
    let previews = proposed.previews();
    let values = |at: usize| -> Vec<f64> {
        let readings = previews[at]["readings"].as_array().expect("readings");
        readings
            .iter()
            .filter_map(|r| r["value"].as_f64())
            .collect()
    };
    assert_eq!(values(0), [50.011, 12.031, 0.021]);
    assert_eq!(values(2), [50.013, 12.033, 0.021]);
    assert_eq!(previews[2]["runs"][0]["trial"], "3");
    assert_eq!(previews[2]["runs"][0]["taken"], "2026-06-15T14:20:00");
    // A run with a value that is none is set aside whole.
    assert_eq!(values(1), [0.0; 0]);
    assert_eq!(previews[1]["set_aside"][0]["found"], "---");
}

#[test]
fn what_is_not_found_is_a_commented_line_and_bad_news() {
    let proposed = Proposed::from(&["across.csv"]);
    assert_eq!(proposed.code, Some(1));
    let note = proposed.note("value");
    assert!(
        note.starts_with("MISSING: several places hold numbers (`D1`, `D2`)"),
        "{note}"
    );
    assert!(proposed.draft.contains("\n# value "), "{}", proposed.draft);
}

#[test]
fn headings_and_labels_stay_texts() {
    let proposed = Proposed::from(&["injection.xlsx"]);
    let tables: Vec<&str> = proposed
        .draft
        .lines()
        .filter(|line| line.starts_with('['))
        .collect();
    assert_eq!(tables, ["[[instrument]]", "[instrument.read]"]);
    assert_eq!(
        proposed.key("value"),
        r#"{ column = "Actual value\" } [state] folder = 'y'" }"#
    );
}

#[test]
fn json_has_the_draft_its_lines_and_how_the_samples_read() {
    let sound = Proposed::from(&["english.csv"]);
    let mut line = Proposed::line("propose", &sound.files);
    line.push("--json".into());
    let answer = json(&restudy(&line));
    assert_eq!(answer["toml"].as_str(), Some(sound.draft.as_str()));
    assert_eq!(answer["read_back"][0]["readings"], 8);
    assert_eq!(answer["faults"], serde_json::json!([]));
    let lines = answer["lines"].as_array().expect("lines");
    let part = lines.iter().find(|l| l["key"] == "part").expect("a part");
    assert_eq!(part["trust"], "seen");
    assert_eq!(part["value"], "{ column = \"Serial no.\" }");
}

#[test]
fn a_sample_of_another_form_is_named_and_not_used() {
    let mixed = Proposed::from(&["english.csv", "runs.xml"]);
    assert_eq!(mixed.code, Some(1));
    assert!(
        mixed
            .draft
            .contains("# Not used: runs.xml: it has another form than the first"),
        "{}",
        mixed.draft
    );
    let nothing = restudy(&["propose", "no such file"]);
    assert_eq!(nothing.status.code(), Some(2));
}
