//! `restudy status`: what is filling, what is missing, what was refused, what is owed, and where every reading is.

mod words;

use restudy_config::Config;
use serde::Serialize;

use super::{Answer, ConfigPath, End, Failure, configuration, print, print_json};
use crate::ledger::{
    Accounting, Ledger, LedgerError, OutboxRow, Read, RefusedExport, RoundRow, RoundState,
    RunStatus, SetAsideRun, UnusedRun,
};
use crate::now::in_zone;
use crate::rounds::frame::Frame;
use crate::rounds::missing::{Missing, missing};

/// Show rounds with their missing cells, refused exports, owed notices
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Example:
  restudy status --config restudy.toml --json

Works beside a running service. Exit code 1: something waits for a person (a held round, an export or run that
could not be used, a characteristic that could not be judged, a refused notice).")]
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
    not_used: Vec<UnusedRun>,
    not_judged: Vec<NotJudged>,
    owed: Vec<OutboxRow>,
    readings: Accounting,
}

#[derive(Serialize)]
struct NotJudged {
    plan: String,
    round: i64,
    characteristic: String,
    reason: String,
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
        print(&words::for_people(&status))?;
    }
    let waits = status
        .rounds
        .iter()
        .any(|r| r.state == RoundState::Held.as_str())
        || !status.refused.is_empty()
        || !status.set_aside.is_empty()
        || !status.not_judged.is_empty()
        || status.owed.iter().any(|o| o.refused);
    Ok(if waits { End::BadNews } else { End::Fine })
}

fn gather(read: Read<'_>, config: &Config) -> Result<Status, LedgerError> {
    let mut rounds = Vec::new();
    let mut not_judged = Vec::new();
    for plan in &config.plans {
        let frame = Frame::of(plan);
        let all = read.rounds(&plan.name)?;
        if let Some(last) = all.iter().rfind(|r| r.analysed > 0) {
            not_judged.extend(faults(read, last)?);
        }
        for round in all {
            rounds.push(shown(read, config, &frame, round)?);
        }
    }
    Ok(Status {
        rounds,
        refused: read.refused()?,
        set_aside: read.set_aside()?,
        not_used: read.unused()?,
        not_judged,
        owed: read.undelivered()?,
        readings: read.accounting()?,
    })
}

/// The characteristics of a round that no study could be worked out for.
fn faults(read: Read<'_>, round: &RoundRow) -> Result<Vec<NotJudged>, LedgerError> {
    let mut faults = Vec::new();
    for study in read.studies(round.id, round.analysed)? {
        let record: serde_json::Value = serde_json::from_str(&study.record)
            .map_err(|_| LedgerError::Damaged("study record".into()))?;
        if let Some(reason) = record["fault"].as_str() {
            faults.push(NotJudged {
                plan: round.plan.clone(),
                round: round.number,
                characteristic: study.characteristic,
                reason: reason.to_owned(),
            });
        }
    }
    Ok(faults)
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
