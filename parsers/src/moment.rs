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
mod tests;
