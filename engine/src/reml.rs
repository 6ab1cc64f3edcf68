//! Restricted maximum likelihood: components of a study whose cells hold unequal numbers of readings, or none.
//!
//! Model: the terms of the design as for a balanced study. Where all cells hold the same number and no component is cut
//! at zero, the estimates are those from mean squares; with a cut, those of the model without the component.
//!
//! Not here: filling in what is missing. Limits are approximate: chi-square with matched variance, and bootstrap.
//!
//! Invariant: estimates maximise the likelihood over components at zero or above.

mod ascent;
mod blocks;
mod bootstrap;
mod dense;
mod fit;
mod likelihood;
mod limits;
mod reduced;
mod study;
mod written;

pub(crate) use study::study;
pub use written::{GaugeBootstrap, Reml};

use crate::design::Design;
use crate::fault::StudyError;
use crate::model::Model;

use fit::{Fit, NoFit};
use reduced::Reduced;

/// Fits all terms of a design, or with `interaction` false those that do not join the part with other factors.
///
/// `cells[i]` is the cell of `values[i]`; cells may hold any number of readings, also none. The order of rows changes nothing.
///
/// # Errors
/// [`StudyError`] when readings are not finite or lie in no cell, when the present cells cannot tell two components
/// apart, or when nothing is left for the error.
pub fn reml(
    design: &Design,
    cells: &[usize],
    values: &[f64],
    interaction: bool,
) -> Result<Reml, StudyError> {
    let counts = crate::study::counts(design, cells, values)?;
    let trials = counts.iter().copied().max().unwrap_or(0);
    let mut model = Model::estimable(design, trials);
    if !interaction {
        model = model.without(design, &model.interactions());
    }
    let reduced = Reduced::new(counts, cells, values)?;
    let fit = Fit::new(design, model, &reduced)?;
    Ok(Reml::of(&fit, reduced.scale))
}

impl From<NoFit> for StudyError {
    fn from(fault: NoFit) -> StudyError {
        match fault {
            NoFit::NotApart(component) => StudyError::NotApart(component),
            NoFit::NoError => StudyError::NoError,
            NoFit::Unsettled => StudyError::Unsettled,
        }
    }
}
