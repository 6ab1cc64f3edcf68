//! The status for people.

use super::Status;
use crate::cli::table::table;
use crate::rounds::missing::Missing;

/// Missing cells named one by one; the JSON has all.
const CELLS_NAMED: usize = 12;
/// Entries of one list; the JSON has all.
const ENTRIES_SHOWN: usize = 20;

pub(super) fn for_people(status: &Status) -> String {
    let mut out = String::new();
    if status.rounds.is_empty() {
        out.push_str("No round has started yet.\n");
    } else {
        let rows = status.rounds.iter().map(|r| {
            vec![
                r.plan.clone(),
                r.round.to_string(),
                r.state.to_owned(),
                format!("{} of {}", r.runs_used, r.runs_planned),
                r.opened.clone().unwrap_or_else(|| "–".into()),
                r.closed.clone().unwrap_or_else(|| "–".into()),
            ]
        });
        let headings = ["plan", "round", "state", "runs", "opened", "closed"];
        out.push_str(&table(&headings, &[1, 3], rows.collect()));
    }
    for round in status
        .rounds
        .iter()
        .filter(|r| !r.missing.is_empty() && r.state != "unfinished")
    {
        out.push_str(&format!(
            "\n{} round {}: still missing\n",
            round.plan, round.round
        ));
        for cell in round.missing.iter().take(CELLS_NAMED) {
            out.push_str(&format!("  {}\n", in_words(cell)));
        }
        if round.missing.len() > CELLS_NAMED {
            out.push_str(&format!(
                "  and {} more cells\n",
                round.missing.len() - CELLS_NAMED
            ));
        }
    }
    for round in status.rounds.iter().filter(|r| r.state == "held") {
        let reason = round.reason.as_deref().unwrap_or_default();
        out.push_str(&format!(
            "\n{} round {} waits for a person: {reason}\n",
            round.plan, round.round
        ));
    }
    list(
        &mut out,
        "Refused exports",
        status.refused.iter().map(|r| {
            let sentence = format!("{} / {}: {}", r.instrument, r.export, r.reason);
            (sentence, r.hint.clone())
        }),
    );
    list(
        &mut out,
        "Set aside",
        status.set_aside.iter().map(|a| {
            let readings = counted(a.readings, "reading");
            (
                format!("{} ({readings}): {}", a.export, a.reason),
                a.hint.clone(),
            )
        }),
    );
    list(
        &mut out,
        "Kept, not used",
        status.not_used.iter().map(|u| {
            (
                format!("{} ({}): {}: {}", u.run, u.export, u.status, u.reason),
                None,
            )
        }),
    );
    list(
        &mut out,
        "Not judged",
        status.not_judged.iter().map(|n| {
            (
                format!(
                    "{} round {}, {}: {}",
                    n.plan, n.round, n.characteristic, n.reason
                ),
                None,
            )
        }),
    );
    list(
        &mut out,
        "Owed notices",
        status.owed.iter().map(|o| {
            let to = match o.recipient.as_str() {
                "" => String::new(),
                recipient => format!(" to {recipient}"),
            };
            let tries = o
                .last_error
                .as_ref()
                .map(|e| format!("; {}, the last: {e}", counted(i64::from(o.attempts), "try")));
            (
                format!(
                    "{}{to}: {}{}",
                    o.channel,
                    o.subject,
                    tries.unwrap_or_default()
                ),
                None,
            )
        }),
    );
    let a = &status.readings;
    out.push_str(&format!("\n{} readings met:", a.total));
    let places = [
        (a.used, "used"),
        (a.copy, "copies"),
        (a.superseded, "superseded"),
        (a.surplus, "surplus"),
        (a.late, "late"),
        (a.set_aside, "set aside"),
        (a.held, "held"),
        (a.excluded, "excluded"),
        (a.unfinished, "in unfinished rounds"),
        (a.not_for_a_plan, "not for a plan"),
    ];
    let said: Vec<String> = places
        .iter()
        .filter(|(n, _)| *n > 0)
        .map(|(n, what)| format!(" {n} {what}"))
        .collect();
    out.push_str(&said.join(","));
    out.push('\n');
    out
}

/// Lists sentences under a title; the same hint is given once, after the last sentence it belongs to.
fn list(out: &mut String, title: &str, entries: impl Iterator<Item = (String, Option<String>)>) {
    let entries: Vec<(String, Option<String>)> = entries.collect();
    if entries.is_empty() {
        return;
    }
    out.push_str(&format!("\n{title}\n"));
    for (index, (sentence, hint)) in entries.iter().take(ENTRIES_SHOWN).enumerate() {
        out.push_str(&format!("  {sentence}\n"));
        let next = entries.get(index + 1).and_then(|(_, hint)| hint.as_ref());
        if let Some(hint) = hint.as_ref().filter(|hint| next != Some(hint)) {
            out.push_str(&format!("    hint: {hint}\n"));
        }
    }
    if entries.len() > ENTRIES_SHOWN {
        out.push_str(&format!(
            "  and {} more (--json has all)\n",
            entries.len() - ENTRIES_SHOWN
        ));
    }
}

fn counted(n: i64, what: &str) -> String {
    match (n, what) {
        (1, what) => format!("1 {what}"),
        (n, "try") => format!("{n} tries"),
        (n, what) => format!("{n} {what}s"),
    }
}

fn in_words(cell: &Missing) -> String {
    let unseen = || "not seen yet".to_owned();
    let mut words = vec![
        cell.part
            .clone()
            .unwrap_or_else(|| "a part not seen yet".into()),
    ];
    words.extend(cell.appraiser.clone());
    words.extend(
        cell.factors
            .iter()
            .map(|(name, level)| format!("{name} {}", level.clone().unwrap_or_else(unseen))),
    );
    let trials: Vec<String> = cell.trials.iter().map(ToString::to_string).collect();
    let what = match cell.characteristics.as_slice() {
        [] => String::new(),
        [one] => format!(": `{one}`"),
        [first, ..] => format!(": `{first}` and {} more", cell.characteristics.len() - 1),
    };
    format!("{}, trial {}{what}", words.join(" · "), trials.join(", "))
}
