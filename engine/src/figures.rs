//! Figures with their limits, from mean squares.
//!
//! Variances: exact for repeatability, modified large sample for the rest, cut at zero. Shares of the total
//! spread, ndc and the ratio of part to gauge: limits of a ratio of two variances, exact with one term,
//! otherwise by the root method.

use std::borrow::Cow;

use crate::basis::Basis;
use crate::chance;
use crate::estimates::Estimates;
use crate::figure::{Bounds, Figure, Interval};
use crate::limits::{MANY_CROSSED, RatioBounds, figure};
use crate::linear::{Linear, Pair};
use crate::mls::Scale;
use crate::percentile::BLOCK;
use crate::record::{Component, Figures, Ndc, Spread};
use crate::tolerance::{FromMean, Share};

pub(crate) const ALL_EQUAL: &str = "all readings are equal";
pub(crate) const ONE_LEVEL: &str = "the design has no factor beside the part with two or more levels, so reproducibility cannot be seen";
pub(crate) const NOT_APART: &str =
    "with one trial a part's spread and the gauge's cannot be told apart";
pub(crate) const GAUGE_ZERO: &str = "the gauge variance is zero";
/// The handbooks' factor; √2 is 0.3 % larger.
const NDC_FACTOR: f64 = 1.41;

/// One study's numbers, ready for figures.
pub(crate) struct Evidence<'a> {
    pub(crate) basis: &'a Basis,
    pub(crate) ms: &'a [f64],
    pub(crate) scale: Scale,
    /// The components of all lines as they are.
    pub(crate) raw: &'a [f64],
    pub(crate) estimates: Estimates,
    pub(crate) share: &'a Share,
    pub(crate) confidence: f64,
    pub(crate) all_equal: bool,
    pub(crate) grand_mean: f64,
}

/// Which side of a ratio a variance stands on in its share of the total.
enum As {
    Numerator,
    Denominator,
}

