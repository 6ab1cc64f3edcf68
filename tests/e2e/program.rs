//! The built program as a child process: the service, and one command at a time beside it.

use std::path::{Path, PathBuf};
use std::process::{Child, Command, ExitStatus, Output, Stdio};
use std::thread;
use std::time::{Duration, Instant};

use serde_json::Value;

use crate::plant::Plant;

/// Whatever is waited for comes within this time, on a busy machine too.
const DEADLINE: Duration = Duration::from_secs(120);
const BETWEEN_LOOKS: Duration = Duration::from_millis(100);
/// The service ends within this time once it is told to.
const STOP_LIMIT: Duration = Duration::from_secs(5);

/// Runs the program and waits for its end.
pub(crate) fn restudy<S: AsRef<std::ffi::OsStr>>(arguments: &[S]) -> Output {
    command()
        .args(arguments)
        .output()
        .expect("the program can be started")
}

fn command() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_restudy"));
    command.stdin(Stdio::null()).env_remove("RESTUDY_LOG");
    command
}

/// Runs a command on a plant's configuration.
pub(crate) fn on(plant: &Plant, name: &str, arguments: &[&str]) -> Output {
    let config = plant.config();
    let line = [name, "--config", config.to_str().expect("a plain path")];
    restudy(&[&line, arguments].concat())
}

/// Standard output as JSON.
pub(crate) fn json(output: &Output) -> Value {
    serde_json::from_slice(&output.stdout)
        .unwrap_or_else(|e| panic!("{e}: {}{}", text(&output.stdout), text(&output.stderr)))
}

pub(crate) fn text(bytes: &[u8]) -> String {
    String::from_utf8_lossy(bytes).into_owned()
}

/// What `status --json` says, its accounting added up; `None` before there is a ledger.
pub(crate) fn status(plant: &Plant) -> Option<(Option<i32>, Value)> {
    let output = on(plant, "status", &["--json"]);
    if output.status.code() == Some(3) {
        return None;
    }
    let status = json(&output);
    assert_accounting_adds_up(&status);
    Some((output.status.code(), status))
}

/// Every reading met is in exactly one place.
fn assert_accounting_adds_up(status: &Value) {
    let readings = status["readings"].as_object().expect("readings by place");
    assert_eq!(readings.len(), 11, "{readings:?}");
    let count = |value: &Value| value.as_i64().expect("a count");
    let placed: i64 = readings
        .iter()
        .filter(|(place, _)| *place != "total")
        .map(|(_, n)| count(n))
        .sum();
    assert_eq!(count(&readings["total"]), placed, "{readings:?}");
}

/// The records of all rounds.
pub(crate) fn records(plant: &Plant) -> Vec<Value> {
    let output = on(plant, "results", &["--history", "--json"]);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    match json(&output) {
        Value::Array(records) => records,
        other => panic!("not a list of records: {other}"),
    }
}

/// The record of a characteristic in the last round.
pub(crate) fn record(plant: &Plant, characteristic: &str) -> Value {
    let found = records(plant)
        .into_iter()
        .rfind(|r| r["characteristic"] == characteristic);
    found.unwrap_or_else(|| panic!("no study of {characteristic}"))
}

/// A running service; it goes when this does.
pub(crate) struct Service<'a> {
    plant: &'a Plant,
    child: Child,
}

impl<'a> Service<'a> {
    /// Starts `serve`; its log lines are added to the plant's log.
    pub(crate) fn start(plant: &'a Plant) -> Self {
        let log = fs_err::OpenOptions::new()
            .create(true)
            .append(true)
            .open(log_path(plant.folder()))
            .expect("a log file");
        let child = command()
            .arg("serve")
            .arg("--config")
            .arg(plant.config())
            .stdout(Stdio::null())
            .stderr(log.into_parts().0)
            .spawn()
            .expect("the service can be started");
        Self { plant, child }
    }

