//! Tables for people: no lines, headings in words, numbers to the right.

/// Blanks between two columns.
const GAP: usize = 2;

/// A table with these headings; the columns in `right` hold numbers. Widths count characters.
pub(super) fn table(headings: &[&str], right: &[usize], rows: Vec<Vec<String>>) -> String {
    let head: Vec<String> = headings.iter().map(|h| (*h).to_owned()).collect();
    let lines: Vec<Vec<String>> = std::iter::once(head).chain(rows).collect();
    let width = |column: usize| {
        lines
            .iter()
            .filter_map(|l| l.get(column))
            .map(|c| c.chars().count())
            .max()
            .unwrap_or(0)
    };
    let widths: Vec<usize> = (0..headings.len()).map(width).collect();
    let mut out = String::new();
    for line in &lines {
        let mut text = String::new();
        for (column, cell) in line.iter().enumerate() {
            let width = widths.get(column).copied().unwrap_or(0);
            if column > 0 {
                text.push_str(&" ".repeat(GAP));
            }
            if right.contains(&column) {
                text.push_str(&format!("{cell:>width$}"));
            } else {
                text.push_str(&format!("{cell:<width$}"));
            }
        }
        out.push_str(text.trim_end());
        out.push('\n');
    }
    out
}
