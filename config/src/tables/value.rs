//! The value of `[instrument.read]`: one column or several, its unit, and how many a run has.

use restudy_parsers::{Across, Cell, Role, Value};

use crate::place::regex;
use crate::tables::role::{PLACES, Shape, found_in, role, role_in, table as role_table};
use crate::walk::{Node, Table};

pub(crate) fn value(node: &Node<'_>, shape: Shape) -> Option<Value> {
    let table = role_table(node)?;
    let role = match table.get("across") {
        None => role_in(&table, shape),
        Some(node) => across(&node, &table, shape),
    };
    let unit = table.optional("unit", |node| unit(node, shape));
    table.finish();
    for key in ["path", "constant", "columns", "heading", "row", "sheet"] {
        if table.get(key).is_some() {
            table
                .place
                .fault(format!("`{key}`"), "a place inside the export");
            return None;
        }
    }
    Some(Value {
        role: role?,
        unit: unit?,
    })
}

/// The value in several columns, each a reading of its row.
fn across(node: &Node<'_>, table: &Table<'_>, shape: Shape) -> Option<Role> {
    if matches!(shape, Shape::Xml(_)) {
        node.place.fault_hint(
            "`across`",
            "a place in an XML export: xml",
            "`across` needs form = \"table\"",
        );
        return None;
    }
    if let Some(place) = PLACES.into_iter().find(|place| table.get(place).is_some()) {
        node.place
            .fault(format!("`across` beside `{place}`"), "one of the two");
        return None;
    }
    let taking = found_in(table);
    let columns = if node.is_list() {
        let names = node.names("headings such as [\"T1\", \"T2\"]")?;
        Across::Headed(names.into_iter().map(|(name, _)| name.to_owned()).collect())
    } else if node.as_text().is_some() {
        Across::Matching(regex(node, usize::MAX)?.as_str().to_owned())
    } else {
        node.fault("a list of headings, or a regular expression for them");
        return None;
    };
    taking?.at(Cell::Across(columns))
}

/// How many readings a run has: a number, or a place.
pub(crate) fn count(node: &Node<'_>, shape: Shape) -> Option<Role> {
    if node.is_number() {
        let count = node.whole(1..=1 << 20, "so many readings")?;
        return Some(Role::plain(Cell::Constant(count.to_string())));
    }
    role(node, shape)
}

fn unit(node: &Node<'_>, shape: Shape) -> Option<Role> {
    if node.is_table() {
        return role(node, shape);
    }
    Some(Role::plain(Cell::Constant(node.name()?.to_owned())))
}

/// A crosstab is a table whose value stands across columns, with their headings as some role.
pub(crate) fn crosstab(table: &Table<'_>) {
    let holds = |role: &'static str, key: &'static str| {
        let node = table.get(role).filter(Node::is_table);
        let role = node.and_then(|node| node.table(""));
        role.is_some_and(|role| role.get(key).is_some())
    };
    if table.get("value").is_some() && !holds("value", "across") {
        table.place_of("value").fault_hint(
            "one column in a crosstab",
            "several, such as { across = '^P\\d+$' }",
            "with one row a reading it is form = \"table\"",
        );
    }
    let roles = ["part", "appraiser", "trial", "characteristic"];
    if table.get("part").is_some() && !roles.into_iter().any(|role| holds(role, "heading")) {
        table.place_of("part").fault(
            "no role from the headings of a crosstab",
            "one of part, appraiser, trial and characteristic as { heading = true }",
        );
    }
}

/// Where a row below the headings holds units, the value's unit stands there unless the rule names one.
pub(crate) fn with_units_row(value: Value, units_row: bool) -> Value {
    match value.unit {
        None if units_row => Value {
            unit: Some(Role::plain(Cell::UnitsRow)),
            ..value
        },
        unit => Value { unit, ..value },
    }
}
