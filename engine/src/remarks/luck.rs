//! Chances of what luck alone gives.

use crate::quantile;

/// Chance of an F above `ratio`; one against an error of zero is never luck, nothing against nothing always is.
pub(super) fn f_above(ratio: f64, df1: f64, df2: f64) -> f64 {
    if ratio == f64::INFINITY {
        0.0
    } else if ratio.is_nan() {
        1.0
    } else {
        quantile::f_above(ratio, df1, df2)
    }
}

/// Chance of at least `k` of `n` when each comes with chance `p`.
pub(super) fn at_least(k: usize, n: usize, p: f64) -> f64 {
    if k == 0 || p >= 1.0 {
        return 1.0;
    }
    if k > n || p <= 0.0 {
        return 0.0;
    }
    let (a, b) = (k as f64, (n - k + 1) as f64);
    quantile::f_above(a * (1.0 - p) / (p * b), 2.0 * b, 2.0 * a)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn binomial_tails_by_hand() {
        let close = |a: f64, b: f64| assert!((a - b).abs() < 1e-12, "{a} {b}");
        close(at_least(1, 3, 0.5), 7.0 / 8.0);
        close(at_least(2, 3, 0.1), 0.028);
        close(at_least(3, 3, 0.1), 0.001);
        close(at_least(0, 3, 0.1), 1.0);
    }
}
