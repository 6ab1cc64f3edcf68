//! Rules that no compiler knows: who may import whom, where clocks and SQL are, that every fixture names its
//! origin; and the checks that need the toolchain's own tools.

#![allow(
    clippy::unwrap_used,
    reason = "a helper of a test fails as the test does"
)]

mod sources;
mod tools;
mod tree;

use std::path::{Path, PathBuf};

/// The project's root.
fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .parent()
        .map(Path::to_path_buf)
        .unwrap()
}

/// Every file below a folder, without what is built.
fn files(folder: &Path) -> Vec<PathBuf> {
    let mut files = Vec::new();
    let mut folders = vec![folder.to_owned()];
    while let Some(folder) = folders.pop() {
        for entry in fs_err::read_dir(&folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                if !path.ends_with("target") && !path.ends_with(".git") {
                    folders.push(path);
                }
            } else {
                files.push(path);
            }
        }
    }
    files.sort();
    files
}
