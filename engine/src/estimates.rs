//! Estimates of the figures: every component cut at zero, then added.

use crate::combination::Combination;
use crate::model::Model;

/// Variances of one study, each built from components cut at zero; absent where they do not stand apart.
#[derive(Debug, Clone)]
pub(crate) struct Estimates {
    /// The components of all lines as they are.
    pub(crate) raw: Vec<f64>,
    pub(crate) repeatability: Option<f64>,
    pub(crate) reproducibility: Option<f64>,
    pub(crate) gauge: Option<f64>,
    pub(crate) part: Option<f64>,
    pub(crate) total: f64,
}

impl Estimates {
    pub(crate) fn new(model: &Model, components: &[Combination], ms: &[f64]) -> Self {
        let raw: Vec<f64> = components.iter().map(|c| c.value(ms)).collect();
        let cut = |line: usize| raw[line].max(0.0);
        let error = raw.len() - 1;
        let part = model.part().map(cut);
        let others: Vec<f64> = model.reproducibility().map(cut).collect();
        let reproducibility = (!others.is_empty()).then(|| others.iter().sum::<f64>());
        let gauge = reproducibility.unwrap_or(0.0) + cut(error);
        let apart = part.is_some();
        Estimates {
            repeatability: apart.then(|| cut(error)),
            gauge: apart.then_some(gauge),
            total: gauge + part.unwrap_or(0.0),
            reproducibility,
            part,
            raw,
        }
    }
}
