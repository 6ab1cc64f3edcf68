//! The rows of one sheet while its cells arrive, each cell within the bounds; and what a cell's value
//! means, the same for every kind of workbook.

use std::collections::BTreeMap;

use calamine::{DataRef, ExcelDateTime};
use jiff::civil;

use crate::grid::{Content, Grid, Origin, Row, cell_name};
use crate::names::shorten;
use crate::parsed::Refused;
use crate::rule::Bounds;

/// A formula whose result the writer left out.
pub(super) const NO_RESULT: &str = "a formula without a result";

/// Rows of one sheet.
pub(super) struct Rows<'a> {
    sheet: Box<str>,
    bounds: &'a Bounds,
    rows: BTreeMap<u32, Row>,
    /// Cells that hold something.
    pub(super) held: usize,
    /// Cells of any kind that the sheet lists.
    listed: usize,
}

impl<'a> Rows<'a> {
    pub(super) fn new(sheet: &str, bounds: &'a Bounds) -> Self {
        Self {
            sheet: shorten(sheet).into(),
            bounds,
            rows: BTreeMap::new(),
            held: 0,
            listed: 0,
        }
    }

    pub(super) fn grid(self) -> Grid {
        Grid {
            origin: Origin::Sheet(self.sheet),
            rows: self.rows.into_values().collect(),
        }
    }

    /// Takes one cell; two contents in one place are none.
    pub(super) fn put(
        &mut self,
        (row, column): (u32, u32),
        content: Content,
    ) -> Result<(), Refused> {
        self.listed += 1;
        if self.listed > self.bounds.cells as usize {
            return Err(self.too_many());
        }
        if content == Content::Blank {
            return Ok(());
        }
        if column >= self.bounds.columns {
            return Err(self.beyond(row, column, "columns", self.bounds.columns));
        }
        if row >= self.bounds.rows {
            return Err(self.beyond(row, column, "rows", self.bounds.rows));
        }
        if let Content::Text(text) = &content
            && text.len() > self.bounds.text_bytes as usize
        {
            return Err(Refused::new(format!(
                "sheet `{}`, cell {}: a text of {} bytes; the limit is {}",
                self.sheet,
                cell_name(row, column),
                text.len(),
                self.bounds.text_bytes
            )));
        }
        self.held += 1;
        let cells = &mut self
            .rows
            .entry(row)
            .or_insert_with(|| Row::new(row, None))
            .cells;
        match cells.last() {
            Some((last, _)) if *last >= column => {
                match cells.binary_search_by_key(&column, |(column, _)| *column) {
                    Ok(twice) => cells[twice].1 = Content::Unusable("two contents".into()),
                    Err(at) => cells.insert(at, (column, content)),
                }
            }
            _ => cells.push((column, content)),
        }
        Ok(())
    }

    pub(super) fn too_many(&self) -> Refused {
        Refused::new(format!(
            "more than {} cells; that is the limit",
            self.bounds.cells
        ))
    }

    fn beyond(&self, row: u32, column: u32, what: &str, limit: u32) -> Refused {
        Refused::new(format!(
            "sheet `{}`, cell {}: beyond the limit of {limit} {what}",
            self.sheet,
            cell_name(row, column)
        ))
    }
}

pub(super) fn text(text: &str) -> Content {
    match text.trim() {
        "" => Content::Blank,
        _ => Content::Text(text.into()),
    }
}

pub(super) fn number(number: f64) -> Content {
    match number.is_finite() {
        true => Content::Number(number),
        false => Content::Unusable(format!("`{number}`, which is no finite number").into()),
    }
}

pub(super) fn truth(truth: bool) -> Content {
    Content::Text(if truth { "TRUE" } else { "FALSE" }.into())
}

pub(super) fn span_of_time() -> Content {
    Content::Unusable("a span of time".into())
}

/// A value as the library gives it.
pub(super) fn content(value: &DataRef<'_>) -> Content {
    match value {
        DataRef::Empty => Content::Blank,
        DataRef::Int(whole) => number(*whole as f64),
        DataRef::Float(float) => number(*float),
        DataRef::String(string) => text(string),
        DataRef::SharedString(string) => text(string),
        DataRef::DateTimeIso(string) | DataRef::DurationIso(string) => text(string),
        DataRef::Bool(is) => truth(*is),
        DataRef::DateTime(date) => date_of(*date),
        DataRef::Error(error) => Content::Unusable(format!("the error `{error}`").into()),
    }
}

pub(super) fn date_of(date: ExcelDateTime) -> Content {
    if date.is_duration() {
        return span_of_time();
    }
    let (year, month, day, hour, minute, second, milli) = date.to_ymd_hms_milli();
    let civil = || {
        civil::DateTime::new(
            i16::try_from(year).ok()?,
            i8::try_from(month).ok()?,
            i8::try_from(day).ok()?,
            i8::try_from(hour).ok()?,
            i8::try_from(minute).ok()?,
            i8::try_from(second).ok()?,
            i32::from(milli) * 1_000_000,
        )
        .ok()
    };
    match civil() {
        Some(date) => Content::Date(date),
        None => Content::Unusable(format!("the day {year}-{month}-{day}, which never was").into()),
    }
}
