//! The round's report: one self-contained page and the study records, written once a revision.
//!
//! Model: a round that is analysed and not yet reported is worked out again from the ledger, written to the state
//! folder, and only then recorded as reported. The page is laid out from the questions a reader brings: how much
//! of the tolerance is gauge, what is wrong, how sure is that.
//!
//! Not here: judging (`analyse`), telling (`notice`), pages served over the network.
//!
//! Invariant: a round is recorded as reported only after both of its files lie whole in their folder; a folder
//! that cannot be written leaves it owed.

mod axis;
mod band;
mod causes;
mod files;
mod lanes;
mod page;
mod pieces;
mod ranking;
mod rungs;
mod section;
mod sentence;
mod share;
mod spread;
mod subject;
mod svg;
mod tables;
#[cfg(test)]
mod tests;
mod unit;
mod unjudged;
mod words;

use std::sync::Arc;

use restudy_config::{Config, Plan};

use crate::analyse::worked::Worked;
use crate::ledger::{LedgerError, RoundRow, SharedLedger, StudyRow};
use crate::now::Now;

pub use files::{WriteError, folder, paths};
pub use page::page;

/// Why a report could not be written; the round stays owed its report.
#[derive(Debug, thiserror::Error)]
pub enum ReportError {
    /// The ledger's refusal.
    #[error(transparent)]
    Ledger(#[from] LedgerError),
    /// A file could not be written.
    #[error(transparent)]
    Write(#[from] WriteError),
}

/// The stage that writes reports.
pub struct Reporter {
    ledger: SharedLedger,
    config: Arc<Config>,
}

impl Reporter {
    /// A stage on that ledger.
    #[must_use]
    pub fn new(ledger: SharedLedger, config: Arc<Config>) -> Self {
        Self { ledger, config }
    }

    /// Writes every report that is owed; true when one was written and recorded.
    ///
    /// # Errors
    /// The ledger's refusal at once; a file that could not be written after the other rounds were tried.
    pub fn pass(&mut self, _now: Now) -> Result<bool, ReportError> {
        let config = Arc::clone(&self.config);
        let mut recorded = false;
        let mut first_fault = None;
        for plan in &config.plans {
            let owed = self.ledger.lock().read().rounds_to_report(&plan.name)?;
            for round in owed
                .into_iter()
                .filter(|round| round.analysed == round.revision)
            {
                match self.report(plan, &round) {
                    Ok(done) => recorded |= done,
                    Err(ReportError::Write(fault)) => {
                        first_fault.get_or_insert(fault);
                    }
                    Err(fault) => return Err(fault),
                }
            }
        }
        first_fault.map_or(Ok(recorded), |fault| Err(fault.into()))
    }

    fn report(&self, plan: &Plan, round: &RoundRow) -> Result<bool, ReportError> {
        let worked = Worked::load(&self.ledger, &self.config, plan, round.clone())?;
        let studies = self
            .ledger
            .lock()
            .read()
            .studies(round.id, round.analysed)?;
        let site = &self.config.site;
        let (html, json) = paths(&self.config.state, &plan.name, round.number);
        files::write(&html, &page(&site.name, &site.zone, plan, &worked))?;
        files::write(&json, &array(&studies))?;
        let recorded = self.ledger.lock().write(|w| {
            let unchanged = w.read().round(round.id)?.as_ref() == Some(round);
            if unchanged {
                w.put_round(&RoundRow {
                    reported: round.analysed,
                    ..round.clone()
                })?;
            }
            Ok::<bool, LedgerError>(unchanged)
        })?;
        if recorded {
            let (plan, number, revision) = (&round.plan, round.number, round.revision);
            tracing::info!(plan, round = number, revision, page = %html.display(), "report written");
        }
        Ok(recorded)
    }
}

/// The records of a round as one JSON array, each exactly as the ledger keeps it.
fn array(studies: &[StudyRow]) -> String {
    let records: Vec<&str> = studies.iter().map(|study| study.record.as_str()).collect();
    format!("[{}]\n", records.join(",\n"))
}
