//! A grid of cells, read by a rule: headings, the cells beside them, and one record a row below.
//!
//! Rows that hold nothing are skipped; every other row below the headings is a record, until the
//! text that ends the export.

use crate::fault::Fault;
use crate::grid::{Content, Field, Grid, Origin, Place, Row};
use crate::names::{fold, listed, nearest, shorten};
use crate::one_field;
use crate::parsed::{Parsed, Refused};
use crate::reader::{End, Roles};
use crate::rule::Header;
use crate::runs::Runs;
use crate::source::{Source, Where};

/// What to do when other headings were expected.
const NOT_THE_HEADINGS: &str =
    "correct the heading, or `header` if the headings stand in another row";
/// The text cells above and in which a mistyped text is sought for a hint.
const HINT_CELLS: usize = 4096;

/// Reads the grid. `once` holds the contents that are the same for the whole export, by source.
pub(crate) fn read(
    grid: &Grid,
    header: &Header,
    roles: &Roles,
    once: &[Option<Content>],
) -> Result<Parsed, Refused> {
    let headings = match roles.by_row() {
        true => Some(Headings::find(grid, header)?),
        false => None,
    };
    let bound: Vec<Bound<'_>> = roles
        .sources
        .iter()
        .zip(once)
        .map(|(source, once)| Bound::new(source, once.as_ref(), grid, headings.as_ref()))
        .collect::<Result<_, _>>()?;
    let mut runs = Runs::new(roles);
    let ended = match &headings {
        None => {
            let fields: Vec<Field<'_>> = bound.iter().map(|bound| bound.alone()).collect();
            runs.add(&fields, None);
            grid.rows.iter().any(|row| ends(row, roles.end.as_ref()))
        }
        Some(headings) => headings.records(grid, roles.end.as_ref(), |row, ragged| {
            let fields: Vec<Field<'_>> = bound.iter().map(|bound| bound.at(grid, row)).collect();
            runs.add(&fields, ragged);
        }),
    };
    if runs.is_empty() {
        return Err(Refused {
            sentence: match &headings {
                Some(headings) => format!(
                    "no readings stand below the headings in {}",
                    grid.row_name(headings.row.number)
                ),
                None => "the export holds no reading".to_owned(),
            },
            hint: Some("was anything measured? export it again".to_owned()),
            perhaps_unfinished: grid.origin == Origin::Text,
        });
    }
    Ok(runs.finish(
        roles
            .end
            .as_ref()
            .filter(|_| !ended)
            .map(|end| end.text.as_str()),
    ))
}

fn ends(row: &Row, end: Option<&End>) -> bool {
    let Some(end) = end else { return false };
    row.cells.iter().any(|(_, content)| match content {
        Content::Text(text) => fold(text).contains(&end.key),
        _ => false,
    })
}

/// The row of headings.
struct Headings<'g> {
    row: &'g Row,
    names: Vec<(u32, String)>,
}

impl<'g> Headings<'g> {
    fn find(grid: &'g Grid, header: &Header) -> Result<Self, Refused> {
        let row = match header {
            Header::Row(counted) => {
                let number = counted.saturating_sub(1);
                grid.row(number).ok_or_else(|| Refused {
                    sentence: format!(
                        "{} is blank; the headings should stand there",
                        grid.row_name(number)
                    ),
                    hint: Some(NOT_THE_HEADINGS.to_owned()),
                    perhaps_unfinished: grid.origin == Origin::Text,
                })?
            }
            Header::Find(text) => {
                let sought = fold(text);
                let holds = |row: &&Row| row.holding(&sought).next().is_some();
                grid.rows
                    .iter()
                    .find(holds)
                    .ok_or_else(|| nowhere(grid, "heading", text))?
            }
        };
        let names = row
            .cells
            .iter()
            .filter_map(|(column, content)| match content {
                Content::Text(text) => Some((*column, shorten(text))),
                Content::Number(number) => Some((*column, number.to_string())),
                _ => None,
            })
            .collect();
        Ok(Self { row, names })
    }

    fn column(&self, source: &Source, heading: &str, grid: &Grid) -> Result<(u32, &str), Refused> {
        let sought = fold(heading);
        let mut found = self.row.holding(&sought).chain(self.numbered(&sought));
        let names = || self.names.iter().map(|(_, name)| name.as_str());
        let Some(column) = found.next() else {
            if let Some(field) = one_field::alone(self.row) {
                let refused = Refused {
                    perhaps_unfinished: grid.may_be_cut_at(self.row.number),
                    ..Refused::new(format!(
                        "no column is headed `{}`, where the {} should stand; {} has one field only: `{}`",
                        shorten(heading),
                        source.role,
                        grid.row_name(self.row.number),
                        shorten(field)
                    ))
                };
                return Err(match one_field::mark(field) {
                    Some(mark) => one_field::hint(refused, mark),
                    None => refused.hint(NOT_THE_HEADINGS),
                });
            }
            return Err(Refused {
                sentence: format!(
                    "no column is headed `{}`, where the {} should stand; {} has {}",
                    shorten(heading),
                    source.role,
                    grid.row_name(self.row.number),
                    listed(names())
                ),
                hint: nearest(heading, names())
                    .map(|name| format!("did you mean `{name}`?"))
                    .or_else(|| Some(NOT_THE_HEADINGS.to_owned())),
                perhaps_unfinished: grid.may_be_cut_at(self.row.number),
            });
        };
        if found.next().is_some() {
            return Err(Refused::new(format!(
                "two columns are headed `{}`, where the {} should stand, in {}",
                shorten(heading),
                source.role,
                grid.row_name(self.row.number)
            ))
            .hint("have one of them headed otherwise, so that it is clear which is meant"));
        }
        let name = self
            .names
            .iter()
            .find(|(at, _)| *at == column)
            .map_or("", |(_, name)| name);
        Ok((column, name))
    }

