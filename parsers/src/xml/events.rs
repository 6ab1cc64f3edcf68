//! One pass over an XML document: elements opened, their attributes, their own text when they close.
//!
//! Not here: document types and entities (refused), schemas.
//!
//! Invariant: a document is visited to its end, or refused; it has one root, and nothing recurses.

use quick_xml::XmlVersion;
use quick_xml::errors::IllFormedError;
use quick_xml::events::{BytesStart, Event};
use quick_xml::name::ResolveResult;
use quick_xml::reader::NsReader;

use super::lines::Lines;
use super::malformed::{in_words, of_attribute};
use crate::names::shorten;
use crate::parsed::Refused;
use crate::rule::Bounds;

/// An element that opens.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Opened<'e> {
    /// `None`: in no namespace.
    pub(crate) namespace: Option<&'e str>,
    /// The local name.
    pub(crate) name: &'e str,
    pub(crate) line: u32,
    /// Open elements around it.
    pub(crate) depth: usize,
}

/// Who is told.
pub(crate) trait Visit {
    /// An element opens; true when its attributes and its own text are wanted.
    fn open(&mut self, element: Opened<'_>) -> Result<bool, Refused>;
    /// An attribute of the element that opened last; `prefixed`: its name has a namespace.
    fn attribute(
        &mut self,
        name: &str,
        prefixed: bool,
        value: &str,
        line: u32,
    ) -> Result<(), Refused>;
    /// The innermost element closes. `line` is where it opened, `text` its own text, `depth` what was
    /// told when it opened.
    fn close(&mut self, text: &str, line: u32, depth: usize);
}

/// An open element.
struct Open {
    line: u32,
    /// `None`: nobody wants it.
    text: Option<String>,
}

struct Pass<'a, V> {
    text: &'a str,
    bounds: &'a Bounds,
    visitor: &'a mut V,
    open: Vec<Open>,
    roots: usize,
}

/// Tells `visitor` what stands in decoded text.
pub(crate) fn visit(text: &str, bounds: &Bounds, visitor: &mut impl Visit) -> Result<(), Refused> {
    Pass {
        text,
        bounds,
        visitor,
        open: Vec::new(),
        roots: 0,
    }
    .run()
}

impl<V: Visit> Pass<'_, V> {
    fn run(&mut self) -> Result<(), Refused> {
        let mut lines = Lines::new(self.text);
        let mut xml = NsReader::from_str(self.text);
        xml.config_mut().expand_empty_elements = true;
        loop {
            let line = lines.line_of(xml.buffer_position());
            match xml.read_event() {
                Ok(Event::Start(element)) => self.start(&xml, &element, line)?,
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
        let namespace = declared(&resolved, line)?;
        let limit = self.bounds.depth as usize;
        if depth >= limit {
            return Err(Refused::new(format!(
                "line {line}: elements lie deeper than {limit}; that is the limit"
            )));
        }
        let name = local.into_inner();
        if depth == 0 {
            self.roots += 1;
            if self.roots > 1 {
                return Err(Refused::new(format!(
                    "line {line}: a second root element `{}`",
                    shorten(name)
                ))
                .hint("an export has one; were two written into one file?"));
            }
        }
        let wanted = self.visitor.open(Opened {
            namespace,
            name,
            line,
            depth,
        })?;
        self.open.push(Open {
            line,
            text: wanted.then(String::new),
        });
        match wanted {
            true => self.attributes(xml, element, line),
            false => Ok(()),
        }
    }

    fn attributes(
        &mut self,
        xml: &NsReader<&[u8]>,
        element: &BytesStart<'_>,
        line: u32,
    ) -> Result<(), Refused> {
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
            let namespace = declared(&resolved, line)?;
            let name = local.into_inner();
            let value = attribute
                .normalized_value(XmlVersion::Implicit1_0)
                .map_err(|_| wrong("its value holds a reference that means nothing".to_owned()))?;
            self.within_text_limit(value.len(), line)?;
            self.visitor
                .attribute(name, namespace.is_some(), &value, line)?;
        }
        Ok(())
    }

    fn gather(&mut self, text: &str, line: u32) -> Result<(), Refused> {
        match self.open.last_mut() {
            Some(Open { text: None, .. }) => Ok(()),
            // Blanks between the children of a long list are no text.
            Some(Open {
                text: Some(own), ..
            }) if own.is_empty() && text.trim().is_empty() => Ok(()),
            Some(Open {
                text: Some(own), ..
            }) => {
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
        let limit = self.bounds.text_bytes as usize;
        if length > limit {
            return Err(Refused::new(format!(
                "line {line}: a text of {length} bytes; the limit is {limit}"
            )));
        }
        Ok(())
    }

    fn close(&mut self) {
        if let Some(Open { line, text }) = self.open.pop() {
            self.visitor
                .close(text.as_deref().unwrap_or(""), line, self.open.len());
        }
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
        Ok(())
    }

    fn malformed(&self, why: &quick_xml::Error, position: u64) -> Refused {
        let line = Lines::new(self.text).line_of(position);
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

fn declared<'n>(resolved: &ResolveResult<'n>, line: u32) -> Result<Option<&'n str>, Refused> {
    match resolved {
        ResolveResult::Unknown(prefix) => Err(Refused::new(format!(
            "line {line}: the namespace prefix `{}` is not declared",
            shorten(prefix)
        ))),
        ResolveResult::Bound(namespace) => Ok(Some(namespace.into_inner())),
        ResolveResult::Unbound => Ok(None),
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
