//! What the plan decides: nothing here has a default, because each choice changes results.

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
    pub lower: Option<f64>,
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
    Stated { mean: f64, sd: f64 },
    StudyParts,
}

/// The two limits on the share of tolerance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Limits {
    pub watch: f64,
    pub act: f64,
    /// A limit held before stays held while share >= back_below × limit.
    pub back_below: f64,
}

/// Which figure is held against the limits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Judge {
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
    pub interaction: Interaction,
    pub process: Option<Process>,
    pub limits: Option<Limits>,
    pub judge: Judge,
}
