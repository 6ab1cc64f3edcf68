//! One SMTP session: opened once a pass, one mail after the other, every step with our own time limit and judged by
//! where it failed.
//!
//! Model: what fails before a recipient is named concerns the server, or our account there, and so every mail;
//! what a server answers to the recipient or to the content concerns that mail.
//!
//! Not here: when to try again, the ledger.

use std::error::Error as _;
use std::time::Duration;

use lettre::Address;
use lettre::transport::smtp::Error;
use lettre::transport::smtp::authentication::{Credentials, DEFAULT_MECHANISMS};
use lettre::transport::smtp::client::{AsyncSmtpConnection, TlsParameters};
use lettre::transport::smtp::commands::{Data, Mail as MailFrom, Rcpt};
use lettre::transport::smtp::extension::ClientId;
use restudy_config::{Mail, Tls};
use tokio::time::timeout;

use super::{Steps, one_line, password};

/// An open session, logged in where the configuration says so.
pub(super) struct Session {
    connection: AsyncSmtpConnection,
    steps: Steps,
}

/// Why no mail can be sent at all for now.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Down {
    /// One sentence.
    pub(super) sentence: String,
    /// True when it will not heal by itself.
    pub(super) needs_person: bool,
}

/// Why one mail was not taken.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Failed {
    /// Nothing to do with this mail.
    Down(Down),
    /// Not now.
    Later(String),
    /// Never.
    Refused(String),
}

impl From<Down> for Failed {
    fn from(down: Down) -> Self {
        Self::Down(down)
    }
}

/// How far a mail had come.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Step {
    Sender,
    Recipient,
    Content,
}

impl Session {
    pub(super) async fn open(mail: &Mail, steps: Steps) -> Result<Self, Down> {
        let credentials = credentials(mail)?;
        let hello = ClientId::default();
        let tls = match mail.tls {
            Tls::None => None,
            Tls::StartTls | Tls::Implicit => {
                Some(TlsParameters::new(mail.server.clone()).map_err(|e| at_server(mail, &e))?)
            }
        };
        let implicit = tls.clone().filter(|_| mail.tls == Tls::Implicit);
        let server = (mail.server.as_str(), mail.port);
        let call = AsyncSmtpConnection::connect_tokio1(
            server,
            Some(steps.connect),
            &hello,
            implicit,
            None,
        );
        let mut connection = within(steps.greeting, "our call", call)
            .await?
            .map_err(|e| at_server(mail, &e))?;
        if let Some(tls) = tls.filter(|_| mail.tls == Tls::StartTls) {
            within(steps.command, "STARTTLS", connection.starttls(tls, &hello))
                .await?
                .map_err(|e| at_server(mail, &e))?;
        }
        if let Some(credentials) = credentials {
            let login = connection.auth(DEFAULT_MECHANISMS, &credentials);
            within(steps.command, "the login", login)
                .await?
                .map_err(|e| at_server(mail, &e))?;
        }
        Ok(Self { connection, steps })
    }

    /// Sends one mail; returns once the server has taken it over.
    pub(super) async fn send(
        &mut self,
        from: &Address,
        to: &Address,
        bytes: &[u8],
    ) -> Result<(), Failed> {
        let Self { connection, steps } = self;
        let sender = MailFrom::new(Some(from.clone()), Vec::new());
        within(steps.command, "MAIL", connection.command(sender))
            .await?
            .map_err(|e| failed(Step::Sender, &e))?;
        let recipient = Rcpt::new(to.clone(), Vec::new());
        within(steps.command, "RCPT", connection.command(recipient))
            .await?
            .map_err(|e| failed(Step::Recipient, &e))?;
        within(steps.data, "DATA", connection.command(Data))
            .await?
            .map_err(|e| failed(Step::Content, &e))?;
        within(steps.content, "the content", connection.message(bytes))
            .await?
            .map_err(|e| failed(Step::Content, &e))?;
        Ok(())
    }

    pub(super) async fn close(mut self) {
        self.connection.abort().await;
    }
}

/// A step with our own time limit: the server's silence must not be ours.
async fn within<T>(limit: Duration, asked: &str, step: impl Future<Output = T>) -> Result<T, Down> {
    timeout(limit, step).await.map_err(|_| Down {
        sentence: format!(
            "the mail server did not answer within {} s after {asked}",
            limit.as_secs_f64()
        ),
        needs_person: false,
    })
}

fn credentials(mail: &Mail) -> Result<Option<Credentials>, Down> {
    let Some((user, secret)) = &mail.login else {
        return Ok(None);
    };
    let secret = password::read(secret).map_err(|sentence| Down {
        sentence,
        needs_person: true,
    })?;
    Ok(Some(Credentials::new(user.clone(), secret)))
}

fn at_server(mail: &Mail, error: &Error) -> Down {
    Down {
        sentence: format!("mail server {}:{}: {}", mail.server, mail.port, told(error)),
        needs_person: error.is_permanent() || error.is_client() || error.is_tls(),
    }
}

fn failed(step: Step, error: &Error) -> Failed {
    let code = error.status().map(u16::from);
    let sentence = told(error);
    let account = matches!(code, Some(530..=539));
    let of_this_mail = step != Step::Sender && !account && code != Some(421);
    if of_this_mail && error.is_permanent() {
        Failed::Refused(sentence)
    } else if of_this_mail && error.is_transient() {
        Failed::Later(sentence)
    } else {
        Failed::Down(Down {
            sentence,
            needs_person: error.is_permanent() || error.is_client(),
        })
    }
}

/// The server's own words, or what happened on the way to it.
fn told(error: &Error) -> String {
    let cause = error.source().map(ToString::to_string);
    match (error.status(), cause) {
        (Some(code), Some(words)) => one_line(&format!("{code} {words}")),
        (None, Some(cause)) if error.is_client() => one_line(&cause),
        _ => one_line(&error.to_string()),
    }
}
