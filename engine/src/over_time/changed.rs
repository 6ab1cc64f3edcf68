//! What changed between two rounds: the gauge, the tolerance, the parts, the people.
//!
//! A share of tolerance moves with the gauge or with the tolerance; only a changed gauge is news about the gauge.
//!
//! The gauge is looked at twice, by its repeats and by its whole spread, each at the confidence of the ratios: of sound
//! pairs of rounds up to twice the rest to that confidence are called changed. Rounds and characteristics compared one
//! by one add to it; a caller who looks at many asks for ratios of a higher confidence.

use std::collections::BTreeSet;

use super::ratio::Ratio;
use crate::figure::Figure;

/// What one round says about itself beside its readings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Facts<'a> {
    /// Lower tolerance limit, in reading units.
    pub lower: Option<f64>,
    /// Upper tolerance limit.
    pub upper: Option<f64>,
    /// Names of the parts.
    pub parts: &'a [String],
    /// Names of the appraisers, or of whatever varies in their place.
    pub people: &'a [String],
}

/// The gauge's spread against before.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Gauge {
    /// More spread, by more than luck.
    Wider,
    /// Less spread, by more than luck.
    Narrower,
    /// No more difference than luck may make.
    NoMoreThanLuck,
    /// The data set no limits.
    NotKnown,
}

/// The names of two rounds against each other.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Names {
    /// The same, in any order.
    Same,
    /// Some of them.
    SomeOther,
    /// None of them.
    AllOther,
}

/// What changed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Changed {
    /// The gauge, by its repeatability where that tells, else by its whole spread.
    pub gauge: Gauge,
    /// Whether a tolerance limit is another one.
    pub tolerance: bool,
    /// The parts.
    pub parts: Names,
    /// The people.
    pub people: Names,
}

impl Changed {
    /// `ratio`: now over earlier; its limits set the level.
    pub fn between(now: &Facts<'_>, earlier: &Facts<'_>, ratio: &Ratio) -> Changed {
        let by_repeats = against_one(&ratio.repeatability);
        let by_gauge = against_one(&ratio.gauge);
        Changed {
            gauge: match (by_repeats, by_gauge) {
                (Gauge::Wider | Gauge::Narrower, _) | (_, Gauge::NotKnown) => by_repeats,
                _ => by_gauge,
            },
            tolerance: (now.lower, now.upper) != (earlier.lower, earlier.upper),
            parts: names(now.parts, earlier.parts),
            people: names(now.people, earlier.people),
        }
    }
}

fn against_one(ratio: &Figure) -> Gauge {
    if ratio.lower.is_some_and(|l| l > 1.0) {
        Gauge::Wider
    } else if ratio.upper.is_some_and(|u| u < 1.0) {
        Gauge::Narrower
    } else if ratio.lower.is_some() {
        Gauge::NoMoreThanLuck
    } else {
        Gauge::NotKnown
    }
}

fn names(now: &[String], earlier: &[String]) -> Names {
    let set = |names: &[String]| names.iter().cloned().collect::<BTreeSet<String>>();
    let (now, earlier) = (set(now), set(earlier));
    if now == earlier {
        Names::Same
    } else if now.is_disjoint(&earlier) {
        Names::AllOther
    } else {
        Names::SomeOther
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::figure::{Bounds, Interval};

    fn figure(lower: f64, upper: f64) -> Figure {
        let bounds = Bounds {
            lower,
            upper,
            at_least: lower,
            interval: Interval::Exact,
        };
        Figure::new(0.5 * (lower + upper), bounds)
    }

    #[test]
    fn the_gauge_by_its_repeats_then_by_its_whole_spread() {
        let none = || Figure::absent("none");
        let table = [
            (figure(1.1, 1.5), figure(0.3, 4.0), Gauge::Wider),
            (figure(0.5, 0.9), figure(0.3, 4.0), Gauge::Narrower),
            (figure(0.8, 1.2), figure(1.2, 4.0), Gauge::Wider),
            (figure(0.8, 1.2), figure(0.3, 4.0), Gauge::NoMoreThanLuck),
            (figure(0.8, 1.2), none(), Gauge::NoMoreThanLuck),
            (none(), figure(0.2, 0.6), Gauge::Narrower),
            (none(), none(), Gauge::NotKnown),
        ];
        let facts = Facts {
            lower: None,
            upper: Some(1.0),
            parts: &[],
            people: &[],
        };
        for (repeatability, gauge, expected) in table {
            let ratio = Ratio {
                repeatability,
                f: None,
                df: None,
                p: None,
                gauge,
            };
            let changed = Changed::between(&facts, &facts, &ratio);
            assert_eq!(changed.gauge, expected, "{ratio:?}");
            assert!(!changed.tolerance);
        }
    }

    #[test]
    fn names_in_any_order() {
        let list = |text: &str| text.split(' ').map(str::to_owned).collect::<Vec<_>>();
        let table = [
            ("KL MO TS", "TS KL MO", Names::Same),
            ("KL MO TS", "KL MO", Names::SomeOther),
            ("KL MO", "TS AB", Names::AllOther),
        ];
        for (now, earlier, expected) in table {
            assert_eq!(names(&list(now), &list(earlier)), expected);
        }
    }
}
