//! Limits of a figure, by any method that fits: one interface, and the method that each figure is reported with.
//!
//! | figure | reported by |
//! |---|---|
//! | a single mean square (repeatability) | exact |
//! | components, reproducibility, gauge, part, total: variance, sd, share of a tolerance | modified large sample |
//! | part over gauge, shares of the total, ndc | exact with one term, else the root method |
//! | share of the distance from an estimated mean, risks, ratio of two studies | generalized |
//!
//! From mean squares Satterthwaite's limits are for comparison and never reported: for a gauge with three appraisers its
//! 95 % limits hold the truth in 82 % of studies when appraisers dominate. Generalized limits cover too seldom with
//! three or more factors crossed, and are then reported for nothing.
//!
//! Sources: Satterthwaite, *Biometrics Bulletin* 2 (1946) 110–114; the others stand in the modules of the methods.

use crate::figure::{Bounds, Figure, Interval};
use crate::figures::Evidence;
use crate::generalized::Draws;
use crate::linear::{Linear, Pair};
use crate::mls::Limit;
use crate::percentile::BLOCK;
use crate::quantile::{ChiSquareByDf, Side, f};

pub(crate) const MANY_CROSSED: &str =
    "simulated limits hold their confidence only with fewer than three factors crossed";
const NOT_EXACT: &str = "a sum of several mean squares has no exact limits";
const NOT_POSITIVE: &str = "the estimate is not above zero, so the method sets no limits";
const FEW_DF: &str =
    "the approximate degrees of freedom are below 0.02, so the method sets no limits";
const NOT_FOR_THIS: &str = "the method does not apply to this figure";
const NO_REPEATS: &str = "the mean square within cells is zero, so the data set no limits";
const REST_ZERO: &str =
    "the rest of the variance has no estimate above zero, so the data set no limits";
/// Degrees of freedom below which the quantiles of chi-square leave the range of f64.
const DF_LEAST: f64 = 0.02;

/// A figure whose limits can be asked for by method.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Quantity {
    /// Variance of repeats.
    Repeatability,
    /// Variance of everything but repeats and parts.
    Reproducibility,
    /// Variance of both together.
    Gauge,
    /// Variance of the parts.
    Part,
    /// Variance of all.
    Total,
    /// Part variance over gauge variance.
    PartToGauge,
}

/// Limits of a ratio of two variances, two-sided and one-sided, each lower then upper.
#[derive(Debug, Clone, Copy)]
pub(crate) struct RatioBounds {
    pub(crate) two_sided: (f64, f64),
    pub(crate) one_sided: (f64, f64),
    pub(crate) interval: Interval,
}

/// Limits with half of what they leave out on either side, or one limit with all of it beyond.
#[derive(Debug, Clone, Copy)]
enum Sided {
    Two,
    One,
}

