//! Published readings and the values that they must give; `fixtures/reference/ORIGIN.md` names their sources.

use std::path::PathBuf;

use serde_json::Value;

/// One reading of a 10 × 3 × 3 study.
#[derive(Debug, Clone)]
pub(crate) struct Reading {
    pub(crate) part: usize,
    pub(crate) appraiser: String,
    pub(crate) trial: usize,
    pub(crate) value: f64,
}

/// A file beside the fixtures' origin.
pub(crate) fn path(name: &str) -> PathBuf {
    let fixtures = concat!(env!("CARGO_MANIFEST_DIR"), "/../fixtures/reference");
    PathBuf::from(fixtures).join(name)
}

pub(crate) fn values(name: &str) -> Value {
    let text = fs_err::read_to_string(path(&format!("{name}.json"))).expect("a fixture");
    serde_json::from_str(&text).expect("JSON")
}

pub(crate) fn readings(name: &str) -> Vec<Reading> {
    let text = fs_err::read_to_string(path(&format!("{name}.csv"))).expect("a fixture");
    text.lines().skip(1).map(reading).collect()
}

fn reading(line: &str) -> Reading {
    let fields: Vec<&str> = line.split(',').collect();
    let [part, appraiser, trial, value] = fields[..] else {
        panic!("not a reading: {line}")
    };
    Reading {
        part: part.parse().expect("a part's number"),
        appraiser: appraiser.to_owned(),
        trial: trial.parse().expect("a trial's number"),
        value: value.parse().expect("a value"),
    }
}

/// Checks that both are numbers that agree to `digits` significant digits.
#[track_caller]
pub(crate) fn assert_agrees(found: &Value, expected: &Value, digits: i32, what: &str) {
    let number = |value: &Value| value.as_f64().unwrap_or_else(|| panic!("{what}: {value}"));
    let (found, expected) = (number(found), number(expected));
    let apart = (found - expected).abs();
    assert!(
        apart <= 0.5 * 10_f64.powi(1 - digits) * expected.abs(),
        "{what}: {found} instead of {expected}"
    );
}

/// The terms' names in a record and in the published values.
pub(crate) const TERMS: [(&str, &str); 4] = [
    ("part", "part"),
    ("appraiser", "appraiser"),
    ("part × appraiser", "interaction"),
    ("within cells", "error"),
];

/// The record's line of that name in the table of mean squares.
pub(crate) fn line<'a>(record: &'a Value, name: &str) -> &'a Value {
    let lines = record["mean_squares"].as_array().expect("mean squares");
    lines
        .iter()
        .find(|l| l["name"] == name)
        .unwrap_or_else(|| panic!("no mean square of {name}"))
}
