//! Grids of cells, read by a rule: tables with their headings, the cells beside them, and one record a
//! value below.
//!
//! A grid is one table, or several one under the other, each with its own headings. Below the headings
//! every row is read until the table ends; rows that hold nothing, rows that repeat the headings and
//! rows that the rule leaves out are no records.

use std::ops::Range;

use crate::bound::{Bound, Line, value_columns};
use crate::fault::Fault;
use crate::grid::{Content, Field, Grid, Origin, Place, Row};
use crate::headings::Headings;
use crate::layout::Stop;
use crate::names::{nearest, shorten};
use crate::number::Number;
use crate::one_field;
use crate::parsed::{Parsed, Refused};
use crate::reader::Roles;
use crate::rule::Header;
use crate::runs::Runs;
use crate::source::Where;

/// The text cells in which a mistyped text is sought for a hint.
const HINT_CELLS: usize = 4096;

/// One table of a grid.
pub(crate) struct Table<'g> {
    pub(crate) grid: &'g Grid,
    /// `None`: nothing is looked up by row, the grid is one record.
    pub(crate) headings: Option<Headings<'g>>,
    /// False when several tables may stand one under the other.
    pub(crate) is_alone: bool,
    /// Numbers of its rows, from the end of the table above it to its own end.
    pub(crate) rows: Range<u32>,
    /// The rows below its headings.
    below: &'g [Row],
}

/// Reads the grids. `once` holds the contents that are the same for the whole export, by source.
pub(crate) fn read(
    grids: &[Grid],
    header: &Header,
    roles: &Roles,
    once: &[Option<Content>],
) -> Result<Parsed, Refused> {
    let mut runs = Runs::new(roles);
    let mut ended = true;
    let mut headed = None;
    for grid in grids {
        let sheet = match &grid.origin {
            Origin::Sheet(name) => Some(Content::Text(name.clone())),
            Origin::Text => None,
        };
        let (tables, end_met) = tables(grid, header, roles)?;
        ended &= end_met;
        for table in &tables {
            read_table(table, roles, once, sheet.as_ref(), &mut runs)?;
            if let Some(headings) = &table.headings {
                headed.get_or_insert_with(|| headings.place(grid));
            }
        }
    }
    if runs.is_empty() {
        return Err(Refused {
            sentence: match headed {
                Some(place) => format!("no readings stand below the headings in {place}"),
                None => "the export holds no reading".to_owned(),
            },
            hint: Some("was anything measured? export it again".to_owned()),
            perhaps_unfinished: grids.iter().all(|grid| grid.origin == Origin::Text),
        });
    }
    let missing = roles.end.as_ref().filter(|_| !ended);
    Ok(runs.finish(missing.map(|end| end.text.as_str())))
}

/// The tables of one grid, and whether the text that ends the export stands in it.
fn tables<'g>(
    grid: &'g Grid,
    header: &Header,
    roles: &Roles,
) -> Result<(Vec<Table<'g>>, bool), Refused> {
    let end_after = |number: u32| {
        let end = roles.end.as_ref()?;
        let after = grid.rows.partition_point(|row| row.number < number);
        let found = grid.rows[after..].iter().position(|row| end.stands_in(row));
        found.map(|found| after + found)
    };
    if !roles.by_row() {
        let whole = Table {
            grid,
            headings: None,
            is_alone: true,
            rows: 0..u32::MAX,
            below: &[],
        };
        return Ok((vec![whole], end_after(0).is_some()));
    }
    let headings: Vec<Headings<'g>> = Headings::starts(grid, header, roles.rows.blocks)?
        .into_iter()
        .map(|row| Headings::new(grid, row, roles.rows.further_headings))
        .collect();
    let end = headings.first().and_then(|first| end_after(first.below));
    let last = end.unwrap_or(grid.rows.len());
    let index = |number: u32| grid.rows.partition_point(|row| row.number < number);
    let starts: Vec<usize> = headings
        .iter()
        .map(|headings| headings.number().map_or(0, index))
        .collect();
    let mut tables: Vec<Table<'g>> = Vec::with_capacity(headings.len());
    let mut above = 0;
    for (at, headings) in headings.into_iter().enumerate() {
        if starts[at] >= last {
            break;
        }
        let first = headings.below + u32::from(roles.rows.units_row);
        let next = starts.get(at + 1).map_or(last, |next| (*next).min(last));
        let from = index(first).min(next);
        let below = &grid.rows[from..next];
        let stop = roles
            .rows
            .until
            .as_ref()
            .and_then(|until| until.first(below));
        let below = &below[..stop.unwrap_or(below.len())];
        let past = below
            .last()
            .map_or(first, |row| row.number.saturating_add(1));
        let own_end = match &roles.rows.until {
            // What stands beside the text that ends a table belongs to it still.
            Some(Stop::Text(_)) if stop.is_some() => past.saturating_add(1),
            _ => past,
        };
        tables.push(Table {
            grid,
            headings: Some(headings),
            is_alone: !roles.rows.blocks,
            rows: above..own_end,
            below,
        });
        above = own_end;
    }
    Ok((tables, end.is_some()))
}

