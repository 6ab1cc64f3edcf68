//! A ledger with an outbox, and the delivery that works on it with short limits.

use std::path::Path;

use restudy_config::Disk;
use tempfile::TempDir;
use tokio::time::{Instant, timeout};

use super::super::backoff::Backoff;
use super::super::*;
use crate::ledger::{Ledger, NewNotice, OutboxRow};
use crate::now::Now;

/// Short enough for a test, long enough for a busy machine.
pub(super) const SHORT: Limits = Limits {
    steps: Steps {
        connect: Duration::from_millis(700),
        greeting: Duration::from_millis(700),
        command: Duration::from_millis(700),
        data: Duration::from_millis(700),
        content: Duration::from_secs(10),
    },
    goodbye: Duration::from_millis(300),
    stop: Duration::from_millis(400),
    after_fault: Duration::from_millis(100),
    backoff: Backoff {
        first: Duration::from_millis(100),
        longest: Duration::from_millis(200),
    },
};
pub(super) const DEADLINE: Duration = Duration::from_secs(20);

struct Nothing;

impl Disk for Nothing {
    fn is_folder(&self, _: &Path) -> bool {
        true
    }
    fn text(&self, path: &Path) -> Result<String, String> {
        Err(format!("no such file: {}", path.display()))
    }
}

pub(super) fn config(mail: &str) -> Config {
    let text = format!(
        r#"
[site]
name = "Halden Pump Works"
zone = "Europe/Oslo"
[state]
folder = "/var/lib/restudy"
[[instrument]]
name    = "bridge-1"
folders = ["/srv/exports/bridge-1"]
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
{mail}
"#
    );
    let read = restudy_config::read(&text, "halden.toml", Path::new("/etc/restudy"), &Nothing);
    read.unwrap_or_else(|faults| panic!("{faults:#?}")).0
}

pub(super) fn plain(port: u16) -> String {
    format!(
        "[mail]\nserver = \"127.0.0.1\"\nport = {port}\ntls = \"none\"\nfrom = \"Restudy <restudy@halden.example>\"\n"
    )
}

/// A ledger with an outbox, and the delivery that works on it.
pub(super) struct Bench {
    pub(super) folder: TempDir,
    pub(super) ledger: SharedLedger,
    round: i64,
    wake: Arc<Notify>,
    stop: Stop,
    delivery: Option<tokio::task::JoinHandle<()>>,
}

impl Bench {
    pub(super) fn new() -> Self {
        let folder = tempfile::tempdir().unwrap();
        let ledger = SharedLedger::new(Ledger::open(folder.path()).unwrap());
        let round = ledger
            .lock()
            .write(|w| w.add_round("impeller hub", 1, None))
            .unwrap();
        Self {
            folder,
            ledger,
            round,
            wake: Arc::new(Notify::new()),
            stop: Stop::new(),
            delivery: None,
        }
    }

    pub(super) fn owe(&self, channel: &'static str, recipient: &str) {
        let notice = NewNotice {
            channel,
            recipient: recipient.into(),
            key: format!("<{channel}-{recipient}-1@halden.example>"),
            thread: "<t@halden.example>".into(),
            plan: "impeller hub".into(),
            round: self.round,
            kind: "standing",
            subject: "ACT: impeller hub / bridge-1: bore A takes 35 % of tolerance".into(),
            bytes: format!(
                "To: {recipient}\r\nMessage-ID: <{recipient}-1>\r\n\r\n.a line with a dot\r\n"
            )
            .into_bytes(),
        };
        self.ledger
            .lock()
            .write(|w| w.owe(&notice, Now::read().utc))
            .unwrap();
        self.wake.notify_one();
    }

    pub(super) fn start(&mut self, config: Config) {
        let state = self.folder.path().to_owned();
        self.start_in(&state, config);
    }

    /// With another state folder than the ledger's.
    pub(super) fn start_in(&mut self, state: &Path, mut config: Config) {
        config.state = state.to_owned();
        let (ledger, wake, stop) = (
            self.ledger.clone(),
            Arc::clone(&self.wake),
            self.stop.clone(),
        );
        self.delivery = Some(tokio::spawn(run_within(
            ledger,
            Arc::new(config),
            wake,
            stop,
            SHORT,
        )));
    }

    /// From now on the ledger can be read only, as on a full disk.
    pub(super) fn refuse_records(&self) {
        *self.ledger.lock() = Ledger::open_to_read(self.folder.path()).unwrap();
    }

    /// The ledger can be written again.
    pub(super) fn take_records(&self) {
        *self.ledger.lock() = Ledger::open(self.folder.path()).unwrap();
    }

    fn undelivered(&self) -> Vec<OutboxRow> {
        self.ledger.lock().read().undelivered().unwrap()
    }

    pub(super) async fn until(
        &self,
        what: &str,
        state: impl Fn(&[OutboxRow]) -> bool,
    ) -> Vec<OutboxRow> {
        let deadline = Instant::now() + DEADLINE;
        loop {
            let rows = self.undelivered();
            if state(&rows) {
                return rows;
            }
            assert!(Instant::now() < deadline, "never came: {what}; {rows:#?}");
            sleep(Duration::from_millis(10)).await;
        }
    }

    pub(super) async fn stopped(mut self) -> Duration {
        self.stop.now();
        let asked = Instant::now();
        timeout(DEADLINE, self.delivery.take().unwrap())
            .await
            .unwrap()
            .unwrap();
        asked.elapsed()
    }
}

/// Waits for something that the ledger does not show.
pub(super) async fn until(state: impl Fn() -> bool) {
    let deadline = Instant::now() + DEADLINE;
    while !state() {
        assert!(Instant::now() < deadline);
        sleep(Duration::from_millis(5)).await;
    }
}
