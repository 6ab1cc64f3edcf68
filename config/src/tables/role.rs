//! Where one role of `[instrument.read]` comes from: `{ column = "Serial no." }`.

use std::collections::BTreeMap;

use restudy_parsers::{Cell, Qif, Role};

use crate::place::{cell, is_xml_path, regex};
use crate::tables::qif;
use crate::walk::{Node, Table};
use restudy_parsers::fold;

/// What the form of the export offers to roles.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Shape {
    /// Rows and columns.
    Table,
    /// Elements and attributes; the repeating element stands so many elements deep.
    Xml(usize),
    /// A QIF document; where the standard has the role that is asked for.
    Qif(Option<&'static Qif>),
    /// The form itself is faulty: any place may be right.
    Unknown,
}

/// Keys of which a role has exactly one.
pub(crate) const PLACES: [&str; 6] = ["column", "cell", "label", "path", "xml", "constant"];

const EXPECTED: &str = "one of column, cell, label, path, xml or constant";

/// A role that has no keys of its own.
pub(crate) fn role(node: &Node<'_>, shape: Shape) -> Option<Role> {
    let table = table(node)?;
    let role = role_in(&table, shape);
    table.finish();
    role
}

/// The table of a role, to ask it for further keys.
pub(crate) fn table<'a>(node: &Node<'a>) -> Option<Table<'a>> {
    if node.as_text().is_some() {
        node.fault_hint(
            "a table that says where it comes from",
            format!("such as {{ column = {} }}", node.found().trim_matches('`')),
        );
        return None;
    }
    node.table("a table such as { column = \"Serial no.\" }")
}

/// The role's own keys; the table is left open for more.
pub(crate) fn role_in(table: &Table<'_>, shape: Shape) -> Option<Role> {
    if let Shape::Qif(usual) = shape {
        return qif::role_in(table, usual);
    }
    table.never(&["qif", "attribute"], "it needs form = \"qif\"");
    table.later(&["columns", "letter", "sheet", "right_of", "below"]);
    let places: Vec<(&str, Node<'_>)> = PLACES
        .into_iter()
        .filter_map(|key| Some((key, table.get(key)?)))
        .collect();
    let find = table
        .get("find")
        .map(|node| regex(&node, 1).map(|regex| regex.as_str().to_owned()));
    let spellings = table.or("spellings", BTreeMap::new(), |node| spellings(node));
    let from = match places.as_slice() {
        [(key, node)] => place(key, node, shape),
        [] => {
            table.place.fault("none of them", EXPECTED);
            None
        }
        several => {
            let found = several
                .iter()
                .map(|(key, _)| format!("`{key}`"))
                .collect::<Vec<_>>()
                .join(" and ");
            table.place.fault(found, EXPECTED);
            None
        }
    };
    let find = match find {
        Some(written) => Some(written?),
        None => None,
    };
    Some(Role {
        from: from?,
        find,
        spellings: spellings?,
    })
}

fn place(key: &str, node: &Node<'_>, shape: Shape) -> Option<Cell> {
    let in_table = ["column", "cell", "label"].contains(&key);
    if (in_table && matches!(shape, Shape::Xml(_))) || (key == "xml" && shape == Shape::Table) {
        let (form, hint) = if in_table {
            (
                "a place in an XML export: xml, path or constant",
                "`column`, `cell` and `label` need form = \"table\"",
            )
        } else {
            (
                "a place in a table: column, cell, label, path or constant",
                "`xml` needs form = \"xml\"",
            )
        };
        node.place.fault_hint(format!("`{key}`"), form, hint);
        return None;
    }
    match key {
        "column" => Some(Cell::Column(node.name()?.to_owned())),
        "label" => Some(Cell::Label(node.name()?.to_owned())),
        "constant" => Some(Cell::Constant(node.name()?.to_owned())),
        "path" => Some(Cell::Path(regex(node, 1)?.as_str().to_owned())),
        "cell" => {
            let place = cell(node.text()?);
            if place.is_none() {
                node.fault("a cell such as \"B4\"");
            }
            place.map(|(row, column)| Cell::At { row, column })
        }
        _ => {
            let path = node.text()?;
            let depth = if let Shape::Xml(depth) = shape {
                depth
            } else {
                usize::MAX
            };
            if !is_xml_path(path, depth) {
                node.fault_hint(
                    "a path such as \"value\", \"@id\", \"../@part\" or \"/export/@id\"",
                    "element names stand without a prefix, an attribute stands last, and `..` stays within the document",
                );
                return None;
            }
            Some(Cell::Xml(path.to_owned()))
        }
    }
}

/// `{ KL = ["k.l.", "Kari"] }`, label to other spellings, turned into spelling to label.
pub(crate) fn spellings(node: &Node<'_>) -> Option<BTreeMap<String, String>> {
    let table = node.table(
        "a table of labels, each with a list of its other spellings, such as { KL = [\"k.l.\"] }",
    )?;
    let mut known: BTreeMap<String, String> = BTreeMap::new();
    let mut sound = true;
    for (label, others) in table.named() {
        if label.trim().is_empty() || label.chars().any(char::is_control) {
            others
                .place
                .fault("a label that cannot be read", "a label on one line");
            sound = false;
        }
        let Some(others) = others.names("a list of other spellings") else {
            sound = false;
            continue;
        };
        for (other, place) in others {
            if known.keys().any(|spelling| fold(spelling) == fold(other)) {
                place.fault("a spelling of one label only");
                sound = false;
            }
            known.insert(other.to_owned(), label.to_owned());
        }
    }
    sound.then_some(known)
}
