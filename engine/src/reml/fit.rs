//! One model fitted to one set of readings.

use crate::design::Design;
use crate::model::Model;

use super::ascent::{Ends, NoSummit, Summit};
use super::blocks::Blocks;
use super::dense::Matrix;
use super::reduced::Reduced;

/// Part of a component's own information that must be left when those before it are known.
const APART: f64 = 1e-9;

/// Why a model cannot be fitted.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum NoFit {
    /// A component that the present cells cannot tell from others.
    NotApart(String),
    /// Nothing is left for the error.
    NoError,
    /// The search did not come to an end.
    Unsettled,
}

/// Components of a model, in squares of the readings' scale.
#[derive(Debug, Clone)]
pub(super) struct Fit {
    pub(super) model: Model,
    pub(super) components: Vec<f64>,
    /// Mean of a reading, in reading units.
    pub(super) mean: f64,
    pub(super) evidence: Evidence,
}

/// What stands behind the components.
#[derive(Debug, Clone)]
pub(super) enum Evidence {
    /// The maximum of the likelihood.
    Summit {
        /// The structure of the covariance.
        blocks: Box<Blocks>,
        /// Where the search ended.
        summit: Summit,
    },
    /// The likelihood has no bound: all repeats are equal. Cell means were fitted as single readings.
    RepeatsEqual { steps: usize },
    /// All readings are equal.
    AllEqual,
}

impl Fit {
    /// Fits a model whose largest term may be the cell itself.
    pub(super) fn new(design: &Design, model: Model, reduced: &Reduced) -> Result<Fit, NoFit> {
        let blocks = Blocks::new(design, &model, &reduced.counts);
        tell_apart(&blocks, &model)?;
        let lines = model.lines().len();
        if reduced.all_equal() {
            return Ok(Fit {
                components: vec![0.0; lines],
                mean: reduced.centre,
                evidence: Evidence::AllEqual,
                model,
            });
        }
        if reduced.within == 0.0
            && blocks.within_df > 0
            && let Some(cell) = cell_line(design, &model)
        {
            return of_cell_means(design, model, reduced, cell);
        }
        let seen = reduced.seen_by(&blocks);
        let total = seen.values.iter().map(|y| y * y).sum::<f64>() + seen.within;
        let spread = total / (blocks.readings - 1) as f64;
        let error = if seen.within > 0.0 {
            seen.within / blocks.within_df as f64
        } else {
            spread / lines as f64
        };
        let other = (spread - error).max(0.1 * spread) / lines as f64;
        let mut start = vec![other; lines];
        start[lines - 1] = error;
        let summit = blocks
            .climb(&seen, start, Ends::Exactly)
            .map_err(|fault| match fault {
                NoSummit::NoError => NoFit::NoError,
                NoSummit::Unsettled => NoFit::Unsettled,
            })?;
        Ok(Fit {
            components: summit.components.clone(),
            mean: reduced.centre + summit.at.mean * reduced.scale,
            evidence: Evidence::Summit {
                blocks: Box::new(blocks),
                summit,
            },
            model,
        })
    }

    pub(super) fn summit(&self) -> Option<(&Blocks, &Summit)> {
        match &self.evidence {
            Evidence::Summit { blocks, summit } => Some((blocks, summit)),
            Evidence::RepeatsEqual { .. } | Evidence::AllEqual => None,
        }
    }

    pub(super) fn log_likelihood(&self) -> Option<f64> {
        self.summit().map(|(_, summit)| summit.at.log_likelihood)
    }
}

/// With equal repeats the error is zero, and the cells' own component takes the error's place.
fn of_cell_means(
    design: &Design,
    model: Model,
    reduced: &Reduced,
    cell: usize,
) -> Result<Fit, NoFit> {
    let means = Fit::new(
        design,
        model.without(design, &[cell]),
        &reduced.as_single_readings(),
    )?;
    let mut components = means.components.clone();
    let of_cells = components.pop().unwrap_or(0.0);
    components.insert(cell, of_cells);
    components.push(0.0);
    Ok(Fit {
        components,
        mean: means.mean,
        evidence: Evidence::RepeatsEqual {
            steps: means.summit().map_or(0, |(_, summit)| summit.steps),
        },
        model,
    })
}

/// The line whose levels are the cells.
fn cell_line(design: &Design, model: &Model) -> Option<usize> {
    let is_cell = |&line: &usize| {
        model
            .set(line)
            .is_some_and(|set| design.combinations(set) == design.cells())
    };
    (0..model.lines().len()).find(is_cell)
}

/// Checks that every component changes the covariance in a way that the others, the error first, cannot.
fn tell_apart(blocks: &Blocks, model: &Model) -> Result<(), NoFit> {
    let n = blocks.components();
    let mut error_alone = vec![0.0; n];
    error_alone[n - 1] = 1.0;
    let not_apart = |line: usize| NoFit::NotApart(model.lines()[line].name.clone());
    let Some(information) = blocks.information(&error_alone) else {
        return Err(not_apart(n - 1));
    };
    let order: Vec<usize> = [n - 1].into_iter().chain(0..n - 1).collect();
    let own: Vec<f64> = order.iter().map(|&i| information[(i, i)].sqrt()).collect();
    let scaled = Matrix::from_fn(n, n, |a, b| {
        information[(order[a], order[b])] / (own[a] * own[b])
    });
    for size in 1..=n {
        let known: Vec<usize> = (0..size).collect();
        let left = scaled.part(&known).cholesky().map(|factor| factor.last());
        if !(own[size - 1] > 0.0 && left.is_some_and(|left| left * left > APART)) {
            return Err(not_apart(order[size - 1]));
        }
    }
    Ok(())
}
