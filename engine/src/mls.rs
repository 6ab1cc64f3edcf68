//! Modified-large-sample limits for sums of mean squares of any signs.
//!
//! Mean squares are independent, `df × MS / E[MS]` chi-square. With `x_q = |c_q| MS_q`, `A` the positive and `B`
//! the negative members, the lower limit of `g = sum c_q MS_q` is `g - √V`:
//! ```text
//! V = sum_A G_q² x_q² + sum_B H_s² x_s² + sum_AB [(F-1)² - G_q² F² - H_s²]/F x_q x_s + sum_(pairs in A) S_qt x_q x_t
//! G_q = 1 - n_q/χ²(1-a; n_q)   H_s = n_s/χ²(a; n_s) - 1   F = F(1-a; n_q, n_s)
//! S_qt = [(1 - w/χ²(1-a; w))² w²/(n_q n_t) - G_q² n_q/n_t - G_t² n_t/n_q]/(|A| - 1),  w = n_q + n_t
//! ```
//! `S` is left out when `B` is empty. The upper limit is minus the lower limit of `-g`.
//!
//! At the confidences of intervals all of `G`, `H` and `F - 1` are positive. Below about 70 % one-sided they
//! change sign one by one; squares are then taken with their sign, so that the limit goes on falling with
//! confidence and stays exact for a single mean square.
//!
//! Sources: Graybill & Wang, *J. Amer. Statist. Assoc.* 75 (1980) 869–873; Ting, Burdick, Graybill, Jeyaratnam
//! & Lu, *J. Statist. Comput. Simul.* 35 (1990) 135–143.

mod ratio;

pub(crate) use ratio::Ratio;

use crate::quantile::{Side, chi_square, f};

/// One-sided tail probability above which `G`, `H` or `F - 1` may be negative for some df ≥ 1.
const SIGNS_CHANGE_ABOVE: f64 = 0.3;

/// The constants of the formula for one list of df and one tail probability.
#[derive(Debug, Clone)]
pub(crate) struct Constants {
    signs_may_change: bool,
    df: Vec<f64>,
    g: Vec<f64>,
    h: Vec<f64>,
    /// `F(1-a; df[q], df[s])` at `q × len + s`.
    f: Vec<f64>,
    /// `1 - w/χ²(1-a; w)` for `w = df[q] + df[s]`, at `q × len + s`.
    joint: Vec<f64>,
}

impl Constants {
    /// All constants at tail probability `a`.
    pub(crate) fn all(df: &[f64], a: f64) -> Self {
        Constants::where_needed(df, a, |_| true, |_| true)
    }

    /// Those that the lower limit with weights `c` needs.
    pub(crate) fn for_lower(c: &[f64], df: &[f64], a: f64) -> Self {
        Constants::where_needed(df, a, |q| c[q] > 0.0, |s| c[s] < 0.0)
    }

    fn where_needed(
        df: &[f64],
        a: f64,
        above: impl Fn(usize) -> bool,
        below: impl Fn(usize) -> bool,
    ) -> Self {
        let len = df.len();
        let shortfall = |n: f64| 1.0 - n / chi_square(Side::Above, a, n);
        let g = (0..len)
            .map(|q| if above(q) { shortfall(df[q]) } else { 0.0 })
            .collect();
        let h = (0..len)
            .map(|s| {
                if below(s) {
                    df[s] / chi_square(Side::Below, a, df[s]) - 1.0
                } else {
                    0.0
                }
            })
            .collect();
        let mixed = (0..len).any(&below);
        let mut ratio = vec![0.0; len * len];
        let mut joint = vec![0.0; len * len];
        for q in (0..len).filter(|&q| above(q)) {
            for s in (0..len).filter(|&s| s != q) {
                if below(s) {
                    ratio[q * len + s] = f(Side::Above, a, df[q], df[s]);
                }
                if above(s) && mixed {
                    joint[q * len + s] = shortfall(df[q] + df[s]);
                }
            }
        }
        Constants {
            signs_may_change: a > SIGNS_CHANGE_ABOVE,
            df: df.to_vec(),
            g,
            h,
            f: ratio,
            joint,
        }
    }

