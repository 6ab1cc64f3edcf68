//! Every fault of a file, at once, each with file, line, key, what was found and expected, and a hint.
//!
//! Each case in `fixtures/config/faults` spoils `sound.toml`: lines after `- ` are taken out, lines after
//! `+ ` put in their place, and what follows is told of the outcome.

mod common;

use std::path::{Path, PathBuf};

use restudy_config::{Config, Fault, read};

use common::{Memory, shown};

const SOUND: &str = include_str!("../../fixtures/config/sound.toml");

fn disk() -> Memory {
    let folders = [
        "/state",
        "/exports",
        "/exports/bridge-1",
        "/exports/form-2",
        "/exports/bridge-1/old",
    ];
    let mut disk = Memory::with_folders(&folders);
    for (name, text) in [
        (
            "empty.csv",
            include_str!("../../fixtures/config/lists/empty.csv"),
        ),
        (
            "headings.csv",
            include_str!("../../fixtures/config/lists/headings.csv"),
        ),
        (
            "bad-headings.csv",
            include_str!("../../fixtures/config/lists/bad-headings.csv"),
        ),
        (
            "bad-rows.csv",
            include_str!("../../fixtures/config/lists/bad-rows.csv"),
        ),
        (
            "mixed-marks.csv",
            include_str!("../../fixtures/config/lists/mixed-marks.csv"),
        ),
        (
            "open-quote.csv",
            include_str!("../../fixtures/config/lists/open-quote.csv"),
        ),
        (
            "sound.csv",
            include_str!("../../fixtures/config/lists/sound.csv"),
        ),
    ] {
        disk.files
            .insert(PathBuf::from("/etc/restudy").join(name), text.to_owned());
    }
    disk
}

fn reading(text: &str) -> Result<(Config, Vec<Fault>), Vec<Fault>> {
    read(text, "restudy.toml", Path::new("/etc/restudy"), &disk())
}

/// The sound configuration with each `from` replaced by its `to`.
fn spoilt(changes: &[(&str, &str)]) -> String {
    changes.iter().fold(SOUND.to_owned(), |text, (from, to)| {
        assert_eq!(text.matches(from).count(), 1, "`{from}` stands once");
        text.replace(from, to)
    })
}

/// The sound configuration with the changes of one case, and what the case expects to be told.
fn case(lines: &str) -> (String, String) {
    let mut changes: Vec<(String, String)> = Vec::new();
    let mut expected = String::new();
    let mut putting = true;
    for line in lines.lines() {
        let (out, put) = (line.strip_prefix("- "), line.strip_prefix("+ "));
        if out.is_some() && putting {
            changes.push(Default::default());
        }
        putting = put.is_some();
        match (out.or(put), changes.last_mut()) {
            (Some(text), Some((out, put))) => {
                *(if putting { put } else { out }) += &format!("{text}\n")
            }
            _ => expected += &format!("{line}\n"),
        }
    }
    let changes: Vec<(&str, &str)> = changes
        .iter()
        .map(|(out, put)| (out.as_str(), put.as_str()))
        .collect();
    (spoilt(&changes), expected)
}

/// Runs every case, so that all that differ are seen at once.
fn expect(cases: &str) {
    let mut differ = String::new();
    for lines in cases.split("\n\n") {
        let (text, expected) = case(lines);
        let told = match reading(&text) {
            Ok((_, warnings)) => format!("no fault\n{}", shown(&warnings)),
            Err(faults) => shown(&faults),
        };
        if told != expected {
            differ += &format!("\n{lines}\nbut told:\n{told}");
        }
    }
    assert_eq!(differ, "");
}

macro_rules! expectations {
    ($($name:ident)*) => {
        $(
            #[test]
            fn $name() {
                expect(include_str!(concat!("../../fixtures/config/faults/", stringify!($name), ".txt")));
            }
        )*
    };
}

expectations! {
    a_text_that_is_not_toml
    missing_tables_and_keys
    wrong_types
    unknown_keys_and_keys_of_later_versions
    text_and_numbers
    times
    folders_and_patterns
    two_instruments
    roles
    reading_exports
    rows_and_columns
    qif
    design
    plan_and_instrument
    judging
    list_of_characteristics
    mail_and_routes
}

#[test]
fn the_sound_one_is_sound() {
    let (_, warnings) = reading(SOUND).unwrap_or_else(|faults| panic!("{}", shown(&faults)));
    assert_eq!(shown(&warnings), "");
}

#[test]
fn without_mail_and_routes_it_is_sound_too() {
    let (before, _) = SOUND.split_once("[mail]").unwrap();
    let (config, warnings) = reading(before).unwrap();
    assert!(config.mail.is_none() && config.routes.is_empty() && warnings.is_empty());
}

#[test]
fn all_faults_of_a_file_come_at_once_by_line() {
    let changes = [
        ("zone = \"Europe/Oslo\"", "zone = \"Oslo\""),
        ("settle = \"2s\"", "settle = \"2\"\nsettle = \"3s\""),
        ("{ column = \"part\" }", "{ cell = \"part\" }"),
        ("parts = 10", "parts = 1"),
        (
            "trials = 3",
            "trials = 3\ncharacteristics = \"mixed-marks.csv\"",
        ),
        ("act = 0.3", "act = 0.05"),
        ("tls = \"none\"", "tls = \"no\""),
        ("to = [\"quality@halden.example\"]", "to = []\nt = 1"),
    ];
    let faults = reading(&spoilt(&changes)).unwrap_err();
    let places: Vec<(&str, usize)> = faults
        .iter()
        .map(|fault| (fault.file.as_str(), fault.line))
        .collect();
    let own = [3, 10, 11, 14, 26, 36, 43, 46, 47].map(|line| ("restudy.toml", line));
    let listed = [2, 3].map(|line| ("mixed-marks.csv", line));
    assert_eq!(
        places,
        [own.as_slice(), &listed].concat(),
        "{}",
        shown(&faults)
    );
}

#[test]
fn a_password_is_never_shown() {
    for line in [
        "password = \"hunter2\"",
        "password = hunter2",
        "password_env = \"hunter2!\"",
        "pasword = \"hunter2\"",
        "password = { hunter2 = 1 }",
    ] {
        let changes = [(
            "tls = \"none\"",
            &*format!("tls = \"implicit\"\nuser = \"restudy\"\n{line}"),
        )];
        let faults = reading(&spoilt(&changes)).unwrap_err();
        assert!(!shown(&faults).contains("hunter2"), "{}", shown(&faults));
    }
}

#[test]
fn keys_of_text_and_numbers_that_are_misspelt_have_the_right_one_for_a_hint() {
    for (wrong, meant) in [
        ("thousand = \"'\"", "thousands"),
        ("line_break = true", "line_breaks"),
        ("novalue = [\"---\"]", "no_value"),
    ] {
        let text = spoilt(&[("form = \"table\"", &format!("form = \"table\"\n{wrong}"))]);
        let told = shown(&reading(&text).unwrap_err());
        assert!(told.contains(&format!("did you mean `{meant}`?")), "{told}");
    }
    let taken = "taken = { column = \"taken\"";
    let text = spoilt(&[(taken, &format!("{taken}, date = \"1904\""))]);
    let told = shown(&reading(&text).unwrap_err());
    assert!(told.contains("did you mean `dates`?"), "{told}");
}
