//! The ledger: the embedded database of all that happened, and the only SQL of the program.
//!
//! Model: one SQLite file in the state folder, WAL, synchronous FULL. Work and its record commit in one
//! transaction ([`Ledger::write`], `BEGIN IMMEDIATE`); readers open their own connection.
//!
//! Not here: what the rows mean for a round or a standing (`rounds`, `analyse`).
//!
//! Invariant: what was committed survives a power cut, and every reading met in an export is counted in exactly
//! one place of [`Accounting`].

mod account;
mod export;
mod file;
mod outbox;
mod readings;
mod round;
mod run;
mod study;

use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};
use std::time::Duration;

use rusqlite::{Connection, OpenFlags, Transaction, TransactionBehavior};

pub use account::{Accounting, RefusedExport, SetAsideRun, UnusedRun};
pub use export::{DealtWith, Digest, ExportState, NewExport, PackedExport};
pub use file::{FileRow, Stat};
pub use outbox::{NewNotice, NoticeRow, OutboxRow, Owed, Tried};
pub use readings::{Delivered, PackedReading};
pub use round::{RoundRow, RoundState};
pub use run::{Holds, Placement, RunFacts, RunRow, RunStatus, Tally};
pub use study::{Earlier, StudyRow};

/// The schema this program writes.
const SCHEMA: i32 = 1;
/// Marks the file as ours: "Rstd".
const APPLICATION: i32 = 0x5273_7464;
const BUSY: Duration = Duration::from_secs(10);

/// An open ledger.
pub struct Ledger {
    connection: Connection,
}

/// The one writer, shared by the stages.
#[derive(Clone)]
pub struct SharedLedger(Arc<Mutex<Ledger>>);

impl SharedLedger {
    /// Shares a ledger.
    #[must_use]
    pub fn new(ledger: Ledger) -> Self {
        Self(Arc::new(Mutex::new(ledger)))
    }

    /// Waits for its turn. A panic elsewhere rolled its transaction back, so the ledger is sound.
    pub fn lock(&self) -> MutexGuard<'_, Ledger> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

/// Why the ledger could not be opened, read or written.
#[derive(Debug, thiserror::Error)]
pub enum LedgerError {
    /// The file belongs to something else.
    #[error("`{0}` is a database, but not a Restudy ledger")]
    Foreign(PathBuf),
    /// Written by a later version.
    #[error("the ledger `{path}` has schema {found}; this version knows up to {SCHEMA}")]
    Newer {
        /// The file.
        path: PathBuf,
        /// Its schema.
        found: i32,
    },
    /// There is none yet.
    #[error("there is no ledger at `{0}` yet: has `restudy serve` run with this configuration?")]
    Absent(PathBuf),
    /// The database said no.
    #[error("the ledger could not be used: {}", in_words(.0))]
    Database(rusqlite::Error),
    /// A row holds what no version of this program writes.
    #[error("the ledger holds an unreadable {0}")]
    Damaged(String),
}

impl From<rusqlite::Error> for LedgerError {
    fn from(error: rusqlite::Error) -> Self {
        Self::Database(error)
    }
}

/// The database's refusal as a person would say it.
fn in_words(error: &rusqlite::Error) -> String {
    use rusqlite::ErrorCode;
    let what = match error.sqlite_error_code() {
        Some(ErrorCode::DiskFull) => "the disk is full",
        Some(ErrorCode::SystemIoFailure) => "the disk refused to read or write (is it full?)",
        Some(ErrorCode::ReadOnly) => "this user may not write it",
        Some(ErrorCode::PermissionDenied | ErrorCode::CannotOpen) => {
            "its file cannot be opened (is its folder there, and may this user use it?)"
        }
        Some(ErrorCode::NotADatabase | ErrorCode::DatabaseCorrupt) => {
            "its file is damaged, or something else"
        }
        Some(ErrorCode::DatabaseBusy | ErrorCode::DatabaseLocked) => "another program holds it",
        _ => return error.to_string(),
    };
    format!("{what} ({error})")
}

impl Ledger {
    /// Opens the ledger below the state folder for reading and writing; makes it when there is none.
    ///
    /// # Errors
    /// A foreign or newer file, or the database's own refusal.
    pub fn open(state: &Path) -> Result<Self, LedgerError> {
        let path = Self::path(state);
        let mut connection = Connection::open(&path)?;
        connection.busy_timeout(BUSY)?;
        refuse_foreign(&connection, &path)?;
        connection.pragma_update(None, "journal_mode", "WAL")?;
        connection.pragma_update(None, "synchronous", "FULL")?;
        connection.pragma_update(None, "foreign_keys", "ON")?;
        migrate(&mut connection)?;
        Ok(Self { connection })
    }

