//! The child's end: reads workbooks from standard input until it closes, one answer each.

use std::io::{self, Read, Write};

use restudy_parsers::{Export, Parsed, Refused};
use rustix::process::{Resource, Rlimit, setrlimit};
use serde::{Deserialize, Serialize};

use super::workbook::Ask;

/// The hidden command that makes our own program the child.
pub const COMMAND: &str = "read-workbooks";

/// Address space of the child; a workbook within the rule's bounds needs far less.
const MEMORY_LIMIT: u64 = 2 << 30;
/// A frame longer than this is nonsense.
const FRAME_MAX: u64 = 4 << 30;

/// What comes before an export's bytes.
#[derive(Debug, Serialize, Deserialize)]
pub struct Head {
    /// Path below the watched folder.
    pub path: String,
    /// How it is to be read.
    pub ask: Ask,
}

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
        let answer = read(&head, &bytes);
        let mut frame = Vec::new();
        put_frame(&mut frame, &serde_json::to_vec(&answer)?);
        output.write_all(&frame)?;
        output.flush()?;
    }
    Ok(())
}

fn read(head: &Head, bytes: &[u8]) -> Result<Parsed, Refused> {
    let export = Export {
        path: &head.path,
        bytes,
    };
    match &head.ask {
        Ask::Rule(rule) => restudy_parsers::read(export, rule),
        Ask::Plain(plain) => restudy_parsers::read_plain(export, plain),
    }
}

/// Appends length and bytes.
pub(super) fn put_frame(to: &mut Vec<u8>, bytes: &[u8]) {
    to.extend((bytes.len() as u64).to_le_bytes());
    to.extend(bytes);
}

/// Takes one frame; `None` at a clean end.
pub(super) fn take_frame(from: &mut impl Read) -> io::Result<Option<Vec<u8>>> {
    let mut length = [0; 8];
    let mut got = 0;
    while got < length.len() {
        match from.read(&mut length[got..])? {
            0 if got == 0 => return Ok(None),
            0 => return Err(io::ErrorKind::UnexpectedEof.into()),
            n => got += n,
        }
    }
    let length = u64::from_le_bytes(length);
    if length > FRAME_MAX {
        return Err(io::ErrorKind::InvalidData.into());
    }
    let mut bytes = Vec::new();
    from.take(length).read_to_end(&mut bytes)?;
    if bytes.len() as u64 == length {
        Ok(Some(bytes))
    } else {
        Err(io::ErrorKind::UnexpectedEof.into())
    }
}
