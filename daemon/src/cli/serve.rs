//! `restudy serve`: the service.

use super::{Answer, ConfigPath, End, Failure, configuration, log};
use crate::service;
use crate::stop::Stop;

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

/// SIGTERM and SIGINT set the stop.
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
    });
    Ok(())
}
