//! Where one source of a rule stands in one table, and the field it has for one value.

use crate::grid::{BLANK, Content, Field, Grid, Origin, Place, Row};
use crate::headings::{Heading, Headings};
use crate::names::{fold, shorten};
use crate::parsed::Refused;
use crate::source::{Columns, Side, Source, Where, digits};
use crate::table::{Table, nowhere};

/// The cells in which a label is sought.
const LABELS_MAX: usize = 4096;

/// Where one source stands in this table.
pub(crate) enum Bound<'a> {
    /// The same for every value.
    Once(Field<'a>),
    /// In every row, in that column.
    Column(u32),
    /// In every row, in several columns.
    Joined(Vec<u32>, &'a str),
    /// In the column of the value.
    Value,
    /// The heading of the value's column.
    Heading,
    /// In that row (its number), in the column of the value.
    Row(u32),
}

/// The columns that a value stands in: one for each reading of a row.
pub(crate) fn value_columns(
    source: &Source,
    headings: &Headings<'_>,
    grid: &Grid,
) -> Result<Vec<u32>, Refused> {
    let column = |heading: &Heading| heading.column;
    match &source.from {
        Where::Column(heading) => headings
            .column(&source.role, heading, grid)
            .map(|heading| vec![column(heading)]),
        Where::Counted(number) => Ok(vec![*number]),
        Where::Across(Columns::Headed(names)) => names
            .iter()
            .map(|name| headings.column(&source.role, name, grid).map(column))
            .collect(),
        Where::Across(Columns::Matching(regex)) => {
            let found = headings.matching(&source.role, regex, grid)?;
            Ok(found.into_iter().map(column).collect())
        }
        _ => Ok(Vec::new()),
    }
}

impl<'a> Bound<'a> {
    /// `content` is known when it is the same for the whole export or sheet.
    pub(crate) fn new(
        source: &'a Source,
        content: Option<Field<'a>>,
        table: &Table<'a>,
    ) -> Result<Self, Refused> {
        if let Some(field) = content {
            return Ok(Self::Once(field));
        }
        let grid = table.grid;
        let column = |heading: &str| {
            let headings = table.headings.as_ref().ok_or_else(|| misplaced(source))?;
            let found = headings.column(&source.role, heading, grid)?;
            Ok::<u32, Refused>(found.column)
        };
        match &source.from {
            Where::Across(_) => Ok(Self::Value),
            Where::Column(heading) => column(heading).map(Self::Column),
            Where::Counted(number) => Ok(Self::Column(*number)),
            Where::Joined { columns, joiner } => {
                let columns = columns.iter().map(|heading| column(heading));
                Ok(Self::Joined(columns.collect::<Result<_, _>>()?, joiner))
            }
            Where::Heading => Ok(Self::Heading),
            Where::Row(label) => {
                labelled(table, "row", label).map(|(row, _)| Self::Row(row.number))
            }
            Where::UnitsRow => match &table.headings {
                Some(headings) => Ok(Self::Row(headings.below)),
                None => Err(misplaced(source)),
            },
            Where::At { row, column } => Ok(Self::Once(grid.field(*row, *column))),
            Where::Label(side, label) => beside(table, label, *side).map(Self::Once),
            Where::Sheet | Where::Path(_) | Where::Xml(_) | Where::Qif(_) | Where::Constant(_) => {
                Err(misplaced(source))
            }
        }
    }

    /// The row that is looked up and is therefore no record.
    pub(crate) fn row(&self) -> Option<u32> {
        match self {
            Self::Row(number) => Some(*number),
            _ => None,
        }
    }

    /// What several columns of one row hold together; `None` when they need not be joined.
    pub(crate) fn joined<'f>(&self, line: &Line<'f, 'a>) -> Option<(Place<'f>, Content)> {
        let Self::Joined(columns, joiner) = self else {
            return None;
        };
        let mut texts = Vec::with_capacity(columns.len());
        let mut place = None;
        for column in columns {
            let field = line.field(*column);
            place = place.or(Some(field.place));
            match field.content {
                Content::Blank => return Some((field.place, Content::Blank)),
                Content::Unusable(_) => return Some((field.place, field.content.clone())),
                Content::Text(text) => texts.push(text.trim().to_owned()),
                Content::Number(number) => texts.push(digits(*number)),
                Content::Date(date) => texts.push(date.to_string()),
            }
        }
        let joined = Content::Text(texts.join(joiner).into());
        Some((place.unwrap_or(Place::Rule), joined))
    }

    /// The field of one value: in that row, in that column.
    pub(crate) fn field<'f>(
        &self,
        line: &Line<'f, 'a>,
        value: u32,
        joined: Option<&'f (Place<'f>, Content)>,
    ) -> Field<'f>
    where
        'a: 'f,
    {
        if let Some((place, content)) = joined {
            return Field {
                place: *place,
                content,
            };
        }
        match self {
            Self::Once(field) => *field,
            Self::Column(column) => line.field(*column),
            Self::Value => line.field(value),
            Self::Joined(..) => Field {
                place: Place::Rule,
                content: &BLANK,
            },
            Self::Heading => match (line.headings.of(value), line.headings.number()) {
                (Some(heading), Some(number)) => Field {
                    place: line.grid.place(number, value),
                    content: &heading.content,
                },
                _ => Field {
                    place: Place::Rule,
                    content: &BLANK,
                },
            },
            Self::Row(number) => line.grid.field(*number, value),
        }
    }

    /// The field when no source is looked up by row.
    pub(crate) fn alone(&self) -> Field<'a> {
        match self {
            Self::Once(field) => *field,
            _ => Field {
                place: Place::Rule,
                content: &BLANK,
            },
        }
    }
}

