//! Pooling: which interactions the error takes in.
//!
//! Model: from the largest interaction down, one that no other term holds is pooled when its p exceeds the limit; the
//! next is then tested against the error that has taken it in. Every p is the one by which its term was pooled.

use crate::design::Design;
use crate::model::Model;
use crate::record::Remark;
use crate::remarks::outside;
use crate::settings::Interaction;
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
pub(crate) fn pooled_above(
    limit: f64,
    design: &Design,
    full: &Model,
    sums: &Sums,
) -> (Vec<Pooled>, Option<Model>) {
    let mut taken_in = Vec::new();
    let mut left: Option<Model> = None;
    loop {
        let now = left.as_ref().unwrap_or(full);
        let table = Table::new(now, sums);
        let next = now
            .interactions()
            .into_iter()
            .filter(|&line| now.is_outermost(line))
            .find_map(|line| Some((line, table.test(line)?.p)).filter(|(_, p)| *p > limit));
        let Some((line, p)) = next else {
            return (taken_in, left);
        };
        let name = now.lines()[line].name.clone();
        taken_in.push(Pooled { name, p });
        left = Some(now.without(design, &[line]));
    }
}

/// Names the terms pooled in a study of equal cells, where there was more than one to pool.
pub(crate) fn remark(
    interaction: Interaction,
    design: &Design,
    full: &Model,
    sums: &Sums,
) -> Option<Remark> {
    let Interaction::PoolAbove(limit) = interaction else {
        return None;
    };
    if full.interactions().len() < 2 {
        return None;
    }
    let (taken_in, left) = pooled_above(limit, design, full, sums);
    outside::terms_pooled(limit, &taken_in, &left?.interaction_names())
}
