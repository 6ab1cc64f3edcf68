//! Time stamps of unknown dress: in which format they are written.

use jiff::fmt::strtime;
use jiff::fmt::temporal::Pieces;

use super::number::is_number;
use super::sample::Datum;

/// Formats with date, hour and minute, the likelier first.
const FORMATS: [&str; 20] = [
    "%d.%m.%Y %H:%M:%S",
    "%d.%m.%Y %H:%M",
    "%d. %m. %Y %H:%M:%S",
    "%d. %m. %Y %H:%M",
    "%d/%m/%Y %H:%M:%S",
    "%d/%m/%Y %H:%M",
    "%m/%d/%Y %H:%M:%S",
    "%m/%d/%Y %H:%M",
    "%m/%d/%Y %I:%M:%S %p",
    "%m/%d/%Y %I:%M %p",
    "%d-%m-%Y %H:%M:%S",
    "%d-%m-%Y %H:%M",
    "%Y/%m/%d %H:%M:%S",
    "%Y/%m/%d %H:%M",
    "%Y.%m.%d %H:%M:%S",
    "%Y.%m.%d %H:%M",
    "%Y年%m月%d日 %H:%M:%S",
    "%Y年%m月%d日 %H:%M",
    "%d.%m.%y %H:%M",
    "%Y%m%d%H%M%S",
];
/// A date without its time of day.
const DATES: [&str; 7] = [
    "%d.%m.%Y",
    "%d. %m. %Y",
    "%d/%m/%Y",
    "%m/%d/%Y",
    "%d-%m-%Y",
    "%Y/%m/%d",
    "%Y年%m月%d日",
];

/// How stamps are written.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Stamps {
    /// ISO 8601 or date cells: no format has to be stated.
    Plain,
    /// One of these formats fits all; several when day and month cannot be told apart.
    Format(Vec<&'static str>),
    /// A date, and no time of day.
    DateOnly,
    /// No stamps, or in no format that is known here.
    No,
}

pub(super) fn stamps(values: &[Datum]) -> Stamps {
    let filled: Vec<&Datum> = values.iter().filter(|d| **d != Datum::Blank).collect();
    if filled.is_empty() {
        return Stamps::No;
    }
    let texts: Vec<&str> = filled
        .iter()
        .filter_map(|datum| match datum {
            Datum::Text(text) => Some(text.as_str()),
            _ => None,
        })
        .collect();
    let cells: Vec<_> = filled
        .iter()
        .filter_map(|datum| match datum {
            Datum::Date(date) => Some(*date),
            _ => None,
        })
        .collect();
    if texts.len() + cells.len() < filled.len() {
        return Stamps::No;
    }
    let midnight = jiff::civil::Time::midnight();
    if texts.is_empty() {
        let timeless = cells.iter().all(|date| date.time() == midnight);
        return if timeless {
            Stamps::DateOnly
        } else {
            Stamps::Plain
        };
    }
    let iso = |text: &&str| !is_number(text) && Pieces::parse(*text).is_ok();
    if texts.iter().all(iso) {
        let timeless = |text: &&str| Pieces::parse(*text).is_ok_and(|p| p.time().is_none());
        return if texts.iter().all(timeless) {
            Stamps::DateOnly
        } else {
            Stamps::Plain
        };
    }
    let fits = |format: &&str| texts.iter().all(|text| reads(format, text));
    let formats: Vec<&'static str> = FORMATS.into_iter().filter(fits).collect();
    if let Some(first) = formats.first().copied() {
        let otherwise = |format: &&str| {
            *format == first
                || texts
                    .iter()
                    .any(|text| read(format, text) != read(first, text))
        };
        return Stamps::Format(formats.into_iter().filter(otherwise).collect());
    }
    if DATES.iter().any(fits) {
        return Stamps::DateOnly;
    }
    Stamps::No
}

fn reads(format: &str, text: &str) -> bool {
    strtime::parse(format, text).is_ok_and(|read| {
        read.to_date()
            .is_ok_and(|date| (1990..=2100).contains(&date.year()))
    })
}

fn read(format: &str, text: &str) -> Option<jiff::civil::DateTime> {
    strtime::parse(format, text).ok()?.to_datetime().ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(texts: &[&str]) -> Stamps {
        let values: Vec<Datum> = texts.iter().map(|t| Datum::Text((*t).to_owned())).collect();
        stamps(&values)
    }

    #[test]
    fn formats_are_found_and_what_is_open_stays_open() {
        assert_eq!(
            of(&["2026-06-02T14:20:05", "2026-06-02 14:20"]),
            Stamps::Plain
        );
        assert_eq!(
            of(&["02.06.2026 14:20"]),
            Stamps::Format(vec!["%d.%m.%Y %H:%M"])
        );
        assert_eq!(
            of(&["02/06/2026 14:20"]),
            Stamps::Format(vec!["%d/%m/%Y %H:%M", "%m/%d/%Y %H:%M"])
        );
        assert_eq!(
            of(&["02/06/2026 14:20", "06/13/2026 08:01"]),
            Stamps::Format(vec!["%m/%d/%Y %H:%M"])
        );
        assert_eq!(
            of(&["2026年06月02日 14:20"]),
            Stamps::Format(vec!["%Y年%m月%d日 %H:%M"])
        );
        assert_eq!(of(&["2026-06-02"]), Stamps::DateOnly);
        assert_eq!(of(&["02.06.2026"]), Stamps::DateOnly);
        assert_eq!(of(&["12.5", "13"]), Stamps::No);
        assert_eq!(of(&["KL"]), Stamps::No);
    }
}
