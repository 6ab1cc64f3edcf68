//! The command line: one file a command.
//!
//! Exit codes: 0 fine, 1 the answer is bad news, 2 usage or configuration, 3 the machine's fault. Answers go to
//! standard output, everything else to standard error.
#![allow(clippy::print_stdout, clippy::print_stderr)]

mod across;
mod analyse;
mod check;
mod configuration;
mod demo;
mod design;
mod log;
mod preview;
mod propose;
mod results;
mod serve;
mod status;
mod table;

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Parser, Subcommand};

/// How a command ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum End {
    Fine,
    BadNews,
}

/// Why a command could not answer.
#[derive(Debug)]
enum Failure {
    /// Usage or configuration: exit code 2.
    Usage {
        sentence: String,
        hint: Option<String>,
    },
    /// The machine: exit code 3.
    Machine(String),
}

type Answer = Result<End, Failure>;

impl Failure {
    fn usage(sentence: impl Into<String>) -> Self {
        Self::Usage {
            sentence: sentence.into(),
            hint: None,
        }
    }

    fn machine(error: &dyn std::error::Error) -> Self {
        Self::Machine(crate::causes::chain(error))
    }
}

const ABOUT: &str = "\
Keeps a measuring room's gauge studies current: reads the exports of measuring machines as they arrive, works a \
study out when the planned design is complete, and tells someone when the gauge takes too much of a tolerance.";

const EXAMPLES: &str = "\
Examples:
  restudy demo                                     an invented plant, the real service, 20 seconds
  restudy check --config restudy.toml              is this configuration sound?
  restudy preview run.xlsx --config restudy.toml --instrument bridge-1
  restudy propose samples/*.csv                    draft how an instrument's exports are read
  restudy serve --config restudy.toml              the service; ends on SIGTERM
  restudy status --config restudy.toml             what is filling, what is missing, what was refused
  restudy analyse study.csv --lower 9.95 --upper 10.05
  restudy design --share 0.2 --limit 0.3 --mix repeatability=60,interaction=10,appraiser=30

A study is evidence about a gauge, not a release of product: decisions belong to the responsible, qualified people.";

#[derive(Debug, Parser)]
#[command(name = "restudy", version, about = ABOUT, after_help = EXAMPLES, disable_help_subcommand = true)]
struct Line {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Run the service until SIGTERM or Ctrl-C
    Serve(serve::Line),
    /// Check configuration, folders and state; name every fault at once
    Check(check::Line),
    /// Show how one export maps to runs and readings, and what would be set aside
    Preview(preview::Line),
    /// Draft the configuration of an instrument from sample exports
    Propose(propose::Line),
    /// Work a study out from files, without a service
    Analyse(analyse::Line),
    /// Show what a study of some size can tell, or print its blind run sheet
    Design(design::Line),
    /// Show rounds with their missing cells, refused exports, owed notices
    Status(status::Line),
    /// Show the recorded studies
    Results(results::Line),
    /// Watch the real service at work in an invented plant
    Demo(demo::Line),
    #[command(name = crate::intake::request::COMMAND, hide = true)]
    ReadWorkbooks,
}

/// Where the configuration is.
#[derive(Debug, clap::Args)]
struct ConfigPath {
    /// The configuration file
    #[arg(long, value_name = "FILE")]
    config: PathBuf,
}

/// Runs the program.
#[must_use]
pub fn main() -> ExitCode {
    let line = match Line::try_parse() {
        Ok(line) => line,
        Err(error) => {
            // Help and version are answers; all else is usage.
            let code = u8::from(error.use_stderr()) * 2;
            let _ = error.print();
            return ExitCode::from(code);
        }
    };
    let answer = match line.command {
        Command::Serve(line) => serve::run(&line),
        Command::Check(line) => check::run(&line),
        Command::Preview(line) => preview::run(&line),
        Command::Propose(line) => propose::run(&line),
        Command::Analyse(line) => analyse::run(&line),
        Command::Design(line) => design::run(&line),
        Command::Status(line) => status::run(&line),
        Command::Results(line) => results::run(&line),
        Command::Demo(line) => demo::run(&line),
        Command::ReadWorkbooks => crate::intake::child::serve()
            .map(|()| End::Fine)
            .map_err(|e| Failure::machine(&e)),
    };
    match answer {
        Ok(End::Fine) => ExitCode::SUCCESS,
        Ok(End::BadNews) => ExitCode::from(1),
        Err(Failure::Usage { sentence, hint }) => {
            complain(&sentence, hint.as_deref());
            ExitCode::from(2)
        }
        Err(Failure::Machine(sentence)) => {
            complain(&sentence, None);
            ExitCode::from(3)
        }
    }
}

/// One sentence, and the hint on its own line.
fn complain(sentence: &str, hint: Option<&str>) {
    eprintln!("{sentence}");
    if let Some(hint) = hint {
        eprintln!("hint: {hint}");
    }
}

/// Prints an answer as JSON.
fn print_json<T: serde::Serialize>(answer: &T) -> Result<(), Failure> {
    let text = serde_json::to_string_pretty(answer).map_err(|e| Failure::machine(&e))?;
    print(&format!("{text}\n"))
}

/// Prints an answer; a reader that has seen enough (a closed pipe) is no fault.
fn print(text: &str) -> Result<(), Failure> {
    use std::io::Write as _;
    match std::io::stdout().lock().write_all(text.as_bytes()) {
        Err(e) if e.kind() != std::io::ErrorKind::BrokenPipe => Err(Failure::machine(&e)),
        _ => Ok(()),
    }
}
