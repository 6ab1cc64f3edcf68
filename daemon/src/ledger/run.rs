//! Runs: one part measured once by one appraiser, whatever number of exports it came in.

use std::collections::BTreeMap;

use jiff::civil::DateTime;
use rusqlite::{OptionalExtension, Row, params};

use super::{Delivered, LedgerError, PackedReading, Read, Write};

/// Where a run's readings end up.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum RunStatus {
    /// In a cell of its round, complete or still filling.
    Used,
    /// Its cell had enough valid runs before it.
    Surplus,
    /// Taken before its round was closed, arrived after.
    Late,
    /// Unknown names, a tie, or cut short.
    SetAside,
    /// In a round that waits for a person.
    Held,
    /// Excluded by a person.
    Excluded,
    /// In a round that closed without being complete.
    Unfinished,
}

impl RunStatus {
    /// All of them.
    pub const ALL: [Self; 7] = [
        Self::Used,
        Self::Surplus,
        Self::Late,
        Self::SetAside,
        Self::Held,
        Self::Excluded,
        Self::Unfinished,
    ];

    /// As the ledger and every text spell it.
    #[must_use]
    pub const fn as_str(self) -> &'static str {
        match self {
            Self::Used => "used",
            Self::Surplus => "surplus",
            Self::Late => "late",
            Self::SetAside => "set aside",
            Self::Held => "held",
            Self::Excluded => "excluded",
            Self::Unfinished => "unfinished",
        }
    }

    fn parse(text: &str) -> Result<Self, LedgerError> {
        Self::ALL
            .into_iter()
            .find(|s| s.as_str() == text)
            .ok_or_else(|| LedgerError::Damaged(format!("run status `{text}`")))
    }
}

/// What a run is, apart from its readings.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RunFacts {
    /// The instrument that measured it.
    pub instrument: String,
    /// Part as the export names it.
    pub part: String,
    /// Appraiser as the export names it.
    pub appraiser: Option<String>,
    /// Trial as stated.
    pub trial: Option<String>,
    /// Levels of further factors.
    pub factors: BTreeMap<String, String>,
    /// Values that must stay the same.
    pub same: BTreeMap<String, String>,
    /// When it was measured.
    pub taken: Option<DateTime>,
    /// The export's own name of the round.
    pub round_label: Option<String>,
}

impl RunFacts {
    /// The run as people call it: part, appraiser, further factors, time.
    #[must_use]
    pub fn who(&self) -> String {
        let names = std::iter::once(&self.part)
            .chain(&self.appraiser)
            .chain(self.factors.values());
        let names: Vec<&str> = names.map(String::as_str).collect();
        match self.taken {
            Some(taken) => format!(
                "{} of {}",
                names.join(" "),
                taken.strftime("%Y-%m-%d %H:%M")
            ),
            None => names.join(" "),
        }
    }
}

/// Folded characteristics and the unit that each one's value comes in.
pub type Holds = BTreeMap<String, Option<String>>;

/// A recorded run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RunRow {
    /// Its number, in order of arrival.
    pub id: i64,
    /// What makes two deliveries the same run.
    pub key: String,
    /// What it is.
    pub facts: RunFacts,
    /// Characteristics it has values of, folded, each with its unit.
    pub holds: Holds,
    /// Why its deliveries contradict each other.
    pub tie: Option<String>,
    /// Its values differ from those its closed round was worked out with.
    pub changed: bool,
    /// Where it is.
    pub place: Placement,
}

/// Where a run stands in its plan.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Placement {
    /// Its round.
    pub round: Option<i64>,
    /// Which trial of its cell, from 0, when used.
    pub slot: Option<usize>,
    /// Where its readings end up.
    pub status: RunStatus,
    /// Why, unless used.
    pub reason: Option<String>,
}