impl Evidence<'_> {
    pub(crate) fn components(&self) -> Vec<Component> {
        let model = &self.basis.model;
        let component = |(i, line): (usize, &crate::model::Line)| {
            let variance = self.variance(&self.basis.components[i], self.raw[i].max(0.0));
            Component {
                name: Cow::Owned(line.name.clone()),
                of: line.of.clone(),
                within: line.within.clone(),
                raw: self.raw[i],
                sd: variance.rising(f64::sqrt),
                variance,
            }
        };
        model.lines().iter().enumerate().map(component).collect()
    }

    pub(crate) fn figures(&self) -> Figures {
        let q = &self.basis.quantities;
        let e = &self.estimates;
        let share_of_tv = ShareOfTv { evidence: self };
        Figures {
            repeatability: self.spread(
                q.repeatability.as_ref(),
                e.repeatability,
                NOT_APART,
                share_of_tv.repeatability(),
            ),
            reproducibility: self.spread(
                q.reproducibility.as_ref(),
                e.reproducibility,
                ONE_LEVEL,
                share_of_tv.reproducibility(),
            ),
            gauge: self.spread(q.gauge.as_ref(), e.gauge, NOT_APART, share_of_tv.gauge()),
            part: self.spread(q.part.as_ref(), e.part, NOT_APART, share_of_tv.part()),
            total: self.spread(
                Some(&q.total),
                Some(e.total),
                NOT_APART,
                share_of_tv.total(),
            ),
        }
    }

    pub(crate) fn part_to_gauge(&self) -> Figure {
        if self.all_equal {
            return Figure::absent(ALL_EQUAL);
        }
        let (Some(part), Some(gauge)) = (self.estimates.part, self.estimates.gauge) else {
            return Figure::absent(NOT_APART);
        };
        if gauge == 0.0 {
            return Figure::absent(GAUGE_ZERO);
        }
        let bounds = self.part_over_gauge();
        figure(
            part / gauge,
            bounds.map(|r| Bounds {
                lower: r.two_sided.0,
                upper: r.two_sided.1,
                at_least: r.one_sided.0,
                interval: r.interval,
            }),
        )
    }

    /// The one-sided lower limit of the gauge share at the confidence that judges.
    pub(crate) fn judged_lower(&self, confidence: f64) -> Option<f64> {
        let limit = self.basis.judging.as_ref()?;
        let gauge = self.basis.quantities.gauge.as_ref()?;
        let per_sd = self
            .share
            .per_sd
            .as_ref()
            .ok()
            .filter(|_| !self.all_equal)?;
        if let Some(from) = &self.share.from_estimated_mean {
            self.check_crossed().ok()?;
            let [at_least] = self.draws().percentiles([1.0 - confidence], |first, out| {
                self.shares_of_distance(gauge, from, first, out);
            });
            return Some(at_least).filter(|x| x.is_finite());
        }
        if gauge.is_error && self.ms[self.ms.len() - 1] <= 0.0 {
            return None;
        }
        Some(limit.at(self.ms).max(0.0).sqrt() * per_sd)
    }

    /// The chance that the gauge share lies above each of some limits.
    pub(crate) fn chances_above<const N: usize>(&self, limits: [f64; N]) -> [Option<f64>; N] {
        let (Ok(per_sd), Some(gauge)) = (&self.share.per_sd, &self.basis.quantities.gauge) else {
            return [None; N];
        };
        if gauge.sum.is_zero(self.ms) {
            return [None; N];
        }
        let Some(from) = &self.share.from_estimated_mean else {
            let above = |limit: f64| {
                let variance = (limit / per_sd).powi(2);
                chance::above(variance, &gauge.weights, &self.basis.df, self.ms)
            };
            return limits.map(|limit| Some(above(limit)));
        };
        if self.check_crossed().is_err() {
            return [None; N];
        }
        let shares = self
            .draws()
            .all(|first, out| self.shares_of_distance(gauge, from, first, out));
        let above = |limit: f64| shares.iter().filter(|&&share| share > limit).count();
        limits.map(|limit| Some(above(limit) as f64 / shares.len() as f64))
    }

    fn spread(
        &self,
        figure: Option<&Linear>,
        estimate: Option<f64>,
        absent: &'static str,
        share_of_tv: Figure,
    ) -> Spread {
        let variance = match (figure, estimate) {
            (Some(figure), Some(estimate)) => self.variance(figure, estimate),
            _ => Figure::absent(absent),
        };
        let sd = variance.rising(f64::sqrt);
        let share_of_tolerance = match &self.share.per_sd {
            _ if variance.estimate.is_none() => Figure::absent(absent),
            Err(why) => Figure::absent(why.clone()),
            Ok(_) if self.all_equal => Figure::absent(ALL_EQUAL),
            Ok(per_sd) => match (self.share.from_estimated_mean, figure) {
                (Some(from), Some(figure)) => {
                    self.share_of_distance(&variance, figure, *per_sd, &from)
                }
                _ => sd.rising(|sd| sd * per_sd),
            },
        };
        Spread {
            variance,
            sd,
            share_of_tolerance,
            share_of_tv,
        }
    }

    /// A share whose limits hold the uncertainty of the mean too.
    fn share_of_distance(
        &self,
        variance: &Figure,
        of: &Linear,
        per_sd: f64,
        from: &FromMean,
    ) -> Figure {
        let estimate = variance.estimate.unwrap_or_default().sqrt() * per_sd;
        match (&variance.why, variance.interval) {
            (Some(why), None) => Figure::without_limits(estimate, why.clone()),
            _ => figure(
                estimate,
                self.check_crossed().map(|()| {
                    self.percentiles(|first, out| self.shares_of_distance(of, from, first, out))
                }),
            ),
        }
    }

    /// Whether simulated limits hold their confidence in this design.
    fn check_crossed(&self) -> Result<(), &'static str> {
        if self.basis.model.crossed() > 2 {
            return Err(MANY_CROSSED);
        }
        Ok(())
    }

    /// Draws of the share of a distance from an estimated mean, from the `first` on.
    fn shares_of_distance(&self, of: &Linear, from: &FromMean, first: usize, out: &mut [f64]) {
        let draws = self.draws();
        let its_variance = &self.basis.variance_of_mean;
        let mut means = [0.0; BLOCK];
        let means = &mut means[..out.len()];
        draws.variance(&of.weights, self.ms, first, out);
        draws.mean(self.grand_mean, its_variance, self.ms, first, means);
        for (share, mean) in out.iter_mut().zip(means) {
            *share = from.share(share.sqrt(), *mean);
        }
    }

    fn variance(&self, of: &Linear, estimate: f64) -> Figure {
        let bounds = self.limits_of_sum(of, self.usual(of));
        figure(estimate, bounds.map(|b| b.rising(|x| x.max(0.0))))
    }

    /// Limits of the ratio of two variances, by the method that it is reported with.
    fn ratio(
        &self,
        pair: Option<&Pair>,
        absent: &'static str,
    ) -> Result<RatioBounds, &'static str> {
        let by = match self.basis.model.lines() {
            [_, _] => Interval::Exact,
            _ => Interval::MlsRoot,
        };
        self.limits_of_ratio(pair.ok_or(absent)?, by)
    }

    fn part_over_gauge(&self) -> Result<RatioBounds, &'static str> {
        self.ratio(self.basis.ratios.part_to_gauge.as_ref(), NOT_APART)
    }
}

