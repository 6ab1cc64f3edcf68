//! Exports that need no rule: columns with plain headings.
//!
//! Delimited text or the first visible sheet of a workbook; the first row that is not blank holds
//! the headings, in any order and case: `part` and `value`, and optionally `appraiser`, `trial`,
//! `characteristic`, `nominal`, `lower`, `upper`, `unit`, `taken`, further factors as asked for.
//!
//! Nothing is guessed that could be two things. The delimiter is the comma, the semicolon or the tab,
//! whichever splits the heading line into the most known headings (a first line `sep=;` decides). The
//! decimal mark is the point; it is the comma when the delimiter is not the comma and numbers of the
//! file are written with commas and none with a point. A file with both is refused. A column under
//! another heading is not used but named in [`Parsed::notes`], whatever its heading may mean.

use std::collections::BTreeMap;

use crate::Export;
use crate::decode;
use crate::delimited::{self, Delimiter};
use crate::grid::{Content, Grid, Row};
use crate::kind::{Kind, misnamed};
use crate::names::{fold, listed, shorten};
use crate::one_field;
use crate::parsed::{Parsed, Refused};
use crate::reader::Reader;
use crate::rule::{
    Bounds, Cell, Count, Form, Header, Layout, Limit, Role, Rule, Sheet, Taken, Trial, Value,
};
use crate::sheets::Sheets;
use crate::workbook;

const HEADINGS: [&str; 10] = [
    "part",
    "appraiser",
    "trial",
    "characteristic",
    "value",
    "nominal",
    "lower",
    "upper",
    "unit",
    "taken",
];
const NUMBERS: [&str; 4] = ["value", "nominal", "lower", "upper"];

/// Everyday words for some of them.
const SYNONYMS: [(&str, &[&str]); 5] = [
    ("appraiser", &["operator", "inspector", "user"]),
    ("part", &["serial", "serial no.", "piece", "sample"]),
    ("trial", &["run", "repeat", "replicate"]),
    ("characteristic", &["feature", "dimension"]),
    ("value", &["result", "measured", "actual"]),
];
/// Columns that are named one by one when they are not used.
const UNUSED_SHOWN: usize = 12;

/// What is asked of an export beside its plain headings.
#[derive(Debug, Clone, Default, PartialEq, Eq, serde::Serialize, serde::Deserialize)]
pub struct Plain {
    /// Headings of further factors.
    pub factors: Vec<String>,
}

/// Reads an export whose columns have plain headings.
///
/// Headings (any case, any order): `part` and `value`; optionally `appraiser`, `trial`,
/// `characteristic`, `nominal`, `lower`, `upper` (absolute limits), `unit`, `taken` (ISO 8601 or a
/// date cell), and those that `asked` names. Columns under other headings are not used, and
/// [`Parsed::notes`] says so. Without `trial`, trials are counted by order in the
/// file; without `characteristic` there is one, called `value`.
///
/// The delimiter of text is the comma, semicolon or tab, whichever splits the heading line into the
/// most known headings. The decimal mark is the point, but the comma when the delimiter is not the
/// comma and the numbers are written with commas and never with a point.
///
/// # Errors
/// [`Refused`] as [`crate::read`]; also when the numbers are written with both decimal marks.
pub fn read_plain(export: Export<'_>, asked: &Plain) -> Result<Parsed, Refused> {
    let bounds = Bounds::default();
    let kind = Kind::of(export.bytes, &bounds)?;
    if kind == Kind::Text {
        let text = decode::decode(export.bytes, None, None)?;
        let delimiter = delimiter(&text, asked);
        return delimited::grid(&text, delimiter, false, &bounds)
            .and_then(|grid| by_headings(export.path, &grid, delimiter.mark != b',', asked))
            .map_err(|refused| misnamed(export.path, &text, refused));
    }
    let grids = workbook::grids(export.bytes, kind, &Sheets::First, &bounds)?;
    match grids.first() {
        Some(grid) => by_headings(export.path, grid, true, asked),
        None => Err(Refused::new("the workbook has no sheet")),
    }
}

/// Reads by the headings in the first row; `comma_free` when commas in fields can be decimal marks.
fn by_headings(
    path: &str,
    grid: &Grid,
    comma_free: bool,
    asked: &Plain,
) -> Result<Parsed, Refused> {
    let Some(header) = grid.rows.first() else {
        return Err(Refused::unfinished("there is no row of headings"));
    };
    let written: Vec<&str> = header
        .cells
        .iter()
        .filter_map(|(_, content)| match content {
            Content::Text(text) => Some(&**text),
            _ => None,
        })
        .collect();
    let headings: Vec<String> = written.iter().map(|text| fold(text)).collect();
    for needed in ["part", "value"] {
        if !headings.iter().any(|heading| heading == needed) {
            return Err(Refused {
                sentence: format!(
                    "no column is headed `{needed}`; {} has {}",
                    grid.row_name(header.number),
                    listed(written.iter().copied())
                ),
                hint: Some(hint_at(needed, header, &written)),
                perhaps_unfinished: grid.may_be_cut_at(header.number),
            });
        }
    }
    let decimal = if comma_free { decimal_mark(grid)? } else { '.' };
    let header = Header::Row(header.number.saturating_add(1));
    let notes = unused(grid, &written, asked);
    let rule = rule(&headings, asked, header.clone(), decimal, Bounds::default());
    let reader = Reader::new(&rule).map_err(|why| Refused::new(why.to_string()))?;
    let once = reader.once(path)?;
    let parsed = reader.read_grids(std::slice::from_ref(grid), &header, once)?;
    Ok(Parsed {
        notes: notes.into_iter().collect(),
        ..parsed
    })
}

