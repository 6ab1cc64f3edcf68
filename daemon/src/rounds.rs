//! Rounds: runs to cells, cells to a complete design.
//!
//! Model: every pass lays out all runs that no closed round holds ([`assign`](assign::assign), pure) and
//! records the difference. A closed round changes only by a new revision, when the values of its runs did.
//!
//! Not here: reading exports, judging.

pub mod assign;
mod fill;
pub mod frame;
pub mod missing;

#[cfg(test)]
mod tests;

use std::collections::HashMap;
use std::sync::Arc;

use restudy_config::{Config, Plan};
use restudy_parsers::fold;

use crate::ledger::{
    LedgerError, Placement, RoundRow, RoundState, RunRow, RunStatus, SharedLedger, Write,
};
use crate::now::Now;
use assign::{Assigned, Clock, Closed, Laid};
use frame::Frame;

/// The stage that keeps rounds in step with the runs.
pub struct Rounds {
    ledger: SharedLedger,
    config: Arc<Config>,
}

/// What a pass changed, to be said once it is recorded.
#[derive(Debug, Clone, PartialEq, Eq)]
enum Change {
    State {
        number: i64,
        state: RoundState,
        reason: Option<String>,
    },
    Revision {
        number: i64,
        revision: i64,
    },
    NotUsed {
        who: String,
        status: RunStatus,
        reason: String,
    },
}

impl Rounds {
    /// A stage on that ledger.
    #[must_use]
    pub fn new(ledger: SharedLedger, config: Arc<Config>) -> Self {
        Self { ledger, config }
    }

    /// Brings every plan's rounds up to date; true when a round is owed an analysis. Until every export at hand
    /// has been read (`all_read`), no round is closed because its time is up.
    ///
    /// # Errors
    /// The ledger's refusal.
    pub fn pass(&mut self, now: Now, all_read: bool) -> Result<bool, LedgerError> {
        let mut owed = false;
        for plan in &self.config.plans {
            let changes = self
                .ledger
                .lock()
                .write(|w| reconcile(w, plan, now, all_read))?;
            for change in &changes {
                say(&plan.name, change);
            }
            owed |= !self
                .ledger
                .lock()
                .read()
                .rounds_to_analyse(&plan.name)?
                .is_empty();
        }
        Ok(owed)
    }
}

fn say(plan: &str, change: &Change) {
    match change {
        Change::State {
            number: round,
            state: RoundState::Held,
            reason,
        } => {
            let reason = reason.as_deref().unwrap_or_default();
            tracing::warn!(plan, round, reason, "round waits for a person");
        }
        Change::State {
            number: round,
            state: RoundState::Unfinished,
            reason,
        } => {
            let reason = reason.as_deref().unwrap_or_default();
            tracing::warn!(plan, round, reason, "round closed unfinished");
        }
        Change::State {
            number: round,
            state,
            ..
        } => {
            tracing::info!(plan, round, "round is {}", state.as_str());
        }
        Change::Revision {
            number: round,
            revision,
        } => {
            tracing::info!(plan, round, revision, "values of a closed round changed");
        }
        Change::NotUsed {
            who,
            status: RunStatus::SetAside,
            reason,
        } => {
            tracing::warn!(plan, "run set aside: {who}: {reason}");
        }
        Change::NotUsed {
            who,
            status,
            reason,
        } => {
            tracing::info!(plan, "run not used ({}): {who}: {reason}", status.as_str());
        }
    }
}

