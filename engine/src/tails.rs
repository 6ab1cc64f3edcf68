//! Tails of the gamma and the beta distribution, in double precision for real parameters from 0.01 to 5e5.
//!
//! Both tails are a density-like factor times a series or a continued fraction. The factor is taken from
//! deviances about the mean and the error of Stirling's formula, so that it does not lose digits where
//! log-gammas are large. Each tail is returned as itself, never as one minus the other where it is small.
//!
//! Sources: Loader, *Fast and Accurate Computation of Binomial Probabilities*, 2000 (deviances); NIST Digital
//! Library of Mathematical Functions 5.11.1, 8.7.1, 8.9.2, 8.17.8; DiDonato & Morris, *ACM Trans. Math. Software* 18
//! (1992) 360–373, eq. 9 (fraction of the incomplete beta function).

use std::f64::consts::PI;

/// Terms of a series or fraction; reached only beyond the stated range of parameters.
const STEPS_MAX: usize = 100_000;
const TINY: f64 = 1e-300;
/// Ratio of the first two terms of a series up to which it is summed rather than the fraction worked out.
const SERIES_BELOW: f64 = 0.6;
/// Parameters up to which `t - ln(1 + t)` loses no digit that counts after it is multiplied.
const SMALL: f64 = 100.0;

/// Both tails of a distribution at one point, and the slope of the lower one against the log of the point.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Tails {
    pub(crate) lower: f64,
    pub(crate) upper: f64,
    pub(crate) slope: f64,
}

/// The gamma distribution of one shape.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Gamma {
    a: f64,
    scale: f64,
}

impl Gamma {
    pub(crate) fn new(a: f64) -> Gamma {
        let scale = (-stirling_error(a)).exp() / (2.0 * PI * a).sqrt();
        Gamma { a, scale }
    }

    /// Tails at `x > 0`.
    pub(crate) fn at(&self, x: f64) -> Tails {
        let a = self.a;
        let factor = (-deviance(a, x, x - a)).exp() * self.scale;
        let slope = factor * a;
        if x < a + 1.0 {
            let lower = factor * gamma_series(a, x);
            Tails {
                lower,
                upper: 1.0 - lower,
                slope,
            }
        } else {
            let upper = slope * gamma_fraction(a, x);
            Tails {
                lower: 1.0 - upper,
                upper,
                slope,
            }
        }
    }
}

/// F with one pair of degrees of freedom, `2a` and `2b`.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Beta {
    a: f64,
    b: f64,
    scale: f64,
}

impl Beta {
    pub(crate) fn new(a: f64, b: f64) -> Beta {
        let log = stirling_error(a + b) - stirling_error(a) - stirling_error(b);
        let scale = log.exp() * (a * b / (2.0 * PI * (a + b))).sqrt();
        Beta { a, b, scale }
    }

    /// Tails at `f > 0`.
    pub(crate) fn at(&self, f: f64) -> Tails {
        let (a, b) = (self.a, self.b);
        let below = a * f / (a * f + b);
        let above = b / (a * f + b);
        let apart = a * b * (f - 1.0) / (a * f + b);
        let deviances = deviance(a, (a + b) * below, apart) + deviance(b, (a + b) * above, -apart);
        let slope = (-deviances).exp() * self.scale;
        if below < (a + 1.0) / (a + b + 2.0) {
            let lower = slope * beta_part(a, b, below, above, -apart);
            Tails {
                lower,
                upper: 1.0 - lower,
                slope,
            }
        } else {
            let upper = slope * beta_part(b, a, above, below, apart);
            Tails {
                lower: 1.0 - upper,
                upper,
                slope,
            }
        }
    }
}

/// `ln Γ(a + 1) - (a + 1/2) ln a + a - ln(2π)/2`.
pub(crate) fn stirling_error(a: f64) -> f64 {
    let mut shifted = a;
    let mut sum = 0.0;
    while shifted < 16.0 {
        sum += (shifted + 0.5) * (1.0 / shifted).ln_1p() - 1.0;
        shifted += 1.0;
    }
    let square = shifted * shifted;
    let series = 1.0 / 12.0
        - (1.0 / 360.0
            - (1.0 / 1260.0 - (1.0 / 1680.0 - (1.0 / 1188.0) / square) / square) / square)
            / square;
    sum + series / shifted
}