    /// Opens an existing ledger for reading, beside a running service.
    ///
    /// # Errors
    /// No ledger, a foreign or newer file, or the database's own refusal.
    pub fn open_to_read(state: &Path) -> Result<Self, LedgerError> {
        let path = Self::path(state);
        if !path.exists() {
            return Err(LedgerError::Absent(path));
        }
        let connection = Connection::open_with_flags(
            &path,
            OpenFlags::SQLITE_OPEN_READ_WRITE | OpenFlags::SQLITE_OPEN_NO_MUTEX,
        )?;
        connection.busy_timeout(BUSY)?;
        if refuse_foreign(&connection, &path)? < 1 {
            return Err(LedgerError::Absent(path));
        }
        connection.pragma_update(None, "query_only", "ON")?;
        Ok(Self { connection })
    }

    /// Where the ledger lies in a state folder.
    #[must_use]
    pub fn path(state: &Path) -> PathBuf {
        state.join("restudy.db")
    }

    /// Runs `work` in one transaction: all of it is recorded, or nothing.
    ///
    /// # Errors
    /// What `work` returns, or the database's refusal to commit.
    pub fn write<T, E: From<LedgerError>>(
        &mut self,
        work: impl FnOnce(&Write<'_>) -> Result<T, E>,
    ) -> Result<T, E> {
        let transaction = self
            .connection
            .transaction_with_behavior(TransactionBehavior::Immediate)
            .map_err(LedgerError::from)?;
        let write = Write { transaction };
        let value = work(&write)?;
        write.transaction.commit().map_err(LedgerError::from)?;
        Ok(value)
    }

    /// Several queries that see one and the same state, beside a service that writes.
    ///
    /// # Errors
    /// What `work` returns, or the database's refusal.
    pub fn snapshot<T>(
        &self,
        work: impl FnOnce(Read<'_>) -> Result<T, LedgerError>,
    ) -> Result<T, LedgerError> {
        let transaction = self.connection.unchecked_transaction()?;
        work(Read {
            connection: &transaction,
        })
    }

    /// The reading side.
    #[must_use]
    pub fn read(&self) -> Read<'_> {
        Read {
            connection: &self.connection,
        }
    }
}

/// Queries.
#[derive(Clone, Copy)]
pub struct Read<'a> {
    connection: &'a Connection,
}

/// A transaction under way: everything of [`Read`], and changes.
pub struct Write<'a> {
    transaction: Transaction<'a>,
}

impl Write<'_> {
    /// The reading side, inside this transaction.
    #[must_use]
    pub fn read(&self) -> Read<'_> {
        Read {
            connection: &self.transaction,
        }
    }
}

/// Refuses what is not ours; answers with the schema's version, 0 before the service has made its tables.
fn refuse_foreign(connection: &Connection, path: &Path) -> Result<i32, LedgerError> {
    let application: i32 = connection.pragma_query_value(None, "application_id", |r| r.get(0))?;
    let schema: i32 = connection.pragma_query_value(None, "user_version", |r| r.get(0))?;
    let empty: bool =
        connection.query_row("SELECT NOT EXISTS (SELECT 1 FROM sqlite_schema)", [], |r| {
            r.get(0)
        })?;
    if application != APPLICATION && !empty {
        return Err(LedgerError::Foreign(path.to_owned()));
    }
    if schema > SCHEMA {
        return Err(LedgerError::Newer {
            path: path.to_owned(),
            found: schema,
        });
    }
    Ok(schema)
}

/// Brings the schema up to [`SCHEMA`], tables and version number in one transaction.
fn migrate(connection: &mut Connection) -> Result<(), LedgerError> {
    let transaction = connection.transaction_with_behavior(TransactionBehavior::Immediate)?;
    let schema: i32 = transaction.pragma_query_value(None, "user_version", |r| r.get(0))?;
    if schema < 1 {
        transaction.execute_batch(include_str!("ledger/schema-1.sql"))?;
        transaction.pragma_update(None, "application_id", APPLICATION)?;
    }
    if schema < SCHEMA {
        transaction.pragma_update(None, "user_version", SCHEMA)?;
    }
    transaction.commit()?;
    Ok(())
}
