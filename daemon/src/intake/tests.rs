//! Intake and rounds on real files and a real ledger, with a clock of our own.

use std::path::PathBuf;
use std::sync::Arc;
use std::time::Duration;

use restudy_config::{Config, Disk};

use super::Intake;
use crate::ledger::{Accounting, Ledger, RoundRow, RoundState, SharedLedger};
use crate::now::Now;
use crate::rounds::Rounds;

const CONFIG: &str = r#"
[site]
name = "Halden Pump Works"
zone = "Europe/Oslo"
[state]
folder = "state"
[[instrument]]
name = "bench-1"
folders = ["exports"]
files = ["*.csv"]
settle = "1s"
[instrument.read]
form = "table"
part = { column = "part" }
appraiser = { column = "who" }
trial = { column = "trial" }
taken = { column = "taken" }
characteristic = { column = "feature" }
value = { column = "value", unit = "mm" }
[[plan]]
name = "pin"
instruments = ["bench-1"]
parts = ["P1", "P2"]
appraisers = ["KL", "MO"]
trials = 1
interaction = "keep"
limits = { watch = 0.1, act = 0.3 }
"#;

const HEAD: &str = "part,who,trial,taken,feature,value\n";
/// 2026-06-02 12:00 UTC.
const NOW: i64 = 1_780_401_600_000;

struct RealDisk;

impl Disk for RealDisk {
    fn is_folder(&self, path: &std::path::Path) -> bool {
        path.is_dir()
    }

    fn text(&self, path: &std::path::Path) -> Result<String, String> {
        fs_err::read_to_string(path).map_err(|e| e.to_string())
    }
}

struct Room {
    folder: tempfile::TempDir,
    ledger: SharedLedger,
    config: Arc<Config>,
    intake: Intake,
    uptime: Duration,
}

impl Room {
    fn new(config: &str) -> Self {
        let folder = tempfile::tempdir().unwrap();
        fs_err::create_dir_all(folder.path().join("exports")).unwrap();
        fs_err::create_dir_all(folder.path().join("state")).unwrap();
        let ledger = SharedLedger::new(Ledger::open(&folder.path().join("state")).unwrap());
        let config = configured(&folder, config);
        let intake = Intake::new(ledger.clone(), Arc::clone(&config), 0).unwrap();
        Self {
            folder,
            ledger,
            config,
            intake,
            uptime: Duration::ZERO,
        }
    }

    /// The service starts anew with another configuration.
    fn restart(&mut self, config: &str) {
        self.config = configured(&self.folder, config);
        self.intake = Intake::new(self.ledger.clone(), Arc::clone(&self.config), 0).unwrap();
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join("exports").join(name)
    }

    fn write(&self, name: &str, rows: &[&str]) {
        fs_err::write(self.path(name), format!("{HEAD}{}\n", rows.join("\n"))).unwrap();
    }

    /// Looks until everything has settled, then brings the rounds up to date.
    fn look(&mut self) {
        for _ in 0..2 {
            let now = Now {
                utc: NOW,
                uptime: self.uptime,
            };
            self.intake.pass(now, &|| false).unwrap();
            self.uptime += Duration::from_secs(20);
        }
        let now = Now {
            utc: NOW,
            uptime: self.uptime,
        };
        Rounds::new(self.ledger.clone(), Arc::clone(&self.config))
            .pass(now, true)
            .unwrap();
    }

    fn account(&self) -> Accounting {
        let account = self.ledger.lock().read().accounting().unwrap();
        assert_eq!(account.total, account.placed(), "{account:?}");
        account
    }

    fn rounds(&self) -> Vec<RoundRow> {
        self.ledger.lock().read().rounds("pin").unwrap()
    }

    fn set_aside(&self) -> Vec<String> {
        let aside = self.ledger.lock().read().set_aside().unwrap();
        aside.into_iter().map(|a| a.reason).collect()
    }
}

fn configured(folder: &tempfile::TempDir, text: &str) -> Arc<Config> {
    let read = restudy_config::read(text, "restudy.toml", folder.path(), &RealDisk);
    Arc::new(read.unwrap_or_else(|faults| panic!("{faults:?}")).0)
}

const FULL: [&str; 4] = [
    "P1,KL,1,2026-06-02T08:01:00,bore,10.01",
    "P1,MO,1,2026-06-02T08:02:00,bore,10.02",
    "P2,KL,1,2026-06-02T08:03:00,bore,10.11",
    "P2,MO,1,2026-06-02T08:04:00,bore,10.12",
];

#[test]
fn two_spellings_of_one_run_in_one_file_stop_nothing() {
    let mut room = Room::new(CONFIG);
    room.write(
        "a.csv",
        &[
            "P1,KL,1,2026-06-02T08:01:00,bore,10.01",
            "p1,kl,1,2026-06-02T08:01:00,bore,10.01",
        ],
    );
    room.write("b.csv", &[FULL[1]]);
    room.look();
    assert_eq!(room.account().total, 3);
    assert_eq!(room.rounds()[0].state, RoundState::Open);
}

#[test]
fn labels_that_were_exchanged_and_corrected_in_place_are_taken_as_corrected() {
    let mut room = Room::new(CONFIG);
    room.write("a.csv", &["P2,KL,1,2026-06-02T08:01:00,bore,10.01"]);
    room.write("b.csv", &["P1,KL,1,2026-06-02T08:03:00,bore,10.11"]);
    room.look();
    room.write("a.csv", &["P1,KL,1,2026-06-02T08:01:00,bore,10.01"]);
    room.write("b.csv", &["P2,KL,1,2026-06-02T08:03:00,bore,10.11"]);
    room.look();
    let account = room.account();
    assert_eq!((account.used, account.set_aside), (2, 2));
    let runs = room.ledger.lock().read().open_runs("pin").unwrap();
    let withdrawn: Vec<&str> = runs.iter().filter_map(|r| r.tie.as_deref()).collect();
    assert_eq!(
        withdrawn,
        [
            "`a.csv` was written anew and gives this run as P1 KL of 2026-06-02 08:01",
            "`b.csv` was written anew and gives this run as P2 KL of 2026-06-02 08:03",
        ]
    );
}

