//! What a plan decides about judging: limits, the judged figure, interaction, process, one-sided tolerances.

use restudy_engine::{Interaction, Judge, Limits, OneSided, Process};

use crate::source::Place;
use crate::walk::{Node, Table};

const SHARE: &str = "a share of tolerance above 0 and up to 5";
const ORDER: &str = "watch below act";
const BACK_BELOW: f64 = 0.85;

/// A share; what looks like per cent gets a hint.
fn share(node: &Node<'_>) -> Option<f64> {
    let share = node.number(|_| true, SHARE)?;
    if share > 5.0 {
        node.fault_hint(
            SHARE,
            "a share of 1 is the whole tolerance: write 10 % as 0.10",
        );
    } else if share <= 0.0 {
        node.fault(SHARE);
    }
    (share > 0.0 && share <= 5.0).then_some(share)
}

fn back_below(node: &Node<'_>) -> Option<f64> {
    node.number(
        |part| part > 0.0 && part <= 1.0,
        "a part of the limit above 0 and up to 1",
    )
}

/// `[plan.limits]`: both limits are needed; so is their order.
pub(crate) fn limits(table: &Table<'_>) -> Option<(Limits, Judge)> {
    let watch = table.need("watch", SHARE).and_then(|node| share(&node));
    let act = table.need("act", SHARE).and_then(|node| share(&node));
    let back_below = table.or("back_below", BACK_BELOW, |node| back_below(node));
    let judge = table.or("judge", Judge::Estimate, |node| judge(node));
    table.finish();
    let limits = Limits {
        watch: watch?,
        act: act?,
        back_below: back_below?,
    };
    if limits.watch >= limits.act {
        table.place_of("watch").fault(
            format!("watch {} and act {}", limits.watch, limits.act),
            ORDER,
        );
        return None;
    }
    Some((limits, judge?))
}

/// What a characteristic says about its own limits.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct OwnLimits {
    watch: Option<f64>,
    act: Option<f64>,
    back_below: Option<f64>,
}

/// A characteristic's `limits`; at least one of them.
pub(crate) fn own_limits(node: &Node<'_>) -> Option<OwnLimits> {
    let table = node.table("a table such as { act = 0.20 }")?;
    let own = OwnLimits {
        watch: table.get("watch").and_then(|node| share(&node)),
        act: table.get("act").and_then(|node| share(&node)),
        back_below: table.get("back_below").and_then(|node| back_below(&node)),
    };
    table.finish();
    Some(own)
}

impl OwnLimits {
    /// Completed from the plan's, and in order.
    pub(crate) fn complete(self, plan: Limits, place: &Place<'_>) -> Option<Limits> {
        let limits = Limits {
            watch: self.watch.unwrap_or(plan.watch),
            act: self.act.unwrap_or(plan.act),
            back_below: self.back_below.unwrap_or(plan.back_below),
        };
        if limits.watch >= limits.act {
            let found = format!("watch {} and act {}", limits.watch, limits.act);
            place.fault_hint(
                found,
                ORDER,
                "a limit that a characteristic does not name is the plan's",
            );
            return None;
        }
        Some(limits)
    }
}

fn judge(node: &Node<'_>) -> Option<Judge> {
    if node.is_table() {
        let table = node.table("a table")?;
        let chance = |node: Node<'_>| {
            node.number(
                |chance| (0.5..1.0).contains(&chance),
                "a chance from 0.5 to below 1",
            )
        };
        let chance = table
            .need("chance", "a chance from 0.5 to below 1")
            .and_then(chance);
        table.finish();
        return chance.map(Judge::Chance);
    }
    match node.as_text() {
        Some("estimate") => Some(Judge::Estimate),
        Some("upper") => {
            node.place.warn(
                "`upper`",
                "\"estimate\" or { chance = 0.9 }",
                "with few appraisers the upper limit is several times the estimate, so good gauges will be above the limits",
            );
            Some(Judge::Upper)
        }
        _ => {
            node.fault("\"estimate\", { chance = 0.9 } or \"upper\"");
            None
        }
    }
}

/// `"keep"` or `{ pool_above = 0.25 }`.
pub(crate) fn interaction(node: &Node<'_>) -> Option<Interaction> {
    if node.is_table() {
        let table = node.table("a table")?;
        let p =
            |node: Node<'_>| node.number(|p| p > 0.0 && p < 1.0, "a probability between 0 and 1");
        let p = table
            .need("pool_above", "a probability between 0 and 1")
            .and_then(p);
        table.finish();
        return p.map(Interaction::PoolAbove);
    }
    if node.as_text() == Some("keep") {
        return Some(Interaction::Keep);
    }
    node.fault(INTERACTION);
    None
}

pub(crate) const INTERACTION: &str = "\"keep\" or { pool_above = 0.25 }";

/// `{ mean, sd }` or `"study parts"`.
pub(crate) fn process(node: &Node<'_>) -> Option<Process> {
    if node.as_text() == Some("study parts") {
        return Some(Process::StudyParts);
    }
    if !node.is_table() {
        node.fault("{ mean = …, sd = … } or \"study parts\"");
        return None;
    }
    let table = node.table("a table")?;
    let mean = table
        .need("mean", "the process mean")
        .and_then(|node| node.number(|_| true, "the process mean"));
    let sd = table
        .need("sd", "the process sd")
        .and_then(|node| node.number(|sd| sd > 0.0, "a standard deviation above 0"));
    table.finish();
    Some(Process::Stated {
        mean: mean?,
        sd: sd?,
    })
}

/// The words for one-sided rules; `none`: shown without a share.
pub(crate) const ONE_SIDED: [(&str, Option<OneSided>); 4] = [
    ("from zero", Some(OneSided::FromZero)),
    ("to process mean", Some(OneSided::ToProcessMean)),
    ("to study mean", Some(OneSided::ToStudyMean)),
    ("none", None),
];

/// A word of [`ONE_SIDED`] or `{ width = 0.05 }`.
pub(crate) fn one_sided(node: &Node<'_>) -> Option<Option<OneSided>> {
    if node.is_table() {
        let table = node.table("a table")?;
        let width = |node: Node<'_>| node.number(|width| width > 0.0, "a width above 0");
        let width = table.need("width", "a width above 0").and_then(width);
        table.finish();
        return width.map(|width| Some(OneSided::Width(width)));
    }
    let word = node
        .as_text()
        .and_then(|text| ONE_SIDED.iter().find(|(word, _)| *word == text));
    if word.is_none() {
        let known = ONE_SIDED
            .iter()
            .map(|(word, _)| format!("\"{word}\""))
            .collect::<Vec<_>>()
            .join(", ");
        node.fault(format!("{known} or {{ width = 0.05 }}"));
    }
    word.map(|(_, rule)| *rule)
}
