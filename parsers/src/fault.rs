//! What is wrong with one content, before it is known which run it costs.

use crate::grid::{Content, Place};
use crate::names::shorten;

/// One content that cannot be used.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub(crate) struct Fault {
    pub(crate) place: String,
    pub(crate) found: String,
    pub(crate) expected: String,
    pub(crate) hint: Option<String>,
    /// What is wrong, without the place: "`12.03.4` is not a number".
    pub(crate) wrong: String,
}

impl Fault {
    pub(crate) fn new(
        place: Place<'_>,
        found: impl Into<String>,
        expected: impl Into<String>,
        wrong: impl Into<String>,
    ) -> Self {
        Self {
            place: place.to_string(),
            found: found.into(),
            expected: expected.into(),
            hint: None,
            wrong: wrong.into(),
        }
    }

    pub(crate) fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }

    /// Place and what is wrong, in one sentence.
    pub(crate) fn sentence(&self) -> String {
        format!("{}: {}", self.place, self.wrong)
    }
}

/// How a content is shown in the `found` field of what is set aside.
pub(crate) fn shown(content: &Content) -> String {
    match content {
        Content::Blank => String::new(),
        Content::Text(text) => shorten(text),
        Content::Number(number) => number.to_string(),
        Content::Date(date) => date.to_string(),
        Content::Unusable(what) => shorten(what),
    }
}
