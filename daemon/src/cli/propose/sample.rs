//! One sample export, opened: which form it has, and what stands where in it.
//!
//! Encoding and delimiter are found by trying: what yields the most words of the trade is taken. Only here may
//! that be done; a service reads by its rule.

use restudy_parsers::{Cells, Refused, Seen, announced_delimiter, look_at_fields, look_at_text};

use super::{table, words, xml};

/// Marks that may part fields, the likelier first.
const DELIMITERS: [char; 4] = [';', '\t', ',', '|'];
/// Encodings of text that is not UTF-8, the likelier first.
const ENCODINGS: [&str; 7] = [
    "windows-1252",
    "windows-1250",
    "iso-8859-2",
    "shift_jis",
    "gb18030",
    "euc-jp",
    "windows-1251",
];

/// A sample and what stands in it.
#[derive(Debug)]
pub(super) struct Sample {
    /// File name, as a `path` role would search it.
    pub(super) file: String,
    pub(super) dress: Dress,
    pub(super) spots: Vec<Spot>,
    /// The text that ends it.
    pub(super) end: Option<String>,
}

/// The outside of an export.
#[derive(Debug)]
pub(super) enum Dress {
    Table {
        /// The sheet's name and how many visible sheets there are; `None` for text.
        sheet: Option<(String, usize)>,
        /// Whether the sheet that holds the table is the first one.
        first_sheet: bool,
        /// `None` when roles stand beside labels only.
        header: Option<Header>,
        /// The mark between fields, and whether the file announces it; `None` in a workbook.
        delimiter: Option<(char, bool)>,
        /// The encoding that was tried with success; `None` when nothing needs to be named.
        encoding: Option<&'static str>,
    },
    Xml {
        each: String,
        /// How many elements stand at that path.
        records: usize,
        encoding: Option<&'static str>,
    },
}

/// Where the headings stand.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Header {
    /// Counted from 1.
    pub(super) row: u32,
    /// Headings that stand in no row above it.
    pub(super) marks: Vec<String>,
    /// Words of the trade among the headings.
    pub(super) known: usize,
}

/// A place that holds one text for every reading, or one for the whole export.
#[derive(Debug, Clone)]
pub(super) struct Spot {
    pub(super) place: Place,
    /// What the place is called, in one or several ways.
    pub(super) names: Vec<String>,
    /// One a record; one in all when `once`.
    pub(super) values: Vec<Datum>,
    pub(super) once: bool,
    /// Another column has the same heading: a rule cannot name it.
    pub(super) twice: bool,
}

/// How a rule names a place.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Place {
    Column(String),
    Label(String),
    /// A cell such as `A2`, and the regex that cuts the content out of its text.
    Cell(String, String),
    Xml(String),
}

/// What stands there.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Datum {
    Blank,
    Text(String),
    Number(f64),
    Date(jiff::civil::DateTime),
}

impl Datum {
    pub(super) fn of(seen: &Seen) -> Self {
        match seen {
            Seen::Text(text) if text.trim().is_empty() => Self::Blank,
            Seen::Text(text) => Self::Text(text.trim().to_owned()),
            Seen::Number(number) => Self::Number(*number),
            Seen::Date(date) => Self::Date(*date),
            Seen::Unusable(what) => Self::Text(what.clone()),
        }
    }
}

/// Opens text: delimited or XML.
pub(super) fn of_text(file: &str, bytes: &[u8]) -> Result<Sample, Refused> {
    let (text, encoding) = decoded(bytes)?;
    if text.trim_start().starts_with('<') {
        return xml::sample(file, &text, encoding);
    }
    let announced = announced_delimiter(&text);
    let marks: Vec<char> = match announced {
        Some(mark) => vec![mark],
        None => DELIMITERS.to_vec(),
    };
    let mut best: Option<(usize, char, table::Seen)> = None;
    let mut refused = None;
    for mark in marks {
        match look_at_fields(&text, mark) {
            Ok(cells) => {
                let seen = table::look(&cells);
                let score = seen.score();
                if best.as_ref().is_none_or(|(most, _, _)| score > *most) {
                    best = Some((score, mark, seen));
                }
            }
            Err(why) => refused = Some(why),
        }
    }
    match (best, refused) {
        (Some((_, mark, seen)), _) => Ok(Sample {
            file: file.to_owned(),
            dress: Dress::Table {
                sheet: None,
                first_sheet: true,
                header: seen.header,
                delimiter: Some((mark, announced.is_some())),
                encoding,
            },
            spots: seen.spots,
            end: seen.end,
        }),
        (None, Some(why)) => Err(why),
        (None, None) => Err(nothing()),
    }
}

