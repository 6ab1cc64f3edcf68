//! Numbers and foreign texts in words: no more digits than a study supports.

use restudy_engine::Limits;

use crate::figures::significant;
use crate::plain::{Rounded, dates, percent_as_set};

/// Names out of exports are cut to this many characters.
const NAME_MAX: usize = 80;
/// Sentences from elsewhere are cut to this many characters.
const SENTENCE_MAX: usize = 400;
/// Above this a gauge sd in mm is told in mm, not in µm.
const MM_FROM: f64 = 0.1;

/// A share in whole per cent.
pub(super) fn percent(share: f64) -> String {
    format!("{:.0} %", 100.0 * share)
}

/// A lower limit of a share in whole per cent.
pub(super) fn at_least(share: f64) -> String {
    rounded(Rounded::Down, share, None)
}

/// An upper limit of a share in whole per cent; never as much as the whole tolerance.
pub(super) fn at_most(share: f64) -> String {
    format!("{} %", Rounded::Up.beside(100.0 * share, &[100.0], 0))
}

/// A share in whole per cent; with more digits where whole ones would put it on another side of a limit.
pub(super) fn percent_against(share: f64, limits: Option<Limits>) -> String {
    rounded(Rounded::Nearest, share, limits)
}

/// The same, rounded one way.
pub(super) fn rounded(rounded: Rounded, share: f64, limits: Option<Limits>) -> String {
    let near = limits.map(|l| {
        [l.act, l.watch, l.act * l.back_below, l.watch * l.back_below].map(|limit| 100.0 * limit)
    });
    let near = near.as_ref().map_or(&[][..], |near| near);
    format!("{} %", rounded.beside(100.0 * share, near, 0))
}

/// A limit or a confidence as the plan has it.
pub(super) fn limit(share: f64) -> String {
    format!("{} %", percent_as_set(share))
}

/// A chance to 5 %; never a certainty.
pub(super) fn chance(p: f64) -> String {
    match (20.0 * p).round() {
        n if n >= 20.0 => "above 95 %".into(),
        n if n <= 0.0 => "below 5 %".into(),
        n => format!("{:.0} %", 5.0 * n),
    }
}

/// `a`, `a and b`, `a, b and c`.
pub(super) fn list(names: &[String]) -> String {
    match names {
        [] => String::new(),
        [one] => one.clone(),
        [first @ .., last] => format!("{} and {last}", first.join(", ")),
    }
}

/// At most `most` of them, the rest counted.
pub(super) fn some(names: &[String], most: usize) -> String {
    match names.len() {
        n if n > most => format!("{} and {} more", names[..most].join(", "), n - most),
        _ => list(names),
    }
}

/// `1 run`, `2 runs`.
pub(super) fn count(n: usize, thing: &str) -> String {
    format!("{n} {thing}{}", if n == 1 { "" } else { "s" })
}

/// A name out of an export: one line, not too long.
pub(super) fn name(text: &str) -> String {
    one_line(text, NAME_MAX)
}

/// A sentence from elsewhere: one line, not too long, its dates in words, without its full stop.
pub(super) fn sentence(text: &str) -> String {
    one_line(&dates::in_words(text), SENTENCE_MAX)
        .trim_end_matches('.')
        .to_owned()
}

fn one_line(text: &str, most: usize) -> String {
    let clean: String = text
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    let clean = clean.split_whitespace().collect::<Vec<_>>().join(" ");
    match clean.char_indices().nth(most) {
        Some((end, _)) => format!("{}…", &clean[..end]),
        None => clean,
    }
}

/// With a capital letter.
pub(super) fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters
        .next()
        .map(|first| first.to_uppercase().chain(letters).collect())
        .unwrap_or_default()
}

/// The unit in which a characteristic's small lengths are told.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Scale {
    /// Multiplies a value in reading units.
    pub(super) factor: f64,
    /// Empty when the export states none.
    pub(super) unit: String,
}

impl Scale {
    /// µm for readings in mm whose gauge sd is small.
    pub(super) fn of(unit: Option<&str>, gauge_sd: Option<f64>) -> Self {
        let unit = name(unit.unwrap_or_default());
        match gauge_sd {
            Some(sd) if unit == "mm" && sd < MM_FROM => Self {
                factor: 1000.0,
                unit: "µm".into(),
            },
            _ => Self { factor: 1.0, unit },
        }
    }

    /// A length in words.
    pub(super) fn length(&self, x: f64) -> String {
        let text = significant(self.factor * x, 2);
        if self.unit.is_empty() {
            text
        } else {
            format!("{text} {}", self.unit)
        }
    }

    /// A figure without its unit.
    pub(super) fn figure(&self, x: Option<f64>) -> String {
        x.map_or_else(|| "–".into(), |x| significant(self.factor * x, 3))
    }

    /// A squared figure without its unit.
    pub(super) fn squared(&self, x: f64) -> String {
        significant(self.factor * self.factor * x, 4)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_share_never_looks_as_if_it_were_on_the_other_side() {
        let limits = Some(Limits {
            watch: 0.10,
            act: 0.30,
            back_below: 0.85,
        });
        for (share, text) in [
            (0.354, "35 %"),
            (0.302, "30.2 %"),
            (0.3004, "30.04 %"),
            (0.298, "29.8 %"),
            (0.30, "30 %"),
            (0.255, "25.5 %"),
            (0.2, "20 %"),
        ] {
            assert_eq!(percent_against(share, limits), text, "{share}");
        }
        assert_eq!(percent(0.354), "35 %");
        assert_eq!(limit(0.3 * 0.85), "25.5 %");
        assert_eq!(limit(0.3), "30 %");
    }

    #[test]
    fn chances_are_told_in_steps_of_five() {
        for (p, text) in [
            (0.812, "80 %"),
            (0.99, "above 95 %"),
            (0.96, "95 %"),
            (0.01, "below 5 %"),
            (0.03, "5 %"),
        ] {
            assert_eq!(chance(p), text, "{p}");
        }
    }

    #[test]
    fn small_lengths_in_mm_are_told_in_micrometres() {
        let scale = Scale::of(Some("mm"), Some(0.0016));
        assert_eq!(scale.length(0.00224), "2.2 µm");
        assert_eq!(scale.figure(Some(0.00157)), "1.57");
        assert_eq!(scale.squared(0.000_055_24), "55.24");
        assert_eq!(Scale::of(Some("mm"), Some(0.4)).length(1.25), "1.2 mm");
        assert_eq!(Scale::of(None, Some(0.0016)).length(0.5), "0.50");
    }

    #[test]
    fn foreign_names_stay_on_one_line() {
        assert_eq!(
            name("bore\r\nBcc: a@b.example\tA"),
            "bore Bcc: a@b.example A"
        );
        assert_eq!(name(&"x".repeat(200)).chars().count(), NAME_MAX + 1);
    }

    #[test]
    fn lists_are_cut_and_counted() {
        let names: Vec<String> = ["a", "b", "c", "d"].map(String::from).to_vec();
        assert_eq!(list(&names), "a, b, c and d");
        assert_eq!(some(&names, 2), "a, b and 2 more");
        assert_eq!(some(&names[..2], 2), "a and b");
    }
}
