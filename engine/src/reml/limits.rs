//! Figures of a fit with their limits.
//!
//! Sums of components: chi-square with the degrees of freedom `2 estimate² / variance`, the variance from the inverse of
//! the expected information (Satterthwaite 1946). With few appraisers these limits lie too close; the gauge's
//! bootstrap limits stand beside them. Ratios of sums: bootstrap.
//!
//! Not here: limits for what the likelihood puts at zero, for which neither method has any.

use std::borrow::Cow;

use crate::figure::{Bounds, Figure, Interval};
use crate::figures::{ALL_EQUAL, GAUGE_ZERO, NOT_APART, ONE_LEVEL};
use crate::quantile::{Side, chi_square};
use crate::record::{Component, Figures, Spread};
use crate::tolerance::Share;

use super::bootstrap::{Drawn, Draws, Quotients};
use super::dense::Matrix;
use super::fit::{Evidence, Fit};
use super::written::GaugeBootstrap;

const AT_ZERO: &str = "the estimate is zero, where approximate limits do not exist";
const REPEATS_EQUAL: &str = "all repeats are equal, so the data set no limits";
const NO_INFORMATION: &str =
    "the information about the components has no inverse, so the data set no limits";
const NOT_DRAWN: &str = "studies of this design could not be drawn anew (too large, or none could be fitted), so there are no bootstrap limits";
const NOTHING_ELSE: &str = "nothing else has an estimate above zero, so the data set no limits";
/// Degrees of freedom for which chi-square quantiles are at hand.
const DF: std::ops::RangeInclusive<f64> = 0.02..=1e6;
const DF_OUT_OF_RANGE: &str =
    "the approximate degrees of freedom leave the range from 0.02 to a million";

/// A fit with what its limits are made from.
pub(super) struct Limits<'a> {
    pub(super) fit: &'a Fit,
    /// Takes variances of the fit to squared reading units.
    pub(super) square: f64,
    pub(super) confidence: f64,
    pub(super) share: &'a Share,
    covariance: Result<Matrix, &'static str>,
    pub(super) draws: Result<Draws, &'static str>,
}

