//! The service: one thread an instrument, one for rounds, analysis and reports, a small runtime for delivery.
//!
//! Model: stages wake each other with a flag and reconcile the ledger; nothing is handed over in memory.
//!
//! Invariant: after [`Stop::now`] the service ends within [`STOP_LIMIT`]; what was not committed is done again
//! at the next start.

use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender, channel};
use std::thread;
use std::time::{Duration, Instant};

use restudy_config::Config;

use crate::analyse::Analyse;
use crate::causes::chain;
use crate::deliver;
use crate::intake::{Intake, RuleError};
use crate::ledger::{Ledger, LedgerError, SharedLedger};
use crate::now::Now;
use crate::report::Reporter;
use crate::rounds::Rounds;
use crate::stop::Stop;
use crate::watch::{Waiting, Wake, Watch, wake};

/// The service ends within this time once it is told to.
pub const STOP_LIMIT: Duration = Duration::from_millis(4500);
/// Looks at the same folders keep this distance, however many events come.
const BETWEEN_LOOKS: Duration = Duration::from_millis(200);
/// After a fault of the machine a stage waits this long.
const AFTER_FAULT: Duration = Duration::from_secs(5);
/// Rounds are looked at this often without being told: their time may be up.
const ROUNDS_EVERY: Duration = Duration::from_secs(30);

