//! Studies and the standings that follow from them.

use jiff::civil::{Date, DateTime};
use jiff::tz::TimeZone;
use restudy_engine::Standing;
use rusqlite::{OptionalExtension, Row, params};

use super::{LedgerError, Read, Write};
use crate::now::in_zone;

/// One recorded study.
#[derive(Debug, Clone, PartialEq)]
pub struct StudyRow {
    /// Its round.
    pub round: i64,
    /// Of that round.
    pub revision: i64,
    /// The characteristic's label.
    pub characteristic: String,
    /// The study record as JSON.
    pub record: String,
    /// Gauge share of tolerance, when there is one.
    pub share: Option<f64>,
    /// Where it lies.
    pub standing: Standing,
}

/// How a characteristic stood in an earlier round.
#[derive(Debug, Clone, PartialEq)]
pub struct Earlier {
    /// Its round's number within the plan.
    pub number: i64,
    /// When that round closed, ms since 1970.
    pub closed: i64,
    /// The study.
    pub study: StudyRow,
}

impl Earlier {
    /// The day on which its last run was measured, where the exports say so, else on which it closed.
    #[must_use]
    pub fn day(&self, zone: &TimeZone) -> Date {
        let record: Option<serde_json::Value> = serde_json::from_str(&self.study.record).ok();
        record
            .and_then(|r| {
                r.pointer("/measured/last")?
                    .as_str()?
                    .parse::<DateTime>()
                    .ok()
            })
            .map_or_else(|| in_zone(self.closed, zone).date(), DateTime::date)
    }
}

impl Read<'_> {
    /// The studies of one revision of a round, in the characteristics' alphabetical order.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn studies(&self, round: i64, revision: i64) -> Result<Vec<StudyRow>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT round, revision, characteristic, record, share, standing FROM study
             WHERE round = ?1 AND revision = ?2 ORDER BY characteristic",
        )?;
        let rows = statement.query_map([round, revision], |r| Ok(study_row(r)))?;
        rows.map(|row| row?).collect()
    }

    /// The last study of a characteristic before a round of its plan.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn study_before(
        &self,
        plan: &str,
        number: i64,
        characteristic: &str,
    ) -> Result<Option<Earlier>, LedgerError> {
        self.connection
            .prepare_cached(
                "SELECT study.round, study.revision, study.characteristic, study.record, study.share,
                   study.standing, round.number, round.closed
                 FROM study JOIN round ON round.id = study.round AND study.revision = round.analysed
                 WHERE round.plan = ?1 AND round.number < ?2 AND study.characteristic = ?3
                 ORDER BY round.number DESC LIMIT 1",
            )?
            .query_row(params![plan, number, characteristic], |r| {
                let (number, closed) = (r.get(6)?, r.get(7)?);
                Ok(study_row(r).map(|study| Earlier { number, closed, study }))
            })
            .optional()?
            .transpose()
    }
}

impl Write<'_> {
    /// Records a study.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn put_study(&self, study: &StudyRow) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached(
                "INSERT INTO study (round, revision, characteristic, record, share, standing)
                 VALUES (?1, ?2, ?3, ?4, ?5, ?6)",
            )?
            .execute(params![
                study.round,
                study.revision,
                study.characteristic,
                study.record,
                study.share,
                study.standing.as_str(),
            ])?;
        Ok(())
    }

    /// Records where a characteristic stands now; `since` moves only when the standing does.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn put_standing(&self, plan: &str, study: &StudyRow) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached(
                "INSERT INTO standing (plan, characteristic, round, revision, now, since, share)
                 VALUES (?1, ?2, ?3, ?4, ?5, ?3, ?6)
                 ON CONFLICT (plan, characteristic) DO UPDATE SET round = excluded.round,
                   revision = excluded.revision, share = excluded.share,
                   since = CASE WHEN now = excluded.now THEN since ELSE excluded.since END,
                   now = excluded.now
                 WHERE excluded.round >= standing.round",
            )?
            .execute(params![
                plan,
                study.characteristic,
                study.round,
                study.revision,
                study.standing.as_str(),
                study.share,
            ])?;
        Ok(())
    }
}

fn study_row(r: &Row<'_>) -> Result<StudyRow, LedgerError> {
    let standing: String = r.get(5)?;
    Ok(StudyRow {
        round: r.get(0)?,
        revision: r.get(1)?,
        characteristic: r.get(2)?,
        record: r.get(3)?,
        share: r.get(4)?,
        standing: serde_json::from_value(standing.into())
            .map_err(|_| LedgerError::Damaged("standing".into()))?,
    })
}
