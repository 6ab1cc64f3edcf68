//! Walking a parsed TOML document, with the place of everything.
//!
//! Model: a [`Table`] is asked for its keys one by one; what nobody asked for when it is
//! [finished](Table::finish) is an unknown key. A [`Node`] is a value that is asked for the type that is
//! wanted. `None` always means: missing, or its fault is already told.

use std::cell::RefCell;
use std::collections::{BTreeMap, BTreeSet};
use std::ops::Range;

use toml::de::{DeTable, DeValue};

use crate::source::{Place, shortened};
use restudy_parsers::{fold, nearest};

/// One table of the document.
#[derive(Debug)]
pub(crate) struct Table<'a> {
    pub(crate) place: Place<'a>,
    entries: &'a DeTable<'a>,
    asked: RefCell<BTreeSet<&'static str>>,
    later: RefCell<BTreeSet<&'static str>>,
    never: RefCell<BTreeMap<&'static str, &'static str>>,
}

impl<'a> Table<'a> {
    pub(crate) fn new(place: Place<'a>, entries: &'a DeTable<'a>) -> Self {
        Self {
            place,
            entries,
            asked: RefCell::default(),
            later: RefCell::default(),
            never: RefCell::default(),
        }
    }

    /// The value of a key, if it is there.
    pub(crate) fn get(&self, key: &'static str) -> Option<Node<'a>> {
        self.asked.borrow_mut().insert(key);
        let (_, value) = self
            .entries
            .iter()
            .find(|(name, _)| name.get_ref() == key)?;
        Some(Node::new(
            self.place.below(key),
            value.span(),
            value.get_ref(),
        ))
    }

    /// Where a key's value stands; the table's own place when the key is not there.
    pub(crate) fn place_of(&self, key: &'static str) -> Place<'a> {
        self.get(key)
            .map_or_else(|| self.place.below(key), |node| node.place)
    }

    /// The value of a key that must be there.
    pub(crate) fn need(&self, key: &'static str, expected: &str) -> Option<Node<'a>> {
        let node = self.get(key);
        if node.is_none() {
            self.place.below(key).fault("nothing", expected);
        }
        node
    }

    /// The same, with a hint why there is no default.
    pub(crate) fn need_hint(
        &self,
        key: &'static str,
        expected: &str,
        hint: &str,
    ) -> Option<Node<'a>> {
        let node = self.get(key);
        if node.is_none() {
            self.place.below(key).fault_hint("nothing", expected, hint);
        }
        node
    }

    /// What a key says, if it is there: `Some(None)` when it is not, `None` when it is faulty.
    #[allow(clippy::option_option)]
    pub(crate) fn optional<T>(
        &self,
        key: &'static str,
        read: impl FnOnce(&Node<'a>) -> Option<T>,
    ) -> Option<Option<T>> {
        match self.get(key) {
            None => Some(None),
            Some(node) => read(&node).map(Some),
        }
    }

    /// What a key says, or `default` when it is not there.
    pub(crate) fn or<T>(
        &self,
        key: &'static str,
        default: T,
        read: impl FnOnce(&Node<'a>) -> Option<T>,
    ) -> Option<T> {
        self.get(key).map_or(Some(default), |node| read(&node))
    }

    /// Keys that are known and not yet followed.
    pub(crate) fn later(&self, keys: &[&'static str]) {
        self.later.borrow_mut().extend(keys);
    }

    /// Keys that one might try and that will not come, with the reason.
    pub(crate) fn never(&self, keys: &[&'static str], why: &'static str) {
        let mut never = self.never.borrow_mut();
        never.extend(keys.iter().map(|&key| (key, why)));
    }

    /// Every entry, for tables whose keys are names that the user chooses.
    pub(crate) fn named(&self) -> Vec<(&'a str, Node<'a>)> {
        let node = |(name, value): (&'a toml::Spanned<_>, &'a toml::Spanned<DeValue<'a>>)| {
            let name: &'a std::borrow::Cow<'a, str> = name.get_ref();
            (
                &**name,
                Node::new(
                    self.place.below(&shortened(name)),
                    value.span(),
                    value.get_ref(),
                ),
            )
        };
        self.entries.iter().map(node).collect()
    }

    /// Tells every key that nobody asked for.
    pub(crate) fn finish(&self) {
        let asked = self.asked.borrow();
        for name in self.entries.keys() {
            let key: &str = name.get_ref();
            if asked.contains(key) {
                continue;
            }
            let place = self.place.below(&shortened(key)).at(name.span().start);
            if self.later.borrow().contains(key) {
                place.fault(format!("`{key}`: not yet"), "a key of this version");
            } else if let Some(why) = self.never.borrow().get(key) {
                place.fault_hint(format!("the key `{key}`"), "no such key", *why);
            } else {
                let known = asked.iter().copied().collect::<Vec<_>>().join(", ");
                let found = format!("the unknown key `{}`", shortened(key));
                place.fault_nearest(
                    found,
                    format!("one of {known}"),
                    nearest(key, asked.iter().copied()),
                );
            }
        }
    }
}

/// One value of the document.
#[derive(Debug, Clone)]
pub(crate) struct Node<'a> {
    pub(crate) place: Place<'a>,
    span: Range<usize>,
    value: &'a DeValue<'a>,
}

impl<'a> Node<'a> {
    fn new(place: Place<'a>, span: Range<usize>, value: &'a DeValue<'a>) -> Self {
        Self {
            place: place.at(span.start),
            span,
            value,
        }
    }

    /// As it is written, in backticks; tables and lists by their kind.
    pub(crate) fn found(&self) -> String {
        match self.value {
            DeValue::Table(_) => "a table".to_owned(),
            DeValue::Array(_) => "a list".to_owned(),
            _ => format!(
                "`{}`",
                shortened(
                    self.place
                        .source
                        .text
                        .get(self.span.clone())
                        .unwrap_or_default()
                )
            ),
        }
    }

    pub(crate) fn fault(&self, expected: impl Into<String>) {
        self.place.fault(self.found(), expected);
    }

    pub(crate) fn fault_hint(&self, expected: impl Into<String>, hint: impl Into<String>) {
        self.place.fault_hint(self.found(), expected, hint);
    }

    /// The text, if it is one; nothing is told.
    pub(crate) fn as_text(&self) -> Option<&'a str> {
        self.value.as_str()
    }

    pub(crate) fn is_table(&self) -> bool {
        self.value.is_table()
    }

    pub(crate) fn is_list(&self) -> bool {
        self.value.is_array()
    }

    pub(crate) fn is_empty_list(&self) -> bool {
        self.value
            .as_array()
            .is_some_and(|entries| entries.is_empty())
    }

    pub(crate) fn is_number(&self) -> bool {
        matches!(self.value, DeValue::Integer(_) | DeValue::Float(_))
    }

    pub(crate) fn text(&self) -> Option<&'a str> {
        let text = self.as_text();
        match text {
            Some(_) => {}
            None if self.is_number() => self.fault_hint("a text", "write it in quotes"),
            None => self.fault("a text"),
        }
        text
    }

    /// A text that a person can read: not blank, no control characters, of bearable length; trimmed.
    pub(crate) fn name(&self) -> Option<&'a str> {
        const LONGEST: usize = 200;
        let name = self.text()?.trim();
        if name.is_empty() || name.chars().any(char::is_control) || name.chars().count() > LONGEST {
            self.fault(format!("a text of 1 to {LONGEST} characters on one line"));
            return None;
        }
        Some(name)
    }

    /// One of a few words.
    pub(crate) fn word<T: Copy>(&self, words: &[(&str, T)]) -> Option<T> {
        let found = self
            .as_text()
            .and_then(|text| words.iter().find(|(word, _)| *word == text));
        if found.is_none() {
            let known = words
                .iter()
                .map(|(word, _)| format!("\"{word}\""))
                .collect::<Vec<_>>()
                .join(" or ");
            let close = self
                .as_text()
                .and_then(|text| nearest(text, words.iter().map(|(word, _)| *word)));
            self.place.fault_nearest(self.found(), known, close);
        }
        found.map(|(_, value)| *value)
    }

    pub(crate) fn flag(&self) -> Option<bool> {
        let flag = self.value.as_bool();
        if flag.is_none() {
            self.fault("true or false");
        }
        flag
    }

    /// A finite number that holds `is_fine`.
    pub(crate) fn number(&self, is_fine: impl Fn(f64) -> bool, expected: &str) -> Option<f64> {
        let number = match self.value {
            DeValue::Integer(whole) if whole.radix() == 10 => whole.as_str().parse().ok(),
            DeValue::Float(float) => float.as_str().parse().ok(),
            _ => None,
        };
        let number = number.filter(|number: &f64| number.is_finite() && is_fine(*number));
        if number.is_none() {
            match self.as_text() {
                Some(text) if text.trim().replace(',', ".").parse::<f64>().is_ok() => {
                    self.fault_hint(expected, "write it without quotes and with a decimal point");
                }
                _ => self.fault(expected),
            }
        }
        number
    }

    /// A whole number within `range`.
    pub(crate) fn whole(&self, range: std::ops::RangeInclusive<u32>, what: &str) -> Option<u32> {
        let whole = match self.value {
            DeValue::Integer(whole) if whole.radix() == 10 => whole.as_str().parse().ok(),
            _ => None,
        };
        let whole = whole.filter(|whole| range.contains(whole));
        if whole.is_none() {
            let expected = format!("{what} from {} to {}", range.start(), range.end());
            match self.as_text() {
                Some(text) if text.trim().parse::<u32>().is_ok() => {
                    self.fault_hint(expected, "write it without quotes")
                }
                _ => self.fault(expected),
            }
        }
        whole
    }

    /// The entries of a list that has at least one.
    pub(crate) fn list(&self, expected: &str) -> Option<Vec<Node<'a>>> {
        let Some(entries) = self.value.as_array().filter(|entries| !entries.is_empty()) else {
            match self.value {
                DeValue::Array(_) => self.place.fault("an empty list", expected),
                DeValue::String(_) => self.fault_hint(expected, "write it in square brackets"),
                _ => self.fault(expected),
            }
            return None;
        };
        let node = |(index, value): (usize, &'a toml::Spanned<DeValue<'a>>)| {
            Node::new(
                self.place.below(&(index + 1).to_string()),
                value.span(),
                value.get_ref(),
            )
        };
        Some(entries.iter().enumerate().map(node).collect())
    }

    /// Different names, at least one; case and blanks do not make a difference. Those that are faulty are left out.
    pub(crate) fn names(&self, expected: &str) -> Option<Vec<(&'a str, Node<'a>)>> {
        let mut names: Vec<(&str, Node<'_>)> = Vec::new();
        for node in self.list(expected)? {
            let Some(name) = node.name() else { continue };
            if names.iter().any(|(other, _)| fold(other) == fold(name)) {
                node.fault("each entry once");
            } else {
                names.push((name, node));
            }
        }
        Some(names)
    }

    pub(crate) fn table(&self, expected: &str) -> Option<Table<'a>> {
        let Some(entries) = self.value.as_table() else {
            self.fault(expected);
            return None;
        };
        Some(Table::new(self.place.clone(), entries))
    }

    /// The tables of a `[[heading]]` list; each is called by its name in faults.
    pub(crate) fn tables(&self, heading: &str, parent: &Place<'a>) -> Option<Vec<Table<'a>>> {
        let expected = format!("one or more [[{heading}]] tables");
        let word = heading.rsplit('.').next().unwrap_or(heading);
        if self.is_table() {
            self.fault_hint(expected, "write its heading in double square brackets");
            return None;
        }
        let table = |(index, node): (usize, Node<'a>)| {
            let table = node.table(&expected)?;
            let name = table
                .entries
                .iter()
                .find(|(key, _)| key.get_ref() == "name");
            let key = match name.and_then(|(_, name)| name.get_ref().as_str()) {
                Some(name) => format!("{word} \"{}\"", shortened(name)),
                None => format!("{word} {}", index + 1),
            };
            Some(Table {
                place: parent.below(&key).at(node.span.start),
                ..table
            })
        };
        Some(
            self.list(&expected)?
                .into_iter()
                .enumerate()
                .filter_map(table)
                .collect(),
        )
    }
}
