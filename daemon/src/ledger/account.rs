//! Where every reading ended, and what of the exports could not be used.

use rusqlite::Row;

use super::{LedgerError, Read};

/// Readings by where they ended; every reading met in an export is in exactly one place.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, serde::Serialize)]
pub struct Accounting {
    /// Every reading met in any export.
    pub total: i64,
    /// In a cell of a round.
    pub used: i64,
    /// The value was known already.
    pub copy: i64,
    /// A later export gave the same run another value.
    pub superseded: i64,
    /// Its cell had enough runs.
    pub surplus: i64,
    /// Arrived after its round was closed.
    pub late: i64,
    /// Could not be used.
    pub set_aside: i64,
    /// In a round that waits for a person.
    pub held: i64,
    /// Excluded by a person.
    pub excluded: i64,
    /// In a round that closed without being complete.
    pub unfinished: i64,
    /// In an export that no plan takes, or of a characteristic that the plan's list does not name.
    pub not_for_a_plan: i64,
}

impl Accounting {
    /// All places together.
    #[must_use]
    pub fn placed(&self) -> i64 {
        self.used
            + self.copy
            + self.superseded
            + self.surplus
            + self.late
            + self.set_aside
            + self.held
            + self.excluded
            + self.unfinished
            + self.not_for_a_plan
    }
}

/// An export that could not be read.
#[derive(Debug, Clone, PartialEq, Eq, serde::Serialize)]
pub struct RefusedExport {
    /// Whose it is.
    pub instrument: String,
    /// Path below the watched folder.
    pub export: String,
    /// Why.
    pub reason: String,
    /// What a person could do.
    pub hint: Option<String>,
}

/// A run that is kept and not used, for no fault of its own.
#[derive(Debug, Clone, PartialEq, Eq, serde::Serialize)]
pub struct UnusedRun {
    /// Its plan.
    pub plan: String,
    /// The export that brought it first.
    pub export: String,
    /// The run as people call it.
    pub run: String,
    /// `surplus`, `late` or `excluded`.
    pub status: String,
    /// Why.
    pub reason: String,
}

/// A run, or a piece of an export, that could not be used.
#[derive(Debug, Clone, PartialEq, Eq, serde::Serialize)]
pub struct SetAsideRun {
    /// Its plan.
    pub plan: Option<String>,
    /// Path below the watched folder.
    pub export: String,
    /// Where in it.
    pub place: Option<String>,
    /// What stands there.
    pub found: Option<String>,
    /// What was expected.
    pub expected: Option<String>,
    /// What a person could do.
    pub hint: Option<String>,
    /// One sentence.
    pub reason: String,
    /// How many readings it costs.
    pub readings: i64,
}

