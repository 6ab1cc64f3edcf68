//! Where log lines go: standard error, for people or as JSON.

use clap::ValueEnum;
use tracing_subscriber::EnvFilter;

/// The form of log lines.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum Form {
    /// Sentences with fields
    Human,
    /// One JSON object a line
    Json,
}

/// Starts logging; `RESTUDY_LOG` sets what is logged (`info` without it).
pub(super) fn start(form: Form) {
    let filter = EnvFilter::try_from_env("RESTUDY_LOG").unwrap_or_else(|_| EnvFilter::new("info"));
    let lines = tracing_subscriber::fmt()
        .with_env_filter(filter)
        .with_writer(std::io::stderr);
    match form {
        Form::Human => lines
            .with_target(false)
            .with_ansi(std::io::IsTerminal::is_terminal(&std::io::stderr()))
            .init(),
        Form::Json => lines.json().init(),
    }
}
