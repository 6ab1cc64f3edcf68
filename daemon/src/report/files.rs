//! Where reports lie, and how a file gets there whole.
//!
//! Invariant: under its own name a file is always whole: it is written and flushed under a temporary one first.

use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use fs_err as fs;
use restudy_parsers::fold;
use sha2::{Digest, Sha256};
use tempfile::NamedTempFile;

use crate::record::hex;

/// Bytes of a file name that every file system takes.
const NAME_MAX: usize = 200;

/// A report that could not be written.
#[derive(Debug, thiserror::Error)]
#[error("the report `{path}` could not be written")]
pub struct WriteError {
    /// The file that was to be.
    pub path: PathBuf,
    /// The system's refusal.
    pub source: io::Error,
}

/// The folder of a plan's reports below the state folder.
#[must_use]
pub fn folder(state: &Path, plan: &str) -> PathBuf {
    state.join("reports").join(file_name(plan))
}

/// Page and records of a round.
#[must_use]
pub fn paths(state: &Path, plan: &str, round: i64) -> (PathBuf, PathBuf) {
    let folder = folder(state, plan);
    (
        folder.join(format!("round-{round:04}.html")),
        folder.join(format!("round-{round:04}.json")),
    )
}

/// Replaces a file as a whole; makes its folder when there is none.
///
/// # Errors
/// The system's refusal; the file is then as it was.
pub(super) fn write(path: &Path, text: &str) -> Result<(), WriteError> {
    replace(path, text).map_err(|source| WriteError {
        path: path.to_owned(),
        source,
    })
}

fn replace(path: &Path, text: &str) -> io::Result<()> {
    let folder = path.parent().unwrap_or(Path::new("."));
    fs::create_dir_all(folder)?;
    let mut builder = tempfile::Builder::new();
    builder.prefix(".report-").suffix(".part");
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o644));
    let mut file: NamedTempFile = builder.tempfile_in(folder)?;
    file.write_all(text.as_bytes())?;
    file.as_file().sync_all()?;
    file.persist(path).map_err(|refused| refused.error)?;
    #[cfg(unix)]
    fs::File::open(folder)?.sync_all()?;
    Ok(())
}

/// A plan's name as a file name: letters a to z, digits and `-` stay, a blank is `_`, every other byte is `=` and
/// its two hexadecimal digits. Names that differ for people (case and runs of blanks apart) differ here.
fn file_name(plan: &str) -> String {
    let name = fold(plan);
    let spelled: String = name
        .bytes()
        .map(|byte| match byte {
            b'a'..=b'z' | b'0'..=b'9' | b'-' => char::from(byte).to_string(),
            b' ' => "_".to_owned(),
            other => format!("={other:02x}"),
        })
        .collect();
    if (1..=NAME_MAX).contains(&spelled.len()) {
        spelled
    } else {
        format!("=={}", hex(&Sha256::digest(&name)))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_plans_never_share_a_folder() {
        let long = "x".repeat(300);
        let longer = "x".repeat(301);
        let plans = [
            "a b",
            "a-b",
            "a_b",
            "a/b",
            "a.b",
            "..",
            ".",
            "é",
            "e",
            "=2f",
            "",
            long.as_str(),
            longer.as_str(),
        ];
        let names: std::collections::BTreeSet<String> =
            plans.iter().map(|p| file_name(p)).collect();
        assert_eq!(names.len(), plans.len());
        assert!(
            names
                .iter()
                .all(|n| n.len() <= NAME_MAX && !n.contains(['/', '.', '\\', '\0']))
        );
    }

    #[test]
    fn paths_are_readable_and_in_order() {
        let (html, json) = paths(Path::new("state"), "Impeller  hub", 7);
        assert_eq!(
            html,
            Path::new("state/reports/impeller_hub/round-0007.html")
        );
        assert_eq!(
            json,
            Path::new("state/reports/impeller_hub/round-0007.json")
        );
    }

    #[test]
    fn a_file_is_replaced_and_nothing_else_is_left() {
        let state = tempfile::tempdir().unwrap();
        let (html, _) = paths(state.path(), "hub", 1);
        write(&html, "first").unwrap();
        write(&html, "second").unwrap();
        assert_eq!(fs::read_to_string(&html).unwrap(), "second");
        assert_eq!(
            fs::read_dir(folder(state.path(), "hub")).unwrap().count(),
            1
        );
    }

    #[test]
    fn a_folder_that_cannot_be_made_is_named() {
        let state = tempfile::tempdir().unwrap();
        fs::write(state.path().join("reports"), "in the way").unwrap();
        let (html, _) = paths(state.path(), "hub", 1);
        let fault = write(&html, "text").unwrap_err();
        assert!(fault.to_string().contains("round-0001.html"), "{fault}");
        assert!(std::error::Error::source(&fault).is_some());
    }
}
