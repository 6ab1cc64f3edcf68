//! What a ledger holds, without numbers of rows and times: what two plants with the same exports must agree in.

use rusqlite::{Connection, OpenFlags};
use serde_json::Value;

use crate::plant::Plant;
use crate::program::records;

/// Runs with their readings, rounds, and study records.
pub(crate) struct Content {
    runs: Vec<String>,
    rounds: Vec<String>,
    records: Vec<Value>,
}

const RUNS: &str = "
    SELECT run.key || ' ' || status || ' ' || coalesce(slot, '-') || ' ' || readings
    FROM run JOIN delivery ON delivery.run = run.id ORDER BY 1";
const ROUNDS: &str =
    "SELECT plan || ' ' || number || ' ' || state || ' ' || revision FROM round ORDER BY 1";

impl Content {
    /// Reads a plant's ledger, which must be whole.
    pub(crate) fn of(plant: &Plant) -> Self {
        let path = restudy::ledger::Ledger::path(&plant.state());
        let ledger = Connection::open_with_flags(path, OpenFlags::SQLITE_OPEN_READ_ONLY)
            .expect("the ledger can be opened");
        assert_eq!(texts(&ledger, "PRAGMA integrity_check"), ["ok"]);
        Self {
            runs: texts(&ledger, RUNS),
            rounds: texts(&ledger, ROUNDS),
            records: records(plant).into_iter().map(in_order).collect(),
        }
    }

    /// Checks that both hold the same, to the last digit.
    #[track_caller]
    pub(crate) fn assert_same_as(&self, other: &Self) {
        assert_eq!(self.runs, other.runs);
        assert_eq!(self.rounds, other.rounds);
        assert_eq!(self.records.len(), other.records.len());
        for (ours, theirs) in self.records.iter().zip(&other.records) {
            let keys = ours.as_object().expect("a record").keys();
            let differing: Vec<&String> = keys.filter(|key| ours[*key] != theirs[*key]).collect();
            assert!(
                differing.is_empty() && ours == theirs,
                "{differing:?} of {}:\n{ours}\n{theirs}",
                ours["characteristic"]
            );
        }
    }
}

fn texts(ledger: &Connection, question: &str) -> Vec<String> {
    let mut statement = ledger.prepare(question).expect("a question");
    let rows = statement
        .query_map([], |row| row.get(0))
        .expect("an answer");
    rows.collect::<Result<_, _>>().expect("texts")
}

/// Exports come in any order, and a record names them as they came.
fn in_order(mut record: Value) -> Value {
    let source = record["source"].as_array_mut().expect("exports");
    source.sort_by_key(|export| export["export"].to_string());
    record
}
