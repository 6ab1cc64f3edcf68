//! Workbooks are read in a child process of our own program: some crafted ones abort whoever opens them.
//!
//! Model: one child, started when first needed and kept for many exports; a request is a JSON head and the
//! export's bytes, an answer is JSON (`child` is the other end). Memory is limited by the child itself, time
//! by us. A child that ended between two exports is replaced and nobody is blamed.
//!
//! Invariant: a child that dies, or does not answer in time, costs only the export it was reading.

use std::io::{self, Write as _};
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::sync::mpsc::channel;
use std::thread;
use std::time::Duration;

use restudy_parsers::Refused;
use serde::de::DeserializeOwned;

use super::request::{Ask, COMMAND, Head, put, take_frame};

/// One workbook may take so long.
const TIME_LIMIT: Duration = Duration::from_secs(60);
/// So many exports are read by one child, so that what the library may leak stays small.
const EXPORTS_PER_CHILD: u32 = 1000;

/// Why there is no answer.
#[derive(Debug)]
pub enum Failure {
    /// The reader died or took too long: how.
    Died(String),
    /// The machine would not start it.
    CannotStart(io::Error),
}

/// The child and its two ends.
#[derive(Default)]
pub struct Workbooks {
    running: Option<Running>,
}

struct Running {
    child: Child,
    stdin: ChildStdin,
    stdout: ChildStdout,
    /// Exports it has read.
    read: u32,
}

impl Drop for Running {
    fn drop(&mut self) {
        // A child that is gone already is what we want.
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

impl Workbooks {
    /// No child yet.
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }

    /// Has the child read a workbook; its answer is what was asked for: `Parsed`, or `Vec<Cells>` for a look.
    ///
    /// # Errors
    /// The child's death, or that it could not be started.
    pub fn read<T: DeserializeOwned>(
        &mut self,
        path: &str,
        bytes: &[u8],
        ask: &Ask,
    ) -> Result<Result<T, Refused>, Failure> {
        let mut kept = self.running.take();
        if kept.as_mut().is_some_and(|running| !running.can_go_on()) {
            kept = None;
        }
        let mut running = match kept {
            Some(running) => running,
            None => start().map_err(Failure::CannotStart)?,
        };
        let head = serde_json::to_vec(&Head {
            path: path.to_owned(),
            ask: ask.clone(),
        })
        .map_err(|e| Failure::CannotStart(e.into()))?;
        let answer = running.exchange(&head, bytes)?;
        let answer = serde_json::from_slice(&answer)
            .map_err(|e| Failure::Died(format!("answered with nonsense ({e})")))?;
        running.read += 1;
        self.running = Some(running);
        Ok(answer)
    }
}

impl Running {
    fn can_go_on(&mut self) -> bool {
        self.read < EXPORTS_PER_CHILD && matches!(self.child.try_wait(), Ok(None))
    }

    /// One request and its answer. Whoever gets no answer must drop us.
    fn exchange(&mut self, head: &[u8], bytes: &[u8]) -> Result<Vec<u8>, Failure> {
        let Self {
            child,
            stdin,
            stdout,
            ..
        } = self;
        let (sender, receiver) = channel();
        let answer = thread::scope(|scope| {
            scope.spawn(move || {
                let answer = put(stdin, head)
                    .and_then(|()| put(stdin, bytes))
                    .and_then(|()| stdin.flush())
                    .and_then(|()| take_frame(stdout));
                // Nobody waits any more when the time was up.
                let _ = sender.send(answer);
            });
            let answer = receiver.recv_timeout(TIME_LIMIT);
            if answer.is_err() {
                // Its ends close, so that the thread ends too.
                let _ = child.kill();
            }
            answer
        });
        match answer {
            Ok(Ok(Some(answer))) => Ok(answer),
            Ok(_) => {
                let how = child.wait().map(|status| status.to_string());
                Err(Failure::Died(how.unwrap_or_else(|e| e.to_string())))
            }
            Err(_) => Err(Failure::Died(format!(
                "took more than {} s",
                TIME_LIMIT.as_secs()
            ))),
        }
    }
}

/// The refusal of a workbook whose readers died.
#[must_use]
pub fn refusal(how: &str, strikes: u32) -> Refused {
    Refused {
        sentence: format!(
            "its reader failed {strikes} times ({how}); a workbook of usual size takes under a second and little memory"
        ),
        hint: Some("open it in a spreadsheet program and save it again, or export as text".into()),
        perhaps_unfinished: false,
    }
}

fn start() -> io::Result<Running> {
    let mut child = Command::new(own_program()?)
        .arg(COMMAND)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()?;
    let (Some(stdin), Some(stdout)) = (child.stdin.take(), child.stdout.take()) else {
        return Err(io::ErrorKind::BrokenPipe.into());
    };
    Ok(Running {
        child,
        stdin,
        stdout,
        read: 0,
    })
}

/// Our own program even after an update replaced the file it was started from.
fn own_program() -> io::Result<std::path::PathBuf> {
    let link = std::path::PathBuf::from("/proc/self/exe");
    if link.exists() {
        Ok(link)
    } else {
        std::env::current_exe()
    }
}
