//! The stage on a real ledger, and rungs against exact arithmetic.

use std::path::Path;
use std::sync::Arc;

use fs_err as fs;
use jiff::tz::TimeZone;
use restudy_config::{Config, Site};
use restudy_engine::Standing;

use super::plant::plan;
use crate::ledger::{Ledger, RoundRow, RoundState, SharedLedger, StudyRow};
use crate::now::Now;
use crate::report::{ReportError, Reporter, paths};

fn config(state: &Path) -> Arc<Config> {
    Arc::new(Config {
        site: Site {
            name: "Halden Pump Works".into(),
            zone: TimeZone::UTC,
        },
        state: state.to_owned(),
        instruments: Vec::new(),
        plans: vec![plan()],
        mail: None,
        routes: Vec::new(),
    })
}

/// A ledger with one analysed round of two records.
fn ledger(state: &Path) -> SharedLedger {
    let mut ledger = Ledger::open(state).unwrap();
    ledger
        .write(|w| {
            let id = w.add_round("impeller hub", 1, None)?;
            for (characteristic, record) in [("a", "{\"a\":1.50}"), ("b", "{\"b\": 2}")] {
                let study = StudyRow {
                    round: id,
                    revision: 1,
                    characteristic: characteristic.into(),
                    record: record.into(),
                    share: None,
                    standing: Standing::NotJudged,
                };
                w.put_study(&study)?;
            }
            let row = w.read().round(id)?.unwrap();
            w.put_round(&RoundRow {
                state: RoundState::Complete,
                revision: 1,
                analysed: 1,
                closed: Some(0),
                ..row
            })
        })
        .unwrap();
    SharedLedger::new(ledger)
}

fn reported(ledger: &SharedLedger) -> i64 {
    ledger.lock().read().rounds("impeller hub").unwrap()[0].reported
}

#[test]
fn an_analysed_round_is_written_once() {
    let state = tempfile::tempdir().unwrap();
    let ledger = ledger(state.path());
    let mut reporter = Reporter::new(ledger.clone(), config(state.path()));
    assert!(reporter.pass(Now::read()).unwrap());
    let (html, json) = paths(state.path(), "impeller hub", 1);
    assert!(
        fs::read_to_string(&html)
            .unwrap()
            .contains("<h1>impeller hub, round 1</h1>")
    );
    assert_eq!(
        fs::read_to_string(&json).unwrap(),
        "[{\"a\":1.50},\n{\"b\": 2}]\n"
    );
    assert_eq!(reported(&ledger), 1);
    assert!(!reporter.pass(Now::read()).unwrap());
}

#[test]
fn a_folder_that_cannot_be_written_leaves_the_round_owed() {
    let state = tempfile::tempdir().unwrap();
    let ledger = ledger(state.path());
    let in_the_way = state.path().join("reports");
    fs::write(&in_the_way, "").unwrap();
    let mut reporter = Reporter::new(ledger.clone(), config(state.path()));
    assert!(matches!(
        reporter.pass(Now::read()),
        Err(ReportError::Write(_))
    ));
    assert_eq!(reported(&ledger), 0);
    fs::remove_file(&in_the_way).unwrap();
    assert!(reporter.pass(Now::read()).unwrap());
    assert_eq!(reported(&ledger), 1);
}

#[test]
fn a_round_revised_and_not_yet_analysed_again_waits() {
    let state = tempfile::tempdir().unwrap();
    let ledger = ledger(state.path());
    ledger
        .lock()
        .write(|w| {
            let row = w.read().rounds("impeller hub")?.remove(0);
            w.put_round(&RoundRow { revision: 2, ..row })
        })
        .unwrap();
    let mut reporter = Reporter::new(ledger.clone(), config(state.path()));
    assert!(!reporter.pass(Now::read()).unwrap());
    assert_eq!(reported(&ledger), 0);
}
