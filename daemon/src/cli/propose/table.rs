//! A table of unknown layout: the row of headings, the columns below it, the labels above it.

use std::collections::BTreeSet;

use restudy_parsers::{Cells, Seen as Cell, fold};

use super::number::is_number;
use super::sample::{Datum, Header, Place, Spot};
use super::words::{self, Fit, Meaning};

/// Headings are sought in so many rows that hold something.
const HEADER_WITHIN: usize = 60;
/// Rows below that are looked at for numbers.
const BELOW: usize = 4;

/// What was seen in one table.
#[derive(Debug)]
pub(super) struct Seen {
    pub(super) header: Option<Header>,
    pub(super) spots: Vec<Spot>,
    pub(super) end: Option<String>,
}

type Row = (u32, Vec<(u32, Cell)>);

impl Seen {
    /// How much was understood: a row of headings counts for more than labels.
    pub(super) fn score(&self) -> usize {
        let header = self.header.as_ref();
        let columns = self.spots.iter().filter(|spot| !spot.once).count();
        header.map_or(0, |header| 10_000 + 1000 * header.known + columns.min(500))
            + self.spots.iter().filter(|spot| spot.once).count().min(400)
    }
}

pub(super) fn look(cells: &Cells) -> Seen {
    let rows = &cells.rows;
    let found = (0..rows.len().min(HEADER_WITHIN))
        .filter_map(|at| Some((known(rows, at)?, at)))
        .max_by_key(|(known, at)| (*known, std::cmp::Reverse(*at)));
    let Some((known, at)) = found else {
        return Seen {
            header: None,
            spots: labels(rows),
            end: None,
        };
    };
    let (above, rest) = rows.split_at(at);
    let Some(((number, headings), below)) = rest.split_first() else {
        return Seen {
            header: None,
            spots: labels(rows),
            end: None,
        };
    };
    let end = below.iter().enumerate().find_map(|(index, (_, cells))| {
        let mut texts = cells.iter().filter_map(|(_, cell)| text(cell));
        texts
            .find(|t| words::ends(t))
            .map(|t| (index, t.trim().to_owned()))
    });
    let records: Vec<&Row> = below
        .iter()
        .take(end.as_ref().map_or(below.len(), |(index, _)| *index))
        .filter(|(_, cells)| cells.len() > 1 || headings.len() < 2)
        .collect();
    let mut spots: Vec<Spot> = headings
        .iter()
        .filter_map(|(column, cell)| {
            let heading = on_one_line(text(cell)?);
            Some(Spot {
                place: Place::Column(heading.clone()),
                names: vec![heading.clone()],
                values: records.iter().map(|row| at_column(row, *column)).collect(),
                once: false,
                twice: headings
                    .iter()
                    .filter(|(_, other)| text(other).is_some_and(|t| fold(t) == fold(&heading)))
                    .count()
                    > 1,
            })
        })
        .collect();
    let stands_above = |heading: &str| {
        let texts = above.iter().flat_map(|(_, cells)| cells);
        texts
            .filter_map(|(_, cell)| text(cell))
            .any(|t| fold(t) == fold(heading))
    };
    let marks = spots
        .iter()
        .filter(|spot| !spot.twice)
        .filter_map(|spot| spot.names.first().cloned())
        .filter(|heading| !stands_above(heading))
        .collect();
    spots.extend(labels(above));
    Seen {
        header: Some(Header {
            row: number + 1,
            marks,
            known,
        }),
        spots,
        end: end.map(|(_, text)| text),
    }
}

fn text(cell: &Cell) -> Option<&str> {
    match cell {
        Cell::Text(text) => Some(text),
        _ => None,
    }
}

