//! From an sd to its share of a tolerance: only by a named rule.

use std::borrow::Cow;

use crate::settings::{OneSided, Process, Settings, Tolerance};

/// What an sd is multiplied with to give its share, under which rule; or why there is no share.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Share {
    pub(crate) rule: &'static str,
    pub(crate) per_sd: Result<f64, Cow<'static, str>>,
    /// Set when the room is a distance from a mean that the study itself estimates.
    pub(crate) from_estimated_mean: Option<FromMean>,
    pub(crate) lower: Option<f64>,
    pub(crate) upper: Option<f64>,
}

/// The distance from a mean to a limit; what is held against it is half of a spread.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct FromMean {
    limit: f64,
    /// 1 from a lower limit up, -1 from an upper limit down.
    inward: f64,
    sds: f64,
}

impl FromMean {
    /// The share of an sd when the mean lies at `mean`; without end when that is not inside the limit.
    pub(crate) fn share(&self, sd: f64, mean: f64) -> f64 {
        let distance = (mean - self.limit) * self.inward;
        if distance > 0.0 {
            self.sds * sd / distance
        } else {
            f64::INFINITY
        }
    }
}

/// The stretch of reading units that a spread is held against.
enum Room {
    /// All of the spread over a width.
    Width(f64),
    /// Half of the spread over the distance from a known mean to the limit.
    Distance(f64),
    /// The same from a mean that the study estimates.
    Estimated {
        distance: f64,
        limit: f64,
        inward: f64,
    },
}

impl Share {
    pub(crate) fn of(tolerance: &Tolerance, settings: &Settings, grand_mean: f64) -> Share {
        let (rule, room) = room(tolerance, settings.process, grand_mean);
        let half = settings.spread_sds / 2.0;
        let from_estimated_mean = match room {
            Ok(Room::Estimated { limit, inward, .. }) => Some(FromMean {
                limit,
                inward,
                sds: half,
            }),
            _ => None,
        };
        let per_sd = room.and_then(|room| match room {
            Room::Width(width) => over(settings.spread_sds, width),
            Room::Distance(distance) | Room::Estimated { distance, .. } => over(half, distance),
        });
        Share {
            rule,
            per_sd,
            from_estimated_mean,
            lower: tolerance.lower,
            upper: tolerance.upper,
        }
    }
}

fn over(sds: f64, room: f64) -> Result<f64, Cow<'static, str>> {
    let share = sds / room;
    if room > 0.0 && share.is_finite() {
        Ok(share)
    } else {
        Err(Cow::Owned(format!(
            "the room for the spread is {room}; expected a width above zero"
        )))
    }
}

fn room(
    tolerance: &Tolerance,
    process: Option<Process>,
    grand_mean: f64,
) -> (&'static str, Result<Room, Cow<'static, str>>) {
    let (limit, inward) = match (tolerance.lower, tolerance.upper) {
        (None, None) => return ("none", Err("the characteristic has no tolerance".into())),
        (Some(lower), Some(upper)) => return ("two-sided", between(lower, upper)),
        (Some(lower), None) => (lower, 1.0),
        (None, Some(upper)) => (upper, -1.0),
    };
    let distance = |mean: f64, of: &str| {
        let distance = (mean - limit) * inward;
        if distance > 0.0 {
            Ok(distance)
        } else {
            Err(Cow::Owned(format!(
                "the {of}, {mean}, does not lie inside the limit {limit}"
            )))
        }
    };
    let estimated = |of: &str| {
        distance(grand_mean, of).map(|distance| Room::Estimated {
            distance,
            limit,
            inward,
        })
    };
    match tolerance.one_sided {
        None => (
            "none",
            Err("the tolerance is one-sided and no rule is named for it".into()),
        ),
        Some(OneSided::FromZero) => ("from zero", Ok(Room::Width(limit.abs()))),
        Some(OneSided::Width(width)) => ("width", Ok(Room::Width(width))),
        Some(OneSided::ToStudyMean) => ("to study mean", estimated("mean of the study")),
        Some(OneSided::ToProcessMean) => {
            let room = match process {
                None => Err("the rule `to process mean` needs a stated process".into()),
                Some(Process::Stated { mean, .. }) => {
                    distance(mean, "process mean").map(Room::Distance)
                }
                Some(Process::StudyParts) => estimated("mean of the study parts"),
            };
            ("to process mean", room)
        }
    }
}

fn between(lower: f64, upper: f64) -> Result<Room, Cow<'static, str>> {
    if upper > lower {
        Ok(Room::Width(upper - lower))
    } else {
        Err(Cow::Owned(format!(
            "the upper limit {upper} is not above the lower limit {lower}"
        )))
    }
}