    /// The lower limit of `sum c_q MS_q`, one-sided; may be negative.
    pub(crate) fn lower_limit(&self, c: &[f64]) -> Limit {
        Limit {
            weights: (0..c.len())
                .map(|q| (q, c[q]))
                .filter(|w| w.1 != 0.0)
                .collect(),
            form: pairs(c.len())
                .zip(self.form(c))
                .map(|((q, s), k)| (q, s, k * (c[q] * c[s]).abs()))
                .filter(|(_, _, k)| *k != 0.0)
                .collect(),
            from: Side::Below,
            signs_may_change: self.signs_may_change,
        }
    }

    /// The upper limit of `sum c_q MS_q`, one-sided; may be negative.
    pub(crate) fn upper_limit(&self, c: &[f64]) -> Limit {
        let negated: Vec<f64> = c.iter().map(|c| -c).collect();
        Limit {
            from: Side::Above,
            ..self.lower_limit(&negated)
        }
    }

    /// One-sided lower limit of `sum c_q MS_q`; may be negative.
    pub(crate) fn lower(&self, c: &[f64], ms: &[f64]) -> f64 {
        self.lower_limit(c).at(ms)
    }

    /// One-sided upper limit of `sum c_q MS_q`; may be negative.
    pub(crate) fn upper(&self, c: &[f64], ms: &[f64]) -> f64 {
        self.upper_limit(c).at(ms)
    }

    /// What `x_q x_s` enters `V` with, for the signs of `c`; one row after another, `q <= s`.
    fn form(&self, c: &[f64]) -> Vec<f64> {
        let members = c.iter().filter(|&&c| c > 0.0).count();
        let mixed = c.iter().any(|&c| c < 0.0);
        let coefficient = |q: usize, s: usize| match (sign(c[q]), sign(c[s])) {
            (1, 1) if q == s => signed_square(self.g[q]),
            (-1, -1) if q == s => signed_square(self.h[q]),
            (1, 1) if mixed => self.alike(q, s) / (members - 1) as f64,
            (1, -1) => self.across(q, s),
            (-1, 1) => self.across(s, q),
            _ => 0.0,
        };
        pairs(c.len()).map(|(q, s)| coefficient(q, s)).collect()
    }

    fn across(&self, q: usize, s: usize) -> f64 {
        let f = self.f[q * self.df.len() + s];
        (signed_square(f - 1.0) - signed_square(self.g[q]) * f * f - signed_square(self.h[s])) / f
    }

    fn alike(&self, q: usize, t: usize) -> f64 {
        let (n, m) = (self.df[q], self.df[t]);
        let w = n + m;
        let joint = signed_square(self.joint[q * self.df.len() + t]);
        joint * w * w / (n * m)
            - signed_square(self.g[q]) * n / m
            - signed_square(self.g[t]) * m / n
    }
}

/// One limit of one sum of mean squares, with all that does not depend on them worked out.
#[derive(Debug, Clone)]
pub(crate) struct Limit {
    /// Those of the sum; of its negative for an upper limit.
    weights: Vec<(usize, f64)>,
    /// What the product of two mean squares enters `V` with.
    form: Vec<(usize, usize, f64)>,
    from: Side,
    signs_may_change: bool,
}

impl Limit {
    /// The limit for given mean squares.
    pub(crate) fn at(&self, ms: &[f64]) -> f64 {
        self.scaled(ms, Scale::of(ms))
    }

    /// The same, the scale of the mean squares being known.
    pub(crate) fn scaled(&self, ms: &[f64], scale: Scale) -> f64 {
        let x = |q: usize| ms[q] * scale.inverse;
        let v: f64 = self.form.iter().map(|&(q, s, k)| k * x(q) * x(s)).sum();
        let sum: f64 = self.weights.iter().map(|&(q, c)| c * x(q)).sum();
        let limit = (sum - root_of(v, self.signs_may_change)) * scale.largest;
        match self.from {
            Side::Below => limit,
            Side::Above => -limit,
        }
    }
}

/// The largest of some mean squares, by which they are divided before they are squared.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Scale {
    largest: f64,
    inverse: f64,
}

impl Scale {
    pub(crate) fn of(ms: &[f64]) -> Scale {
        let largest = ms.iter().fold(0.0, |a, &x| if x > a { x } else { a });
        let inverse = if largest > 0.0 { 1.0 / largest } else { 0.0 };
        Scale { largest, inverse }
    }
}

/// The one-sided lower limit of `sum c_q MS_q` at a confidence given by its two tails, `within + beyond = 1`; where it is
/// below one half, the upper limit at the rest.
pub(crate) fn lower_limit_at(c: &[f64], df: &[f64], within: f64, beyond: f64) -> Limit {
    if within >= beyond {
        return Constants::for_lower(c, df, beyond).lower_limit(c);
    }
    let negated: Vec<f64> = c.iter().map(|c| -c).collect();
    Constants::for_lower(&negated, df, within).upper_limit(c)
}

