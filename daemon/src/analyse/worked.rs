//! A round with everything worked out: what analysis records, notices tell and reports show.

use std::collections::BTreeMap;

use restudy_config::{Config, Plan};

use super::study::{Outcome, work_out};
use crate::evidence::Evidence;
use crate::ledger::{Earlier, LedgerError, Read, RoundRow, SharedLedger};

/// A round with everything worked out.
pub struct Worked {
    /// What it was worked out from.
    pub evidence: Evidence,
    /// One a characteristic.
    pub outcomes: Vec<Outcome>,
    /// Each characteristic's study in the round before, by label.
    pub earlier: BTreeMap<String, Earlier>,
}

impl Worked {
    /// Loads a round and works it out, holding the ledger only while reading.
    ///
    /// # Errors
    /// The ledger's refusal.
    pub fn load(
        ledger: &SharedLedger,
        config: &Config,
        plan: &Plan,
        round: RoundRow,
    ) -> Result<Self, LedgerError> {
        let (evidence, earlier) = {
            let ledger = ledger.lock();
            read_all(ledger.read(), plan, round)?
        };
        Ok(Self::work(config, plan, evidence, earlier))
    }

    fn work(
        config: &Config,
        plan: &Plan,
        evidence: Evidence,
        earlier: BTreeMap<String, Earlier>,
    ) -> Self {
        let before = |label: &str| earlier.get(label).map(|e| e.study.standing);
        let outcomes = work_out(&config.site.name, plan, &evidence, &before);
        Self {
            evidence,
            outcomes,
            earlier,
        }
    }
}

fn read_all(
    read: Read<'_>,
    plan: &Plan,
    round: RoundRow,
) -> Result<(Evidence, BTreeMap<String, Earlier>), LedgerError> {
    let number = round.number;
    let evidence = Evidence::load(read, plan, round)?;
    let mut earlier = BTreeMap::new();
    for feature in &evidence.features {
        if let Some(before) = read.study_before(&plan.name, number, &feature.label)? {
            earlier.insert(feature.label.clone(), before);
        }
    }
    Ok((evidence, earlier))
}
