//! The chance that the true share lies above a limit: the confidence at which the one-sided lower limit of
//! the share equals that limit.
//!
//! A limit above the estimate is met by the upper limit: its confidence counts from the other end.

use crate::mls::lower_at_log_odds;
use crate::root;

/// Log odds beyond which a chance is called 0 or 1; about 1e-13.
const LOG_ODDS_MAX: f64 = 30.0;

/// Confidence, 0 to 1, that `sum weights[q] E[MS_q]` lies above `variance`.
pub(crate) fn above(variance: f64, weights: &[f64], df: &[f64], ms: &[f64]) -> f64 {
    let beyond = |log_odds: f64| lower_at_log_odds(weights, df, ms, log_odds) - variance;
    if beyond(LOG_ODDS_MAX) >= 0.0 {
        1.0
    } else if beyond(-LOG_ODDS_MAX) <= 0.0 {
        0.0
    } else {
        let log_odds = root::between(beyond, -LOG_ODDS_MAX, LOG_ODDS_MAX);
        1.0 / (1.0 + (-log_odds).exp())
    }
}
