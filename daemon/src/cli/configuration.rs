//! Reading the configuration file, with the disk that checking may ask.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use restudy_config::{Config, Disk, Fault};

use super::{Failure, complain};

/// The real disk; whether a watched folder that is away (a share not mounted yet) is a fault.
struct RealDisk {
    away_is_a_fault: bool,
}

impl Disk for RealDisk {
    fn is_folder(&self, path: &Path) -> bool {
        path.is_dir() || (!self.away_is_a_fault && !path.exists())
    }

    fn text(&self, path: &Path) -> Result<String, String> {
        fs_err::read_to_string(path).map_err(|e| e.to_string())
    }
}

/// What a configuration file turned out to be: with its warnings, or its faults.
pub(super) type Checked = Result<(Config, Vec<Fault>), Vec<Fault>>;

/// Reads and checks a configuration file.
///
/// # Errors
/// The file cannot be read.
pub(super) fn check(path: &Path) -> Result<Checked, Failure> {
    read(
        path,
        &RealDisk {
            away_is_a_fault: true,
        },
    )
}

fn read(path: &Path, disk: &RealDisk) -> Result<Checked, Failure> {
    let text = fs_err::read_to_string(path).map_err(|e| Failure::Usage {
        sentence: e.to_string(),
        hint: None,
    })?;
    let whole = std::path::absolute(path).unwrap_or_else(|_| path.to_owned());
    let folder = whole.parent().map_or_else(PathBuf::new, Path::to_owned);
    Ok(restudy_config::read(
        &text,
        &path.display().to_string(),
        &folder,
        disk,
    ))
}

/// A sound configuration, even when a watched folder is away just now; its faults are printed otherwise.
///
/// # Errors
/// Faults, or a file that cannot be read.
pub(super) fn sound(path: &Path) -> Result<Arc<Config>, Failure> {
    match read(
        path,
        &RealDisk {
            away_is_a_fault: false,
        },
    )? {
        Ok((config, _)) => Ok(Arc::new(config)),
        Err(faults) => {
            for fault in &faults {
                complain(&fault.to_string(), fault.hint.as_deref());
            }
            let n = faults.len();
            Err(Failure::usage(format!(
                "{}: {n} {}",
                path.display(),
                if n == 1 { "fault" } else { "faults" }
            )))
        }
    }
}
