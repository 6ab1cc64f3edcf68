//! References by id, inside the document and out of it.

use std::collections::HashMap;

use super::tree::{Node, Tree};
use crate::names::shorten;

/// Why a reference leads nowhere: what is wrong, what was expected, what a person could do.
#[derive(Debug, Clone)]
pub(super) struct Broken {
    pub(super) line: u32,
    pub(super) found: String,
    pub(super) wrong: String,
    pub(super) hint: &'static str,
}

enum Slot {
    One(Node),
    /// Lines of two elements with the same id.
    Two(u32, u32),
}

/// Elements by id: ids are unique in a document, whatever their elements are.
pub(super) struct Links<'t> {
    tree: &'t Tree,
    by_id: HashMap<u64, Slot>,
    /// Documents that this one refers to, by the id it gives them.
    outside: HashMap<u64, String>,
}

impl<'t> Links<'t> {
    pub(super) fn new(tree: &'t Tree) -> Self {
        let mut by_id: HashMap<u64, Slot> = HashMap::new();
        let mut outside = HashMap::new();
        for node in tree.all() {
            let Some(id) = tree.attribute(node, "id").and_then(number) else {
                continue;
            };
            if tree.name(node) == "ExternalQIFDocument" {
                outside.insert(id, described(tree, node));
            }
            let slot = match by_id.get(&id) {
                None => Slot::One(node),
                Some(Slot::One(first)) => Slot::Two(tree.line(*first), tree.line(node)),
                Some(Slot::Two(first, second)) => Slot::Two(*first, *second),
            };
            by_id.insert(id, slot);
        }
        Self {
            tree,
            by_id,
            outside,
        }
    }

    /// The element that the text of `reference` names. `what` is what it should be: "the
    /// characteristic item".
    pub(super) fn follow(&self, reference: Node, what: &str) -> Result<Node, Broken> {
        let line = self.tree.line(reference);
        let text = self.tree.text(reference).unwrap_or("");
        let broken = |wrong: String, hint| {
            Err(Broken {
                line,
                found: shorten(text),
                wrong,
                hint,
            })
        };
        if let Some(outside) = self.tree.attribute(reference, "xId") {
            let document = number(text)
                .and_then(|id| self.outside.get(&id))
                .map_or("another document", String::as_str);
            return broken(
                format!(
                    "{what} {} is defined in {document}, which is not at hand",
                    shorten(outside)
                ),
                "have results written in one document with what they refer to",
            );
        }
        let export_again = "the document is not whole: export it again";
        let Some(id) = number(text) else {
            return broken(
                format!("`{}` is no id, where {what} should be named", shorten(text)),
                export_again,
            );
        };
        match self.by_id.get(&id) {
            Some(Slot::One(node)) => Ok(*node),
            Some(Slot::Two(first, second)) => broken(
                format!("the id {id} of {what} stands twice, in lines {first} and {second}"),
                "export it again; ids are unique in a document",
            ),
            None => broken(
                format!("{what} with the id {id} is not in this document"),
                export_again,
            ),
        }
    }
}

fn number(text: &str) -> Option<u64> {
    text.parse().ok()
}

/// "`casing.qif` (6513270e-…)", as far as the reference says.
fn described(tree: &Tree, node: Node) -> String {
    let of = |name: &str| tree.child(node, name).and_then(|child| tree.text(child));
    match (of("URI"), of("QPId")) {
        (Some(place), Some(id)) => format!("`{}` ({})", shorten(place), shorten(id)),
        (Some(one), None) | (None, Some(one)) => format!("`{}`", shorten(one)),
        (None, None) => "another document".to_owned(),
    }
}
