//! Cells of xlsb, one by one, after [MS-XLSB].
//!
//! Not from the library, which passes over two kinds of cell as if they were blank: those whose formula
//! ended in an error, and the short ones that follow another cell.

mod format;
mod records;

use std::collections::BTreeMap;
use std::io::{BufReader, Cursor};
use std::ops::ControlFlow;

use calamine::{ExcelDateTime, ExcelDateTimeType};
use quick_xml::events::Event;
use zip::ZipArchive;

use super::rows::{Rows, date_of, number, span_of_time, text, truth};
use crate::damage::{damaged, of_zip};
use crate::grid::{Content, Grid};
use crate::parsed::Refused;
use crate::rule::Bounds;
use crate::sheets::Named;
use format::Shown;
use records::{Zip, f64_at, u16_at, u32_at, wide_text};

pub(super) struct Book<'a> {
    zip: Zip<'a>,
    /// Sheets with their parts.
    sheets: Vec<(Named, String)>,
    texts: Vec<Box<str>>,
    styles: Vec<Shown>,
    is_1904: bool,
}

pub(super) fn open(bytes: &[u8]) -> Result<Book<'_>, Refused> {
    let mut zip = ZipArchive::new(Cursor::new(bytes)).map_err(|why| of_zip(&why))?;
    let targets = targets(&mut zip)?;
    let mut sheets = Vec::new();
    let mut is_1904 = false;
    let mut ended = false;
    records::each(&mut zip, "xl/workbook.bin", |kind, data| {
        match kind {
            WORKBOOK_PROPERTIES => is_1904 = data.first().is_some_and(|flags| flags & 1 != 0),
            SHEET => {
                let listed = || {
                    let state = u32_at(data, 0)?;
                    let (relation, rest) = wide_text(data.get(8..)?)?;
                    let (name, _) = wide_text(rest)?;
                    Some((state, relation, name))
                };
                let (state, relation, name) = listed().ok_or_else(short)?;
                // A sheet of macros or of one chart has another kind of part.
                if let Some(part) = targets.get(&relation)
                    && part.starts_with("xl/worksheets/")
                {
                    let visible = state == 0;
                    sheets.push((Named { name, visible }, part.clone()));
                }
            }
            SHEETS_END => {
                ended = true;
                return Ok(ControlFlow::Break(()));
            }
            _ => {}
        }
        Ok(ControlFlow::Continue(()))
    })?;
    if !ended {
        return Err(damaged("its list of sheets has no end"));
    }
    let texts = texts(&mut zip)?;
    let styles = styles(&mut zip)?;
    Ok(Book {
        zip,
        sheets,
        texts,
        styles,
        is_1904,
    })
}

pub(super) fn sheets(book: &Book<'_>) -> Vec<Named> {
    book.sheets.iter().map(|(name, _)| name.clone()).collect()
}

pub(super) fn grid(book: &mut Book<'_>, name: &str, bounds: &Bounds) -> Result<Grid, Refused> {
    let part = book.sheets.iter().find(|(sheet, _)| sheet.name == name);
    let Some((_, part)) = part.cloned() else {
        return Err(damaged("a sheet is listed that it does not hold"));
    };
    let mut rows = Rows::new(name, bounds);
    let (mut row, mut next) = (0, 0);
    let mut ended = false;
    let Book {
        zip,
        texts,
        styles,
        is_1904,
        ..
    } = book;
    let meaning = Meaning {
        texts,
        styles,
        is_1904: *is_1904,
    };
    records::each(zip, &part, |kind, data| {
        match kind {
            ROW => {
                row = u32_at(data, 0).ok_or_else(short)?;
                next = 0;
            }
            CELL_FIRST..=CELL_LAST | RICH_TEXT => {
                let column = u32_at(data, 0).ok_or_else(short)?;
                let content = meaning.of(kind, data.get(4..).ok_or_else(short)?)?;
                rows.put((row, column), content)?;
                next = column.saturating_add(1);
            }
            SHORT_FIRST..=SHORT_LAST => {
                rows.put((row, next), meaning.of(long(kind), data)?)?;
                next = next.saturating_add(1);
            }
            SHEET_DATA_END => {
                ended = true;
                return Ok(ControlFlow::Break(()));
            }
            _ => {}
        }
        Ok(ControlFlow::Continue(()))
    })?;
    if !ended {
        return Err(damaged("a sheet has no end"));
    }
    Ok(rows.grid())
}

const ROW: u16 = 0;
const CELL_FIRST: u16 = 1;
const CELL_LAST: u16 = 11;
const SHORT_FIRST: u16 = 12;
const SHORT_LAST: u16 = 18;
const TEXT: u16 = 19;
const FORMAT: u16 = 44;
const STYLE: u16 = 47;
const RICH_TEXT: u16 = 62;
const SHEETS_END: u16 = 144;
const SHEET_DATA_END: u16 = 146;
const WORKBOOK_PROPERTIES: u16 = 153;
const SHEET: u16 = 156;
const STYLES_BEGIN: u16 = 617;
const STYLES_END: u16 = 618;

/// The kind of cell that a short one is.
fn long(kind: u16) -> u16 {
    kind - SHORT_FIRST + CELL_FIRST
}

/// What cells refer to.
struct Meaning<'a> {
    texts: &'a [Box<str>],
    styles: &'a [Shown],
    is_1904: bool,
}

