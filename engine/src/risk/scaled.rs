//! Probabilities of the normal distribution too small for f64: a factor times the exponential of a log.
//!
//! A ratio of two such numbers keeps its digits when each alone would be 0.

use std::f64::consts::{PI, SQRT_2};

use super::quadrature::FINE;

/// `factor × exp(log)`, `factor ≥ 0`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Scaled {
    pub(super) factor: f64,
    pub(super) log: f64,
}

/// Where the integral of the density over a stretch is taken rather than the difference of two tails.
const NARROW: f64 = 1.0;
/// From here on the tail is a continued fraction.
const FAR: f64 = 8.0;
const FRACTION_TERMS: u32 = 60;

impl Scaled {
    pub(super) const ZERO: Scaled = Scaled {
        factor: 0.0,
        log: 0.0,
    };

    pub(super) fn value(self) -> f64 {
        if self.factor == 0.0 {
            0.0
        } else {
            self.factor * self.log.exp()
        }
    }

    pub(super) fn plus(self, other: Scaled) -> Scaled {
        self.joined(other, 1.0)
    }

    /// `self - other`, not below zero.
    pub(super) fn minus(self, other: Scaled) -> Scaled {
        self.joined(other, -1.0)
    }

    fn joined(self, other: Scaled, sign: f64) -> Scaled {
        if other.factor == 0.0 {
            return self;
        }
        let log = if self.factor == 0.0 {
            other.log
        } else {
            self.log.max(other.log)
        };
        let at = |x: Scaled| {
            if x.factor == 0.0 {
                0.0
            } else {
                x.factor * (x.log - log).exp()
            }
        };
        Scaled {
            factor: (at(self) + sign * at(other)).max(0.0),
            log,
        }
    }

    /// `self / whole` as a probability; `None` when the whole is 0.
    pub(super) fn part_of(self, whole: Scaled) -> Option<f64> {
        if whole.factor == 0.0 {
            return None;
        }
        if self.factor == 0.0 {
            return Some(0.0);
        }
        Some((self.factor / whole.factor * (self.log - whole.log).exp()).min(1.0))
    }
}

/// Probability of a standard normal above `z`.
pub(super) fn above(z: f64) -> f64 {
    0.5 * libm::erfc(z / SQRT_2)
}

/// Probability of a standard normal above `z`, however small.
pub(super) fn tail(z: f64) -> Scaled {
    if z < 0.0 {
        return Scaled {
            factor: above(z),
            log: 0.0,
        };
    }
    let square = 0.5 * z * z;
    let factor = if z < FAR {
        above(z) * square.exp()
    } else {
        // Laplace's fraction 1/(z + 1/(z + 2/(z + …))) from its far end.
        let rest = (1..FRACTION_TERMS).rev();
        let rest = rest.fold(z, |rest, n| z + f64::from(n) / rest);
        1.0 / (rest * (2.0 * PI).sqrt())
    };
    Scaled {
        factor,
        log: -square,
    }
}

/// Probability of a standard normal between `-below` and `above`.
pub(super) fn between(below: f64, above: f64) -> Scaled {
    if below + above < NARROW {
        return density_over(below, above);
    }
    if below < 0.0 {
        tail(-below).minus(tail(above))
    } else if above < 0.0 {
        tail(-above).minus(tail(below))
    } else {
        let one = Scaled {
            factor: 1.0,
            log: 0.0,
        };
        one.minus(tail(below)).minus(tail(above))
    }
}

fn density_over(below: f64, above: f64) -> Scaled {
    let nearest = 0f64.clamp(-below, above);
    let width = below + above;
    let sum = FINE.sum(0.0, width, |s| {
        let x = s - below;
        (0.5 * (nearest - x) * (nearest + x)).exp()
    });
    Scaled {
        factor: sum / (2.0 * PI).sqrt(),
        log: -0.5 * nearest * nearest,
    }
}
