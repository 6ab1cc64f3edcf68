//! Remarks on invented studies: what is planted is named, what is sound is left alone, nothing panics.

#![allow(clippy::unwrap_used, reason = "a test stops at its first surprise")]

mod degenerate;
mod false_alarms;
mod invented;
mod planted;
mod published;
