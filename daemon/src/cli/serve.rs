//! `restudy serve`: the service.

use std::time::Duration;

use super::{Answer, ConfigPath, End, Failure, configuration, log};
use crate::service;
use crate::stop::Stop;

/// Beyond the stop's limit, for the process to end by itself.
const AFTER_STOP: Duration = Duration::from_millis(300);

/// Run the service until SIGTERM or Ctrl-C
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Examples:
  restudy serve --config /etc/restudy/restudy.toml
  RESTUDY_LOG=debug restudy serve --config restudy.toml --log json")]
pub(super) struct Line {
    #[command(flatten)]
    config: ConfigPath,
    /// Form of the log lines on standard error
    #[arg(long, value_enum, default_value = "human")]
    log: log::Form,
}

pub(super) fn run(line: &Line) -> Answer {
    let config = configuration::sound(&line.config.config)?;
    log::start(line.log);
    let stop = Stop::new();
    on_signals(stop.clone())?;
    service::run(config, &stop).map_err(|e| Failure::machine(&e))?;
    Ok(End::Fine)
}

/// SIGTERM and SIGINT set the stop; whatever happens, the process ends soon after.
pub(super) fn on_signals(stop: Stop) -> Result<(), Failure> {
    use tokio::signal::unix::{SignalKind, signal};
    let runtime = tokio::runtime::Builder::new_current_thread()
        .enable_all()
        .build()
        .map_err(|e| Failure::machine(&e))?;
    let (mut term, mut int) = {
        let _inside = runtime.enter();
        let term = signal(SignalKind::terminate()).map_err(|e| Failure::machine(&e))?;
        let int = signal(SignalKind::interrupt()).map_err(|e| Failure::machine(&e))?;
        (term, int)
    };
    std::thread::spawn(move || {
        runtime.block_on(async {
            tokio::select! {
                _ = term.recv() => {}
                _ = int.recv() => {}
            }
        });
        stop.now();
        // A full log pipe can block any thread that still logs; the ledger is sound at every moment.
        std::thread::sleep(service::STOP_LIMIT + AFTER_STOP);
        std::process::exit(0);
    });
    Ok(())
}
