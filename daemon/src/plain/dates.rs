//! Dates for people: `2 June 2026 14:20`, also where another text brings them in a machine's form.

use jiff::civil::{Date, DateTime};

const DAY: &str = "%-d %B %Y";
const MINUTE: &str = "%-d %B %Y %H:%M";
/// A machine's time stamp: `0` a digit, `T` that letter or a blank.
const STAMP: &[u8] = b"0000-00-00T00:00";

/// `2 June 2026`.
pub(crate) fn day(date: Date) -> String {
    date.strftime(DAY).to_string()
}

/// `2 June 2026 14:20`.
pub(crate) fn minute(at: DateTime) -> String {
    at.strftime(MINUTE).to_string()
}

/// `2 June 2026 08:00 to 14:20`, or with both days.
pub(crate) fn span(first: DateTime, last: DateTime) -> String {
    let end = if first.date() == last.date() {
        last.strftime("%H:%M").to_string()
    } else {
        minute(last)
    };
    format!("{} to {end}", minute(first))
}

/// A sentence from elsewhere with its time stamps in words; those within a longer name, as of a file, stay.
pub(crate) fn in_words(text: &str) -> String {
    let mut words = String::with_capacity(text.len());
    let mut rest = text;
    while let Some(letter) = rest.chars().next() {
        let begins = words.chars().next_back().is_none_or(char::is_whitespace);
        match stamp(rest).filter(|_| begins) {
            Some((at, after)) => {
                words.push_str(&minute(at));
                rest = after;
            }
            None => {
                words.push(letter);
                rest = &rest[letter.len_utf8()..];
            }
        }
    }
    words
}

/// The time stamp that a text begins with, and what follows it.
fn stamp(text: &str) -> Option<(DateTime, &str)> {
    let (head, rest) = text.split_at_checked(STAMP.len())?;
    let alike = |(byte, form): (u8, &u8)| match form {
        b'0' => byte.is_ascii_digit(),
        b'T' => byte == b'T' || byte == b' ',
        form => byte == *form,
    };
    if !head.bytes().zip(STAMP).all(alike) {
        return None;
    }
    let at = head.parse().ok()?;
    let after = without_seconds(rest);
    let ends = after.trim_start_matches(['.', ',', ';', ':', ')']);
    ends.chars()
        .next()
        .is_none_or(char::is_whitespace)
        .then_some((at, after))
}

/// What follows `:07` or `:07.250`.
fn without_seconds(text: &str) -> &str {
    let digits = |text: &str| text.bytes().take_while(u8::is_ascii_digit).count();
    let Some(seconds) = text.strip_prefix(':').filter(|s| digits(s) == 2) else {
        return text;
    };
    let rest = &seconds[2..];
    match rest
        .strip_prefix('.')
        .map(|fraction| (fraction, digits(fraction)))
    {
        Some((fraction, n)) if n > 0 => &fraction[n..],
        _ => rest,
    }
}

#[cfg(test)]
mod tests {
    use jiff::civil::date;

    use super::*;

    #[test]
    fn stamps_of_machines_are_told_in_words() {
        let table = [
            (
                "P04 MO of 2026-06-02 09:40: surplus",
                "P04 MO of 2 June 2026 09:40: surplus",
            ),
            (
                "its time stamp 2026-06-02T14:20:05 lies in the future",
                "its time stamp 2 June 2026 14:20 lies in the future",
            ),
            ("2026-06-02 14:20:05.250, late", "2 June 2026 14:20, late"),
            ("taken 2026-06-02 14:20.", "taken 2 June 2026 14:20."),
            (
                "hub 2026-06-02 14:20.xlsx: empty",
                "hub 2026-06-02 14:20.xlsx: empty",
            ),
            ("GRR/2026-06-02T14:20: empty", "GRR/2026-06-02T14:20: empty"),
            (
                "of 2026-13-02 14:20 and 2026-06-02",
                "of 2026-13-02 14:20 and 2026-06-02",
            ),
            ("Ø 2026-06-02 1é:20", "Ø 2026-06-02 1é:20"),
        ];
        for (text, words) in table {
            assert_eq!(in_words(text), words);
        }
    }

    #[test]
    fn a_span_names_the_day_once() {
        let first = date(2026, 6, 2).at(8, 0, 0, 0);
        assert_eq!(
            span(first, date(2026, 6, 2).at(14, 20, 0, 0)),
            "2 June 2026 08:00 to 14:20"
        );
        assert_eq!(
            span(first, date(2026, 6, 3).at(14, 20, 0, 0)),
            "2 June 2026 08:00 to 3 June 2026 14:20"
        );
        assert_eq!(day(first.date()), "2 June 2026");
    }
}
