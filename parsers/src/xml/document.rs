//! One pass over an XML document: what stands at each sought path, for each record.
//!
//! The open elements are followed along every path at once; a text found in an element that a path
//! shares with `each` is handed to all records inside that element when it closes.

use std::rc::Rc;

use super::events::{Opened, Visit, visit};
use crate::grid::Content;
use crate::names::{fold, shorten};
use crate::parsed::Refused;
use crate::reader::{End, Reader};
use crate::source::Where;
use crate::xml_path::XmlPath;

/// What stands at a path.
pub(super) struct Found {
    pub(super) line: u32,
    pub(super) content: Content,
}

/// One element at the path `each`.
pub(super) struct Record {
    pub(super) line: u32,
    /// By source.
    pub(super) found: Vec<Option<Rc<Found>>>,
}

/// A path that a source is read from, and how far the open elements follow it.
pub(super) struct Sought<'a> {
    pub(super) source: usize,
    pub(super) path: &'a XmlPath,
    /// Elements that the path shares with `each`.
    shared: usize,
    followed: usize,
    found: Option<Rc<Found>>,
}

pub(super) struct Document<'a> {
    text: &'a str,
    reader: &'a Reader,
    each: &'a XmlPath,
    end: Option<&'a End>,
    pub(super) sought: Vec<Sought<'a>>,
    /// Elements of `each` that the open elements follow.
    followed: usize,
    /// Number of records when each of the followed elements was opened.
    records_before: Vec<usize>,
    /// Open elements.
    depth: usize,
    pub(super) records: Vec<Record>,
    pub(super) ended: bool,
}

impl<'a> Document<'a> {
    pub(super) fn new(text: &'a str, reader: &'a Reader, each: &'a XmlPath) -> Self {
        let sought = reader
            .roles
            .sources
            .iter()
            .enumerate()
            .filter_map(|(source, role)| {
                let Where::Xml(path) = &role.from else {
                    return None;
                };
                Some(Sought {
                    source,
                    path,
                    shared: path.shared(each),
                    followed: 0,
                    found: None,
                })
            });
        Self {
            text,
            reader,
            each,
            end: reader.roles.end.as_ref(),
            sought: sought.collect(),
            followed: 0,
            records_before: Vec::new(),
            depth: 0,
            records: Vec::new(),
            ended: false,
        }
    }

    pub(super) fn read(&mut self) -> Result<(), Refused> {
        let reader = self.reader;
        visit(self.text, &reader.bounds, self)?;
        if self.records.is_empty() {
            return Err(
                Refused::new(format!("there is no element {} in this export", self.each))
                    .hint("correct `each`; names stand without prefix, and case counts"),
            );
        }
        Ok(())
    }

    fn record(&mut self, line: u32) -> Result<(), Refused> {
        let limit = self.reader.bounds.rows as usize;
        if self.records.len() >= limit {
            return Err(Refused::new(format!(
                "more than {limit} elements {}; that is the limit",
                self.each
            )));
        }
        self.records.push(Record {
            line,
            found: vec![None; self.reader.roles.sources.len()],
        });
        Ok(())
    }

    fn found(&mut self, index: usize, text: &str, line: u32) {
        let sought = &mut self.sought[index];
        let content = match (&sought.found, text.trim()) {
            (Some(before), _) => Content::Unusable(
                format!("a second text after the one in line {}", before.line).into(),
            ),
            (None, "") => Content::Blank,
            (None, text) => Content::Text(text.into()),
        };
        sought.found = Some(Rc::new(Found { line, content }));
    }
}

impl Visit for Document<'_> {
    fn open(&mut self, element: Opened<'_>) -> Result<bool, Refused> {
        let Opened {
            name, line, depth, ..
        } = element;
        if depth == 0 && name != self.each.elements[0] {
            return Err(Refused::new(format!(
                "line {line}: the root element is `{}`; this instrument's exports have `{}`",
                shorten(name),
                self.each.elements[0]
            ))
            .hint("correct `each`, or leave such files out with `files`"));
        }
        self.depth = depth + 1;
        if self.followed == depth && self.each.elements.get(depth).is_some_and(|e| e == name) {
            self.followed += 1;
            self.records_before.push(self.records.len());
            for sought in self
                .sought
                .iter_mut()
                .filter(|sought| sought.shared == depth + 1)
            {
                sought.found = None;
            }
            if self.followed == self.each.elements.len() {
                self.record(line)?;
            }
        }
        for sought in &mut self.sought {
            if sought.followed == depth
                && sought.path.elements.get(depth).is_some_and(|e| e == name)
            {
                sought.followed += 1;
            }
        }
        Ok(true)
    }

    fn attribute(
        &mut self,
        name: &str,
        _prefixed: bool,
        value: &str,
        line: u32,
    ) -> Result<(), Refused> {
        for index in 0..self.sought.len() {
            let sought = &self.sought[index];
            if sought.at(self.depth) && sought.path.attribute.as_deref() == Some(name) {
                self.found(index, value, line);
            }
        }
        Ok(())
    }

    fn close(&mut self, text: &str, line: u32, depth: usize) {
        let depth = depth + 1;
        if let Some(end) = self.end
            && !self.ended
        {
            self.ended = fold(text).contains(&end.key);
        }
        for index in 0..self.sought.len() {
            let sought = &self.sought[index];
            if sought.at(depth) && sought.path.attribute.is_none() {
                self.found(index, text, line);
            }
            let sought = &mut self.sought[index];
            sought.followed = sought.followed.min(depth.saturating_sub(1));
        }
        if self.followed == depth {
            self.followed -= 1;
            let first = self.records_before.pop().unwrap_or(self.records.len());
            for sought in self.sought.iter().filter(|sought| sought.shared == depth) {
                for record in &mut self.records[first..] {
                    record.found[sought.source].clone_from(&sought.found);
                }
            }
        }
    }
}

impl Sought<'_> {
    /// True when the innermost of `depth` open elements is the one that the path names.
    fn at(&self, depth: usize) -> bool {
        self.followed == depth && self.path.elements.len() == depth
    }
}
