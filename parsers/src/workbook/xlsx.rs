//! Cells of xlsx, one by one: two far cells cost two cells.

use std::io::Cursor;

use calamine::{Reader as _, SheetType, Xlsx, XlsxError, XlsxFormulaMetadata};

use super::rows::{NO_RESULT, Rows, content};
use crate::damage::{damaged, of_cell, of_workbook};
use crate::grid::{Content, Grid};
use crate::parsed::Refused;
use crate::rule::Bounds;
use crate::sheets::Named;

type Book<'a> = Xlsx<Cursor<&'a [u8]>>;

pub(super) fn open(bytes: &[u8]) -> Result<Book<'_>, Refused> {
    Xlsx::new(Cursor::new(bytes)).map_err(|why| of_workbook(&why))
}

pub(super) fn sheets(book: &Book<'_>) -> Vec<Named> {
    super::listed_by_library(book.sheets_metadata(), SheetType::WorkSheet)
}

pub(super) fn grid(book: &mut Book<'_>, name: &str, bounds: &Bounds) -> Result<Grid, Refused> {
    let mut scan = Scan::of(book, name, None, bounds)?;
    if scan.unreadable > 0 {
        let places = places(book, name, &scan, bounds)?;
        scan = Scan::of(book, name, Some(&places), bounds)?;
    }
    Ok(scan.rows.grid())
}

/// The place of every cell. The reader of values says nothing of the place of a cell that it cannot
/// read, and takes cells without a stated place to follow the last one it could.
fn places(
    book: &mut Book<'_>,
    name: &str,
    scan: &Scan<'_>,
    bounds: &Bounds,
) -> Result<Vec<(u32, u32)>, Refused> {
    if scan.largest_shared_formula > bounds.cells as usize {
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

struct Scan<'a> {
    rows: Rows<'a>,
    unreadable: usize,
    largest_shared_formula: usize,
}

impl<'a> Scan<'a> {
    /// Reads all cells; `places` overrules where the reader takes them to be.
    fn of(
        book: &mut Book<'_>,
        sheet: &str,
        places: Option<&[(u32, u32)]>,
        bounds: &'a Bounds,
    ) -> Result<Self, Refused> {
        let mut reader = book
            .worksheet_cells_reader(sheet)
            .map_err(|why| of_workbook(&why))?;
        let mut scan = Self {
            rows: Rows::new(sheet, bounds),
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
                    scan.largest_shared_formula =
                        scan.largest_shared_formula.max(shared.unwrap_or(0));
                    let content = match (&cell.value, &cell.formula) {
                        (calamine::DataRef::Empty, Some(_)) => Content::Unusable(NO_RESULT.into()),
                        (value, _) => content(value),
                    };
                    scan.rows.put(place.unwrap_or(cell.pos), content)?;
                }
                Ok(None) => break,
                Err(why) if costs_one_cell(&why) => {
                    scan.unreadable += 1;
                    if let Some(place) = place {
                        scan.rows
                            .put(place, Content::Unusable(of_cell(&why).into()))?;
                    }
                }
                Err(why) => return Err(of_workbook(&why)),
            }
        }
        Ok(scan)
    }
}