fn read_table<'g>(
    table: &Table<'g>,
    roles: &'g Roles,
    once: &'g [Option<Content>],
    sheet: Option<&'g Content>,
    runs: &mut Runs<'_>,
) -> Result<(), Refused> {
    let bound: Vec<Bound<'g>> = roles
        .sources
        .iter()
        .zip(once)
        .map(|(source, once)| {
            let content = match (&source.from, sheet, &table.grid.origin) {
                (Where::Sheet, Some(content), Origin::Sheet(name)) => Some(Field {
                    place: Place::Sheet(name),
                    content,
                }),
                _ => once.as_ref().map(|once| source.once_field(once)),
            };
            Bound::new(source, content, table)
        })
        .collect::<Result<_, _>>()?;
    let Some(headings) = &table.headings else {
        let fields: Vec<Field<'_>> = bound.iter().map(Bound::alone).collect();
        runs.add(&fields, None);
        return Ok(());
    };
    let grid = table.grid;
    let mut values = value_columns(&roles.sources[roles.value], headings, grid)?;
    if values.is_empty() {
        // The value is the same for every row, or joined: one record a row.
        values.push(u32::MAX);
    }
    no_number_for_a_heading(roles, headings, grid)?;
    let filters = roles
        .rows
        .filters
        .iter()
        .map(|filter| {
            let column = headings.number_of("text of a row filter", &filter.column, grid)?;
            Ok((column, filter))
        })
        .collect::<Result<Vec<_>, Refused>>()?;
    let mut filled = roles
        .rows
        .fill_down
        .iter()
        .map(|column| {
            let column = headings.number_of("text to fill down", column, grid)?;
            Ok((column, None))
        })
        .collect::<Result<Vec<(u32, Option<&Row>)>, Refused>>()?;
    let units = match roles.rows.units_row {
        true => grid.row(headings.below),
        false => None,
    };
    let looked_up: Vec<u32> = bound.iter().filter_map(Bound::row).collect();
    for row in table.below {
        let repeats = headings.repeats(row) || units.is_some_and(|units| units.says_the_same(row));
        if repeats || looked_up.contains(&row.number) {
            continue;
        }
        for (column, above) in &mut filled {
            if *row.at(*column) != Content::Blank {
                *above = Some(row);
            }
        }
        let line = Line {
            grid,
            headings,
            row,
            filled: &filled,
        };
        let stays = |(column, filter): &(u32, &crate::layout::RowTest)| {
            filter.passes(line.field(*column).content)
        };
        if !filters.iter().all(stays) {
            continue;
        }
        let ragged: Option<Fault> = headings.ragged(grid, row);
        let joined: Vec<Option<(Place<'_>, Content)>> =
            bound.iter().map(|bound| bound.joined(&line)).collect();
        for value in &values {
            let fields: Vec<Field<'_>> = bound
                .iter()
                .zip(&joined)
                .map(|(bound, joined)| bound.field(&line, *value, joined.as_ref()))
                .collect();
            runs.add(&fields, ragged.clone());
        }
    }
    Ok(())
}

/// Refuses a number in place of the heading above a value that is named by its letter: the line would
/// be lost.
fn no_number_for_a_heading(
    roles: &Roles,
    headings: &Headings<'_>,
    grid: &Grid,
) -> Result<(), Refused> {
    let Where::Counted(column) = roles.sources[roles.value].from else {
        return Ok(());
    };
    match headings.of(column) {
        Some(heading) if Number::read(&heading.shown, roles.marks).is_ok() => {
            Err(Refused::new(format!(
                "{} holds the number `{}` where the heading of the value should stand",
                headings.place(grid),
                heading.shown
            ))
            .hint("if the export has no headings, set `header = \"none\"`"))
        }
        _ => Ok(()),
    }
}

pub(crate) fn nowhere(grid: &Grid, what: &str, text: &str) -> Refused {
    if let Some((row, field, mark)) = one_field::hiding(grid, text) {
        let refused = Refused::new(format!(
            "no cell holds the {what} `{}`; {} has one field only: `{}`",
            shorten(text),
            grid.row_name(row.number),
            shorten(field)
        ));
        return one_field::hint(refused, mark);
    }
    let texts =
        grid.rows
            .iter()
            .flat_map(|row| &row.cells)
            .filter_map(|(_, content)| match content {
                Content::Text(text) => Some(&**text),
                _ => None,
            });
    Refused {
        sentence: format!("no cell holds the {what} `{}`", shorten(text)),
        hint: nearest(text, texts.take(HINT_CELLS))
            .map(|near| format!("did you mean `{}`?", shorten(near)))
            .or_else(|| {
                Some(format!(
                    "correct the {what}, or the sheet or file it is sought in"
                ))
            }),
        perhaps_unfinished: grid.origin == Origin::Text,
    }
}
