//! The elements of a QIF document that readings are made of.
//!
//! Features, geometry, plans and statistics are passed over, so that memory follows the results.
//!
//! Invariant: every element kept lies in the document's own namespace.

use std::collections::HashMap;

use crate::names::shorten;
use crate::parsed::Refused;
use crate::reader::OTHER_FORM;
use crate::rule::Bounds;
use crate::xml::events::{Opened, Visit, visit};

/// Elements kept of one document; bounds memory.
const ELEMENTS_MAX: usize = 1 << 22;
const NAMESPACES: [&str; 2] = [
    "http://qifstandards.org/xsd/qif2",
    "http://qifstandards.org/xsd/qif3",
];
const ROOT: &str = "QIFDocument";
/// Blocks of the document that are kept.
const KEPT: [&str; 6] = [
    "Attributes",
    "Characteristics",
    "ExternalQIFReferences",
    "FileUnits",
    "MeasurementResources",
    "Results",
];
/// The block of results in QIF 2.
pub(super) const RESULTS_2: &str = "MeasurementsResults";
/// What is passed over inside kept blocks.
const PASSED_OVER: [&str; 3] = [
    "MeasuredFeatures",
    "MeasuredPointSets",
    "CharacteristicGroups",
];

/// An element, by its place in the tree.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) struct Node(u32);

impl Node {
    pub(super) const ROOT: Self = Self(0);
}

struct Kept {
    name: u32,
    line: u32,
    /// Its own text, outer blanks cut.
    text: (u32, u32),
    /// Its attributes, in the list of all.
    attributes: (u32, u32),
    /// How many elements lie inside it.
    inside: u32,
}

/// The kept elements in document order.
#[derive(Default)]
pub(super) struct Tree {
    elements: Vec<Kept>,
    attributes: Vec<(u32, (u32, u32))>,
    texts: String,
    names: Vec<Box<str>>,
    by_name: HashMap<Box<str>, u32>,
}

/// A tree while the document is read.
struct Growing<'b> {
    tree: Tree,
    bounds: &'b Bounds,
    namespace: &'static str,
    /// Kept elements that are open.
    open: Vec<u32>,
    /// Depth of the element that is passed over with all it holds.
    passed_over: Option<usize>,
    measurements: u32,
}

impl Tree {
    pub(super) fn read(text: &str, bounds: &Bounds) -> Result<Self, Refused> {
        if u32::try_from(text.len()).is_err() {
            return Err(Refused::new("the document is larger than 4 GB"));
        }
        let mut growing = Growing {
            tree: Self::default(),
            bounds,
            namespace: "",
            open: Vec::new(),
            passed_over: None,
            measurements: 0,
        };
        visit(text, bounds, &mut growing)?;
        Ok(growing.tree)
    }

    pub(super) fn name(&self, node: Node) -> &str {
        &self.names[self.elements[node.0 as usize].name as usize]
    }

    pub(super) fn line(&self, node: Node) -> u32 {
        self.elements[node.0 as usize].line
    }

    /// Its own text; `None` when that is blank.
    pub(super) fn text(&self, node: Node) -> Option<&str> {
        Some(self.cut(self.elements[node.0 as usize].text)).filter(|text| !text.is_empty())
    }

    /// Attributes by local name, outer blanks cut.
    pub(super) fn attributes(&self, node: Node) -> impl Iterator<Item = (&str, &str)> {
        let (first, count) = self.elements[node.0 as usize].attributes;
        self.attributes[first as usize..(first + count) as usize]
            .iter()
            .map(|(name, value)| (&*self.names[*name as usize], self.cut(*value)))
    }

    pub(super) fn attribute(&self, node: Node, sought: &str) -> Option<&str> {
        self.attributes(node)
            .find(|(name, value)| *name == sought && !value.is_empty())
            .map(|(_, value)| value)
    }

    pub(super) fn all(&self) -> impl Iterator<Item = Node> {
        (0..self.elements.len() as u32).map(Node)
    }

    /// Everything inside an element, in document order.
    pub(super) fn inside(&self, node: Node) -> impl Iterator<Item = Node> {
        let first = node.0 + 1;
        (first..first + self.elements[node.0 as usize].inside).map(Node)
    }

    pub(super) fn children(&self, node: Node) -> impl Iterator<Item = Node> {
        let mut next = node.0 + 1;
        let end = next + self.elements[node.0 as usize].inside;
        std::iter::from_fn(move || {
            let child = (next < end).then_some(Node(next))?;
            next += 1 + self.elements[next as usize].inside;
            Some(child)
        })
    }

    pub(super) fn child(&self, node: Node, name: &str) -> Option<Node> {
        self.children(node).find(|child| self.name(*child) == name)
    }

