//! Who measured what, when and with what: the facts of a run, of a part, of a characteristic item.

use std::collections::HashMap;

use super::links::{Broken, Links};
use super::tree::{Node, Tree, is_measurement};
use crate::grid::Content;
use crate::names::{fold, shorten};

/// What stands at a place.
#[derive(Debug, Clone)]
pub(super) struct Said {
    pub(super) line: u32,
    pub(super) content: Content,
}

impl Said {
    pub(super) fn nothing(line: u32) -> Self {
        Self {
            line,
            content: Content::Blank,
        }
    }

    pub(super) fn text(line: u32, text: &str) -> Self {
        Self {
            line,
            content: Content::Text(text.into()),
        }
    }

    pub(super) fn broken(broken: &Broken) -> Self {
        Self::unusable(broken.line, &broken.wrong)
    }

    /// What is wrong, as a clause of its own.
    pub(super) fn unusable(line: u32, what: &str) -> Self {
        Self {
            line,
            content: Content::Unusable(what.into()),
        }
    }

    fn of(tree: &Tree, node: Node) -> Option<Self> {
        Some(Self::text(tree.line(node), tree.text(node)?))
    }
}

/// The operator that one block of traceability names.
pub(super) fn operator(tree: &Tree, traceability: Node) -> Option<Said> {
    let named = tree
        .children(traceability)
        .filter(|child| tree.name(*child) == "InspectionOperator")
        .filter_map(|operator| tree.child(operator, "Name"));
    one_of(tree, named, "operators")
}

/// When an inspection began, else when it ended.
pub(super) fn inspected(tree: &Tree, traceability: Node) -> Option<Said> {
    ["InspectionStart", "InspectionEnd"]
        .into_iter()
        .find_map(|name| Said::of(tree, tree.child(traceability, name)?))
}

/// The one text that all the nodes hold; an unusable one when they differ.
fn one_of(tree: &Tree, nodes: impl Iterator<Item = Node>, what: &str) -> Option<Said> {
    let mut first: Option<Said> = None;
    for said in nodes.filter_map(|node| Said::of(tree, node)) {
        let Some(before) = &first else {
            first = Some(said);
            continue;
        };
        if let (Content::Text(a), Content::Text(b)) = (&before.content, &said.content)
            && fold(a) != fold(b)
        {
            let both = format!(
                "two {what} are named, `{}` and `{}`",
                shorten(a),
                shorten(b)
            );
            return Some(Said {
                line: said.line,
                content: Content::Unusable(both.into()),
            });
        }
    }
    first
}

/// The device that a list of ids names, by `name` (`Name`, `SerialNumber`).
pub(super) fn device(tree: &Tree, links: &Links<'_>, holder: Node, name: &str) -> Option<Said> {
    let ids = tree.child(holder, "MeasurementDeviceIds")?;
    let mut devices = Vec::new();
    for id in tree.children(ids).filter(|id| tree.name(*id) == "Id") {
        match links.follow(id, "the measuring device") {
            Ok(device) => devices.extend(tree.child(device, name)),
            Err(broken) => return Some(Said::broken(&broken)),
        }
    }
    one_of(tree, devices.into_iter(), "measuring devices")
}

/// The user attribute of that name (any case) on one element.
pub(super) fn user_attribute(tree: &Tree, holder: Node, sought: &str) -> Option<Said> {
    let sought = fold(sought);
    let is_so = |node: &Node| {
        tree.attribute(*node, "name")
            .is_some_and(|name| fold(name) == sought)
    };
    let attributes = tree.child(holder, "Attributes")?;
    let found = tree.children(attributes).find(is_so)?;
    let inside = || tree.inside(found).find_map(|node| tree.text(node));
    let text = tree
        .attribute(found, "value")
        .or_else(|| tree.text(found))
        .or_else(inside);
    Some(match text {
        Some(text) => Said::text(tree.line(found), text),
        None => Said::nothing(tree.line(found)),
    })
}

/// How characteristic items are called.
pub(super) struct Labels {
    by_name: HashMap<String, u32>,
    by_both: HashMap<(String, String), u32>,
}

impl Labels {
    pub(super) fn new(tree: &Tree) -> Self {
        let mut labels = Self {
            by_name: HashMap::new(),
            by_both: HashMap::new(),
        };
        let items = tree
            .at(Node::ROOT, &["Characteristics", "CharacteristicItems"])
            .into_iter()
            .flat_map(|items| tree.children(items));
        for item in items {
            let (name, designator) = spoken(tree, item);
            let key = fold(name.or(designator).unwrap_or(""));
            *labels.by_name.entry(key.clone()).or_default() += 1;
            let both = (key, fold(designator.unwrap_or("")));
            *labels.by_both.entry(both).or_default() += 1;
        }
        labels
    }

    /// The item's name; with its designator, or its id, where others have the same.
    pub(super) fn of(&self, tree: &Tree, item: Node) -> Option<String> {
        let (name, designator) = spoken(tree, item);
        let id = tree.attribute(item, "id");
        let Some(called) = name.or(designator) else {
            return id.map(str::to_owned);
        };
        let key = fold(called);
        if self.by_name.get(&key).is_none_or(|count| *count < 2) {
            return Some(called.to_owned());
        }
        let both = (key, fold(designator.unwrap_or("")));
        Some(match (name, designator) {
            (Some(name), Some(designator)) if self.by_both.get(&both) == Some(&1) => {
                format!("{name} ({designator})")
            }
            _ => format!("{called} (id {})", id.unwrap_or("")),
        })
    }
}

fn spoken(tree: &Tree, item: Node) -> (Option<&str>, Option<&str>) {
    let name = tree.child(item, "Name").and_then(|node| tree.text(node));
    (
        name,
        designator(tree, item).and_then(|node| tree.text(node)),
    )
}

/// The drawing's number of an item.
pub(super) fn designator(tree: &Tree, item: Node) -> Option<Node> {
    ["CharacteristicDesignator", "KeyCharacteristic"]
        .into_iter()
        .find_map(|holder| tree.at(item, &[holder, "Designator"]))
}

/// True when two runs say the same, whatever ids they and their elements have.
pub(super) fn same_run(tree: &Tree, a: Node, b: Node) -> bool {
    let is_own = |node: &Node| {
        let name = tree.name(*node);
        name != "ThisResultsInstanceQPId" && !name.starts_with("Feature")
    };
    let measured = |run: Node| {
        tree.inside(run)
            .filter(|node| is_measurement(tree.name(*node)))
            .flat_map(|node| tree.children(node))
            .filter(is_own)
    };
    let about = |run: Node| {
        let blocks = tree
            .children(run)
            .filter(|block| is_own(block) && tree.name(*block) != "MeasuredCharacteristics");
        blocks.flat_map(|block| std::iter::once(block).chain(tree.inside(block)))
    };
    let says = |node: Node| {
        let attributes = tree.attributes(node).filter(|(name, _)| *name != "id");
        (
            tree.name(node),
            tree.text(node),
            attributes.collect::<Vec<_>>(),
        )
    };
    about(a).map(says).eq(about(b).map(says)) && measured(a).map(says).eq(measured(b).map(says))
}
