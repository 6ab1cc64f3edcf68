//! A compound file, judged before the xls in it is read.
//!
//! The reader of xls takes the rectangle that a sheet's cells span, and the one that it claims to
//! span, for allocations; both must be ones that a sheet can have, and the sum one that memory can.

mod streams;

use crate::damage::{NO_PASSWORD, damaged};
use crate::parsed::Refused;
use crate::rule::Bounds;
use streams::{Streams, u16_at, u32_at};

/// Rows and columns of an xls sheet.
const ROWS: u32 = 1 << 16;
const COLUMNS: u32 = 1 << 8;
/// Cells that the rectangles of all sheets may have together.
const RECTANGLES_MAX: u64 = 1 << 22;
/// Sheets of a workbook.
const SHEETS_MAX: usize = 1024;

/// Refuses everything but an open xls workbook of bounded size.
pub(crate) fn check(bytes: &[u8], bounds: &Bounds) -> Result<(), Refused> {
    let cut = || Refused {
        sentence: "the workbook is cut short or damaged: its streams cannot be read".to_owned(),
        hint: Some("export it again".to_owned()),
        perhaps_unfinished: true,
    };
    let file = Streams::open(bytes).ok_or_else(cut)?;
    if file.has("EncryptedPackage") {
        return Err(protected());
    }
    let Some(name) = ["Workbook", "Book"].into_iter().find(|name| file.has(name)) else {
        let what = match file.has("WordDocument") {
            true => "this is a text document (doc), no workbook",
            false => "this is a compound file that holds no workbook",
        };
        return Err(
            Refused::new(what).hint("have it saved as xlsx, or leave such files out with `files`")
        );
    };
    let stream = file.read(name).ok_or_else(cut)?;
    measure(&stream, bounds)
}

fn protected() -> Refused {
    Refused::new("the workbook is protected by a password").hint(NO_PASSWORD)
}

fn measure(stream: &[u8], bounds: &Bounds) -> Result<(), Refused> {
    let mut sheets = Vec::new();
    let mut ended = false;
    for record in Records::at(stream, 0) {
        let (kind, data) = record?;
        match kind {
            FILE_PASS => return Err(protected()),
            BOUND_SHEET => sheets.push(u32_at(data, 0).ok_or_else(short)? as usize),
            END => {
                ended = true;
                break;
            }
            _ => {}
        }
    }
    if !ended {
        return Err(damaged("it ends within its list of sheets"));
    }
    if sheets.len() > SHEETS_MAX {
        return Err(Refused::new(format!(
            "the workbook has {} sheets; the limit is {SHEETS_MAX}",
            sheets.len()
        )));
    }
    let (mut area, mut walked) = (0_u64, 0_u64);
    for (index, start) in sheets.into_iter().enumerate() {
        let span = span(stream, start)?;
        area += span.area();
        walked += span.walked;
        if area > RECTANGLES_MAX {
            return Err(Refused::new(format!(
                "sheet {} of this xls workbook spans so much that all have more than {RECTANGLES_MAX} cells, blank ones counted; that is the limit",
                index + 1
            ))
            .hint("have it saved as xlsx, where blank cells cost nothing"));
        }
        if walked > bounds.inflated_bytes {
            return Err(damaged("its sheets lie over each other"));
        }
    }
    Ok(())
}

const FILE_PASS: u16 = 0x002F;
const BOUND_SHEET: u16 = 0x0085;
const BEGIN: u16 = 0x0809;
const END: u16 = 0x000A;
const DIMENSIONS: u16 = 0x0200;
const MULTIPLE: u16 = 0x00BD;
/// Records of one cell, which begin with its row and column.
const CELLS: [u16; 7] = [0x0006, 0x00D6, 0x00FD, 0x0203, 0x0204, 0x0205, 0x027E];

#[derive(Default)]
struct Span {
    rows: Option<(u16, u16)>,
    columns: Option<(u16, u16)>,
    walked: u64,
}

impl Span {
    fn take(&mut self, row: u16, column: u16) {
        let wider = |range: &mut Option<(u16, u16)>, at: u16| {
            let (low, high) = range.unwrap_or((at, at));
            *range = Some((low.min(at), high.max(at)));
        };
        wider(&mut self.rows, row);
        wider(&mut self.columns, column);
    }

    fn area(&self) -> u64 {
        let length =
            |range: Option<(u16, u16)>| range.map_or(0, |(low, high)| u64::from(high - low) + 1);
        length(self.rows) * length(self.columns)
    }
}

fn span(stream: &[u8], start: usize) -> Result<Span, Refused> {
    let mut span = Span::default();
    let mut depth = 0_usize;
    for record in Records::at(stream, start) {
        let (kind, data) = record?;
        span.walked += data.len() as u64 + 4;
        match kind {
            BEGIN => depth += 1,
            END if depth <= 1 => return Ok(span),
            END => depth -= 1,
            DIMENSIONS if depth <= 1 => check_claim(data)?,
            MULTIPLE if depth <= 1 => {
                let row = u16_at(data, 0).ok_or_else(short)?;
                let last = data.len().checked_sub(2).ok_or_else(short)?;
                span.take(row, u16_at(data, 2).ok_or_else(short)?);
                span.take(row, u16_at(data, last).ok_or_else(short)?);
            }
            _ if depth <= 1 && CELLS.contains(&kind) => span.take(
                u16_at(data, 0).ok_or_else(short)?,
                u16_at(data, 2).ok_or_else(short)?,
            ),
            _ => {}
        }
    }
    Err(damaged("a sheet has no end"))
}

/// The rectangle that a sheet claims to span.
fn check_claim(data: &[u8]) -> Result<(), Refused> {
    let (first, end, columns) = match data.len() {
        10 => (
            u16_at(data, 0).map(u32::from),
            u16_at(data, 2).map(u32::from),
            u16_at(data, 6),
        ),
        _ => (u32_at(data, 0), u32_at(data, 4), u16_at(data, 10)),
    };
    let (Some(first), Some(end), Some(columns)) = (first, end, columns) else {
        return Err(short());
    };
    let is_sound = first <= ROWS && end <= ROWS && u32::from(columns) <= COLUMNS;
    if !is_sound || (end > 0 && first >= end) {
        return Err(damaged("a sheet claims rows or columns that do not exist"));
    }
    Ok(())
}

fn short() -> Refused {
    damaged("a record is cut short")
}

/// Records of a stream, each its kind and data.
struct Records<'a> {
    rest: &'a [u8],
}

impl<'a> Records<'a> {
    fn at(stream: &'a [u8], start: usize) -> Self {
        Self {
            rest: stream.get(start..).unwrap_or_default(),
        }
    }
}

impl<'a> Iterator for Records<'a> {
    type Item = Result<(u16, &'a [u8]), Refused>;

    fn next(&mut self) -> Option<Self::Item> {
        if self.rest.is_empty() {
            return None;
        }
        let record = || {
            let kind = u16_at(self.rest, 0)?;
            let length = usize::from(u16_at(self.rest, 2)?);
            let data = self.rest.get(4..4 + length)?;
            Some((kind, data, self.rest.get(4 + length..)?))
        };
        match record() {
            Some((kind, data, rest)) => {
                self.rest = rest;
                Some(Ok((kind, data)))
            }
            None => {
                self.rest = &[];
                Some(Err(short()))
            }
        }
    }
}
