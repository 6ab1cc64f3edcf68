//! The headings of one table: in one row, or spread over several.
//!
//! A heading of several rows is what stands in all of them, joined by blanks. Where an upper row is
//! blank above a filled lower one, the text left of it holds there too: so merged cells come out of
//! every format. A column is found by its whole heading, else by its lowest part alone.

use regex::Regex;

use crate::fault::Fault;
use crate::grid::{Content, Grid, Origin, Row};
use crate::names::{fold, fold_blanks, listed, nearest, shorten};
use crate::one_field;
use crate::parsed::Refused;
use crate::rule::{Column, Header};
use crate::source::digits;

/// What to do when other headings were expected.
pub(crate) const NOT_THE_HEADINGS: &str =
    "correct the heading, or `header` if the headings stand in another row";

/// The heading of one column.
pub(crate) struct Heading {
    pub(crate) column: u32,
    /// The whole heading, for the places that are the heading.
    pub(crate) content: Content,
    /// As sentences show it.
    pub(crate) shown: String,
    key: String,
    lowest: String,
}

/// The headings of one table.
pub(crate) struct Headings<'g> {
    /// The rows that hold them; none when the table has no headings.
    rows: Vec<&'g Row>,
    names: Vec<Heading>,
    /// Number of the first row below them, from 0.
    pub(crate) below: u32,
}

impl<'g> Headings<'g> {
    /// The rows in which headings begin: one, or when there may be several tables at least one.
    pub(crate) fn starts(
        grid: &'g Grid,
        header: &Header,
        several: bool,
    ) -> Result<Vec<Option<&'g Row>>, Refused> {
        match header {
            Header::Nothing => Ok(vec![None]),
            Header::Row(counted) => {
                let number = counted.saturating_sub(1);
                let row = grid.row(number).ok_or_else(|| Refused {
                    sentence: format!(
                        "{} is blank; the headings should stand there",
                        grid.row_name(number)
                    ),
                    hint: Some(NOT_THE_HEADINGS.to_owned()),
                    perhaps_unfinished: grid.origin == Origin::Text,
                })?;
                Ok(vec![Some(row)])
            }
            Header::Find(text) => {
                let sought = fold(text);
                let holds = |row: &&Row| row.holding(&sought).next().is_some();
                let most = if several { usize::MAX } else { 1 };
                let rows = grid.rows.iter().filter(holds).take(most);
                let rows: Vec<_> = rows.map(Some).collect();
                match rows.is_empty() {
                    false => Ok(rows),
                    true => Err(crate::table::nowhere(grid, "heading", text)),
                }
            }
        }
    }

    /// The headings that begin in `first` and go on in so many rows below it.
    pub(crate) fn new(grid: &'g Grid, first: Option<&'g Row>, further: u32) -> Self {
        let Some(first) = first else {
            return Self {
                rows: Vec::new(),
                names: Vec::new(),
                below: 0,
            };
        };
        let below = first.number.saturating_add(further).saturating_add(1);
        let rows: Vec<&Row> = (first.number..below)
            .filter_map(|number| grid.row(number))
            .collect();
        Self {
            names: names(&rows),
            rows,
            below,
        }
    }

    /// "line 3", or "lines 3 to 4"; "nothing" without headings.
    pub(crate) fn place(&self, grid: &Grid) -> String {
        match (self.rows.first(), self.rows.last()) {
            (Some(first), Some(last)) if first.number != last.number => format!(
                "{} to {}",
                grid.row_name(first.number),
                u64::from(last.number) + 1
            ),
            (Some(row), _) => grid.row_name(row.number),
            _ => "no row".to_owned(),
        }
    }

    /// The number of the first row of headings.
    pub(crate) fn number(&self) -> Option<u32> {
        self.rows.first().map(|row| row.number)
    }

    fn shown(&self) -> impl Iterator<Item = &str> {
        self.names.iter().map(|heading| heading.shown.as_str())
    }

    pub(crate) fn of(&self, column: u32) -> Option<&Heading> {
        let found = self
            .names
            .binary_search_by_key(&column, |heading| heading.column)
            .ok()?;
        Some(&self.names[found])
    }

    /// The one column with that heading, for `role`.
    pub(crate) fn column(
        &self,
        role: &str,
        heading: &str,
        grid: &Grid,
    ) -> Result<&Heading, Refused> {
        let sought = fold(heading);
        let whole: Vec<&Heading> = self
            .names
            .iter()
            .filter(|heading| heading.key == sought)
            .collect();
        let found = match whole.is_empty() {
            false => whole,
            true => self
                .names
                .iter()
                .filter(|heading| heading.lowest == sought)
                .collect(),
        };
        match found.as_slice() {
            [one] => Ok(one),
            [] => Err(self.missing(role, heading, grid)),
            _ => Err(Refused::new(format!(
                "two columns are headed `{}`, where the {role} should stand, in {}",
                shorten(heading),
                self.place(grid)
            ))
            .hint("have one of them headed otherwise, so that it is clear which is meant")),
        }
    }

    /// The columns whose headings a regex matches; at least one.
    pub(crate) fn matching(
        &self,
        role: &str,
        regex: &Regex,
        grid: &Grid,
    ) -> Result<Vec<&Heading>, Refused> {
        let matches = |heading: &&Heading| match &heading.content {
            Content::Text(text) => regex.is_match(text),
            _ => false,
        };
        let found: Vec<&Heading> = self.names.iter().filter(matches).collect();
        if found.is_empty() {
            return Err(Refused {
                perhaps_unfinished: self.may_be_cut(grid),
                ..Refused::new(format!(
                    "no heading matches `{regex}`, where the {role} should stand; {} has {}",
                    self.place(grid),
                    listed(self.shown())
                ))
            }
            .hint(NOT_THE_HEADINGS));
        }
        Ok(found)
    }

    /// The number of a column that a rule names.
    pub(crate) fn number_of(
        &self,
        role: &str,
        column: &Column,
        grid: &Grid,
    ) -> Result<u32, Refused> {
        match column {
            Column::Counted(number) => Ok(*number),
            Column::Headed(heading) => self.column(role, heading, grid).map(|found| found.column),
        }
    }

    fn may_be_cut(&self, grid: &Grid) -> bool {
        self.rows
            .last()
            .is_some_and(|row| grid.may_be_cut_at(row.number))
    }

    fn missing(&self, role: &str, heading: &str, grid: &Grid) -> Refused {
        let cut = self.may_be_cut(grid);
        let field = match self.rows.as_slice() {
            [row] => one_field::alone(row),
            _ => None,
        };
        if let Some(field) = field {
            let refused = Refused {
                perhaps_unfinished: cut,
                ..Refused::new(format!(
                    "no column is headed `{}`, where the {role} should stand; {} has one field only: `{}`",
                    shorten(heading),
                    self.place(grid),
                    shorten(field)
                ))
            };
            return match one_field::mark(field) {
                Some(mark) => one_field::hint(refused, mark),
                None => refused.hint(NOT_THE_HEADINGS),
            };
        }
        Refused {
            sentence: format!(
                "no column is headed `{}`, where the {role} should stand; {} has {}",
                shorten(heading),
                self.place(grid),
                listed(self.shown())
            ),
            hint: nearest(heading, self.shown())
                .map(|name| format!("did you mean `{name}`?"))
                .or_else(|| Some(NOT_THE_HEADINGS.to_owned())),
            perhaps_unfinished: cut,
        }
    }

    /// True for a row that repeats one of the rows of headings, a text of them at least.
    pub(crate) fn repeats(&self, row: &Row) -> bool {
        self.rows.iter().any(|heading| heading.says_the_same(row))
    }

    /// A line with fewer fields than headings, or with something beyond them.
    pub(crate) fn ragged(&self, grid: &Grid, row: &Row) -> Option<Fault> {
        let fields = row.width?;
        let filled = |row: &Row| row.cells.last().map_or(0, |(column, _)| column + 1);
        let headings = self.rows.iter().map(|row| filled(row)).max()?;
        let width = self.rows.iter().filter_map(|row| row.width).max();
        let used = filled(row);
        let wrong = if used > headings.max(width.unwrap_or(0)) {
            format!("{used} fields below {headings} headings")
        } else if fields < headings {
            format!("only {fields} fields below {headings} headings")
        } else {
            return None;
        };
        let fault = Fault::new(
            grid.place(row.number, used.min(headings).max(1) - 1),
            format!("{} fields", used.max(fields)),
            format!("{headings} fields"),
            wrong,
        );
        Some(match used > headings {
            true => fault.hint("does a decimal comma or a text part the fields as well?"),
            false => fault.hint("was the line cut short? export it again"),
        })
    }
}