/// Blanks and line breaks folded, as rules compare headings.
fn on_one_line(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

fn at_column((_, cells): &Row, column: u32) -> Datum {
    cells
        .iter()
        .find(|(at, _)| *at == column)
        .map_or(Datum::Blank, |(_, cell)| Datum::of(cell))
}

/// How many meanings the row's texts have as headings; `None` when no row of headings can stand there.
fn known(rows: &[Row], at: usize) -> Option<usize> {
    let (_, headings) = rows.get(at)?;
    let texts = headings
        .iter()
        .filter(|(_, cell)| text(cell).is_some_and(|t| !is_number(t)));
    if texts.clone().count() < 2 || texts.clone().count() < headings.len() {
        return None;
    }
    let below = rows.iter().skip(at + 1).take(BELOW);
    let is_numeric = |cell: &Cell| match cell {
        Cell::Number(_) => true,
        Cell::Text(text) => is_number(text),
        _ => false,
    };
    let numbers_below = below.clone().any(|(_, cells)| {
        cells.len() * 2 > headings.len()
            && cells.iter().any(|(column, cell)| {
                is_numeric(cell) && headings.iter().any(|(heading, _)| heading == column)
            })
    });
    if !numbers_below {
        return None;
    }
    let is_value = |(_, cell): &(u32, Cell)| {
        let means = |t: &str| words::meanings(t).iter().any(|(_, m)| *m == Meaning::Value);
        text(cell).is_some_and(means)
    };
    let meanings: BTreeSet<Meaning> = texts
        .filter_map(|(_, cell)| words::meanings(text(cell)?).first().map(|(_, m)| *m))
        .filter(|meaning| !matches!(meaning, Meaning::Neither | Meaning::End))
        .collect();
    // Beside a label stands its content: only a heading for values makes a row of two one of headings.
    let is_block = headings.len() < 3 && !headings.iter().any(is_value);
    (!is_block).then_some(meanings.len())
}

/// Texts that mean something, with what stands beside them.
fn labels(rows: &[Row]) -> Vec<Spot> {
    let mut spots: Vec<Spot> = Vec::new();
    let meant = |text: &str| {
        let means = |(fit, meaning): &(Fit, Meaning)| {
            *fit == Fit::Whole && !matches!(meaning, Meaning::Neither | Meaning::End)
        };
        words::meanings(text).iter().any(means)
    };
    let all = || {
        rows.iter()
            .flat_map(|(_, cells)| cells)
            .filter_map(|(_, cell)| text(cell))
    };
    for (number, cells) in rows {
        for (index, (column, cell)) in cells.iter().enumerate() {
            let Some(label) = text(cell).map(on_one_line) else {
                continue;
            };
            if meant(&label) {
                let Some((_, beside)) = cells.get(index + 1) else {
                    continue;
                };
                if text(beside).is_some_and(meant) {
                    continue;
                }
                spots.push(Spot {
                    place: Place::Label(label.clone()),
                    names: vec![label.clone()],
                    values: vec![Datum::of(beside)],
                    once: true,
                    twice: all().filter(|t| fold(t) == fold(&label)).count() > 1,
                });
            } else if let Some((name, content)) = label.split_once([':', '：'])
                && meant(name)
                && !content.trim().is_empty()
            {
                let name = name.trim();
                spots.push(Spot {
                    place: Place::Cell(
                        format!("{}{}", letters(*column), number + 1),
                        format!(r"^{}\s*[:：]\s*(.+)$", regex::escape(name)),
                    ),
                    names: vec![name.to_owned()],
                    values: vec![Datum::Text(content.trim().to_owned())],
                    once: true,
                    twice: false,
                });
            }
        }
    }
    spots
}

/// The letters of a column, counted from 0.
fn letters(column: u32) -> String {
    let mut letters = Vec::new();
    let mut rest = column + 1;
    while rest > 0 {
        rest -= 1;
        letters.push(char::from(b'A' + (rest % 26) as u8));
        rest /= 26;
    }
    letters.iter().rev().collect()
}

#[cfg(test)]
mod tests {
    use restudy_parsers::look_at_fields;

    use super::*;

    fn seen(text: &str) -> Seen {
        look(&look_at_fields(text, ';').unwrap())
    }

    #[test]
    fn headings_stand_below_title_rows_and_labels() {
        let seen = seen(
            "Halden Pump Works\nOperator;KL\nDate: 2.6.2026\n\nSerial no.;Feature;Actual\nHP-1;bore;50,01\nHP-2;bore;50,02\nEnd of report;;\nx;y;1\n",
        );
        let header = seen.header.unwrap();
        assert_eq!((header.row, header.known), (5, 3));
        assert_eq!(header.marks, ["Serial no.", "Feature", "Actual"]);
        assert_eq!(seen.end.as_deref(), Some("End of report"));
        let places: Vec<&Place> = seen.spots.iter().map(|spot| &spot.place).collect();
        assert_eq!(places[3], &Place::Label("Operator".into()));
        assert_eq!(
            places[4],
            &Place::Cell("A3".into(), r"^Date\s*[:：]\s*(.+)$".into())
        );
        assert_eq!(
            seen.spots[0].values,
            ["HP-1", "HP-2"].map(|t| Datum::Text(t.into()))
        );
    }

    #[test]
    fn a_block_of_labels_alone_has_no_headings() {
        let seen = seen("Serial no.;HP-1\nOperator;KL\nActual;50,01\n");
        assert!(seen.header.is_none(), "{seen:?}");
        assert_eq!(seen.spots.len(), 3);
    }

    #[test]
    fn letters_go_on_after_z() {
        assert_eq!(
            (letters(0), letters(25), letters(26)),
            ("A".into(), "Z".into(), "AA".into())
        );
    }
}
