//! What a table holds before anyone asks what it means: rows of cells, each with its place.
//!
//! Sparse: blank cells are not stored, so that two far cells cost two cells.

use std::fmt;

use jiff::civil;

use crate::names;

/// What stands in one cell, field or element.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Content {
    /// Nothing, or only blanks.
    Blank,
    /// A text.
    Text(Box<str>),
    /// A number of a workbook: finite.
    Number(f64),
    /// A date cell of a workbook.
    Date(civil::DateTime),
    /// Something that is no value, said as in "the error `#N/A`".
    Unusable(Box<str>),
}

/// The content of a place where nothing stands.
pub(crate) static BLANK: Content = Content::Blank;

/// Where a content stands.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Place<'a> {
    /// A cell of a workbook; row and column from 0.
    Cell {
        sheet: &'a str,
        row: u32,
        column: u32,
    },
    /// A field of delimited text below a heading; line from 1.
    Column { line: u32, heading: &'a str },
    /// A field of delimited text; line and field from 1.
    Field { line: u32, field: u32 },
    /// An element or attribute; line from 1.
    Element { line: u32, path: &'a str },
    /// The name of a sheet.
    Sheet(&'a str),
    /// The export's path.
    Path,
    /// The rule itself.
    Rule,
}

impl fmt::Display for Place<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Cell { sheet, row, column } => {
                write!(f, "sheet `{sheet}`, cell {}", cell_name(*row, *column))
            }
            Self::Column { line, heading } => write!(f, "line {line}, column `{heading}`"),
            Self::Field { line, field } => write!(f, "line {line}, field {field}"),
            Self::Element { line, path } => write!(f, "line {line}, {path}"),
            Self::Sheet(sheet) => write!(f, "the name of the sheet `{sheet}`"),
            Self::Path => f.write_str("the export's path"),
            Self::Rule => f.write_str("the rule"),
        }
    }
}

/// `F12` from row 11, column 5.
pub(crate) fn cell_name(row: u32, column: u32) -> String {
    format!("{}{}", column_name(column), u64::from(row) + 1)
}

fn column_name(column: u32) -> String {
    let mut letters = Vec::new();
    let mut rest = u64::from(column) + 1;
    while rest > 0 {
        rest -= 1;
        letters.push(char::from(b'A' + (rest % 26) as u8));
        rest /= 26;
    }
    letters.iter().rev().collect()
}

/// A content with its place.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Field<'a> {
    pub(crate) place: Place<'a>,
    pub(crate) content: &'a Content,
}

/// Where the rows come from, for naming places.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Origin {
    Sheet(Box<str>),
    Text,
}

/// One row that holds something.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Row {
    /// Counted from 0.
    pub(crate) number: u32,
    /// Fields of the line, blank ones too (delimited text only).
    pub(crate) width: Option<u32>,
    /// Non-blank cells, by column.
    pub(crate) cells: Vec<(u32, Content)>,
}

impl Row {
    pub(crate) fn new(number: u32, width: Option<u32>) -> Self {
        Self {
            number,
            width,
            cells: Vec::new(),
        }
    }

    pub(crate) fn at(&self, column: u32) -> &Content {
        match self
            .cells
            .binary_search_by_key(&column, |(column, _)| *column)
        {
            Ok(found) => &self.cells[found].1,
            Err(_) => &BLANK,
        }
    }

    /// True when the cells of both rows are the same, and a text among them is no number.
    pub(crate) fn says_the_same(&self, other: &Self) -> bool {
        let is_same = |(ours, theirs): (&(u32, Content), &(u32, Content))| {
            ours.0 == theirs.0
                && match (&ours.1, &theirs.1) {
                    (Content::Text(ours), Content::Text(theirs)) => {
                        names::fold(ours) == names::fold(theirs)
                    }
                    (ours, theirs) => ours == theirs,
                }
        };
        let is_word = |(_, content): &(u32, Content)| match content {
            Content::Text(text) => text.contains(char::is_alphabetic),
            _ => false,
        };
        self.cells.len() == other.cells.len()
            && self.cells.iter().zip(&other.cells).all(is_same)
            && self.cells.iter().any(is_word)
    }

    /// The columns whose text is `sought`, a key.
    pub(crate) fn holding(&self, sought: &str) -> impl Iterator<Item = u32> {
        self.cells
            .iter()
            .filter_map(move |(column, content)| match content {
                Content::Text(text) if names::fold(text) == sought => Some(*column),
                _ => None,
            })
    }
}

/// Rows in ascending order.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Grid {
    pub(crate) origin: Origin,
    pub(crate) rows: Vec<Row>,
}

impl Grid {
    /// The row of that number, from 0.
    pub(crate) fn row(&self, number: u32) -> Option<&Row> {
        let found = self
            .rows
            .binary_search_by_key(&number, |row| row.number)
            .ok()?;
        Some(&self.rows[found])
    }

    pub(crate) fn place(&self, row: u32, column: u32) -> Place<'_> {
        match &self.origin {
            Origin::Sheet(sheet) => Place::Cell { sheet, row, column },
            Origin::Text => Place::Field {
                line: row.saturating_add(1),
                field: column.saturating_add(1),
            },
        }
    }

    pub(crate) fn field(&self, row: u32, column: u32) -> Field<'_> {
        Field {
            place: self.place(row, column),
            content: self.row(row).map_or(&BLANK, |row| row.at(column)),
        }
    }

    /// True when the row of that number is the last line of a text, which may be cut short there.
    pub(crate) fn may_be_cut_at(&self, number: u32) -> bool {
        self.origin == Origin::Text && self.rows.last().is_some_and(|last| last.number == number)
    }

    /// "row 3 of sheet `Results`" or "line 3"; `number` from 0.
    pub(crate) fn row_name(&self, number: u32) -> String {
        let counted = u64::from(number) + 1;
        match &self.origin {
            Origin::Sheet(sheet) => format!("row {counted} of sheet `{sheet}`"),
            Origin::Text => format!("line {counted}"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cells_are_named_as_a_workbook_names_them() {
        for (row, column, name) in [
            (11, 5, "F12"),
            (0, 25, "Z1"),
            (0, 26, "AA1"),
            (1_048_575, 16_383, "XFD1048576"),
        ] {
            assert_eq!(cell_name(row, column), name);
        }
        assert!(cell_name(u32::MAX, u32::MAX).ends_with("4294967296"));
    }
}
