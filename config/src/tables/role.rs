//! Where one role of `[instrument.read]` comes from: `{ column = "Serial no." }`.

use std::collections::BTreeMap;

use restudy_parsers::{Cell, Qif, Role};

use crate::place::{cell, is_xml_path, letter, regex};
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
pub(crate) const PLACES: [&str; 13] = [
    "column", "columns", "letter", "heading", "row", "cell", "label", "right_of", "below", "sheet",
    "path", "xml", "constant",
];
/// Those that an XML export has.
const ANYWHERE: [&str; 2] = ["path", "constant"];

const EXPECTED: &str = "one of column, columns, letter, heading, row, cell, label, right_of, below, sheet, path, xml or constant";

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
    let (cell, found) = (cell_in(table, shape), found_in(table));
    found?.at(cell?)
}

/// The one place that the keys name.
fn cell_in(table: &Table<'_>, shape: Shape) -> Option<Cell> {
    let places: Vec<(&str, Node<'_>)> = PLACES
        .into_iter()
        .filter_map(|key| Some((key, table.get(key)?)))
        .collect();
    let joiner = table.optional("joiner", joiner);
    let from = match places.as_slice() {
        [("columns", node)] => joined(node, shape, joiner?),
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
    if let Some(node) = table.get("joiner")
        && table.get("columns").is_none()
    {
        node.place
            .fault("`joiner` without `columns`", "both, or none of them");
        return None;
    }
    from
}

/// What is taken of the text that stands at a role's place.
pub(crate) struct Taking {
    find: Option<String>,
    spellings: BTreeMap<String, String>,
}

impl Taking {
    #[allow(clippy::unnecessary_wraps)]
    pub(crate) fn at(self, from: Cell) -> Option<Role> {
        Some(Role {
            from,
            find: self.find,
            spellings: self.spellings,
        })
    }
}

/// The keys `find` and `spellings`.
pub(crate) fn found_in(table: &Table<'_>) -> Option<Taking> {
    let find = table.optional("find", |node| {
        regex(node, 1).map(|regex| regex.as_str().to_owned())
    });
    let spellings = table.or("spellings", BTreeMap::new(), |node| spellings(node));
    Some(Taking {
        find: find?,
        spellings: spellings?,
    })
}

/// What stands between the texts of two columns.
fn joiner(node: &Node<'_>) -> Option<String> {
    let joiner = node.text()?;
    if joiner.chars().count() > 9 || joiner.chars().any(char::is_control) {
        node.fault("a text of at most 9 characters");
        return None;
    }
    Some(joiner.to_owned())
}

fn joined(node: &Node<'_>, shape: Shape, joiner: Option<String>) -> Option<Cell> {
    in_table("columns", node, shape)?;
    let names = node.names("two or more headings such as [\"Feature\", \"Axis\"]")?;
    if names.len() < 2 {
        node.fault_hint("two or more headings", "one column is `column`");
        return None;
    }
    Some(Cell::Joined {
        columns: names.into_iter().map(|(name, _)| name.to_owned()).collect(),
        joiner: joiner.unwrap_or_else(|| " ".to_owned()),
    })
}

/// `Some` when the place `key` fits the form.
fn in_table(key: &str, node: &Node<'_>, shape: Shape) -> Option<()> {
    let fault = match (key, shape) {
        ("xml", Shape::Table) => (
            "a place in a table: column, cell, label, path or constant",
            "`xml` needs form = \"xml\"".to_owned(),
        ),
        (key, Shape::Xml(_)) if key != "xml" && !ANYWHERE.contains(&key) => (
            "a place in an XML export: xml, path or constant",
            match key {
                "column" | "cell" | "label" => {
                    "`column`, `cell` and `label` need form = \"table\"".to_owned()
                }
                key => format!("`{key}` needs form = \"table\""),
            },
        ),
        _ => return Some(()),
    };
    node.place.fault_hint(format!("`{key}`"), fault.0, fault.1);
    None
}

fn place(key: &str, node: &Node<'_>, shape: Shape) -> Option<Cell> {
    in_table(key, node, shape)?;
    match key {
        "column" => Some(Cell::Column(node.name()?.to_owned())),
        "letter" => letter(node).map(Cell::Counted),
        "row" => Some(Cell::Row(node.name()?.to_owned())),
        "right_of" => Some(Cell::RightOf(node.name()?.to_owned())),
        "below" => Some(Cell::Below(node.name()?.to_owned())),
        "heading" | "sheet" => {
            if !node.flag()? {
                node.fault_hint("true", "leave it out to look elsewhere");
                return None;
            }
            Some(if key == "sheet" {
                Cell::Sheet
            } else {
                Cell::Heading
            })
        }
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
