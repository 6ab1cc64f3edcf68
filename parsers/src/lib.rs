//! Instrument exports to runs of readings, by a stated rule.
//!
//! Model: [`read`] takes the bytes of one export with its path and a [`Rule`], and answers with
//! [`Parsed`]: runs (one part measured once by one appraiser), their readings, and what was set
//! aside with its place, what was found there and what was expected. An export that cannot be read
//! at all is [`Refused`] with one sentence. Bad data is a result, never a panic.
//!
//! Not here: files, clocks, the plan (who may measure what), judging, guessing. Nothing is repaired:
//! a text that can be two numbers is no number.
//!
//! Invariant: every value field met in an export is a [`Reading`] of an accepted run or is counted
//! in [`SetAside::readings`].

mod fold;
mod parsed;
mod rule;

pub use fold::fold;
pub use parsed::{Parsed, Reading, Refused, Run, SetAside};
pub use rule::{
    Bounds, Cell, Count, Find, Form, Header, Limit, Role, Rule, Sheet, Taken, Trial, Value,
};

/// One export as it was read: its path below the watched folder (with `/` between folders, lossy
/// where a name is not UTF-8) and all its bytes.
#[derive(Debug, Clone, Copy)]
pub struct Export<'a> {
    /// Path below the watched folder, file name included; what `path` roles search.
    pub path: &'a str,
    /// The whole file.
    pub bytes: &'a [u8],
}
