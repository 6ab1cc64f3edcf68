//! What we and the child that reads workbooks say to each other: frames of a length and bytes.

use std::io::{self, Read, Write};

use restudy_parsers::{Plain, Rule};
use serde::{Deserialize, Serialize};

/// The hidden command that makes our own program the child.
pub const COMMAND: &str = "read-workbooks";

/// A frame longer than this is nonsense.
const FRAME_MAX: u64 = 4 << 30;

/// How a workbook is to be read.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub enum Ask {
    /// By an instrument's rule.
    Rule(Box<Rule>),
    /// By plain headings.
    Plain(Plain),
    /// Not yet: only shown, sheet by sheet.
    Look,
}

/// What comes before an export's bytes.
#[derive(Debug, Serialize, Deserialize)]
pub struct Head {
    /// Path below the watched folder.
    pub path: String,
    /// How it is to be read.
    pub ask: Ask,
}

/// Writes length and bytes.
pub(super) fn put(to: &mut impl Write, bytes: &[u8]) -> io::Result<()> {
    to.write_all(&(bytes.len() as u64).to_le_bytes())?;
    to.write_all(bytes)
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
