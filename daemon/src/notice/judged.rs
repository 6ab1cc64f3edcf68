//! The figure that a plan holds against its limits, in words.

use restudy_engine::Judge;

use super::news::Item;
use super::words::{limit, rounded};
use crate::plain::Rounded;

/// What was judged.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Judged {
    /// The share that was held against the limits.
    pub(super) share: f64,
    /// The same in words, on its side of every limit.
    pub(super) value: String,
    /// What it is; `None` for the estimate, which needs no name.
    pub(super) name: Option<String>,
}

/// `None` when nothing was judged.
pub(super) fn of(item: Item<'_>, judge: Judge) -> Option<Judged> {
    let share = item.record()?.study.judged_share?;
    let (way, name) = match judge {
        Judge::Estimate => (Rounded::Nearest, None),
        Judge::Chance(p) => (
            Rounded::Down,
            Some(format!(
                "the judged figure, what the share is above with {} confidence,",
                limit(p)
            )),
        ),
        Judge::Upper => (
            Rounded::Up,
            Some("the judged figure, the upper limit of the share,".to_owned()),
        ),
    };
    Some(Judged {
        share,
        value: rounded(way, share, item.limits()),
        name,
    })
}
