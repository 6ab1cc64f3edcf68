//! Guard bands: acceptance limits drawn in from the limits of the tolerance until a bad part is accepted no
//! more often than wanted.
//!
//! Source: JCGM 106:2012, 8.3 (guarded acceptance) and 9 (global consumer's risk).

use super::misclassification::Judged;
use super::quadrature::FINE;
use super::scaled::{between, tail};
use crate::root;

/// Gauge sds beyond which no reading is worth a thought.
const GUARD_MAX: f64 = 40.0;

/// Acceptance limits that keep the consumer's risk, and what they cost.
#[derive(Debug, Clone, Copy, PartialEq, serde::Serialize)]
pub struct Guarded {
    /// The wanted probability that a part is bad and accepted.
    pub wanted: f64,
    /// How far each limit is drawn in, in reading units; 0 when the risk is kept without.
    pub guard: f64,
    /// Accept from here.
    pub lower: Option<f64>,
    /// Accept up to here.
    pub upper: Option<f64>,
    /// A part is bad and accepted under these limits.
    pub consumer_joint: f64,
    /// A part is good and rejected under these limits.
    pub producer_joint: f64,
    /// A part is accepted under these limits.
    pub accepted: f64,
}

/// The widest acceptance limits within the tolerance, drawn in alike from both sides, under which the probability
/// that a part is bad and accepted is at most `wanted`.
///
/// `None` when `wanted` is not between 0 and 1, or where [`misclassification`](super::misclassification) gives
/// nothing.
pub fn guarded(judged: &Judged, wanted: f64) -> Option<Guarded> {
    if !(judged.sound() && wanted > 0.0 && wanted < 1.0) {
        return None;
    }
    let excess = |guard: f64| judged.consumer(&FINE, guard).value() - wanted;
    let half_width = match (judged.lower, judged.upper) {
        (Some(lower), Some(upper)) => (upper - lower) / 2.0 / judged.gauge_sd,
        _ => GUARD_MAX,
    };
    let most = half_width.min(GUARD_MAX);
    let guard = if excess(0.0) <= 0.0 {
        0.0
    } else if excess(most) >= 0.0 {
        most
    } else {
        root::between(excess, 0.0, most)
    };
    Some(judged.with_guard(wanted, guard))
}

impl Judged {
    fn with_guard(&self, wanted: f64, guard: f64) -> Guarded {
        let inward = guard * self.gauge_sd;
        let (lower, upper) = (
            self.lower.map(|l| l + inward),
            self.upper.map(|u| u - inward),
        );
        let sd = self.spread().hypot(self.gauge_sd);
        let below = lower.map_or(f64::INFINITY, |l| (self.mean - l) / sd);
        let over = upper.map_or(f64::INFINITY, |u| (u - self.mean) / sd);
        let consumer = self.consumer(&FINE, guard);
        let rejected = tail(below).plus(tail(over));
        let bad = self.bad();
        // Of the rejected, the bad ones are those that were not accepted.
        let producer = rejected.minus(bad.minus(consumer));
        Guarded {
            wanted,
            guard: inward,
            lower,
            upper,
            consumer_joint: consumer.value(),
            producer_joint: producer.value(),
            accepted: between(below, over).value(),
        }
    }
}
