//! The child that reads workbooks, spoken to as the service does: frames of a length and bytes.

use std::io::{Read as _, Write as _};
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};

/// Exports that are timed.
const TIMED: usize = 200;
/// A small workbook takes no longer in a child that runs already.
const MEDIAN_MAX: Duration = Duration::from_millis(25);

struct Reader(Child);

impl Reader {
    fn start() -> Self {
        let child = Command::new(env!("CARGO_BIN_EXE_restudy"))
            .arg("read-workbooks")
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .spawn();
        Self(child.expect("the program can be started"))
    }

    fn read(&mut self, bytes: &[u8]) -> Value {
        let head = json!({"path": "run", "ask": {"Plain": {"factors": []}}}).to_string();
        let stdin = self.0.stdin.as_mut().expect("its input");
        for frame in [head.as_bytes(), bytes] {
            stdin
                .write_all(&(frame.len() as u64).to_le_bytes())
                .expect("it listens");
            stdin.write_all(frame).expect("it listens");
        }
        stdin.flush().expect("it listens");
        let stdout = self.0.stdout.as_mut().expect("its output");
        let mut length = [0; 8];
        stdout.read_exact(&mut length).expect("it answers");
        let mut answer = vec![0; u64::from_le_bytes(length) as usize];
        stdout.read_exact(&mut answer).expect("it answers whole");
        serde_json::from_slice(&answer).expect("it answers in JSON")
    }
}

impl Drop for Reader {
    fn drop(&mut self) {
        drop(self.0.stdin.take());
        let ended = self.0.wait().expect("it ends with its input");
        assert!(ended.success(), "{ended}");
    }
}

fn book(name: &str) -> Vec<u8> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("../fixtures/exports/workbooks");
    fs_err::read(folder.join(name)).expect("a fixture")
}

fn readings(answer: &Value) -> usize {
    answer["Ok"]["readings"].as_array().map_or(0, Vec::len)
}

#[test]
fn one_child_reads_every_kind_one_after_another() {
    let mut reader = Reader::start();
    assert_eq!(readings(&reader.read(&book("cells-xlsxwriter.xlsx"))), 2);
    assert_eq!(readings(&reader.read(&book("cells-xlwt.xls"))), 2);
    let refused = reader.read(b"PK\x03\x04");
    assert!(refused["Err"]["sentence"].is_string(), "{refused}");
    assert_eq!(readings(&reader.read(&book("cells-sheetjs.xlsb"))), 2);
    assert_eq!(readings(&reader.read(&book("cells-odfpy.ods"))), 3);
}

#[test]
fn a_small_workbook_takes_a_few_milliseconds() {
    let bytes = book("cells-xlsxwriter.xlsx");
    let median = |mut times: Vec<Duration>| {
        times.sort_unstable();
        times[times.len() / 2]
    };
    let timed = |read: &mut dyn FnMut() -> Value| {
        let started = Instant::now();
        assert_eq!(readings(&read()), 2);
        started.elapsed()
    };
    let mut reader = Reader::start();
    let kept = median(
        (0..TIMED)
            .map(|_| timed(&mut || reader.read(&bytes)))
            .collect(),
    );
    let anew = median(
        (0..TIMED)
            .map(|_| timed(&mut || Reader::start().read(&bytes)))
            .collect(),
    );
    assert!(
        kept <= MEDIAN_MAX,
        "{kept:?} in a child kept, {anew:?} in one each"
    );
}
