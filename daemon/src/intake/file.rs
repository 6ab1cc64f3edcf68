//! Reading a settled file once, whole, and only if it held still meanwhile.

use std::io::Read as _;
use std::path::Path;

use restudy_parsers::Refused;

use crate::ledger::Stat;
use crate::watch::walk::look;

/// What reading a file gave.
#[derive(Debug)]
pub enum Content {
    /// All its bytes; it looked the same before and after.
    Bytes(Vec<u8>),
    /// More than the rule allows.
    TooLarge,
    /// It changed or went while it was read.
    Changed,
    /// The system's refusal.
    Unreadable(std::io::Error),
}

/// Reads a file that looked like `stat` when it had settled.
#[must_use]
pub fn read_still(path: &Path, stat: &Stat, bound: u64) -> Content {
    if stat.size > bound {
        return Content::TooLarge;
    }
    let mut bytes = Vec::with_capacity(usize::try_from(stat.size).unwrap_or(0));
    let read = open(path).and_then(|f| f.take(bound + 1).read_to_end(&mut bytes));
    match (read, look(path)) {
        (Ok(_), Ok(after)) if after == *stat && bytes.len() as u64 == stat.size => {
            Content::Bytes(bytes)
        }
        (Ok(_), Ok(_)) => Content::Changed,
        (Err(error), _) | (_, Err(error)) if error.kind() == std::io::ErrorKind::NotFound => {
            Content::Changed
        }
        (Err(error), _) | (_, Err(error)) => Content::Unreadable(error),
    }
}

/// Opens a file, but follows no link: what it points to may be no export.
fn open(path: &Path) -> std::io::Result<fs_err::File> {
    use fs_err::os::unix::fs::OpenOptionsExt as _;
    let follow_none = rustix::fs::OFlags::NOFOLLOW.bits().cast_signed();
    fs_err::OpenOptions::new()
        .read(true)
        .custom_flags(follow_none)
        .open(path)
}

/// The refusal of a file that the service's user may not read.
#[must_use]
pub fn forbidden() -> Refused {
    Refused {
        sentence: "the file may not be read by the service's user".into(),
        hint: Some("give that user the right to read it; it is looked at again then".into()),
        perhaps_unfinished: false,
    }
}

/// The refusal of a file that is larger than the rule allows.
#[must_use]
pub fn too_large(size: u64, bound: u64) -> Refused {
    Refused {
        sentence: format!("the file has {size} bytes; an export may have up to {bound}"),
        hint: Some("split the export, or raise `bounds` for this instrument".into()),
        perhaps_unfinished: false,
    }
}
