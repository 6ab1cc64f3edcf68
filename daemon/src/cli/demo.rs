//! `restudy demo`: the real service at work in an invented plant.
//!
//! Halden Pump Works has one bridge machine and one plan. Its exports arrive over some twenty seconds: a first
//! round that is fine, and a second one in which one person's loadings of the part differ.

mod plant;

use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};
use restudy_config::Config;

use super::{Answer, End, Failure, configuration, print, results};
use crate::analyse::worked::Worked;
use crate::ledger::{Ledger, LedgerError, RoundRow, SharedLedger};
use crate::notice;
use crate::report;
use crate::service::{self, ServiceError};
use crate::stop::Stop;

/// How long the exports take to arrive.
const ARRIVAL: Duration = Duration::from_secs(18);
/// The service has so long after the last export to finish.
const PATIENCE: Duration = Duration::from_secs(60);
const ROUNDS: i64 = 2;

/// Watch the real service at work in an invented plant
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Examples:
  restudy demo
  restudy demo --keep halden && restudy serve --config halden/restudy.toml")]
pub(super) struct Line {
    /// Build the plant in this new folder, so that `serve` can go on with it
    #[arg(long, value_name = "FOLDER")]
    keep: Option<PathBuf>,
}

pub(super) fn run(line: &Line) -> Answer {
    let folder = folder(line)?;
    let config_path = plant::build(&folder).map_err(|e| Failure::machine(&e))?;
    let config = configuration::sound(&config_path)?;
    print(&format!(
        "{}: one machine, one plan (10 parts × 3 loadings × 3 trials, 4 characteristics), two rounds.\n\
         The plant is in {}\n\n",
        config.site.name,
        folder.display()
    ))?;
    if std::env::var_os("RESTUDY_LOG").is_some() {
        super::log::start(super::log::Form::Human);
    }
    let stop = Stop::new();
    super::serve::on_signals(stop.clone())?;
    let service = {
        let (config, stop) = (Arc::clone(&config), stop.clone());
        std::thread::spawn(move || service::run(config, &stop))
    };
    let watched = watch_it_work(&config, &folder, &stop);
    stop.now();
    let served = service
        .join()
        .unwrap_or(Err(ServiceError::Stage("service")));
    served.map_err(|e| Failure::machine(&e))?;
    watched?;
    show(&config, &config_path, &folder, line.keep.is_some())?;
    Ok(End::Fine)
}

fn folder(line: &Line) -> Result<PathBuf, Failure> {
    match &line.keep {
        Some(folder) => {
            fs_err::create_dir(folder).map_err(|e| Failure::Usage {
                sentence: e.to_string(),
                hint: Some("--keep makes a new folder".into()),
            })?;
            std::path::absolute(folder).map_err(|e| Failure::machine(&e))
        }
        None => tempfile::Builder::new()
            .prefix("restudy-demo-")
            .tempdir()
            .map(tempfile::TempDir::keep)
            .map_err(|e| Failure::machine(&e)),
    }
}

/// Lets the exports arrive and waits until both rounds are written up.
fn watch_it_work(config: &Config, folder: &Path, stop: &Stop) -> Result<(), Failure> {
    let exports = plant::exports();
    let bar = ProgressBar::new(exports.len() as u64);
    bar.set_style(
        ProgressStyle::with_template("{bar:40} {pos} of {len} exports  {msg}")
            .unwrap_or_else(|_| ProgressStyle::default_bar()),
    );
    let started = Instant::now();
    let total = exports.len() as u32;
    for (index, export) in exports.iter().enumerate() {
        if stop.is_set() {
            return Err(Failure::Machine(
                "stopped before the exports had arrived".into(),
            ));
        }
        export.write(folder).map_err(Failure::Machine)?;
        bar.set_position(index as u64 + 1);
        bar.set_message(progress(config)?);
        let due = ARRIVAL * (index as u32 + 1) / total;
        std::thread::sleep(due.saturating_sub(started.elapsed()));
    }
    let deadline = Instant::now() + PATIENCE;
    loop {
        let done = rounds(config)?;
        bar.set_message(progress(config)?);
        let written = |r: &RoundRow| r.analysed == r.revision && r.reported == r.revision;
        if done.iter().filter(|r| written(r)).count() as i64 == ROUNDS {
            bar.finish_and_clear();
            return Ok(());
        }
        if stop.is_set() || Instant::now() > deadline {
            return Err(Failure::Machine(
                "the service did not finish both rounds in time".into(),
            ));
        }
        std::thread::sleep(Duration::from_millis(100));
    }
}

fn rounds(config: &Config) -> Result<Vec<RoundRow>, Failure> {
    let read = || match Ledger::open_to_read(&config.state) {
        Ok(ledger) => {
            let mut all = Vec::new();
            for plan in &config.plans {
                all.extend(ledger.read().rounds(&plan.name)?);
            }
            Ok(all)
        }
        Err(LedgerError::Absent(_)) => Ok(Vec::new()),
        Err(error) => Err(error),
    };
    read().map_err(|e: LedgerError| Failure::machine(&e))
}

fn progress(config: &Config) -> Result<String, Failure> {
    let said: Vec<String> = rounds(config)?
        .iter()
        .map(|r| format!("round {} {}", r.number, r.state.as_str()))
        .collect();
    Ok(said.join(", "))
}

/// The studies, the alert, and where the reports lie.
fn show(config: &Config, config_path: &Path, folder: &Path, kept: bool) -> Result<(), Failure> {
    results::print_history(config)?;
    let ledger =
        SharedLedger::new(Ledger::open_to_read(&config.state).map_err(|e| Failure::machine(&e))?);
    for plan in &config.plans {
        for round in rounds(config)? {
            let number = round.number;
            let worked =
                Worked::load(&ledger, config, plan, round).map_err(|e| Failure::machine(&e))?;
            let Some(mail) = notice::draft(config, plan, &worked, plant::RECIPIENT) else {
                print(&format!(
                    "\nRound {number}: nothing needs a person, so nobody would have been written to.\n"
                ))?;
                continue;
            };
            let eml = folder.join(format!("alert-round-{number}.eml"));
            fs_err::write(&eml, &mail.bytes).map_err(|e| Failure::machine(&e))?;
            print(&format!(
                "\nRound {number}: this would have been mailed to {} ({}):\n\nSubject: {}\n\n{}\n",
                plant::RECIPIENT,
                eml.display(),
                mail.subject,
                mail.text.trim_end()
            ))?;
        }
        print(&format!(
            "\nReports: {}\n",
            report::folder(&config.state, &plan.name).display()
        ))?;
    }
    if kept {
        print(&format!(
            "Go on with it: restudy serve --config {}\n",
            config_path.display()
        ))?;
    }
    Ok(())
}