    /// The first element along the names.
    pub(super) fn at(&self, node: Node, names: &[&str]) -> Option<Node> {
        names
            .iter()
            .try_fold(node, |node, name| self.child(node, name))
    }

    fn cut(&self, (first, length): (u32, u32)) -> &str {
        &self.texts[first as usize..(first + length) as usize]
    }

    fn intern(&mut self, name: &str) -> u32 {
        if let Some(known) = self.by_name.get(name) {
            return *known;
        }
        let fresh = self.names.len() as u32;
        self.names.push(name.into());
        self.by_name.insert(name.into(), fresh);
        fresh
    }

    fn keep(&mut self, text: &str) -> (u32, u32) {
        let text = text.trim();
        let first = self.texts.len() as u32;
        self.texts.push_str(text);
        (first, text.len() as u32)
    }
}

/// True for the element of one measured characteristic.
pub(super) fn is_measurement(name: &str) -> bool {
    name.ends_with("CharacteristicMeasurement") || name.ends_with("CharacteristicActual")
}

impl Growing<'_> {
    fn root(&mut self, element: Opened<'_>) -> Result<(), Refused> {
        let Opened {
            namespace,
            name,
            line,
            ..
        } = element;
        let shown = namespace.unwrap_or("no namespace");
        if name != ROOT {
            return Err(Refused::new(format!(
                "line {line}: the root element is `{}` in `{}`; a QIF document has `{ROOT}` in `{}` or `{}`",
                shorten(name),
                shorten(shown),
                NAMESPACES[0],
                NAMESPACES[1]
            ))
            .hint(OTHER_FORM));
        }
        let known = NAMESPACES
            .into_iter()
            .find(|known| namespace.is_some_and(|namespace| namespace.trim() == *known));
        self.namespace = known.ok_or_else(|| {
            Refused::new(format!(
                "line {line}: `{ROOT}` lies in `{}`; this version reads `{}` and `{}`",
                shorten(shown),
                NAMESPACES[0],
                NAMESPACES[1]
            ))
            .hint("have QIF 2.0, 2.1 or 3.0 written")
        })?;
        Ok(())
    }

    fn is_kept(&self, element: &Opened<'_>) -> bool {
        let own = element
            .namespace
            .is_some_and(|namespace| namespace.trim() == self.namespace);
        own && match element.depth {
            1 => KEPT.contains(&element.name) || element.name == RESULTS_2,
            _ => !PASSED_OVER.contains(&element.name),
        }
    }
}

impl Visit for Growing<'_> {
    fn open(&mut self, element: Opened<'_>) -> Result<bool, Refused> {
        if self.passed_over.is_some() {
            return Ok(false);
        }
        if element.depth == 0 {
            self.root(element)?;
        }
        if !self.is_kept(&element) && element.depth > 0 {
            self.passed_over = Some(element.depth);
            return Ok(false);
        }
        let line = element.line;
        if self.tree.elements.len() >= ELEMENTS_MAX {
            return Err(Refused::new(format!(
                "line {line}: more than {ELEMENTS_MAX} elements of results; that is the limit"
            )));
        }
        if is_measurement(element.name) {
            self.measurements += 1;
            if self.measurements > self.bounds.rows {
                return Err(Refused::new(format!(
                    "line {line}: more than {} measured characteristics; that is the limit",
                    self.bounds.rows
                )));
            }
        }
        let name = self.tree.intern(element.name);
        self.open.push(self.tree.elements.len() as u32);
        let first = self.tree.attributes.len() as u32;
        self.tree.elements.push(Kept {
            name,
            line,
            text: (0, 0),
            attributes: (first, 0),
            inside: 0,
        });
        Ok(true)
    }

    fn attribute(
        &mut self,
        name: &str,
        prefixed: bool,
        value: &str,
        _line: u32,
    ) -> Result<(), Refused> {
        if prefixed {
            return Ok(());
        }
        let name = self.tree.intern(name);
        let value = self.tree.keep(value);
        self.tree.attributes.push((name, value));
        if let Some(element) = self.tree.elements.last_mut() {
            element.attributes.1 += 1;
        }
        Ok(())
    }

    fn close(&mut self, text: &str, _line: u32, depth: usize) {
        match self.passed_over {
            Some(passed_over) if depth > passed_over => {}
            Some(_) => self.passed_over = None,
            None => {
                if let Some(at) = self.open.pop() {
                    let text = self.tree.keep(text);
                    let inside = self.tree.elements.len() as u32 - at - 1;
                    let element = &mut self.tree.elements[at as usize];
                    element.text = text;
                    element.inside = inside;
                }
            }
        }
    }
}
