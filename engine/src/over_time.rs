//! One characteristic over its rounds: has the gauge become worse, how fast, and what else changed.
//!
//! Model: a [`Round`] is a recorded study with the time at which it was measured. A baseline is a round after which
//! things are no longer as before (recalibration, new stylus); what is compared over time starts at the last one.
//! Repeatability is watched first: it has many degrees of freedom, appraisers have few.
//!
//! Not here: dates (time is a number, in whatever unit the caller counts), words, whether anyone is told.

mod changed;
mod ratio;
mod shift;
mod trend;

pub use changed::{Changed, Facts, Gauge, Names};
pub use ratio::{Ratio, Ratios};
pub use shift::{Shift, shift};
pub use trend::{Crossing, ROUNDS_MIN, Trend};

use crate::recorded::Recorded;

/// One round of one characteristic.
#[derive(Debug, Clone, PartialEq)]
pub struct Round {
    /// When it was measured, in the caller's unit.
    pub at: f64,
    /// Its study.
    pub recorded: Recorded,
    /// Whether a new baseline starts here.
    pub baseline: bool,
}

/// The last round against those before it.
#[derive(Debug, Clone, PartialEq)]
pub struct OverTime {
    /// Against the round before, whether or not a baseline lies between.
    pub to_previous: Option<Ratio>,
    /// Against the first round since the last baseline, unless that is the last round itself.
    pub to_baseline: Option<Ratio>,
    /// The gauge's sd since the last baseline; absent before there are [`ROUNDS_MIN`] rounds with a spread.
    pub trend: Option<Trend>,
}

/// The rounds since the last baseline, which comes first; all of them when there is none.
pub fn since_baseline(rounds: &[Round]) -> &[Round] {
    let start = rounds.iter().rposition(|round| round.baseline).unwrap_or(0);
    &rounds[start..]
}

impl OverTime {
    /// `rounds` in the order of time; `limit_sd`: the gauge sd, in reading units, at which the share of tolerance
    /// meets its limit today; `confidence`: of the trend's limits. `None` without a round.
    pub fn of(
        rounds: &[Round],
        limit_sd: Option<f64>,
        confidence: f64,
        ratios: &mut Ratios,
    ) -> Option<OverTime> {
        let (last, before) = rounds.split_last()?;
        let since = since_baseline(rounds);
        let mut against = |earlier: &Round| ratios.of(&last.recorded, &earlier.recorded);
        let points: Vec<(f64, f64)> = since
            .iter()
            .filter_map(|round| Some((round.at, round.recorded.gauge_sd()?)))
            .collect();
        Some(OverTime {
            to_previous: before.last().map(&mut against),
            to_baseline: since.first().filter(|_| since.len() > 1).map(&mut against),
            trend: Trend::of(&points, limit_sd, confidence),
        })
    }
}
