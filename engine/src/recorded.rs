//! A study's table of mean squares with the model that it belongs to, from a study or from its written record.
//!
//! Not here: readings. What needs more than mean squares cannot be worked out from a record.
//!
//! Invariant: a [`Recorded`] holds a mean square for every line of its model; a study without a table of mean squares
//! (unequal trials) has none.

use serde::Deserialize;

use crate::combination::Combination;
use crate::design::{Design, Factor};
use crate::estimates::Estimates;
use crate::model::{Model, WITHIN_CELLS};
use crate::record::Study;

/// Mean squares of one study, enough to compare it with another or to leave a component out.
///
/// Read from the JSON of a study record with serde; keys that it does not need are passed over.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(try_from = "Written")]
pub struct Recorded {
    pub(crate) model: Model,
    pub(crate) trials: usize,
    pub(crate) df: Vec<f64>,
    pub(crate) ms: Vec<f64>,
}

/// The keys of a record that say the same.
#[derive(Debug, Deserialize)]
struct Written {
    design: WrittenDesign,
    mean_squares: Vec<WrittenLine>,
}

#[derive(Debug, Deserialize)]
struct WrittenDesign {
    factors: Vec<Factor>,
    trials: usize,
}

#[derive(Debug, Deserialize)]
struct WrittenLine {
    name: String,
    ms: Option<f64>,
}

/// Why a record gives no table of mean squares.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum RecordedError {
    /// The record's design is none.
    #[error("the record's design is none: {0}")]
    Design(#[from] crate::design::DesignError),
    /// A study without mean squares.
    #[error("the record has no mean squares; expected those of a study with equal trials")]
    NoTable,
    /// Lines that the design does not give.
    #[error("the record's mean squares ({found}) are not those of its design ({expected})")]
    Lines {
        /// Names in the record.
        found: String,
        /// Names that the design gives.
        expected: String,
    },
}

impl TryFrom<&Study> for Recorded {
    type Error = RecordedError;

    fn try_from(study: &Study) -> Result<Recorded, RecordedError> {
        let lines = study
            .mean_squares
            .iter()
            .filter_map(|line| Some((line.name.as_ref(), line.ms?)));
        Recorded::new(&study.design.factors, study.design.trials, lines.collect())
    }
}

impl TryFrom<Written> for Recorded {
    type Error = RecordedError;

    fn try_from(written: Written) -> Result<Recorded, RecordedError> {
        let lines = written
            .mean_squares
            .iter()
            .filter_map(|line| Some((line.name.as_str(), line.ms?)));
        Recorded::new(
            &written.design.factors,
            written.design.trials,
            lines.collect(),
        )
    }
}

impl Recorded {
    fn new(
        factors: &[Factor],
        trials: usize,
        lines: Vec<(&str, f64)>,
    ) -> Result<Recorded, RecordedError> {
        if lines.is_empty() || trials == 0 {
            return Err(RecordedError::NoTable);
        }
        let design = Design::new(factors.to_vec())?;
        let full = Model::estimable(&design, trials);
        let ms_of = |name: &str| lines.iter().find(|(n, _)| *n == name).map(|(_, ms)| *ms);
        let pooled: Vec<usize> = (0..full.lines().len() - 1)
            .filter(|&i| ms_of(&full.lines()[i].name).is_none())
            .collect();
        let model = if pooled.is_empty() {
            full
        } else {
            full.without(&design, &pooled)
        };
        let ms: Option<Vec<f64>> = model.lines().iter().map(|l| ms_of(&l.name)).collect();
        match ms {
            Some(ms) if ms.len() == lines.len() && ms.iter().all(|x| x.is_finite()) => {
                Ok(Recorded {
                    df: model.lines().iter().map(|l| l.df as f64).collect(),
                    model,
                    trials,
                    ms,
                })
            }
            _ => {
                let names = |names: Vec<&str>| names.join(", ");
                Err(RecordedError::Lines {
                    found: names(lines.iter().map(|(n, _)| *n).collect()),
                    expected: names(model.lines().iter().map(|l| l.name.as_str()).collect()),
                })
            }
        }
    }

    /// Index of the line within cells.
    pub(crate) fn error(&self) -> usize {
        self.ms.len() - 1
    }

    /// The mean square within cells and its degrees of freedom, where there are repeats; it holds what was pooled into it too.
    pub(crate) fn repeats(&self) -> Option<(f64, f64)> {
        debug_assert_eq!(self.model.error().name, WITHIN_CELLS);
        (self.trials > 1).then(|| (self.ms[self.error()], self.df[self.error()]))
    }

    pub(crate) fn components(&self) -> Vec<Combination> {
        (0..self.ms.len())
            .map(|line| self.model.component(line))
            .collect()
    }

    /// The gauge variance as a combination of mean squares.
    pub(crate) fn gauge(&self) -> Combination {
        let repeatability = self.model.component(self.error());
        match self.model.sum(self.model.reproducibility()) {
            Some(reproducibility) => reproducibility.plus(&repeatability),
            None => repeatability,
        }
    }

    /// Variances built from components cut at zero.
    pub(crate) fn estimates(&self) -> Estimates {
        let components = self.components();
        let raw: Vec<f64> = components.iter().map(|c| c.value(&self.ms)).collect();
        Estimates::new(&self.model, &raw)
    }

    /// Standard deviation of the gauge, in reading units; absent where it does not stand apart from the parts.
    pub fn gauge_sd(&self) -> Option<f64> {
        self.estimates().gauge.map(f64::sqrt)
    }
}
