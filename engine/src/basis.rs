//! A model with all that follows from it for a stated confidence, worked out once and used for every
//! characteristic of the same design.

use std::sync::OnceLock;

use crate::combination::Combination;
use crate::generalized::{Draws, Simulation};
use crate::mls::Constants;
use crate::model::Model;
use crate::settings::{Judge, Settings};

#[derive(Debug, Clone)]
pub(crate) struct Basis {
    pub(crate) model: Model,
    pub(crate) df: Vec<f64>,
    pub(crate) quantities: Quantities,
    /// Two-sided limits.
    pub(crate) two_sided: Constants,
    /// One-sided limits at the same confidence.
    pub(crate) one_sided: Constants,
    /// One-sided limits at the confidence that judges, when that is another one.
    pub(crate) judging: Option<Constants>,
    simulation: Simulation,
    draws: OnceLock<Draws>,
}

/// The figures as combinations of mean squares; absent where the design cannot tell them apart.
#[derive(Debug, Clone)]
pub(crate) struct Quantities {
    pub(crate) repeatability: Option<Combination>,
    pub(crate) reproducibility: Option<Combination>,
    pub(crate) gauge: Option<Combination>,
    pub(crate) part: Option<Combination>,
    pub(crate) total: Combination,
}

impl Basis {
    pub(crate) fn new(model: Model, settings: &Settings) -> Self {
        let df: Vec<f64> = model.lines().iter().map(|l| l.df as f64).collect();
        let alpha = 1.0 - settings.confidence;
        let judging = match settings.judge {
            Judge::Chance(p) => Some(Constants::all(&df, 1.0 - p)),
            Judge::Estimate | Judge::Upper => None,
        };
        Basis {
            quantities: Quantities::of(&model),
            two_sided: Constants::all(&df, alpha / 2.0),
            one_sided: Constants::all(&df, alpha),
            judging,
            simulation: Simulation::default(),
            draws: OnceLock::new(),
            model,
            df,
        }
    }

    /// The same with other draws.
    pub(crate) fn simulated(self, simulation: Simulation) -> Self {
        Basis {
            simulation,
            draws: OnceLock::new(),
            ..self
        }
    }

    /// Drawn when first asked for, then shared by all characteristics.
    pub(crate) fn draws(&self) -> &Draws {
        self.draws
            .get_or_init(|| Draws::new(&self.df, self.simulation))
    }
}

impl Quantities {
    pub(crate) fn of(model: &Model) -> Self {
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
        Quantities {
            repeatability: apart.then_some(repeatability),
            reproducibility,
            gauge: apart.then_some(gauge),
            part,
            total,
        }
    }
}