fn reconcile(
    w: &Write<'_>,
    plan: &Plan,
    now: Now,
    all_read: bool,
) -> Result<Vec<Change>, LedgerError> {
    let mut changes = Vec::new();
    let rounds = w.read().rounds(&plan.name)?;
    for round in rounds.iter().filter(|r| r.state.closed()) {
        revise(w, round, &mut changes)?;
    }
    let runs = w.read().open_runs(&plan.name)?;
    if runs.is_empty() {
        return Ok(changes);
    }
    let frame = Frame::of(plan);
    let closed: Vec<Closed> = rounds
        .iter()
        .filter(|r| r.state.closed())
        .map(|r| Closed {
            id: r.id,
            label: r.label.clone(),
            through: r.through,
        })
        .collect();
    let filling = |label: Option<&str>| {
        rounds
            .iter()
            .find(|r| !r.state.closed() && r.label.as_deref().map(fold) == label.map(fold))
    };
    let opened = |label: Option<&str>| filling(label).and_then(|r| r.opened);
    let Assigned {
        rounds: laid,
        late,
        elsewhere,
    } = assign::assign(
        &frame,
        &closed,
        &runs,
        Clock {
            now: all_read.then_some(now.utc),
        },
        &opened,
    );

    let mut next_number = rounds.iter().map(|r| r.number).max().unwrap_or(0) + 1;
    let mut kept: Vec<i64> = Vec::new();
    for laid in &laid {
        let row = filling(laid.label.as_deref())
            .filter(|r| !kept.contains(&r.id))
            .cloned();
        let row = match row {
            Some(row) => row,
            None => {
                let id = w.add_round(&plan.name, next_number, laid.label.as_deref())?;
                next_number += 1;
                w.read()
                    .round(id)?
                    .ok_or_else(|| LedgerError::Damaged("round".into()))?
            }
        };
        kept.push(row.id);
        settle_round(w, row, laid, now, &mut changes)?;
        move_runs(
            w,
            &runs,
            &laid.seats,
            Some(kept[kept.len() - 1]),
            &mut changes,
        )?;
    }
    move_runs(w, &runs, &elsewhere, None, &mut changes)?;
    for (round, seat) in late {
        move_runs(w, &runs, &[seat], Some(round), &mut changes)?;
    }
    for lost in rounds
        .iter()
        .filter(|r| !r.state.closed() && !kept.contains(&r.id))
    {
        w.drop_round(lost.id)?;
    }
    Ok(changes)
}

/// A closed round whose runs changed gets a revision; one without a standing has nothing to revise.
fn revise(w: &Write<'_>, round: &RoundRow, changes: &mut Vec<Change>) -> Result<(), LedgerError> {
    if w.take_changes(round.id)? == 0 || round.state != RoundState::Complete {
        return Ok(());
    }
    if round.analysed < round.revision {
        return Ok(());
    }
    let revised = RoundRow {
        revision: round.revision + 1,
        ..round.clone()
    };
    w.put_round(&revised)?;
    changes.push(Change::Revision {
        number: round.number,
        revision: revised.revision,
    });
    Ok(())
}

fn settle_round(
    w: &Write<'_>,
    row: RoundRow,
    laid: &Laid,
    now: Now,
    changes: &mut Vec<Change>,
) -> Result<(), LedgerError> {
    let mut next = RoundRow {
        state: laid.state,
        reason: laid.reason.clone(),
        ..row.clone()
    };
    if laid.state != RoundState::Pending {
        next.opened.get_or_insert(now.utc);
    }
    if laid.state.closed() {
        next.closed = Some(now.utc);
        next.through = laid.through;
    }
    if next != row {
        w.put_round(&next)?;
    }
    if next.state != row.state || next.reason != row.reason {
        let (state, reason) = (laid.state, laid.reason.clone());
        changes.push(Change::State {
            number: row.number,
            state,
            reason,
        });
    }
    Ok(())
}

fn move_runs(
    w: &Write<'_>,
    runs: &[RunRow],
    seats: &[fill::Seat],
    round: Option<i64>,
    changes: &mut Vec<Change>,
) -> Result<(), LedgerError> {
    let known: HashMap<i64, &RunRow> = runs.iter().map(|r| (r.id, r)).collect();
    for seat in seats {
        let place = Placement {
            round,
            slot: seat.slot,
            status: seat.status,
            reason: seat.reason.clone(),
        };
        let run = known.get(&seat.run);
        if run.is_some_and(|r| r.place == place) {
            continue;
        }
        w.place_run(seat.run, &place)?;
        if let (Some(run), Some(reason)) = (run, place.reason) {
            let (who, status) = (run.facts.who(), place.status);
            changes.push(Change::NotUsed {
                who,
                status,
                reason,
            });
        }
    }
    Ok(())
}
