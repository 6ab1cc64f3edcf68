//! Why there is no study.

use crate::cli::Failure;

/// Why there is no study, and what a person could do.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Fault {
    pub(super) sentence: String,
    pub(super) hint: Option<String>,
}

impl Fault {
    pub(super) fn new(sentence: impl Into<String>) -> Self {
        let sentence = sentence.into();
        let hint = None;
        Self { sentence, hint }
    }

    pub(super) fn hinted(sentence: impl Into<String>, hint: impl Into<String>) -> Self {
        let hint = Some(hint.into());
        Self {
            hint,
            ..Self::new(sentence)
        }
    }
}

impl From<Fault> for Failure {
    fn from(Fault { sentence, hint }: Fault) -> Self {
        Self::Usage { sentence, hint }
    }
}
