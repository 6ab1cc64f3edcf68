//! What `[instrument.read]` knows of the rows of a table: headings, filters, where a table ends.

use restudy_parsers::{Column, Filter, Header, Layout, Test, Until};

use crate::place::{letter, regex};
use crate::tables::role::Shape;
use crate::tables::rule::find;
use crate::walk::{Node, Table};

/// Keys that are about rows and columns.
const KEYS: [&str; 6] = ["units_row", "blocks", "until", "skip", "keep", "fill_down"];

/// Where the headings stand, and how many rows of them below the first.
pub(crate) fn header(node: &Node<'_>) -> Option<(Header, u32)> {
    const EXPECTED: &str = "the row of the headings, { find = \"a heading\" } or \"none\"";
    if node.is_number() {
        return Some((row(node)?, 0));
    }
    if node.as_text() == Some("none") {
        return Some((Header::Nothing, 0));
    }
    if !node.is_table() {
        node.fault(EXPECTED);
        return None;
    }
    let table = node.table(EXPECTED)?;
    let rows = table.or("rows", 1, |node| node.whole(1..=9, "so many rows"));
    let found = table.optional("find", |node| node.name().map(str::to_owned));
    let counted = table.optional("row", row);
    table.finish();
    let header = match (found?, counted?) {
        (Some(text), None) => Header::Find(text),
        (None, Some(row)) => row,
        (found, _) => {
            let both = if found.is_some() { "both" } else { "neither" };
            table.place.fault(both, "one of find and row");
            return None;
        }
    };
    Some((header, rows?.saturating_sub(1)))
}

fn row(node: &Node<'_>) -> Option<Header> {
    node.whole(1..=1 << 20, "a row").map(Header::Row)
}

/// The layout, but for the rows of headings.
pub(crate) fn layout(table: &Table<'_>, shape: Shape) -> Option<Layout> {
    if matches!(shape, Shape::Xml(_)) {
        for key in KEYS {
            if let Some(node) = table.get(key) {
                node.place.fault_hint(
                    format!("`{key}`"),
                    "a key of an XML export",
                    format!("`{key}` needs form = \"table\""),
                );
            }
        }
        return Some(Layout::default());
    }
    let units_row = table.or("units_row", false, Node::flag);
    let blocks = table.or("blocks", false, Node::flag);
    let until = table.optional("until", until);
    let skip = table.or("skip", Vec::new(), filters);
    let keep = table.or("keep", Vec::new(), filters);
    let fill_down = table.or("fill_down", Vec::new(), |node| {
        all(node, "columns such as [\"Part\"]", column)
    });
    Some(Layout {
        further_headings: 0,
        units_row: units_row?,
        blocks: blocks?,
        until: until?,
        skip: skip?,
        keep: keep?,
        fill_down: fill_down?,
    })
}

fn until(node: &Node<'_>) -> Option<Until> {
    if node.is_table() {
        return find(node).map(Until::Text);
    }
    if node.as_text() == Some("blank row") {
        return Some(Until::BlankRow);
    }
    node.fault("\"blank row\", or a table such as { find = \"Mean\" }");
    None
}

/// Every entry of a list, when all are sound.
fn all<T>(
    node: &Node<'_>,
    expected: &str,
    read: impl Fn(&Node<'_>) -> Option<T>,
) -> Option<Vec<T>> {
    let entries = node.list(expected)?;
    let read: Vec<Option<T>> = entries.iter().map(read).collect();
    read.into_iter().collect()
}

fn column(node: &Node<'_>) -> Option<Column> {
    if node.as_text().is_some() {
        return node
            .name()
            .map(|heading| Column::Headed(heading.to_owned()));
    }
    let table = node.table("a heading, or a table such as { letter = \"A\" }")?;
    let number = table
        .need("letter", "the letter of a column")
        .and_then(|node| letter(&node));
    table.finish();
    number.map(Column::Counted)
}

fn filters(node: &Node<'_>) -> Option<Vec<Filter>> {
    all(
        node,
        "tests of rows such as [{ column = \"Status\", is = [\"void\"] }]",
        filter,
    )
}

fn filter(node: &Node<'_>) -> Option<Filter> {
    let table = node.table("a table such as { column = \"Status\", is = [\"void\"] }")?;
    let headed = table.optional("column", |node| {
        node.name()
            .map(|heading| Column::Headed(heading.to_owned()))
    });
    let counted = table.optional("letter", |node| letter(node).map(Column::Counted));
    let is = table.optional("is", |node| {
        let names = node.names("texts such as [\"void\"]")?;
        Some(Test::Is(
            names.into_iter().map(|(name, _)| name.to_owned()).collect(),
        ))
    });
    let matches = table.optional("matches", |node| {
        regex(node, usize::MAX).map(|regex| Test::Matches(regex.as_str().to_owned()))
    });
    let blank = table.optional("blank", |node| match node.flag()? {
        true => Some(Test::Blank),
        false => {
            node.fault_hint(
                "true",
                "rows that are not blank there: swap `skip` and `keep`",
            );
            None
        }
    });
    table.finish();
    let column = one_of(&table, [headed?, counted?], "one of column and letter")?;
    let test = one_of(
        &table,
        [is?, matches?, blank?],
        "one of is, matches and blank",
    )?;
    Some(Filter { column, test })
}

fn one_of<T, const N: usize>(
    table: &Table<'_>,
    found: [Option<T>; N],
    expected: &str,
) -> Option<T> {
    let mut found = found.into_iter().flatten();
    let (first, second) = (found.next(), found.next());
    if first.is_none() || second.is_some() {
        let several = if first.is_some() {
            "several of them"
        } else {
            "none of them"
        };
        table.place.fault(several, expected);
        return None;
    }
    first
}
