//! Sheets of a workbook to rows of cells: xlsx, xlsb, xls and ods, told apart by their content.
//!
//! Cells of xlsx, xlsb and ods are taken one by one; xls, which the library only reads whole, is
//! measured before. Hidden rows are data like others; hidden sheets are read only by name. A panic of
//! the library on a crafted file is one refused export.

mod ods;
mod rows;
mod xls;
mod xlsb;
mod xlsx;

use std::io::Cursor;
use std::panic::{AssertUnwindSafe, catch_unwind};

use calamine::{SheetType, SheetVisible, Xls, Xlsx};

use crate::compound;
use crate::container::{self, Container};
use crate::damage::damaged;
use crate::grid::Grid;
use crate::kind::Kind;
use crate::parsed::Refused;
use crate::rule::Bounds;
use crate::sheets::{Named, Sheets};

/// An opened workbook.
pub(crate) struct Book<'a> {
    inside: Inside<'a>,
}

enum Inside<'a> {
    Xlsx(Box<Xlsx<Cursor<&'a [u8]>>>),
    Xlsb(Box<xlsb::Book<'a>>),
    Xls(Box<Xls<Cursor<&'a [u8]>>>),
    Ods(ods::Sheets),
}

impl<'a> Book<'a> {
    pub(crate) fn open(bytes: &'a [u8], kind: Kind, bounds: &Bounds) -> Result<Self, Refused> {
        let inside = unpanicked(|| {
            Ok(match kind {
                Kind::Compound => {
                    compound::check(bytes, bounds)?;
                    Inside::Xls(Box::new(xls::open(bytes)?))
                }
                Kind::Zip | Kind::Text => match container::check(bytes, bounds)? {
                    Container::Xlsx => Inside::Xlsx(Box::new(xlsx::open(bytes)?)),
                    Container::Xlsb => Inside::Xlsb(Box::new(xlsb::open(bytes)?)),
                    Container::Ods => Inside::Ods(ods::read(bytes, bounds)?),
                },
            })
        })?;
        Ok(Self { inside })
    }

    /// Every sheet of cells, in the workbook's order.
    pub(crate) fn sheets(&self) -> Vec<Named> {
        match &self.inside {
            Inside::Xlsx(book) => xlsx::sheets(book),
            Inside::Xlsb(book) => xlsb::sheets(book),
            Inside::Xls(book) => xls::sheets(book),
            Inside::Ods(sheets) => sheets.names(),
        }
    }

    /// The cells of the sheet of exactly that name.
    fn grid(&mut self, name: &str, bounds: &Bounds) -> Result<Grid, Refused> {
        unpanicked(|| match &mut self.inside {
            Inside::Xlsx(book) => xlsx::grid(book, name, bounds),
            Inside::Xlsb(book) => xlsb::grid(book, name, bounds),
            Inside::Xls(book) => xls::grid(book, name, bounds),
            Inside::Ods(sheets) => sheets.grid(name),
        })
    }
}

/// The cells of the sheets that the rule asks for.
pub(crate) fn grids(
    bytes: &[u8],
    kind: Kind,
    sheets: &Sheets,
    bounds: &Bounds,
) -> Result<Vec<Grid>, Refused> {
    let mut book = Book::open(bytes, kind, bounds)?;
    let mut left = *bounds;
    let mut grids = Vec::new();
    for name in sheets.chosen(&book.sheets())? {
        let grid = book.grid(&name, &left)?;
        let used: usize = grid.rows.iter().map(|row| row.cells.len()).sum();
        left.cells = left
            .cells
            .saturating_sub(u32::try_from(used).unwrap_or(u32::MAX));
        grids.push(grid);
    }
    Ok(grids)
}

fn unpanicked<T>(read: impl FnOnce() -> Result<T, Refused>) -> Result<T, Refused> {
    catch_unwind(AssertUnwindSafe(read))
        .unwrap_or_else(|_| Err(damaged("its cells cannot be read")))
}

fn listed_by_library(sheets: &[calamine::Sheet], kind: SheetType) -> Vec<Named> {
    sheets
        .iter()
        .filter(|sheet| sheet.typ == kind)
        .map(|sheet| Named {
            name: sheet.name.clone(),
            visible: sheet.visible == SheetVisible::Visible,
        })
        .collect()
}
