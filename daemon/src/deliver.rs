//! Delivery: what the outbox owes, to the log and to the mail server.
//!
//! Model: the outbox is the queue, and each channel works on its own share of it, so that a slow mail server does
//! not hold up the log. A pass delivers notice after notice and records each result before the next. A server that
//! cannot be reached or does not let us in is tried with one mail at growing distances, while all others wait
//! unchanged.
//!
//! Not here: what a notice says (`notice`).
//!
//! Invariant: a notice leaves the outbox only after it was taken or refused for good, so it is delivered at least
//! once; every repetition has the same bytes and the same Message-ID. While the service runs, a result that cannot
//! be recorded is remembered and nothing further is delivered on its channel.

pub mod address;
pub mod backoff;
mod limits;
mod outbox;
pub mod password;
mod post;
pub mod reach;
mod session;

#[cfg(test)]
mod tests;

use std::sync::Arc;
use std::time::Duration;

use restudy_config::Config;
use tokio::sync::Notify;
use tokio::time::sleep;

use crate::causes::chain;
use crate::ledger::{SharedLedger, Tried};
use crate::stop::Stop;
pub use limits::{LIMITS, Limits, Steps};
use outbox::{Halt, Outbox};
use post::Post;

/// A server's words are cut to this many characters.
const WORDS_MAX: usize = 300;

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
    let log = Log(Outbox::new("log", ledger.clone(), &config.state));
    let mails = Outbox::new("mail", ledger, &config.state);
    let (look_log, look_mail) = (Notify::new(), Notify::new());
    let channels = async {
        let logging = repeat(log, &look_log, &stop, &limits);
        match &config.mail {
            Some(mail) => {
                let post = Post::new(mails, mail, limits, stop.clone());
                tokio::join!(logging, repeat(post, &look_mail, &stop, &limits));
            }
            None => {
                say_without_server(&mails).await;
                logging.await;
            }
        }
    };
    tokio::select! {
        () = channels => {}
        () = pass_on(&wake, [&look_log, &look_mail]) => {}
        () = patience(&stop, limits.stop) => {
            tracing::warn!("a notice was still under way; it stays owed");
        }
    }
}

/// A way that notices travel.
trait Channel {
    /// Delivers what is due; answers how long to wait for the next try, if any is to come.
    async fn pass(&mut self) -> Result<Option<Duration>, Halt>;
}

async fn repeat(mut channel: impl Channel, look: &Notify, stop: &Stop, limits: &Limits) {
    while !stop.is_set() {
        let wait = channel.pass().await.unwrap_or_else(|halt| {
            tracing::error!(error = %chain(&halt), "delivery waits and tries again");
            Some(limits.after_fault)
        });
        tokio::select! {
            () = stop.wait() => {}
            () = look.notified() => {}
            () = sleep(wait.unwrap_or(limits.backoff.longest)) => {}
        }
    }
}

/// The service's one wake-up, for every channel; never ends.
async fn pass_on(wake: &Notify, looks: [&Notify; 2]) {
    loop {
        wake.notified().await;
        looks.iter().for_each(|look| look.notify_one());
    }
}

/// Ends that long after the stop.
async fn patience(stop: &Stop, longest: Duration) {
    stop.wait().await;
    sleep(longest.saturating_sub(stop.since())).await;
}

async fn say_without_server(mails: &Outbox) {
    if let Ok(Some(_)) = mails.next_due().await {
        tracing::warn!("mails are owed, and the configuration has no [mail]; they stay owed");
    }
}

/// The service's own log.
struct Log(Outbox);

impl Channel for Log {
    async fn pass(&mut self) -> Result<Option<Duration>, Halt> {
        loop {
            let owed = self.0.due(i64::MAX).await?;
            if owed.is_empty() {
                return Ok(None);
            }
            for notice in owed {
                let text = String::from_utf8_lossy(&notice.bytes);
                tracing::warn!(%text, "{}", notice.subject);
                self.0.record(notice.id, Tried::Delivered).await?;
            }
        }
    }
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
