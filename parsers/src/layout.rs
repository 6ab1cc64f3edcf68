//! The layout of a rule, compiled; which rows it leaves out and where it ends a table.

use regex::Regex;

use crate::grid::{Content, Row};
use crate::names::fold;
use crate::reader::RuleError;
use crate::rule::{Column, Filter, Form, Header, Layout, Rule, Test, Until};
use crate::source::{Source, Where, compiled, digits};

/// What is known of the rows of a table.
#[derive(Debug, Clone)]
pub(crate) struct Rows {
    pub(crate) further_headings: u32,
    pub(crate) units_row: bool,
    pub(crate) blocks: bool,
    pub(crate) until: Option<Stop>,
    pub(crate) filters: Vec<RowTest>,
    pub(crate) fill_down: Vec<Column>,
}

/// Where a table ends.
#[derive(Debug, Clone)]
pub(crate) enum Stop {
    BlankRow,
    /// A key.
    Text(String),
}

/// A test that rows pass or fail.
#[derive(Debug, Clone)]
pub(crate) struct RowTest {
    pub(crate) column: Column,
    /// True when the rows that are found are the ones that stay.
    keeps: bool,
    sought: Sought,
}

#[derive(Debug, Clone)]
enum Sought {
    /// Keys.
    Texts(Vec<String>),
    Regex(Regex),
    Blank,
}

impl Rows {
    pub(crate) fn new(layout: &Layout) -> Result<Self, RuleError> {
        let tests = |key: &str, filters: &[Filter], keeps| {
            let test = |filter: &Filter| RowTest::new(key, filter, keeps);
            filters.iter().map(test).collect::<Result<Vec<_>, _>>()
        };
        let mut filters = tests("skip", &layout.skip, false)?;
        filters.extend(tests("keep", &layout.keep, true)?);
        Ok(Self {
            further_headings: layout.further_headings,
            units_row: layout.units_row,
            blocks: layout.blocks,
            until: layout.until.as_ref().map(|until| match until {
                Until::BlankRow => Stop::BlankRow,
                Until::Text(find) => Stop::Text(fold(&find.find)),
            }),
            filters,
            fill_down: layout.fill_down.clone(),
        })
    }

    /// Checks that the places of a rule fit its form, its headings and the place of its value.
    pub(crate) fn fit(
        &self,
        rule: &Rule,
        sources: &[Source],
        value: &Where,
    ) -> Result<(), RuleError> {
        let Form::Table { header, .. } = &rule.form else {
            return match rule.layout == Layout::default() {
                true => Ok(()),
                false => Err(RuleError::new(
                    "form",
                    "rows are told apart, but the form is XML",
                )),
            };
        };
        let first = |is: fn(&Where) -> bool| sources.iter().find(|source| is(&source.from));
        if matches!(value, Where::Joined { .. } | Where::Sheet) || value.is_by_value() {
            return Err(RuleError::new("value", "a place where no value can stand"));
        }
        if first(Where::is_by_row).is_none() && rule.layout != Layout::default() {
            let what = "rows are told apart, but no role is looked up by row";
            return Err(RuleError::new("form", what));
        }
        if let Some(source) = first(Where::is_by_value)
            && !value.is_by_row()
        {
            let what = "looked up in the value's column, but the value stands in none";
            return Err(RuleError::new(&source.role, what));
        }
        match (header, first(Where::needs_headings)) {
            (Header::Nothing, Some(source)) => Err(RuleError::new(
                &source.role,
                "looked up by a heading, but there are no headings",
            )),
            (Header::Nothing, None) if self.needs_headings() => {
                Err(RuleError::new("header", "rows are told apart by headings"))
            }
            (Header::Row(_), _) if self.blocks => Err(RuleError::new(
                "blocks",
                "the headings are not sought by a text",
            )),
            _ => Ok(()),
        }
    }

    fn needs_headings(&self) -> bool {
        let columns = self.filters.iter().map(|filter| &filter.column);
        columns
            .chain(&self.fill_down)
            .any(|column| matches!(column, Column::Headed(_)))
            || self.blocks
            || self.units_row
    }
}

impl RowTest {
    fn new(key: &str, filter: &Filter, keeps: bool) -> Result<Self, RuleError> {
        Ok(Self {
            column: filter.column.clone(),
            keeps,
            sought: match &filter.test {
                Test::Is(texts) => Sought::Texts(texts.iter().map(|text| fold(text)).collect()),
                Test::Matches(regex) => {
                    Sought::Regex(compiled(regex).map_err(|what| RuleError::new(key, what))?)
                }
                Test::Blank => Sought::Blank,
            },
        })
    }

    /// True when a row with this content in the tested column stays. What cannot be read stays, to be
    /// told.
    pub(crate) fn passes(&self, content: &Content) -> bool {
        let text = match content {
            Content::Unusable(_) => return true,
            Content::Blank => "",
            Content::Text(text) => text.trim(),
            Content::Number(number) => &digits(*number),
            Content::Date(date) => &date.to_string(),
        };
        let found = match &self.sought {
            Sought::Texts(keys) => keys.contains(&fold(text)),
            Sought::Regex(regex) => regex.is_match(text),
            Sought::Blank => text.is_empty(),
        };
        found == self.keeps
    }
}

impl Stop {
    /// The first of the rows that no longer belongs to the table.
    pub(crate) fn first(&self, rows: &[Row]) -> Option<usize> {
        match self {
            Self::BlankRow => rows
                .windows(2)
                .position(|pair| pair[1].number > pair[0].number + 1)
                .map(|before| before + 1),
            Self::Text(key) => rows
                .iter()
                .position(|row| row.holding(key).next().is_some()),
        }
    }
}
