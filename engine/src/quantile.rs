//! Quantiles and upper tails of chi-square and F for real degrees of freedom from 0.02 to 1e6.
//!
//! A quantile is found by Newton steps on the log of the smaller tail against the log of the point, which is
//! concave, so that the steps come from one side; a bracket catches a poor start.

mod by_df;

pub(crate) use by_df::ChiSquareByDf;

use crate::tails::{Beta, Gamma, Tails, ln_gamma_1p};

const STEPS_MAX: usize = 200;
/// How far to look for the other side of the root, in log of the point.
const STRIDE: f64 = 2.0;
/// Steps shorter than this that no longer shrink are rounding.
const SETTLING: f64 = 1e-11;
/// Logs of points below this are given by the first term of the power series alone.
const FIRST_TERM_BELOW: f64 = -38.0;

/// Which tail of a distribution holds the stated probability.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// The probability lies below the quantile.
    Below,
    /// The probability lies above the quantile.
    Above,
}

impl Side {
    fn opposite(self) -> Side {
        match self {
            Side::Below => Side::Above,
            Side::Above => Side::Below,
        }
    }
}

/// The value of chi-square with `df` degrees of freedom that has probability `p` on `side` of it.
///
/// `p` strictly between 0 and 1, `df` from 0.02 to 1e6. A value too small for f64 is 0.
pub fn chi_square(side: Side, p: f64, df: f64) -> f64 {
    let a = df / 2.0;
    let first_term = |ln_p: f64| (ln_p + ln_gamma_1p(a)) / a;
    // Wilson & Hilferty 1931.
    let spread = 2.0 / (9.0 * df);
    let cube = 1.0 - spread + normal(side, p) * spread.sqrt();
    let guess = if cube > 0.2 {
        (a * cube.powi(3)).ln()
    } else {
        f64::NAN
    };
    let gamma = Gamma::new(a);
    2.0 * quantile(side, p, guess, first_term, |x| gamma.at(x))
}

/// The value of F with `df1` and `df2` degrees of freedom that has probability `p` on `side` of it.
///
/// `p` strictly between 0 and 1, `df1` and `df2` from 0.02 to 1e6.
pub fn f(side: Side, p: f64, df1: f64, df2: f64) -> f64 {
    match side {
        Side::Below => f_below(p, df1, df2),
        Side::Above => 1.0 / f_below(p, df2, df1),
    }
}

fn f_below(p: f64, df1: f64, df2: f64) -> f64 {
    let (a, b) = (df1 / 2.0, df2 / 2.0);
    // Near zero the lower tail is (a f / b)^a / (a B(a, b)).
    let ln_a_beta = ln_gamma_1p(a) + ln_gamma_1p(b) - ln_gamma_1p(a + b) + (a / b).ln_1p();
    let first_term = |ln_p: f64| (ln_p + ln_a_beta) / a + (b / a).ln();
    let beta = Beta::new(a, b);
    quantile(Side::Below, p, f_guess(p, df1, df2), first_term, |x| {
        beta.at(x)
    })
}

/// Probability of chi-square with `df` degrees of freedom above `x`.
pub fn chi_square_above(x: f64, df: f64) -> f64 {
    if x > 0.0 {
        Gamma::new(df / 2.0).at(x / 2.0).upper.clamp(0.0, 1.0)
    } else {
        1.0
    }
}

/// Probability of F with `df1` and `df2` degrees of freedom above `x`.
pub fn f_above(x: f64, df1: f64, df2: f64) -> f64 {
    FTail::new(df1, df2).above(x)
}

/// The upper tail of F with one pair of degrees of freedom.
#[derive(Debug, Clone, Copy)]
pub(crate) enum FTail {
    /// An even number of the first, both small: a finite sum.
    Finite {
        /// Half of the first.
        terms: u32,
        /// Half of the second.
        b: f64,
    },
    /// Any other.
    Any(Beta),
}

/// Degrees of freedom up to which the finite sum loses no digit that counts.
const FINITE_UP_TO: f64 = 200.0;

impl FTail {
    pub(crate) fn new(df1: f64, df2: f64) -> FTail {
        if df1 % 2.0 == 0.0 && df1.max(df2) <= FINITE_UP_TO {
            FTail::Finite {
                terms: (df1 / 2.0) as u32,
                b: df2 / 2.0,
            }
        } else {
            FTail::Any(Beta::new(df1 / 2.0, df2 / 2.0))
        }
    }