fn written(content: &Content) -> Option<String> {
    match content {
        Content::Text(text) => Some(fold_blanks(text)),
        Content::Number(number) => Some(digits(*number)),
        Content::Date(date) => Some(date.to_string()),
        Content::Blank | Content::Unusable(_) => None,
    }
}

fn names(rows: &[&Row]) -> Vec<Heading> {
    let mut columns: Vec<u32> = rows
        .iter()
        .flat_map(|row| row.cells.iter().map(|(column, _)| *column))
        .collect();
    columns.sort_unstable();
    columns.dedup();
    columns
        .into_iter()
        .filter_map(|column| {
            let lowest = rows
                .iter()
                .rposition(|row| *row.at(column) != Content::Blank)?;
            let parts: Vec<String> = rows[..=lowest]
                .iter()
                .enumerate()
                .filter_map(|(at, row)| match at == lowest {
                    true => written(row.at(column)),
                    false => above(row, column),
                })
                .collect();
            let whole = parts.join(" ");
            Some(Heading {
                column,
                key: fold(&whole),
                lowest: fold(parts.last()?),
                shown: shorten(&whole),
                content: Content::Text(whole.into()),
            })
        })
        .collect()
}

/// What an upper row of headings holds above a column: its own text, else the one left of it.
fn above(row: &Row, column: u32) -> Option<String> {
    let left = row.cells.partition_point(|(at, _)| *at <= column);
    let (_, content) = row.cells.get(left.checked_sub(1)?)?;
    written(content)
}
