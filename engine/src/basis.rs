//! A model with all that follows from it for a stated confidence, worked out once and used for every
//! characteristic of the same design.

use std::sync::OnceLock;

use crate::combination::Combination;
use crate::generalized::{Draws, Simulation};
use crate::linear::{Linear, Pair};
use crate::mls::{Constants, Limit, lower_limit_at};
use crate::model::Model;
use crate::quantile::{ChiSquareByDf, Side};
use crate::settings::{Judge, Settings};
use crate::sums::{Sums, Sweep};
use crate::table::Against;

#[derive(Debug)]
pub(crate) struct Basis {
    pub(crate) model: Model,
    pub(crate) df: Vec<f64>,
    /// One a line.
    pub(crate) components: Vec<Linear>,
    /// What each line is tested against; `None` for the error.
    pub(crate) against: Vec<Option<Against>>,
    pub(crate) quantities: Quantities,
    pub(crate) ratios: Ratios,
    /// The lower limit of the gauge at the confidence that judges.
    pub(crate) judging: Option<Limit>,
    /// Weights of the variance of the grand mean.
    pub(crate) variance_of_mean: Vec<f64>,
    /// For every term of the design the line that its sum of squares goes to.
    homes: Vec<usize>,
    matched: OnceLock<Matched>,
    alpha: f64,
    simulation: Simulation,
    draws: OnceLock<Draws>,
}

/// The figures as combinations of mean squares; absent where the design cannot tell them apart.
#[derive(Debug)]
pub(crate) struct Quantities {
    pub(crate) repeatability: Option<Linear>,
    pub(crate) reproducibility: Option<Linear>,
    pub(crate) gauge: Option<Linear>,
    pub(crate) part: Option<Linear>,
    pub(crate) total: Linear,
}

/// Ratios of variances that figures follow from.
#[derive(Debug)]
pub(crate) struct Ratios {
    pub(crate) part_to_gauge: Option<Pair>,
    pub(crate) rest_to_repeatability: Option<Pair>,
    pub(crate) reproducibility_to_rest: Option<Pair>,
}

/// Quantiles of chi-square at the tail probabilities of the limits.
#[derive(Debug)]
pub(crate) struct Matched {
    pub(crate) lower: ChiSquareByDf,
    pub(crate) upper: ChiSquareByDf,
    pub(crate) at_least: ChiSquareByDf,
}

impl Basis {
    pub(crate) fn new(
        model: Model,
        sweep: &Sweep,
        settings: &Settings,
        simulation: Simulation,
    ) -> Self {
        let df: Vec<f64> = model.lines().iter().map(|l| l.df as f64).collect();
        let alpha = 1.0 - settings.confidence;
        let two_sided = Constants::all(&df, alpha / 2.0);
        let one_sided = Constants::all(&df, alpha);
        let linear = |sum: Combination| Linear::new(sum, &two_sided, &one_sided);
        let lines = 0..model.lines().len();
        let sums = Variances::of(&model);
        let judging = match (settings.judge, &sums.gauge) {
            (Judge::Chance(p), Some(gauge)) => {
                Some(lower_limit_at(&gauge.weights(), &df, p, 1.0 - p))
            }
            _ => None,
        };
        Basis {
            components: lines.clone().map(|i| linear(model.component(i))).collect(),
            against: lines.map(|i| Against::new(&model, i)).collect(),
            ratios: Ratios::of(&sums, &two_sided, &one_sided),
            quantities: Quantities {
                repeatability: sums.repeatability.map(linear),
                reproducibility: sums.reproducibility.map(linear),
                gauge: sums.gauge.map(linear),
                part: sums.part.map(linear),
                total: linear(sums.total),
            },
            judging,
            homes: sweep.terms().map(|set| model.home(set)).collect(),
            variance_of_mean: model.variance_of_mean().weights(),
            matched: OnceLock::new(),
            alpha,
            simulation,
            draws: OnceLock::new(),
            model,
            df,
        }
    }

    /// Sums of squares and mean squares of the lines.
    pub(crate) fn mean_squares(&self, sums: &Sums, ss: &mut Vec<f64>, ms: &mut Vec<f64>) {
        ss.clear();
        ss.resize(self.df.len(), 0.0);
        for (&home, term) in self.homes.iter().zip(&sums.terms) {
            ss[home] += term;
        }
        ss[self.df.len() - 1] += sums.within;
        ms.clear();
        ms.extend(ss.iter().zip(&self.df).map(|(ss, df)| ss / df));
    }

    pub(crate) fn simulation(&self) -> Simulation {
        self.simulation
    }

    /// Drawn when first asked for, then shared by all characteristics.
    pub(crate) fn draws(&self) -> &Draws {
        self.draws
            .get_or_init(|| Draws::new(&self.df, self.simulation))
    }

    pub(crate) fn matched(&self) -> &Matched {
        self.matched.get_or_init(|| Matched {
            lower: ChiSquareByDf::new(Side::Above, self.alpha / 2.0),
            upper: ChiSquareByDf::new(Side::Below, self.alpha / 2.0),
            at_least: ChiSquareByDf::new(Side::Above, self.alpha),
        })
    }
}

/// The variances that people ask for.
struct Variances {
    repeatability: Option<Combination>,
    reproducibility: Option<Combination>,
    gauge: Option<Combination>,
    part: Option<Combination>,
    total: Combination,
}

impl Variances {
    fn of(model: &Model) -> Self {
        let error = model.lines().len() - 1;
        let repeatability = model.component(error);
        let part = model.part().map(|part| model.component(part));
        let reproducibility = model.sum(model.reproducibility());
        let gauge = reproducibility
            .as_ref()
            .map_or(repeatability.clone(), |r| r.plus(&repeatability));
        let total = part
            .as_ref()
            .map_or(gauge.clone(), |part| part.plus(&gauge));
        // Without a part line the error holds the parts, and neither repeatability nor gauge stands apart.
        let apart = part.is_some();
        Variances {
            repeatability: apart.then_some(repeatability),
            reproducibility,
            gauge: apart.then_some(gauge),
            part,
            total,
        }
    }
}

impl Ratios {
    fn of(sums: &Variances, two_sided: &Constants, one_sided: &Constants) -> Ratios {
        let pair = |numerator: &Combination, denominator: &Combination| {
            Pair::new(numerator, denominator, two_sided, one_sided)
        };
        let Variances { part, gauge, .. } = sums;
        let rest = |of: &Combination| sums.total.minus(of);
        let (repeats, between) = (&sums.repeatability, &sums.reproducibility);
        Ratios {
            part_to_gauge: part.as_ref().zip(gauge.as_ref()).map(|(p, g)| pair(p, g)),
            rest_to_repeatability: repeats.as_ref().map(|e| pair(&rest(e), e)),
            reproducibility_to_rest: between.as_ref().map(|r| pair(r, &rest(r))),
        }
    }
}
