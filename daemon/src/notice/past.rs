//! The study of the round before, as far as a comparison needs it, out of its record.

use std::collections::BTreeMap;

use restudy_engine::{Study, WITHIN_CELLS, quantile};
use serde_json::Value;

use crate::plain::same_model;

/// A change of repeatability is called real below this one-sided p.
const REAL_BELOW: f64 = 0.05;

/// What is compared.
pub(super) struct Past {
    /// sds by component, in reading units.
    pub(super) sds: BTreeMap<String, f64>,
    /// Share of tolerance of the repeatability.
    pub(super) repeatability: Option<f64>,
    within_df: Option<f64>,
    /// Lines of its table of mean squares.
    lines: Vec<String>,
    trials: Option<u64>,
    lower: Option<f64>,
    upper: Option<f64>,
}

/// Repeatability now against the round before, judged by the F distribution of the ratio of variances.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Repeatability {
    AsBefore,
    Higher,
    Lower,
}

impl Past {
    /// `None` for a round without a study.
    pub(super) fn read(record: &str) -> Option<Self> {
        let record: Value = serde_json::from_str(record).ok()?;
        let sds = record["components"]
            .as_array()?
            .iter()
            .filter_map(|component| {
                Some((
                    component["name"].as_str()?.to_owned(),
                    component["sd"]["estimate"].as_f64()?,
                ))
            });
        let lines = record["mean_squares"].as_array()?;
        let within = lines.iter().find(|line| line["name"] == WITHIN_CELLS);
        let names = lines.iter().filter_map(|line| line["name"].as_str());
        Some(Self {
            sds: sds.collect(),
            repeatability: record["figures"]["repeatability"]["share_of_tolerance"]["estimate"]
                .as_f64(),
            within_df: within.and_then(|line| line["df"].as_f64()),
            lines: names.map(str::to_owned).collect(),
            trials: record["design"]["trials"].as_u64(),
            lower: record["lower"].as_f64(),
            upper: record["upper"].as_f64(),
        })
    }

    /// Whether the line within cells holds repeats and nothing else than before: more than one trial in both
    /// rounds, and the same terms kept out of it.
    pub(super) fn same_repeats(&self, now: &Study) -> bool {
        let repeats = now.design.trials > 1 && self.trials.is_some_and(|trials| trials > 1);
        repeats && same_model(now, &self.lines)
    }

    /// How the repeatability has moved; `None` where the two rounds do not tell it.
    pub(super) fn repeatability_now(&self, now: &Study) -> Option<Repeatability> {
        if !self.same_repeats(now) {
            return None;
        }
        let line = now
            .mean_squares
            .iter()
            .find(|line| line.name == WITHIN_CELLS)?;
        let before = self.sds.get(WITHIN_CELLS).filter(|sd| **sd > 0.0)?;
        let (ratio, df, df_before) = (
            line.ms? / (before * before),
            line.df as f64,
            self.within_df?,
        );
        if ratio > 1.0 && quantile::f_above(ratio, df, df_before) < REAL_BELOW {
            Some(Repeatability::Higher)
        } else if ratio > 0.0
            && ratio < 1.0
            && quantile::f_above(1.0 / ratio, df_before, df) < REAL_BELOW
        {
            Some(Repeatability::Lower)
        } else {
            Some(Repeatability::AsBefore)
        }
    }

    /// True when the limits on the drawing were other ones.
    pub(super) fn other_tolerance(&self, lower: Option<f64>, upper: Option<f64>) -> bool {
        (self.lower, self.upper) != (lower, upper)
    }
}
