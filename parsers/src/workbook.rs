//! One sheet of an xlsx workbook to rows of cells.
//!
//! Only the cell-by-cell reader is used: the library's rectangular range would allocate whatever the
//! farthest cells span. A panic of the library on a crafted file is one refused export.

use std::collections::BTreeMap;
use std::io::Cursor;
use std::panic::{AssertUnwindSafe, catch_unwind};

use calamine::{
    DataRef, ExcelDateTime, Reader as _, SheetType, SheetVisible, Xlsx,
    XlsxCellFormulaMetadataRecord, XlsxError, XlsxFormulaMetadata,
};
use jiff::civil;

use crate::container;
use crate::damage::{damaged, of_cell, of_workbook};
use crate::grid::{Content, Grid, Origin, Row, cell_name};
use crate::kind::Kind;
use crate::names::shorten;
use crate::parsed::Refused;
use crate::rule::Bounds;
use crate::sheets::{Named, Sheets};

/// The cells of the sheets that are asked for.
pub(crate) fn grids(
    bytes: &[u8],
    kind: Kind,
    sheets: &Sheets,
    bounds: &Bounds,
) -> Result<Vec<Grid>, Refused> {
    container::check(bytes, kind, bounds)?;
    catch_unwind(AssertUnwindSafe(|| {
        let mut book = Xlsx::new(Cursor::new(bytes)).map_err(|why| of_workbook(&why))?;
        let mut left = *bounds;
        let mut grids = Vec::new();
        for name in sheets.chosen(&listed(&book))? {
            let grid = cells(&mut book, &name, &left)?;
            let used = grid.rows.iter().map(|row| row.cells.len()).sum::<usize>();
            left.cells = left
                .cells
                .saturating_sub(u32::try_from(used).unwrap_or(u32::MAX));
            grids.push(grid);
        }
        Ok(grids)
    }))
    .unwrap_or_else(|_| Err(damaged("its cells cannot be read")))
}

fn listed(book: &Xlsx<Cursor<&[u8]>>) -> Vec<Named> {
    book.sheets_metadata()
        .iter()
        .filter(|sheet| sheet.typ == SheetType::WorkSheet)
        .map(|sheet| Named {
            name: sheet.name.clone(),
            visible: sheet.visible == SheetVisible::Visible,
        })
        .collect()
}

fn cells(book: &mut Xlsx<Cursor<&[u8]>>, name: &str, bounds: &Bounds) -> Result<Grid, Refused> {
    let mut rows = Rows::scan(book, name, None, bounds)?;
    if rows.unreadable > 0 {
        let places = places(book, name, &rows)?;
        rows = Rows::scan(book, name, Some(&places), bounds)?;
    }
    let rows = rows.rows.into_values().collect();
    Ok(Grid {
        origin: Origin::Sheet(shorten(name).into()),
        rows,
    })
}

/// The place of every cell. The reader of values says nothing of the place of a cell that it cannot
/// read, and takes cells without a stated place to follow the last one it could.
fn places(
    book: &mut Xlsx<Cursor<&[u8]>>,
    name: &str,
    scanned: &Rows<'_>,
) -> Result<Vec<(u32, u32)>, Refused> {
    if scanned.largest_shared_formula > scanned.bounds.cells as usize {
        return Err(damaged("a shared formula is numbered beyond all cells"));
    }
    let mut reader = book
        .worksheet_cells_reader(name)
        .map_err(|why| of_workbook(&why))?;
    let mut places = Vec::new();
    while let Some(cell) = reader.next_formula().map_err(|why| of_workbook(&why))? {
        places.push(cell.get_position());
    }
    Ok(places)
}

/// Faults after which the reader goes on with the next cell.
fn costs_one_cell(why: &XlsxError) -> bool {
    matches!(
        why,
        XlsxError::CellError(_)
            | XlsxError::CellTAttribute(_)
            | XlsxError::ParseFloat(_)
            | XlsxError::ParseInt(_)
            | XlsxError::Unrecognized { .. }
    )
}

/// Rows while cells arrive.
struct Rows<'a> {
    sheet: &'a str,
    bounds: &'a Bounds,
    rows: BTreeMap<u32, Row>,
    cells: usize,
    unreadable: usize,
    largest_shared_formula: usize,
}