/// `ln Γ(a + 1)`.
pub(crate) fn ln_gamma_1p(a: f64) -> f64 {
    stirling_error(a) + (a + 0.5) * a.ln() - a + 0.5 * (2.0 * PI).ln()
}

/// `a ln(a / m) + m - a`, given both `m` and `m - a`, of which one or the other may be rounded hard.
fn deviance(a: f64, m: f64, apart: f64) -> f64 {
    let t = apart / a;
    if t.abs() > 0.5 || a < SMALL {
        return apart - a * (m / a).ln();
    }
    // t - ln(1 + t) with r = t / (2 + t): ln(1 + t) = 2 (r + r³/3 + r⁵/5 + …) and t = 2 r + r t.
    let r = t / (2.0 + t);
    let square = r * r;
    let mut power = 2.0 * r * square;
    let mut sum = r * t;
    let mut odd = 3.0;
    loop {
        let term = power / odd;
        sum -= term;
        if term.abs() <= f64::EPSILON * 0.1 * sum.abs() {
            return a * sum;
        }
        power *= square;
        odd += 2.0;
    }
}

/// `1 + x/(a+1) + x²/((a+1)(a+2)) + …`
fn gamma_series(a: f64, x: f64) -> f64 {
    let mut term = 1.0;
    let mut sum = 1.0;
    for n in 1..STEPS_MAX {
        term *= x / (a + n as f64);
        sum += term;
        if term < sum * f64::EPSILON * 0.1 {
            break;
        }
    }
    sum
}

/// The continued fraction of `Γ(a, x) / (x^a e^-x)`.
fn gamma_fraction(a: f64, x: f64) -> f64 {
    let mut b = (x - a) + 1.0;
    let mut c = 1.0 / TINY;
    let mut d = 1.0 / b;
    let mut h = d;
    for n in 1..STEPS_MAX {
        let n = n as f64;
        let an = -n * (n - a);
        b += 2.0;
        d = 1.0 / away_from_zero(an * d + b);
        c = away_from_zero(b + an / c);
        let step = d * c;
        h *= step;
        if (step - 1.0).abs() < f64::EPSILON {
            break;
        }
    }
    h
}

/// `B(x; a, b) / (x^a y^b)`, given `y = 1 - x` and `a - (a + b) x` to full precision.
fn beta_part(a: f64, b: f64, x: f64, y: f64, apart: f64) -> f64 {
    if x * (a + b) < SERIES_BELOW * (a + 1.0) {
        beta_series(a, b, x)
    } else {
        beta_fraction(a, b, x, y, apart)
    }
}

/// `1/a + (a+b)/(a (a+1)) x + (a+b)(a+b+1)/(a (a+1)(a+2)) x² + …`
fn beta_series(a: f64, b: f64, x: f64) -> f64 {
    let mut term = 1.0 / a;
    let mut sum = term;
    for n in 0..STEPS_MAX {
        let n = n as f64;
        term *= x * (a + b + n) / (a + 1.0 + n);
        sum += term;
        if term < sum * f64::EPSILON * 0.1 {
            break;
        }
    }
    sum
}

/// The continued fraction of `B(x; a, b) / (x^a y^b)`, given `y = 1 - x` and `a - (a + b) x` to full precision.
///
/// Its partial numerators and denominators lose no digits where `x` is near 1.
fn beta_fraction(a: f64, b: f64, x: f64, y: f64, apart: f64) -> f64 {
    let mut fraction = a * (apart + 1.0) / (a + 1.0);
    let mut c = fraction;
    let mut d = 0.0;
    for n in 1..STEPS_MAX {
        let n = n as f64;
        let odd = a + 2.0 * n - 1.0;
        let numerator = (a + n - 1.0) * (a + b + n - 1.0) * n * (b - n) * (x / odd) * (x / odd);
        let denominator = n
            + n * (b - n) * x / odd
            + (a + n) * (apart + 1.0 + n * (1.0 + y)) / (a + 2.0 * n + 1.0);
        d = 1.0 / away_from_zero(denominator + numerator * d);
        c = away_from_zero(denominator + numerator / c);
        let step = d * c;
        fraction *= step;
        if (step - 1.0).abs() < f64::EPSILON {
            break;
        }
    }
    1.0 / fraction
}

fn away_from_zero(x: f64) -> f64 {
    if x.abs() < TINY { TINY } else { x }
}
