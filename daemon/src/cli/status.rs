//! `restudy status`: what is filling, what is missing, what was refused, what is owed, and where every reading is.

use restudy_config::Config;
use serde::Serialize;

use super::table::table;
use super::{Answer, ConfigPath, End, Failure, configuration, print, print_json};
use crate::ledger::{
    Accounting, Ledger, LedgerError, OutboxRow, Read, RefusedExport, RoundRow, RoundState,
    RunStatus, SetAsideRun,
};
use crate::now::in_zone;
use crate::rounds::frame::Frame;
use crate::rounds::missing::{Missing, missing};

/// Missing cells named one by one for people; the JSON has all.
const CELLS_NAMED: usize = 12;

/// Show rounds with their missing cells, refused exports, owed notices
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Example:
  restudy status --config restudy.toml --json

Works beside a running service. Exit code 1: something waits for a person.")]
pub(super) struct Line {
    #[command(flatten)]
    config: ConfigPath,
    /// Print everything as JSON
    #[arg(long)]
    json: bool,
}

#[derive(Serialize)]
struct Status {
    rounds: Vec<ShownRound>,
    refused: Vec<RefusedExport>,
    set_aside: Vec<SetAsideRun>,
    owed: Vec<OutboxRow>,
    readings: Accounting,
}

#[derive(Serialize)]
struct ShownRound {
    plan: String,
    round: i64,
    label: Option<String>,
    state: &'static str,
    reason: Option<String>,
    revision: i64,
    opened: Option<String>,
    closed: Option<String>,
    runs_used: usize,
    runs_planned: usize,
    missing: Vec<Missing>,
}

pub(super) fn run(line: &Line) -> Answer {
    let config = configuration::sound(&line.config.config)?;
    let ledger = Ledger::open_to_read(&config.state).map_err(|e| Failure::machine(&e))?;
    let status = ledger
        .snapshot(|read| gather(read, &config))
        .map_err(|e| Failure::machine(&e))?;
    if line.json {
        print_json(&status)?;
    } else {
        print(&for_people(&status))?;
    }
    let waits = status
        .rounds
        .iter()
        .any(|r| r.state == RoundState::Held.as_str())
        || !status.refused.is_empty()
        || status.owed.iter().any(|o| o.refused);
    Ok(if waits { End::BadNews } else { End::Fine })
}

fn gather(read: Read<'_>, config: &Config) -> Result<Status, LedgerError> {
    let mut rounds = Vec::new();
    for plan in &config.plans {
        let frame = Frame::of(plan);
        for round in read.rounds(&plan.name)? {
            rounds.push(shown(read, config, &frame, round)?);
        }
    }
    Ok(Status {
        rounds,
        refused: read.refused()?,
        set_aside: read.set_aside()?,
        owed: read.undelivered()?,
        readings: read.accounting()?,
    })
}

fn shown(
    read: Read<'_>,
    config: &Config,
    frame: &Frame,
    round: RoundRow,
) -> Result<ShownRound, LedgerError> {
    let runs = read.round_runs(round.id)?;
    let time = |ms: Option<i64>| {
        ms.map(|ms| {
            in_zone(ms, &config.site.zone)
                .strftime("%Y-%m-%dT%H:%M:%S%:z")
                .to_string()
        })
    };
    let in_cells = |status| {
        matches!(
            status,
            RunStatus::Used | RunStatus::Held | RunStatus::Unfinished
        )
    };
    Ok(ShownRound {
        state: round.state.as_str(),
        opened: time(round.opened),
        closed: time(round.closed),
        runs_used: runs
            .iter()
            .filter(|r| in_cells(r.place.status) && r.place.slot.is_some())
            .count(),
        runs_planned: frame.cells() * frame.trials,
        missing: if round.state == RoundState::Complete {
            Vec::new()
        } else {
            missing(frame, &runs)
        },
        plan: round.plan,
        round: round.number,
        label: round.label,
        reason: round.reason,
        revision: round.revision,
    })
}

fn for_people(status: &Status) -> String {
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
            (
                format!("{} / {}: {}", r.instrument, r.export, r.reason),
                r.hint.clone(),
            )
        }),
    );
    list(
        &mut out,
        "Set aside",
        status.set_aside.iter().map(|a| {
            (
                format!("{} ({} readings): {}", a.export, a.readings, a.reason),
                a.hint.clone(),
            )
        }),
    );
    list(
        &mut out,
        "Owed notices",
        status.owed.iter().map(|o| {
            let to = if o.recipient.is_empty() {
                String::new()
            } else {
                format!(" to {}", o.recipient)
            };
            let tries = o
                .last_error
                .as_ref()
                .map(|e| format!("; {} tries, the last: {e}", o.attempts));
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

fn list(out: &mut String, title: &str, entries: impl Iterator<Item = (String, Option<String>)>) {
    let mut first = true;
    for (sentence, hint) in entries {
        if std::mem::take(&mut first) {
            out.push_str(&format!("\n{title}\n"));
        }
        out.push_str(&format!("  {sentence}\n"));
        if let Some(hint) = hint {
            out.push_str(&format!("    hint: {hint}\n"));
        }
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
