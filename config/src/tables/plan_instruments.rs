//! What a plan asks of its instruments, and they of it.

use restudy_parsers::Trial;

use crate::checked::{Instrument, Plan};
use crate::source::Place;
use crate::walk::Table;
use restudy_parsers::{fold, nearest};

/// Tells everything in which plan and instrument do not fit.
pub(crate) fn fits(
    table: &Table<'_>,
    plan: &Plan,
    factor_places: &[Place<'_>],
    instrument: &Instrument,
) {
    let name = &instrument.name;
    let rule = &instrument.rule;
    match (&plan.appraisers, &rule.appraiser) {
        (Some(_), None) => table.place_of("appraisers").fault_hint(
            format!("appraisers, and none in the exports of instrument \"{name}\""),
            "a role `appraiser` in its [instrument.read], or no appraisers",
            "on an automatic machine the appraiser may be the loading, the shift or the fixture seat",
        ),
        (None, Some(_)) => table.place_of("appraisers").fault_hint(
            format!("nothing, and a role `appraiser` at instrument \"{name}\""),
            "the plan's appraisers",
            "say how many there are, or their names; or leave the role out",
        ),
        _ => {}
    }
    match (&rule.trial, plan.trials) {
        (None, 2..) => table.place_of("trials").fault_hint(
            format!(
                "{} trials, and no role `trial` at instrument \"{name}\"",
                plan.trials
            ),
            "a role `trial` in its [instrument.read], or trials = 1",
            "where exports do not number them: trial = { count = \"taken\" }",
        ),
        (Some(Trial::Stated(_) | Trial::Counted(_)) | None, _) => {}
    }
    for (factor, place) in plan.factors.iter().zip(factor_places) {
        if !rule
            .factors
            .keys()
            .any(|other| fold(other) == fold(&factor.name))
        {
            let close = nearest(&factor.name, rule.factors.keys().map(String::as_str));
            place.fault_nearest(
                format!("a factor that instrument \"{name}\" does not read"),
                "a name in `factors` of its [instrument.read]",
                close,
            );
        }
    }
    for factor in rule.factors.keys() {
        if !plan
            .factors
            .iter()
            .any(|other| fold(&other.name) == fold(factor))
        {
            table.place.warn(
                format!("no factor \"{factor}\", which instrument \"{name}\" reads"),
                format!("a [[plan.factor]] named \"{factor}\""),
                "without it, its levels are mixed in this plan; what must not change belongs in `same`",
            );
        }
    }
    if plan.repeat_every.is_some() && rule.taken.is_none() && rule.round.is_none() {
        table.place_of("repeat_every").fault_hint(
            format!("a repeated study, and neither `taken` nor `round` at instrument \"{name}\""),
            "one of these roles in its [instrument.read]",
            "without it a run of the next round cannot be told from a late one of this round",
        );
    }
}

/// Tells when an earlier plan leaves this one nothing of an instrument: an export goes to the first plan that takes it.
pub(crate) fn reached(table: &Table<'_>, plan: &Plan, earlier: &[Plan]) {
    let only = |plan: &Plan| plan.only.as_ref().map(|regex| regex.as_str().to_owned());
    for instrument in &plan.instruments {
        let takes_all = |other: &&Plan| {
            other.instruments.contains(instrument)
                && (other.only.is_none() || only(other) == only(plan))
        };
        if let Some(first) = earlier.iter().find(takes_all) {
            table.place_of("only").fault_hint(
                format!("nothing left: plan \"{}\" above takes these exports of instrument \"{instrument}\"", first.name),
                "exports that no earlier plan takes",
                format!("give both an `only` of their own, or put plan \"{}\" last", first.name),
            );
        }
    }
}
