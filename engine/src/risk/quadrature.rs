//! `∫ φ(s + z) K(s) ds` over `0 ≤ s ≤ end`, for a `K` that is no larger than a normal tail beyond `k s + h`.
//!
//! Gauss & Legendre over the stretch that carries the integral: around the peak of `φ(s + z) φ(k s + h)`, or
//! from `s = 0` on where that lies below.

use std::f64::consts::PI;
use std::sync::LazyLock;

use super::scaled::Scaled;

/// For one value: relative error about 1e-13.
pub(super) static FINE: LazyLock<Quadrature> = LazyLock::new(|| Quadrature::new(9.5, 40));
/// For percentiles of draws: relative error below 1e-5, far less than the draws' own.
pub(super) static QUICK: LazyLock<Quadrature> = LazyLock::new(|| Quadrature::new(6.0, 16));

pub(super) struct Quadrature {
    /// What lies further out than this many sds of the product counts as nothing.
    reach: f64,
    /// Places from 0 to 1 with weights that add up to 1.
    nodes: Vec<(f64, f64)>,
}

impl Quadrature {
    fn new(reach: f64, points: u32) -> Quadrature {
        Quadrature {
            reach,
            nodes: (0..points).map(|i| node(i, points)).collect(),
        }
    }

    /// The integral of `f` from `from` to `to`.
    pub(super) fn sum(&self, from: f64, to: f64, f: impl Fn(f64) -> f64) -> f64 {
        let width = to - from;
        let terms = self.nodes.iter().map(|(x, w)| w * f(from + width * x));
        width * terms.sum::<f64>()
    }

    /// The integral, for a `kernel` no larger than a normal tail beyond `k s + h`.
    pub(super) fn against_normal(
        &self,
        z: f64,
        (k, h): (f64, f64),
        end: f64,
        kernel: impl Fn(f64) -> f64,
    ) -> Scaled {
        let c2 = 1.0 + k * k;
        let b = self.reach;
        let inward = z + k * h;
        // Places are counted from the peak, so that a mean far outside costs no digits.
        let (peak, from, to, at_peak) = if inward >= 0.0 {
            let to = b * b / (inward + (inward * inward + b * b * c2).sqrt());
            (0.0, 0.0, end.min(to), z)
        } else {
            let (peak, span) = (-inward / c2, b / c2.sqrt());
            let to = span.min(end - peak);
            let from = (-peak).max((-span).min(to - span));
            (peak, from, to, k * (z * k - h) / c2)
        };
        let highest = (-at_peak).clamp(from, to);
        let exponent = |u: f64| -0.5 * (u - highest) * (u + highest + 2.0 * at_peak);
        let sum = self.sum(from, to, |u| exponent(u).exp() * kernel(peak + u));
        Scaled {
            factor: (sum / (2.0 * PI).sqrt()).max(0.0),
            log: -0.5 * (highest + at_peak) * (highest + at_peak),
        }
    }
}

/// Place and weight of a root of the Legendre polynomial, moved from -1…1 to 0…1, by Newton's steps.
fn node(i: u32, points: u32) -> (f64, f64) {
    const STEPS: usize = 8;
    let n = f64::from(points);
    let mut x = (PI * (f64::from(i) + 0.75) / (n + 0.5)).cos();
    let mut slope = 1.0;
    for _ in 0..STEPS {
        let (mut before, mut value) = (1.0, x);
        for j in 2..=points {
            let j = f64::from(j);
            (before, value) = (
                value,
                ((2.0 * j - 1.0) * x * value - (j - 1.0) * before) / j,
            );
        }
        slope = n * (x * value - before) / (x * x - 1.0);
        x -= value / slope;
    }
    (0.5 * (1.0 + x), 1.0 / ((1.0 - x * x) * slope * slope))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// n points integrate polynomials up to degree 2n - 1.
    #[test]
    fn polynomials_are_integrated_exactly() {
        for (rule, points) in [(&*FINE, 40), (&*QUICK, 16)] {
            for degree in [0, 1, 7, 2 * points - 1] {
                let found = rule.sum(0.0, 1.0, |x| x.powi(degree));
                let expected = 1.0 / f64::from(degree + 1);
                assert!((found / expected - 1.0).abs() < 1e-13, "degree {degree}");
            }
        }
    }
}
