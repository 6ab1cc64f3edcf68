//! One role, ready for use: its place, its regexes compiled, its spellings keyed; and what a field
//! means to it.

use std::borrow::Cow;
use std::collections::BTreeMap;

use regex::Regex;

use crate::fault::{Fault, shown};
use crate::grid::{Content, Field, Place};
use crate::names::{fold, fold_blanks, shorten};
use crate::number::Number;
use crate::qif::Qif;
use crate::reader::RuleError;
use crate::rule::{Cell, Role};
use crate::xml_path::XmlPath;

/// Where a role comes from, checked.
#[derive(Debug, Clone)]
pub(crate) enum Where {
    /// The heading as written.
    Column(String),
    At {
        row: u32,
        column: u32,
    },
    /// The label as written.
    Label(String),
    Path(Regex),
    Xml(XmlPath),
    Qif(Qif),
    Constant(Content),
}

/// One role of a rule.
#[derive(Debug, Clone)]
pub(crate) struct Source {
    /// As sentences name it: "part", "factor `fixture`".
    pub(crate) role: String,
    pub(crate) from: Where,
    find: Option<Regex>,
    spellings: BTreeMap<String, String>,
}

impl Source {
    /// `each` is the repeating element of an XML form, to which paths may be relative.
    pub(crate) fn new(name: &str, role: &Role, each: Option<&XmlPath>) -> Result<Self, RuleError> {
        let error = |what: String| RuleError::new(name, what);
        let regex = |text: &str| {
            Regex::new(text).map_err(|why| {
                let why = why.to_string();
                let why = why
                    .lines()
                    .last()
                    .unwrap_or("")
                    .trim_start_matches("error: ");
                error(format!("the regex `{text}` cannot be used: {why}"))
            })
        };
        let from = match (&role.from, each) {
            (Cell::Constant(text), _) => Where::Constant(Content::Text(text.as_str().into())),
            (Cell::Path(text), _) => Where::Path(regex(text)?),
            (Cell::Qif(place), _) => Where::Qif(place.clone()),
            (Cell::Xml(path), Some(each)) => Where::Xml(each.join(path).map_err(error)?),
            (Cell::Column(heading), None) => Where::Column(heading.clone()),
            (Cell::At { row, column }, None) => Where::At {
                row: *row,
                column: *column,
            },
            (Cell::Label(label), None) => Where::Label(label.clone()),
            (Cell::Xml(_), None) => {
                return Err(error("an XML path, but the form is a table".to_owned()));
            }
            (Cell::Column(_) | Cell::At { .. } | Cell::Label(_), Some(_)) => {
                return Err(error("a place in a table, but the form is XML".to_owned()));
            }
        };
        Ok(Self {
            role: name.to_owned(),
            from,
            find: role.find.as_deref().map(regex).transpose()?,
            spellings: role
                .spellings
                .iter()
                .map(|(found, label)| (fold(found), label.clone()))
                .collect(),
        })
    }

