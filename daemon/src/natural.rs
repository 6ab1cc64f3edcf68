//! The order people expect of labels: `P2` before `P10`.

use std::cmp::Ordering;

/// Compares text by text, but runs of digits by their number; ties by the plain text.
#[must_use]
pub fn compare(a: &str, b: &str) -> Ordering {
    pieces(a).cmp(pieces(b)).then_with(|| a.cmp(b))
}

#[derive(PartialEq, Eq, PartialOrd, Ord)]
enum Piece {
    Number(usize, String),
    Text(String),
}

fn pieces(text: &str) -> impl Iterator<Item = Piece> {
    let mut rest = text;
    std::iter::from_fn(move || {
        let first = rest.chars().next()?;
        let is_digit = first.is_ascii_digit();
        let end = rest
            .find(|c: char| c.is_ascii_digit() != is_digit)
            .unwrap_or(rest.len());
        let (piece, tail) = rest.split_at(end);
        rest = tail;
        Some(if is_digit {
            let digits = piece.trim_start_matches('0');
            Piece::Number(digits.len(), digits.to_owned())
        } else {
            Piece::Text(piece.to_lowercase())
        })
    })
}

#[cfg(test)]
mod tests {
    #[test]
    fn numbers_count_as_numbers() {
        let mut labels = ["P10", "P2", "p1", "P02", "Q"];
        labels.sort_by(|a, b| super::compare(a, b));
        assert_eq!(labels, ["p1", "P02", "P2", "P10", "Q"]);
    }
}
