//! The mail channel: one session a pass, one mail after the other.

use std::time::Duration;

use restudy_config::Mail;
use tokio::time::{Instant, timeout};

use super::outbox::{Halt, Outbox};
use super::session::{Down, Failed, Session};
use super::{Channel, Limits, address};
use crate::ledger::{Owed, Tried};
use crate::now::Now;
use crate::stop::Stop;

pub(super) struct Post<'a> {
    outbox: Outbox,
    mail: &'a Mail,
    limits: Limits,
    stop: Stop,
    server: Server,
}

/// What is known about the mail server: nothing that a restart must remember.
#[derive(Default)]
struct Server {
    failures: u32,
    closed_until: Option<Instant>,
}

impl Channel for Post<'_> {
    async fn pass(&mut self) -> Result<Option<Duration>, Halt> {
        let mut session = None;
        let sent = self.send_due(&mut session).await;
        if let Some(session) = session {
            // The mails are recorded; a server that does not answer now is left alone.
            let _ = timeout(self.limits.goodbye, session.close()).await;
        }
        sent?;
        let Some(due) = self.outbox.next_due().await? else {
            return Ok(None);
        };
        let due =
            u64::try_from(due - Now::read().utc).map_or(Duration::ZERO, Duration::from_millis);
        Ok(Some(due.max(self.closed_for())))
    }
}

impl<'a> Post<'a> {
    pub(super) fn new(outbox: Outbox, mail: &'a Mail, limits: Limits, stop: Stop) -> Self {
        Self {
            outbox,
            mail,
            limits,
            stop,
            server: Server::default(),
        }
    }

    async fn send_due(&mut self, session: &mut Option<Session>) -> Result<(), Halt> {
        while !self.pauses() {
            let until = self.horizon().await?;
            let owed = self.outbox.due(until).await?;
            if owed.is_empty() {
                break;
            }
            for notice in owed {
                if self.pauses() {
                    return Ok(());
                }
                let outcome = self.one(session, &notice).await;
                self.settle(&notice, outcome).await?;
            }
        }
        Ok(())
    }

    /// One mail; a session that failed is not used again.
    async fn one(&self, session: &mut Option<Session>, notice: &Owed) -> Result<(), Failed> {
        let from = address::sender(&self.mail.from)
            .map_err(|sentence| Down {
                sentence,
                needs_person: true,
            })?
            .email;
        let to = address::address(&notice.recipient).map_err(Failed::Refused)?;
        let mut open = match session.take() {
            Some(open) => open,
            None => Session::open(self.mail, self.limits.steps).await?,
        };
        open.send(&from, &to, &notice.bytes).await?;
        *session = Some(open);
        Ok(())
    }

    async fn settle(&mut self, notice: &Owed, outcome: Result<(), Failed>) -> Result<(), Halt> {
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
        self.outbox.record(notice.id, tried).await
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
    async fn horizon(&self) -> Result<i64, Halt> {
        let now = Now::read().utc;
        let longest = i64::try_from(self.limits.backoff.longest.as_millis()).unwrap_or(i64::MAX);
        let next = self.outbox.next_due().await?;
        Ok(next
            .filter(|next| *next > now.saturating_add(longest.saturating_mul(2)))
            .unwrap_or(now))
    }
}