    /// Waits until the status shows what is waited for; answers with that status.
    pub(crate) fn wait_until(&mut self, what: &str, is_so: impl Fn(&Value) -> bool) -> Value {
        let deadline = Instant::now() + DEADLINE;
        loop {
            let status = status(self.plant);
            if let Some((_, status)) = &status
                && is_so(status)
            {
                return status.clone();
            }
            let ended = self.child.try_wait().expect("the service can be asked");
            assert!(
                ended.is_none() && Instant::now() < deadline,
                "waited for: {what}\nservice: {ended:?}\nstatus: {status:#?}\nlog:\n{}",
                log(self.plant)
            );
            thread::sleep(BETWEEN_LOOKS);
        }
    }

    /// Waits until the plan's `number`-th round is complete, its report written and nothing owed.
    pub(crate) fn wait_for_round(&mut self, number: i64, revision: i64) -> Value {
        let report = report(self.plant, number);
        self.wait_until(
            &format!("round {number}, revision {revision}, told and reported"),
            |s| {
                let is_it = |r: &Value| {
                    r["round"] == number && r["revision"] == revision && r["state"] == "complete"
                };
                let rounds = s["rounds"].as_array().expect("rounds");
                rounds.iter().any(is_it)
                    && nothing_owed(s)
                    && reported_revision(&report) == Some(revision)
            },
        )
    }

    /// Ends the process that reads its workbooks, as the system does when memory is short.
    pub(crate) fn kill_reader(&self) {
        let is_its_child = |process: &i32| {
            let status = fs_err::read_to_string(format!("/proc/{process}/status"));
            status.is_ok_and(|s| s.contains(&format!("\nPPid:\t{}\n", self.child.id())))
        };
        let processes = fs_err::read_dir("/proc").expect("the processes");
        let names = processes.filter_map(|entry| entry.ok()?.file_name().into_string().ok());
        let readers: Vec<i32> = names
            .filter_map(|name| name.parse().ok())
            .filter(is_its_child)
            .collect();
        let [reader] = readers[..] else {
            panic!("one reader, not {readers:?}")
        };
        let reader = rustix::process::Pid::from_raw(reader).expect("a process number");
        rustix::process::kill_process(reader, rustix::process::Signal::KILL)
            .expect("the reader can be killed");
    }

    /// Ends it as a power cut would.
    pub(crate) fn kill(mut self) {
        self.child.kill().expect("the service can be killed");
        let status = self.child.wait().expect("the service has ended");
        assert_eq!(
            status.code(),
            None,
            "it ended by itself: {status}\n{}",
            log(self.plant)
        );
    }

    /// Tells it to stop: it does so in time, and calls that fine.
    pub(crate) fn stop(mut self) {
        let told = Instant::now();
        let pid = i32::try_from(self.child.id())
            .ok()
            .and_then(rustix::process::Pid::from_raw);
        let pid = pid.expect("a process number");
        rustix::process::kill_process(pid, rustix::process::Signal::TERM).expect("it can be told");
        let status = self.ended_by(told + STOP_LIMIT);
        let status = status.unwrap_or_else(|| panic!("still running: {}", log(self.plant)));
        assert_eq!(status.code(), Some(0), "{}", log(self.plant));
    }

    fn ended_by(&mut self, deadline: Instant) -> Option<ExitStatus> {
        while Instant::now() < deadline {
            if let Some(status) = self.child.try_wait().expect("the service can be asked") {
                return Some(status);
            }
            thread::sleep(Duration::from_millis(20));
        }
        None
    }
}

impl Drop for Service<'_> {
    fn drop(&mut self) {
        // One that has ended already is what we want.
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

pub(crate) fn nothing_owed(status: &Value) -> bool {
    status["owed"].as_array().expect("owed notices").is_empty()
}

/// Where the JSON report of a round lies.
fn report(plant: &Plant, number: i64) -> PathBuf {
    let plan = restudy::report::paths(&plant.state(), "impeller hub", number);
    plan.1
}

fn reported_revision(report: &Path) -> Option<i64> {
    let records: Value = serde_json::from_slice(&fs_err::read(report).ok()?).ok()?;
    records[0]["revision"].as_i64()
}

fn log_path(folder: &Path) -> PathBuf {
    folder.join("service.log")
}

/// All log lines of the plant's services.
pub(crate) fn log(plant: &Plant) -> String {
    fs_err::read_to_string(log_path(plant.folder())).unwrap_or_default()
}
