//! Limits of the ratio of two sums of mean squares: the ratio at which the limit of their difference is zero.
//!
//! Between the ratios at which a weight of `numerator - ρ denominator` changes sign, `V` of that difference is a
//! polynomial of second degree in `ρ`. Its coefficients are themselves quadratic forms of the mean squares, worked
//! out once for all characteristics of a design; a characteristic costs a few of them and a root.
//!
//! Source: Gui, Graybill, Burdick & Ting, *J. Statist. Plann. Inference* 48 (1995).

use super::{Constants, Limit, pairs, root_of};
use crate::root;

/// The limits of one ratio at one tail probability, with all that does not depend on mean squares worked out.
#[derive(Debug, Clone)]
pub(crate) struct Ratio {
    numerator: Vec<f64>,
    denominator: Vec<f64>,
    signs_may_change: bool,
    denominator_at_least: Limit,
    pieces: Vec<Piece>,
}

/// A stretch of ratios over which no weight of the difference changes sign.
#[derive(Debug, Clone)]
struct Piece {
    end: f64,
    lower: [Vec<f64>; 3],
    upper: [Vec<f64>; 3],
}

/// `V` of the difference as a polynomial in the ratio, lowest power first.
type Polynomial = [f64; 3];

impl Ratio {
    pub(crate) fn new(constants: &Constants, numerator: &[f64], denominator: &[f64]) -> Ratio {
        let mut ends: Vec<f64> = numerator
            .iter()
            .zip(denominator)
            .map(|(n, d)| n / d)
            .filter(|end| *end > 0.0 && end.is_finite())
            .collect();
        ends.sort_by(f64::total_cmp);
        ends.dedup();
        ends.push(f64::INFINITY);
        let mut start = 0.0;
        let piece = |end: f64| {
            let inside = if end.is_finite() {
                0.5 * (start + end)
            } else {
                2.0 * start + 1.0
            };
            start = end;
            let difference: Vec<f64> = numerator
                .iter()
                .zip(denominator)
                .map(|(n, d)| n - inside * d)
                .collect();
            let negated: Vec<f64> = difference.iter().map(|c| -c).collect();
            let powers = |c: &[f64]| powers(&constants.form(c), c, numerator, denominator);
            Piece {
                end,
                lower: powers(&difference),
                upper: powers(&negated),
            }
        };
        let pieces = ends.into_iter().map(piece).collect();
        Ratio {
            numerator: numerator.to_vec(),
            denominator: denominator.to_vec(),
            denominator_at_least: constants.lower_limit(denominator),
            signs_may_change: constants.signs_may_change,
            pieces,
        }
    }

    /// Both limits at zero or above; the upper one may be infinite.
    ///
    /// `None` when the denominator's estimate is not above zero.
    pub(crate) fn limits(&self, ms: &[f64]) -> Option<(f64, f64)> {
        let largest = ms.iter().fold(0.0, |a: f64, x| a.max(*x));
        let sum = |c: &[f64]| -> f64 { c.iter().zip(ms).map(|(c, ms)| c * (ms / largest)).sum() };
        let (n, d) = (sum(&self.numerator), sum(&self.denominator));
        if d.is_nan() || d <= 0.0 {
            return None;
        }
        let forms = |forms: &[Vec<f64>; 3]| forms.each_ref().map(|form| value(form, ms, largest));
        let lower = self.falls_to_zero(n, d, -1.0, |piece| forms(&piece.lower));
        let upper = if self.denominator_at_least.at(ms) <= 0.0 {
            f64::INFINITY
        } else {
            self.falls_to_zero(n, d, 1.0, |piece| forms(&piece.upper))
        };
        // Only at confidences near one half can the lower limit be without end.
        let lower = if lower.is_finite() { lower } else { n / d };
        Some((lower.max(0.0), upper))
    }