/// Why the service could not start, or ended by itself.
#[derive(Debug, thiserror::Error)]
pub enum ServiceError {
    /// The state folder could not be made.
    #[error("the state folder cannot be used")]
    State(#[source] std::io::Error),
    /// Another service holds the state folder.
    #[error("another service is running on `{0}`")]
    Running(PathBuf),
    /// The ledger.
    #[error("the ledger cannot be opened")]
    Ledger(#[from] LedgerError),
    /// A rule that `check` would have refused.
    #[error("the rule of instrument `{0}` cannot be used")]
    Rule(String, #[source] RuleError),
    /// No runtime for mail.
    #[error("the mail runtime cannot be started")]
    Runtime(#[source] std::io::Error),
    /// A stage is gone.
    #[error("the stage `{0}` ended unexpectedly")]
    Stage(&'static str),
}

/// Runs the service until `stop`.
///
/// # Errors
/// What kept it from starting, or the stage that ended by itself.
pub fn run(config: Arc<Config>, stop: &Stop) -> Result<(), ServiceError> {
    fs_err::create_dir_all(&config.state).map_err(ServiceError::State)?;
    let _lock = lock(&config)?;
    let ledger = SharedLedger::new(Ledger::open(&config.state)?);
    let mut intakes = Vec::new();
    for (index, instrument) in config.instruments.iter().enumerate() {
        let intake = Intake::new(ledger.clone(), Arc::clone(&config), index)
            .map_err(|e| ServiceError::Rule(instrument.name.clone(), e))?;
        intakes.push((intake, instrument.folders.clone()));
    }
    let runtime = tokio::runtime::Builder::new_multi_thread()
        .worker_threads(1)
        .max_blocking_threads(4)
        .enable_all()
        .build()
        .map_err(ServiceError::Runtime)?;

    let (ended, ends) = channel();
    let mut stages = 0;
    let mail = Arc::new(tokio::sync::Notify::new());
    let (rounds_wake, rounds_waiting) = wake();
    stop.wakes(rounds_wake.clone());
    let mut read = Vec::new();
    for (intake, folders) in intakes {
        let its_read = Arc::new(AtomicBool::new(false));
        read.push(Arc::clone(&its_read));
        let (look, looking) = wake();
        stop.wakes(look.clone());
        let watch = Watch::new(&folders, look);
        let (rounds, stop) = (rounds_wake.clone(), stop.clone());
        stage("intake", &ended, &mut stages, move || {
            look_on(intake, watch, &looking, &rounds, &its_read, &stop)
        });
    }
    rounds_wake.now();
    let work = Work {
        read: read.clone(),
        rounds: Rounds::new(ledger.clone(), Arc::clone(&config)),
        analyse: Analyse::new(ledger.clone(), Arc::clone(&config)),
        reporter: Reporter::new(ledger.clone(), Arc::clone(&config)),
        mail: Arc::clone(&mail),
    };
    let stop_work = stop.clone();
    stage("rounds", &ended, &mut stages, move || {
        work.go_on(&rounds_waiting, &stop_work)
    });
    let delivery = runtime.spawn(deliver::run(
        ledger,
        Arc::clone(&config),
        mail,
        stop.clone(),
    ));

    let instruments = config.instruments.len();
    tracing::info!(
        instruments,
        plans = config.plans.len(),
        "service is running"
    );
    let outcome = wait(&ends, stages, stop);
    let left = STOP_LIMIT.saturating_sub(stop.since());
    runtime.block_on(async {
        // A send that outlives its time stays owed.
        let _ = tokio::time::timeout(left, delivery).await;
    });
    runtime.shutdown_background();
    tracing::info!("service has stopped");
    outcome
}

/// Starts a stage's thread; its end is told whether it returns or panics.
fn stage(
    name: &'static str,
    ended: &Sender<&'static str>,
    stages: &mut usize,
    work: impl FnOnce() + Send + 'static,
) {
    struct Told(&'static str, Sender<&'static str>);
    impl Drop for Told {
        fn drop(&mut self) {
            // Nobody listens any more when the service is past its time.
            let _ = self.1.send(self.0);
        }
    }
    let told = Told(name, ended.clone());
    *stages += 1;
    thread::spawn(move || {
        let _told = told;
        work();
    });
}

/// Waits for the stop, then for the stages, at most [`STOP_LIMIT`].
fn wait(ends: &Receiver<&'static str>, mut stages: usize, stop: &Stop) -> Result<(), ServiceError> {
    let mut outcome = Ok(());
    while stages > 0 {
        let patience = if stop.is_set() {
            STOP_LIMIT.saturating_sub(stop.since())
        } else {
            Duration::from_millis(100)
        };
        match ends.recv_timeout(patience) {
            Ok(name) => {
                stages -= 1;
                if !stop.is_set() {
                    outcome = Err(ServiceError::Stage(name));
                    stop.now();
                }
            }
            Err(RecvTimeoutError::Timeout) if !stop.is_set() => {}
            Err(_) => {
                tracing::warn!(
                    stages,
                    "stages were still busy; their work is done again at the next start"
                );
                break;
            }
        }
    }
    outcome
}

fn lock(config: &Config) -> Result<std::fs::File, ServiceError> {
    let path = config.state.join("restudy.lock");
    let file = fs_err::File::create(&path)
        .map_err(ServiceError::State)?
        .into_parts()
        .0;
    file.try_lock()
        .map_err(|_| ServiceError::Running(config.state.clone()))?;
    Ok(file)
}

/// Looks through an instrument's folders until the stop; `read` says whether all that lies there was read.
fn look_on(
    mut intake: Intake,
    mut watch: Watch,
    looking: &Waiting,
    rounds: &Wake,
    read: &AtomicBool,
    stop: &Stop,
) {
    let mut unreadable_before = Vec::new();
    while !stop.is_set() {
        let looked_at = Instant::now();
        let wait = match intake.pass(Now::read(), &|| stop.is_set()) {
            Ok(looked) => {
                if looked.recorded > 0 {
                    rounds.now();
                }
                read.store(
                    looked.unreadable.is_empty() && !looked.settling,
                    Ordering::Release,
                );
                let mut unreadable = Vec::new();
                for folder in looked.unreadable {
                    if !unreadable_before.contains(&folder.path) {
                        tracing::warn!(error = %folder.error, "folder cannot be read; it is tried again");
                    }
                    watch.lost(&folder.path);
                    unreadable.push(folder.path);
                }
                unreadable_before = unreadable;
                looked.next
            }
            Err(error) => {
                tracing::error!(error = %chain(&error), "exports cannot be recorded; trying again");
                AFTER_FAULT
            }
        };
        watch.again();
        if !looking.at_most(wait) {
            return;
        }
        if !stop.is_set() {
            thread::sleep(BETWEEN_LOOKS.saturating_sub(looked_at.elapsed()));
        }
    }
}

struct Work {
    read: Vec<Arc<AtomicBool>>,
    rounds: Rounds,
    analyse: Analyse,
    reporter: Reporter,
    mail: Arc<tokio::sync::Notify>,
}

impl Work {
    fn go_on(mut self, waiting: &Waiting, stop: &Stop) {
        while !stop.is_set() {
            let wait = match self.pass(Now::read()) {
                Ok(()) => ROUNDS_EVERY,
                Err(error) => {
                    tracing::error!(error = %chain(&*error), "rounds cannot be brought up to date; trying again");
                    AFTER_FAULT
                }
            };
            if !waiting.at_most(wait) {
                return;
            }
        }
    }

    fn pass(&mut self, now: Now) -> Result<(), Box<dyn std::error::Error>> {
        let all_read = self.read.iter().all(|read| read.load(Ordering::Acquire));
        self.rounds.pass(now, all_read)?;
        if self.analyse.pass(now)? {
            self.mail.notify_one();
        }
        self.reporter.pass(now)?;
        Ok(())
    }
}
