//! Notices: what a round's result is worth telling, to whom, and in which words.
//!
//! Model: one message a round, made from everything that was worked out, the most urgent characteristic first.
//! There is one when a standing differs from the round before, when a first study lies above a limit, when a
//! characteristic could not be worked out, or when a revision changes what people were told. From it follows one row
//! for the log and one finished mail a recipient.
//!
//! Not here: sending (`deliver`), judging (`analyse`).
//!
//! Invariant: the same ledger and configuration give the same bytes and the same Message-ID.

mod cause;
mod corrected;
mod facts;
mod html;
mod judged;
mod letter;
mod mail;
mod news;
mod past;
mod standing;
mod sure;
mod telling;
mod words;

#[cfg(test)]
mod tests;

use std::path::PathBuf;

use jiff::tz::TimeZone;
use restudy_config::{Config, NoticeKind, Plan};
use restudy_engine::Standing;

use crate::analyse::worked::Worked;
use crate::evidence::Evidence;
use crate::ledger::{LedgerError, NewNotice, NoticeRow, Read, StudyRow};
use crate::now::Now;
use crate::report;
use letter::Letter;
use mail::Envelope;
use news::Item;

/// Who writes when no mail server is configured: nothing is sent then, but a draft has a sender.
const NOBODY: &str = "Restudy <restudy@restudy.invalid>";

/// A message before it is addressed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Message {
    /// Why it is sent.
    pub kind: NoticeKind,
    /// One line.
    pub subject: String,
    /// Plain text.
    pub text: String,
    /// The same as a page.
    pub html: String,
}

/// A message as it would be mailed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Draft {
    /// One line.
    pub subject: String,
    /// Plain text.
    pub text: String,
    /// The whole mail.
    pub bytes: Vec<u8>,
}

/// What people were told about a round before its present revision.
#[derive(Debug, Clone, PartialEq)]
pub struct Told {
    /// Subject of the first notice.
    pub subject: String,
    /// The studies of the revision before.
    pub studies: Vec<StudyRow>,
}

/// A round as its message sees it.
struct Round<'a> {
    config: &'a Config,
    plan: &'a Plan,
    worked: &'a Worked,
    items: Vec<Item<'a>>,
    report: PathBuf,
}

impl Round<'_> {
    fn evidence(&self) -> &Evidence {
        &self.worked.evidence
    }

    fn zone(&self) -> &TimeZone {
        &self.config.site.zone
    }

    /// Plan and machines.
    fn place(&self) -> String {
        let used = &self.evidence().instruments;
        let instruments = if used.is_empty() {
            &self.plan.instruments
        } else {
            used
        };
        let names: Vec<String> = instruments.iter().map(|i| words::name(i)).collect();
        format!("{} / {}", words::name(&self.plan.name), names.join(", "))
    }

    fn signature(&self) -> String {
        format!(
            "Restudy at {}, plan {}.",
            words::name(&self.config.site.name),
            words::name(&self.plan.name)
        )
    }
}

/// What a round's result is worth telling; `told` when people were told about it before. `None`: nothing.
#[must_use]
pub fn compose(
    config: &Config,
    plan: &Plan,
    worked: &Worked,
    told: Option<&Told>,
) -> Option<Message> {
    let (report, _) = report::paths(&config.state, &plan.name, worked.evidence.round.number);
    let round = Round {
        config,
        plan,
        worked,
        items: news::ranked(worked),
        report,
    };
    let (kind, letter): (NoticeKind, Letter) = match told {
        Some(told) => (NoticeKind::Corrected, corrected::letter(&round, told)?),
        None => (NoticeKind::Standing, standing::letter(&round)?),
    };
    Some(Message {
        kind,
        text: letter.text(),
        html: letter.html(),
        subject: letter.subject,
    })
}

/// A round's message as it would be mailed to `recipient`; `None` when nothing needs a person.
#[must_use]
pub fn draft(config: &Config, plan: &Plan, worked: &Worked, recipient: &str) -> Option<Draft> {
    let message = compose(config, plan, worked, None)?;
    let round = &worked.evidence.round;
    let key = key(
        config,
        plan,
        round.number,
        round.revision,
        message.kind,
        recipient,
    );
    let date = round.closed.unwrap_or_default();
    let envelope = Envelope {
        from: from(config),
        to: recipient,
        id: &key,
        thread: &key,
        date,
    };
    let bytes = mail::bytes(&envelope, &message).unwrap_or_default();
    Some(Draft {
        subject: message.subject,
        text: message.text,
        bytes,
    })
}

