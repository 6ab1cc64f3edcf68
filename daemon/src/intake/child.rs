//! The child's end: reads workbooks from standard input until it closes, one answer each.

use std::io::{self, Write};

use restudy_parsers::Export;
use rustix::process::{Resource, Rlimit, setrlimit};

use super::request::{Ask, Head, put, take_frame};

/// Address space of the child; a workbook within the rule's bounds needs far less.
const MEMORY_LIMIT: u64 = 2 << 30;

/// Serves until standard input closes.
///
/// # Errors
/// A broken pipe, or a request that is no request.
pub fn serve() -> io::Result<()> {
    let limit = Rlimit {
        current: Some(MEMORY_LIMIT),
        maximum: Some(MEMORY_LIMIT),
    };
    setrlimit(Resource::As, limit)?;
    #[cfg(target_os = "linux")]
    rustix::process::set_parent_process_death_signal(Some(rustix::process::Signal::KILL))?;
    let mut input = io::stdin().lock();
    let mut output = io::stdout().lock();
    while let Some(head) = take_frame(&mut input)? {
        let head: Head = serde_json::from_slice(&head)?;
        let bytes = take_frame(&mut input)?.ok_or(io::ErrorKind::UnexpectedEof)?;
        put(&mut output, &answer(&head, &bytes)?)?;
        output.flush()?;
    }
    Ok(())
}

fn answer(head: &Head, bytes: &[u8]) -> serde_json::Result<Vec<u8>> {
    let export = Export {
        path: &head.path,
        bytes,
    };
    match &head.ask {
        Ask::Rule(rule) => serde_json::to_vec(&restudy_parsers::read(export, rule)),
        Ask::Plain(plain) => serde_json::to_vec(&restudy_parsers::read_plain(export, plain)),
        Ask::Look => serde_json::to_vec(&restudy_parsers::look_at_sheets(bytes)),
    }
}