impl Evidence<'_> {
    /// The figure with limits by a stated method instead of the one it is reported with.
    pub(crate) fn figure_by(&self, quantity: Quantity, by: Interval) -> Option<Figure> {
        let (q, e) = (&self.basis.quantities, &self.estimates);
        let sum = |c: Option<&Linear>, estimate: Option<f64>| {
            let limits = self.limits_of_sum(c?, by);
            Some(figure(estimate?, limits.map(|b| b.rising(|x| x.max(0.0)))))
        };
        match quantity {
            Quantity::Repeatability => sum(q.repeatability.as_ref(), e.repeatability),
            Quantity::Reproducibility => sum(q.reproducibility.as_ref(), e.reproducibility),
            Quantity::Gauge => sum(q.gauge.as_ref(), e.gauge),
            Quantity::Part => sum(q.part.as_ref(), e.part),
            Quantity::Total if by == Interval::Generalized => Some(figure(
                e.total,
                Ok(self.percentiles(|first, out| self.drawn_total(first, out))),
            )),
            Quantity::Total => sum(Some(&q.total), Some(e.total)),
            Quantity::PartToGauge => {
                let ratio = self.limits_of_ratio(self.basis.ratios.part_to_gauge.as_ref()?, by);
                let bounds = ratio.map(|r| Bounds {
                    lower: r.two_sided.0,
                    upper: r.two_sided.1,
                    at_least: r.one_sided.0,
                    interval: r.interval,
                });
                Some(figure(e.part? / e.gauge?, bounds))
            }
        }
    }

    /// Two-sided limits alone, at zero or above; an infinite upper one means none.
    pub(crate) fn two_sided(&self, quantity: Quantity, by: Interval) -> Option<(f64, f64)> {
        let q = &self.basis.quantities;
        let figure = match quantity {
            Quantity::Repeatability => q.repeatability.as_ref()?,
            Quantity::Reproducibility => q.reproducibility.as_ref()?,
            Quantity::Gauge => q.gauge.as_ref()?,
            Quantity::Part => q.part.as_ref()?,
            Quantity::Total => &q.total,
            Quantity::PartToGauge => {
                let pair = self.basis.ratios.part_to_gauge.as_ref()?;
                return self.limits_of_ratio_at(pair, by, Sided::Two).ok();
            }
        };
        let total = quantity == Quantity::Total;
        let (lower, upper) = match by {
            Interval::Generalized if total => {
                self.drawn(|first, out| self.drawn_total(first, out), Sided::Two)
            }
            _ => self.two_sided_of_sum(figure, by).ok()?,
        };
        Some((lower.max(0.0), upper.max(0.0)))
    }

    /// The method that limits of a sum of mean squares are reported by.
    pub(crate) fn usual(&self, figure: &Linear) -> Interval {
        if figure.is_error {
            Interval::Exact
        } else {
            Interval::Mls
        }
    }

    /// Limits of a sum of mean squares; those of the exact and the linear methods may be below zero.
    pub(crate) fn limits_of_sum(
        &self,
        figure: &Linear,
        by: Interval,
    ) -> Result<Bounds, &'static str> {
        if by == Interval::Generalized {
            let drawn = |first: usize, out: &mut [f64]| self.drawn_sum(figure, first, out);
            return Ok(self.percentiles(drawn));
        }
        let (lower, upper) = self.two_sided_of_sum(figure, by)?;
        let at_least = match by {
            Interval::Satterthwaite => {
                let (value, df) = self.matched(figure)?;
                df * value / self.basis.matched().at_least.at(df)
            }
            _ => figure.at_least.scaled(self.ms, self.scale),
        };
        Ok(Bounds {
            lower,
            upper,
            at_least,
            interval: by,
        })
    }

    fn two_sided_of_sum(&self, figure: &Linear, by: Interval) -> Result<(f64, f64), &'static str> {
        match by {
            // Of the error alone the modified-large-sample limits are the exact ones.
            Interval::Exact if !figure.is_error => Err(NOT_EXACT),
            Interval::Exact if self.ms[self.ms.len() - 1] == 0.0 && !self.all_equal => {
                Err(NO_REPEATS)
            }
            Interval::Exact | Interval::Mls => {
                let limit = |limit: &Limit| limit.scaled(self.ms, self.scale);
                Ok((limit(&figure.lower), limit(&figure.upper)))
            }
            Interval::Satterthwaite => {
                let (value, df) = self.matched(figure)?;
                let quantiles = self.basis.matched();
                let limit = |quantile: &ChiSquareByDf| df * value / quantile.at(df);
                Ok((limit(&quantiles.lower), limit(&quantiles.upper)))
            }
            Interval::Generalized => {
                Ok(self.drawn(|first, out| self.drawn_sum(figure, first, out), Sided::Two))
            }
            Interval::MlsRoot | Interval::Bootstrap => Err(NOT_FOR_THIS),
        }
    }

    /// Limits of a ratio of two variances, at zero or above; an infinite one means none.
    pub(crate) fn limits_of_ratio(
        &self,
        pair: &Pair,
        by: Interval,
    ) -> Result<RatioBounds, &'static str> {
        Ok(RatioBounds {
            two_sided: self.limits_of_ratio_at(pair, by, Sided::Two)?,
            one_sided: self.limits_of_ratio_at(pair, by, Sided::One)?,
            interval: by,
        })
    }

    fn limits_of_ratio_at(
        &self,
        pair: &Pair,
        by: Interval,
        sided: Sided,
    ) -> Result<(f64, f64), &'static str> {
        match (by, self.basis.model.lines()) {
            (Interval::Exact, [term, _]) => {
                let readings_per_level = self.basis.model.readings() / term.cells;
                self.ratio_to_error(readings_per_level, self.tail(sided))
            }
            (Interval::Exact, _) => Err(NOT_EXACT),
            (Interval::MlsRoot, _) => {
                let ratio = match sided {
                    Sided::Two => &pair.two_sided,
                    Sided::One => &pair.one_sided,
                };
                ratio.limits(self.ms).ok_or(REST_ZERO)
            }
            (Interval::Generalized, _) => {
                Ok(self.drawn(|first, out| self.drawn_ratio(pair, first, out), sided))
            }
            (Interval::Mls | Interval::Satterthwaite | Interval::Bootstrap, _) => Err(NOT_FOR_THIS),
        }
    }

    /// Probability beyond each limit.
    fn tail(&self, sided: Sided) -> f64 {
        let alpha = 1.0 - self.confidence;
        match sided {
            Sided::Two => alpha / 2.0,
            Sided::One => alpha,
        }
    }

    /// Lower and upper percentile of draws.
    fn drawn(&self, fill: impl FnMut(usize, &mut [f64]), sided: Sided) -> (f64, f64) {
        let tail = self.tail(sided);
        let [lower, upper] = self.draws().percentiles([tail, 1.0 - tail], fill);
        (lower, upper)
    }

    fn drawn_sum(&self, figure: &Linear, first: usize, out: &mut [f64]) {
        self.draws().variance(&figure.weights, self.ms, first, out);
    }

    /// Limits from draws of the figure itself.
    pub(crate) fn percentiles(&self, fill: impl FnMut(usize, &mut [f64])) -> Bounds {
        let alpha = 1.0 - self.confidence;
        let ends = [alpha / 2.0, 1.0 - alpha / 2.0, alpha];
        let [lower, upper, at_least] = self.draws().percentiles(ends, fill);
        Bounds {
            lower,
            upper,
            at_least,
            interval: Interval::Generalized,
        }
    }

    fn drawn_ratio(&self, pair: &Pair, first: usize, out: &mut [f64]) {
        let draws = self.draws();
        let mut divisors = [0.0; BLOCK];
        let divisors = &mut divisors[..out.len()];
        draws.variance(&pair.numerator, self.ms, first, out);
        draws.divisor(&pair.denominator, self.ms, first, divisors);
        for (x, divisor) in out.iter_mut().zip(divisors) {
            *x = if *x == 0.0 {
                0.0
            } else {
                *x / divisor.max(0.0)
            };
        }
    }

    /// Gauge and part added in every draw, each cut by itself.
    fn drawn_total(&self, first: usize, out: &mut [f64]) {
        let (draws, q) = (self.draws(), &self.basis.quantities);
        let (Some(gauge), Some(part)) = (&q.gauge, &q.part) else {
            return draws.variance(&q.total.weights, self.ms, first, out);
        };
        let mut parts = [0.0; BLOCK];
        let parts = &mut parts[..out.len()];
        draws.divisor(&gauge.weights, self.ms, first, out);
        draws.variance(&part.weights, self.ms, first, parts);
        for (sum, part) in out.iter_mut().zip(parts) {
            *sum += *part;
        }
    }

    pub(crate) fn draws(&self) -> &Draws {
        self.basis.draws()
    }

    /// The value of a sum and the degrees of freedom of the chi-square that matches it.
    fn matched(&self, figure: &Linear) -> Result<(f64, f64), &'static str> {
        let value = figure.sum.value(self.ms);
        if value <= 0.0 {
            return Err(NOT_POSITIVE);
        }
        let pieces = figure.weights.iter().zip(self.ms).zip(&self.basis.df);
        let pieces = pieces.map(|((c, ms), n)| (c * ms / value).powi(2) / n);
        let df = 1.0 / pieces.sum::<f64>();
        if df < DF_LEAST {
            return Err(FEW_DF);
        }
        Ok((value, df))
    }

    /// The exact limits of `variance of the only term / variance of the error`.
    fn ratio_to_error(
        &self,
        readings_per_level: usize,
        tail: f64,
    ) -> Result<(f64, f64), &'static str> {
        if self.ms[1] <= 0.0 {
            return Err(REST_ZERO);
        }
        let (n, m) = (self.basis.df[0], self.basis.df[1]);
        let observed = self.ms[0] / self.ms[1];
        let limit =
            |side| ((observed / f(side, tail, n, m) - 1.0) / readings_per_level as f64).max(0.0);
        Ok((limit(Side::Above), limit(Side::Below)))
    }
}

pub(crate) fn figure(estimate: f64, bounds: Result<Bounds, &'static str>) -> Figure {
    match bounds {
        Ok(bounds) => Figure::new(estimate, bounds),
        Err(why) => Figure::without_limits(estimate, why),
    }
}
