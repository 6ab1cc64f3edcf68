//! Producer's and consumer's risk of one study, with generalized limits and guarded acceptance limits.
//!
//! Only for a named process: a stated mean and sd, or the mean and sd of the study parts, which the record then
//! says. The gauge sd is the study's. Limits are percentiles over draws of everything that the study estimates;
//! a stated process is taken as known.
//!
//! Not here: with three or more factors crossed the limits would cover too seldom and are absent.

mod guard;
mod misclassification;
mod of_study;
mod quadrature;
mod scaled;

pub use guard::{Guarded, guarded};
pub use misclassification::{Judged, Misclassification, misclassification};
pub(crate) use of_study::{Spreads, of_estimates, of_study};
