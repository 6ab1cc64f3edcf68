//! The time, as every pass gets it: the only place that reads a clock.

use std::sync::LazyLock;
use std::time::{Duration, Instant};

use jiff::{Timestamp, ZonedDateTime, tz::TimeZone};

static START: LazyLock<Instant> = LazyLock::new(Instant::now);

/// Wall clock and a clock that only goes forward.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Now {
    /// ms since 1970; may jump.
    pub utc: i64,
    /// Since the program started; never jumps.
    pub uptime: Duration,
}

impl Now {
    /// Reads both clocks.
    #[must_use]
    pub fn read() -> Self {
        Self {
            utc: Timestamp::now().as_millisecond(),
            uptime: START.elapsed(),
        }
    }
}

/// A recorded time in the plant's zone; times outside the calendar become its edge.
#[must_use]
pub fn in_zone(utc_ms: i64, zone: &TimeZone) -> ZonedDateTime {
    let at = Timestamp::from_millisecond(utc_ms);
    let edge = if utc_ms < 0 {
        Timestamp::MIN
    } else {
        Timestamp::MAX
    };
    at.unwrap_or(edge).to_zoned_datetime(zone.clone())
}
