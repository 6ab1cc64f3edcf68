//! How often a part is judged wrongly: bad ones accepted (consumer's risk), good ones rejected (producer's).
//!
//! True value `X ~ N(mean, part sd²)`, reading `Y = X + N(0, gauge sd²)`; good: `X` within the limits; accepted:
//! `Y` within them. A missing limit drops its pieces. One limit at a time, with `s` the distance from it in
//! part sds, `k = part sd / gauge sd`, `z` the mean's distance inside, `w` the width, all in part sds:
//! ```text
//! consumer += ∫_0^∞ φ(s + z) [Φ(-k s) - Φ(-k (s + w))] ds
//! producer += ∫_0^w φ(s - z) Φ(-k s) ds            bad += Φ(-z)
//! ```
//! Conditional risks are ratios of scaled numbers, so that they stand when no part is bad to f64.
//!
//! Source: Burdick, Borror & Montgomery, *J. Quality Technology* 35 (2003) 342–354.

use super::quadrature::{FINE, QUICK, Quadrature};
use super::scaled::{Scaled, above, between, tail};

/// Parts spread less than this share of the gauge count as spread this much: the risks have reached their limits.
const PART_SD_LEAST: f64 = 1e-10;
/// Difference of squares from which one normal tail is less than 1e-17 of another.
const NEGLIGIBLE: f64 = 80.0;

/// The process and the gauge that judges its parts against limits, all in reading units.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Judged {
    /// Mean of the true values.
    pub mean: f64,
    /// Their sd; 0 gives the limits that the risks tend to.
    pub part_sd: f64,
    /// The gauge sd.
    pub gauge_sd: f64,
    /// Lower limit.
    pub lower: Option<f64>,
    /// Upper limit.
    pub upper: Option<f64>,
}

/// Probabilities of wrong judgements; each is absent where it has no condition to stand on.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Misclassification {
    /// A part is bad.
    pub bad: f64,
    /// A part is accepted.
    pub accepted: f64,
    /// A part is good and rejected.
    pub producer_joint: f64,
    /// A good part is rejected.
    pub producer_given_good: Option<f64>,
    /// A rejected part is good.
    pub producer_given_rejected: Option<f64>,
    /// A part is bad and accepted.
    pub consumer_joint: f64,
    /// A bad part is accepted.
    pub consumer_given_bad: Option<f64>,
    /// An accepted part is bad.
    pub consumer_given_accepted: Option<f64>,
}

/// Risks of a process, a gauge and limits, to about 12 digits.
///
/// `None` when there is no limit, the limits are not in order, the gauge sd is not above zero, or a number is
/// not finite.
pub fn misclassification(judged: &Judged) -> Option<Misclassification> {
    judged.sound().then(|| judged.risks(&FINE))
}

/// The distances of one limit from the mean, towards the inside, in part sds.
struct Distances {
    lower: f64,
    upper: f64,
}

impl Judged {
    pub(super) fn sound(&self) -> bool {
        let limits = [self.lower, self.upper];
        let ordered = match limits {
            [None, None] => false,
            [Some(lower), Some(upper)] => lower < upper,
            _ => true,
        };
        ordered
            && limits.iter().flatten().all(|x| x.is_finite())
            && self.mean.is_finite()
            && (0.0..f64::INFINITY).contains(&self.part_sd)
            && self.gauge_sd > 0.0
            && self.gauge_sd.is_finite()
    }

    /// To the accuracy of percentiles of draws.
    pub(super) fn quickly(&self) -> Misclassification {
        self.risks(&QUICK)
    }

    pub(super) fn spread(&self) -> f64 {
        self.part_sd.max(PART_SD_LEAST * self.gauge_sd)
    }

    fn distances(&self, sd: f64) -> Distances {
        Distances {
            lower: self.lower.map_or(f64::INFINITY, |l| (self.mean - l) / sd),
            upper: self.upper.map_or(f64::INFINITY, |u| (u - self.mean) / sd),
        }
    }

    fn risks(&self, rule: &Quadrature) -> Misclassification {
        let true_values = self.distances(self.spread());
        let readings = self.distances(self.spread().hypot(self.gauge_sd));
        let bad = self.bad();
        let good = between(true_values.lower, true_values.upper);
        let rejected = tail(readings.lower).plus(tail(readings.upper));
        let accepted = between(readings.lower, readings.upper);
        let consumer = self.consumer(rule, 0.0);
        let producer = self.producer(rule);
        Misclassification {
            bad: bad.value(),
            accepted: accepted.value(),
            producer_joint: producer.value(),
            producer_given_good: producer.part_of(good),
            producer_given_rejected: producer.part_of(rejected),
            consumer_joint: consumer.value(),
            consumer_given_bad: consumer.part_of(bad),
            consumer_given_accepted: consumer.part_of(accepted),
        }
    }

    pub(super) fn bad(&self) -> Scaled {
        let z = self.distances(self.spread());
        tail(z.lower).plus(tail(z.upper))
    }

    /// A part is bad and its reading lies within the limits moved inwards by `guard` gauge sds.
    pub(super) fn consumer(&self, rule: &Quadrature, guard: f64) -> Scaled {
        let sd = self.spread();
        let (k, z) = (sd / self.gauge_sd, self.distances(sd));
        let width = z.lower + z.upper;
        let accepted = |s: f64| {
            let (near, far) = (k * s + guard, k * (s + width) - guard);
            if far > 0.0 && far * far - near * near > NEGLIGIBLE {
                above(near)
            } else {
                (above(near) - above(far)).max(0.0)
            }
        };
        self.at_limits(&z, |z| {
            rule.against_normal(z, (k, guard), f64::INFINITY, accepted)
        })
    }

    fn producer(&self, rule: &Quadrature) -> Scaled {
        let sd = self.spread();
        let (k, z) = (sd / self.gauge_sd, self.distances(sd));
        let width = z.lower + z.upper;
        self.at_limits(&z, |z| {
            rule.against_normal(-z, (k, 0.0), width, |s| above(k * s))
        })
    }

    fn at_limits(&self, z: &Distances, f: impl Fn(f64) -> Scaled) -> Scaled {
        let at = |limit: Option<f64>, z: f64| limit.map_or(Scaled::ZERO, |_| f(z));
        at(self.lower, z.lower).plus(at(self.upper, z.upper))
    }
}
