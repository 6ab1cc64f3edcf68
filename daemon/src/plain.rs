//! A study in plain words: the rules that mails and reports share, so that they never say different things.
//!
//! Model: how a number is rounded and a date written, what counts as an upper end, which limit is only held, which
//! level stands out, which terms one line holds.
//!
//! Not here: layout, judging, statistics.

pub(crate) mod dates;
mod held;
mod rounded;
mod stands_out;
mod terms;
mod upper_end;

pub(crate) use held::{held, held_clause};
pub(crate) use rounded::{Rounded, percent_as_set};
pub(crate) use stands_out::stands_out;
pub(crate) use terms::{in_error, interactions, is_interaction, pooled, same_model};
pub(crate) use upper_end::UpperEnd;

/// Of the plant's word for a factor.
pub(crate) fn plural(word: &str) -> String {
    if word.ends_with('s') {
        word.to_owned()
    } else {
        format!("{word}s")
    }
}