#[test]
fn a_file_that_is_used_again_for_new_runs_takes_nothing_back() {
    let mut room = Room::new(CONFIG);
    for row in &FULL[..2] {
        room.write("out.csv", &[row]);
        room.look();
    }
    assert_eq!((room.account().used, room.account().total), (2, 2));
}

#[test]
fn bytes_that_are_read_anew_by_another_rule_count_once() {
    let mut room = Room::new(CONFIG);
    room.write(
        "a.csv",
        &[
            "P1,KL,1,2026-06-02T08:01:00,bore,10.01",
            "P1,MM,1,2026-06-02T08:02:00,bore,10.02",
        ],
    );
    room.look();
    assert_eq!(room.account().set_aside, 1);
    let rule = r#"appraiser = { column = "who", spellings = { MO = ["MM"] } }"#;
    room.restart(&CONFIG.replace(r#"appraiser = { column = "who" }"#, rule));
    room.look();
    let account = room.account();
    assert_eq!((account.total, account.used, account.set_aside), (2, 2, 0));
}

#[test]
fn an_export_that_no_plan_took_is_looked_at_again_when_one_does() {
    let mut room =
        Room::new(&CONFIG.replace("trials = 1", "trials = 1\nonly = { path = \"GRR\" }"));
    room.write("a.csv", &FULL);
    room.look();
    assert_eq!(room.account().not_for_a_plan, 4);
    room.restart(CONFIG);
    room.look();
    assert_eq!((room.account().total, room.account().used), (4, 4));
    assert_eq!(room.rounds()[0].state, RoundState::Complete);
}

#[test]
fn a_contradiction_after_the_close_changes_nothing() {
    let counted = CONFIG.replace(
        "trial = { column = \"trial\" }",
        "trial = { count = \"taken\" }",
    );
    let mut room = Room::new(&counted);
    room.write("a.csv", &FULL);
    room.look();
    assert_eq!(room.rounds()[0].state, RoundState::Complete);
    room.write("b.csv", &["P1,KL,1,2026-06-02T08:01:00,bore,10.9"]);
    room.look();
    assert_eq!(room.rounds()[0].revision, 1);
    assert_eq!(room.account().superseded, 1);
}

#[test]
fn a_corrected_value_after_the_close_makes_a_revision_only_once_it_was_worked_out() {
    let mut room = Room::new(CONFIG);
    room.write("a.csv", &FULL);
    room.look();
    let closed = room.rounds().remove(0);
    let analysed = RoundRow {
        analysed: 1,
        ..closed
    };
    room.ledger
        .lock()
        .write(|w| w.put_round(&analysed))
        .unwrap();
    let corrected = FULL.map(|row| row.replace("10.12", "10.13"));
    room.write("a.csv", &corrected.each_ref().map(String::as_str));
    room.look();
    assert_eq!(room.rounds()[0].revision, 2);
    let account = room.account();
    assert_eq!((account.used, account.superseded, account.copy), (4, 1, 3));
}

#[test]
fn a_time_stamp_in_the_future_is_set_aside() {
    let mut room = Room::new(CONFIG);
    room.write("a.csv", &["P1,KL,1,2062-06-02T08:01:00,bore,10.01"]);
    room.look();
    assert_eq!(
        room.set_aside(),
        ["its time stamp 2062-06-02T08:01:00 lies in the future"]
    );
}

#[test]
fn links_are_not_followed() {
    let mut room = Room::new(CONFIG);
    room.write("a.csv", &[FULL[0]]);
    std::os::unix::fs::symlink(room.path("a.csv"), room.path("b.csv")).unwrap();
    std::os::unix::fs::symlink(room.folder.path().join("exports"), room.path("again")).unwrap();
    room.look();
    assert_eq!(room.account().total, 1);
}

#[test]
fn a_refused_export_is_shown_until_its_file_is_gone() {
    let mut room = Room::new(CONFIG);
    fs_err::write(room.path("a.csv"), "no,headings\n1,2\n").unwrap();
    room.look();
    let refused = |room: &Room| room.ledger.lock().read().refused().unwrap().len();
    assert_eq!(refused(&room), 1);
    fs_err::remove_file(room.path("a.csv")).unwrap();
    room.look();
    assert_eq!(refused(&room), 0);
}

/// Here the child that should read workbooks is this test program, which answers with no frame and ends.
#[test]
fn a_workbook_whose_reader_dies_three_times_is_refused_and_costs_only_itself() {
    let mut room = Room::new(&CONFIG.replace("*.csv", "*.*"));
    fs_err::write(room.path("a.xlsx"), b"PK\x03\x04 and more").unwrap();
    room.write("b.csv", &[FULL[0]]);
    let refused = |room: &Room| room.ledger.lock().read().refused().unwrap();
    for _ in 0..2 {
        let now = Now {
            utc: NOW,
            uptime: room.uptime,
        };
        room.intake.pass(now, &|| false).unwrap();
        room.uptime += Duration::from_secs(20);
    }
    assert_eq!(refused(&room), []);
    room.look();
    room.look();
    let told = refused(&room).remove(0).reason;
    assert!(told.starts_with("its reader failed 3 times ("), "{told}");
    assert_eq!(room.account().used, 1);
}
