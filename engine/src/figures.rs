//! Figures with their limits, from mean squares.
//!
//! Variances: exact for repeatability, modified large sample for the rest, cut at zero. Shares of the total
//! spread, ndc and the ratio of part to gauge: limits of a ratio of two variances, exact with one term,
//! otherwise by the root method.

use std::borrow::Cow;

use crate::basis::Basis;
use crate::combination::Combination;
use crate::estimates::Estimates;
use crate::figure::{Bounds, Figure, Interval};
use crate::mls::Constants;
use crate::quantile::{Side, chi_square, f};
use crate::record::{Component, Figures, Ndc, Spread};
use crate::tolerance::Share;

const ALL_EQUAL: &str = "all readings are equal";
const ONE_LEVEL: &str = "the design has no factor beside the part with two or more levels, so reproducibility cannot be seen";
const NOT_APART: &str = "with one trial a part's spread and the gauge's cannot be told apart";
const NO_REPEATS: &str = "the mean square within cells is zero, so the data set no limits";
const GAUGE_ZERO: &str = "the gauge variance is zero";
const REST_ZERO: &str =
    "the rest of the variance has no estimate above zero, so the data set no limits";
/// The handbooks' factor; √2 is 0.3 % larger.
const NDC_FACTOR: f64 = 1.41;

/// One study's numbers, ready for figures.
pub(crate) struct Evidence<'a> {
    pub(crate) basis: &'a Basis,
    pub(crate) ms: &'a [f64],
    pub(crate) estimates: &'a Estimates,
    pub(crate) share: &'a Share,
    pub(crate) confidence: f64,
    pub(crate) all_equal: bool,
}

