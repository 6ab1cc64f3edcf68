//! Delimited text to rows of fields.
//!
//! Quoting as in RFC 4180, but a field ends on its line, unless the rule says otherwise: one stray quote
//! would otherwise swallow the rest of the file. Text behind a closing quote costs its field. Lines are counted here, since blank ones count for places.

use csv::{ReaderBuilder, StringRecord};

use crate::grid::{Content, Grid, Origin, Row};
use crate::names::shorten;
use crate::parsed::Refused;
use crate::rule::Bounds;

/// What parts the fields, and whether the file says so itself in a first line `sep=;`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Delimiter {
    pub(crate) mark: u8,
    pub(crate) announced: bool,
}

/// A mark that can part fields.
pub(crate) fn as_delimiter(mark: char) -> Option<u8> {
    let fits =
        mark.is_ascii() && !mark.is_ascii_alphanumeric() && !matches!(mark, '"' | '\r' | '\n');
    fits.then_some(mark as u8)
}

/// The rule's mark, else the file's own `sep=`, else the comma (the semicolon where commas are decimal marks).
pub(crate) fn delimiter(text: &str, named: Option<u8>, decimal: char) -> Delimiter {
    let first = text.lines().next().unwrap_or("").trim_end_matches('\r');
    let unquoted = first
        .strip_prefix('"')
        .and_then(|first| first.strip_suffix('"'));
    let announced = unquoted
        .unwrap_or(first)
        .strip_prefix("sep=")
        .and_then(|mark| {
            let mut chars = mark.chars();
            chars.next().filter(|_| chars.next().is_none())
        })
        .and_then(as_delimiter);
    let usual = if decimal == ',' { b';' } else { b',' };
    Delimiter {
        mark: named.or(announced).unwrap_or(usual),
        announced: announced.is_some(),
    }
}

/// All rows of the text.
pub(crate) fn grid(
    text: &str,
    delimiter: Delimiter,
    line_breaks: bool,
    bounds: &Bounds,
) -> Result<Grid, Refused> {
    within_columns(text, delimiter.mark, bounds)?;
    let mut reader = ReaderBuilder::new()
        .delimiter(delimiter.mark)
        .has_headers(false)
        .flexible(true)
        .from_reader(text.as_bytes());
    let mut lines = Lines {
        bytes: text.as_bytes(),
        at: 0,
        line: 0,
    };
    let mut record = StringRecord::new();
    let mut rows = Vec::new();
    let mut cells = 0;
    while reader
        .read_record(&mut record)
        .map_err(|_| unreadable(lines.line))?
    {
        let start = record.position().map_or(0, csv::Position::byte);
        let line = lines.advance_to(start);
        if delimiter.announced && line == 0 {
            continue;
        }
        let raw = &text[position(start)..position(reader.position().byte())];
        let quotes = Quotes::of(raw, delimiter.mark);
        if quotes.open && line_breaks {
            return Err(never_closed(line));
        }
        let row = row(&record, line, &quotes, line_breaks, bounds)?;
        if row.cells.is_empty() {
            continue;
        }
        cells += row.cells.len();
        rows.push(row);
        if rows.len() > bounds.rows as usize {
            return Err(Refused::new(format!(
                "more than {} rows; that is the limit",
                bounds.rows
            )));
        }
        if cells > bounds.cells as usize {
            return Err(Refused::new(format!(
                "more than {} fields; that is the limit",
                bounds.cells
            )));
        }
    }
    Ok(Grid {
        origin: Origin::Text,
        rows,
    })
}

