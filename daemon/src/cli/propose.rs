//! `restudy propose`: drafts an `[[instrument]]` with its `[instrument.read]` from sample exports.
//!
//! Model: each sample is opened (`sample`, `table`, `xml`), its places are given roles by words of the trade
//! (`words`, `roles`), and each role becomes one line (`rule`, `draft`) that says in how many files it was seen. Then
//! the draft is read as a configuration and the samples are read by it, as the service would.
//!
//! Guessing is allowed here and nowhere else; every guess is marked `check`.

mod draft;
mod limits;
mod number;
mod path;
mod read_back;
mod roles;
mod rule;
mod sample;
mod stamp;
mod table;
mod words;
mod xml;

use std::path::{Path, PathBuf};

use restudy_parsers::{Bounds, Cells, Refused};
use serde::Serialize;

use super::preview::{read_bytes, read_workbook};
use super::{Answer, End, Failure, print, print_json};
use crate::intake::request::Ask;
use draft::{Trust, quoted};
use read_back::ReadBack;
use rule::counted;
use sample::{Dress, Sample};

/// Draft the configuration of an instrument from sample exports
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Example:
  restudy propose samples/*.csv > bridge-2.toml

The draft says in how many files each thing was seen; lines marked `check` are guesses. Nothing is recorded.
Exit code 1: a needed role was not found, or not every sample reads by the draft.")]
pub(super) struct Line {
    /// Sample exports of one instrument; several show more than one
    #[arg(value_name = "FILE", required = true)]
    files: Vec<PathBuf>,
    /// Print the draft, its lines and how the samples read by it as JSON
    #[arg(long)]
    json: bool,
}

/// A sample that could not be opened, or that has another form than the first.
#[derive(Debug, Serialize)]
struct Unused {
    file: String,
    reason: String,
}

#[derive(Serialize)]
struct Answered<'a> {
    toml: &'a str,
    lines: &'a [draft::Line],
    read_back: &'a [ReadBack],
    unused: &'a [Unused],
    /// Faults that `check` would find in the draft.
    faults: &'a [String],
}

pub(super) fn run(line: &Line) -> Answer {
    let mut samples = Vec::new();
    let mut unused = Vec::new();
    let mut used = Vec::new();
    for file in &line.files {
        match open(file)? {
            Err(refused) => unused.push(Unused {
                file: name(file),
                reason: refused.sentence,
            }),
            Ok(sample)
                if samples
                    .first()
                    .is_some_and(|first| !same_form(first, &sample)) =>
            {
                unused.push(Unused {
                    file: name(file),
                    reason:
                        "it has another form than the first; one instrument has exports of one form"
                            .into(),
                });
            }
            Ok(sample) => {
                samples.push(sample);
                used.push(file.clone());
            }
        }
    }
    if samples.is_empty() {
        let reasons: Vec<String> = unused
            .iter()
            .map(|u| format!("{}: {}", u.file, u.reason))
            .collect();
        return Err(Failure::usage(format!(
            "no sample can be opened: {}",
            reasons.join("; ")
        )));
    }
    let mut lines = instrument(&used);
    lines.extend(rule::lines(&samples));
    let (read_back, faults) = read_back::read_back(&draft::written(&[], &lines), &used)?;
    let head = head(samples.len(), &lines, &read_back, &unused, &faults);
    let toml = draft::written(&head, &lines);
    if line.json {
        print_json(&Answered {
            toml: &toml,
            lines: &lines,
            read_back: &read_back,
            unused: &unused,
            faults: &faults,
        })?;
    } else {
        print(&toml)?;
    }
    let missing = lines.iter().any(|line| line.trust == Trust::Missing);
    let reads = read_back.iter().all(|file| file.refused.is_none());
    Ok(
        if missing || !reads || !unused.is_empty() || !faults.is_empty() {
            End::BadNews
        } else {
            End::Fine
        },
    )
}

fn open(file: &Path) -> Result<Result<Sample, Refused>, Failure> {
    let shown = name(file);
    read_bytes(file, Bounds::default().file_bytes, |bytes| {
        if restudy_parsers::is_workbook(bytes) {
            let sheets: Result<Vec<Cells>, Refused> = read_workbook(&shown, bytes, &Ask::Look)?;
            return Ok(sheets.and_then(|sheets| sample::of_sheets(&shown, &sheets)));
        }
        Ok(sample::of_text(&shown, bytes))
    })
}

fn name(file: &Path) -> String {
    file.file_name().map_or_else(
        || file.display().to_string(),
        |name| name.to_string_lossy().into_owned(),
    )
}

fn same_form(a: &Sample, b: &Sample) -> bool {
    match (&a.dress, &b.dress) {
        (Dress::Xml { .. }, Dress::Xml { .. }) => true,
        (Dress::Table { delimiter: a, .. }, Dress::Table { delimiter: b, .. }) => {
            a.is_some() == b.is_some()
        }
        _ => false,
    }
}

/// The lines about where the exports come from: all a person's to decide.
fn instrument(files: &[PathBuf]) -> Vec<draft::Line> {
    let put = |key, value: String, note: &str| {
        draft::Line::new("instrument", key, value, Trust::Check, note)
    };
    let folder = files
        .first()
        .and_then(|file| std::path::absolute(file).ok());
    let folder = folder.and_then(|file| file.parent().map(Path::to_owned));
    let folder = folder.map_or_else(|| "exports".to_owned(), |f| f.display().to_string());
    let mut patterns: Vec<String> = files
        .iter()
        .map(|file| match file.extension() {
            Some(ending) => format!("*.{}", ending.to_string_lossy()),
            None => "*".to_owned(),
        })
        .collect();
    patterns.sort();
    patterns.dedup();
    let patterns: Vec<String> = patterns.iter().map(|p| quoted(p)).collect();
    vec![
        put(
            "name",
            quoted("new-instrument"),
            "its name in plans and reports",
        ),
        put(
            "folders",
            format!("[{}]", quoted(&folder)),
            "where the samples lie; the folder to watch",
        ),
        put(
            "files",
            format!("[{}]", patterns.join(", ")),
            "the endings of the samples",
        ),
        put(
            "settle",
            quoted("3s"),
            "how long a file must hold still; depends on the exporter",
        ),
    ]
}

fn head(
    n: usize,
    lines: &[draft::Line],
    read_back: &[ReadBack],
    unused: &[Unused],
    faults: &[String],
) -> Vec<String> {
    let mut head = vec![format!(
        "A draft, from {}. Lines marked `check` are guesses: look at each, then try the rule with `restudy preview`.",
        counted(n, "file")
    )];
    let missing: Vec<&str> = lines
        .iter()
        .filter(|line| line.trust == Trust::Missing)
        .map(|line| line.key)
        .collect();
    if !missing.is_empty() {
        head.push(format!(
            "Not found, and nothing can be read without: {}. Fill in the lines marked MISSING.",
            missing.join(", ")
        ));
    }
    for fault in faults {
        head.push(format!("`restudy check` would say: {fault}"));
    }
    for other in unused {
        head.push(format!("Not used: {}: {}", other.file, other.reason));
    }
    if !read_back.is_empty() {
        let read = read_back
            .iter()
            .filter(|file| file.refused.is_none())
            .count();
        let (mut runs, mut readings, mut aside) = (0, 0, 0);
        for file in read_back {
            runs += file.runs;
            readings += file.readings;
            aside += file.set_aside;
        }
        head.push(format!(
            "Read by this draft, {read} of {}: {}, {}, {aside} set aside.",
            counted(read_back.len(), "file"),
            counted(runs, "run"),
            counted(readings, "reading"),
        ));
    }
    for file in read_back {
        if let Some(sentence) = &file.refused {
            head.push(format!("{}: refused: {sentence}", file.file));
        }
        if let Some(reason) = &file.first_reason {
            head.push(format!("{}: set aside, the first: {reason}", file.file));
        }
    }
    head
}