    /// Headings that are numbers.
    fn numbered(&self, sought: &str) -> impl Iterator<Item = u32> {
        self.row
            .cells
            .iter()
            .filter_map(move |(column, content)| match content {
                Content::Number(number) if number.to_string() == sought => Some(*column),
                _ => None,
            })
    }

    /// Calls `record` for every row below the headings; true when the text that ends the export was met.
    fn records(
        &self,
        grid: &Grid,
        end: Option<&End>,
        mut record: impl FnMut(&Row, Option<Fault>),
    ) -> bool {
        let below = grid
            .rows
            .partition_point(|row| row.number <= self.row.number);
        for row in &grid.rows[below..] {
            if ends(row, end) {
                return true;
            }
            record(row, self.ragged(grid, row));
        }
        false
    }

    /// A line with fewer fields than headings, or with something beyond them.
    fn ragged(&self, grid: &Grid, row: &Row) -> Option<Fault> {
        let fields = row.width?;
        let filled = |row: &Row| row.cells.last().map_or(0, |(column, _)| column + 1);
        let (headings, used) = (filled(self.row), filled(row));
        let wrong = if used > headings.max(self.row.width.unwrap_or(0)) {
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

/// Where one source stands in this grid.
enum Bound<'a> {
    Column { column: u32, heading: &'a str },
    Once(Field<'a>),
}

impl<'a> Bound<'a> {
    fn new(
        source: &'a Source,
        once: Option<&'a Content>,
        grid: &'a Grid,
        headings: Option<&'a Headings<'a>>,
    ) -> Result<Self, Refused> {
        if let Some(content) = once {
            return Ok(Self::Once(source.once_field(content)));
        }
        match (&source.from, headings) {
            (Where::Column(heading), Some(headings)) => {
                let (column, heading) = headings.column(source, heading, grid)?;
                Ok(Self::Column { column, heading })
            }
            (Where::At { row, column }, _) => Ok(Self::Once(grid.field(*row, *column))),
            (Where::Label(label), _) => {
                beside(grid, label, headings.map(|headings| headings.row.number)).map(Self::Once)
            }
            _ => Err(Refused::new(format!(
                "the {} cannot stand in a table",
                source.role
            ))),
        }
    }

    fn at<'f>(&self, grid: &'f Grid, row: &'f Row) -> Field<'f>
    where
        'a: 'f,
    {
        match self {
            Self::Once(field) => *field,
            Self::Column { column, heading } => {
                let place = match &grid.origin {
                    Origin::Text => Place::Column {
                        line: row.number.saturating_add(1),
                        heading,
                    },
                    Origin::Sheet(_) => grid.place(row.number, *column),
                };
                Field {
                    place,
                    content: row.at(*column),
                }
            }
        }
    }

    fn alone(&self) -> Field<'a> {
        match self {
            Self::Once(field) => *field,
            Self::Column { .. } => Field {
                place: Place::Rule,
                content: &crate::grid::BLANK,
            },
        }
    }
}

/// The first non-blank cell right of the label, else the one below it.
fn beside<'g>(grid: &'g Grid, label: &str, header: Option<u32>) -> Result<Field<'g>, Refused> {
    let sought = fold(label);
    let all: Vec<(&Row, u32)> = grid
        .rows
        .iter()
        .flat_map(|row| row.holding(&sought).map(move |column| (row, column)))
        .take(HINT_CELLS)
        .collect();
    let above: Vec<_> = all
        .iter()
        .copied()
        .filter(|(row, _)| header.is_some_and(|header| row.number < header))
        .collect();
    let (row, column) = match (all.as_slice(), above.as_slice()) {
        ([one], _) | (_, [one]) => *one,
        ([], _) => return Err(nowhere(grid, "label", label)),
        ([(a, a_column), (b, b_column), ..], _) => {
            return Err(Refused::new(format!(
                "the label `{}` stands at two places: {} and {}",
                shorten(label),
                grid.place(a.number, *a_column),
                grid.place(b.number, *b_column)
            ))
            .hint("name the cell itself with `cell`"));
        }
    };
    let right = row.cells.iter().find(|(at, _)| *at > column);
    Ok(match right {
        Some((column, content)) => Field {
            place: grid.place(row.number, *column),
            content,
        },
        None => grid.field(row.number.saturating_add(1), column),
    })
}

fn nowhere(grid: &Grid, what: &str, text: &str) -> Refused {
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
