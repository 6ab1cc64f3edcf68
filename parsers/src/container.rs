//! A workbook's zip container, judged by what it states of itself before anything is inflated.
//!
//! The zip reader ends a part that grows beyond its stated size with an error, so that the stated
//! sizes bound what reading can cost.

use std::io::{BufReader, Cursor};

use quick_xml::events::Event;
use zip::ZipArchive;

use crate::damage::{NO_PASSWORD, damaged, of_zip};
use crate::kind::Kind;
use crate::parsed::Refused;
use crate::rule::Bounds;

/// Parts of a workbook; real ones have some dozens.
const PARTS_MAX: usize = 4096;

/// Refuses everything but an xlsx workbook of bounded size.
pub(crate) fn check(bytes: &[u8], kind: Kind, bounds: &Bounds) -> Result<(), Refused> {
    if kind == Kind::Compound {
        return Err(compound(bytes));
    }
    let mut zip = ZipArchive::new(Cursor::new(bytes)).map_err(|_| Refused {
        sentence: "the workbook is cut short or damaged: its table of parts cannot be read"
            .to_owned(),
        hint: Some("export it again".to_owned()),
        perhaps_unfinished: true,
    })?;
    if zip.len() > PARTS_MAX {
        return Err(Refused::new(format!(
            "the workbook has {} parts; the limit is {PARTS_MAX}",
            zip.len()
        )));
    }
    let mut inflated = 0_u64;
    let mut names = Vec::with_capacity(zip.len());
    for index in 0..zip.len() {
        let part = zip.by_index_raw(index).map_err(|why| of_zip(&why))?;
        inflated = inflated.saturating_add(part.size());
        names.push(
            String::from_utf8_lossy(part.name_raw())
                .replace('\\', "/")
                .to_lowercase(),
        );
    }
    if inflated > bounds.inflated_bytes {
        return Err(Refused::new(format!(
            "the workbook states {inflated} bytes when inflated; the limit is {}",
            bounds.inflated_bytes
        )));
    }
    let has = |name: &str| names.iter().any(|part| part == name);
    if has("xl/workbook.bin") {
        return Err(not_yet("an xlsb workbook"));
    }
    if has("content.xml") {
        return Err(not_yet("an OpenDocument file"));
    }
    if !has("_rels/.rels") {
        return Err(Refused::new("this is a zip archive that holds no workbook")
            .hint("have it saved as xlsx, or leave such files out with `files`"));
    }
    let tables: Vec<usize> = (0..names.len())
        .filter(|&index| names[index].ends_with("sharedstrings.xml"))
        .collect();
    for index in tables {
        check_string_count(&mut zip, index)?;
    }
    Ok(())
}

/// The count that a string table states is taken as an allocation by its reader: it must be one that
/// the part can hold.
fn check_string_count(zip: &mut ZipArchive<Cursor<&[u8]>>, index: usize) -> Result<(), Refused> {
    let part = zip.by_index(index).map_err(|why| of_zip(&why))?;
    let size = part.size();
    let mut xml = quick_xml::Reader::from_reader(BufReader::new(part));
    let mut buffer = Vec::new();
    loop {
        buffer.clear();
        match xml.read_event_into(&mut buffer) {
            Ok(Event::Start(element) | Event::Empty(element)) => {
                let stated = element
                    .attributes()
                    .flatten()
                    .find(|attribute| attribute.key.local_name().as_ref() == "uniqueCount")
                    .and_then(|attribute| attribute.value.parse::<u64>().ok());
                return match stated {
                    Some(count) if count > size => Err(Refused::new(format!(
                        "the workbook states {count} texts in a table of {size} bytes"
                    ))),
                    _ => Ok(()),
                };
            }
            Ok(Event::Eof) => return Ok(()),
            Ok(_) => {}
            Err(_) => return Err(damaged("its table of texts is no well-formed XML")),
        }
    }
}

fn compound(bytes: &[u8]) -> Refused {
    let name: Vec<u8> = "EncryptedPackage"
        .encode_utf16()
        .flat_map(u16::to_le_bytes)
        .collect();
    if bytes.windows(name.len()).any(|window| window == name) {
        return Refused {
            sentence: "the workbook is protected by a password".to_owned(),
            hint: Some(NO_PASSWORD.to_owned()),
            perhaps_unfinished: false,
        };
    }
    not_yet("an xls workbook")
}

fn not_yet(what: &str) -> Refused {
    Refused {
        sentence: format!("this is {what}, which is not yet read"),
        hint: Some("have it saved as xlsx".to_owned()),
        perhaps_unfinished: false,
    }
}
