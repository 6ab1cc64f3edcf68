//! When a run was measured: a text or a date cell to civil time.
//!
//! Model: a stamp with an offset is a moment; one without, a date cell too, is what the clock of
//! [`Taken::written_in`](crate::Taken) showed. Both are shown by the clock of `shown_in`. A day
//! without a time of day is that day in every zone.
//!
//! A bare number is a time only when the rule says what its days count from; then a text is one too.
//!
//! A time that a clock shows twice (it was set back) is taken as the earlier one; a time that it
//! never shows (it was set forward) as that much later. Source: RFC 5545, section 3.3.5.
//!
//! Invariant: a time lies in the years 1990 to 2100 and is rounded to the millisecond.

use jiff::civil::{self, Time};
use jiff::fmt::strtime;
use jiff::fmt::temporal::{Pieces, PiecesOffset};
use jiff::tz::{Offset, TimeZone, TimeZoneDatabase};
use jiff::{ToSpan as _, Unit};

use crate::fault::{Fault, shown};
use crate::grid::{Content, Field};
use crate::names::shorten;
use crate::number::{Marks, Number};
use crate::rule::{Epoch, Taken};

/// Beyond every day of the calendar's four-digit years.
const DAYS_MAX: f64 = 2_958_466.0;
const DAY_MILLISECONDS: f64 = 86_400_000.0;
const YEARS: std::ops::RangeInclusive<i16> = 1990..=2100;

/// How time stamps are written, and by which clock they are shown.
#[derive(Debug, Clone)]
pub(crate) struct Clock {
    format: Option<String>,
    dates: Option<Epoch>,
    marks: Marks,
    written_in: Option<TimeZone>,
    shown_in: Option<TimeZone>,
}

/// A stamp as it is written.
struct Stamp {
    day: civil::Date,
    /// `None`: a day alone.
    time: Option<Time>,
    offset: Option<Offset>,
}

impl Clock {
    /// # Errors
    /// The sentence that says which zone cannot be used, or that numbers and a format exclude each other. Zones are looked up in the tables that are
    /// built in, so that the answer does not depend on the machine.
    pub(crate) fn new(taken: &Taken, marks: Marks) -> Result<Self, String> {
        let zone = |name: &Option<String>| match name {
            None => Ok(None),
            Some(name) => TimeZoneDatabase::bundled()
                .get(name)
                .map(Some)
                .map_err(|_| format!("`{}` is no IANA time zone", shorten(name))),
        };
        if taken.written_in.is_some() && taken.shown_in.is_none() {
            return Err(
                "a zone in which times are written, but none in which they are shown".into(),
            );
        }
        if taken.dates.is_some() && taken.format.is_some() {
            return Err("times that are numbers, and a format of texts beside it".into());
        }
        Ok(Self {
            format: taken.format.clone(),
            dates: taken.dates,
            marks,
            written_in: zone(&taken.written_in)?,
            shown_in: zone(&taken.shown_in)?,
        })
    }

    /// The civil time that `text` (cut out of `field` by the rule) or the field's own date means.
    pub(crate) fn read(
        &self,
        field: Field<'_>,
        text: Option<&str>,
    ) -> Result<civil::DateTime, Fault> {
        let expected = self.expected();
        let fault =
            |wrong: String| Fault::new(field.place, shown(field.content), expected.clone(), wrong);
        let stamp = match (text, field.content) {
            (None, Content::Date(date)) => Stamp {
                day: date.date(),
                time: Some(date.time()),
                offset: None,
            },
            (Some(text), content) => self.stamp(text, content).ok_or_else(|| {
                fault(format!("`{}` is not {expected}", shorten(text))).hint(match content {
                    _ if self.dates.is_some() => {
                        "leave `dates` out if times are written as texts"
                    }
                    Content::Number(_) => {
                        "have the cell formatted as a date, or say what the numbers count from with `dates = \"1900\"`"
                    }
                    _ if self.format.is_some() => {
                        "correct `format`, or cut the time out of the text with `find`"
                    }
                    _ => "have it written so, or say how it is written with `format`",
                })
            })?,
            (None, _) => {
                return Err(fault(format!("blank, where {expected} should stand"))
                    .hint("have the instrument write the time, or correct where `taken` is read"));
            }
        };
        let outside = |time: &dyn std::fmt::Display| {
            fault(format!("`{time}` lies outside the years 1990 to 2100")).hint(match self.format {
                Some(_) => "`%y` reads a year of two digits, `%Y` one of four",
                None if self.dates.is_some() => {
                    "do the numbers count days, and from the year that `dates` says?"
                }
                None => "is the instrument's clock set?",
            })
        };
        let written = stamp
            .day
            .to_datetime(stamp.time.unwrap_or(Time::midnight()));
        self.show(&stamp, written)
            .and_then(|time| time.round(Unit::Millisecond).ok())
            .filter(|time| YEARS.contains(&time.year()))
            .ok_or_else(|| outside(&written))
    }

