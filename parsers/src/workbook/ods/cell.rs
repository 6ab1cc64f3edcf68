//! One cell of an OpenDocument spreadsheet: what it states and what it shows, and what that means.

use jiff::civil;
use quick_xml::events::BytesStart;
use quick_xml::reader::NsReader;

use super::{OFFICE, TABLE, attribute, repeats};
use crate::grid::Content;
use crate::names::shorten;
use crate::parsed::Refused;
use crate::workbook::rows::{NO_RESULT, number, span_of_time, text, truth};

/// Attributes of a later version of the format, in which an error is a kind of its own.
const CALC_EXTENSION: &str = "urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0";
const ERRORS: [&str; 8] = [
    "#NULL!",
    "#DIV/0!",
    "#VALUE!",
    "#REF!",
    "#NAME?",
    "#NUM!",
    "#N/A",
    "#GETTING_DATA",
];

pub(super) struct Cell {
    pub(super) repeats: u64,
    kind: Option<String>,
    value: Option<String>,
    is_error: bool,
    is_formula: bool,
    shown: String,
    paragraphs: usize,
    most: usize,
}

impl Cell {
    /// `most`: bytes of text beyond which no more is gathered.
    pub(super) fn of<R>(
        element: &BytesStart<'_>,
        xml: &NsReader<R>,
        most: usize,
    ) -> Result<Self, Refused> {
        let of = |namespace: &str, name: &str| attribute(xml, element, namespace, name);
        let kind = of(OFFICE, "value-type")?;
        let value = match kind.as_deref() {
            Some("date") => of(OFFICE, "date-value")?,
            Some("boolean") => of(OFFICE, "boolean-value")?,
            Some("string") => of(OFFICE, "string-value")?,
            Some(_) => of(OFFICE, "value")?,
            None => None,
        };
        Ok(Self {
            repeats: repeats(of(TABLE, "number-columns-repeated")?)?,
            kind,
            value,
            is_error: of(CALC_EXTENSION, "value-type")?.as_deref() == Some("error"),
            is_formula: of(TABLE, "formula")?.is_some(),
            shown: String::new(),
            paragraphs: 0,
            most,
        })
    }

    pub(super) fn begin_paragraph(&mut self) {
        self.paragraphs += 1;
        if self.paragraphs > 1 {
            self.show_blanks(1);
        }
    }

    /// White space counts as one blank.
    pub(super) fn show(&mut self, text: &str) {
        for c in text.chars() {
            if self.shown.len() > self.most {
                return;
            }
            match c.is_ascii_whitespace() {
                true if self.shown.ends_with(' ') => {}
                true => self.shown.push(' '),
                false => self.shown.push(c),
            }
        }
    }

    pub(super) fn show_blanks(&mut self, count: usize) {
        let left = self.most.saturating_sub(self.shown.len()) + 1;
        self.shown.extend(std::iter::repeat_n(' ', count.min(left)));
    }

    pub(super) fn content(self) -> Content {
        let shown = self.shown.trim();
        if self.is_error || is_error(shown) {
            return Content::Unusable(match shown {
                "" => "an error".into(),
                shown => format!("the error `{}`", shorten(shown)).into(),
            });
        }
        let lacking = |kind: &str| {
            Content::Unusable(match self.is_formula {
                true => NO_RESULT.into(),
                false => format!("a {kind} without its value").into(),
            })
        };
        match (self.kind.as_deref(), self.value.as_deref().map(str::trim)) {
            (Some("string"), Some(value)) if is_error(value) => {
                Content::Unusable(format!("the error `{value}`").into())
            }
            (Some("string"), Some(value)) if !value.is_empty() => text(value),
            (Some("string"), _) => text(shown),
            (Some("boolean"), Some("true")) => truth(true),
            (Some("boolean"), Some("false")) => truth(false),
            (Some("date"), Some(value)) => date(value),
            (Some("time"), _) => span_of_time(),
            // A formula `TRUE()` is stored as a number by some writers.
            (Some("float"), Some("0" | "1")) if matches!(shown, "TRUE" | "FALSE") => text(shown),
            (Some("float" | "percentage" | "currency"), Some(value)) => float(value),
            (Some(kind @ ("float" | "percentage" | "currency" | "date" | "boolean")), _) => {
                lacking(kind)
            }
            (Some(kind), _) => Content::Unusable(
                format!("a content of the unknown kind `{}`", shorten(kind)).into(),
            ),
            (None, _) if self.is_formula && shown.is_empty() => Content::Unusable(NO_RESULT.into()),
            (None, _) => text(shown),
        }
    }
}

/// An error as cells show it; `Err:502` stands for errors that have no name.
fn is_error(shown: &str) -> bool {
    ERRORS.contains(&shown)
        || shown
            .strip_prefix("Err:")
            .is_some_and(|code| code.len() == 3 && code.bytes().all(|b| b.is_ascii_digit()))
}

fn float(value: &str) -> Content {
    let wrong = || Content::Unusable(format!("`{}` in place of its number", shorten(value)).into());
    let Ok(parsed) = value.parse::<f64>() else {
        return wrong();
    };
    let mantissa = value.split(['e', 'E']).next().unwrap_or(value);
    if parsed == 0.0 && mantissa.contains(|c: char| matches!(c, '1'..='9')) {
        return wrong();
    }
    number(parsed)
}

/// A day, or a day and a time, as in ISO 8601, rounded to milliseconds as in other workbooks.
fn date(value: &str) -> Content {
    let parsed = value
        .parse::<civil::DateTime>()
        .ok()
        .filter(|_| !value.ends_with(['Z', 'z']));
    let rounded = parsed.and_then(|date| date.round(jiff::Unit::Millisecond).ok());
    match rounded {
        Some(date) => Content::Date(date),
        None => Content::Unusable(format!("`{}` in place of its date", shorten(value)).into()),
    }
}
