//! Delivery: what the outbox owes, to the log and to the mail server.
//!
//! Model: the outbox is the queue. A pass writes what the log is owed, then sends mail after mail in one session;
//! each result is recorded before the next. A server that cannot be reached or does not let us in is tried with one
//! mail at growing distances, while all others wait unchanged.
//!
//! Not here: what a notice says (`notice`).
//!
//! Invariant: a notice leaves the outbox only after it was taken or refused for good, so it is delivered at least
//! once; every repetition has the same bytes and the same Message-ID.

pub mod address;
pub mod backoff;
pub mod password;
mod session;

#[cfg(test)]
mod tests;

use std::sync::Arc;
use std::time::Duration;

use restudy_config::{Config, Mail};
use tokio::sync::Notify;
use tokio::time::{Instant, sleep, timeout};

use crate::causes::chain;
use crate::ledger::{LedgerError, Owed, Read, SharedLedger, Tried};
use crate::now::Now;
use crate::stop::Stop;
use backoff::Backoff;
use session::{Down, Failed, Session};

/// Mails fetched at once; bounds memory, whatever the backlog.
const BATCH: usize = 16;
/// A server's words are cut to this many characters.
const WORDS_MAX: usize = 300;

/// Time limits of delivery.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Limits {
    /// For opening a session, and for each mail.
    pub send: Duration,
    /// For saying goodbye.
    pub goodbye: Duration,
    /// For a mail under way when the service stops.
    pub stop: Duration,
    /// After a fault of the ledger.
    pub after_fault: Duration,
    /// Between tries.
    pub backoff: Backoff,
}

/// The limits of the service.
pub const LIMITS: Limits = Limits {
    send: Duration::from_secs(60),
    goodbye: Duration::from_secs(2),
    stop: Duration::from_secs(3),
    after_fault: Duration::from_secs(5),
    backoff: Backoff {
        first: Duration::from_secs(60),
        longest: Duration::from_secs(30 * 60),
    },
};

/// Delivers until `stop`: on every `wake`, and when the next try is due.
pub async fn run(ledger: SharedLedger, config: Arc<Config>, wake: Arc<Notify>, stop: Stop) {
    run_within(ledger, config, wake, stop, LIMITS).await;
}

/// [`run`] with other time limits.
pub async fn run_within(
    ledger: SharedLedger,
    config: Arc<Config>,
    wake: Arc<Notify>,
    stop: Stop,
    limits: Limits,
) {
    let mut delivery = Delivery {
        ledger,
        config,
        limits,
        stop: stop.clone(),
        server: Server::default(),
    };
    delivery.say_without_server().await;
    while !stop.is_set() {
        let wait = tokio::select! {
            pass = delivery.pass() => pass.unwrap_or_else(|error| {
                tracing::error!(error = %chain(&error), "the outbox cannot be read or written; trying again");
                Some(limits.after_fault)
            }),
            () = patience(&stop, limits.stop) => {
                tracing::warn!("a mail was still under way; it stays owed");
                return;
            }
        };
        tokio::select! {
            () = stop.wait() => {}
            () = wake.notified() => {}
            () = sleep(wait.unwrap_or(limits.backoff.longest)) => {}
        }
    }
}

/// Ends that long after the stop.
async fn patience(stop: &Stop, longest: Duration) {
    stop.wait().await;
    sleep(longest.saturating_sub(stop.since())).await;
}

/// What is known about the mail server: nothing that a restart must remember.
#[derive(Default)]
struct Server {
    failures: u32,
    closed_until: Option<Instant>,
}

struct Delivery {
    ledger: SharedLedger,
    config: Arc<Config>,
    limits: Limits,
    stop: Stop,
    server: Server,
}

impl Delivery {
    /// Delivers what is due; answers how long to wait for the next try, if any is to come.
    async fn pass(&mut self) -> Result<Option<Duration>, LedgerError> {
        while let Some(owed) = self.next("log", i64::MAX).await? {
            for notice in owed {
                let text = String::from_utf8_lossy(&notice.bytes);
                tracing::warn!(%text, "{}", notice.subject);
                self.tried(notice.id, Tried::Delivered).await?;
            }
        }
        let config = Arc::clone(&self.config);
        match &config.mail {
            Some(mail) => self.mails(mail).await,
            None => Ok(None),
        }
    }

