//! What a design can show before the first run: studies simulated from an assumed gauge.
//!
//! Model: mean squares of a random model are independent, `df × MS / E[MS]` chi-square; the expectations follow from the
//! design and the assumed variances. Each simulated study is estimated, limited and held against the limit as a real
//! one would be that keeps its interaction: components cut at zero and added, two-sided modified-large-sample limits.
//!
//! Not here: parts as a source of doubt. In a crossed design their spread does not enter the gauge's.
//!
//! Invariant: the same seed gives the same outlook.

mod sheet;

pub use sheet::{SHEET_RUNS_MAX, SheetRun, run_sheet};

use crate::combination::Combination;
use crate::design::{Design, Factor, PART};
use crate::mls::Constants;
use crate::model::{Model, WITHIN_CELLS};
use crate::percentile::percentile;
use crate::random::Random;
use crate::record::Study;

/// Studies to simulate when nothing else is asked for; a chance of one in ten is then known to 0.1 %.
pub const STUDIES: u32 = 100_000;

/// A design with its number of trials.
#[derive(Debug, Clone, PartialEq)]
pub struct Candidate {
    /// Its factors.
    pub design: Design,
    /// Readings in a cell.
    pub trials: usize,
}

/// The gauge as it is assumed to be, and how studies of it are judged.
#[derive(Debug, Clone, PartialEq)]
pub struct Assumption {
    /// Variances by name of their line (`within cells`, `appraiser`, `part × appraiser`), in any one unit.
    pub mix: Vec<(String, f64)>,
    /// True share of tolerance.
    pub share: f64,
    /// The limit on the share.
    pub limit: f64,
    /// Two-sided confidence of the limits.
    pub confidence: f64,
    /// Studies to simulate.
    pub studies: u32,
    /// Seed of the simulation.
    pub seed: u64,
}

/// What studies of one design would show. Everything but `readings` and `right` is an sd over the true gauge sd, and so a
/// share over the true share.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Outlook {
    /// Readings in a study.
    pub readings: usize,
    /// Part of the studies whose estimate lies on that side of the limit on which the truth lies.
    pub right: f64,
    /// One study in twenty estimates less.
    pub estimate_low: f64,
    /// One study in twenty estimates more.
    pub estimate_high: f64,
    /// Median of the lower limits.
    pub lower: f64,
    /// Median of the upper limits.
    pub upper: f64,
    /// One upper limit in ten lies higher.
    pub upper_in_ten: f64,
    /// Mean of upper limit minus lower limit.
    pub width: f64,
}

/// Why an assumption gives no outlook.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum PlanningError {
    /// A source that the design does not have.
    #[error("`{source_name}` is no source of variance in this design; expected {expected}")]
    NoSuchSource {
        /// What was named.
        source_name: String,
        /// What the design has.
        expected: String,
    },
    /// A variance that is none.
    #[error("the variance of {source_name} is {value}; expected a number of 0 or more")]
    Variance {
        /// Of what.
        source_name: String,
        /// What it is.
        value: f64,
    },
    /// No variance at all.
    #[error("the assumed gauge has no variance; expected one above 0")]
    NoVariance,
    /// A source that this design cannot see.
    #[error(
        "with one level the design cannot see the variance of {0}; expected two levels or more"
    )]
    Unseen(String),
    /// A nested design whose gauge cannot be told without the parts' spread.
    #[error(
        "in this design the spread of parts enters the gauge's; expected a variance of `{0}` too"
    )]
    PartsMatter(String),
    /// A design whose error holds the parts.
    #[error(
        "with one trial and no factor crossed with the parts the gauge cannot be told from them; expected two trials or more"
    )]
    NotApart,
    /// A number out of range.
    #[error("{what} is {value}; expected {expected}")]
    OutOfRange {
        /// Which.
        what: &'static str,
        /// What it is.
        value: f64,
        /// What it may be.
        expected: &'static str,
    },
    /// A design that gives no study.
    #[error(
        "the design has {parts} part(s) and {trials} trial(s); expected two parts and one trial at least"
    )]
    TooSmall {
        /// Parts.
        parts: usize,
        /// Trials.
        trials: usize,
    },
}

impl Candidate {
    /// The design of a study, to ask what more of it would buy.
    ///
    /// # Errors
    /// [`crate::DesignError`] when the record's factors are no design.
    pub fn of_study(study: &Study) -> Result<Candidate, crate::DesignError> {
        Ok(Candidate {
            design: Design::new(study.design.factors.clone())?,
            trials: study.design.trials,
        })
    }

