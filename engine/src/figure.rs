//! A figure with its certainty: estimate, limits, how they were made, and why a number is absent.

use std::borrow::Cow;

use serde::Serialize;

/// How limits were made.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub enum Interval {
    /// From the exact distribution of the estimate.
    #[serde(rename = "exact")]
    Exact,
    /// Modified large sample.
    #[serde(rename = "mls")]
    Mls,
    /// Modified large sample, solved for the ratio at which the difference may be zero.
    #[serde(rename = "mls root")]
    MlsRoot,
    /// Percentiles of seeded draws of the mean squares.
    #[serde(rename = "generalized")]
    Generalized,
    /// Chi-square with approximate degrees of freedom.
    #[serde(rename = "satterthwaite")]
    Satterthwaite,
    /// Percentiles of studies drawn anew from the fitted model.
    #[serde(rename = "bootstrap")]
    Bootstrap,
}

/// The side on which a figure has no limit.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub enum Open {
    /// No upper limit.
    #[serde(rename = "upper")]
    Upper,
}

/// An estimate with two-sided limits and the one-sided lower limit at the same confidence.
///
/// Every number is finite or absent. `why` says in one sentence why a number is absent.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Figure {
    /// The estimate, built from components cut at zero.
    pub estimate: Option<f64>,
    /// Two-sided lower limit.
    pub lower: Option<f64>,
    /// Two-sided upper limit.
    pub upper: Option<f64>,
    /// One-sided lower limit.
    pub at_least: Option<f64>,
    /// How the limits were made.
    pub interval: Option<Interval>,
    /// The side without a limit.
    pub open: Option<Open>,
    /// Why a number is absent.
    pub why: Option<Cow<'static, str>>,
}

/// Limits before they are joined to an estimate; an infinite `upper` means none.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Bounds {
    pub(crate) lower: f64,
    pub(crate) upper: f64,
    pub(crate) at_least: f64,
    pub(crate) interval: Interval,
}

impl Bounds {
    /// Limits of an increasing function of the figure.
    pub(crate) fn rising(self, f: impl Fn(f64) -> f64) -> Bounds {
        Bounds {
            lower: f(self.lower),
            upper: f(self.upper),
            at_least: f(self.at_least),
            ..self
        }
    }
}

impl Figure {
    pub(crate) fn new(estimate: f64, bounds: Bounds) -> Figure {
        let open = !bounds.upper.is_finite();
        Figure {
            estimate: finite(estimate),
            lower: finite(bounds.lower),
            upper: finite(bounds.upper),
            at_least: finite(bounds.at_least),
            interval: Some(bounds.interval),
            open: open.then_some(Open::Upper),
            why: open.then_some(Cow::Borrowed("the data set no upper limit")),
        }
    }

    pub(crate) fn without_limits(estimate: f64, why: impl Into<Cow<'static, str>>) -> Figure {
        Figure {
            estimate: finite(estimate),
            ..Figure::absent(why)
        }
    }

    pub(crate) fn absent(why: impl Into<Cow<'static, str>>) -> Figure {
        Figure {
            estimate: None,
            lower: None,
            upper: None,
            at_least: None,
            interval: None,
            open: None,
            why: Some(why.into()),
        }
    }

    /// The same function, increasing, of the estimate and of every limit.
    pub(crate) fn rising(&self, f: impl Fn(f64) -> f64) -> Figure {
        let f = |x: Option<f64>| x.map(&f).and_then(finite);
        let mut risen = Figure {
            estimate: f(self.estimate),
            lower: f(self.lower),
            upper: f(self.upper),
            at_least: f(self.at_least),
            ..self.clone()
        };
        if risen.why.is_none() && risen.numbers().contains(&None) {
            risen.why = Some(Cow::Borrowed("a number is too large to be written"));
        }
        risen
    }

    fn numbers(&self) -> [Option<f64>; 4] {
        [self.estimate, self.lower, self.upper, self.at_least]
    }

    /// Whether the estimate lies outside its two-sided limits by more than rounding.
    pub(crate) fn contradicts_itself(&self) -> bool {
        const ROUNDING: f64 = 1e-12;
        let Some(estimate) = self.estimate else {
            return false;
        };
        let slack = ROUNDING * estimate.abs();
        self.lower.is_some_and(|l| estimate < l - slack)
            || self.upper.is_some_and(|u| estimate > u + slack)
    }
}

fn finite(x: f64) -> Option<f64> {
    x.is_finite().then_some(x)
}