impl Read<'_> {
    /// Runs that are surplus, late or excluded, newest first.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn unused(&self) -> Result<Vec<UnusedRun>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT run.plan, min(export.shown), run.part, coalesce(run.appraiser, ''),
                    coalesce(' of ' || run.taken, ''), run.status, coalesce(run.reason, '')
             FROM run JOIN delivery ON delivery.run = run.id JOIN export ON export.id = delivery.export
             WHERE run.status IN ('surplus', 'late', 'excluded') GROUP BY run.id ORDER BY run.id DESC",
        )?;
        let rows = statement.query_map([], |r| {
            let (part, appraiser, taken): (String, String, String) =
                (r.get(2)?, r.get(3)?, r.get(4)?);
            Ok(UnusedRun {
                plan: r.get(0)?,
                export: r.get(1)?,
                run: format!("{} {taken}", format!("{part} {appraiser}").trim())
                    .trim()
                    .to_owned(),
                status: r.get(5)?,
                reason: r.get(6)?,
            })
        })?;
        Ok(rows.collect::<Result<_, _>>()?)
    }

    /// Counts every reading.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn accounting(&self) -> Result<Accounting, LedgerError> {
        let mut account = Accounting::default();
        (account.total, account.not_for_a_plan) = self.connection.query_row(
            "SELECT coalesce(sum(readings), 0),
                    coalesce(sum(CASE state WHEN 'no plan' THEN readings ELSE unplanned END), 0) FROM export",
            [],
            |r| Ok((r.get(0)?, r.get(1)?)),
        )?;
        account.set_aside = self.connection.query_row(
            "SELECT coalesce(sum(readings), 0) FROM set_aside",
            [],
            |r| r.get(0),
        )?;
        let mut statement = self.connection.prepare_cached(
            "SELECT status, sum(count - copies - superseded), sum(copies), sum(superseded)
             FROM delivery JOIN run ON run.id = delivery.run GROUP BY status",
        )?;
        let mut rows = statement.query([])?;
        while let Some(row) = rows.next()? {
            let readings: i64 = row.get(1)?;
            account.copy += row.get::<_, i64>(2)?;
            account.superseded += row.get::<_, i64>(3)?;
            let place = match row.get::<_, String>(0)?.as_str() {
                "used" => &mut account.used,
                "surplus" => &mut account.surplus,
                "late" => &mut account.late,
                "set aside" => &mut account.set_aside,
                "held" => &mut account.held,
                "excluded" => &mut account.excluded,
                "unfinished" => &mut account.unfinished,
                other => return Err(LedgerError::Damaged(format!("run status `{other}`"))),
            };
            *place += readings;
        }
        Ok(account)
    }

    /// Exports whose present content could not be read, newest first.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn refused(&self) -> Result<Vec<RefusedExport>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT instrument, shown, sentence, hint FROM export
             WHERE state = 'refused' AND id IN (SELECT export FROM file WHERE NOT gone) ORDER BY id DESC",
        )?;
        let rows = statement.query_map([], |r: &Row<'_>| {
            Ok(RefusedExport {
                instrument: r.get(0)?,
                export: r.get(1)?,
                reason: r.get(2)?,
                hint: r.get(3)?,
            })
        })?;
        Ok(rows.collect::<Result<_, _>>()?)
    }

    /// Export and reason of what a parser set aside for a plan while a round was open.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn set_aside_between(
        &self,
        plan: &str,
        opened: Option<i64>,
        closed: Option<i64>,
    ) -> Result<Vec<(String, String)>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT export.shown, set_aside.reason FROM set_aside JOIN export ON export.id = set_aside.export
             WHERE export.plan = ?1 AND export.arrived BETWEEN ?2 AND ?3
               AND export.id IN (SELECT export FROM file WHERE NOT gone) ORDER BY set_aside.id",
        )?;
        let (from, to) = (opened.unwrap_or(i64::MIN), closed.unwrap_or(i64::MAX));
        let rows = statement.query_map(rusqlite::params![plan, from, to], |r| {
            Ok((r.get(0)?, r.get(1)?))
        })?;
        Ok(rows.collect::<Result<_, _>>()?)
    }

    /// What of the exports' present content could not be used, newest first: by the parser, and by the plan.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn set_aside(&self) -> Result<Vec<SetAsideRun>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT export.plan, export.shown, set_aside.place, set_aside.found, set_aside.expected,
                    set_aside.hint, set_aside.reason, set_aside.readings
             FROM set_aside JOIN export ON export.id = set_aside.export
             WHERE export.id IN (SELECT export FROM file WHERE NOT gone) ORDER BY set_aside.id DESC",
        )?;
        let mut asides: Vec<SetAsideRun> = statement
            .query_map([], |r| {
                Ok(SetAsideRun {
                    plan: r.get(0)?,
                    export: r.get(1)?,
                    place: r.get(2)?,
                    found: r.get(3)?,
                    expected: r.get(4)?,
                    hint: r.get(5)?,
                    reason: r.get(6)?,
                    readings: r.get(7)?,
                })
            })?
            .collect::<Result<_, _>>()?;
        let mut statement = self.connection.prepare_cached(
            "SELECT run.plan, min(export.shown), coalesce(run.reason, ''),
                    sum(delivery.count - delivery.copies - delivery.superseded)
             FROM run JOIN delivery ON delivery.run = run.id JOIN export ON export.id = delivery.export
             WHERE run.status = 'set aside' AND export.id IN (SELECT export FROM file WHERE NOT gone)
             GROUP BY run.id ORDER BY run.id DESC",
        )?;
        let by_plan = statement.query_map([], |r| {
            Ok(SetAsideRun {
                plan: r.get(0)?,
                export: r.get(1)?,
                place: None,
                found: None,
                expected: None,
                hint: None,
                reason: r.get(2)?,
                readings: r.get(3)?,
            })
        })?;
        for aside in by_plan {
            asides.push(aside?);
        }
        Ok(asides)
    }
}
