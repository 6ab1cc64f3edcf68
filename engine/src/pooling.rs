//! Pooling: which interactions the error takes in.
//!
//! Model: from the largest interaction down, one that no other term holds is pooled when its p exceeds the limit; the
//! next is then tested against the error that has taken it in. Every p is the one by which its term was pooled.

use std::sync::Arc;

use crate::basis::Basis;
use crate::model::Model;
use crate::sums::Sums;
use crate::table::Table;

/// An interaction that the error took in.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Pooled {
    pub(crate) name: String,
    /// By the test that pooled it.
    pub(crate) p: f64,
}

/// What the error takes in above a p, in this order, and the model that is left; `None` when it takes in nothing.
///
/// `without` gives a model without one of its lines.
pub(crate) fn pooled_above(
    limit: f64,
    full: &Arc<Basis>,
    sums: &Sums,
    without: impl Fn(&Model, usize) -> Arc<Basis>,
) -> (Vec<Pooled>, Option<Arc<Basis>>) {
    let mut taken_in = Vec::new();
    let mut left: Option<Arc<Basis>> = None;
    let (mut ss, mut ms) = (Vec::new(), Vec::new());
    loop {
        let basis = left.as_ref().unwrap_or(full);
        basis.mean_squares(sums, &mut ss, &mut ms);
        let (ss, ms) = (&ss[..], &ms[..]);
        let table = Table { basis, ss, ms };
        let model = &basis.model;
        let next = model
            .interactions()
            .into_iter()
            .filter(|&line| model.is_outermost(line))
            .find_map(|line| Some((line, table.test(line)?.p)).filter(|(_, p)| *p > limit));
        let Some((line, p)) = next else {
            return (taken_in, left);
        };
        let name = model.lines()[line].name.clone();
        taken_in.push(Pooled { name, p });
        left = Some(without(model, line));
    }
}
