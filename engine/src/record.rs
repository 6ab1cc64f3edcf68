//! The study record: what one characteristic's study says, in the order in which it is written out.
//!
//! Not here: who measured what, standings over time, where the readings came from; the caller adds them.
//!
//! Invariant: every number is finite or absent.

use std::borrow::Cow;
use std::collections::BTreeMap;

use serde::Serialize;

use crate::design::Factor;
use crate::figure::Figure;
use crate::reml::Reml;
use crate::risk::Guarded;

/// One study. Variances are in squared reading units, sds in reading units, shares are fractions.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Study {
    /// The rule that gives the tolerance its width: `two-sided`, `from zero`, `width`,
    /// `to process mean`, `to study mean` or `none`.
    pub tolerance_rule: &'static str,
    /// The design that the readings fill.
    pub design: Layout,
    /// `anova`, or `reml` where cells hold unequal numbers of readings.
    pub method: &'static str,
    /// Two-sided confidence of all limits.
    pub confidence: f64,
    /// Multiple of the gauge sd that counts as its spread.
    pub spread_sds: f64,
    /// What was done with the interaction of part and other factors.
    pub interaction: InteractionChoice,
    /// One entry a term, then `within cells` and `total`; none with `reml`, for there sums of squares depend on the order
    /// of the terms.
    pub mean_squares: Vec<MeanSquare>,
    /// Estimates by restricted maximum likelihood; a balanced study has none.
    pub reml: Option<Reml>,
    /// One entry a term, then `within cells`.
    pub components: Vec<Component>,
    /// The figures that people ask for.
    pub figures: Figures,
    /// Number of distinct categories.
    pub ndc: Ndc,
    /// Part variance over gauge variance.
    pub part_to_gauge: Figure,
    /// Misclassification; absent without a stated process.
    pub risk: Option<Risk>,
    /// Confidence that the true share lies above each limit.
    pub chance_above: ChanceAbove,
    /// What a reader should know beside the numbers.
    pub remarks: Vec<Remark>,
    /// Draws of simulated limits; absent when nothing was simulated.
    pub draws: Option<u32>,
    /// Seed of the draws.
    pub seed: Option<u64>,
    /// Mean of all readings, in reading units; with `reml` by generalised least squares.
    #[serde(skip)]
    pub grand_mean: f64,
    /// The figure that is held against the limits; absent when the share is.
    #[serde(skip)]
    pub judged_share: Option<f64>,
}

/// The design with its counts.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Layout {
    /// The factors in the order of the design.
    pub factors: Vec<Factor>,
    /// Readings in each cell; where they differ, in the fullest.
    pub trials: usize,
    /// Number of cells.
    pub cells: usize,
    /// Number of readings.
    pub readings: usize,
    /// Readings that the study lacks for every cell to be as full as the fullest.
    pub missing: usize,
    /// Whether all cells hold the same number of readings.
    pub balanced: bool,
}

/// Interaction of the part with other factors: kept or pooled, and what the other choice would say.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct InteractionChoice {
    /// Whether an interaction term stands in the table of mean squares.
    pub kept: bool,
    /// p of the largest interaction term against its denominator, before any pooling; with `reml` of the likelihood
    /// ratio.
    pub p: Option<f64>,
    /// The p above which the plan pools; absent when it always keeps.
    pub pool_above: Option<f64>,
    /// The other choice; absent when there is no interaction term.
    pub other_reading: Option<OtherReading>,
}

/// What the other choice about the interaction would say.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct OtherReading {
    /// Gauge sd.
    pub gauge_sd: Option<f64>,
    /// Gauge share of tolerance.
    pub share_of_tolerance: Option<f64>,
}

