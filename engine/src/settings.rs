//! What the plan decides: nothing here has a default, because each choice changes results.

use crate::fault::StudyError;

/// Interaction (every term that joins the part with other factors): kept, or pooled.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Interaction {
    /// Always kept.
    Keep,
    /// Pooled into the error when the p of the interaction exceeds this.
    PoolAbove(f64),
}

/// Tolerance of one characteristic, in reading units.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Tolerance {
    /// Lower limit.
    pub lower: Option<f64>,
    /// Upper limit.
    pub upper: Option<f64>,
    /// How a one-sided tolerance is judged; without it the share is absent.
    pub one_sided: Option<OneSided>,
}

/// The named rule for a one-sided tolerance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum OneSided {
    /// Width is the distance from zero to the limit.
    FromZero,
    /// Width is stated, in reading units.
    Width(f64),
    /// Half the spread over the distance from the stated process mean to the limit.
    ToProcessMean,
    /// Half the spread over the distance from the study's grand mean to the limit.
    ToStudyMean,
}

/// The process that risks and `ToProcessMean` refer to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Process {
    /// Named mean and sd, in reading units.
    Stated {
        /// Mean of the process.
        mean: f64,
        /// Its sd.
        sd: f64,
    },
    /// Grand mean and part sd of the study itself.
    StudyParts,
}

/// The two limits on the share of tolerance.
#[derive(Debug, Clone, Copy, PartialEq, serde::Serialize, serde::Deserialize)]
pub struct Limits {
    /// Above this: watch.
    pub watch: f64,
    /// Above this: act.
    pub act: f64,
    /// A limit held before stays held while share >= back_below × limit.
    pub back_below: f64,
}

/// Which figure is held against the limits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Judge {
    /// The estimate itself.
    Estimate,
    /// The one-sided lower limit of the share at this confidence.
    Chance(f64),
    /// The two-sided upper limit.
    Upper,
}

/// All that a study is worked out with.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Settings {
    /// Two-sided confidence, 0.95.
    pub confidence: f64,
    /// Multiple of the gauge sd that counts as its spread, 6.
    pub spread_sds: f64,
    /// Interaction kept or pooled.
    pub interaction: Interaction,
    /// The process that risks and distances refer to.
    pub process: Option<Process>,
    /// The limits on the share; `None`: nothing is judged.
    pub limits: Option<Limits>,
    /// The figure that is judged.
    pub judge: Judge,
}

impl Settings {
    /// Refuses what no study can be worked out with.
    pub(crate) fn check(&self) -> Result<(), StudyError> {
        let fault = |setting, value, expected| {
            Err(StudyError::Setting {
                setting,
                value,
                expected,
            })
        };
        if !(self.confidence >= 0.5 && self.confidence < 1.0) {
            return fault(
                "the confidence",
                self.confidence,
                "at least 0.5 and below 1",
            );
        }
        if !(self.spread_sds > 0.0 && self.spread_sds.is_finite()) {
            return fault(
                "the multiple of the gauge sd",
                self.spread_sds,
                "a number above 0, such as 6",
            );
        }
        if let Judge::Chance(p) = self.judge
            && !(p > 0.0 && p < 1.0)
        {
            return fault("the confidence that judges", p, "between 0 and 1");
        }
        match self.interaction {
            Interaction::PoolAbove(p) if !(0.0..=1.0).contains(&p) => fault(
                "the p above which the interaction is pooled",
                p,
                "from 0 to 1",
            ),
            _ => Ok(()),
        }
    }
}