/// All that is owed for a round's present revision: one row for the log, one a recipient. Empty when nothing needs
/// a person.
///
/// # Errors
/// The ledger's refusal.
pub fn owed(
    read: Read<'_>,
    config: &Config,
    plan: &Plan,
    worked: &Worked,
    now: Now,
) -> Result<Vec<NewNotice>, LedgerError> {
    let round = &worked.evidence.round;
    let sent = read.notices_of(round.id)?;
    let told = match sent.first() {
        Some(first) if round.revision > 1 => {
            let studies = read.studies(round.id, round.revision - 1)?;
            Some(Told {
                subject: first.subject.clone(),
                studies,
            })
        }
        _ => None,
    };
    let Some(message) = compose(config, plan, worked, told.as_ref()) else {
        return Ok(Vec::new());
    };
    let row = |channel: &'static str,
               recipient: &str,
               thread: Option<String>,
               bytes: &dyn Fn(&str, &str) -> Vec<u8>| {
        let key = key(
            config,
            plan,
            round.number,
            round.revision,
            message.kind,
            recipient,
        );
        let thread = thread.unwrap_or_else(|| key.clone());
        NewNotice {
            channel,
            recipient: recipient.to_owned(),
            bytes: bytes(&key, &thread),
            thread,
            plan: plan.name.clone(),
            round: round.id,
            kind: word(message.kind),
            subject: message.subject.clone(),
            key,
        }
    };
    let mut notices = vec![row("log", "", None, &|_, _| {
        message.text.clone().into_bytes()
    })];
    for recipient in recipients(config, plan, message.kind) {
        let thread = thread(read, plan, worked, &sent, recipient)?;
        let date = if round.revision > 1 {
            now.utc
        } else {
            round.closed.unwrap_or(now.utc)
        };
        let bytes = |id: &str, thread: &str| {
            let envelope = Envelope {
                from: from(config),
                to: recipient,
                id,
                thread,
                date,
            };
            mail::bytes(&envelope, &message).unwrap_or_else(|why| {
                tracing::error!(
                    recipient,
                    subject = message.subject,
                    "notice cannot be mailed: {why}"
                );
                Vec::new()
            })
        };
        notices.push(row("mail", recipient, thread, &bytes));
    }
    Ok(notices)
}

/// Message-ID of a notice: the same whenever the same notice is made, another for every other one.
#[must_use]
pub fn message_id(
    sender: &str,
    site: &str,
    plan: &str,
    round: i64,
    revision: i64,
    kind: NoticeKind,
    recipient: &str,
) -> String {
    mail::id(
        sender,
        &[
            site,
            plan,
            &round.to_string(),
            &revision.to_string(),
            word(kind),
            recipient,
        ],
    )
}

fn key(
    config: &Config,
    plan: &Plan,
    round: i64,
    revision: i64,
    kind: NoticeKind,
    recipient: &str,
) -> String {
    message_id(
        from(config),
        &config.site.name,
        &plan.name,
        round,
        revision,
        kind,
        recipient,
    )
}

fn from(config: &Config) -> &str {
    config.mail.as_ref().map_or(NOBODY, |mail| &mail.from)
}

/// As routes spell it.
const fn word(kind: NoticeKind) -> &'static str {
    match kind {
        NoticeKind::Standing => "standing",
        NoticeKind::Corrected => "corrected",
    }
}

/// Everybody whom a route names for this plan and kind, once.
fn recipients<'a>(config: &'a Config, plan: &Plan, kind: NoticeKind) -> Vec<&'a str> {
    let mut all: Vec<&str> = Vec::new();
    if config.mail.is_none() {
        return all;
    }
    for route in &config.routes {
        let kinds = route.kinds.is_empty() || route.kinds.contains(&kind);
        let plans = route.plans.is_empty() || route.plans.contains(&plan.name);
        if kinds && plans {
            for to in &route.to {
                if !all.iter().any(|known| known.eq_ignore_ascii_case(to)) {
                    all.push(to);
                }
            }
        }
    }
    all
}

/// The thread to go on with: that of an earlier notice on the round, or the plan's while it is not back under its
/// limits. `None`: a new one.
fn thread(
    read: Read<'_>,
    plan: &Plan,
    worked: &Worked,
    sent: &[NoticeRow],
    recipient: &str,
) -> Result<Option<String>, LedgerError> {
    let of_round = sent
        .iter()
        .rev()
        .find(|n| n.channel == "mail" && n.recipient == recipient);
    if let Some(notice) = of_round {
        return Ok(Some(notice.thread.clone()));
    }
    let above = worked
        .earlier
        .values()
        .any(|e| e.study.standing >= Standing::Watch);
    if above {
        read.last_thread(&plan.name, recipient)
    } else {
        Ok(None)
    }
}
