//! `[[plan.characteristic]]`, and its checked form.
//!
//! Model: a [`Draft`] is what one table or one row of a list says; drafts of one name are merged, the
//! table over the row, then checked as a whole.

use restudy_engine::{Limits, OneSided, Process};

use crate::checked::Characteristic;
use crate::source::Place;
use crate::tables::judging::{OwnLimits, one_sided, own_limits, process};
use crate::walk::{Node, Table};
use restudy_parsers::{fold, nearest};

/// What is said about one characteristic, and where.
#[derive(Debug, Clone)]
pub(crate) struct Draft<'a> {
    pub(crate) place: Place<'a>,
    /// Where single values stand, if not there.
    pub(crate) places: Vec<(&'static str, Place<'a>)>,
    pub(crate) name: String,
    pub(crate) nominal: Option<f64>,
    pub(crate) lower: Option<f64>,
    pub(crate) upper: Option<f64>,
    pub(crate) unit: Option<String>,
    /// `Some(None)`: said to be none.
    pub(crate) one_sided: Option<Option<OneSided>>,
    pub(crate) special: Option<bool>,
    pub(crate) limits: OwnLimits,
    pub(crate) process: Option<Process>,
}

pub(crate) fn draft<'a>(table: &Table<'a>) -> Option<Draft<'a>> {
    let name = table
        .need("name", "the characteristic's name as in the exports")
        .and_then(|node| node.name());
    let draft = |name: &str| Draft {
        place: table.place.clone(),
        places: ["nominal", "lower", "upper", "one_sided", "limits"]
            .into_iter()
            .map(|key| (key, table.place_of(key)))
            .collect(),
        name: name.to_owned(),
        nominal: table.get("nominal").and_then(|node| finite(&node)),
        lower: table.get("lower").and_then(|node| finite(&node)),
        upper: table.get("upper").and_then(|node| finite(&node)),
        unit: table
            .get("unit")
            .and_then(|node| node.name())
            .map(str::to_owned),
        one_sided: table.get("one_sided").and_then(|node| one_sided(&node)),
        special: table.get("special").and_then(|node| node.flag()),
        limits: table
            .get("limits")
            .and_then(|node| own_limits(&node))
            .unwrap_or_default(),
        process: table.get("process").and_then(|node| process(&node)),
    };
    let draft = draft(name.unwrap_or_default());
    table.later(&["gauge", "due", "baseline", "spellings"]);
    table.finish();
    name.map(|_| draft)
}

fn finite(node: &Node<'_>) -> Option<f64> {
    node.number(|_| true, "a number")
}

/// The tables over the rows of the list, if there is one; then every name must be in it.
pub(crate) fn merged<'a>(list: Option<Vec<Draft<'a>>>, tables: Vec<Draft<'a>>) -> Vec<Draft<'a>> {
    let tables = once(tables);
    let Some(list) = list else { return tables };
    let mut drafts = once(list);
    for table in tables {
        match drafts
            .iter_mut()
            .find(|row| fold(&row.name) == fold(&table.name))
        {
            Some(row) => *row = over(table, row),
            None => {
                let close = nearest(&table.name, drafts.iter().map(|row| row.name.as_str()));
                table.place.fault_nearest(
                    format!("`{}`", table.name),
                    "a characteristic of the plan's list",
                    close,
                );
            }
        }
    }
    drafts
}

/// Each name once; the second is told.
fn once(drafts: Vec<Draft<'_>>) -> Vec<Draft<'_>> {
    let mut kept: Vec<Draft<'_>> = Vec::new();
    for draft in drafts {
        match kept
            .iter()
            .find(|other| fold(&other.name) == fold(&draft.name))
        {
            Some(first) => draft.place.fault(
                format!("the same characteristic as in line {}", first.place.line()),
                "each characteristic once",
            ),
            None => kept.push(draft),
        }
    }
    kept
}

impl<'a> Draft<'a> {
    fn place_of(&self, key: &str) -> Place<'a> {
        let place = self
            .places
            .iter()
            .find(|(name, _)| *name == key)
            .map(|(_, place)| place.clone());
        place.unwrap_or_else(|| self.place.below(key))
    }
}

fn over<'a>(table: Draft<'a>, row: &Draft<'a>) -> Draft<'a> {
    Draft {
        nominal: table.nominal.or(row.nominal),
        lower: table.lower.or(row.lower),
        upper: table.upper.or(row.upper),
        unit: table.unit.or_else(|| row.unit.clone()),
        one_sided: table.one_sided.or(row.one_sided),
        special: table.special.or(row.special),
        ..table
    }
}

/// The draft as a whole: limits in order, the nominal between, a one-sided rule that can be followed.
pub(crate) fn checked(
    draft: &Draft<'_>,
    plan: Limits,
    plan_process: Option<Process>,
) -> Option<Characteristic> {
    let limits = draft.limits.complete(plan, &draft.place_of("limits"));
    let in_order = tolerance_in_order(draft);
    let one_sided = draft.one_sided.flatten();
    let rule_fits =
        one_sided.is_none_or(|rule| rule_fits(draft, rule, draft.process.or(plan_process)));
    (in_order && rule_fits).then_some(())?;
    Some(Characteristic {
        name: draft.name.clone(),
        nominal: draft.nominal,
        lower: draft.lower,
        upper: draft.upper,
        unit: draft.unit.clone(),
        one_sided,
        special: draft.special.unwrap_or(false),
        limits: limits?,
        process: draft.process,
    })
}

fn tolerance_in_order(draft: &Draft<'_>) -> bool {
    let (lower, upper) = (
        draft.lower.unwrap_or(f64::NEG_INFINITY),
        draft.upper.unwrap_or(f64::INFINITY),
    );
    if lower >= upper {
        draft.place_of("lower").fault(
            format!("{lower} with an upper limit of {upper}"),
            "a lower limit below the upper one",
        );
        return false;
    }
    match draft.nominal {
        Some(nominal) if nominal < lower || nominal > upper => {
            let limit = if nominal < lower {
                format!("a lower limit of {lower}")
            } else {
                format!("an upper limit of {upper}")
            };
            draft.place_of("nominal").fault_hint(
                format!("{nominal} with {limit}"),
                "a nominal between the limits",
                "limits are absolute here, not deviations from the nominal",
            );
            false
        }
        _ => true,
    }
}

fn rule_fits(draft: &Draft<'_>, rule: OneSided, process: Option<Process>) -> bool {
    let place = draft.place_of("one_sided");
    if draft.lower.is_some() && draft.upper.is_some() {
        place.fault(
            "a rule for one-sided tolerances, with a lower and an upper limit",
            "one limit only, or no such rule",
        );
        return false;
    }
    if rule == OneSided::FromZero && draft.lower.or(draft.upper) == Some(0.0) {
        place.fault("`from zero` with a limit of 0", "a limit away from zero");
        return false;
    }
    if rule == OneSided::ToProcessMean && !matches!(process, Some(Process::Stated { .. })) {
        place.fault_hint(
            "`to process mean` without a stated process",
            "process = { mean = …, sd = … } here or in the plan",
            "the mean of the study's own parts is named \"to study mean\"",
        );
        return false;
    }
    true
}
