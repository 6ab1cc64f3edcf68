//! The samples, read by the draft as the service would read them.

use std::path::{Path, PathBuf};

use restudy_config::{Config, Disk};
use serde::Serialize;

use crate::cli::Failure;
use crate::cli::preview::read_file;

/// How one sample reads.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub(super) struct ReadBack {
    pub(super) file: String,
    pub(super) runs: usize,
    pub(super) readings: usize,
    /// Readings set aside.
    pub(super) set_aside: usize,
    /// Why the first was set aside.
    pub(super) first_reason: Option<String>,
    /// Why the whole file is refused.
    pub(super) refused: Option<String>,
}

/// What an instrument needs around it to be a configuration; none of it matters for reading.
const AROUND: &str = r#"
[[plan]]
name = "draft"
instruments = ["new-instrument"]
parts = 2
trials = 2
interaction = "keep"
limits = { watch = 0.1, act = 0.3 }
"#;
const BEFORE: &str =
    "site = { name = \"draft\", zone = \"UTC\" }\nstate = { folder = \"state of the draft\" }\n";

/// Every folder is taken to be there.
struct AllThere;

impl Disk for AllThere {
    fn is_folder(&self, _: &Path) -> bool {
        true
    }

    fn text(&self, path: &Path) -> Result<String, String> {
        Err(format!("{} is not read", path.display()))
    }
}

/// Reads the samples by the draft; nothing when the draft has faults, which are told instead.
pub(super) fn read_back(
    draft: &str,
    files: &[PathBuf],
) -> Result<(Vec<ReadBack>, Vec<String>), Failure> {
    let has_appraiser = draft.lines().any(|line| line.starts_with("appraiser "));
    let appraisers = if has_appraiser {
        "appraisers = 2\n"
    } else {
        ""
    };
    let text = format!("{BEFORE}{draft}{AROUND}{appraisers}");
    let root = if cfg!(windows) { "C:\\" } else { "/" };
    let config: Config = match restudy_config::read(&text, "the draft", Path::new(root), &AllThere)
    {
        Ok((config, _)) => config,
        Err(faults) => {
            // What is missing is marked so in the draft already.
            let told = faults
                .iter()
                .filter(|fault| {
                    !matches!(
                        fault.key.as_str(),
                        "instrument.read.part" | "instrument.read.value"
                    )
                })
                .map(ToString::to_string);
            return Ok((Vec::new(), told.collect()));
        }
    };
    let Some(instrument) = config.instruments.first() else {
        return Ok((Vec::new(), Vec::new()));
    };
    let read = files.iter().map(|file| {
        let name = super::name(file);
        Ok(match read_file(instrument, file)? {
            Ok(parsed) => ReadBack {
                file: name,
                runs: parsed.runs.len(),
                readings: parsed.readings.len(),
                set_aside: parsed.set_aside.iter().map(|aside| aside.readings).sum(),
                first_reason: parsed.set_aside.first().map(|aside| aside.reason.clone()),
                refused: None,
            },
            Err(refused) => ReadBack {
                file: name,
                runs: 0,
                readings: 0,
                set_aside: 0,
                first_reason: None,
                refused: Some(refused.sentence),
            },
        })
    });
    let read: Result<Vec<ReadBack>, Failure> = read.collect();
    Ok((read?, Vec::new()))
}
