//! Which sheets of a workbook are read.

use regex::Regex;

use crate::names::{fold, listed, nearest, shorten};
use crate::parsed::Refused;
use crate::reader::RuleError;
use crate::rule::Sheet;
use crate::source::compiled;

/// One sheet of cells that a workbook has.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Named {
    pub(crate) name: String,
    pub(crate) visible: bool,
}

/// The sheets that a rule asks for.
#[derive(Debug, Clone)]
pub(crate) enum Sheets {
    First,
    /// As the rule writes it.
    One(String),
    Matching(Regex),
    Every,
}

impl Sheets {
    pub(crate) fn new(sheet: &Sheet) -> Result<Self, RuleError> {
        Ok(match sheet {
            Sheet::First => Self::First,
            Sheet::Named(name) => Self::One(name.clone()),
            Sheet::Matching(regex) => {
                Self::Matching(compiled(regex).map_err(|what| RuleError::new("sheet", what))?)
            }
            Sheet::Every => Self::Every,
        })
    }

    /// True when a sheet that holds nothing is passed over.
    pub(crate) fn may_be_blank(&self) -> bool {
        matches!(self, Self::Matching(_) | Self::Every)
    }

    /// The names of the sheets that are read, in the workbook's order; at least one.
    pub(crate) fn chosen(&self, sheets: &[Named]) -> Result<Vec<String>, Refused> {
        let names = || sheets.iter().map(|sheet| sheet.name.as_str());
        let visible = sheets.iter().filter(|sheet| sheet.visible);
        let chosen: Vec<String> = match self {
            Self::First => visible.take(1).map(|sheet| sheet.name.clone()).collect(),
            Self::Every => visible.map(|sheet| sheet.name.clone()).collect(),
            Self::One(sought) => names()
                .filter(|name| fold(name) == fold(sought))
                .take(1)
                .map(str::to_owned)
                .collect(),
            Self::Matching(regex) => visible
                .filter(|sheet| regex.is_match(&sheet.name))
                .map(|sheet| sheet.name.clone())
                .collect(),
        };
        if !chosen.is_empty() {
            return Ok(chosen);
        }
        let has = format!("the workbook has {}", listed(names()));
        Err(match self {
            Self::First | Self::Every => Refused::new("the workbook has no visible sheet"),
            Self::One(sought) => Refused {
                hint: nearest(sought, names()).map(|name| format!("did you mean `{name}`?")),
                ..Refused::new(format!("no sheet is named `{}`; {has}", shorten(sought)))
            },
            Self::Matching(regex) => Refused::new(format!(
                "no visible sheet has a name in which `{regex}` is found; {has}"
            ))
            .hint("correct the regex of `sheet`"),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn chosen(sheet: Sheet) -> Result<Vec<String>, String> {
        let named = |name: &str, visible| Named {
            name: name.to_owned(),
            visible,
        };
        let book = [
            named("Setup", false),
            named("bore A", true),
            named("bore B", true),
            named("Notes", true),
        ];
        let sheets = Sheets::new(&sheet).map_err(|why| why.to_string())?;
        sheets.chosen(&book).map_err(|refused| refused.sentence)
    }

    #[test]
    fn hidden_sheets_are_read_by_their_name_alone() {
        let names = |names: &[&str]| Ok(names.iter().map(|&name| name.to_owned()).collect());
        assert_eq!(chosen(Sheet::First), names(&["bore A"]));
        assert_eq!(chosen(Sheet::Named("setup ".into())), names(&["Setup"]));
        assert_eq!(
            chosen(Sheet::Matching("^bore".into())),
            names(&["bore A", "bore B"])
        );
        assert_eq!(chosen(Sheet::Every), names(&["bore A", "bore B", "Notes"]));
        assert_eq!(
            chosen(Sheet::Matching("Setup".into())).unwrap_err(),
            "no visible sheet has a name in which `Setup` is found; the workbook has `Setup`, `bore A`, `bore B`, `Notes`"
        );
        assert!(chosen(Sheet::Matching("(".into())).is_err());
    }
}
