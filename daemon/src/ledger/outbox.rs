//! Notices owed and delivered: one row a recipient and channel.

use rusqlite::{Row, params};

use super::{LedgerError, Read, Write};

/// A notice about to be owed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NewNotice {
    /// How it travels: `log` or `mail`.
    pub channel: &'static str,
    /// An address; empty for the log.
    pub recipient: String,
    /// Message-ID: made from site, plan, round, revision, kind and recipient.
    pub key: String,
    /// Message-ID of the thread's first message.
    pub thread: String,
    /// Its plan.
    pub plan: String,
    /// Its round.
    pub round: i64,
    /// Its kind, as in routes.
    pub kind: &'static str,
    /// One line.
    pub subject: String,
    /// What is sent, to the byte.
    pub bytes: Vec<u8>,
}

/// A notice that is owed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Owed {
    /// Its number.
    pub id: i64,
    /// How it travels.
    pub channel: String,
    /// To whom.
    pub recipient: String,
    /// Its Message-ID.
    pub key: String,
    /// One line.
    pub subject: String,
    /// What is sent, to the byte.
    pub bytes: Vec<u8>,
    /// Tries so far.
    pub attempts: u32,
}

/// A notice as `status` shows it.
#[derive(Debug, Clone, PartialEq, Eq, serde::Serialize)]
pub struct OutboxRow {
    /// How it travels.
    pub channel: String,
    /// To whom.
    pub recipient: String,
    /// Its plan.
    pub plan: String,
    /// One line.
    pub subject: String,
    /// ms since 1970.
    #[serde(skip)]
    pub created: i64,
    /// Tries so far.
    pub attempts: u32,
    /// What the last try said.
    pub last_error: Option<String>,
    /// True when the server refused it for good.
    pub refused: bool,
}

/// What became of one try.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Tried {
    /// It was taken.
    Delivered,
    /// Try again at that time, ms since 1970.
    Later(i64, String),
    /// The server will never take it.
    Refused(String),
}

impl Read<'_> {
    /// A channel's notices that are due, oldest first.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn owed_now(
        &self,
        channel: &str,
        now: i64,
        at_most: usize,
    ) -> Result<Vec<Owed>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT id, channel, recipient, key, subject, bytes, attempts FROM outbox
             WHERE state = 'owed' AND channel = ?1 AND next_try <= ?2 ORDER BY id LIMIT ?3",
        )?;
        let rows = statement.query_map(params![channel, now, at_most as i64], |r| {
            Ok(Owed {
                id: r.get(0)?,
                channel: r.get(1)?,
                recipient: r.get(2)?,
                key: r.get(3)?,
                subject: r.get(4)?,
                bytes: r.get(5)?,
                attempts: r.get(6)?,
            })
        })?;
        Ok(rows.collect::<Result<_, _>>()?)
    }

    /// When a channel's next notice is due, ms since 1970.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn next_due(&self, channel: &str) -> Result<Option<i64>, LedgerError> {
        Ok(self
            .connection
            .prepare_cached(
                "SELECT min(next_try) FROM outbox WHERE state = 'owed' AND channel = ?1",
            )?
            .query_row([channel], |r| r.get(0))?)
    }

    /// Notices owed or refused, oldest first.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn undelivered(&self) -> Result<Vec<OutboxRow>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT channel, recipient, plan, subject, created, attempts, last_error, state = 'refused'
             FROM outbox WHERE state <> 'delivered' ORDER BY id",
        )?;
        let rows = statement.query_map([], |r: &Row<'_>| {
            Ok(OutboxRow {
                channel: r.get(0)?,
                recipient: r.get(1)?,
                plan: r.get(2)?,
                subject: r.get(3)?,
                created: r.get(4)?,
                attempts: r.get(5)?,
                last_error: r.get(6)?,
                refused: r.get(7)?,
            })
        })?;
        Ok(rows.collect::<Result<_, _>>()?)
    }

    /// Channel, Message-ID, subject and bytes of every notice of a round, oldest first.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn notices_of(&self, round: i64) -> Result<Vec<NoticeRow>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT channel, recipient, thread, subject, bytes FROM outbox WHERE round = ?1 ORDER BY id",
        )?;
        let rows = statement.query_map([round], |r| {
            Ok(NoticeRow {
                channel: r.get(0)?,
                recipient: r.get(1)?,
                thread: r.get(2)?,
                subject: r.get(3)?,
                bytes: r.get(4)?,
            })
        })?;
        Ok(rows.collect::<Result<_, _>>()?)
    }

    /// The thread of a plan's last notice to a recipient, while the plan is not back under its limits.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn last_thread(&self, plan: &str, recipient: &str) -> Result<Option<String>, LedgerError> {
        use rusqlite::OptionalExtension as _;
        Ok(self
            .connection
            .prepare_cached(
                "SELECT thread FROM outbox WHERE plan = ?1 AND recipient = ?2 AND channel = 'mail'
                 ORDER BY id DESC LIMIT 1",
            )?
            .query_row([plan, recipient], |r| r.get(0))
            .optional()?)
    }
}

/// A notice with its content.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NoticeRow {
    /// How it travels.
    pub channel: String,
    /// To whom.
    pub recipient: String,
    /// Message-ID of the thread's first message.
    pub thread: String,
    /// One line.
    pub subject: String,
    /// What is sent, to the byte.
    pub bytes: Vec<u8>,
}

impl Write<'_> {
    /// Owes a notice from now on; one that is owed already stays as it is.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn owe(&self, notice: &NewNotice, now: i64) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached(
                "INSERT OR IGNORE INTO outbox (channel, recipient, key, thread, plan, round, kind, subject,
                   bytes, created, next_try) VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10, ?10)",
            )?
            .execute(params![
                notice.channel,
                notice.recipient,
                notice.key,
                notice.thread,
                notice.plan,
                notice.round,
                notice.kind,
                notice.subject,
                notice.bytes,
                now,
            ])?;
        Ok(())
    }

    /// Records what became of a try.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn tried(&self, id: i64, outcome: &Tried, now: i64) -> Result<(), LedgerError> {
        let (state, next, error, delivered) = match outcome {
            Tried::Delivered => ("delivered", now, None, Some(now)),
            Tried::Later(at, why) => ("owed", *at, Some(why), None),
            Tried::Refused(why) => ("refused", now, Some(why), None),
        };
        self.transaction
            .prepare_cached(
                "UPDATE outbox SET state = ?2, next_try = ?3, last_error = ?4, delivered = ?5,
                   attempts = attempts + 1 WHERE id = ?1",
            )?
            .execute(params![id, state, next, error, delivered])?;
        Ok(())
    }
}