    /// Probability above `x`.
    pub(crate) fn above(&self, x: f64) -> f64 {
        if x.is_nan() || x <= 0.0 {
            return 1.0;
        }
        match *self {
            FTail::Finite { terms, b } => finite_sum(terms, b, x).clamp(0.0, 1.0),
            FTail::Any(beta) => beta.at(x).upper.clamp(0.0, 1.0),
        }
    }
}

/// `y^b [1 + b z + b (b+1)/2 z² + …]`, as many terms as half the first degrees of freedom, `y = 1 - z` the second over
/// the second plus the first times `x` (Abramowitz & Stegun 26.6.4).
fn finite_sum(terms: u32, b: f64, x: f64) -> f64 {
    let odds = f64::from(terms) * x / b;
    let z = odds / (1.0 + odds);
    let (mut term, mut sum) = (1.0, 1.0);
    for i in 1..terms {
        let i = f64::from(i);
        term *= z * (b + i - 1.0) / i;
        sum += term;
    }
    sum * (-b * (1.0 + odds).ln()).exp()
}

/// Log of F by the cube-root approximation to both chi-squares (Paulson 1942), or by the one with fewer df.
fn f_guess(p: f64, df1: f64, df2: f64) -> f64 {
    let z = normal(Side::Below, p);
    let (s1, s2) = (2.0 / (9.0 * df1), 2.0 / (9.0 * df2));
    let (m1, m2) = (1.0 - s1, 1.0 - s2);
    let divisor = m2 * m2 - z * z * s2;
    let under_root = m1 * m1 * s2 + m2 * m2 * s1 - z * z * s1 * s2;
    let cube = (m1 * m2 + z * under_root.sqrt()) / divisor;
    if divisor > 0.0 && cube > 0.2 {
        3.0 * cube.ln()
    } else if df1 < df2 {
        (chi_square(Side::Below, p, df1) / df1).ln()
    } else {
        (df2 / chi_square(Side::Above, p, df2)).ln()
    }
}

fn quantile(
    side: Side,
    p: f64,
    guess: f64,
    first_term: impl Fn(f64) -> f64,
    at: impl Fn(f64) -> Tails,
) -> f64 {
    let start = first_term(p.ln());
    if side == Side::Below && start < FIRST_TERM_BELOW {
        return start.exp();
    }
    let mut log = if guess.is_finite() {
        guess
    } else {
        start.clamp(FIRST_TERM_BELOW, 700.0)
    };
    // The smaller tail decides: it is known to a relative error of its own.
    let (wanted, target) = if p <= 0.5 {
        (side, p)
    } else {
        (side.opposite(), 1.0 - p)
    };
    let (mut low, mut high) = (f64::NEG_INFINITY, f64::INFINITY);
    let mut smallest = f64::INFINITY;
    for _ in 0..STEPS_MAX {
        let tails = at(log.exp());
        let (tail, outward) = match wanted {
            Side::Below => (tails.lower, -1.0),
            Side::Above => (tails.upper, 1.0),
        };
        if (tail < target) == (wanted == Side::Below) {
            low = log;
        } else {
            high = log;
        }
        let newton = log + outward * (tail / target).ln() * tail / tails.slope;
        let next = if newton >= low && newton <= high {
            newton
        } else if low.is_finite() && high.is_finite() {
            0.5 * (low + high)
        } else {
            log + if log == low { STRIDE } else { -STRIDE }
        };
        let step = (next - log).abs();
        log = next;
        if step <= 4.0 * f64::EPSILON || (step < SETTLING && step >= smallest) {
            break;
        }
        smallest = smallest.min(step);
    }
    log.exp()
}

/// Rough standard normal quantile, good enough to start from (Abramowitz & Stegun 26.2.23).
fn normal(side: Side, p: f64) -> f64 {
    let tail = p.min(1.0 - p);
    let t = (-2.0 * tail.ln()).sqrt();
    let z = t
        - (2.515517 + t * (0.802853 + t * 0.010328))
            / (1.0 + t * (1.432788 + t * (0.189269 + t * 0.001308)));
    let below = if p < 0.5 { -z } else { z };
    if side == Side::Below { below } else { -below }
}
