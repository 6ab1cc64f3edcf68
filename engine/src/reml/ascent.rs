//! The components at which the restricted likelihood is largest, none of them below zero.
//!
//! Newton steps on the observed information where that is positive, otherwise on the expected one (scoring). A step
//! ends where the first component meets zero, and is halved until the likelihood does not fall, so that it rises from
//! step to step. A component stays at zero while its slope there is not above zero. The error is kept above zero.
//!
//! Invariant: what is returned satisfies these conditions, or it is no result.

use super::blocks::Blocks;
use super::dense::{Matrix, dot};
use super::likelihood::Evaluation;
use super::reduced::Seen;

const STEPS_MAX: usize = 300;
const HALVINGS_MAX: usize = 50;
/// Slopes at zero this small, squared in standard errors, are rounding.
const FLAT: f64 = 1e-12;
/// A step this short that rounding keeps from rising ends the search too.
const ROUNDED: f64 = 1e-7;
/// Rounding of the likelihood, relative.
const SLACK: f64 = 1e-12;
/// Part of itself by which the error may shrink in one step.
const ERROR_SHRINKS_TO: f64 = 0.05;
/// Error variance, in squares of the largest deviation, that is nothing but rounding.
const ERROR_MIN: f64 = 1e-24;
/// The same when the search fails there.
const ERROR_LOST: f64 = 1e-15;

/// How near to the maximum the search ends: squared length of its last step, in standard errors.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Ends {
    /// For estimates: within 1e-12 standard errors, because Newton's next error is the square of a step.
    Exactly,
    /// For draws: within 1e-6.
    Nearly,
}

impl Ends {
    fn after(self, newton: bool) -> f64 {
        match (self, newton) {
            (Ends::Exactly, true) => 1e-12,
            (Ends::Exactly, false) => 1e-22,
            (Ends::Nearly, true) => 1e-6,
            (Ends::Nearly, false) => 1e-10,
        }
    }
}

/// Where the search ended.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Summit {
    pub(super) components: Vec<f64>,
    pub(super) at: Evaluation,
    pub(super) steps: usize,
}

/// Why there is no summit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum NoSummit {
    /// The error shrinks without end.
    NoError,
    /// The search did not come to an end.
    Unsettled,
}

struct Step {
    /// By component; zero for those that stay.
    change: Vec<f64>,
    /// Squared length in standard errors.
    length: f64,
    newton: bool,
}

impl Blocks {
    /// Climbs from `start`, in which the error, the last, is above zero.
    pub(super) fn climb(
        &self,
        seen: &Seen,
        start: Vec<f64>,
        ends: Ends,
    ) -> Result<Summit, NoSummit> {
        let error = start.len() - 1;
        let failed = |components: &[f64]| {
            if components[error] < ERROR_LOST {
                NoSummit::NoError
            } else {
                NoSummit::Unsettled
            }
        };
        let mut components = start;
        let mut at = self
            .evaluate(seen, &components)
            .ok_or(NoSummit::Unsettled)?;
        for steps in 1..=STEPS_MAX {
            let step = step(&components, &at).ok_or_else(|| failed(&components))?;
            let enough = ends.after(step.newton);
            let (next, full) = match self.rise(seen, &components, &at, &step) {
                Some(risen) => risen,
                None if step.length < ROUNDED => {
                    return Ok(Summit {
                        components,
                        at,
                        steps,
                    });
                }
                None => return Err(failed(&components)),
            };
            (components, at) = next;
            if components[error] < ERROR_MIN {
                return Err(NoSummit::NoError);
            }
            if full && step.length <= enough && !released(&components, &at) {
                return Ok(Summit {
                    components,
                    at,
                    steps,
                });
            }
        }
        Err(NoSummit::Unsettled)
    }

    /// The point after a step, halved until the likelihood does not fall, and whether the step was taken whole.
    fn rise(
        &self,
        seen: &Seen,
        from: &[f64],
        at: &Evaluation,
        step: &Step,
    ) -> Option<((Vec<f64>, Evaluation), bool)> {
        let error = from.len() - 1;
        let mut part: f64 = 1.0;
        let mut meets_zero = None;
        for (i, (x, change)) in from.iter().zip(&step.change).enumerate() {
            let room = if i == error {
                x * (1.0 - ERROR_SHRINKS_TO)
            } else {
                *x
            };
            if -change * part > room {
                part = room / -change;
                meets_zero = (i != error).then_some(i);
            }
        }
        let whole = part == 1.0;
        let lowest = at.log_likelihood - SLACK * (self.readings as f64 + at.log_likelihood.abs());
        for halving in 0..HALVINGS_MAX {
            let mut to: Vec<f64> = from
                .iter()
                .zip(&step.change)
                .map(|(x, change)| (x + part * change).max(0.0))
                .collect();
            if let Some(i) = meets_zero.filter(|_| halving == 0) {
                to[i] = 0.0;
            }
            if let Some(there) = self.evaluate(seen, &to)
                && there.log_likelihood >= lowest
            {
                return Some(((to, there), whole && halving == 0));
            }
            part *= 0.5;
        }
        None
    }
}

/// Whether a component at zero would rise from it by more than rounding.
fn released(components: &[f64], at: &Evaluation) -> bool {
    (0..components.len()).any(|i| {
        components[i] == 0.0
            && at.score[i] > 0.0
            && at.score[i].powi(2) > FLAT * at.expected[(i, i)]
    })
}

/// The step from a point; `None` when no information is positive.
fn step(components: &[f64], at: &Evaluation) -> Option<Step> {
    let mut free: Vec<usize> = (0..components.len())
        .filter(|&i| components[i] > 0.0 || at.score[i] > 0.0)
        .collect();
    loop {
        let score: Vec<f64> = free.iter().map(|&i| at.score[i]).collect();
        let by = |information: &Matrix| information.part(&free).cholesky();
        let (factor, newton) = match by(&at.observed) {
            Some(factor) => (factor, true),
            None => (by(&at.expected)?, false),
        };
        let change = factor.solve(&score);
        let stays = (0..free.len()).find(|&k| components[free[k]] == 0.0 && change[k] <= 0.0);
        if let Some(k) = stays {
            free.remove(k);
            continue;
        }
        let mut of_all = vec![0.0; components.len()];
        for (&i, &change) in free.iter().zip(&change) {
            of_all[i] = change;
        }
        return Some(Step {
            length: dot(&score, &change),
            change: of_all,
            newton,
        });
    }
}
