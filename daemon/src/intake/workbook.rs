//! Workbooks are read in a child process of our own program: some crafted ones abort whoever opens them.
//!
//! Model: one child, started when first needed and kept; a request is a JSON head and the export's bytes, an
//! answer is JSON (`child` is the other end). Memory is limited by the child itself, time by us.
//!
//! Invariant: a child that dies, or does not answer in time, costs only the export it was reading.

use std::io::{self, Write as _};
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::sync::mpsc::{RecvTimeoutError, channel};
use std::time::Duration;

use restudy_parsers::Refused;
use serde::de::DeserializeOwned;

use super::request::{Ask, COMMAND, Head, put_frame, take_frame};

/// One workbook may take so long.
const TIME_LIMIT: Duration = Duration::from_secs(60);

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
    ends: Option<(ChildStdin, ChildStdout)>,
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
        let mut running = match self.running.take() {
            Some(running) => running,
            None => start().map_err(Failure::CannotStart)?,
        };
        let Some((mut stdin, mut stdout)) = running.ends.take() else {
            return Err(Failure::Died("lost its ends".into()));
        };
        let head = serde_json::to_vec(&Head {
            path: path.to_owned(),
            ask: ask.clone(),
        })
        .map_err(|e| Failure::CannotStart(e.into()))?;
        let mut request = Vec::with_capacity(head.len() + bytes.len() + 16);
        put_frame(&mut request, &head);
        put_frame(&mut request, bytes);

        let (sender, receiver) = channel();
        std::thread::spawn(move || {
            let answer = stdin
                .write_all(&request)
                .and_then(|()| stdin.flush())
                .and_then(|()| take_frame(&mut stdout));
            // Nobody waits any more when the time was up.
            let _ = sender.send((answer, stdin, stdout));
        });
        match receiver.recv_timeout(TIME_LIMIT) {
            Ok((Ok(Some(answer)), stdin, stdout)) => {
                let answer = serde_json::from_slice(&answer)
                    .map_err(|e| Failure::Died(format!("answered with nonsense ({e})")))?;
                running.ends = Some((stdin, stdout));
                self.running = Some(running);
                Ok(answer)
            }
            Ok(_) | Err(RecvTimeoutError::Disconnected) => {
                let how = running.child.wait().map(|s| s.to_string());
                Err(Failure::Died(how.unwrap_or_else(|e| e.to_string())))
            }
            Err(RecvTimeoutError::Timeout) => Err(Failure::Died(format!(
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
    let ends = child.stdin.take().zip(child.stdout.take());
    Ok(Running { child, ends })
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