    /// Parts × appraisers, all crossed.
    ///
    /// # Errors
    /// [`crate::DesignError`] for no levels or too many cells.
    pub fn crossed(
        parts: usize,
        appraisers: usize,
        trials: usize,
    ) -> Result<Candidate, crate::DesignError> {
        let factors = vec![
            Factor::crossed(PART, parts),
            Factor::crossed("appraiser", appraisers),
        ];
        Ok(Candidate {
            design: Design::new(factors)?,
            trials,
        })
    }

    /// The same with twice the trials.
    pub fn with_twice_the_trials(&self) -> Candidate {
        Candidate {
            design: self.design.clone(),
            trials: self.trials * 2,
        }
    }

    /// The same with twice the levels of one factor.
    ///
    /// # Errors
    /// [`crate::DesignError`] for too many cells.
    pub fn with_twice_the(&self, factor: &str) -> Result<Candidate, crate::DesignError> {
        let mut factors = self.design.factors().to_vec();
        for f in factors.iter_mut().filter(|f| f.name == factor) {
            f.levels *= 2;
        }
        Ok(Candidate {
            design: Design::new(factors)?,
            trials: self.trials,
        })
    }
}

impl Assumption {
    /// The gauge as a study estimates it; `None` without a share of tolerance or without a spread.
    ///
    /// What the study cannot tell from repeatability counts as repeatability.
    pub fn from_study(study: &Study, limit: f64, studies: u32, seed: u64) -> Option<Assumption> {
        let share = study.figures.gauge.share_of_tolerance.estimate;
        let variance =
            |c: &crate::record::Component| Some((c.name.to_string(), c.variance.estimate?));
        Some(Assumption {
            mix: study.components.iter().filter_map(variance).collect(),
            share: share.filter(|s| *s > 0.0)?,
            limit,
            confidence: study.confidence,
            studies,
            seed,
        })
    }

    /// What studies of a design would show.
    ///
    /// # Errors
    /// [`PlanningError`] when the assumption does not fit the design or a number is out of range.
    pub fn outlook(&self, candidate: &Candidate) -> Result<Outlook, PlanningError> {
        self.check(candidate)?;
        let gauge = Gauge::of(self, candidate)?;
        let constants = Constants::all(&gauge.df, 0.5 * (1.0 - self.confidence));
        let weights = gauge.whole.weights();
        let mut streams = Random::new(self.seed);
        let mut lines: Vec<Random> = gauge.df.iter().map(|_| streams.stream()).collect();

        let above = self.share > self.limit;
        let studies = self.studies as usize;
        let mut right = 0u32;
        let mut width = 0.0;
        let mut ms = vec![0.0; gauge.df.len()];
        let (mut estimates, mut lowers, mut uppers) = (
            Vec::with_capacity(studies),
            Vec::with_capacity(studies),
            Vec::with_capacity(studies),
        );
        for _ in 0..studies {
            for (q, line) in lines.iter_mut().enumerate() {
                ms[q] = gauge.expected[q] * line.chi_square(gauge.df[q]) / gauge.df[q];
            }
            let over_truth = |variance: f64| (variance.max(0.0) / gauge.variance).sqrt();
            let sum: f64 = gauge.components.iter().map(|c| c.value(&ms).max(0.0)).sum();
            let estimate = over_truth(sum);
            let lower = over_truth(constants.lower(&weights, &ms));
            let upper = over_truth(constants.upper(&weights, &ms));
            right += u32::from((estimate * self.share > self.limit) == above);
            width += upper - lower;
            estimates.push(estimate);
            lowers.push(lower);
            uppers.push(upper);
        }
        Ok(Outlook {
            readings: candidate.design.cells() * candidate.trials,
            right: f64::from(right) / f64::from(self.studies),
            estimate_low: percentile(&mut estimates, 0.05),
            estimate_high: percentile(&mut estimates, 0.95),
            lower: percentile(&mut lowers, 0.5),
            upper: percentile(&mut uppers, 0.5),
            upper_in_ten: percentile(&mut uppers, 0.9),
            width: width / f64::from(self.studies),
        })
    }

