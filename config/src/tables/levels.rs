//! The levels of a factor: so many, or these.

use crate::checked::{FactorLevels, Label};
use crate::walk::Node;
use restudy_parsers::fold;

/// Levels of one factor at most; bounds memory and the length of a report.
const LEVELS_MAX: u32 = 10_000;

/// A number of levels or a list of labels, at least `least` of them.
pub(crate) fn levels(node: &Node<'_>, least: u32, what: &str) -> Option<FactorLevels> {
    if node.is_number() {
        let count = node.whole(least..=LEVELS_MAX, what)?;
        return Some(FactorLevels::Count(usize::try_from(count).ok()?));
    }
    if !node.is_list() {
        node.fault(format!("{what}, or a list of names"));
        return None;
    }
    let expected = format!("{what} or names, at least {least}");
    let nodes = node.list(&expected)?;
    let written = nodes.len();
    let mut labels: Vec<Label> = Vec::new();
    for node in nodes {
        let Some(label) = label(&node) else { continue };
        let is_known = |text: &&str| {
            labels
                .iter()
                .flat_map(texts)
                .any(|other| fold(other) == fold(text))
        };
        if let Some(twice) = texts(&label).find(is_known) {
            node.place
                .fault(format!("`{twice}` again"), "each name and spelling once");
            continue;
        }
        labels.push(label);
    }
    if u32::try_from(written).is_ok_and(|written| written < least || written > LEVELS_MAX) {
        node.place.fault(format!("{written} in the list"), expected);
        return None;
    }
    (labels.len() == written).then_some(FactorLevels::Named(labels))
}

/// A name, or `{ name = "KL", spellings = ["k.l."] }`.
fn label(node: &Node<'_>) -> Option<Label> {
    if !node.is_table() {
        return Some(Label {
            name: node.name()?.to_owned(),
            spellings: Vec::new(),
        });
    }
    let table = node.table("a name")?;
    let name = table
        .need("name", "the name as it is shown")
        .and_then(|node| node.name());
    let spellings = table
        .need("spellings", "a list of other spellings")
        .and_then(|node| node.names("a list of other spellings"));
    table.finish();
    let name = name?;
    let mut others = Vec::new();
    for (spelling, node) in spellings? {
        if fold(spelling) == fold(name) {
            node.fault_hint(
                "another spelling than the name itself",
                "case and blanks make no difference",
            );
            return None;
        }
        others.push(spelling.to_owned());
    }
    Some(Label {
        name: name.to_owned(),
        spellings: others,
    })
}

fn texts(label: &Label) -> impl Iterator<Item = &str> {
    std::iter::once(label.name.as_str()).chain(label.spellings.iter().map(String::as_str))
}

/// How many levels there are.
pub(crate) fn count(levels: &FactorLevels) -> usize {
    match levels {
        FactorLevels::Count(count) => *count,
        FactorLevels::Named(labels) => labels.len(),
    }
}