/// One row of a table, blanks filled from above where the rule says so.
pub(crate) struct Line<'f, 'g> {
    pub(crate) grid: &'g Grid,
    pub(crate) headings: &'f Headings<'g>,
    pub(crate) row: &'g Row,
    /// The last row that held something, by column.
    pub(crate) filled: &'f [(u32, Option<&'g Row>)],
}

impl<'f, 'g: 'f> Line<'f, 'g> {
    pub(crate) fn field(&self, column: u32) -> Field<'f> {
        let row = self
            .filled
            .iter()
            .find(|(filled, _)| *filled == column)
            .and_then(|(_, row)| *row)
            .unwrap_or(self.row);
        let place = match (&self.grid.origin, self.headings.of(column)) {
            (Origin::Text, Some(heading)) => Place::Column {
                line: row.number.saturating_add(1),
                heading: &heading.shown,
            },
            _ => self.grid.place(row.number, column),
        };
        Field {
            place,
            content: row.at(column),
        }
    }
}

fn misplaced(source: &Source) -> Refused {
    match source.from {
        Where::Sheet => Refused::new(format!(
            "this is text, which has no sheets; the {} should be the name of one",
            source.role
        ))
        .hint("leave such files out with `files`; one instrument has exports of one form"),
        _ => Refused::new(format!("the {} cannot stand in this table", source.role)),
    }
}

/// The first non-blank cell right of the label, else the one below it; or either alone.
fn beside<'g>(table: &Table<'g>, label: &str, side: Side) -> Result<Field<'g>, Refused> {
    let grid = table.grid;
    let (row, column) = labelled(table, "label", label)?;
    let below = || grid.field(row.number.saturating_add(1), column);
    let right = row.cells.iter().find(|(at, _)| *at > column);
    Ok(match (side, right) {
        (Side::Below, _) | (Side::Either, None) => below(),
        (_, Some((column, content))) => Field {
            place: grid.place(row.number, *column),
            content,
        },
        (Side::Right, None) => grid.field(row.number, column.saturating_add(1)),
    })
}

/// The one cell that holds a label; of several, the one above the headings. Of several tables each has
/// its own: a label that one of them lacks is not looked for at another.
fn labelled<'g>(table: &Table<'g>, what: &str, label: &str) -> Result<(&'g Row, u32), Refused> {
    let grid = table.grid;
    let sought = fold(label);
    let index = |number: u32| grid.rows.partition_point(|row| row.number < number);
    let rows = match table.is_alone {
        true => &grid.rows[..],
        false => &grid.rows[index(table.rows.start)..index(table.rows.end)],
    };
    let all: Vec<(&Row, u32)> = rows
        .iter()
        .flat_map(|row| row.holding(&sought).map(move |column| (row, column)))
        .take(LABELS_MAX)
        .collect();
    let header = table.headings.as_ref().and_then(Headings::number);
    let above: Vec<_> = all
        .iter()
        .copied()
        .filter(|(row, _)| header.is_some_and(|header| row.number < header))
        .collect();
    match (all.as_slice(), above.as_slice(), &table.headings) {
        ([one], _, _) | (_, [one], _) => Ok(*one),
        ([], _, Some(headings)) if !table.is_alone => Err(Refused::new(format!(
            "the {what} `{}` does not stand by the table with its headings in {}",
            shorten(label),
            headings.place(grid)
        ))
        .hint("if it holds for every table of the sheet, name its cell with `cell`")),
        ([], ..) => Err(nowhere(grid, what, label)),
        ([(a, a_column), (b, b_column), ..], ..) => Err(Refused::new(format!(
            "the {what} `{}` stands at two places: {} and {}",
            shorten(label),
            grid.place(a.number, *a_column),
            grid.place(b.number, *b_column)
        ))
        .hint("name the cell itself with `cell`")),
    }
}