    /// The ratio `ρ` at which `n - ρ d ± √V` falls to zero; zero when it never was above, infinite when it stays there.
    fn falls_to_zero(&self, n: f64, d: f64, side: f64, v: impl Fn(&Piece) -> Polynomial) -> f64 {
        let root = |v| side * root_of(v, self.signs_may_change);
        let mut start = 0.0;
        for piece in &self.pieces {
            let [a, b, c] = v(piece);
            let at = |rho: f64| n - rho * d + root(a + rho * (b + rho * c));
            // The same over the ratio, in terms of its inverse: reaches up to a ratio without end.
            let at_inverse = |t: f64| n * t - d + root(c + t * (b + t * a));
            if at(start) <= 0.0 {
                return start;
            }
            if piece.end.is_finite() {
                if at(piece.end) <= 0.0 {
                    return root::between(at, start, piece.end);
                }
                start = piece.end;
            } else if at_inverse(0.0) < 0.0 {
                let from = start.max(f64::MIN_POSITIVE.sqrt());
                return 1.0 / root::between(at_inverse, 0.0, 1.0 / from);
            }
        }
        f64::INFINITY
    }
}

/// The forms that stand before the powers of the ratio, given that of `V` for the signs of `c`.
fn powers(form: &[f64], c: &[f64], n: &[f64], d: &[f64]) -> [Vec<f64>; 3] {
    let signed = |(&k, (q, s)): (&f64, (usize, usize))| {
        if k == 0.0 {
            0.0
        } else {
            k * c[q].signum() * c[s].signum()
        }
    };
    let each = |product: &dyn Fn(usize, usize) -> f64| -> Vec<f64> {
        let of_pairs = form.iter().zip(pairs(c.len()));
        of_pairs
            .map(|(k, (q, s))| signed((k, (q, s))) * product(q, s))
            .collect()
    };
    [
        each(&|q, s| n[q] * n[s]),
        each(&|q, s| -(n[q] * d[s] + d[q] * n[s])),
        each(&|q, s| d[q] * d[s]),
    ]
}

/// A quadratic form of mean squares, each over the largest.
fn value(form: &[f64], ms: &[f64], largest: f64) -> f64 {
    let scale = 1.0 / largest;
    let mut rest = form;
    let mut sum = 0.0;
    for (q, x) in ms.iter().enumerate() {
        let row;
        (row, rest) = rest.split_at(ms.len() - q);
        let along: f64 = row.iter().zip(&ms[q..]).map(|(k, x)| k * (x * scale)).sum();
        sum += along * (x * scale);
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantile::{Side, f};

    /// With one term the limits are the exact ones by F, also where the lower one lies above the estimate.
    #[test]
    fn one_term_over_the_error_has_its_exact_limits() {
        let (n, m, trials) = (3.0, 4.0, 2.0);
        for tail in [0.005, 0.025, 0.25, 0.45, 0.5] {
            let constants = Constants::all(&[n, m], tail);
            let ratio = Ratio::new(&constants, &[1.0 / trials, -1.0 / trials], &[0.0, 1.0]);
            for observed in [0.8, 1.4, 26.25, 4000.0] {
                let (lower, upper) = ratio.limits(&[observed * 7.0, 7.0]).unwrap();
                for (found, side) in [(lower, Side::Above), (upper, Side::Below)] {
                    let exact = ((observed / f(side, tail, n, m) - 1.0) / trials).max(0.0);
                    let close = (found - exact).abs() <= 1e-9 * exact;
                    assert!(close, "F {observed}, tail {tail}: {found} for {exact}");
                }
            }
        }
    }

    /// A gauge that may be zero sets the ratio no upper limit.
    #[test]
    fn a_denominator_that_may_be_zero_sets_no_upper_limit() {
        let constants = Constants::all(&[9.0, 6.0, 20.0], 0.025);
        let ratio = Ratio::new(&constants, &[0.5, -0.5, 0.0], &[0.0, 0.5, -0.5]);
        let (lower, upper) = ratio.limits(&[90.0, 1.1, 1.0]).unwrap();
        assert!(lower > 1.0 && upper == f64::INFINITY, "{lower} {upper}");
        assert_eq!(ratio.limits(&[90.0, 1.0, 1.1]), None);
    }
}