impl<'a> Rows<'a> {
    /// Reads all cells; `places` overrules where the reader takes them to be.
    fn scan(
        book: &mut Xlsx<Cursor<&[u8]>>,
        sheet: &'a str,
        places: Option<&[(u32, u32)]>,
        bounds: &'a Bounds,
    ) -> Result<Self, Refused> {
        let mut reader = book
            .worksheet_cells_reader(sheet)
            .map_err(|why| of_workbook(&why))?;
        let mut rows = Rows {
            sheet,
            bounds,
            rows: BTreeMap::new(),
            cells: 0,
            unreadable: 0,
            largest_shared_formula: 0,
        };
        for index in 0.. {
            let place = places.and_then(|places| places.get(index)).copied();
            match reader.next_cell_with_formula_metadata() {
                Ok(Some(cell)) => {
                    let shared = cell
                        .formula
                        .as_ref()
                        .and_then(XlsxFormulaMetadata::shared_index);
                    rows.largest_shared_formula =
                        rows.largest_shared_formula.max(shared.unwrap_or(0));
                    let place = place.unwrap_or(cell.pos);
                    let content = rows.content(place, cell)?;
                    rows.put(place, content)?;
                }
                Ok(None) => break,
                Err(why) if costs_one_cell(&why) => {
                    rows.unreadable += 1;
                    if let Some(place) = place {
                        rows.put(place, Content::Unusable(of_cell(&why).into()))?;
                    }
                }
                Err(why) => return Err(of_workbook(&why)),
            }
        }
        Ok(rows)
    }

    fn put(&mut self, (row, column): (u32, u32), content: Content) -> Result<(), Refused> {
        if content == Content::Blank {
            return Ok(());
        }
        if column >= self.bounds.columns {
            return Err(self.beyond(row, column, "columns", self.bounds.columns));
        }
        if row >= self.bounds.rows {
            return Err(self.beyond(row, column, "rows", self.bounds.rows));
        }
        self.cells += 1;
        if self.cells > self.bounds.cells as usize {
            return Err(Refused::new(format!(
                "more than {} cells; that is the limit",
                self.bounds.cells
            )));
        }
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

    fn content(
        &self,
        (row, column): (u32, u32),
        cell: XlsxCellFormulaMetadataRecord<'_>,
    ) -> Result<Content, Refused> {
        let text = |text: &str| {
            if text.len() > self.bounds.text_bytes as usize {
                return Err(Refused::new(format!(
                    "sheet `{}`, cell {}: a text of {} bytes; the limit is {}",
                    self.sheet,
                    cell_name(row, column),
                    text.len(),
                    self.bounds.text_bytes
                )));
            }
            Ok(match text.trim() {
                "" => Content::Blank,
                _ => Content::Text(text.into()),
            })
        };
        let number = |number: f64| match number.is_finite() {
            true => Content::Number(number),
            false => Content::Unusable(format!("`{number}`, which is no finite number").into()),
        };
        Ok(match cell.value {
            DataRef::Empty if cell.formula.is_some() => {
                Content::Unusable("a formula without a result".into())
            }
            DataRef::Empty => Content::Blank,
            DataRef::Int(whole) => number(whole as f64),
            DataRef::Float(float) => number(float),
            DataRef::String(string) => text(&string)?,
            DataRef::SharedString(string) => text(string)?,
            DataRef::DateTimeIso(string) | DataRef::DurationIso(string) => text(&string)?,
            DataRef::Bool(truth) => Content::Text(if truth { "TRUE" } else { "FALSE" }.into()),
            DataRef::DateTime(date) => date_of(date),
            DataRef::Error(error) => Content::Unusable(format!("the error `{error}`").into()),
        })
    }

    fn beyond(&self, row: u32, column: u32, what: &str, limit: u32) -> Refused {
        Refused::new(format!(
            "sheet `{}`, cell {}: beyond the limit of {limit} {what}",
            self.sheet,
            cell_name(row, column)
        ))
    }
}

fn date_of(date: ExcelDateTime) -> Content {
    if date.is_duration() {
        return Content::Unusable("a span of time".into());
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