    /// `None` beyond the calendar.
    fn show(&self, stamp: &Stamp, written: civil::DateTime) -> Option<civil::DateTime> {
        let Some(shown_in) = &self.shown_in else {
            return Some(written);
        };
        let moment = match (stamp.offset, &self.written_in) {
            (Some(offset), _) => offset.to_timestamp(written).ok()?,
            (None, Some(zone)) if stamp.time.is_some() => zone.to_timestamp(written).ok()?,
            (None, _) => return Some(written),
        };
        Some(shown_in.to_datetime(moment))
    }

    fn stamp(&self, text: &str, content: &Content) -> Option<Stamp> {
        let Some(epoch) = self.dates else {
            return self.parse(text);
        };
        let marks = match content {
            Content::Number(_) => Marks::PLAIN,
            _ => self.marks,
        };
        let written = from_serial(Number::read(text, marks).ok()?.value, epoch)?;
        Some(Stamp {
            day: written.date(),
            time: Some(written.time()),
            offset: None,
        })
    }

    fn parse(&self, text: &str) -> Option<Stamp> {
        match &self.format {
            Some(format) => {
                let read = strtime::parse(format, text).ok()?;
                if let Some(moment) = read.timestamp() {
                    let written = Offset::UTC.to_datetime(moment);
                    return Some(Stamp {
                        day: written.date(),
                        time: Some(written.time()),
                        offset: Some(Offset::UTC),
                    });
                }
                let time = match read.hour() {
                    Some(_) => Some(read.to_time().ok()?),
                    None => None,
                };
                Some(Stamp {
                    day: read.to_date().ok()?,
                    time,
                    offset: read.offset().filter(|_| time.is_some()),
                })
            }
            None => {
                let pieces = Pieces::parse(text).ok()?;
                let offset = pieces.offset().map(|offset| match offset {
                    PiecesOffset::Numeric(numeric) => numeric.offset(),
                    _ => Offset::UTC,
                });
                Some(Stamp {
                    day: pieces.date(),
                    time: pieces.time(),
                    offset,
                })
            }
        }
    }

    /// What should stand there, with a time written so.
    fn expected(&self) -> String {
        if let Some(epoch) = self.dates {
            let year = match epoch {
                Epoch::Of1900 => 1900,
                Epoch::Of1904 => 1904,
            };
            return format!("a number of days since the start of {year}");
        }
        let Some(format) = &self.format else {
            return "a time as `2026-06-02T14:20:05`".to_owned();
        };
        let sample = civil::date(2026, 6, 2).at(14, 20, 5, 0);
        let written = sample
            .to_zoned_datetime(TimeZone::UTC)
            .and_then(|sample| strtime::format(format, &sample));
        match written {
            Ok(written) => format!("a time as `{format}`, such as `{written}`"),
            Err(_) => format!("a time as `{format}`"),
        }
    }
}

