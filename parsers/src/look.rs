//! What an export of unknown form holds, before there is a rule for it: texts and numbers by place.
//!
//! Whoever drafts a rule looks here. Encoding and delimiter are the caller's suppositions, tried one
//! after the other; a supposition that does not fit is a [`Refused`], as under a rule.
//!
//! Not here: guessing, meaning, roles. Only the first [`ROWS_LOOKED_AT`] rows of a table are shown.

use encoding_rs::Encoding;
use serde::{Deserialize, Serialize};

use crate::decode;
use crate::delimited::{self, Delimiter};
use crate::grid::{Content, Grid, Origin};
use crate::kind::Kind;
use crate::names::shorten;
use crate::parsed::Refused;
use crate::rule::Bounds;
use crate::sheets::Sheets;
use crate::workbook;

/// Rows of a table that are shown.
pub const ROWS_LOOKED_AT: usize = 2000;

/// The filled cells of one table.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Cells {
    /// The sheet's name; `None` for delimited text.
    pub sheet: Option<String>,
    /// Rows that hold something, in order: the row's number from 0 and its cells by column, from 0.
    pub rows: Vec<(u32, Vec<(u32, Seen)>)>,
}

/// What stands in one cell.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum Seen {
    /// A text.
    Text(String),
    /// A number of a workbook.
    Number(f64),
    /// A date cell of a workbook.
    Date(jiff::civil::DateTime),
    /// Something that is no value, such as an error.
    Unusable(String),
}

/// The text of an export: by its byte-order mark, by what XML says of itself, as UTF-8, else in the
/// encoding of that label.
///
/// # Errors
/// [`Refused`] when the bytes are no text so.
pub fn look_at_text(bytes: &[u8], encoding: Option<&str>) -> Result<String, Refused> {
    let named = match encoding {
        None => None,
        Some(label) => Some(
            Encoding::for_label_no_replacement(label.as_bytes())
                .ok_or_else(|| Refused::new(format!("`{}` names no encoding", shorten(label))))?,
        ),
    };
    Kind::of(bytes, &Bounds::default())?;
    decode::decode(bytes, decode::declared(bytes), named).map(std::borrow::Cow::into_owned)
}

/// The mark that the text itself announces in a first line `sep=;`.
#[must_use]
pub fn announced_delimiter(text: &str) -> Option<char> {
    let found = delimited::delimiter(text, None, '.');
    found.announced.then_some(char::from(found.mark))
}

/// The fields of delimited text, parted by that mark.
///
/// # Errors
/// [`Refused`] when the text cannot be parted so.
pub fn look_at_fields(text: &str, delimiter: char) -> Result<Cells, Refused> {
    let mark = delimited::as_delimiter(delimiter)
        .ok_or_else(|| Refused::new(format!("{delimiter:?} cannot part fields")))?;
    let announced = announced_delimiter(text).is_some();
    let delimiter = Delimiter { mark, announced };
    delimited::grid(text, delimiter, false, &Bounds::default()).map(cells)
}

/// The visible sheets of a workbook. Crafted workbooks can exhaust the memory of the process that
/// looks into them.
///
/// # Errors
/// [`Refused`] when the workbook cannot be read.
pub fn look_at_sheets(bytes: &[u8]) -> Result<Vec<Cells>, Refused> {
    let bounds = Bounds::default();
    let kind = Kind::of(bytes, &bounds)?;
    let grids = workbook::grids(bytes, kind, &Sheets::Every, &bounds)?;
    Ok(grids.into_iter().map(cells).collect())
}

fn cells(grid: Grid) -> Cells {
    let sheet = match grid.origin {
        Origin::Sheet(name) => Some(name.to_string()),
        Origin::Text => None,
    };
    let rows = grid.rows.into_iter().take(ROWS_LOOKED_AT).map(|row| {
        let seen = row.cells.into_iter().filter_map(|(column, content)| {
            let seen = match content {
                Content::Blank => return None,
                Content::Text(text) => Seen::Text(text.into()),
                Content::Number(number) => Seen::Number(number),
                Content::Date(date) => Seen::Date(date),
                Content::Unusable(what) => Seen::Unusable(what.into()),
            };
            Some((column, seen))
        });
        (row.number, seen.collect())
    });
    Cells {
        sheet,
        rows: rows.collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_is_shown_by_row_and_column_and_blank_ones_are_left_out() {
        let text = "sep=;\r\nStück;Wert\r\n\r\nP1;\r\n";
        assert_eq!(announced_delimiter(text), Some(';'));
        let cells = look_at_fields(text, ';').unwrap();
        let text = |text: &str| Seen::Text(text.to_owned());
        assert_eq!(
            cells.rows,
            [
                (1, vec![(0, text("Stück")), (1, text("Wert"))]),
                (3, vec![(0, text("P1"))]),
            ]
        );
        assert_eq!(cells.sheet, None);
    }

    #[test]
    fn a_supposition_that_does_not_fit_is_refused() {
        assert_eq!(
            look_at_text(b"St\xfcck", Some("windows-1252")).unwrap(),
            "Stück"
        );
        assert!(look_at_text(b"St\xfcck", None).is_err());
        assert!(look_at_text(b"St\xfcck", Some("no such")).is_err());
        assert!(look_at_fields("a", 'a').is_err());
        assert!(look_at_sheets(b"no workbook").is_err());
    }
}
