//! Numbers of unknown dress: which decimal mark they have, what stands behind them.

use std::sync::LazyLock;

use regex::Regex;

use super::sample::Datum;

static NUMBER: LazyLock<Option<Regex>> = LazyLock::new(|| {
    Regex::new(r"^[+\-\u{2212}]?(?:\d+(?P<mark>[.,])?\d*|(?P<bare>[.,])\d+)(?:[eE][+\-]?\d+)?(?:\s*(?P<unit>mm|cm|m|µm|μm|um|nm|in|inch|°|deg|rad|N|Nm|kg|g|V|A|bar))?$").ok()
});

/// The decimal mark that numbers are written with, as far as they show one.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Mark {
    /// No number has a fraction, or all are a workbook's.
    NotShown,
    Seen(char),
    /// Commas, and three digits behind each: they could part thousands.
    PerhapsThousands,
    /// Some with a point, some with a comma.
    Both,
}

/// True for a number with either decimal mark, a unit behind it or not.
pub(super) fn is_number(text: &str) -> bool {
    parts(text).is_some()
}

/// The mark within a number, and the unit behind it.
fn parts(text: &str) -> Option<(Option<char>, Option<String>)> {
    let found = NUMBER.as_ref()?.captures(text.trim())?;
    let mark = found.name("mark").or_else(|| found.name("bare"));
    let mark = mark.and_then(|mark| mark.as_str().chars().next());
    Some((
        mark,
        found.name("unit").map(|unit| unit.as_str().to_owned()),
    ))
}

/// The number that stands there under that decimal mark.
pub(super) fn value(datum: &Datum, mark: char) -> Option<f64> {
    match datum {
        Datum::Number(number) => Some(*number),
        Datum::Text(text) => {
            let (own, unit) = parts(text)?;
            if own.is_some_and(|own| own != mark) {
                return None;
            }
            let bare = text.trim().trim_end_matches(unit.as_deref().unwrap_or(""));
            let plain = bare.trim().replace('\u{2212}', "-").replace(mark, ".");
            plain.parse().ok()
        }
        Datum::Blank | Datum::Date(_) => None,
    }
}

/// The decimal mark of many contents.
pub(super) fn mark<'a>(all: impl Iterator<Item = &'a Datum>) -> Mark {
    let (mut point, mut comma, mut by_three) = (false, false, true);
    for datum in all {
        let Datum::Text(text) = datum else { continue };
        match parts(text) {
            Some((Some('.'), _)) => point = true,
            Some((Some(_), unit)) => {
                comma = true;
                let bare = text.trim().trim_end_matches(unit.as_deref().unwrap_or(""));
                let (whole, fraction) = bare.trim().split_once(',').unwrap_or(("", ""));
                let whole = whole.trim_start_matches(['+', '-', '\u{2212}']);
                by_three &= fraction.len() == 3 && !whole.is_empty() && !whole.starts_with('0');
            }
            _ => {}
        }
    }
    match (point, comma) {
        (false, false) => Mark::NotShown,
        (true, false) => Mark::Seen('.'),
        (false, true) if by_three => Mark::PerhapsThousands,
        (false, true) => Mark::Seen(','),
        (true, true) => Mark::Both,
    }
}

/// The unit behind every number, when they all have the same one.
pub(super) fn unit_behind(values: &[Datum]) -> Option<String> {
    let mut units = values.iter().filter_map(|datum| match datum {
        Datum::Text(text) => parts(text).map(|(_, unit)| unit),
        Datum::Number(_) => Some(None),
        _ => None,
    });
    let first = units.next()??;
    units
        .all(|unit| unit.as_ref() == Some(&first))
        .then_some(first)
}

/// The share of what stands there that is a number.
pub(super) fn share_of_numbers(values: &[Datum]) -> f64 {
    let filled: Vec<&Datum> = values.iter().filter(|d| **d != Datum::Blank).collect();
    let numbers = filled.iter().filter(|datum| match datum {
        Datum::Number(_) => true,
        Datum::Text(text) => is_number(text),
        _ => false,
    });
    if filled.is_empty() {
        0.0
    } else {
        numbers.count() as f64 / filled.len() as f64
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn texts(texts: &[&str]) -> Vec<Datum> {
        texts.iter().map(|t| Datum::Text((*t).to_owned())).collect()
    }

    #[test]
    fn the_mark_is_what_the_numbers_show() {
        for (written, expected) in [
            (&["12", "-3"][..], Mark::NotShown),
            (&["12.5", "3"], Mark::Seen('.')),
            (&["12,5", "1,234"], Mark::Seen(',')),
            (&["0,125", "0,234"], Mark::Seen(',')),
            (&["1,234", "12,001"], Mark::PerhapsThousands),
            (&["12,5", "12.5"], Mark::Both),
            (&["P1,5", "---"], Mark::NotShown),
        ] {
            assert_eq!(mark(texts(written).iter()), expected, "{written:?}");
        }
    }

    #[test]
    fn units_are_told_apart_from_numbers() {
        assert_eq!(unit_behind(&texts(&["12.5 mm", "3mm"])), Some("mm".into()));
        assert_eq!(unit_behind(&texts(&["12.5 mm", "3"])), None);
        assert_eq!(
            value(&Datum::Text("\u{2212}12,5 mm".into()), ','),
            Some(-12.5)
        );
        assert_eq!(value(&Datum::Text("12.5".into()), ','), None);
        assert_eq!(share_of_numbers(&texts(&["1", "---"])), 0.5);
    }
}
