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
use crate::names::{fold, listed, nearest, shorten};
use crate::parsed::Refused;
use crate::rule::{Bounds, Sheet};

/// One sheet of cells.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct SheetName {
    pub(crate) name: String,
    pub(crate) visible: bool,
}

/// An opened workbook.
pub(crate) struct Book<'a> {
    inside: Inside<'a>,
    bounds: &'a Bounds,
}

enum Inside<'a> {
    Xlsx(Box<Xlsx<Cursor<&'a [u8]>>>),
    Xlsb(Box<xlsb::Book<'a>>),
    Xls(Box<Xls<Cursor<&'a [u8]>>>),
    Ods(ods::Sheets),
}

impl<'a> Book<'a> {
    pub(crate) fn open(bytes: &'a [u8], kind: Kind, bounds: &'a Bounds) -> Result<Self, Refused> {
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
        Ok(Self { inside, bounds })
    }

    /// Every sheet of cells, in the workbook's order.
    pub(crate) fn sheets(&self) -> Vec<SheetName> {
        match &self.inside {
            Inside::Xlsx(book) => xlsx::sheets(book),
            Inside::Xlsb(book) => xlsb::sheets(book),
            Inside::Xls(book) => xls::sheets(book),
            Inside::Ods(sheets) => sheets.names(),
        }
    }

    /// The cells of the sheet of exactly that name.
    pub(crate) fn grid(&mut self, name: &str) -> Result<Grid, Refused> {
        let bounds = self.bounds;
        unpanicked(|| match &mut self.inside {
            Inside::Xlsx(book) => xlsx::grid(book, name, bounds),
            Inside::Xlsb(book) => xlsb::grid(book, name, bounds),
            Inside::Xls(book) => xls::grid(book, name, bounds),
            Inside::Ods(sheets) => sheets.grid(name),
        })
    }
}

/// The cells of the sheet that the rule asks for.
pub(crate) fn grid(
    bytes: &[u8],
    kind: Kind,
    sheet: &Sheet,
    bounds: &Bounds,
) -> Result<Grid, Refused> {
    let mut book = Book::open(bytes, kind, bounds)?;
    let name = chosen(&book.sheets(), sheet)?;
    book.grid(&name)
}

fn unpanicked<T>(read: impl FnOnce() -> Result<T, Refused>) -> Result<T, Refused> {
    catch_unwind(AssertUnwindSafe(read))
        .unwrap_or_else(|_| Err(damaged("its cells cannot be read")))
}

fn listed_by_library(sheets: &[calamine::Sheet], kind: SheetType) -> Vec<SheetName> {
    sheets
        .iter()
        .filter(|sheet| sheet.typ == kind)
        .map(|sheet| SheetName {
            name: sheet.name.clone(),
            visible: sheet.visible == SheetVisible::Visible,
        })
        .collect()
}

fn chosen(sheets: &[SheetName], asked: &Sheet) -> Result<String, Refused> {
    let names = || sheets.iter().map(|sheet| sheet.name.as_str());
    match asked {
        Sheet::First => sheets
            .iter()
            .find(|sheet| sheet.visible)
            .map(|sheet| sheet.name.clone())
            .ok_or_else(|| Refused::new("the workbook has no visible sheet")),
        Sheet::Named(sought) => {
            let same = |name: &&str| fold(name) == fold(sought);
            names()
                .find(same)
                .map(str::to_owned)
                .ok_or_else(|| Refused {
                    sentence: format!(
                        "no sheet is named `{}`; the workbook has {}",
                        shorten(sought),
                        listed(names())
                    ),
                    hint: nearest(sought, names()).map(|name| format!("did you mean `{name}`?")),
                    perhaps_unfinished: false,
                })
        }
    }
}
