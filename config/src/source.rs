//! Where something stands in a text, and what was found wrong there.
//!
//! Model: a [`Source`] is one named text; a [`Place`] is a key with its offset in a source. Whoever sees a
//! fault tells the place; the [`Findings`] gather them, so that reading goes on and all come at once.

use std::cell::RefCell;

use crate::Fault;

/// All that was found, in the order of finding.
#[derive(Debug, Default)]
pub(crate) struct Findings {
    faults: RefCell<Vec<Fault>>,
    warnings: RefCell<Vec<Fault>>,
}

impl Findings {
    /// Faults and warnings: by file in the order of `files`, there by line.
    pub(crate) fn sorted(self, first: &str) -> (Vec<Fault>, Vec<Fault>) {
        let sorted = |mut found: Vec<Fault>| {
            found.sort_by(|a, b| {
                (a.file != first, &a.file, a.line).cmp(&(b.file != first, &b.file, b.line))
            });
            found.dedup();
            found
        };
        (
            sorted(self.faults.into_inner()),
            sorted(self.warnings.into_inner()),
        )
    }
}

/// A named text.
#[derive(Debug)]
pub(crate) struct Source<'a> {
    pub(crate) file: &'a str,
    pub(crate) text: &'a str,
    pub(crate) findings: &'a Findings,
}

impl Source<'_> {
    /// Line of a byte offset, from 1.
    pub(crate) fn line(&self, offset: usize) -> usize {
        let before = &self.text.as_bytes()[..offset.min(self.text.len())];
        1 + before.iter().filter(|byte| **byte == b'\n').count()
    }
}

/// A key in a source.
#[derive(Debug, Clone)]
pub(crate) struct Place<'a> {
    pub(crate) source: &'a Source<'a>,
    pub(crate) offset: usize,
    /// The key with its tables; empty for the whole text.
    pub(crate) key: String,
}

impl<'a> Place<'a> {
    /// The same spot, seen as a key below this one.
    pub(crate) fn below(&self, key: &str) -> Self {
        let key = if self.key.is_empty() {
            key.to_owned()
        } else {
            format!("{} . {key}", self.key)
        };
        Self {
            key,
            ..self.clone()
        }
    }

    /// The same key at another offset of its source.
    pub(crate) fn at(self, offset: usize) -> Self {
        Self { offset, ..self }
    }

    pub(crate) fn line(&self) -> usize {
        self.source.line(self.offset)
    }

    pub(crate) fn fault(&self, found: impl Into<String>, expected: impl Into<String>) {
        let fault = self.told(found.into(), expected.into(), None);
        self.source.findings.faults.borrow_mut().push(fault);
    }

    pub(crate) fn fault_hint(
        &self,
        found: impl Into<String>,
        expected: impl Into<String>,
        hint: impl Into<String>,
    ) {
        let fault = self.told(found.into(), expected.into(), Some(hint.into()));
        self.source.findings.faults.borrow_mut().push(fault);
    }

    /// A fault whose hint is there only if something is close.
    pub(crate) fn fault_nearest(
        &self,
        found: impl Into<String>,
        expected: impl Into<String>,
        nearest: Option<&str>,
    ) {
        let hint = nearest.map(|name| format!("did you mean `{name}`?"));
        let fault = self.told(found.into(), expected.into(), hint);
        self.source.findings.faults.borrow_mut().push(fault);
    }

    pub(crate) fn warn(
        &self,
        found: impl Into<String>,
        expected: impl Into<String>,
        hint: impl Into<String>,
    ) {
        let fault = self.told(found.into(), expected.into(), Some(hint.into()));
        self.source.findings.warnings.borrow_mut().push(fault);
    }

    fn told(&self, found: String, expected: String, hint: Option<String>) -> Fault {
        Fault {
            file: self.source.file.to_owned(),
            line: self.line(),
            key: self.key.clone(),
            found,
            expected,
            hint,
        }
    }
}

/// A text in a message: on one line and of bearable length.
pub(crate) fn shortened(text: &str) -> String {
    const LONGEST: usize = 60;
    let line: String = text
        .chars()
        .take(LONGEST + 1)
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    if line.chars().count() > LONGEST {
        line.chars().take(LONGEST).chain(['…']).collect()
    } else {
        line
    }
}
