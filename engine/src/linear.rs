//! Figures that are sums or ratios of mean squares, with everything about their limits that the readings do not change.

use crate::combination::{Combination, Ready};
use crate::mls::{Constants, Limit, Ratio};

/// A sum of mean squares with its modified-large-sample limits.
#[derive(Debug, Clone)]
pub(crate) struct Linear {
    pub(crate) sum: Ready,
    pub(crate) weights: Vec<f64>,
    pub(crate) lower: Limit,
    pub(crate) upper: Limit,
    /// One-sided, at the same confidence.
    pub(crate) at_least: Limit,
    /// Whether it is the last mean square alone and as it is.
    pub(crate) is_error: bool,
}

impl Linear {
    pub(crate) fn new(sum: Combination, two_sided: &Constants, one_sided: &Constants) -> Linear {
        let weights = sum.weights();
        let error = weights.len() - 1;
        Linear {
            lower: two_sided.lower_limit(&weights),
            upper: two_sided.upper_limit(&weights),
            at_least: one_sided.lower_limit(&weights),
            is_error: sum.members().eq([error]) && weights[error] == 1.0,
            sum: Ready::from(&sum),
            weights,
        }
    }
}

/// The ratio of two sums of mean squares with its limits by the root method.
#[derive(Debug, Clone)]
pub(crate) struct Pair {
    pub(crate) numerator: Vec<f64>,
    pub(crate) denominator: Vec<f64>,
    pub(crate) two_sided: Ratio,
    pub(crate) one_sided: Ratio,
}

impl Pair {
    pub(crate) fn new(
        numerator: &Combination,
        denominator: &Combination,
        two_sided: &Constants,
        one_sided: &Constants,
    ) -> Pair {
        let (numerator, denominator) = (numerator.weights(), denominator.weights());
        Pair {
            two_sided: Ratio::new(two_sided, &numerator, &denominator),
            one_sided: Ratio::new(one_sided, &numerator, &denominator),
            numerator,
            denominator,
        }
    }
}
