//! The study record `restudy.study/1`: what the engine found, with who, when and from what.

use std::collections::BTreeMap;

use jiff::civil::DateTime;
use restudy_engine::{Limits, Standing, Study};
use serde::Serialize;

/// The record's schema.
pub const SCHEMA: &str = "restudy.study/1";

/// One characteristic's study, as it is recorded, printed and packed. Outside a plan, what only a plan knows
/// is `None`.
#[derive(Debug, Clone, Serialize)]
pub struct Record {
    /// [`SCHEMA`].
    pub schema: &'static str,
    /// The plant.
    pub site: Option<String>,
    /// The plan.
    pub plan: Option<String>,
    /// The round's number within the plan.
    pub round: Option<i64>,
    /// Of that round.
    pub revision: Option<i64>,
    /// Whose readings these are.
    pub instruments: Vec<String>,
    /// First and last time stamp of the used runs.
    pub measured: Option<Measured>,
    /// Its label.
    pub characteristic: String,
    /// Of the readings and the limits.
    pub unit: Option<String>,
    /// In `unit`.
    pub nominal: Option<f64>,
    /// In `unit`.
    pub lower: Option<f64>,
    /// In `unit`.
    pub upper: Option<f64>,
    /// The statistics.
    #[serde(flatten)]
    pub study: Study,
    /// Where the share lies against the limits.
    pub standing: Judgement,
    /// How many readings were used, and how many not.
    pub readings: Counts,
    /// Values that had to stay the same.
    pub same: BTreeMap<String, Vec<String>>,
    /// Persons' decisions.
    pub decisions: Vec<serde_json::Value>,
    /// The exports, with their digests.
    pub source: Vec<Source>,
    /// Version of the program.
    pub engine: &'static str,
}

/// First and last time stamp, civil time of the instrument.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Measured {
    /// Of the first run.
    pub first: DateTime,
    /// Of the last run.
    pub last: DateTime,
}

/// Where a share lies, and why.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Judgement {
    /// Now.
    pub now: Standing,
    /// In the plan's round before.
    pub before: Option<Standing>,
    /// The limits it was judged by.
    pub limits: Option<Limits>,
    /// Which figure was judged.
    pub judged_by: Option<&'static str>,
    /// One sentence.
    pub why: String,
}

/// Readings of the characteristic in the round.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize)]
pub struct Counts {
    /// In the study.
    pub used: usize,
    /// A later export gave another value.
    pub superseded: usize,
    /// Its cell had enough runs.
    pub surplus: usize,
    /// Of runs that were set aside.
    pub set_aside: usize,
    /// Arrived after the close.
    pub late: usize,
    /// Excluded by a person.
    pub excluded: usize,
}

/// One export.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Source {
    /// Its path below the watched folder.
    pub export: String,
    /// SHA-256 of its bytes, hexadecimal.
    pub sha256: String,
}

/// A digest in hexadecimal.
#[must_use]
pub fn hex(digest: &[u8]) -> String {
    use std::fmt::Write as _;
    digest
        .iter()
        .fold(String::with_capacity(2 * digest.len()), |mut text, byte| {
            // Writing to a String cannot fail.
            let _ = write!(text, "{byte:02x}");
            text
        })
}