/// What a person could do when the heading `needed` is missing.
fn hint_at(needed: &str, header: &Row, written: &[&str]) -> String {
    if one_field::alone(header).is_some() {
        return "one field only; part the fields by `,`, `;` or a tab".to_owned();
    }
    match written.iter().find(|text| meaning(text) == Some(needed)) {
        Some(text) => format!("is it `{}`? head that column `{needed}`", shorten(text)),
        None => format!("the headings are {}", listed(HEADINGS)),
    }
}

/// The plain heading that an everyday word in place of it means.
fn meaning(heading: &str) -> Option<&'static str> {
    let heading = fold(heading);
    SYNONYMS
        .into_iter()
        .find(|(_, words)| words.contains(&heading.as_str()))
        .map(|(meant, _)| meant)
}

/// One sentence that names the columns that are not used.
fn unused(grid: &Grid, written: &[&str], asked: &Plain) -> Option<String> {
    let is_used = |heading: &str| {
        let heading = fold(heading);
        HEADINGS.contains(&heading.as_str())
            || asked.factors.iter().any(|factor| fold(factor) == heading)
    };
    let has = |name: &str| written.iter().any(|text| fold(text) == name);
    let unused: Vec<&str> = written
        .iter()
        .copied()
        .filter(|text| !is_used(text))
        .collect();
    let shown = |text: &&str| match meaning(text).filter(|meant| !has(meant)) {
        Some(meant) => format!("`{}` (perhaps `{meant}`?)", shorten(text)),
        None => format!("`{}`", shorten(text)),
    };
    let row = grid.row_name(grid.rows.first()?.number);
    match unused.as_slice() {
        [] => None,
        [one] => Some(format!("{row}: the column {} is not used", shown(one))),
        several => {
            let names: Vec<String> = several.iter().take(UNUSED_SHOWN).map(shown).collect();
            let more = match several.len().saturating_sub(UNUSED_SHOWN) {
                0 => String::new(),
                more => format!(" and {more} more"),
            };
            Some(format!(
                "{row}: the columns {}{more} are not used",
                names.join(", ")
            ))
        }
    }
}

fn delimiter(text: &str, asked: &Plain) -> Delimiter {
    let announced = delimited::delimiter(text, None, '.');
    if announced.announced {
        return announced;
    }
    let known = |heading: &str| {
        let heading = fold(heading.trim().trim_matches('"'));
        HEADINGS.contains(&heading.as_str())
            || asked.factors.iter().any(|factor| fold(factor) == heading)
    };
    let line = text
        .lines()
        .find(|line| !line.trim().is_empty())
        .unwrap_or("");
    let recognised = |mark: &u8| {
        line.split(char::from(*mark))
            .filter(|cell| known(cell))
            .count()
    };
    let mark = [b'\t', b';', b',']
        .into_iter()
        .max_by_key(recognised)
        .unwrap_or(b',');
    Delimiter {
        mark,
        announced: false,
    }
}

/// The decimal mark of all numbers of a file whose fields are not parted by commas.
fn decimal_mark(grid: &Grid) -> Result<char, Refused> {
    let Some((header, rows)) = grid.rows.split_first() else {
        return Ok('.');
    };
    let columns: Vec<u32> = NUMBERS
        .iter()
        .flat_map(|name| header.holding(name))
        .collect();
    let texts = rows.iter().flat_map(|row| {
        columns
            .iter()
            .filter_map(move |&column| match row.at(column) {
                Content::Text(text) => Some((row.number, column, text)),
                _ => None,
            })
    });
    let with = |mark: char| texts.clone().find(|(_, _, text)| text.contains(mark));
    let (comma, point) = (with(','), with('.'));
    match (comma, point) {
        (None, _) => Ok('.'),
        (Some(_), None) => Ok(','),
        (Some((row, column, comma)), Some((other_row, other_column, point))) => Err(Refused {
            sentence: format!(
                "the numbers have two decimal marks: `{}` ({}) and `{}` ({})",
                shorten(comma),
                grid.place(row, column),
                shorten(point),
                grid.place(other_row, other_column)
            ),
            hint: Some(
                "write all numbers with one decimal mark and no marks between thousands".to_owned(),
            ),
            perhaps_unfinished: false,
        }),
    }
}

fn rule(headings: &[String], asked: &Plain, header: Header, decimal: char, bounds: Bounds) -> Rule {
    let column = |name: &str| Role::plain(Cell::Column(name.to_owned()));
    let role = |name: &str| {
        headings
            .iter()
            .any(|heading| heading == name)
            .then(|| column(name))
    };
    let limit = |name: &str| {
        role(name).map(|role| Limit {
            role,
            from_nominal: false,
            unsigned: false,
        })
    };
    Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header,
            delimiter: None,
        },
        part: column("part"),
        appraiser: role("appraiser"),
        trial: Some(role("trial").map_or(Trial::Counted(Count::Order), Trial::Stated)),
        taken: role("taken").map(|role| Taken {
            role,
            format: None,
            dates: None,
            written_in: None,
            shown_in: None,
        }),
        round: None,
        characteristic: role("characteristic"),
        value: Value {
            role: column("value"),
            unit: role("unit"),
        },
        nominal: role("nominal"),
        lower: limit("lower"),
        upper: limit("upper"),
        factors: asked
            .factors
            .iter()
            .map(|name| (name.clone(), column(name)))
            .collect(),
        same: BTreeMap::new(),
        end: None,
        count: None,
        layout: Layout::default(),
        decimal,
        thousands: None,
        no_value: Vec::new(),
        line_breaks: false,
        encoding: None,
        bounds,
    }
}
