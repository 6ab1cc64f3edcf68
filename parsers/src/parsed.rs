//! What an export turned out to hold.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

/// The content of one export: runs, their readings, and what was set aside.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Parsed {
    /// Accepted runs, in order of appearance.
    pub runs: Vec<Run>,
    /// Readings of accepted runs; [`Reading::run`] is an index into `runs`.
    pub readings: Vec<Reading>,
    /// What could not be used; a run is set aside whole.
    pub set_aside: Vec<SetAside>,
    /// What a person should know of the export as a whole, a sentence each. Empty for exports that
    /// are read by a rule.
    #[serde(default)]
    pub notes: Vec<String>,
}

/// One part measured once by one appraiser, as the export names them (blanks trimmed, not yet
/// matched with a plan).
#[derive(Debug, Clone, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub struct Run {
    /// The part's label.
    pub part: String,
    /// The appraiser's label; `None` when the rule names no appraiser.
    pub appraiser: Option<String>,
    /// The trial's label as stated; `None` when trials are counted.
    pub trial: Option<String>,
    /// Levels of further factors, by factor name.
    pub factors: BTreeMap<String, String>,
    /// Values that must stay the same within a round, by name.
    pub same: BTreeMap<String, String>,
    /// When the part was measured: civil time of the rule's `shown_in`, to the millisecond.
    pub taken: Option<jiff::civil::DateTime>,
    /// The round's own label, when the rule names that role.
    pub round: Option<String>,
}

/// One value of one characteristic in one run.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Reading {
    /// Index into [`Parsed::runs`].
    pub run: usize,
    /// The characteristic's label, blanks trimmed and folded.
    pub characteristic: String,
    /// The value, finite, in `unit`.
    pub value: f64,
    /// Unit of value, nominal and limits, as stated by the rule or the export.
    pub unit: Option<String>,
    /// Nominal value, in `unit`.
    pub nominal: Option<f64>,
    /// Lower limit (absolute, already added to the nominal), in `unit`.
    pub lower: Option<f64>,
    /// Upper limit (absolute, already added to the nominal), in `unit`.
    pub upper: Option<f64>,
    /// Where the value stands: "sheet `Results`, cell F12", "line 17, column `value`", "line 40, /export/run/feature/value".
    pub origin: String,
}

/// Something that could not be used, and why. `run` says which run, as far as it is known.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SetAside {
    /// Where: sheet and cell, or line and column.
    pub place: String,
    /// The text that stands there, shortened.
    pub found: String,
    /// What the rule asks for.
    pub expected: String,
    /// What a person could do.
    pub hint: Option<String>,
    /// One sentence with all of it.
    pub reason: String,
    /// The run this belongs to, as far as its roles could be read.
    pub run: Option<Run>,
    /// How many readings of the export are set aside by this entry (its run's whole count).
    pub readings: usize,
}

/// An export that cannot be read as its rule says: nothing of it is used.
#[derive(Debug, Clone, PartialEq, thiserror::Error, Serialize, Deserialize)]
#[error("{sentence}")]
pub struct Refused {
    /// What was found, where, and what was expected. Does not repeat the file's name.
    pub sentence: String,
    /// What a person could do.
    pub hint: Option<String>,
    /// True when a file that is still being written would look the same (cut short, empty, a tail
    /// of NULs): worth another look later.
    pub perhaps_unfinished: bool,
}

impl Refused {
    pub(crate) fn new(sentence: impl Into<String>) -> Self {
        Self {
            sentence: sentence.into(),
            hint: None,
            perhaps_unfinished: false,
        }
    }

    pub(crate) fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }

    /// A refusal of what a file that is still being written would look like.
    pub(crate) fn unfinished(sentence: impl Into<String>) -> Self {
        Self {
            perhaps_unfinished: true,
            ..Self::new(sentence)
        }
    }
}