    fn check(&self, candidate: &Candidate) -> Result<(), PlanningError> {
        let parts = candidate.design.factors()[candidate.design.part()].levels;
        if parts < 2 || candidate.trials == 0 {
            return Err(PlanningError::TooSmall {
                parts,
                trials: candidate.trials,
            });
        }
        let out_of_range = |what, value, expected| {
            Err(PlanningError::OutOfRange {
                what,
                value,
                expected,
            })
        };
        for (what, value) in [("the true share", self.share), ("the limit", self.limit)] {
            if !(value > 0.0 && value.is_finite()) {
                return out_of_range(what, value, "a number above 0, such as 0.3");
            }
        }
        if !(self.confidence >= 0.5 && self.confidence < 1.0) {
            return out_of_range(
                "the confidence",
                self.confidence,
                "at least 0.5 and below 1",
            );
        }
        if self.studies == 0 {
            return out_of_range("the number of studies", 0.0, "1 or more");
        }
        Ok(())
    }

    fn variance_of(&self, name: &str) -> f64 {
        self.mix
            .iter()
            .filter(|(n, _)| n == name)
            .map(|(_, v)| v)
            .sum()
    }
}

/// The assumed gauge in one design.
struct Gauge {
    df: Vec<f64>,
    /// Expected mean squares of the lines that a study of the design has.
    expected: Vec<f64>,
    components: Vec<Combination>,
    whole: Combination,
    variance: f64,
}

impl Gauge {
    fn of(assumed: &Assumption, candidate: &Candidate) -> Result<Gauge, PlanningError> {
        let design = &candidate.design;
        let full = Model::full(design, candidate.trials);
        let names: Vec<&str> = full.lines().iter().map(|l| l.name.as_str()).collect();
        for (name, value) in &assumed.mix {
            if !names.contains(&name.as_str()) {
                return Err(PlanningError::NoSuchSource {
                    source_name: name.clone(),
                    expected: names.join(", "),
                });
            }
            if !(*value >= 0.0 && value.is_finite()) {
                return Err(PlanningError::Variance {
                    source_name: name.clone(),
                    value: *value,
                });
            }
        }
        let variances: Vec<f64> = names.iter().map(|n| assumed.variance_of(n)).collect();
        let part = full.part();
        let variance: f64 = (0..names.len())
            .filter(|&i| Some(i) != part)
            .map(|i| variances[i])
            .sum();
        if variance <= 0.0 || !variance.is_finite() {
            return Err(PlanningError::NoVariance);
        }
        for (i, line) in full.lines().iter().enumerate() {
            if line.name != WITHIN_CELLS && line.df == 0 && variances[i] > 0.0 {
                return Err(PlanningError::Unseen(line.name.clone()));
            }
        }

        let model = Model::estimable(design, candidate.trials);
        if model.part().is_none() {
            return Err(PlanningError::NotApart);
        }
        // The line of the full model whose mean square a line of the study is: with one trial the error is another.
        let taken_in = model.taken_in_by_error(design);
        let place = |name: &str| {
            let name = match &taken_in {
                Some(taken_in) if name == WITHIN_CELLS => taken_in.as_str(),
                _ => name,
            };
            names.iter().position(|n| *n == name)
        };
        let expected: Vec<f64> = model
            .lines()
            .iter()
            .filter_map(|line| place(&line.name))
            .map(|line| {
                let weights = full.expected_mean_square(line);
                weights
                    .iter()
                    .zip(&variances)
                    .map(|(&w, v)| w as f64 * v)
                    .sum()
            })
            .collect();
        debug_assert_eq!(expected.len(), model.lines().len());

        let error = model.lines().len() - 1;
        let of_gauge: Vec<usize> = model.reproducibility().chain([error]).collect();
        let whole = model
            .sum(of_gauge.iter().copied())
            .ok_or(PlanningError::NoVariance)?;
        let parts_matter = |part: usize| {
            let enters = |q: usize| {
                place(&model.lines()[q].name)
                    .is_some_and(|line| full.expected_mean_square(line)[part] > 0)
            };
            variances[part] == 0.0 && whole.members().any(enters)
        };
        if let Some(part) = part.filter(|&p| parts_matter(p)) {
            return Err(PlanningError::PartsMatter(names[part].to_owned()));
        }
        Ok(Gauge {
            df: model.lines().iter().map(|l| l.df as f64).collect(),
            components: of_gauge.iter().map(|&i| model.component(i)).collect(),
            expected,
            whole,
            variance,
        })
    }
}