fn row(
    record: &StringRecord,
    line: u32,
    quotes: &Quotes,
    line_breaks: bool,
    bounds: &Bounds,
) -> Result<Row, Refused> {
    let mut row = Row::new(line, Some(u32::try_from(record.len()).unwrap_or(u32::MAX)));
    for (column, text) in (0..).zip(record) {
        let is_last = column as usize + 1 == record.len();
        if !line_breaks && (text.contains(['\n', '\r']) || (quotes.open && is_last)) {
            return Err(Refused {
                sentence: format!(
                    "line {}, field {}: a quoted text runs over the end of its line: `{}`",
                    line + 1,
                    column + 1,
                    shorten(text)
                ),
                hint: Some(
                    "look for a stray `\"` in that line; if texts do hold line ends, set `line_breaks = true`"
                        .to_owned(),
                ),
                perhaps_unfinished: quotes.open,
            });
        }
        if text.len() > bounds.text_bytes as usize {
            return Err(Refused::new(format!(
                "line {}, field {}: a text of {} bytes; the limit is {}",
                line + 1,
                column + 1,
                text.len(),
                bounds.text_bytes
            )));
        }
        if !text.trim().is_empty() {
            row.cells.push((
                column,
                match quotes.behind.contains(&column) {
                    true => Content::Unusable("text behind its closing quote".into()),
                    false => Content::Text(text.into()),
                },
            ));
        }
    }
    Ok(row)
}

fn never_closed(line: u32) -> Refused {
    Refused {
        sentence: format!(
            "line {}: a quoted text begins and never ends",
            line.saturating_add(1)
        ),
        hint: Some("look for a stray `\"` in that line".to_owned()),
        perhaps_unfinished: true,
    }
}

fn position(byte: u64) -> usize {
    usize::try_from(byte).unwrap_or(usize::MAX)
}

/// What the quotes of one record leave amiss.
#[derive(Debug, Default)]
struct Quotes {
    /// The last field's quote is not closed.
    open: bool,
    /// Fields with something between their closing quote and the next delimiter.
    behind: Vec<u32>,
}

impl Quotes {
    fn of(raw: &str, mark: u8) -> Self {
        let mut quotes = Self::default();
        if !raw.contains('"') {
            return quotes;
        }
        let bytes = raw
            .trim_start_matches(['\r', '\n'])
            .trim_end_matches(['\r', '\n'])
            .as_bytes();
        let (mut at, mut field) = (0, 0);
        loop {
            if bytes.get(at) == Some(&b'"') {
                let Some(end) = closing(bytes, at + 1) else {
                    quotes.open = true;
                    return quotes;
                };
                at = end + 1;
                if bytes.get(at).is_some_and(|&next| next != mark) {
                    quotes.behind.push(field);
                }
            }
            match bytes[at..].iter().position(|&byte| byte == mark) {
                Some(next) => at += next + 1,
                None => return quotes,
            }
            field += 1;
        }
    }
}

/// The quote that closes the field whose text begins at `from`.
fn closing(bytes: &[u8], from: usize) -> Option<usize> {
    let mut at = from;
    loop {
        at += bytes[at..].iter().position(|&byte| byte == b'"')?;
        if bytes.get(at + 1) != Some(&b'"') {
            return Some(at);
        }
        at += 2;
    }
}

fn within_columns(text: &str, mark: u8, bounds: &Bounds) -> Result<(), Refused> {
    let (mut marks, mut line) = (0_u32, 1_u64);
    for &byte in text.as_bytes() {
        if byte == b'\n' || byte == b'\r' {
            marks = 0;
            line += u64::from(byte == b'\n');
        } else if byte == mark {
            marks += 1;
            if marks >= bounds.columns {
                return Err(Refused::new(format!(
                    "line {line}: more than {} columns; that is the limit",
                    bounds.columns
                )));
            }
        }
    }
    Ok(())
}

fn unreadable(line: u32) -> Refused {
    Refused::new(format!(
        "below line {}: the text cannot be split into fields",
        line.saturating_add(1)
    ))
}

/// Counts line ends (CR LF, LF, lone CR) as far as records have been read.
struct Lines<'a> {
    bytes: &'a [u8],
    at: usize,
    line: u32,
}

