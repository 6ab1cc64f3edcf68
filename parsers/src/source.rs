//! One role, ready for use: its place, its regexes compiled, its spellings keyed; and what a field
//! means to it.

use std::borrow::Cow;
use std::collections::BTreeMap;

use regex::Regex;

use crate::fault::{Fault, shown};
use crate::grid::{Content, Field, Place};
use crate::names::{fold, fold_blanks, shorten};
use crate::number::{Marks, NotANumber, Number, Quantity};
use crate::qif::Qif;
use crate::reader::RuleError;
use crate::rule::{Across, Cell, Role};
use crate::xml_path::XmlPath;

/// Where a role comes from, checked.
#[derive(Debug, Clone)]
pub(crate) enum Where {
    /// The heading as written.
    Column(String),
    Counted(u32),
    /// Headings as written.
    Joined {
        columns: Vec<String>,
        joiner: String,
    },
    Across(Columns),
    Heading,
    /// The label as written.
    Row(String),
    UnitsRow,
    At {
        row: u32,
        column: u32,
    },
    /// The label as written.
    Label(Side, String),
    Sheet,
    Path(Regex),
    Xml(XmlPath),
    Qif(Qif),
    Constant(Content),
}

/// The columns of a value that stands in several.
#[derive(Debug, Clone)]
pub(crate) enum Columns {
    /// Headings as written.
    Headed(Vec<String>),
    Matching(Regex),
}

/// Where the text of a label stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Side {
    /// Right of it, else below it.
    Either,
    Right,
    Below,
}

impl Where {
    /// True when it is looked up for every row.
    pub(crate) fn is_by_row(&self) -> bool {
        matches!(
            self,
            Self::Column(_) | Self::Counted(_) | Self::Joined { .. } | Self::Across(_)
        )
    }

    /// True when it depends on the column that the value stands in.
    pub(crate) fn is_by_value(&self) -> bool {
        matches!(self, Self::Heading | Self::Row(_) | Self::UnitsRow)
    }

    /// True when it is looked up in a row of headings.
    pub(crate) fn needs_headings(&self) -> bool {
        matches!(
            self,
            Self::Column(_)
                | Self::Joined { .. }
                | Self::Across(_)
                | Self::Heading
                | Self::UnitsRow
        )
    }
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
        let regex = |text: &str| compiled(text).map_err(error);
        let from = match (&role.from, each) {
            (Cell::Constant(text), _) => Where::Constant(Content::Text(text.as_str().into())),
            (Cell::Path(text), _) => Where::Path(regex(text)?),
            (Cell::Qif(place), _) => Where::Qif(place.clone()),
            (Cell::Xml(path), Some(each)) => Where::Xml(each.join(path).map_err(error)?),
            (Cell::Xml(_), None) => {
                return Err(error("an XML path, but the form is a table".to_owned()));
            }
            (_, Some(_)) => {
                return Err(error("a place in a table, but the form is XML".to_owned()));
            }
            (Cell::Column(heading), None) => Where::Column(heading.clone()),
            (Cell::Counted(column), None) => Where::Counted(*column),
            (Cell::Joined { columns, joiner }, None) => Where::Joined {
                columns: columns.clone(),
                joiner: joiner.clone(),
            },
            (Cell::Across(_), None) if name != "value" => {
                return Err(error("several columns; that is for the value".to_owned()));
            }
            (Cell::Across(Across::Headed(headings)), None) => {
                Where::Across(Columns::Headed(headings.clone()))
            }
            (Cell::Across(Across::Matching(text)), None) => {
                Where::Across(Columns::Matching(regex(text)?))
            }
            (Cell::Heading, None) => Where::Heading,
            (Cell::Row(label), None) => Where::Row(label.clone()),
            (Cell::UnitsRow, None) => Where::UnitsRow,
            (Cell::At { row, column }, None) => Where::At {
                row: *row,
                column: *column,
            },
            (Cell::Label(label), None) => Where::Label(Side::Either, label.clone()),
            (Cell::RightOf(label), None) => Where::Label(Side::Right, label.clone()),
            (Cell::Below(label), None) => Where::Label(Side::Below, label.clone()),
            (Cell::Sheet, None) => Where::Sheet,
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

    /// The number that stands there with the unit behind it, and `None` when the field is blank.
    pub(crate) fn quantity(
        &self,
        field: Field<'_>,
        marks: Marks,
    ) -> Result<Option<Quantity>, Fault> {
        if let Content::Number(number) = field.content
            && self.is_plain()
        {
            return Ok(Number::of(*number).map(Quantity::bare));
        }
        let marks = match (field.place, field.content) {
            (Place::Rule, _) | (_, Content::Number(_)) => Marks::PLAIN,
            _ => marks,
        };
        if let Content::Date(date) = field.content {
            return Err(Fault::new(
                field.place,
                date.to_string(),
                marks.expected(),
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
        Quantity::read(&text, marks)
            .map(Some)
            .map_err(|not| not.fault(field, marks.expected()))
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
            Where::Column(_) | Where::Counted(_) | Where::Joined { .. } | Where::Across(_) => {
                "have every row filled in: nothing is taken over from the row above"
            }
            Where::Heading => "have the column headed, or leave it out",
            Where::Row(_) | Where::UnitsRow => "have the row filled in above every value",
            Where::At { .. } => "fill the cell in at the instrument, or correct `cell`",
            Where::Label(..) => "fill it in beside the label, or correct `label`",
            Where::Sheet => "give the sheet a name",
            Where::Path(_) => "name folder or file as before, or correct `path`",
            Where::Xml(_) => "have the instrument write it, or correct `xml`",
            Where::Qif(place) => place.hint(),
            Where::Constant(_) => "correct `constant`",
        })
    }
}

impl NotANumber {
    /// What is wrong with the field that it was read from.
    pub(crate) fn fault(self, field: Field<'_>, expected: String) -> Fault {
        let mut fault = Fault::new(field.place, shown(field.content), expected, self.wrong);
        fault.hint = self.hint;
        fault
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

/// A regex, or the sentence that says why it is none.
pub(crate) fn compiled(text: &str) -> Result<Regex, String> {
    Regex::new(text).map_err(|why| {
        let why = why.to_string();
        let why = why
            .lines()
            .last()
            .unwrap_or("")
            .trim_start_matches("error: ");
        format!("the regex `{text}` cannot be used: {why}")
    })
}

/// A workbook's number as a label: whole numbers as plain digits.
pub(crate) fn digits(number: f64) -> String {
    if number == 0.0 {
        "0".to_owned()
    } else {
        number.to_string()
    }
}
