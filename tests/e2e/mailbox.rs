//! A real mail server on loopback, and the messages it received.

use std::io::{BufRead as _, BufReader};
use std::net::TcpListener;
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::thread;
use std::time::{Duration, Instant};

use serde_json::Value;
use tempfile::TempDir;

const SINK: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/../tests/e2e/smtp_sink.py");
const DEADLINE: Duration = Duration::from_secs(90);

/// A mail server that keeps what it receives; it goes when this does.
pub(crate) struct Mailbox {
    server: Child,
    folder: TempDir,
    pub(crate) port: u16,
}

/// One message with its envelope.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Received {
    pub(crate) sender: String,
    pub(crate) recipient: String,
    pub(crate) bytes: Vec<u8>,
}

impl Mailbox {
    /// A server on any free port; `None`, said by name, where aiosmtpd is not installed.
    pub(crate) fn open(test: &str) -> Option<Self> {
        Self::open_on(test, 0, 0)
    }

    /// A server on that port that never answers for the first `silent` messages.
    pub(crate) fn open_on(test: &str, port: u16, silent: usize) -> Option<Self> {
        if !can_be_opened(test) {
            return None;
        }
        let folder = tempfile::tempdir().expect("a temporary folder");
        let mut server = Command::new("python3")
            .arg(SINK)
            .arg(folder.path())
            .args([port.to_string(), silent.to_string()])
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .spawn()
            .expect("the mail server can be started");
        let mut line = String::new();
        let stdout = server.stdout.take().expect("its standard output");
        BufReader::new(stdout)
            .read_line(&mut line)
            .expect("the mail server's port");
        let port = line.trim().parse().expect("a port");
        Some(Self {
            server,
            folder,
            port,
        })
    }

    /// What came so far, in order.
    pub(crate) fn messages(&self) -> Vec<Received> {
        let mut files: Vec<_> = fs_err::read_dir(self.folder.path())
            .expect("the mail server's folder")
            .map(|entry| entry.expect("a message").path())
            .filter(|path| path.extension().is_none())
            .collect();
        files.sort();
        files.iter().map(|path| received(path)).collect()
    }

    /// Waits until so many messages came.
    pub(crate) fn wait_for(&self, count: usize) -> Vec<Received> {
        let deadline = Instant::now() + DEADLINE;
        loop {
            let messages = self.messages();
            if messages.len() >= count {
                return messages;
            }
            assert!(
                Instant::now() < deadline,
                "{} of {count} messages came",
                messages.len()
            );
            thread::sleep(Duration::from_millis(50));
        }
    }
}

impl Drop for Mailbox {
    fn drop(&mut self) {
        // One that has ended already is what we want.
        let _ = self.server.kill();
        let _ = self.server.wait();
    }
}

/// A port on which nothing listens.
pub(crate) fn silent_port() -> u16 {
    let listener = TcpListener::bind("127.0.0.1:0").expect("a free port");
    listener.local_addr().expect("its address").port()
}

#[expect(clippy::print_stderr, reason = "a test that is skipped must say so")]
fn can_be_opened(test: &str) -> bool {
    let found = Command::new("python3")
        .args(["-c", "import aiosmtpd"])
        .stderr(Stdio::null())
        .status()
        .is_ok_and(|status| status.success());
    if !found {
        let in_ci = std::env::var_os("CI").is_some_and(|value| value == "true");
        assert!(!in_ci, "{test} must not be skipped here: it needs aiosmtpd");
        eprintln!("skipped: {test} needs aiosmtpd (python3 -m pip install aiosmtpd)");
    }
    found
}

fn received(path: &Path) -> Received {
    let bytes = fs_err::read(path).expect("a message");
    let end = bytes
        .iter()
        .position(|b| *b == b'\n')
        .expect("a line of envelope");
    let envelope: Value = serde_json::from_slice(&bytes[..end]).expect("an envelope");
    let text = |value: &Value| value.as_str().expect("an address").to_owned();
    assert_eq!(
        envelope["recipients"].as_array().map(Vec::len),
        Some(1),
        "{envelope}"
    );
    Received {
        sender: text(&envelope["sender"]),
        recipient: text(&envelope["recipients"][0]),
        bytes: bytes[end + 1..].to_vec(),
    }
}