impl Meaning<'_> {
    /// `data` from the style on.
    fn of(&self, kind: u16, data: &[u8]) -> Result<Content, Refused> {
        let style = u32_at(data, 0).ok_or_else(short)? & 0x00FF_FFFF;
        let value = &data[4..];
        let byte = value.first().copied().ok_or_else(short);
        Ok(match kind {
            1 => Content::Blank,
            2 => self.number(style, packed(u32_at(value, 0).ok_or_else(short)?)),
            3 | 11 => Content::Unusable(error(byte?).into()),
            4 | 10 => truth(byte? != 0),
            5 | 9 => self.number(style, f64_at(value, 0).ok_or_else(short)?),
            6 | 8 => self.text(value)?,
            7 => {
                let index = u32_at(value, 0).ok_or_else(short)?;
                let shared = usize::try_from(index)
                    .ok()
                    .and_then(|at| self.texts.get(at));
                text(shared.ok_or_else(|| damaged("a cell refers to a text that is not there"))?)
            }
            RICH_TEXT => self.text(value.get(1..).ok_or_else(short)?)?,
            _ => Content::Unusable("what cannot be read".into()),
        })
    }

    fn text(&self, value: &[u8]) -> Result<Content, Refused> {
        let (found, _) = wide_text(value).ok_or_else(short)?;
        Ok(text(&found))
    }

    fn number(&self, style: u32, value: f64) -> Content {
        let shown = usize::try_from(style)
            .ok()
            .and_then(|at| self.styles.get(at));
        match shown {
            _ if !value.is_finite() => number(value),
            Some(Shown::Span) => span_of_time(),
            Some(Shown::Date) => date_of(ExcelDateTime::new(
                value,
                ExcelDateTimeType::DateTime,
                self.is_1904,
            )),
            Some(Shown::Number) | None => number(value),
        }
    }
}

/// A number packed into 30 bits and two flags: a hundredth, a whole number (2.5.122).
fn packed(bits: u32) -> f64 {
    let value = match bits & 2 {
        0 => f64::from_bits(u64::from(bits & !3) << 32),
        _ => f64::from(bits.cast_signed() >> 2),
    };
    if bits & 1 == 0 { value } else { value / 100.0 }
}

/// 2.5.97.2.
fn error(code: u8) -> String {
    let name = match code {
        0x00 => "#NULL!",
        0x07 => "#DIV/0!",
        0x0F => "#VALUE!",
        0x17 => "#REF!",
        0x1D => "#NAME?",
        0x24 => "#NUM!",
        0x2A => "#N/A",
        0x2B => "#GETTING_DATA",
        _ => return format!("the error of code {code}"),
    };
    format!("the error `{name}`")
}

fn short() -> Refused {
    damaged("a record is cut short")
}

/// The table of shared texts.
fn texts(zip: &mut Zip<'_>) -> Result<Vec<Box<str>>, Refused> {
    let mut texts = Vec::new();
    records::each(zip, "xl/sharedStrings.bin", |kind, data| {
        if kind == TEXT {
            let text = data.get(1..).and_then(wide_text);
            texts.push(text.ok_or_else(short)?.0.into());
        }
        Ok(ControlFlow::Continue(()))
    })?;
    Ok(texts)
}

/// By style, what its numbers are shown as.
fn styles(zip: &mut Zip<'_>) -> Result<Vec<Shown>, Refused> {
    let mut formats = BTreeMap::new();
    let mut styles = Vec::new();
    let mut of_cells = false;
    records::each(zip, "xl/styles.bin", |kind, data| {
        match kind {
            FORMAT => {
                let number = u16_at(data, 0).ok_or_else(short)?;
                let (code, _) = data.get(2..).and_then(wide_text).ok_or_else(short)?;
                formats.insert(number, Shown::of_code(&code));
            }
            STYLES_BEGIN => of_cells = true,
            STYLES_END => of_cells = false,
            STYLE if of_cells => {
                let number = u16_at(data, 2).ok_or_else(short)?;
                let own = formats.get(&number).copied();
                styles.push(own.unwrap_or_else(|| Shown::of_number(number)));
            }
            _ => {}
        }
        Ok(ControlFlow::Continue(()))
    })?;
    Ok(styles)
}

/// Relation to part.
fn targets(zip: &mut Zip<'_>) -> Result<BTreeMap<String, String>, Refused> {
    let mut targets = BTreeMap::new();
    let Some(part) = records::part(zip, "xl/_rels/workbook.bin.rels")? else {
        return Ok(targets);
    };
    let mut xml = quick_xml::Reader::from_reader(BufReader::new(part));
    let mut buffer = Vec::new();
    loop {
        buffer.clear();
        match xml.read_event_into(&mut buffer) {
            Ok(Event::Start(element) | Event::Empty(element)) => {
                let of = |name: &str| {
                    element
                        .attributes()
                        .flatten()
                        .find(|attribute| attribute.key.as_ref() == name)
                        .map(|attribute| attribute.value.to_string())
                };
                if let (Some(id), Some(target)) = (of("Id"), of("Target")) {
                    let part = match target.strip_prefix('/') {
                        Some(absolute) => absolute.to_owned(),
                        None => format!("xl/{target}"),
                    };
                    targets.insert(id, part);
                }
            }
            Ok(Event::Eof) => return Ok(targets),
            Ok(_) => {}
            Err(_) => return Err(damaged("a part is no well-formed XML")),
        }
    }
}
