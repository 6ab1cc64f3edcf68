//! A disk in memory, and faults as one text.

#![allow(dead_code)]

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use restudy_config::{Config, Disk, Fault, read};

/// Folders and files that exist.
#[derive(Default)]
pub(crate) struct Memory {
    pub(crate) folders: Vec<PathBuf>,
    pub(crate) files: BTreeMap<PathBuf, String>,
}

impl Memory {
    pub(crate) fn with_folders(folders: &[&str]) -> Self {
        Self {
            folders: folders.iter().map(PathBuf::from).collect(),
            ..Self::default()
        }
    }
}

impl Disk for Memory {
    fn is_folder(&self, path: &Path) -> bool {
        self.folders.iter().any(|folder| folder == path)
    }

    fn text(&self, path: &Path) -> Result<String, String> {
        self.files
            .get(path)
            .cloned()
            .ok_or_else(|| "no such file".to_owned())
    }
}

/// The folders of Halden Pump Works.
pub(crate) fn halden() -> Memory {
    let mut disk = Memory::with_folders(&[
        "/var/lib/restudy",
        "/srv/exports/bridge-1",
        "/srv/exports/form-2",
    ]);
    disk.files.insert(
        PathBuf::from("/etc/restudy/hub-features.csv"),
        HUB_FEATURES.to_owned(),
    );
    disk
}

pub(crate) const HALDEN: &str = include_str!("../../../fixtures/config/halden.toml");
pub(crate) const HUB_FEATURES: &str = include_str!("../../../fixtures/config/hub-features.csv");

pub(crate) fn read_at_halden(text: &str) -> Result<(Config, Vec<Fault>), Vec<Fault>> {
    read(text, "halden.toml", Path::new("/etc/restudy"), &halden())
}

/// One line a fault, and one for its hint.
pub(crate) fn shown(faults: &[Fault]) -> String {
    let line = |fault: &Fault| match &fault.hint {
        Some(hint) => format!("{fault}\n  hint: {hint}\n"),
        None => format!("{fault}\n"),
    };
    faults.iter().map(line).collect()
}
