//! `[instrument.read.bounds]`: how much of an export is read at most.

use restudy_parsers::Bounds;

use crate::walk::Node;

/// The bounds that are named, the others as they always are.
pub(crate) fn bounds(node: &Node<'_>) -> Option<Bounds> {
    let table = node.table("a table such as { rows = 200000, file = \"64 MiB\" }")?;
    let usual = Bounds::default();
    let whole =
        |key, usual, most| table.or(key, usual, |node| node.whole(1..=most, "at most so many"));
    let size = |key, usual, most| table.or(key, usual, |node| bytes(node, most));
    let file_bytes = size("file", usual.file_bytes, 4 << 30);
    let inflated_bytes = size("inflated", usual.inflated_bytes, 16 << 30);
    let text_bytes = size("text", u64::from(usual.text_bytes), 1 << 30);
    let rows = whole("rows", usual.rows, 1 << 24);
    let columns = whole("columns", usual.columns, 1 << 20);
    let cells = whole("cells", usual.cells, 1 << 28);
    let depth = whole("depth", usual.depth, 1 << 12);
    table.finish();
    Some(Bounds {
        file_bytes: file_bytes?,
        inflated_bytes: inflated_bytes?,
        rows: rows?,
        columns: columns?,
        cells: cells?,
        text_bytes: u32::try_from(text_bytes?).ok()?,
        depth: depth?,
    })
}

/// A size with its unit, `64 MiB`.
fn bytes(node: &Node<'_>, most: u64) -> Option<u64> {
    const UNITS: [(&str, u32); 4] = [("KiB", 10), ("MiB", 20), ("GiB", 30), ("B", 0)];
    let size = node.as_text().and_then(|text| {
        let (number, shift) = UNITS
            .into_iter()
            .find_map(|(unit, shift)| Some((text.strip_suffix(unit)?, shift)))?;
        let number: u64 = number.trim().parse().ok()?;
        number.checked_mul(1 << shift)
    });
    let size = size.filter(|size| (1..=most).contains(size));
    if size.is_none() {
        node.fault(format!(
            "a size such as \"64 MiB\", at most \"{} GiB\"",
            most >> 30
        ));
    }
    size
}
