//! Instrument exports to runs of readings, by a stated rule.
//!
//! Model: [`read`] takes the bytes of one export with its path and a [`Rule`], and answers with
//! [`Parsed`]: runs (one part measured once by one appraiser), their readings, and what was set
//! aside with its place, what was found there and what was expected. An export that cannot be read
//! at all is [`Refused`] with one sentence. Bad data is a result, never a panic.
//!
//! A table (delimited text, sheets of a workbook) has one value field a row below its headings, or
//! several when the value stands across columns; XML has an element at the rule's path, QIF a measured
//! characteristic. An export in which no role is looked up by row has one value field a sheet. A run is what shares
//! part, appraiser, trial, factors, time and round; it is set aside whole when one of its readings
//! cannot be used.
//!
//! Not here: files, clocks, the plan (who may measure what), judging, guessing. Nothing is repaired:
//! a text that can be two numbers is no number.
//!
//! Invariant: every value field met in an export is a [`Reading`] of an accepted run or is counted
//! in [`SetAside::readings`].

mod bound;
mod compound;
mod container;
mod damage;
mod decimal;
mod decode;
mod delimited;
mod fault;
mod grid;
mod headings;
mod identity;
mod kind;
mod layout;
mod look;
mod moment;
mod names;
mod no_value;
mod number;
mod one_field;
mod parsed;
mod plain;
mod qif;
mod reader;
mod rule;
mod runs;
mod sexagesimal;
mod sheets;
mod source;
mod table;
mod unit;
mod whole;
mod workbook;
mod xml;
mod xml_path;

pub use look::{
    Cells, ROWS_LOOKED_AT, Seen, announced_delimiter, look_at_fields, look_at_sheets, look_at_text,
};
pub use names::{fold, nearest};
pub use parsed::{Parsed, Reading, Refused, Run, SetAside};
pub use plain::{Plain, read_plain};
pub use qif::Qif;
pub use reader::{Reader, RuleError};
pub use rule::{
    Across, Bounds, Cell, Column, Count, Epoch, Filter, Find, Form, Header, Layout, Limit, Role,
    Rule, Sheet, Taken, Test, Trial, Until, Value,
};
pub use unit::converted;

/// One export as it was read: its path below the watched folder (with `/` between folders, lossy
/// where a name is not UTF-8) and all its bytes.
#[derive(Debug, Clone, Copy)]
pub struct Export<'a> {
    /// Path below the watched folder, file name included; what `path` roles search.
    pub path: &'a str,
    /// The whole file.
    pub bytes: &'a [u8],
}

/// Reads one export by a rule that is used once; [`Reader`] compiles a rule for many.
///
/// # Errors
/// [`Refused`] when nothing of the export can be used, and when the rule itself cannot be.
pub fn read(export: Export<'_>, rule: &Rule) -> Result<Parsed, Refused> {
    Reader::new(rule)
        .map_err(|why| Refused::new(format!("the rule cannot be used: {why}")))?
        .read(export)
}

/// True when the content is a workbook's (a zip archive or a compound file), whatever the file is
/// called. Crafted workbooks can exhaust the memory of the process that reads them.
#[must_use]
pub fn is_workbook(bytes: &[u8]) -> bool {
    kind::Kind::by_signature(bytes) != kind::Kind::Text
}
