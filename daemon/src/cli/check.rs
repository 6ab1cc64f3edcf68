//! `restudy check`: is the configuration sound, and can the service work with it here?

use std::path::Path;
use std::time::Duration;

use serde::Serialize;

use super::{Answer, ConfigPath, End, Failure, complain, configuration, print, print_json};
use crate::deliver::{password, reach};
use crate::ledger::{Ledger, LedgerError};
use restudy_config::{Config, Fault, Mail, Password};

/// How long the mail server may take to answer a call.
const REACH: Duration = Duration::from_secs(5);

/// Check configuration, folders, state and mail; name every fault at once
#[derive(Debug, clap::Args)]
#[command(after_help = "Example:\n  restudy check --config /etc/restudy/restudy.toml")]
pub(super) struct Line {
    #[command(flatten)]
    config: ConfigPath,
    /// Print faults and warnings as JSON
    #[arg(long)]
    json: bool,
}

#[derive(Debug, Default, Serialize)]
struct Report {
    faults: Vec<Fault>,
    warnings: Vec<Fault>,
    /// What keeps the service from using its state folder.
    state: Option<String>,
    mail: MailReport,
}

#[derive(Debug, Default, Serialize)]
struct MailReport {
    /// What keeps the service from logging in to its mail server.
    password: Option<String>,
    /// What may be otherwise where and when the service runs.
    warnings: Vec<String>,
    /// The server that took a connection.
    reached: Option<String>,
}

impl Report {
    fn is_sound(&self) -> bool {
        self.faults.is_empty() && self.state.is_none() && self.mail.password.is_none()
    }
}

pub(super) fn run(line: &Line) -> Answer {
    let path = &line.config.config;
    let report = report(path)?;
    if line.json {
        print_json(&report)?;
    } else {
        tell(path, &report)?;
    }
    if !report.faults.is_empty() {
        return Err(Failure::usage(format!("{}: not sound", path.display())));
    }
    Ok(if report.is_sound() {
        End::Fine
    } else {
        End::BadNews
    })
}

fn report(path: &Path) -> Result<Report, Failure> {
    Ok(match configuration::check(path)? {
        Err(faults) => Report {
            faults,
            ..Report::default()
        },
        Ok((config, warnings)) => Report {
            faults: Vec::new(),
            warnings,
            state: state(&config),
            mail: config.mail.as_ref().map(mail).unwrap_or_default(),
        },
    })
}

fn tell(path: &Path, report: &Report) -> Result<(), Failure> {
    for fault in &report.faults {
        complain(&fault.to_string(), fault.hint.as_deref());
    }
    for warning in &report.warnings {
        complain(&format!("warning: {warning}"), warning.hint.as_deref());
    }
    for warning in &report.mail.warnings {
        complain(&format!("warning: {warning}"), None);
    }
    for sentence in [&report.state, &report.mail.password].into_iter().flatten() {
        complain(sentence, None);
    }
    if let Some(server) = &report.mail.reached {
        print(&format!(
            "mail server {server}: takes connections; no mail was sent\n"
        ))?;
    }
    if report.is_sound() {
        print(&format!("{}: sound\n", path.display()))?;
    }
    Ok(())
}

/// What keeps the service from using its state folder.
fn state(config: &Config) -> Option<String> {
    match Ledger::open_to_read(&config.state) {
        Ok(_) => None,
        Err(LedgerError::Absent(_)) => {
            let probe = fs_err::create_dir_all(&config.state)
                .and_then(|()| tempfile::NamedTempFile::new_in(&config.state).map(drop));
            probe
                .err()
                .map(|e| format!("the state folder cannot be written: {e}"))
        }
        Err(error) => Some(crate::causes::chain(&error)),
    }
}

/// The way to the mail server. A variable may be set for the service only, and a server may be away for a while, so
/// these two are warnings.
fn mail(mail: &Mail) -> MailReport {
    let mut report = MailReport::default();
    if let Some((_, secret)) = &mail.login
        && let Err(sentence) = password::read(secret)
    {
        match secret {
            Password::File(_) => report.password = Some(sentence),
            Password::Environment(_) => report
                .warnings
                .push(format!("{sentence} here; the service needs it")),
        }
    }
    match reach::reach(mail, REACH) {
        Ok(()) => report.reached = Some(format!("{}:{}", mail.server, mail.port)),
        Err(sentence) => report.warnings.push(sentence),
    }
    report
}

#[cfg(test)]
mod tests {
    use std::net::TcpListener;

    use tempfile::TempDir;

    use super::*;