    async fn mails(&mut self, mail: &Mail) -> Result<Option<Duration>, LedgerError> {
        let mut session = None;
        'pass: while !self.pauses() {
            let Some(owed) = self.next("mail", self.horizon().await?).await? else {
                break;
            };
            for notice in owed {
                if self.pauses() {
                    break 'pass;
                }
                let outcome = self.one(mail, &mut session, &notice).await;
                self.settle(&notice, outcome).await?;
            }
        }
        if let Some(session) = session {
            // The mails are recorded; a server that does not answer now is left alone.
            let _ = timeout(self.limits.goodbye, session.close()).await;
        }
        let Some(due) = self.read(|read| read.next_due("mail")).await? else {
            return Ok(None);
        };
        let due =
            u64::try_from(due - Now::read().utc).map_or(Duration::ZERO, Duration::from_millis);
        Ok(Some(due.max(self.closed_for())))
    }

    /// One mail; a session that failed is not used again.
    async fn one(
        &self,
        mail: &Mail,
        session: &mut Option<Session>,
        notice: &Owed,
    ) -> Result<(), Failed> {
        let from = address::sender(&mail.from)
            .map_err(|sentence| {
                Failed::Down(Down {
                    sentence,
                    needs_person: true,
                })
            })?
            .email;
        let to = address::address(&notice.recipient).map_err(Failed::Refused)?;
        let mut open = match session.take() {
            Some(open) => open,
            None => within(self.limits.send, Session::open(mail))
                .await?
                .map_err(Failed::Down)?,
        };
        within(self.limits.send, open.send(&from, &to, &notice.bytes)).await??;
        *session = Some(open);
        Ok(())
    }

    async fn settle(
        &mut self,
        notice: &Owed,
        outcome: Result<(), Failed>,
    ) -> Result<(), LedgerError> {
        let (recipient, subject) = (notice.recipient.as_str(), notice.subject.as_str());
        let tried = match outcome {
            Ok(()) => {
                self.server = Server::default();
                tracing::info!(recipient, subject, "notice mailed");
                Tried::Delivered
            }
            Err(Failed::Refused(why)) => {
                tracing::error!(
                    recipient,
                    subject,
                    "the mail server refuses a notice for good: {why}"
                );
                Tried::Refused(why)
            }
            Err(Failed::Later(why)) => {
                tracing::warn!(
                    recipient,
                    subject,
                    "notice not taken yet, it stays owed: {why}"
                );
                self.later(notice, notice.attempts + 1, why)
            }
            Err(Failed::Down(Down {
                sentence,
                needs_person,
            })) => {
                self.server.failures += 1;
                let closed = self.limits.backoff.wait(self.server.failures);
                self.server.closed_until = Some(Instant::now() + closed);
                let again = format!("{} s", closed.as_secs());
                if needs_person {
                    tracing::error!(again, "mail cannot be sent and stays owed: {sentence}");
                } else {
                    tracing::warn!(again, "mail cannot be sent and stays owed: {sentence}");
                }
                self.later(notice, self.server.failures, sentence)
            }
        };
        self.tried(notice.id, tried).await
    }

    fn later(&self, notice: &Owed, failures: u32, why: String) -> Tried {
        let wait = self.limits.backoff.wait_of(failures, &notice.key);
        let wait = i64::try_from(wait.as_millis()).unwrap_or(i64::MAX);
        Tried::Later(Now::read().utc.saturating_add(wait), why)
    }

    /// True when no further mail is sent in this pass.
    fn pauses(&self) -> bool {
        self.stop.is_set() || !self.closed_for().is_zero()
    }

    fn closed_for(&self) -> Duration {
        let left = |until: Instant| until.saturating_duration_since(Instant::now());
        self.server.closed_until.map(left).unwrap_or_default()
    }

    /// Up to when mails are due: now. Where the next one is further away than any wait, the wall clock was set
    /// back, and it is due.
    async fn horizon(&self) -> Result<i64, LedgerError> {
        let now = Now::read().utc;
        let longest = i64::try_from(self.limits.backoff.longest.as_millis()).unwrap_or(i64::MAX);
        let next = self.read(|read| read.next_due("mail")).await?;
        Ok(next
            .filter(|next| *next > now.saturating_add(longest.saturating_mul(2)))
            .unwrap_or(now))
    }

    async fn next(
        &self,
        channel: &'static str,
        until: i64,
    ) -> Result<Option<Vec<Owed>>, LedgerError> {
        let owed = self
            .read(move |read| read.owed_now(channel, until, BATCH))
            .await?;
        Ok(Some(owed).filter(|owed| !owed.is_empty()))
    }

    async fn tried(&self, id: i64, outcome: Tried) -> Result<(), LedgerError> {
        let now = Now::read().utc;
        self.apart(move |ledger| ledger.lock().write(|w| w.tried(id, &outcome, now)))
            .await
    }

    async fn read<T: Send + 'static>(
        &self,
        query: impl FnOnce(Read<'_>) -> Result<T, LedgerError> + Send + 'static,
    ) -> Result<T, LedgerError> {
        self.apart(move |ledger| query(ledger.lock().read())).await
    }

    /// The ledger may be busy for a while: not on the thread that talks to the server.
    async fn apart<T: Send + 'static>(
        &self,
        work: impl FnOnce(&SharedLedger) -> Result<T, LedgerError> + Send + 'static,
    ) -> Result<T, LedgerError> {
        let ledger = self.ledger.clone();
        let done = tokio::task::spawn_blocking(move || work(&ledger)).await;
        done.unwrap_or_else(|e| Err(LedgerError::Damaged(format!("notice ({e})"))))
    }

    async fn say_without_server(&self) {
        if self.config.mail.is_some() {
            return;
        }
        if let Ok(Some(_)) = self.read(|read| read.next_due("mail")).await {
            tracing::warn!("mails are owed, and the configuration has no [mail]; they stay owed");
        }
    }
}

/// A step with our own time limit: the server's silence must not be ours.
async fn within<T>(limit: Duration, step: impl Future<Output = T>) -> Result<T, Failed> {
    timeout(limit, step).await.map_err(|_| {
        let sentence = format!(
            "the mail server did not answer within {} s",
            limit.as_secs_f64()
        );
        Failed::Down(Down {
            sentence,
            needs_person: false,
        })
    })
}

/// Foreign text for a log line or a table: one line, without control characters, not too long.
fn one_line(text: &str) -> String {
    let clean: String = text
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .take(WORDS_MAX)
        .collect();
    clean.split_whitespace().collect::<Vec<_>>().join(" ")
}
