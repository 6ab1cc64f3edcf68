//! Estimates of the figures: every component cut at zero, then added.

use crate::model::Model;

/// Variances of one study, each built from components cut at zero; absent where they do not stand apart.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Estimates {
    pub(crate) repeatability: Option<f64>,
    pub(crate) reproducibility: Option<f64>,
    pub(crate) gauge: Option<f64>,
    pub(crate) part: Option<f64>,
    pub(crate) total: f64,
}

impl Estimates {
    /// From the components of all lines as they are.
    pub(crate) fn new(model: &Model, raw: &[f64]) -> Self {
        let cut = |line: usize| raw[line].max(0.0);
        let error = raw.len() - 1;
        let part = model.part().map(cut);
        let reproducibility = model.reproducibility().map(cut).reduce(|a, b| a + b);
        let gauge = reproducibility.unwrap_or(0.0) + cut(error);
        let apart = part.is_some();
        Estimates {
            repeatability: apart.then(|| cut(error)),
            gauge: apart.then_some(gauge),
            total: gauge + part.unwrap_or(0.0),
            reproducibility,
            part,
        }
    }
}