/// The time of a serial number, to the millisecond; `None` before the 29 February 1900 that the
/// 1900 system counts and that never was, and beyond the calendar.
fn from_serial(serial: f64, epoch: Epoch) -> Option<civil::DateTime> {
    let (zero, first) = match epoch {
        Epoch::Of1900 => (civil::date(1899, 12, 30), 61.0),
        Epoch::Of1904 => (civil::date(1904, 1, 1), 0.0),
    };
    if !(first..DAYS_MAX).contains(&serial) {
        return None;
    }
    let milliseconds = (serial * DAY_MILLISECONDS).round() as i64;
    zero.to_datetime(Time::midnight())
        .checked_add(milliseconds.milliseconds())
        .ok()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Place;
    use crate::rule::{Cell, Role};

    fn clock(format: Option<&str>, written_in: Option<&str>, shown_in: Option<&str>) -> Clock {
        Clock::new(&taken(format, written_in, shown_in), Marks::PLAIN).unwrap()
    }

    fn taken(format: Option<&str>, written_in: Option<&str>, shown_in: Option<&str>) -> Taken {
        Taken {
            role: Role::plain(Cell::Column("taken".to_owned())),
            format: format.map(str::to_owned),
            dates: None,
            written_in: written_in.map(str::to_owned),
            shown_in: shown_in.map(str::to_owned),
        }
    }

    fn read(format: Option<&str>, shown_in: Option<&str>, text: &str) -> String {
        read_by(&clock(format, None, shown_in), text)
    }

    fn read_by(clock: &Clock, text: &str) -> String {
        let content = Content::Text(text.into());
        let field = Field {
            place: Place::Field { line: 3, field: 2 },
            content: &content,
        };
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

    /// Oslo is two hours ahead of UTC in summer, Tokyo nine all the year.
    #[test]
    fn a_stamp_without_offset_is_read_by_the_clock_that_wrote_it() {
        let utc = clock(None, Some("UTC"), Some("Europe/Oslo"));
        assert_eq!(read_by(&utc, "2026-06-02T12:20:05"), "2026-06-02T14:20:05");
        assert_eq!(
            read_by(&utc, "2026-06-02T12:20:05+09:00"),
            "2026-06-02T05:20:05"
        );
        let tokyo = clock(
            Some("%d.%m.%Y %H:%M"),
            Some("Asia/Tokyo"),
            Some("Europe/Oslo"),
        );
        assert_eq!(read_by(&tokyo, "02.06.2026 03:00"), "2026-06-01T20:00:00");
        let cell = Content::Date(civil::date(2026, 6, 2).at(12, 20, 5, 0));
        let field = Field {
            place: Place::Rule,
            content: &cell,
        };
        assert_eq!(
            utc.read(field, None).unwrap().to_string(),
            "2026-06-02T14:20:05"
        );
        let unzoned = clock(None, None, Some("Europe/Oslo"));
        assert_eq!(
            read_by(&unzoned, "2026-06-02T12:20:05"),
            "2026-06-02T12:20:05"
        );
    }

    #[test]
    fn a_day_alone_is_that_day_in_every_zone() {
        let tokyo = clock(None, Some("Asia/Tokyo"), Some("Europe/Oslo"));
        assert_eq!(read_by(&tokyo, "2026-06-02"), "2026-06-02T00:00:00");
        let tokyo = clock(Some("%d.%m.%Y"), Some("Asia/Tokyo"), Some("Europe/Oslo"));
        assert_eq!(read_by(&tokyo, "02.06.2026"), "2026-06-02T00:00:00");
    }

    /// Oslo sets its clocks forward at 02:00 on 2026-03-29 and back at 03:00 on 2026-10-25: the last
    /// Sundays of March and October at 01:00 UTC (Directive 2000/84/EC).
    #[test]
    fn a_clock_that_was_set_back_means_the_earlier_time_and_one_set_forward_the_later() {
        let oslo = clock(None, Some("Europe/Oslo"), Some("UTC"));
        assert_eq!(read_by(&oslo, "2026-10-25T01:59"), "2026-10-24T23:59:00");
        assert_eq!(read_by(&oslo, "2026-10-25T02:30"), "2026-10-25T00:30:00");
        assert_eq!(read_by(&oslo, "2026-10-25T03:00"), "2026-10-25T02:00:00");
        assert_eq!(read_by(&oslo, "2026-03-29T02:30"), "2026-03-29T01:30:00");
    }

    #[test]
    fn other_texts_are_named_in_our_own_words() {
        assert_eq!(
            read(None, None, "2 June 2026"),
            "line 3, field 2: `2 June 2026` is not a time as `2026-06-02T14:20:05`"
        );
        assert_eq!(
            read(Some("%d.%m.%Y %H:%M"), None, "2026-06-02 14:20"),
            "line 3, field 2: `2026-06-02 14:20` is not a time as `%d.%m.%Y %H:%M`, such as `02.06.2026 14:20`"
        );
        assert_eq!(
            read(Some("%d.%m.%Y %H:%M"), None, "31.02.2026 14:20"),
            "line 3, field 2: `31.02.2026 14:20` is not a time as `%d.%m.%Y %H:%M`, such as `02.06.2026 14:20`"
        );
    }

    #[test]
    fn zones_that_cannot_be_used() {
        let wrong = |written_in, shown_in| {
            Clock::new(&taken(None, written_in, shown_in), Marks::PLAIN).is_err()
        };
        assert!(wrong(None, Some("Europe/Halden")));
        assert!(wrong(Some("Europe/Halden"), Some("UTC")));
        assert!(wrong(Some("UTC"), None));
    }

    fn by_number(dates: Epoch, content: &Content) -> String {
        let taken = Taken {
            dates: Some(dates),
            ..taken(None, None, None)
        };
        let comma = Marks {
            decimal: ',',
            thousands: None,
        };
        let field = Field {
            place: Place::Rule,
            content,
        };
        let text = match content {
            Content::Number(number) => Some(number.to_string()),
            Content::Text(text) => Some(text.to_string()),
            _ => None,
        };
        match Clock::new(&taken, comma)
            .unwrap()
            .read(field, text.as_deref())
        {
            Ok(time) => time.to_string(),
            Err(fault) => fault.wrong,
        }
    }

    /// 39448 is 1 January 2008 in the 1900 system; the 1904 system counts 1,462 days fewer. Source:
    /// Microsoft's description of the function DATE and of the two date systems.
    #[test]
    fn a_serial_number_counts_from_the_year_that_the_rule_says() {
        let number = Content::Number;
        for (dates, serial, time) in [
            (Epoch::Of1900, 39448.0, "2008-01-01T00:00:00"),
            (Epoch::Of1904, 37986.0, "2008-01-01T00:00:00"),
            (Epoch::Of1900, 39448.75, "2008-01-01T18:00:00"),
            (
                Epoch::Of1900,
                39448.0 + 1.0 / 86400.0,
                "2008-01-01T00:00:01",
            ),
        ] {
            assert_eq!(by_number(dates, &number(serial)), time);
        }
        let text = |text: &str| Content::Text(text.into());
        assert_eq!(
            by_number(Epoch::Of1900, &text("39448,5")),
            "2008-01-01T12:00:00"
        );
        let date = civil::date(2026, 6, 2).at(14, 20, 5, 0);
        assert_eq!(
            by_number(Epoch::Of1904, &Content::Date(date)),
            "2026-06-02T14:20:05"
        );
        for (content, wrong) in [
            (number(60.0), "`60` is not a number of days"),
            (number(0.5), "is not a number of days"),
            (number(32000.0), "outside the years 1990 to 2100"),
            (number(80000.0), "outside the years 1990 to 2100"),
            (number(1e300), "is not a number of days"),
            (text("39448.5"), "is not a number of days"),
            (text("2026-06-02"), "is not a number of days"),
        ] {
            let told = by_number(Epoch::Of1900, &content);
            assert!(told.contains(wrong), "{told}");
        }
    }

    #[test]
    fn a_number_is_no_time_unless_the_rule_says_so() {
        let clock = clock(None, None, None);
        let content = Content::Number(46175.5);
        let field = Field {
            place: Place::Rule,
            content: &content,
        };
        let fault = clock.read(field, Some("46175.5")).unwrap_err();
        assert!(fault.hint.unwrap().contains("`dates = \"1900\"`"));
    }

    #[test]
    fn twelve_hours_and_ordinal_days_by_their_format() {
        assert_eq!(
            read(Some("%m/%d/%y %I:%M:%S %p"), None, "06/02/26 02:20:05 PM"),
            "2026-06-02T14:20:05"
        );
        assert_eq!(
            read(Some("%Y-%j %H:%M"), None, "2026-153 14:20"),
            "2026-06-02T14:20:00"
        );
        assert_eq!(
            read(Some("%G-W%V-%u %H:%M"), None, "2026-W23-2 14:20"),
            "2026-06-02T14:20:00"
        );
        assert_eq!(read(None, None, "20260602T142005"), "2026-06-02T14:20:05");
        assert_eq!(
            read(None, None, "2026-06-02T14:20:05,25"),
            "2026-06-02T14:20:05.25"
        );
    }
}