impl Lines<'_> {
    /// The line, from 0, on which the record at `start` stands: past the line ends that lie there.
    fn advance_to(&mut self, start: u64) -> u32 {
        let start = usize::try_from(start).unwrap_or(usize::MAX);
        while let Some(&byte) = self.bytes.get(self.at) {
            let ends = byte == b'\n' || byte == b'\r';
            if self.at >= start && !ends {
                break;
            }
            let pair = byte == b'\r' && self.bytes.get(self.at + 1) == Some(&b'\n');
            self.at += 1 + usize::from(pair);
            self.line += u32::from(ends);
        }
        self.line
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rows(text: &str) -> Vec<(u32, Option<u32>)> {
        let delimiter = delimiter(text, None, '.');
        let grid = grid(text, delimiter, false, &Bounds::default()).unwrap();
        grid.rows
            .iter()
            .map(|row| (row.number + 1, row.width))
            .collect()
    }

    #[test]
    fn lines_are_counted_whatever_ends_them() {
        for end in ["\n", "\r\n", "\r"] {
            let text = ["a,b", "", "", "1,2", " ", "3,4,5"].join(end);
            assert_eq!(
                rows(&text),
                [(1, Some(2)), (4, Some(2)), (6, Some(3))],
                "{end:?}"
            );
        }
        assert_eq!(rows("\n\na,b\n"), [(3, Some(2))]);
        assert_eq!(rows("sep=;\r\na;b\r\n"), [(2, Some(2))]);
    }

    #[test]
    fn the_rule_decides_then_the_file_then_the_decimal_mark() {
        let mark = |text, named, decimal| char::from(delimiter(text, named, decimal).mark);
        assert_eq!(mark("sep=|\na", Some(b'\t'), '.'), '\t');
        assert_eq!(mark("sep=|\r\na", None, '.'), '|');
        assert_eq!(mark("\"sep=|\"\r\na", None, '.'), '|');
        assert_eq!(mark("a;b", None, '.'), ',');
        assert_eq!(mark("a;b", None, ','), ';');
        assert_eq!(mark("sep=\"\na", None, '.'), ',');
    }

    #[test]
    fn a_stray_quote_does_not_swallow_the_file() {
        let text = "part,value\n1,\"2\n2,3\n";
        let refused =
            grid(text, delimiter(text, None, '.'), false, &Bounds::default()).unwrap_err();
        assert!(
            refused
                .sentence
                .starts_with("line 2, field 2: a quoted text runs over")
        );
    }

    #[test]
    fn limits_are_named() {
        let bounds = Bounds {
            rows: 2,
            columns: 3,
            text_bytes: 4,
            ..Bounds::default()
        };
        for (text, limit) in [
            ("a\nb\nc\n", "2 rows"),
            ("a,b,c,d\n", "3 columns"),
            ("abcde\n", "5 bytes; the limit is 4"),
        ] {
            let refused = grid(text, delimiter(text, None, '.'), false, &bounds).unwrap_err();
            assert!(refused.sentence.contains(limit), "{}", refused.sentence);
        }
    }

    fn fields(text: &str) -> Result<Vec<Vec<String>>, Refused> {
        let shown = |content: &Content| match content {
            Content::Text(text) => text.to_string(),
            other => format!("{other:?}"),
        };
        let delimiter = delimiter(text, None, '.');
        let grid = grid(text, delimiter, true, &Bounds::default())?;
        let row = |row: &Row| row.cells.iter().map(|(_, cell)| shown(cell)).collect();
        Ok(grid.rows.iter().map(row).collect())
    }

    #[test]
    fn a_field_may_hold_line_ends_where_the_rule_says_so() {
        let text = "part,\"Actual\r\nmm\"\r\nP1,\"1\"\r\n";
        assert_eq!(
            fields(text).unwrap(),
            [["part", "Actual\r\nmm"], ["P1", "1"]]
        );
        let refused = fields("part,value\nP1,\"1\nP2,2\n").unwrap_err();
        assert_eq!(
            refused.sentence,
            "line 2: a quoted text begins and never ends"
        );
        assert!(refused.perhaps_unfinished);
    }

    #[test]
    fn a_quote_that_the_file_ends_in_is_no_whole_field() {
        let text = "part,value\nP1,\"12.0";
        let told = grid(text, delimiter(text, None, '.'), false, &Bounds::default()).unwrap_err();
        assert!(told.perhaps_unfinished && told.sentence.starts_with("line 2, field 2: a quoted"));
    }

    #[test]
    fn text_behind_a_closing_quote_costs_its_field() {
        let read = fields("a,\"1\"2,\"x,\"\"y\",5\"\n").unwrap();
        assert_eq!(read[0][0], "a");
        assert!(
            read[0][1].contains("text behind its closing quote"),
            "{read:?}"
        );
        assert_eq!(read[0][2..], ["x,\"y", "5\""]);
    }
}