/// The one-sided lower limit at the confidence whose log odds are given.
pub(crate) fn lower_at_log_odds(c: &[f64], df: &[f64], ms: &[f64], log_odds: f64) -> f64 {
    let tail = 1.0 / (1.0 + log_odds.abs().exp());
    let (within, beyond) = if log_odds >= 0.0 {
        (1.0 - tail, tail)
    } else {
        (tail, 1.0 - tail)
    };
    lower_limit_at(c, df, within, beyond).at(ms)
}

/// All pairs of lines, `q <= s`, row by row.
fn pairs(len: usize) -> impl Iterator<Item = (usize, usize)> {
    (0..len).flat_map(move |q| (q..len).map(move |s| (q, s)))
}

/// The root of `V`. Rounding can bring a tiny negative; where signs may change, its root counts the other way.
fn root_of(v: f64, signs_may_change: bool) -> f64 {
    if v >= 0.0 {
        v.sqrt()
    } else if signs_may_change {
        -(-v).sqrt()
    } else {
        0.0
    }
}

fn sign(x: f64) -> i8 {
    i8::from(x > 0.0) - i8::from(x < 0.0)
}

fn signed_square(x: f64) -> f64 {
    x * x.abs()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(found: f64, expected: f64, digits: i32) {
        let error = ((found - expected) / expected).abs();
        assert!(
            error < 10f64.powi(-digits),
            "found {found:e}, expected {expected:e}"
        );
    }

    /// Graybill & Wang: with one mean square the limits are the exact ones, at any confidence.
    #[test]
    fn one_mean_square_has_its_chi_square_limits() {
        for df in [1.0, 2.0, 18.0, 60.0] {
            for a in [0.005, 0.05, 0.3, 0.45] {
                let constants = Constants::all(&[df], a);
                close(
                    constants.lower(&[2.0], &[3.0]),
                    6.0 * df / chi_square(Side::Above, a, df),
                    13,
                );
                close(
                    constants.upper(&[2.0], &[3.0]),
                    6.0 * df / chi_square(Side::Below, a, df),
                    13,
                );
            }
        }
    }

    /// Ting et al.: the lower limit of a difference is 0 when F is just significant.
    #[test]
    fn a_difference_has_lower_limit_zero_where_f_is_significant() {
        for (n, m) in [(9.0, 18.0), (2.0, 60.0), (1.0, 1.0), (120.0, 3.0)] {
            let a = 0.025;
            let constants = Constants::all(&[n, m], a);
            let upper_f = f(Side::Above, a, n, m);
            assert!(constants.lower(&[0.5, -0.25], &[0.5 * upper_f, 1.0]).abs() < 1e-9 * upper_f);
            let lower_f = f(Side::Below, a, n, m);
            assert!(constants.upper(&[0.5, -0.25], &[0.5 * lower_f, 1.0]).abs() < 1e-9);
        }
    }

    /// With endless df the subtracted mean square is known, and the exact limits shift by it.
    #[test]
    fn a_known_subtrahend_shifts_the_exact_limits() {
        let (n, a) = (9.0, 0.025);
        let constants = Constants::all(&[n, 1e6], a);
        close(
            constants.lower(&[1.0, -1.0], &[5.0, 0.5]),
            5.0 * n / chi_square(Side::Above, a, n) - 0.5,
            3,
        );
        close(
            constants.upper(&[1.0, -1.0], &[5.0, 0.5]),
            5.0 * n / chi_square(Side::Below, a, n) - 0.5,
            3,
        );
    }

    #[test]
    fn the_limit_falls_as_confidence_grows() {
        let (df, ms) = ([9.0, 2.0, 18.0, 60.0], [5.0, 1.5, 0.02, 0.05]);
        for c in [
            [0.0, 0.04, 0.3, 0.6],
            [0.1, 0.0, -0.1, 0.0],
            [0.1, 0.04, 0.2, 0.6],
        ] {
            let limits: Vec<f64> = (-100..=100)
                .map(|t| lower_at_log_odds(&c, &df, &ms, f64::from(t) * 0.2))
                .collect();
            assert!(
                limits.windows(2).all(|pair| pair[1] <= pair[0]),
                "weights {c:?}"
            );
        }
    }
}
