//! A round in which nothing could be judged: the most common reason, and what to do about it.

use crate::analyse::study::Outcome;

/// Sentences; the outcomes come in the page's order, and of reasons alike in number the first is told.
pub(super) fn unjudged(ranked: &[&Outcome]) -> String {
    let alike = |outcome: &Outcome| {
        ranked
            .iter()
            .filter(|o| reason(o) == reason(outcome))
            .count()
    };
    let first = ranked
        .iter()
        .reduce(|a, b| if alike(b) > alike(a) { b } else { a });
    let Some(first) = first else {
        return "Nothing was measured.".to_owned();
    };
    let why = reason(first);
    let what = match (ranked.len(), alike(first)) {
        (1, _) => format!("{} could not be judged: {why}.", first.characteristic),
        (all, n) if n == all => {
            format!("None of the {all} characteristics could be judged: {why}.")
        }
        (all, n) => {
            format!(
                "None of the {all} characteristics could be judged, {n} of them for this reason: {why}."
            )
        }
    };
    format!("{what} Next: {}.", next(first))
}

fn reason(outcome: &Outcome) -> &str {
    match &outcome.study {
        Ok(record) => &record.standing.why,
        Err(fault) => fault,
    }
}

fn next(outcome: &Outcome) -> &'static str {
    match &outcome.study {
        Ok(record) if record.lower.is_none() && record.upper.is_none() => {
            "give its limits in the plan, or read them from the exports"
        }
        Ok(record) if record.study.tolerance_rule == "none" => {
            "name in the plan how a one-sided tolerance is to be judged (`one_sided`)"
        }
        _ => "set right what the reason names, in the exports or in the plan",
    }
}
