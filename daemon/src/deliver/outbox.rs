//! One channel's share of the outbox: what is due, and what became of it.
//!
//! Invariant: nothing is handed out for delivery while an earlier result is not recorded, or while the disk below
//! the ledger takes no further record; so a full disk repeats no notice.

use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use crate::ledger::{LedgerError, Owed, Read, SharedLedger, Tried};
use crate::now::Now;

/// Notices fetched at once; bounds memory, whatever the backlog.
pub(super) const BATCH: usize = 16;
/// What the disk must take before a batch is handed out, bytes: more than the records of a batch.
const ROOM: usize = 256 * 1024;

/// Why nothing is delivered for now.
#[derive(Debug, thiserror::Error)]
pub(super) enum Halt {
    #[error("the outbox cannot be read or written")]
    Ledger(#[from] LedgerError),
    #[error("the state folder `{0}` has no room to record a delivery, so nothing is delivered")]
    NoRoom(PathBuf, #[source] io::Error),
}

pub(super) struct Outbox {
    channel: &'static str,
    ledger: SharedLedger,
    state: PathBuf,
    unrecorded: Option<Outcome>,
}

/// What became of a notice, and when, ms since 1970.
#[derive(Clone)]
struct Outcome {
    id: i64,
    tried: Tried,
    at: i64,
}

impl Outbox {
    /// `state` is the folder of the ledger.
    pub(super) fn new(channel: &'static str, ledger: SharedLedger, state: &Path) -> Self {
        Self {
            channel,
            ledger,
            state: state.to_owned(),
            unrecorded: None,
        }
    }

    /// The oldest notices that are due by then, ms since 1970.
    pub(super) async fn due(&mut self, until: i64) -> Result<Vec<Owed>, Halt> {
        self.catch_up().await?;
        let channel = self.channel;
        let owed = self
            .read(move |read| read.owed_now(channel, until, BATCH))
            .await?;
        if !owed.is_empty() {
            let state = self.state.clone();
            apart(move || room(&state).map_err(|e| Halt::NoRoom(state, e))).await?;
        }
        Ok(owed)
    }

    /// When the next notice is due, ms since 1970.
    pub(super) async fn next_due(&self) -> Result<Option<i64>, Halt> {
        let channel = self.channel;
        self.read(move |read| read.next_due(channel)).await
    }

    /// Records what became of a notice; remembers it where the ledger does not take it.
    pub(super) async fn record(&mut self, id: i64, tried: Tried) -> Result<(), Halt> {
        let at = Now::read().utc;
        self.unrecorded = Some(Outcome { id, tried, at });
        self.catch_up().await
    }

    async fn catch_up(&mut self) -> Result<(), Halt> {
        let Some(Outcome { id, tried, at }) = self.unrecorded.clone() else {
            return Ok(());
        };
        let ledger = self.ledger.clone();
        apart(move || Ok(ledger.lock().write(|w| w.tried(id, &tried, at))?)).await?;
        self.unrecorded = None;
        Ok(())
    }

    async fn read<T: Send + 'static>(
        &self,
        query: impl FnOnce(Read<'_>) -> Result<T, LedgerError> + Send + 'static,
    ) -> Result<T, Halt> {
        let ledger = self.ledger.clone();
        apart(move || Ok(query(ledger.lock().read())?)).await
    }
}

/// The disk and the ledger may be busy for a while: not on the thread that talks to the server.
async fn apart<T: Send + 'static>(
    work: impl FnOnce() -> Result<T, Halt> + Send + 'static,
) -> Result<T, Halt> {
    let done = tokio::task::spawn_blocking(work).await;
    done.unwrap_or_else(|e| Err(LedgerError::Damaged(format!("notice ({e})")).into()))
}

/// Writes a file without a name, which is gone when it is closed.
fn room(state: &Path) -> io::Result<()> {
    let mut file = tempfile::tempfile_in(state)?;
    file.write_all(&vec![0; ROOM])?;
    file.sync_all()
}
