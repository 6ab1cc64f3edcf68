//! Quantiles of chi-square at one probability for degrees of freedom that differ from one study to the next.
//!
//! The log of `χ² / df` is smooth in `df`: over a quarter of an octave a short Chebyshev series gives it to the last digits.
//! A series is worked out from the quantiles themselves when it is first needed.

use std::f64::consts::PI;
use std::sync::OnceLock;

use super::{Side, chi_square};

/// Powers of two between which df are looked up: 2⁻⁶ to 2²⁰.
const POWERS: std::ops::Range<i32> = -6..20;
/// Pieces of an octave.
const PER_OCTAVE: usize = 4;
const PIECES: usize = PER_OCTAVE * (POWERS.end - POWERS.start) as usize;
const TERMS: usize = 12;

/// Quantiles at one probability.
#[derive(Debug, Clone)]
pub(crate) struct ChiSquareByDf {
    side: Side,
    p: f64,
    series: Box<[OnceLock<[f64; TERMS]>; PIECES]>,
}

impl ChiSquareByDf {
    pub(crate) fn new(side: Side, p: f64) -> ChiSquareByDf {
        ChiSquareByDf {
            side,
            p,
            series: Box::new([const { OnceLock::new() }; PIECES]),
        }
    }

    /// The quantile; `df` from 0.02 to 1e6.
    pub(crate) fn at(&self, df: f64) -> f64 {
        let (power, part) = octave(df);
        if !POWERS.contains(&power) {
            return chi_square(self.side, self.p, df);
        }
        let per_octave = PER_OCTAVE as f64;
        let piece = (per_octave * (part - 1.0)) as usize;
        let middle = 1.0 + (piece as f64 + 0.5) / per_octave;
        let place = PER_OCTAVE * (power - POWERS.start) as usize + piece;
        let series = self.series[place].get_or_init(|| self.fit(middle, df / part));
        df * chebyshev(series, 2.0 * per_octave * (part - middle)).exp()
    }

    /// The series about `middle × unit`, half a piece to either side.
    fn fit(&self, middle: f64, unit: f64) -> [f64; TERMS] {
        let angle = |k: usize| PI * (k as f64 + 0.5) / TERMS as f64;
        let values: [f64; TERMS] = std::array::from_fn(|k| {
            let df = (middle + 0.5 / PER_OCTAVE as f64 * angle(k).cos()) * unit;
            (chi_square(self.side, self.p, df) / df).ln()
        });
        std::array::from_fn(|j| {
            let sum: f64 = (0..TERMS)
                .map(|k| values[k] * (j as f64 * angle(k)).cos())
                .sum();
            sum * if j == 0 { 1.0 } else { 2.0 } / TERMS as f64
        })
    }
}

/// `x = 2^power × part` with `part` from 1 up to 2; for `x` above zero and not tiny.
fn octave(x: f64) -> (i32, f64) {
    const MANTISSA: u64 = (1 << 52) - 1;
    let bits = x.to_bits();
    let power = (bits >> 52) as i32 - 1023;
    (power, f64::from_bits(bits & MANTISSA | 1023 << 52))
}

/// A Chebyshev series at `x` in -1 to 1, by Clenshaw's recurrence.
fn chebyshev(series: &[f64; TERMS], x: f64) -> f64 {
    let (mut b1, mut b2) = (0.0, 0.0);
    for c in series[1..].iter().rev() {
        (b1, b2) = (c + 2.0 * x * b1 - b2, b1);
    }
    series[0] + x * b1 - b2
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against the quantiles found one by one, themselves tested against published values.
    #[test]
    fn as_exact_as_the_quantile_itself() {
        for (side, p) in [
            (Side::Above, 0.025),
            (Side::Below, 0.025),
            (Side::Above, 0.05),
            (Side::Below, 0.005),
            (Side::Above, 0.25),
        ] {
            let table = ChiSquareByDf::new(side, p);
            let mut df = 0.05;
            while df < 1e6 {
                let (found, expected) = (table.at(df), chi_square(side, p, df));
                let error = (found / expected - 1.0).abs();
                let digits = 1e-13 * (expected / df).ln().abs().max(1.0);
                assert!(error < digits, "{side:?} {p} at {df}: {error:e}");
                df *= 1.0137;
            }
        }
    }

    #[test]
    fn octaves() {
        for (x, expected) in [(1.0, (0, 1.0)), (0.75, (-1, 1.5)), (12.0, (3, 1.5))] {
            assert_eq!(octave(x), expected);
        }
    }
}
