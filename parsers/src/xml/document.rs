//! One pass over an XML document: what stands at each sought path, for each record.
//!
//! The open elements are followed along every path at once; a text found in an element that a path
//! shares with `each` is handed to all records inside that element when it closes.

use std::rc::Rc;

use quick_xml::XmlVersion;
use quick_xml::errors::IllFormedError;
use quick_xml::events::{BytesStart, Event};
use quick_xml::name::ResolveResult;
use quick_xml::reader::NsReader;

use super::lines::Lines;
use super::malformed::{in_words, of_attribute};
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

/// An open element.
struct Open {
    line: u32,
    /// Its own text so far.
    text: String,
}

pub(super) struct Document<'a> {
    text: &'a str,
    lines: Lines<'a>,
    reader: &'a Reader,
    each: &'a XmlPath,
    end: Option<&'a End>,
    pub(super) sought: Vec<Sought<'a>>,
    /// Elements of `each` that the open elements follow.
    followed: usize,
    /// Number of records when each of the followed elements was opened.
    records_before: Vec<usize>,
    open: Vec<Open>,
    pub(super) records: Vec<Record>,
    roots: usize,
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
            lines: Lines::new(text),
            reader,
            each,
            end: reader.roles.end.as_ref(),
            sought: sought.collect(),
            followed: 0,
            records_before: Vec::new(),
            open: Vec::new(),
            records: Vec::new(),
            roots: 0,
            ended: false,
        }
    }

    pub(super) fn read(&mut self) -> Result<(), Refused> {
        let mut xml = NsReader::from_str(self.text);
        xml.config_mut().expand_empty_elements = true;
        loop {
            let line = self.lines.line_of(xml.buffer_position());
            match xml.read_event() {
                Ok(Event::Start(element)) => {
                    self.start(&xml, &element, line)?;
                }
                Ok(Event::End(_)) => self.close(),
                Ok(Event::Text(text)) => self.gather(&text.xml10_content(), line)?,
                Ok(Event::CData(text)) => self.gather(&text.xml10_content(), line)?,
                Ok(Event::GeneralRef(entity)) => {
                    let resolved = match entity.resolve_char_ref() {
                        Ok(Some(c)) if !c.is_control() || matches!(c, '\t' | '\n' | '\r') => {
                            Some(c)
                        }
                        Ok(None) => predefined(&entity),
                        _ => None,
                    };
                    let Some(c) = resolved else {
                        return Err(Refused::new(format!(
                            "line {line}: the reference `&{};` means nothing here",
                            shorten(&entity)
                        ))
                        .hint("only `&amp;`, `&lt;`, `&gt;`, `&quot;`, `&apos;` and numbers of printable characters do"));
                    };
                    self.gather(c.encode_utf8(&mut [0; 4]), line)?;
                }
                Ok(Event::DocType(_)) => {
                    return Err(Refused::new(format!(
                        "line {line}: a document type (DOCTYPE); exports that declare one are not read"
                    )));
                }
                Ok(Event::Eof) => return self.eof(line),
                Ok(Event::Empty(_) | Event::Comment(_) | Event::PI(_) | Event::Decl(_)) => {}
                Err(why) => return Err(self.malformed(&why, xml.error_position())),
            }
        }
    }

    fn start(
        &mut self,
        xml: &NsReader<&[u8]>,
        element: &BytesStart<'_>,
        line: u32,
    ) -> Result<(), Refused> {
        let depth = self.open.len();
        let (resolved, local) = xml.resolver().resolve_element(element.name());
        declared(&resolved, line)?;
        let name = local.into_inner();
        let limit = self.reader.bounds.depth as usize;
        if depth >= limit {
            return Err(Refused::new(format!(
                "line {line}: elements lie deeper than {limit}; that is the limit"
            )));
        }
        if depth == 0 {
            self.roots += 1;
            let root = &self.each.elements[0];
            if self.roots > 1 {
                return Err(Refused::new(format!(
                    "line {line}: a second root element `{}`",
                    shorten(name)
                ))
                .hint("an export has one; were two written into one file?"));
            }
            if name != root {
                return Err(Refused::new(format!(
                    "line {line}: the root element is `{}`; this instrument's exports have `{root}`",
                    shorten(name)
                ))
                .hint("correct `each`, or leave such files out with `files`"));
            }
        }
        self.open.push(Open {
            line,
            text: String::new(),
        });
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
        for index in 0..self.sought.len() {
            let sought = &mut self.sought[index];
            if sought.followed == depth
                && sought.path.elements.get(depth).is_some_and(|e| e == name)
            {
                sought.followed += 1;
            }
        }
        self.attributes(xml, element, line)
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

    fn attributes(
        &mut self,
        xml: &NsReader<&[u8]>,
        element: &BytesStart<'_>,
        line: u32,
    ) -> Result<(), Refused> {
        let depth = self.open.len();
        for attribute in element.attributes() {
            let wrong = |why: String| {
                Refused::new(format!(
                    "line {line}: an attribute that cannot be read: {why}"
                ))
            };
            let attribute = attribute.map_err(|why| wrong(of_attribute(&why)))?;
            if attribute.key.as_namespace_binding().is_some() {
                continue;
            }
            let (resolved, local) = xml.resolver().resolve_attribute(attribute.key);
            declared(&resolved, line)?;
            let name = local.into_inner();
            let value = attribute
                .normalized_value(XmlVersion::Implicit1_0)
                .map_err(|_| wrong("its value holds a reference that means nothing".to_owned()))?;
            self.within_text_limit(value.len(), line)?;
            for index in 0..self.sought.len() {
                let sought = &self.sought[index];
                if sought.at(depth) && sought.path.attribute.as_deref() == Some(name) {
                    self.found(index, &value, line);
                }
            }
        }
        Ok(())
    }

    fn gather(&mut self, text: &str, line: u32) -> Result<(), Refused> {
        match self.open.last_mut() {
            Some(Open { text: own, .. }) => {
                own.push_str(text);
                let length = own.len();
                self.within_text_limit(length, line)
            }
            None if text.trim().is_empty() => Ok(()),
            None => Err(Refused::new(format!(
                "line {line}: text outside the root element: `{}`",
                shorten(text)
            ))),
        }
    }

    fn within_text_limit(&self, length: usize, line: u32) -> Result<(), Refused> {
        let limit = self.reader.bounds.text_bytes as usize;
        if length > limit {
            return Err(Refused::new(format!(
                "line {line}: a text of {length} bytes; the limit is {limit}"
            )));
        }
        Ok(())
    }

    fn close(&mut self) {
        let depth = self.open.len();
        let Some(Open { line, text }) = self.open.pop() else {
            return;
        };
        if let Some(end) = self.end
            && !self.ended
        {
            self.ended = fold(&text).contains(&end.key);
        }
        for index in 0..self.sought.len() {
            let sought = &self.sought[index];
            if sought.at(depth) && sought.path.attribute.is_none() {
                self.found(index, &text, line);
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

    fn eof(&self, line: u32) -> Result<(), Refused> {
        if !self.open.is_empty() {
            return Err(Refused::unfinished(format!(
                "line {line}: the file ends inside {} open element{}",
                self.open.len(),
                if self.open.len() == 1 { "" } else { "s" }
            )));
        }
        if self.roots == 0 {
            return Err(Refused::unfinished("the file holds no XML element"));
        }
        if self.records.is_empty() {
            return Err(
                Refused::new(format!("there is no element {} in this export", self.each))
                    .hint("correct `each`; names stand without prefix, and case counts"),
            );
        }
        Ok(())
    }

    fn malformed(&self, why: &quick_xml::Error, position: u64) -> Refused {
        let mut lines = Lines::new(self.text);
        let line = lines.line_of(position);
        let cut = matches!(
            why,
            quick_xml::Error::Syntax(_)
                | quick_xml::Error::IllFormed(IllFormedError::UnclosedReference)
        );
        Refused {
            sentence: format!("line {line}: the XML is malformed: {}", in_words(why)),
            hint: Some("export it again".to_owned()),
            perhaps_unfinished: cut,
        }
    }
}

impl Sought<'_> {
    /// True when the innermost of `depth` open elements is the one that the path names.
    fn at(&self, depth: usize) -> bool {
        self.followed == depth && self.path.elements.len() == depth
    }
}

fn declared(resolved: &ResolveResult<'_>, line: u32) -> Result<(), Refused> {
    match resolved {
        ResolveResult::Unknown(prefix) => Err(Refused::new(format!(
            "line {line}: the namespace prefix `{}` is not declared",
            shorten(prefix)
        ))),
        ResolveResult::Bound(_) | ResolveResult::Unbound => Ok(()),
    }
}

fn predefined(entity: &str) -> Option<char> {
    Some(match entity {
        "amp" => '&',
        "lt" => '<',
        "gt" => '>',
        "quot" => '"',
        "apos" => '\'',
        _ => return None,
    })
}
