//! When a run was measured: a text or a date cell to the instrument's civil time.
//!
//! Invariant: a time lies in the years 1990 to 2100 and is rounded to the millisecond.

use jiff::Unit;
use jiff::civil::{self, Time};
use jiff::fmt::strtime;
use jiff::fmt::temporal::{Pieces, PiecesOffset};
use jiff::tz::{TimeZone, TimeZoneDatabase};

use crate::fault::{Fault, shown};
use crate::grid::{Content, Field};
use crate::names::shorten;

const YEARS: std::ops::RangeInclusive<i16> = 1990..=2100;

/// How time stamps are written.
#[derive(Debug, Clone)]
pub(crate) struct Clock {
    format: Option<String>,
    zone: Option<TimeZone>,
}

impl Clock {
    /// # Errors
    /// The sentence that says which of both cannot be used. Zones are looked up in the tables that
    /// are built in, so that the answer does not depend on the machine.
    pub(crate) fn new(format: Option<&str>, zone: Option<&str>) -> Result<Self, String> {
        let zone = match zone {
            None => None,
            Some(name) => Some(
                TimeZoneDatabase::bundled()
                    .get(name)
                    .map_err(|_| format!("`{}` is no IANA time zone", shorten(name)))?,
            ),
        };
        Ok(Self {
            format: format.map(str::to_owned),
            zone,
        })
    }

    /// The civil time that `text` (cut out of `field` by the rule) or the field's own date means.
    pub(crate) fn read(
        &self,
        field: Field<'_>,
        text: Option<&str>,
    ) -> Result<civil::DateTime, Fault> {
        let expected = match &self.format {
            Some(format) => format!("a time as `{format}`"),
            None => "a time as `2026-06-02T14:20:05`".to_owned(),
        };
        let fault =
            |wrong: String| Fault::new(field.place, shown(field.content), expected.clone(), wrong);
        let read = match (text, field.content) {
            (None, Content::Date(date)) => *date,
            (Some(text), _) => self.parse(text).map_err(|why| {
                let fault = fault(format!("`{}` is not {expected}: {why}", shorten(text)));
                match field.content {
                    Content::Number(_) => fault.hint("have the cell formatted as a date"),
                    _ => fault,
                }
            })?,
            (None, _) => return Err(fault(format!("blank, where {expected} should stand"))),
        };
        let year = read.year();
        if !YEARS.contains(&year) {
            return Err(
                fault(format!("`{read}` lies outside the years 1990 to 2100"))
                    .hint("`%y` reads a year of two digits, `%Y` one of four"),
            );
        }
        read.round(Unit::Millisecond)
            .map_err(|why| fault(format!("`{read}`: {why}")))
    }

    fn parse(&self, text: &str) -> Result<civil::DateTime, jiff::Error> {
        match &self.format {
            Some(format) => {
                let time = strtime::parse(format, text)?;
                match (&self.zone, time.offset()) {
                    (Some(zone), Some(_)) => Ok(zone.to_datetime(time.to_timestamp()?)),
                    _ if time.hour().is_none() => Ok(time.to_date()?.at(0, 0, 0, 0)),
                    _ => time.to_datetime(),
                }
            }
            None => {
                let pieces = Pieces::parse(text)?;
                let written = pieces
                    .date()
                    .to_datetime(pieces.time().unwrap_or(Time::midnight()));
                let offset = pieces.offset().map(|offset| match offset {
                    PiecesOffset::Numeric(numeric) => numeric.offset(),
                    _ => jiff::tz::Offset::UTC,
                });
                match (&self.zone, offset) {
                    (Some(zone), Some(offset)) => {
                        Ok(zone.to_datetime(offset.to_timestamp(written)?))
                    }
                    _ => Ok(written),
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Place;

    fn read(format: Option<&str>, zone: Option<&str>, text: &str) -> String {
        let content = Content::Text(text.into());
        let field = Field {
            place: Place::Field { line: 3, field: 2 },
            content: &content,
        };
        let clock = Clock::new(format, zone).unwrap();
        match clock.read(field, Some(text)) {
            Ok(time) => time.to_string(),
            Err(fault) => fault.sentence(),
        }
    }

    #[test]
    fn iso_times_need_no_format() {
        assert_eq!(
            read(None, None, "2026-06-02T14:20:05"),
            "2026-06-02T14:20:05"
        );
        assert_eq!(
            read(None, None, "2026-06-02 14:20:05.1234567"),
            "2026-06-02T14:20:05.123"
        );
        assert_eq!(
            read(None, None, "2026-06-02T14:20:05+02:00"),
            "2026-06-02T14:20:05"
        );
        assert_eq!(read(None, None, "2026-06-02"), "2026-06-02T00:00:00");
    }

    /// Oslo is one hour ahead of UTC in winter, two in summer.
    #[test]
    fn an_offset_is_shown_in_the_named_zone() {
        let oslo = Some("Europe/Oslo");
        assert_eq!(
            read(None, oslo, "2026-06-02T12:20:05Z"),
            "2026-06-02T14:20:05"
        );
        assert_eq!(
            read(None, oslo, "2026-01-02T12:20:05Z"),
            "2026-01-02T13:20:05"
        );
        assert_eq!(
            read(None, oslo, "2026-06-02T14:20:05"),
            "2026-06-02T14:20:05"
        );
        let format = Some("%d.%m.%Y %H:%M %z");
        assert_eq!(
            read(format, oslo, "02.06.2026 12:20 +0000"),
            "2026-06-02T14:20:00"
        );
    }

    #[test]
    fn the_format_decides_what_comes_first() {
        assert_eq!(
            read(Some("%d/%m/%Y %H:%M"), None, "03/04/2026 09:12"),
            "2026-04-03T09:12:00"
        );
        assert_eq!(
            read(Some("%m/%d/%Y %H:%M"), None, "03/04/2026 09:12"),
            "2026-03-04T09:12:00"
        );
        assert_eq!(
            read(Some("%d.%m.%y"), None, "03.04.26"),
            "2026-04-03T00:00:00"
        );
    }

    #[test]
    fn a_year_of_two_digits_under_a_four_digit_format_is_no_year() {
        let answer = read(Some("%d.%m.%Y"), None, "03.04.26");
        assert!(
            answer.contains("outside the years 1990 to 2100"),
            "{answer}"
        );
    }

    #[test]
    fn other_texts_are_named() {
        let answer = read(None, None, "2 June 2026");
        assert!(
            answer.starts_with("line 3, field 2: `2 June 2026` is not a time as"),
            "{answer}"
        );
        assert!(Clock::new(None, Some("Europe/Halden")).is_err());
    }
}
