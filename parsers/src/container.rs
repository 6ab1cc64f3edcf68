//! A workbook's zip container, judged by what it states of itself before anything is inflated.
//!
//! The zip reader ends a part that grows beyond its stated size with an error, so that the stated
//! sizes bound what reading can cost.

use std::io::{BufReader, Cursor, Read as _};

use quick_xml::events::Event;
use zip::ZipArchive;

use crate::damage::{NO_PASSWORD, damaged, of_zip};
use crate::parsed::Refused;
use crate::rule::Bounds;

/// Parts of a workbook; real ones have some dozens.
const PARTS_MAX: usize = 4096;

/// Bytes of a table of texts, which its reader holds whole.
const TEXTS_MAX: u64 = 32 << 20;
/// From this size on a part is searched for texts that are larger than any cell's.
const SEARCHED_FROM: u64 = 8 << 20;
/// Bytes without a mark of XML.
const TEXT_MAX: usize = 4 << 20;
/// From this size on, parts inflate to no more than so many times the file's bytes: tables of numbers
/// do to some twenty times.
const INFLATES_FREELY: u64 = 64 << 20;
const INFLATION_MAX: u64 = 200;
const SPREADSHEET: &str = "application/vnd.oasis.opendocument.spreadsheet";

/// What a zip archive is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Container {
    Xlsx,
    Xlsb,
    Ods,
}

type Zip<'a> = ZipArchive<Cursor<&'a [u8]>>;

struct Part {
    /// Lower case, `/` between folders.
    name: String,
    size: u64,
}

/// Refuses everything but an open workbook of bounded size.
pub(crate) fn check(bytes: &[u8], bounds: &Bounds) -> Result<Container, Refused> {
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
    let mut parts = Vec::with_capacity(zip.len());
    for index in 0..zip.len() {
        let part = zip.by_index_raw(index).map_err(|why| of_zip(&why))?;
        parts.push(Part {
            name: String::from_utf8_lossy(part.name_raw())
                .replace('\\', "/")
                .to_lowercase(),
            size: part.size(),
        });
    }
    let inflated = parts
        .iter()
        .fold(0_u64, |sum, part| sum.saturating_add(part.size));
    if inflated > bounds.inflated_bytes {
        return Err(Refused::new(format!(
            "the workbook states {inflated} bytes when inflated; the limit is {}",
            bounds.inflated_bytes
        )));
    }
    if inflated > INFLATES_FREELY && inflated / INFLATION_MAX > bytes.len() as u64 {
        return Err(Refused::new(format!(
            "the workbook states {inflated} bytes when inflated, more than {INFLATION_MAX} times its own {}; that is the limit",
            bytes.len()
        )));
    }
    let kind = kind(&mut zip, &parts)?;
    for (index, part) in parts.iter().enumerate() {
        let is_texts =
            part.name.ends_with("sharedstrings.xml") || part.name.ends_with("sharedstrings.bin");
        if is_texts && part.size > TEXTS_MAX {
            return Err(Refused::new(format!(
                "the workbook's table of texts has {} bytes; the limit is {TEXTS_MAX}",
                part.size
            )));
        }
        if part.name.ends_with("sharedstrings.xml") {
            check_string_count(&mut zip, index)?;
        }
        if part.name.ends_with(".xml") && part.size > SEARCHED_FROM {
            check_texts(&mut zip, index)?;
        }
    }
    Ok(kind)
}

fn kind(zip: &mut Zip<'_>, parts: &[Part]) -> Result<Container, Refused> {
    let has = |name: &str| parts.iter().any(|part| part.name == name);
    let begins = |folder: &str| parts.iter().any(|part| part.name.starts_with(folder));
    let no_workbook = |what: &str| {
        Err(Refused::new(format!("this is {what}"))
            .hint("have it saved as xlsx, or leave such files out with `files`"))
    };
    if has("xl/workbook.bin") {
        return Ok(Container::Xlsb);
    }
    if has("mimetype") || has("content.xml") {
        let stated = read_short(zip, "mimetype")?;
        if !stated.trim().starts_with(SPREADSHEET) {
            return no_workbook("an OpenDocument file that is no spreadsheet");
        }
        if read_short(zip, "META-INF/manifest.xml")?.contains("encryption-data") {
            return Err(Refused::new("the workbook is protected by a password").hint(NO_PASSWORD));
        }
        return Ok(Container::Ods);
    }
    if begins("word/") {
        return no_workbook("a text document (docx), no workbook");
    }
    if begins("ppt/") {
        return no_workbook("a presentation (pptx), no workbook");
    }
    if !has("_rels/.rels") {
        return no_workbook("a zip archive that holds no workbook");
    }
    Ok(Container::Xlsx)
}

/// The beginning of a part; nothing when there is none.
fn read_short(zip: &mut Zip<'_>, name: &str) -> Result<String, Refused> {
    let part = match zip.by_name(name) {
        Ok(part) => part,
        Err(zip::result::ZipError::FileNotFound) => return Ok(String::new()),
        Err(why) => return Err(of_zip(&why)),
    };
    let mut bytes = Vec::new();
    part.take(1 << 20)
        .read_to_end(&mut bytes)
        .map_err(|_| damaged("a part cannot be unpacked"))?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}

/// The readers hold a text, a tag or an attribute whole, however long it is.
fn check_texts(zip: &mut Zip<'_>, index: usize) -> Result<(), Refused> {
    let mut part = zip.by_index(index).map_err(|why| of_zip(&why))?;
    let mut chunk = vec![0; 64 << 10];
    let mut since = 0;
    loop {
        let read = part
            .read(&mut chunk)
            .map_err(|_| damaged("a part cannot be unpacked"))?;
        let chunk = &chunk[..read];
        if chunk.is_empty() {
            return Ok(());
        }
        match chunk.iter().rposition(|byte| *byte == b'<') {
            Some(last) => since = read - last,
            None => since += read,
        }
        if since > TEXT_MAX {
            return Err(Refused::new(format!(
                "the workbook holds a text of more than {TEXT_MAX} bytes; that is the limit"
            )));
        }
    }
}

/// The count that a string table states is taken as an allocation by its reader: it must be one that
/// the part can hold.
fn check_string_count(zip: &mut Zip<'_>, index: usize) -> Result<(), Refused> {
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