/// A run's deliveries with how each counts.
#[derive(Debug, Clone, PartialEq)]
pub struct Tally {
    /// Of this export.
    pub export: i64,
    /// Readings whose value was known already.
    pub copies: usize,
    /// Readings that a later export gave another value.
    pub superseded: usize,
}

const COLUMNS: &str =
    "id, instrument, part, appraiser, trial, factors, same, taken, round_label, holds, tie,
  changed, round, slot, status, reason, key";

impl Read<'_> {
    /// The run of that key.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn run_by_key(&self, plan: &str, key: &str) -> Result<Option<RunRow>, LedgerError> {
        self.connection
            .prepare_cached(&format!(
                "SELECT {COLUMNS} FROM run WHERE plan = ?1 AND key = ?2"
            ))?
            .query_row([plan, key], |r| Ok(run_row(r)))
            .optional()?
            .transpose()
    }

    /// The runs of a plan that no closed round holds, in order of arrival.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn open_runs(&self, plan: &str) -> Result<Vec<RunRow>, LedgerError> {
        self.runs(
            "plan = ?1 AND (round IS NULL OR round IN
               (SELECT id FROM round WHERE state IN ('pending', 'open', 'held')))",
            rusqlite::params![plan],
        )
    }

    /// The runs of a round, in order of arrival.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn round_runs(&self, round: i64) -> Result<Vec<RunRow>, LedgerError> {
        self.runs("round = ?1", rusqlite::params![round])
    }

    fn runs(
        &self,
        condition: &str,
        values: &[&dyn rusqlite::ToSql],
    ) -> Result<Vec<RunRow>, LedgerError> {
        let mut statement = self.connection.prepare_cached(&format!(
            "SELECT {COLUMNS} FROM run WHERE {condition} ORDER BY id"
        ))?;
        let rows = statement.query_map(values, |r| Ok(run_row(r)))?;
        rows.map(|row| row?).collect()
    }

    /// The runs that an export brought readings of.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn runs_of_export(&self, export: i64) -> Result<Vec<RunRow>, LedgerError> {
        self.runs(
            "id IN (SELECT run FROM delivery WHERE export = ?1)",
            rusqlite::params![export],
        )
    }

    /// What every export brought for a run, in order of arrival.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn deliveries(&self, run: i64) -> Result<Vec<Delivered>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT delivery.export, export.path, delivery.readings
             FROM delivery JOIN export ON export.id = delivery.export
             WHERE delivery.run = ?1 ORDER BY delivery.export",
        )?;
        let rows = statement.query_map([run], |r| {
            Ok((r.get(0)?, r.get(1)?, r.get::<_, String>(2)?))
        })?;
        rows.map(|row| {
            let (export, path, readings) = row?;
            let readings: Vec<PackedReading> = serde_json::from_str(&readings)
                .map_err(|_| LedgerError::Damaged("readings".into()))?;
            Ok(Delivered {
                export,
                path,
                readings,
            })
        })
        .collect()
    }
}

