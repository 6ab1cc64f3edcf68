//! `restudy check`: is the configuration sound, and can the service work with it here?

use serde::Serialize;

use super::{Answer, ConfigPath, End, Failure, complain, configuration, print, print_json};
use crate::ledger::{Ledger, LedgerError};
use restudy_config::{Config, Fault};

/// Check configuration, folders and state; name every fault at once
#[derive(Debug, clap::Args)]
#[command(after_help = "Example:\n  restudy check --config /etc/restudy/restudy.toml")]
pub(super) struct Line {
    #[command(flatten)]
    config: ConfigPath,
    /// Print faults and warnings as JSON
    #[arg(long)]
    json: bool,
}

#[derive(Serialize)]
struct Report {
    faults: Vec<Fault>,
    warnings: Vec<Fault>,
    state: Option<String>,
}

pub(super) fn run(line: &Line) -> Answer {
    let report = match configuration::check(&line.config.config)? {
        Err(faults) => Report {
            faults,
            warnings: Vec::new(),
            state: None,
        },
        Ok((config, warnings)) => Report {
            faults: Vec::new(),
            warnings,
            state: state(&config),
        },
    };
    let sound = report.faults.is_empty() && report.state.is_none();
    if line.json {
        print_json(&report)?;
    } else {
        for fault in &report.faults {
            complain(&fault.to_string(), fault.hint.as_deref());
        }
        for warning in &report.warnings {
            complain(&format!("warning: {warning}"), warning.hint.as_deref());
        }
        if let Some(sentence) = &report.state {
            complain(sentence, None);
        }
        if sound {
            print(&format!("{}: sound\n", line.config.config.display()))?;
        }
    }
    match (report.faults.is_empty(), report.state) {
        (false, _) => Err(Failure::usage(format!(
            "{}: not sound",
            line.config.config.display()
        ))),
        (true, Some(_)) => Ok(End::BadNews),
        (true, None) => Ok(End::Fine),
    }
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