/// Categories from the ratio of part to gauge variance.
pub(crate) fn ndc(part_to_gauge: &Figure) -> Ndc {
    let categories = |ratio: Option<f64>| ratio.map(|r| (2.0 * r).sqrt());
    Ndc {
        whole: part_to_gauge
            .estimate
            .map(|r| (NDC_FACTOR * r.sqrt()).floor() as u64),
        estimate: categories(part_to_gauge.estimate),
        lower: categories(part_to_gauge.lower),
        upper: categories(part_to_gauge.upper),
    }
}

/// sd of one source over the sd of the total.
struct ShareOfTv<'a> {
    evidence: &'a Evidence<'a>,
}

impl ShareOfTv<'_> {
    fn repeatability(&self) -> Figure {
        let pair = self.evidence.basis.ratios.rest_to_repeatability.as_ref();
        self.figure(
            self.evidence.estimates.repeatability,
            NOT_APART,
            As::Denominator,
            || self.evidence.ratio(pair, NOT_APART),
        )
    }

    fn reproducibility(&self) -> Figure {
        let pair = self.evidence.basis.ratios.reproducibility_to_rest.as_ref();
        self.figure(
            self.evidence.estimates.reproducibility,
            ONE_LEVEL,
            As::Numerator,
            || self.evidence.ratio(pair, ONE_LEVEL),
        )
    }

    fn gauge(&self) -> Figure {
        self.figure(
            self.evidence.estimates.gauge,
            NOT_APART,
            As::Denominator,
            || self.evidence.part_over_gauge(),
        )
    }

    fn part(&self) -> Figure {
        self.figure(
            self.evidence.estimates.part,
            NOT_APART,
            As::Numerator,
            || self.evidence.part_over_gauge(),
        )
    }

    fn total(&self) -> Figure {
        if self.evidence.all_equal {
            return Figure::absent(ALL_EQUAL);
        }
        Figure::new(
            1.0,
            Bounds {
                lower: 1.0,
                upper: 1.0,
                at_least: 1.0,
                interval: Interval::Exact,
            },
        )
    }

    fn figure(
        &self,
        variance: Option<f64>,
        absent: &'static str,
        place: As,
        ratio: impl Fn() -> Result<RatioBounds, &'static str>,
    ) -> Figure {
        if self.evidence.all_equal {
            return Figure::absent(ALL_EQUAL);
        }
        let Some(variance) = variance else {
            return Figure::absent(absent);
        };
        let estimate = (variance / self.evidence.estimates.total).sqrt();
        let bounds = ratio().map(|r| {
            let ((lower, upper), (one_lower, one_upper)) = (r.two_sided, r.one_sided);
            match place {
                As::Numerator => Bounds {
                    lower: of_numerator(lower),
                    upper: of_numerator(upper),
                    at_least: of_numerator(one_lower),
                    interval: r.interval,
                },
                As::Denominator => Bounds {
                    lower: of_denominator(upper),
                    upper: of_denominator(lower),
                    at_least: of_denominator(one_upper),
                    interval: r.interval,
                },
            }
        });
        figure(estimate, bounds)
    }
}

/// `√(R / (1 + R))`, 1 for an infinite ratio.
fn of_numerator(ratio: f64) -> f64 {
    if ratio.is_infinite() {
        1.0
    } else {
        (ratio / (1.0 + ratio)).sqrt()
    }
}

/// `√(1 / (1 + R))`.
fn of_denominator(ratio: f64) -> f64 {
    (1.0 / (1.0 + ratio)).sqrt()
}