impl Write<'_> {
    /// Records a run that no export brought before.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn add_run(&self, plan: &str, key: &str, facts: &RunFacts) -> Result<i64, LedgerError> {
        self.transaction
            .prepare_cached(
                "INSERT INTO run (plan, key, instrument, part, appraiser, trial, factors, same, taken,
                   round_label, holds) VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10, '{}')",
            )?
            .execute(params![
                plan,
                key,
                facts.instrument,
                facts.part,
                facts.appraiser,
                facts.trial,
                json(&facts.factors)?,
                json(&facts.same)?,
                facts.taken.map(|t| t.to_string()),
                facts.round_label,
            ])?;
        Ok(self.transaction.last_insert_rowid())
    }

    /// Records what an export brought for a run.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn add_delivery(
        &self,
        run: i64,
        export: i64,
        readings: &[PackedReading],
    ) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached(
                "INSERT INTO delivery (export, run, readings, count, copies, superseded)
                 VALUES (?1, ?2, ?3, ?4, 0, 0)",
            )?
            .execute(params![
                export,
                run,
                json(&readings)?,
                readings.len() as i64
            ])?;
        Ok(())
    }

    /// Records how each delivery of a run counts, and what the run holds by now.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn put_tally(
        &self,
        run: i64,
        tallies: &[Tally],
        holds: &Holds,
        tie: Option<&str>,
        changed: bool,
    ) -> Result<(), LedgerError> {
        for tally in tallies {
            self.transaction
                .prepare_cached(
                    "UPDATE delivery SET copies = ?3, superseded = ?4 WHERE run = ?1 AND export = ?2",
                )?
                .execute(params![run, tally.export, tally.copies as i64, tally.superseded as i64])?;
        }
        self.transaction
            .prepare_cached("UPDATE run SET holds = ?2, tie = ?3, changed = ?4 WHERE id = ?1")?
            .execute(params![run, json(holds)?, tie, changed])?;
        Ok(())
    }

    /// A run that an export no longer means is set aside, for this reason.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn set_tie(&self, run: i64, why: &str) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached("UPDATE run SET tie = ?2 WHERE id = ?1")?
            .execute(params![run, why])?;
        Ok(())
    }

    /// Forgets a run that no export brings any more.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn drop_run(&self, run: i64) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached("DELETE FROM run WHERE id = ?1")?
            .execute([run])?;
        Ok(())
    }

    /// A later export of a run states what must stay the same anew.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn put_same(&self, run: i64, same: &BTreeMap<String, String>) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached("UPDATE run SET same = ?2 WHERE id = ?1")?
            .execute(params![run, json(same)?])?;
        Ok(())
    }

    /// Records where a run is now.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn place_run(&self, run: i64, place: &Placement) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached(
                "UPDATE run SET round = ?2, slot = ?3, status = ?4, reason = ?5 WHERE id = ?1",
            )?
            .execute(params![
                run,
                place.round,
                place.slot.map(|s| s as i64),
                place.status.as_str(),
                place.reason,
            ])?;
        Ok(())
    }

    /// The changed runs of a round are part of its new revision.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn take_changes(&self, round: i64) -> Result<usize, LedgerError> {
        Ok(self
            .transaction
            .prepare_cached("UPDATE run SET changed = 0 WHERE round = ?1 AND changed")?
            .execute([round])?)
    }
}

fn json<T: serde::Serialize + ?Sized>(value: &T) -> Result<String, LedgerError> {
    serde_json::to_string(value).map_err(|e| LedgerError::Damaged(e.to_string()))
}

fn run_row(r: &Row<'_>) -> Result<RunRow, LedgerError> {
    fn parsed<T: serde::de::DeserializeOwned>(text: &str) -> Result<T, LedgerError> {
        serde_json::from_str(text).map_err(|_| LedgerError::Damaged("run".into()))
    }
    let taken: Option<String> = r.get(7)?;
    let taken = taken.map(|t| t.parse()).transpose();
    let slot: Option<i64> = r.get(13)?;
    Ok(RunRow {
        id: r.get(0)?,
        facts: RunFacts {
            instrument: r.get(1)?,
            part: r.get(2)?,
            appraiser: r.get(3)?,
            trial: r.get(4)?,
            factors: parsed(&r.get::<_, String>(5)?)?,
            same: parsed(&r.get::<_, String>(6)?)?,
            taken: taken.map_err(|_| LedgerError::Damaged("time".into()))?,
            round_label: r.get(8)?,
        },
        holds: parsed(&r.get::<_, String>(9)?)?,
        tie: r.get(10)?,
        changed: r.get(11)?,
        place: Placement {
            round: r.get(12)?,
            slot: slot.map(|s| s as usize),
            status: RunStatus::parse(&r.get::<_, String>(14)?)?,
            reason: r.get(15)?,
        },
        key: r.get(16)?,
    })
}
