//! Analysis: a complete round's evidence to studies, standings and owed notices.
//!
//! Model: evidence is loaded, everything is worked out without the ledger, and studies, standings and notices
//! are recorded in one transaction, unless the round was revised meanwhile.
//!
//! Invariant: a round's revision is analysed once; its notices are owed in the same transaction.

pub mod study;
pub mod worked;

use std::sync::Arc;

use restudy_config::{Config, Plan};

use crate::ledger::{LedgerError, RoundRow, SharedLedger, StudyRow, Write};
use crate::notice;
use crate::now::Now;
use study::Outcome;
use worked::Worked;

/// The stage that works studies out.
pub struct Analyse {
    ledger: SharedLedger,
    config: Arc<Config>,
}

impl Analyse {
    /// A stage on that ledger.
    #[must_use]
    pub fn new(ledger: SharedLedger, config: Arc<Config>) -> Self {
        Self { ledger, config }
    }

    /// Works out every complete round that is owed it; true when something was recorded.
    ///
    /// # Errors
    /// The ledger's refusal.
    pub fn pass(&mut self, now: Now) -> Result<bool, LedgerError> {
        let config = Arc::clone(&self.config);
        let mut recorded = false;
        for plan in &config.plans {
            let owed = self.ledger.lock().read().rounds_to_analyse(&plan.name)?;
            for round in owed {
                let worked = Worked::load(&self.ledger, &config, plan, round)?;
                recorded |= self
                    .ledger
                    .lock()
                    .write(|w| record(w, &config, plan, &worked, now))?;
                say(&worked);
            }
        }
        Ok(recorded)
    }
}

fn record(
    w: &Write<'_>,
    config: &Config,
    plan: &Plan,
    worked: &Worked,
    now: Now,
) -> Result<bool, LedgerError> {
    let round = &worked.evidence.round;
    let current = w.read().round(round.id)?;
    if current.as_ref() != Some(round) {
        return Ok(false);
    }
    for outcome in &worked.outcomes {
        let row = StudyRow {
            round: round.id,
            revision: round.revision,
            characteristic: outcome.characteristic.clone(),
            record: record_text(outcome)?,
            share: outcome.share(),
            standing: outcome.standing(),
        };
        w.put_study(&row)?;
        w.put_standing(&plan.name, &row)?;
    }
    for notice in notice::owed(w.read(), config, plan, worked, now)? {
        w.owe(&notice, now.utc)?;
    }
    w.put_round(&RoundRow {
        analysed: round.revision,
        ..round.clone()
    })?;
    Ok(true)
}

/// The record as it is kept; a study that could not be worked out says why.
fn record_text(outcome: &Outcome) -> Result<String, LedgerError> {
    let text = match &outcome.study {
        Ok(record) => serde_json::to_string(record),
        Err(fault) => serde_json::to_string(&serde_json::json!({
            "schema": crate::record::SCHEMA,
            "characteristic": outcome.characteristic,
            "fault": fault,
        })),
    };
    text.map_err(|e| LedgerError::Damaged(format!("study record ({e})")))
}

fn say(worked: &Worked) {
    let round = &worked.evidence.round;
    for outcome in &worked.outcomes {
        if let Err(fault) = &outcome.study {
            let characteristic = outcome.characteristic.as_str();
            tracing::error!(
                plan = round.plan,
                round = round.number,
                characteristic,
                "not judged: {fault}"
            );
        }
    }
    let studies = worked.outcomes.len();
    tracing::info!(
        plan = round.plan,
        round = round.number,
        revision = round.revision,
        studies,
        "round analysed"
    );
}
