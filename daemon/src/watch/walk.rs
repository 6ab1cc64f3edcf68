//! One look through a watched folder and its sub-folders.

use std::ffi::OsStr;
use std::os::unix::ffi::OsStrExt as _;
use std::os::unix::fs::MetadataExt as _;
use std::path::{Path, PathBuf};

use restudy_config::FilePatterns;

use crate::ledger::Stat;

/// Folders further down are not entered.
const DEPTH_MAX: usize = 32;

/// Names that programs give to files they are still writing: common practice, no source.
const TEMPORARY_ENDINGS: [&str; 8] = [
    ".tmp",
    ".temp",
    ".part",
    ".partial",
    ".filepart",
    ".crdownload",
    ".swp",
    "~",
];
const TEMPORARY_STARTS: [&str; 3] = [".", "~$", "#"];

/// A file that an instrument's patterns name.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Found {
    /// Absolute, or as the configuration has it.
    pub path: PathBuf,
    /// Path below the watched folder, with `/`, for people and for `path` roles.
    pub shown: String,
    /// How it looks.
    pub stat: Stat,
}

/// A folder or file that could not be looked at.
#[derive(Debug)]
pub struct Unreadable {
    /// Which.
    pub path: PathBuf,
    /// The system's word for it.
    pub error: std::io::Error,
}

/// Everything below `root`, without following links, that the patterns name and that is not a program's temporary file, by path.
#[must_use]
pub fn walk(root: &Path, patterns: &FilePatterns) -> (Vec<Found>, Vec<Unreadable>) {
    let mut found = Vec::new();
    let mut unreadable = Vec::new();
    let mut folders = vec![(root.to_owned(), 0)];
    while let Some((folder, depth)) = folders.pop() {
        let entries = match fs_err::read_dir(&folder) {
            Ok(entries) => entries,
            Err(error) => {
                unreadable.push(Unreadable {
                    path: folder,
                    error,
                });
                continue;
            }
        };
        for entry in entries.flatten() {
            let path = entry.path();
            let Ok(metadata) = fs_err::symlink_metadata(&path) else {
                continue;
            };
            if metadata.is_dir() {
                if depth < DEPTH_MAX && !hidden(&entry.file_name()) {
                    folders.push((path, depth + 1));
                }
            } else if metadata.is_file() && is_export(&entry.file_name(), patterns) {
                let shown = shown(root, &path);
                found.push(Found {
                    path,
                    shown,
                    stat: stat(&metadata),
                });
            }
        }
    }
    found.sort_by(|a, b| a.path.cmp(&b.path));
    (found, unreadable)
}

/// How a file looks now.
///
/// # Errors
/// The system's refusal, with the path.
pub fn look(path: &Path) -> std::io::Result<Stat> {
    fs_err::symlink_metadata(path).map(|m| stat(&m))
}

fn stat(metadata: &std::fs::Metadata) -> Stat {
    let ns = |secs: i64, ns: i64| secs.saturating_mul(1_000_000_000).saturating_add(ns);
    Stat {
        size: metadata.size(),
        mtime: ns(metadata.mtime(), metadata.mtime_nsec()),
        ctime: ns(metadata.ctime(), metadata.ctime_nsec()),
        device: metadata.dev(),
        inode: metadata.ino(),
    }
}

fn is_export(name: &OsStr, patterns: &FilePatterns) -> bool {
    !temporary(name) && patterns.matches(name)
}

fn hidden(name: &OsStr) -> bool {
    name.as_bytes().starts_with(b".")
}

fn temporary(name: &OsStr) -> bool {
    let name = name.to_string_lossy().to_lowercase();
    TEMPORARY_STARTS.iter().any(|s| name.starts_with(s))
        || TEMPORARY_ENDINGS.iter().any(|e| name.ends_with(e))
}

/// A path below the watched folder as people and `path` roles see it.
#[must_use]
pub fn shown(root: &Path, path: &Path) -> String {
    path.strip_prefix(root)
        .unwrap_or(path)
        .to_string_lossy()
        .into_owned()
}
