//! Cells of xls. The library reads all sheets at once and into rectangles; `compound` has measured
//! these before.

use std::io::Cursor;

use calamine::{Data, DataRef, Reader as _, SheetType, Xls, XlsError};

use super::rows::{NO_RESULT, Rows, content};
use crate::damage::{NO_PASSWORD, damaged};
use crate::grid::{Content, Grid};
use crate::parsed::Refused;
use crate::rule::Bounds;
use crate::sheets::Named;

type Book<'a> = Xls<Cursor<&'a [u8]>>;

pub(super) fn open(bytes: &[u8]) -> Result<Book<'_>, Refused> {
    Xls::new(Cursor::new(bytes)).map_err(|why| of_xls(&why))
}

pub(super) fn sheets(book: &Book<'_>) -> Vec<Named> {
    super::listed_by_library(book.sheets_metadata(), SheetType::WorkSheet)
}

pub(super) fn grid(book: &mut Book<'_>, name: &str, bounds: &Bounds) -> Result<Grid, Refused> {
    let range = book.worksheet_range(name).map_err(|why| of_xls(&why))?;
    let formulas = book.worksheet_formula(name).map_err(|why| of_xls(&why))?;
    let mut rows = Rows::new(name, bounds);
    let (top, left) = range.start().unwrap_or_default();
    for (row, column, value) in range.used_cells() {
        let place = (top + row as u32, left + column as u32);
        rows.put(place, content(&borrowed(value)))?;
    }
    let (above, before) = formulas.start().unwrap_or_default();
    for (row, column, _) in formulas.used_cells() {
        let (row, column) = (above + row as u32, before + column as u32);
        if matches!(range.get_value((row, column)), None | Some(Data::Empty)) {
            rows.put((row, column), Content::Unusable(NO_RESULT.into()))?;
        }
    }
    Ok(rows.grid())
}

fn borrowed(value: &Data) -> DataRef<'_> {
    match value {
        Data::Empty => DataRef::Empty,
        Data::Int(whole) => DataRef::Int(*whole),
        Data::Float(float) => DataRef::Float(*float),
        Data::String(string) => DataRef::SharedString(string),
        Data::Bool(truth) => DataRef::Bool(*truth),
        Data::DateTime(date) => DataRef::DateTime(*date),
        Data::DateTimeIso(string) => DataRef::DateTimeIso(string.clone()),
        Data::DurationIso(string) => DataRef::DurationIso(string.clone()),
        Data::Error(error) => DataRef::Error(error.clone()),
    }
}

fn of_xls(why: &XlsError) -> Refused {
    match why {
        XlsError::Password => {
            Refused::new("the workbook is protected by a password").hint(NO_PASSWORD)
        }
        XlsError::Io(_) | XlsError::Cfb(_) => damaged("a stream cannot be read"),
        XlsError::EoStream(_) | XlsError::Len { .. } | XlsError::ContinueRecordTooShort => {
            damaged("a record is cut short")
        }
        _ => damaged("a record holds what no workbook holds"),
    }
}
