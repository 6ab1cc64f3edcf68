//! Rounds: one pass through a plan.

use jiff::civil::DateTime;
use rusqlite::{OptionalExtension, Row, params};

use super::{LedgerError, Read, Write};

/// Where a round is in its life.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RoundState {
    /// A stray run or two after a close: no clock, no notices yet.
    Pending,
    /// Filling.
    Open,
    /// Waits for a person.
    Held,
    /// Every cell filled; closed.
    Complete,
    /// Its time was up; closed without a standing.
    Unfinished,
}

impl RoundState {
    /// As the ledger and every text spell it.
    #[must_use]
    pub const fn as_str(self) -> &'static str {
        match self {
            Self::Pending => "pending",
            Self::Open => "open",
            Self::Held => "held",
            Self::Complete => "complete",
            Self::Unfinished => "unfinished",
        }
    }

    /// True when no further run is taken in.
    #[must_use]
    pub const fn closed(self) -> bool {
        matches!(self, Self::Complete | Self::Unfinished)
    }

    fn parse(text: &str) -> Result<Self, LedgerError> {
        [
            Self::Pending,
            Self::Open,
            Self::Held,
            Self::Complete,
            Self::Unfinished,
        ]
        .into_iter()
        .find(|s| s.as_str() == text)
        .ok_or_else(|| LedgerError::Damaged(format!("round state `{text}`")))
    }
}

/// A recorded round.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RoundRow {
    /// Its number in the ledger.
    pub id: i64,
    /// Its plan.
    pub plan: String,
    /// Its number within the plan, from 1.
    pub number: i64,
    /// The export's own name of it.
    pub label: Option<String>,
    /// Where it is in its life.
    pub state: RoundState,
    /// Why it is held or unfinished.
    pub reason: Option<String>,
    /// ms since 1970.
    pub opened: Option<i64>,
    /// ms since 1970.
    pub closed: Option<i64>,
    /// Latest time of its used runs, once closed.
    pub through: Option<DateTime>,
    /// Counts changes after the close, from 1.
    pub revision: i64,
    /// Last revision with its studies recorded.
    pub analysed: i64,
    /// Last revision with its report written.
    pub reported: i64,
}

const COLUMNS: &str = "id, plan, number, label, state, reason, opened, closed, through, revision,
  analysed, reported";

impl Read<'_> {
    /// The rounds of a plan, oldest first.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn rounds(&self, plan: &str) -> Result<Vec<RoundRow>, LedgerError> {
        self.select_rounds("plan = ?1 ORDER BY number", params![plan])
    }

    /// One round.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn round(&self, id: i64) -> Result<Option<RoundRow>, LedgerError> {
        self.connection
            .prepare_cached(&format!("SELECT {COLUMNS} FROM round WHERE id = ?1"))?
            .query_row([id], |r| Ok(round_row(r)))
            .optional()?
            .transpose()
    }

    /// Complete rounds whose studies are owed.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn rounds_to_analyse(&self, plan: &str) -> Result<Vec<RoundRow>, LedgerError> {
        self.select_rounds(
            "plan = ?1 AND state = 'complete' AND analysed < revision ORDER BY number",
            params![plan],
        )
    }

    /// Analysed rounds whose report is owed.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn rounds_to_report(&self, plan: &str) -> Result<Vec<RoundRow>, LedgerError> {
        self.select_rounds(
            "plan = ?1 AND analysed > reported ORDER BY number",
            params![plan],
        )
    }

    fn select_rounds(
        &self,
        condition: &str,
        values: &[&dyn rusqlite::ToSql],
    ) -> Result<Vec<RoundRow>, LedgerError> {
        let mut statement = self
            .connection
            .prepare_cached(&format!("SELECT {COLUMNS} FROM round WHERE {condition}"))?;
        let rows = statement.query_map(values, |r| Ok(round_row(r)))?;
        rows.map(|row| row?).collect()
    }
}

impl Write<'_> {
    /// Starts a round.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn add_round(
        &self,
        plan: &str,
        number: i64,
        label: Option<&str>,
    ) -> Result<i64, LedgerError> {
        self.transaction
            .prepare_cached(
                "INSERT INTO round (plan, number, label, state) VALUES (?1, ?2, ?3, 'pending')",
            )?
            .execute(params![plan, number, label])?;
        Ok(self.transaction.last_insert_rowid())
    }

    /// Records a round's state.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn put_round(&self, round: &RoundRow) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached(
                "UPDATE round SET state = ?2, reason = ?3, opened = ?4, closed = ?5, through = ?6,
                   revision = ?7, analysed = ?8, reported = ?9 WHERE id = ?1",
            )?
            .execute(params![
                round.id,
                round.state.as_str(),
                round.reason,
                round.opened,
                round.closed,
                round.through.map(|t| t.to_string()),
                round.revision,
                round.analysed,
                round.reported,
            ])?;
        Ok(())
    }

    /// Forgets a round that lost its last run before it opened.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn drop_round(&self, id: i64) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached("DELETE FROM round WHERE id = ?1")?
            .execute([id])?;
        Ok(())
    }
}

fn round_row(r: &Row<'_>) -> Result<RoundRow, LedgerError> {
    let through: Option<String> = r.get(8)?;
    let through = through.map(|t| t.parse()).transpose();
    Ok(RoundRow {
        id: r.get(0)?,
        plan: r.get(1)?,
        number: r.get(2)?,
        label: r.get(3)?,
        state: RoundState::parse(&r.get::<_, String>(4)?)?,
        reason: r.get(5)?,
        opened: r.get(6)?,
        closed: r.get(7)?,
        through: through.map_err(|_| LedgerError::Damaged("time".into()))?,
        revision: r.get(9)?,
        analysed: r.get(10)?,
        reported: r.get(11)?,
    })
}