    /// A configuration in a folder of its own, with its mail server.
    struct Site {
        folder: TempDir,
        server: TcpListener,
    }

    impl Site {
        fn new() -> Self {
            Self {
                folder: tempfile::tempdir().unwrap(),
                server: TcpListener::bind(("127.0.0.1", 0)).unwrap(),
            }
        }

        fn port(&self) -> u16 {
            self.server.local_addr().unwrap().port()
        }

        fn checked(&self, login: &str) -> Report {
            let path = self.folder.path().join("restudy.toml");
            fs_err::create_dir_all(self.folder.path().join("exports")).unwrap();
            fs_err::write(&path, text(self.port(), login)).unwrap();
            let report = report(&path).unwrap();
            assert!(report.faults.is_empty(), "{report:#?}");
            report
        }
    }

    fn text(port: u16, login: &str) -> String {
        format!(
            r#"
[site]
name = "Halden Pump Works"
zone = "Europe/Oslo"
[state]
folder = "state"
[[instrument]]
name    = "bridge-1"
folders = ["exports"]
files   = ["*.csv"]
settle  = "3s"
[instrument.read]
form           = "table"
decimal        = "."
part           = {{ column = "part" }}
appraiser      = {{ column = "loaded by" }}
trial          = {{ column = "trial" }}
taken          = {{ column = "taken" }}
characteristic = {{ column = "feature" }}
value          = {{ column = "value", unit = "mm" }}
[[plan]]
name        = "impeller hub"
instruments = ["bridge-1"]
parts       = 10
appraisers  = ["KL", "MO", "TS"]
trials      = 3
interaction = "keep"
[plan.limits]
watch = 0.10
act   = 0.30
[mail]
server = "127.0.0.1"
port   = {port}
tls    = "starttls"
from   = "Restudy <restudy@halden.example>"
{login}
[[route]]
to = ["quality@halden.example"]
"#
        )
    }

    const BY_FILE: &str = "user = \"restudy\"\npassword_file = \"mail-password\"\n";

    #[cfg(unix)]
    fn put_password(site: &Site, mode: u32) {
        use std::os::unix::fs::PermissionsExt as _;
        let path = site.folder.path().join("mail-password");
        fs_err::write(&path, "hunter two\n").unwrap();
        fs_err::set_permissions(&path, std::fs::Permissions::from_mode(mode)).unwrap();
    }

    #[test]
    fn a_server_that_takes_connections_is_named() {
        let site = Site::new();
        let report = site.checked("");
        assert!(report.is_sound(), "{report:#?}");
        assert_eq!(
            report.mail.reached,
            Some(format!("127.0.0.1:{}", site.port()))
        );
        assert!(report.mail.warnings.is_empty());
    }

    #[test]
    fn a_password_file_that_is_absent_is_not_sound() {
        let report = Site::new().checked(BY_FILE);
        let sentence = report.mail.password.clone().unwrap();
        assert!(
            !report.is_sound() && sentence.contains("mail-password"),
            "{sentence}"
        );
    }

    #[cfg(unix)]
    #[test]
    fn a_password_file_open_to_others_is_not_sound() {
        let site = Site::new();
        put_password(&site, 0o644);
        let report = site.checked(BY_FILE);
        let sentence = report.mail.password.clone().unwrap();
        assert!(
            !report.is_sound() && sentence.contains("0644") && sentence.contains("expected 0600"),
            "{sentence}"
        );
        put_password(&site, 0o600);
        assert!(site.checked(BY_FILE).is_sound());
    }

    #[test]
    fn a_password_variable_that_is_not_set_is_a_warning() {
        let login = "user = \"restudy\"\npassword_env = \"RESTUDY_TEST_NO_SUCH_VARIABLE\"\n";
        let report = Site::new().checked(login);
        assert!(report.is_sound());
        assert!(
            report.mail.warnings[0].contains("`RESTUDY_TEST_NO_SUCH_VARIABLE`"),
            "{report:#?}"
        );
    }

    #[test]
    fn a_server_that_does_not_answer_is_a_warning() {
        let Site { folder, server } = Site::new();
        let port = server.local_addr().unwrap().port();
        drop(server);
        let path = folder.path().join("restudy.toml");
        fs_err::create_dir_all(folder.path().join("exports")).unwrap();
        fs_err::write(&path, text(port, "")).unwrap();
        let report = report(&path).unwrap();
        assert!(
            report.is_sound() && report.mail.reached.is_none(),
            "{report:#?}"
        );
        let place = format!("127.0.0.1:{port} cannot be reached");
        assert!(report.mail.warnings[0].contains(&place), "{report:#?}");
    }
}
