//! A fit as the record writes it, in reading units.

use serde::Serialize;

use crate::figure::Figure;

use super::dense::Matrix;
use super::fit::{Evidence, Fit};

const REPEATS_EQUAL: &str = "all repeats are equal, so that the likelihood grows without bound as repeatability goes to zero; the other components are those of the cell means";
const ALL_EQUAL: &str = "all readings are equal";

/// Restricted maximum likelihood: variance components of unequal cells.
///
/// Variances in squared reading units; slopes and information belong to them. Rows and columns of every matrix are
/// in the order of `order`.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Reml {
    /// Names of the components, `within cells` last.
    pub order: Vec<String>,
    /// Their estimates, at zero or above.
    pub estimates: Vec<f64>,
    /// Components that the likelihood puts at zero.
    pub at_zero: Vec<String>,
    /// Mean by generalised least squares, in reading units.
    pub mean: f64,
    /// Log of the restricted likelihood at the estimates, all constants included.
    pub log_likelihood: Option<f64>,
    /// Its slope there: zero, or at or below zero for a component at zero.
    pub score: Option<Vec<f64>>,
    /// Expected information.
    pub expected_information: Option<Vec<Vec<f64>>>,
    /// Observed information: minus the second derivatives.
    pub observed_information: Option<Vec<Vec<f64>>>,
    /// Covariance of all estimates: inverse of the expected information.
    pub covariance: Option<Vec<Vec<f64>>>,
    /// Covariance of the estimates above zero when those at zero are left out, in the same order without them.
    pub covariance_above_zero: Option<Vec<Vec<f64>>>,
    /// Steps to the maximum.
    pub iterations: usize,
    /// Twice the log likelihood that the largest interaction adds; absent without one.
    pub interaction_statistic: Option<f64>,
    /// Limits of the gauge by parametric bootstrap.
    pub bootstrap: Option<GaugeBootstrap>,
    /// Why numbers are absent.
    pub reason: Option<&'static str>,
}

/// The gauge with limits from studies drawn anew.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct GaugeBootstrap {
    /// Gauge variance.
    pub variance: Figure,
    /// Gauge sd.
    pub sd: Figure,
    /// Gauge share of tolerance.
    pub share_of_tolerance: Figure,
}

impl Reml {
    /// `scale` takes the fit's numbers to reading units.
    pub(super) fn of(fit: &Fit, scale: f64) -> Reml {
        let lines = fit.model.lines();
        let names = |kept: &dyn Fn(usize) -> bool| -> Vec<String> {
            let kept = (0..lines.len()).filter(|&i| kept(i));
            kept.map(|i| lines[i].name.clone()).collect()
        };
        let square = scale * scale;
        let blank = Reml {
            order: names(&|_| true),
            estimates: fit.components.iter().map(|x| x * square).collect(),
            at_zero: names(&|i| fit.components[i] == 0.0),
            mean: fit.mean,
            log_likelihood: None,
            score: None,
            expected_information: None,
            observed_information: None,
            covariance: None,
            covariance_above_zero: None,
            iterations: 0,
            interaction_statistic: None,
            bootstrap: None,
            reason: None,
        };
        let (blocks, summit) = match &fit.evidence {
            Evidence::Summit { blocks, summit } => (blocks, summit),
            Evidence::RepeatsEqual { steps } => {
                return Reml {
                    iterations: *steps,
                    reason: Some(REPEATS_EQUAL),
                    ..blank
                };
            }
            Evidence::AllEqual => {
                return Reml {
                    reason: Some(ALL_EQUAL),
                    ..blank
                };
            }
        };
        let at = &summit.at;
        let above: Vec<usize> = (0..lines.len())
            .filter(|&i| fit.components[i] > 0.0)
            .collect();
        let inverse = |information: Matrix| information.cholesky().map(|factor| factor.inverse());
        let fourth = square * square;
        Reml {
            log_likelihood: Some(at.log_likelihood - (blocks.readings - 1) as f64 * scale.ln()),
            score: finite(vec![at.score.iter().map(|x| x / square).collect()])
                .and_then(|mut s| s.pop()),
            expected_information: rows(&at.expected, 1.0 / fourth),
            observed_information: rows(&at.observed, 1.0 / fourth),
            covariance: inverse(at.expected.clone()).and_then(|c| rows(&c, fourth)),
            covariance_above_zero: inverse(at.expected.part(&above)).and_then(|c| rows(&c, fourth)),
            iterations: summit.steps,
            ..blank
        }
    }
}

/// The rows of a matrix times `factor`; `None` when a number is too large to be written.
fn rows(matrix: &Matrix, factor: f64) -> Option<Vec<Vec<f64>>> {
    let rows = (0..matrix.rows()).map(|row| matrix.row(row).iter().map(|x| x * factor).collect());
    finite(rows.collect())
}

fn finite(rows: Vec<Vec<f64>>) -> Option<Vec<Vec<f64>>> {
    rows.iter().flatten().all(|x| x.is_finite()).then_some(rows)
}
