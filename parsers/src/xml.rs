//! XML to records: one for every element at the path `each`.
//!
//! A path is read within the nearest element that it shares with `each`: `value` within the record,
//! `../@part` within the record's parent, `/export/head/operator` once for the whole export. What
//! stands after the records counts as well as what stands before.
//!
//! Not here: document types and entities (refused), schemas, namespaces beyond being declared.
//!
//! Invariant: an export is read to its end, or refused; depth is bounded and nothing recurses.

mod document;
pub(crate) mod events;
mod lines;
mod malformed;

use crate::grid::{BLANK, Content, Field, Place};
use crate::names::shorten;
use crate::parsed::{Parsed, Refused};
use crate::reader::{OTHER_FORM, Reader, Roles};
use crate::runs::Runs;
use crate::source::Where;
use crate::xml_path::XmlPath;
use document::Document;

/// Reads decoded text. `once` holds the contents that are the same for the whole export, by source.
pub(crate) fn read(
    text: &str,
    reader: &Reader,
    each: &XmlPath,
    once: Vec<Option<Content>>,
) -> Result<Parsed, Refused> {
    let sources = &reader.roles.sources;
    if !text.trim_start().starts_with('<') {
        return Err(Refused::new(format!(
            "this is not XML, as this instrument's exports are; it begins with `{}`",
            shorten(text)
        ))
        .hint(OTHER_FORM));
    }
    let mut document = Document::new(text, reader, each);
    document.read()?;
    check_found(&document, &reader.roles)?;
    let mut runs = Runs::new(&reader.roles);
    for record in &document.records {
        let fields: Vec<Field<'_>> = sources
            .iter()
            .zip(&record.found)
            .zip(&once)
            .map(
                |((source, found), once)| match (once, found, &source.from) {
                    (Some(content), _, _) => source.once_field(content),
                    (None, Some(found), Where::Xml(path)) => Field {
                        place: Place::Element {
                            line: found.line,
                            path: path.shown(),
                        },
                        content: &found.content,
                    },
                    (None, _, Where::Xml(path)) => Field {
                        place: Place::Element {
                            line: record.line,
                            path: path.shown(),
                        },
                        content: &BLANK,
                    },
                    (None, _, _) => Field {
                        place: Place::Rule,
                        content: &BLANK,
                    },
                },
            )
            .collect();
        runs.add(&fields, None);
    }
    let missing_end = reader.roles.end.as_ref().filter(|_| !document.ended);
    Ok(runs.finish(missing_end.map(|end| end.text.as_str())))
}

/// Refuses a path that a reading cannot do without and that leads nowhere in the whole export.
fn check_found(document: &Document<'_>, roles: &Roles) -> Result<(), Refused> {
    let optional: Vec<usize> = [
        roles.unit,
        roles.nominal,
        roles.lower.map(|limit| limit.source),
        roles.upper.map(|limit| limit.source),
    ]
    .into_iter()
    .flatten()
    .collect();
    let nowhere = document.sought.iter().find(|sought| {
        !optional.contains(&sought.source)
            && document
                .records
                .iter()
                .all(|record| record.found[sought.source].is_none())
    });
    match nowhere {
        None => Ok(()),
        Some(sought) => Err(Refused::new(format!(
            "there is no {} in this export, where the {} should stand",
            sought.path, roles.sources[sought.source].role
        ))
        .hint("correct the path; names stand without prefix, and case counts")),
    }
}