/// Limits of a ratio of two variances, two-sided and one-sided.
#[derive(Debug, Clone, Copy)]
struct RatioBounds {
    two_sided: (f64, f64),
    one_sided: (f64, f64),
    interval: Interval,
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
            let variance = self.variance(&model.component(i), self.estimates.raw[i].max(0.0));
            Component {
                name: Cow::Owned(line.name.clone()),
                of: line.of.clone(),
                within: line.within.clone(),
                raw: self.estimates.raw[i],
                sd: variance.rising(f64::sqrt),
                variance,
            }
        };
        model.lines().iter().enumerate().map(component).collect()
    }

    pub(crate) fn figures(&self) -> Figures {
        let q = &self.basis.quantities;
        let e = self.estimates;
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
        with_limits(
            part / gauge,
            bounds.map(|r| Bounds {
                lower: r.two_sided.0,
                upper: r.two_sided.1,
                at_least: r.one_sided.0,
                interval: r.interval,
            }),
        )
    }

    pub(crate) fn ndc(&self, part_to_gauge: &Figure) -> Ndc {
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

    /// The one-sided lower limit of the gauge share at the confidence that judges.
    pub(crate) fn judged_lower(&self) -> Option<f64> {
        let constants = self.basis.judging.as_ref()?;
        let gauge = self.basis.quantities.gauge.as_ref()?;
        let per_sd = self
            .share
            .per_sd
            .as_ref()
            .ok()
            .filter(|_| !self.all_equal)?;
        let variance = match gauge.members().collect::<Vec<_>>()[..] {
            [only] if self.ms[only] > 0.0 => constants.lower(&gauge.weights(), self.ms),
            [_] => return None,
            _ => constants.lower(&gauge.weights(), self.ms),
        };
        Some(variance.max(0.0).sqrt() * per_sd)
    }

    fn spread(
        &self,
        combination: Option<&Combination>,
        estimate: Option<f64>,
        absent: &'static str,
        share_of_tv: Figure,
    ) -> Spread {
        let variance = match (combination, estimate) {
            (Some(combination), Some(estimate)) => self.variance(combination, estimate),
            _ => Figure::absent(absent),
        };
        let sd = variance.rising(f64::sqrt);
        let share_of_tolerance = match &self.share.per_sd {
            _ if variance.estimate.is_none() => Figure::absent(absent),
            Err(why) => Figure::absent(why.clone()),
            Ok(_) if self.all_equal => Figure::absent(ALL_EQUAL),
            Ok(per_sd) => sd.rising(|sd| sd * per_sd),
        };
        Spread {
            variance,
            sd,
            share_of_tolerance,
            share_of_tv,
        }
    }

    fn variance(&self, combination: &Combination, estimate: f64) -> Figure {
        let error = self.ms.len() - 1;
        let alone = combination.members().eq([error]) && combination.weights()[error] == 1.0;
        if alone && self.ms[error] == 0.0 && !self.all_equal {
            return Figure::without_limits(estimate, NO_REPEATS);
        }
        let bounds = if alone {
            self.exact(error)
        } else {
            self.modified_large_sample(&combination.weights())
        };
        Figure::new(estimate, bounds.rising(|x| x.max(0.0)))
    }

    /// A single mean square with its chi-square limits.
    fn exact(&self, line: usize) -> Bounds {
        let n = self.basis.df[line];
        let alpha = 1.0 - self.confidence;
        let limit = |side, a| n * self.ms[line] / chi_square(side, a, n);
        Bounds {
            lower: limit(Side::Above, alpha / 2.0),
            upper: limit(Side::Below, alpha / 2.0),
            at_least: limit(Side::Above, alpha),
            interval: Interval::Exact,
        }
    }

    fn modified_large_sample(&self, weights: &[f64]) -> Bounds {
        Bounds {
            lower: self.basis.two_sided.lower(weights, self.ms),
            upper: self.basis.two_sided.upper(weights, self.ms),
            at_least: self.basis.one_sided.lower(weights, self.ms),
            interval: Interval::Mls,
        }
    }

    fn part_over_gauge(&self) -> Option<RatioBounds> {
        let q = &self.basis.quantities;
        self.ratio(q.part.as_ref()?, q.gauge.as_ref()?)
    }

    /// Limits of the ratio of two variances; `None` when the denominator's estimate is not above zero.
    fn ratio(&self, numerator: &Combination, denominator: &Combination) -> Option<RatioBounds> {
        if let [term, _] = self.basis.model.lines() {
            return self.ratio_to_error(self.basis.model.readings() / term.cells);
        }
        let (n, d) = (numerator.weights(), denominator.weights());
        let limits = |constants: &Constants| constants.ratio(&n, &d, self.ms);
        Some(RatioBounds {
            two_sided: limits(&self.basis.two_sided)?,
            one_sided: limits(&self.basis.one_sided)?,
            interval: Interval::MlsRoot,
        })
    }

    /// The exact limits of `variance of the only term / variance of the error`.
    fn ratio_to_error(&self, readings_per_level: usize) -> Option<RatioBounds> {
        if self.ms[1] <= 0.0 {
            return None;
        }
        let (n, m) = (self.basis.df[0], self.basis.df[1]);
        let observed = self.ms[0] / self.ms[1];
        let limit =
            |side, a| ((observed / f(side, a, n, m) - 1.0) / readings_per_level as f64).max(0.0);
        let limits = |a| (limit(Side::Above, a), limit(Side::Below, a));
        let alpha = 1.0 - self.confidence;
        Some(RatioBounds {
            two_sided: limits(alpha / 2.0),
            one_sided: limits(alpha),
            interval: Interval::Exact,
        })
    }
}

fn with_limits(estimate: f64, bounds: Option<Bounds>) -> Figure {
    match bounds {
        Some(bounds) => Figure::new(estimate, bounds),
        None => Figure::without_limits(estimate, REST_ZERO),
    }
}

/// sd of one source over the sd of the total.
struct ShareOfTv<'a> {
    evidence: &'a Evidence<'a>,
}

impl ShareOfTv<'_> {
    fn repeatability(&self) -> Figure {
        let q = &self.evidence.basis.quantities;
        let ratio = || {
            let repeatability = q.repeatability.as_ref()?;
            self.evidence
                .ratio(&q.total.minus(repeatability), repeatability)
        };
        self.figure(
            self.evidence.estimates.repeatability,
            NOT_APART,
            As::Denominator,
            ratio,
        )
    }

    fn reproducibility(&self) -> Figure {
        let q = &self.evidence.basis.quantities;
        let ratio = || {
            let reproducibility = q.reproducibility.as_ref()?;
            self.evidence
                .ratio(reproducibility, &q.total.minus(reproducibility))
        };
        self.figure(
            self.evidence.estimates.reproducibility,
            ONE_LEVEL,
            As::Numerator,
            ratio,
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
        ratio: impl Fn() -> Option<RatioBounds>,
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
        with_limits(estimate, bounds)
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
