//! A message as the bytes of a mail, the same every time.

use std::time::{Duration, UNIX_EPOCH};

use lettre::message::header::{ContentTransferEncoding, ContentType, HeaderName, HeaderValue};
use lettre::message::{Body, Mailbox, MultiPart, SinglePart};
use sha2::{Digest, Sha256};

use super::Message;
use crate::deliver::address::{address, sender};
use crate::record::hex;

/// Who writes to whom, when, and in answer to what.
#[derive(Debug, Clone, Copy)]
pub(super) struct Envelope<'a> {
    pub(super) from: &'a str,
    pub(super) to: &'a str,
    pub(super) id: &'a str,
    /// Message-ID of the thread's first message; its own when it is the first.
    pub(super) thread: &'a str,
    /// ms since 1970.
    pub(super) date: i64,
}

/// The finished mail, text and HTML.
///
/// # Errors
/// One sentence for an address that no server would take.
pub(super) fn bytes(envelope: &Envelope<'_>, message: &Message) -> Result<Vec<u8>, String> {
    let date = UNIX_EPOCH + Duration::from_millis(u64::try_from(envelope.date).unwrap_or(0));
    let automatic = HeaderValue::new(
        HeaderName::new_from_ascii_str("Auto-Submitted"),
        "auto-generated".to_owned(),
    );
    let mut mail = lettre::Message::builder()
        .from(sender(envelope.from)?)
        .to(Mailbox::new(None, address(envelope.to)?))
        .subject(message.subject.as_str())
        .date(date)
        .message_id(Some(envelope.id.to_owned()))
        .raw_header(automatic);
    if envelope.thread != envelope.id {
        mail = mail
            .in_reply_to(envelope.thread.to_owned())
            .references(envelope.thread.to_owned());
    }
    let digest = hex(&Sha256::digest(envelope.id.as_bytes()));
    let parts = MultiPart::alternative()
        .boundary(format!("restudy-{}", &digest[..32]))
        .singlepart(part(ContentType::TEXT_PLAIN, &message.text)?)
        .singlepart(part(ContentType::TEXT_HTML, &message.html)?);
    let mail = mail
        .multipart(parts)
        .map_err(|e| format!("the mail cannot be written: {e}"))?;
    Ok(mail.formatted())
}

/// Quoted-printable keeps every line short and the mail in ASCII.
fn part(kind: ContentType, text: &str) -> Result<SinglePart, String> {
    let body = Body::new_with_encoding(text.to_owned(), ContentTransferEncoding::QuotedPrintable)
        .map_err(|_| "the mail's text cannot be encoded".to_owned())?;
    Ok(SinglePart::builder().header(kind).body(body))
}

/// A Message-ID from what the message is about: the same for every repetition, another for every other message.
#[must_use]
pub(super) fn id(sender: &str, about: &[&str]) -> String {
    let mut digest = Sha256::new();
    for field in about {
        digest.update((field.len() as u64).to_be_bytes());
        digest.update(field.as_bytes());
    }
    let host = super::mail::sender(sender).map_or_else(
        |_| "restudy.invalid".into(),
        |m| m.email.domain().to_owned(),
    );
    format!("<{}@{host}>", &hex(&digest.finalize())[..32])
}