    /// The text that stands there, cut by `find` and respelled; `None` when the field is blank.
    pub(crate) fn text<'a>(&self, field: Field<'a>) -> Result<Option<Cow<'a, str>>, Fault> {
        let whole: Cow<'a, str> = match field.content {
            Content::Blank => return Ok(None),
            Content::Text(text) => Cow::Borrowed(text.trim()),
            Content::Number(number) => Cow::Owned(digits(*number)),
            Content::Date(date) => Cow::Owned(date.to_string()),
            Content::Unusable(what) => {
                return Err(Fault::new(
                    field.place,
                    shorten(what),
                    format!("the {}", self.role),
                    match self.from {
                        Where::Qif(_) => what.to_string(),
                        _ => format!("holds {what}, where the {} should stand", self.role),
                    },
                )
                .hint(match &self.from {
                    Where::Qif(place) => place.hint(),
                    Where::Xml(_) => "correct the path so that it leads to one text a reading",
                    _ => {
                        "correct the cell where the export is made; it must hold a text or a number"
                    }
                }));
            }
        };
        let found = match &self.find {
            None => whole,
            Some(find) => match first_group(find, &whole) {
                Some(part) => Cow::Owned(part.trim().to_owned()),
                None => {
                    return Err(Fault::new(
                        field.place,
                        shown(field.content),
                        format!("a text in which `{find}` is found"),
                        format!(
                            "nothing in `{}` matches `{find}`, where the {} should stand",
                            shorten(&whole),
                            self.role
                        ),
                    )
                    .hint("have it written as before, or correct `find`"));
                }
            },
        };
        if found.is_empty() {
            return Ok(None);
        }
        if !self.spellings.is_empty()
            && let Some(label) = self.spellings.get(&fold(&found))
        {
            return Ok(Some(Cow::Owned(label.clone())));
        }
        Ok(Some(found))
    }

    /// The label that stands there, blanks folded; a blank is a fault.
    pub(crate) fn label(&self, field: Field<'_>) -> Result<String, Fault> {
        match self.text(field)? {
            Some(text) => Ok(fold_blanks(&text)),
            None => Err(self.blank(field.place)),
        }
    }

    /// The number that stands there, and `None` when the field is blank.
    pub(crate) fn number(&self, field: Field<'_>, mark: char) -> Result<Option<Number>, Fault> {
        if let Content::Number(number) = field.content
            && self.is_plain()
        {
            return Ok(Some(Number::of(*number)));
        }
        let mark = if matches!(field.place, Place::Rule) {
            '.'
        } else {
            mark
        };
        let expected = format!("a number with the decimal mark `{mark}`");
        if let Content::Date(date) = field.content {
            return Err(Fault::new(
                field.place,
                date.to_string(),
                expected,
                format!(
                    "holds the date {date}, where the {} should stand",
                    self.role
                ),
            )
            .hint("have the cell formatted as a number"));
        }
        let Some(text) = self.text(field)? else {
            return Ok(None);
        };
        let mark = if matches!(field.content, Content::Number(_)) {
            '.'
        } else {
            mark
        };
        match Number::read(&text, mark) {
            Ok(number) => Ok(Some(number)),
            Err(not) => {
                let mut fault = Fault::new(field.place, shown(field.content), expected, not.wrong);
                fault.hint = not.hint;
                Err(fault)
            }
        }
    }

    /// True when the whole text is taken as it stands.
    pub(crate) fn is_plain(&self) -> bool {
        self.find.is_none() && self.spellings.is_empty()
    }

    pub(crate) fn blank(&self, place: Place<'_>) -> Fault {
        Fault::new(
            place,
            "",
            format!("the {}", self.role),
            format!("blank, where the {} should stand", self.role),
        )
        .hint(match &self.from {
            _ if self.role == "value" => "measure this run again",
            Where::Column(_) => {
                "have every row filled in: nothing is taken over from the row above"
            }
            Where::At { .. } => "fill the cell in at the instrument, or correct `cell`",
            Where::Label(_) => "fill it in beside the label, or correct `label`",
            Where::Path(_) => "name folder or file as before, or correct `path`",
            Where::Xml(_) => "have the instrument write it, or correct `xml`",
            Where::Qif(place) => place.hint(),
            Where::Constant(_) => "correct `constant`",
        })
    }
}

/// The first group of the match, or the whole match when the regex has no group.
pub(crate) fn first_group<'t>(regex: &Regex, text: &'t str) -> Option<&'t str> {
    let found = regex.captures(text)?;
    let group = if found.len() > 1 {
        found.get(1)
    } else {
        found.get(0)
    };
    group.map(|group| group.as_str())
}

/// A workbook's number as a label: whole numbers as plain digits.
fn digits(number: f64) -> String {
    if number == 0.0 {
        "0".to_owned()
    } else {
        number.to_string()
    }
}
