//! Lines that a wrong delimiter leaves whole: one field, in which another mark stands.

use crate::grid::{Content, Grid, Row};
use crate::names::fold;
use crate::parsed::Refused;

/// Marks that part fields in practice.
const MARKS: [char; 4] = [';', ',', '\t', '|'];

/// The one field of the line, when it has no other.
pub(crate) fn alone(row: &Row) -> Option<&str> {
    match (row.width, row.cells.as_slice()) {
        (Some(1), [(0, Content::Text(text))]) => Some(text),
        _ => None,
    }
}

/// The mark that parts the field further, if any does.
pub(crate) fn mark(field: &str) -> Option<char> {
    let count = |mark: &char| field.matches(*mark).count();
    MARKS
        .into_iter()
        .rev()
        .max_by_key(count)
        .filter(|mark| count(mark) > 0)
}

/// The line of one field in which `text` would be a field of its own by another mark.
pub(crate) fn hiding<'g>(grid: &'g Grid, text: &str) -> Option<(&'g Row, &'g str, char)> {
    let sought = fold(text);
    grid.rows.iter().find_map(|row| {
        let field = alone(row)?;
        let mark = mark(field)?;
        let holds = |piece: &str| fold(piece.trim().trim_matches('"')) == sought;
        field.split(mark).any(holds).then_some((row, field, mark))
    })
}

/// The hint that asks for the mark.
pub(crate) fn hint(refused: Refused, mark: char) -> Refused {
    refused.hint(match mark {
        '\t' => "is the delimiter a tab, `\\t`?".to_owned(),
        mark => format!("is the delimiter `{mark}`?"),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_mark_that_parts_most_is_meant() {
        for (field, meant) in [
            ("part;value", Some(';')),
            ("part\tvalue, mm\tunit", Some('\t')),
            ("a,b", Some(',')),
            ("a|b|c", Some('|')),
            ("Serial no.", None),
        ] {
            assert_eq!(mark(field), meant, "{field}");
        }
    }
}