/// One line of the table of mean squares.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MeanSquare {
    /// `part`, `part × appraiser`, `part within appraiser`, `within cells`, `total`.
    pub name: Cow<'static, str>,
    /// Inner factors.
    pub of: Vec<String>,
    /// Containing factors.
    pub within: Vec<String>,
    /// Sum of squares.
    pub ss: f64,
    /// Degrees of freedom.
    pub df: usize,
    /// Mean square; absent for the total.
    pub ms: Option<f64>,
    /// F against the denominator; absent when that is not above zero.
    pub f: Option<f64>,
    /// Upper tail of F.
    pub p: Option<f64>,
    /// The denominator as a weighted sum of mean squares.
    pub against: Option<Vec<Against>>,
    /// Its degrees of freedom (Satterthwaite when it is a sum).
    pub against_df: Option<f64>,
}

/// One mean square of a denominator.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Against {
    /// Name of the line.
    pub name: String,
    /// Its weight.
    pub weight: f64,
}

/// One variance component.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Component {
    /// Name of the line it comes from.
    pub name: Cow<'static, str>,
    /// Inner factors.
    pub of: Vec<String>,
    /// Containing factors.
    pub within: Vec<String>,
    /// The combination of mean squares as it is; may be below zero.
    pub raw: f64,
    /// The variance, cut at zero.
    pub variance: Figure,
    /// Its square root.
    pub sd: Figure,
}

/// The figures that people ask for.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Figures {
    /// EV: spread of one appraiser's repeats.
    pub repeatability: Spread,
    /// AV: everything but repeatability and parts, the interaction included.
    pub reproducibility: Spread,
    /// GRR: both together.
    pub gauge: Spread,
    /// PV: spread of the true parts.
    pub part: Spread,
    /// TV: gauge and parts together.
    pub total: Spread,
}

/// One source of spread, as variance, sd and shares.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Spread {
    /// Variance.
    pub variance: Figure,
    /// Standard deviation.
    pub sd: Figure,
    /// Spread over the width of the tolerance.
    pub share_of_tolerance: Figure,
    /// sd over the sd of the total.
    pub share_of_tv: Figure,
}

/// Number of distinct categories.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Ndc {
    /// 1.41 × part sd / gauge sd, cut to a whole number.
    pub whole: Option<u64>,
    /// √2 × part sd / gauge sd.
    pub estimate: Option<f64>,
    /// Two-sided lower limit of the estimate.
    pub lower: Option<f64>,
    /// Two-sided upper limit; absent when there is none.
    pub upper: Option<f64>,
}

/// Confidence that the true share of tolerance lies above each limit.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize)]
pub struct ChanceAbove {
    /// Above the watch limit.
    pub watch: Option<f64>,
    /// Above the act limit.
    pub act: Option<f64>,
}

/// A plain sentence about the data with its figures.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Remark {
    /// What kind of thing it says.
    pub kind: &'static str,
    /// The sentence.
    pub text: String,
    /// The numbers behind it.
    pub figures: BTreeMap<String, f64>,
}

/// How often parts of a process are judged wrongly by this gauge; every number is a probability.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Risk {
    /// The process that the parts come from.
    pub process: RiskProcess,
    /// A part is bad: its true value lies outside the limits.
    pub bad: Figure,
    /// A part is accepted: its reading lies within the limits.
    pub accepted: Figure,
    /// Good parts rejected.
    pub producer: ProducerRisk,
    /// Bad parts accepted.
    pub consumer: ConsumerRisk,
    /// Acceptance limits that keep the joint consumer's risk at 100, 10 and 1 in a million; those that need no guard
    /// band are left out.
    pub guarded: Vec<Guarded>,
}

/// The process behind the risks.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct RiskProcess {
    /// `stated`, or `study parts`: the parts that somebody chose for the study.
    pub from: &'static str,
    /// Mean of the true values, in reading units.
    pub mean: Option<f64>,
    /// Their sd, in reading units.
    pub sd: Option<f64>,
}

/// Producer's risk.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ProducerRisk {
    /// A part is good and rejected.
    pub joint: Figure,
    /// A good part is rejected.
    pub given_good: Figure,
    /// A rejected part is good.
    pub given_rejected: Figure,
}

/// Consumer's risk.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ConsumerRisk {
    /// A part is bad and accepted.
    pub joint: Figure,
    /// A bad part is accepted.
    pub given_bad: Figure,
    /// An accepted part is bad.
    pub given_accepted: Figure,
}