/// Opens a workbook's sheets.
pub(super) fn of_sheets(file: &str, sheets: &[Cells]) -> Result<Sample, Refused> {
    let mut best: Option<(usize, usize, table::Seen)> = None;
    for (index, cells) in sheets.iter().enumerate() {
        let seen = table::look(cells);
        let score = seen.score();
        if best.as_ref().is_none_or(|(most, _, _)| score > *most) {
            best = Some((score, index, seen));
        }
    }
    let Some((_, index, seen)) = best else {
        return Err(nothing());
    };
    let name = sheets.get(index).and_then(|cells| cells.sheet.clone());
    Ok(Sample {
        file: file.to_owned(),
        dress: Dress::Table {
            sheet: name.map(|name| (name, sheets.len())),
            first_sheet: index == 0,
            header: seen.header,
            delimiter: None,
            encoding: None,
        },
        spots: seen.spots,
        end: seen.end,
    })
}

fn nothing() -> Refused {
    Refused {
        sentence: "nothing stands in it".into(),
        hint: None,
        perhaps_unfinished: true,
    }
}

/// The text, and the encoding that has to be named for it.
fn decoded(bytes: &[u8]) -> Result<(String, Option<&'static str>), Refused> {
    let refused = match look_at_text(bytes, None) {
        Ok(text) => return Ok((text, None)),
        Err(refused) => refused,
    };
    if bytes.contains(&0) {
        let zeros = |from: usize| {
            bytes
                .iter()
                .skip(from)
                .step_by(2)
                .filter(|b| **b == 0)
                .count()
        };
        let label = if zeros(1) > zeros(0) {
            "utf-16le"
        } else {
            "utf-16be"
        };
        return look_at_text(bytes, Some(label))
            .map(|text| (text, Some(label)))
            .map_err(|_| refused);
    }
    let mut best: Option<(i64, String, &'static str)> = None;
    for label in ENCODINGS {
        let Ok(text) = look_at_text(bytes, Some(label)) else {
            continue;
        };
        let likely = likely(&text);
        if best.as_ref().is_none_or(|(most, _, _)| likely > *most) {
            best = Some((likely, text, label));
        }
    }
    best.map(|(_, text, label)| (text, Some(label)))
        .ok_or(refused)
}

/// How much a text looks like one: words of the trade that are not plain ASCII, less odd characters.
fn likely(text: &str) -> i64 {
    let mut words_met = 0;
    for field in text.split([';', ',', '\t', '|', '\n', '\r', ':']) {
        let field = field.trim().trim_matches('"');
        let whole = |(fit, _): &(words::Fit, words::Meaning)| *fit == words::Fit::Whole;
        if !field.is_ascii() && words::meanings(field).iter().any(whole) {
            words_met += 1;
        }
    }
    let usual = |c: char| c.is_ascii() || c.is_alphabetic() || "µ°Ø±²³–—…€§×Δº".contains(c);
    let odd = text.chars().filter(|c| !usual(*c)).count();
    20 * words_met - i64::try_from(odd).unwrap_or(i64::MAX / 2)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_encoding_is_found_by_the_words_that_it_yields() {
        for (bytes, label) in [
            (&b"Werkst\xfcck;Pr\xfcfer\n1;KL\n"[..], "windows-1252"),
            (
                b"\xc8\xedslo d\xedlu;Nam\xec\xf8en\xe1 hodnota\n1;2\n",
                "windows-1250",
            ),
            (
                b"\x95\x94\x95i\x94\xd4\x8d\x86,\x91\xaa\x92\xe8\x92l\n1,2\n",
                "shift_jis",
            ),
            (
                b"\xc1\xe3\xbc\xfe\xba\xc5,\xb2\xe2\xc1\xbf\xd6\xb5\n1,2\n",
                "gb18030",
            ),
            (b"p\0a\0r\0t\0;\0v\0a\0l\0u\0e\0\n\0", "utf-16le"),
        ] {
            assert_eq!(decoded(bytes).unwrap().1, Some(label), "{bytes:?}");
        }
        assert_eq!(decoded("Werkstück".as_bytes()).unwrap().1, None);
    }

    #[test]
    fn the_delimiter_is_the_one_that_yields_headings() {
        for (text, expected) in [
            ("part;actual\nP1;1,5\n", ';'),
            ("part\tactual, mm\nP1\t1,5\n", '\t'),
            ("part,actual\nP1,1.5\n", ','),
            ("part|actual\nP1|1.5\n", '|'),
        ] {
            let sample = of_text("a.csv", text.as_bytes()).unwrap();
            let Dress::Table { delimiter, .. } = sample.dress else {
                panic!("{text}")
            };
            assert_eq!(delimiter, Some((expected, false)), "{text}");
        }
    }
}