impl<'a> Limits<'a> {
    pub(super) fn new(fit: &'a Fit, scale: f64, confidence: f64, share: &'a Share) -> Limits<'a> {
        let (covariance, draws) = match &fit.evidence {
            Evidence::Summit { blocks, summit } => (
                summit
                    .at
                    .expected
                    .cholesky()
                    .map(|factor| factor.inverse())
                    .ok_or(NO_INFORMATION),
                Draws::new(blocks, &fit.components).ok_or(NOT_DRAWN),
            ),
            Evidence::RepeatsEqual { .. } => (Err(REPEATS_EQUAL), Err(REPEATS_EQUAL)),
            Evidence::AllEqual => (Err(ALL_EQUAL), Err(ALL_EQUAL)),
        };
        Limits {
            fit,
            square: scale * scale,
            confidence,
            share,
            covariance,
            draws,
        }
    }

    fn error(&self) -> usize {
        self.fit.components.len() - 1
    }

    fn reproducibility(&self) -> Vec<usize> {
        self.fit.model.reproducibility().collect()
    }

    fn gauge(&self) -> Vec<usize> {
        self.fit
            .model
            .reproducibility()
            .chain([self.error()])
            .collect()
    }

    fn all(&self) -> Vec<usize> {
        (0..self.fit.components.len()).collect()
    }

    pub(super) fn part_variance(&self) -> Option<f64> {
        let part = self.fit.model.part()?;
        Some(self.fit.components[part] * self.square)
    }

    pub(super) fn gauge_variance(&self) -> Option<f64> {
        self.fit.model.part()?;
        Some(self.sum(&self.gauge()) * self.square)
    }

    fn sum(&self, members: &[usize]) -> f64 {
        members.iter().map(|&i| self.fit.components[i]).sum()
    }

    /// A sum of components, in squared reading units.
    fn variance(&self, members: &[usize]) -> Figure {
        let estimate = self.sum(members);
        match self.satterthwaite(members, estimate) {
            Ok(bounds) => Figure::new(estimate * self.square, bounds.rising(|x| x * self.square)),
            Err(ALL_EQUAL) => Figure::new(
                0.0,
                Bounds {
                    lower: 0.0,
                    upper: 0.0,
                    at_least: 0.0,
                    interval: Interval::Satterthwaite,
                },
            ),
            Err(why) => Figure::without_limits(estimate * self.square, why),
        }
    }

    fn satterthwaite(&self, members: &[usize], estimate: f64) -> Result<Bounds, &'static str> {
        let covariance = self.covariance.as_ref().map_err(|why| *why)?;
        if estimate == 0.0 {
            return Err(AT_ZERO);
        }
        let pairs = members
            .iter()
            .flat_map(|&i| members.iter().map(move |&j| (i, j)));
        let variance: f64 = pairs.map(|place| covariance[place]).sum();
        let df = 2.0 * estimate * estimate / variance;
        if !DF.contains(&df) {
            return Err(DF_OUT_OF_RANGE);
        }
        let alpha = 1.0 - self.confidence;
        let limit = |side, a| df * estimate / chi_square(side, a, df);
        Ok(Bounds {
            lower: limit(Side::Above, alpha / 2.0),
            upper: limit(Side::Below, alpha / 2.0),
            at_least: limit(Side::Above, alpha),
            interval: Interval::Satterthwaite,
        })
    }

    pub(super) fn components(&self) -> Vec<Component> {
        let component = |(i, line): (usize, &crate::model::Line)| {
            let variance = self.variance(&[i]);
            Component {
                name: Cow::Owned(line.name.clone()),
                of: line.of.clone(),
                within: line.within.clone(),
                raw: self.fit.components[i] * self.square,
                sd: variance.rising(f64::sqrt),
                variance,
            }
        };
        self.fit
            .model
            .lines()
            .iter()
            .enumerate()
            .map(component)
            .collect()
    }

    pub(super) fn figures(&self) -> Figures {
        let part = self.fit.model.part();
        let apart = |members: Vec<usize>| part.map(|_| members).ok_or(NOT_APART);
        let reproducibility = self.reproducibility();
        let reproducibility = if reproducibility.is_empty() {
            Err(ONE_LEVEL)
        } else {
            Ok(reproducibility)
        };
        Figures {
            repeatability: self.spread(apart(vec![self.error()])),
            reproducibility: self.spread(reproducibility),
            gauge: self.spread(apart(self.gauge())),
            part: self.spread(part.map(|part| vec![part]).ok_or(NOT_APART)),
            total: self.spread(Ok(self.all())),
        }
    }

    fn spread(&self, members: Result<Vec<usize>, &'static str>) -> Spread {
        let members = match members {
            Ok(members) => members,
            Err(why) => {
                return Spread {
                    variance: Figure::absent(why),
                    sd: Figure::absent(why),
                    share_of_tolerance: Figure::absent(why),
                    share_of_tv: Figure::absent(why),
                };
            }
        };
        let variance = self.variance(&members);
        let sd = variance.rising(f64::sqrt);
        Spread {
            share_of_tolerance: self.share_of_tolerance(&members, &sd),
            share_of_tv: self.share_of_total(&members),
            variance,
            sd,
        }
    }

    /// A mean that the study estimates makes the share uncertain too; then its limits are by bootstrap.
    fn share_of_tolerance(&self, members: &[usize], sd: &Figure) -> Figure {
        match &self.share.per_sd {
            Err(why) => Figure::absent(why.clone()),
            Ok(_) if self.all_equal() => Figure::absent(ALL_EQUAL),
            Ok(_) if self.share.from_estimated_mean.is_some() => self.share_by_bootstrap(members),
            Ok(per_sd) => sd.rising(|sd| sd * per_sd),
        }
    }

    /// The share of tolerance of a sum of components, with bootstrap limits.
    fn share_by_bootstrap(&self, members: &[usize]) -> Figure {
        let per_sd = match &self.share.per_sd {
            Err(why) => return Figure::absent(why.clone()),
            Ok(_) if self.all_equal() => return Figure::absent(ALL_EQUAL),
            Ok(per_sd) => per_sd,
        };
        let estimate = (self.sum(members) * self.square).sqrt() * per_sd;
        match self.share_quotients(members) {
            Ok(quotients) => Figure::new(estimate, self.bootstrap(estimate, &quotients)),
            Err(why) => Figure::without_limits(estimate, why),
        }
    }

    fn share_quotients(&self, members: &[usize]) -> Result<Quotients, &'static str> {
        let draws = self.draws.as_ref().map_err(|why| *why)?;
        let estimate = self.sum(members).sqrt();
        if estimate == 0.0 {
            return Err(AT_ZERO);
        }
        let sd = |drawn: &Drawn| {
            members
                .iter()
                .map(|&i| drawn.components[i])
                .sum::<f64>()
                .sqrt()
        };
        Ok(match &self.share.from_estimated_mean {
            None => draws.of(sd, estimate),
            Some(from) => {
                let scale = self.square.sqrt();
                let share =
                    |sd: f64, mean: f64| from.share(sd * scale, self.fit.mean + mean * scale);
                draws.of(|drawn| share(sd(drawn), drawn.mean), share(estimate, 0.0))
            }
        })
    }

    fn share_of_total(&self, members: &[usize]) -> Figure {
        if self.all_equal() {
            return Figure::absent(ALL_EQUAL);
        }
        let rest: Vec<usize> = self
            .all()
            .into_iter()
            .filter(|i| !members.contains(i))
            .collect();
        if rest.is_empty() {
            return Figure::new(
                1.0,
                Bounds {
                    lower: 1.0,
                    upper: 1.0,
                    at_least: 1.0,
                    interval: Interval::Exact,
                },
            );
        }
        let of_total = |ratio: f64| {
            if ratio.is_infinite() {
                1.0
            } else {
                (ratio / (1.0 + ratio)).sqrt()
            }
        };
        let estimate = (self.sum(members) / self.sum(&self.all())).sqrt();
        match self.ratio(members, &rest) {
            Ok(bounds) => Figure::new(estimate, bounds.rising(of_total)),
            Err(why) => Figure::without_limits(estimate, why),
        }
    }

    pub(super) fn part_to_gauge(&self) -> Figure {
        if self.all_equal() {
            return Figure::absent(ALL_EQUAL);
        }
        let Some(part) = self.fit.model.part() else {
            return Figure::absent(NOT_APART);
        };
        let gauge = self.sum(&self.gauge());
        if gauge == 0.0 {
            return Figure::absent(GAUGE_ZERO);
        }
        let estimate = self.fit.components[part] / gauge;
        match self.ratio(&[part], &self.gauge()) {
            Ok(bounds) => Figure::new(estimate, bounds),
            Err(why) => Figure::without_limits(estimate, why),
        }
    }

    /// Bootstrap limits of the ratio of two sums of components.
    fn ratio(&self, above: &[usize], below: &[usize]) -> Result<Bounds, &'static str> {
        let draws = self.draws.as_ref().map_err(|why| *why)?;
        let estimate = self.sum(above) / self.sum(below);
        if self.sum(below) == 0.0 {
            return Err(NOTHING_ELSE);
        }
        if estimate == 0.0 {
            return Err(AT_ZERO);
        }
        let sum = |drawn: &Drawn, members: &[usize]| -> f64 {
            members.iter().map(|&i| drawn.components[i]).sum()
        };
        let quotients = draws.of(|drawn| sum(drawn, above) / sum(drawn, below), estimate);
        Ok(self.bootstrap(estimate, &quotients))
    }

    /// The gauge share of the drawn studies over its estimate.
    pub(super) fn gauge_quotients(&self) -> Result<Quotients, &'static str> {
        self.share_quotients(&self.gauge())
    }

    /// Limits of a figure from its quotients.
    pub(super) fn bootstrap(&self, estimate: f64, quotients: &Quotients) -> Bounds {
        let alpha = 1.0 - self.confidence;
        let limit = |probability| estimate / quotients.percentile(probability);
        Bounds {
            lower: limit(1.0 - alpha / 2.0),
            upper: limit(alpha / 2.0),
            at_least: limit(1.0 - alpha),
            interval: Interval::Bootstrap,
        }
    }

    /// Gauge variance, sd and share of tolerance with bootstrap limits.
    pub(super) fn gauge_by_bootstrap(&self) -> Option<GaugeBootstrap> {
        let draws = self.draws.as_ref().ok()?;
        let estimate = self.gauge_variance()?;
        let gauge = self.gauge();
        let sd = |drawn: &Drawn| {
            gauge
                .iter()
                .map(|&i| drawn.components[i])
                .sum::<f64>()
                .sqrt()
        };
        let quotients = draws.of(sd, self.sum(&gauge).sqrt());
        let bounds = self.bootstrap(estimate.sqrt(), &quotients);
        Some(GaugeBootstrap {
            variance: Figure::new(estimate, bounds.rising(|sd| sd * sd)),
            sd: Figure::new(estimate.sqrt(), bounds),
            share_of_tolerance: self.share_by_bootstrap(&gauge),
        })
    }

    pub(super) fn all_equal(&self) -> bool {
        matches!(self.fit.evidence, Evidence::AllEqual)
    }
}
