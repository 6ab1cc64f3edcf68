//! `restudy preview`: how one export maps, without recording anything.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use restudy_config::{Config, Instrument};
use restudy_parsers::{Export, Parsed, Reader, Refused, SetAside};
use serde::Serialize;
use serde::de::DeserializeOwned;

use super::across::{across, against_drawing, bold};
use super::table::table;
use super::{Answer, ConfigPath, End, Failure, complain, configuration, print, print_json};
use crate::intake::file::too_large;
use crate::intake::merge::facts;
use crate::intake::plan_of;
use crate::intake::plausible::{latest, sift};
use crate::intake::request::Ask;
use crate::intake::workbook::{Failure as WorkbookFailure, Workbooks, refusal};
use crate::now::Now;
use crate::rounds::frame::Frame;
use crate::watch::walk::shown;

/// Readings that are shown one by one; the JSON has all.
const READINGS_SHOWN: usize = 40;

/// Show how one export maps to runs and readings, and what would be set aside
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Example:
  restudy preview \"GRR/P03 KL run-2.xlsx\" --config restudy.toml --instrument bridge-1

Nothing is recorded. Exit code 1: the export would be refused.")]
pub(super) struct Line {
    /// The export
    #[arg(value_name = "FILE")]
    file: PathBuf,
    #[command(flatten)]
    config: ConfigPath,
    /// Whose rule to read it by
    #[arg(long, value_name = "NAME")]
    instrument: String,
    /// Print everything as JSON
    #[arg(long)]
    json: bool,
}

#[derive(Serialize)]
struct Shown<'a> {
    runs: Vec<ShownRun<'a>>,
    readings: &'a [restudy_parsers::Reading],
    set_aside: Vec<ShownAside<'a>>,
}

#[derive(Serialize)]
struct ShownRun<'a> {
    part: &'a str,
    appraiser: Option<&'a str>,
    trial: Option<&'a str>,
    factors: &'a BTreeMap<String, String>,
    same: &'a BTreeMap<String, String>,
    taken: Option<jiff::civil::DateTime>,
}

#[derive(Serialize)]
struct ShownAside<'a> {
    place: &'a str,
    found: &'a str,
    expected: &'a str,
    hint: Option<&'a str>,
    reason: &'a str,
}

pub(super) fn run(line: &Line) -> Answer {
    let config = configuration::sound(&line.config.config)?;
    let instrument = instrument(&config, &line.instrument)?;
    match read_file(instrument, &line.file)? {
        Ok(parsed) if line.json => {
            print_json(&as_shown(&parsed))?;
            Ok(End::Fine)
        }
        Ok(parsed) => {
            let path = path_below(instrument, &line.file);
            let parsed = match plan_of(&config.plans, &instrument.name, &path) {
                Some(plan) => sift(parsed, plan, latest(Now::read(), &config.site.zone)),
                None => parsed,
            };
            print(&for_people(&parsed))?;
            for note in &parsed.notes {
                print(&format!("note: {note}\n"))?;
            }
            print(&by_plan(&config, instrument, &path, &parsed))?;
            Ok(End::Fine)
        }
        Err(refused) => {
            if line.json {
                print_json(&BTreeMap::from([("refused", &refused.sentence)]))?;
            } else {
                let sentence = format!("{}: {}", line.file.display(), refused.sentence);
                complain(&sentence, refused.hint.as_deref());
            }
            Ok(End::BadNews)
        }
    }
}

/// The instrument of that name.
pub(super) fn instrument<'a>(config: &'a Config, name: &str) -> Result<&'a Instrument, Failure> {
    config
        .instruments
        .iter()
        .find(|i| i.name == name)
        .ok_or_else(|| {
            let known: Vec<&str> = config.instruments.iter().map(|i| i.name.as_str()).collect();
            Failure::usage(format!(
                "no instrument is called `{name}`; there are: {}",
                known.join(", ")
            ))
        })
}

/// Reads one file by an instrument's rule.
pub(super) fn read_file(
    instrument: &Instrument,
    file: &Path,
) -> Result<Result<Parsed, Refused>, Failure> {
    let path = path_below(instrument, file);
    read_bytes(file, instrument.rule.bounds.file_bytes, |bytes| {
        if restudy_parsers::is_workbook(bytes) {
            return read_workbook(&path, bytes, &Ask::Rule(Box::new(instrument.rule.clone())));
        }
        let reader = Reader::new(&instrument.rule).map_err(|e| Failure::machine(&e))?;
        Ok(reader.read(Export { path: &path, bytes }))
    })
}

/// Reads one file, bounded.
pub(super) fn read_bytes<T>(
    file: &Path,
    bound: u64,
    read: impl FnOnce(&[u8]) -> Result<Result<T, Refused>, Failure>,
) -> Result<Result<T, Refused>, Failure> {
    let usage = |e: std::io::Error| Failure::usage(e.to_string());
    let size = fs_err::metadata(file).map_err(usage)?.len();
    if size > bound {
        return Ok(Err(too_large(size, bound)));
    }
    read(&fs_err::read(file).map_err(usage)?)
}

/// Reads a workbook in the child process.
pub(super) fn read_workbook<T: DeserializeOwned>(
    path: &str,
    bytes: &[u8],
    ask: &Ask,
) -> Result<Result<T, Refused>, Failure> {
    match Workbooks::new().read(path, bytes, ask) {
        Ok(outcome) => Ok(outcome),
        Err(WorkbookFailure::Died(how)) => Ok(Err(refusal(&how, 1))),
        Err(WorkbookFailure::CannotStart(error)) => Err(Failure::machine(&error)),
    }
}

/// The path as the service would see it: below the watched folder when the file lies in one.
fn path_below(instrument: &Instrument, file: &Path) -> String {
    let whole = std::path::absolute(file).unwrap_or_else(|_| file.to_owned());
    let root = instrument.folders.iter().find(|f| whole.starts_with(f));
    match root {
        Some(root) => shown(root, &whole),
        None => file.to_string_lossy().into_owned(),
    }
}

fn as_shown(parsed: &Parsed) -> Shown<'_> {
    Shown {
        runs: parsed
            .runs
            .iter()
            .map(|r| ShownRun {
                part: &r.part,
                appraiser: r.appraiser.as_deref(),
                trial: r.trial.as_deref(),
                factors: &r.factors,
                same: &r.same,
                taken: r.taken,
            })
            .collect(),
        readings: &parsed.readings,
        set_aside: parsed.set_aside.iter().map(shown_aside).collect(),
    }
}

fn shown_aside(aside: &SetAside) -> ShownAside<'_> {
    ShownAside {
        place: &aside.place,
        found: &aside.found,
        expected: &aside.expected,
        hint: aside.hint.as_deref(),
        reason: &aside.reason,
    }
}

fn for_people(parsed: &Parsed) -> String {
    let text = |t: &Option<String>| t.clone().unwrap_or_else(|| "–".into());
    let rows = parsed.runs.iter().enumerate().map(|(index, run)| {
        let readings = parsed.readings.iter().filter(|r| r.run == index).count();
        let others = run.factors.iter().chain(&run.same);
        let others: Vec<String> = others
            .map(|(name, value)| format!("{name} {value}"))
            .collect();
        vec![
            (index + 1).to_string(),
            run.part.clone(),
            text(&run.appraiser),
            text(&run.trial),
            run.taken.map_or_else(
                || "–".into(),
                |t| t.strftime("%Y-%m-%d %H:%M:%S").to_string(),
            ),
            others.join(", "),
            readings.to_string(),
        ]
    });
    let headings = [
        "run",
        "part",
        "appraiser",
        "trial",
        "taken",
        "further",
        "readings",
    ];
    let mut out = table(&headings, &[0, 6], rows.collect());
    out.push('\n');
    out.push_str(&across(parsed));
    out.push('\n');
    let number = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| x.to_string());
    let rows = parsed.readings.iter().take(READINGS_SHOWN).map(|r| {
        vec![
            (r.run + 1).to_string(),
            r.characteristic.clone(),
            r.value.to_string(),
            text(&r.unit),
            number(r.nominal),
            number(r.lower),
            number(r.upper),
            r.origin.clone(),
        ]
    });
    let headings = [
        "run",
        "characteristic",
        "value",
        "unit",
        "nominal",
        "lower",
        "upper",
        "where it stands",
    ];
    out.push_str(&table(&headings, &[0, 2, 4, 5, 6], rows.collect()));
    if parsed.readings.len() > READINGS_SHOWN {
        let more = parsed.readings.len() - READINGS_SHOWN;
        out.push_str(&format!("and {more} more readings (--json has all)\n"));
    }
    if !parsed.set_aside.is_empty() {
        let n: usize = parsed.set_aside.iter().map(|a| a.readings).sum();
        out.push_str(&bold(&format!("\nset aside ({n} readings):\n")));
    }
    for aside in &parsed.set_aside {
        out.push_str(&format!("  {}\n", aside.reason));
        if !aside.reason.contains(&aside.expected) {
            out.push_str(&format!("  expected: {}\n", aside.expected));
        }
        if let Some(hint) = &aside.hint {
            out.push_str(&format!("  hint: {hint}\n"));
        }
    }
    out
}

/// Which plan would take the export, and which of its runs that plan does not know.
fn by_plan(config: &Config, instrument: &Instrument, path: &str, parsed: &Parsed) -> String {
    let Some(plan) = plan_of(&config.plans, &instrument.name, path) else {
        return "\nNo plan takes this export.\n".into();
    };
    let frame = Frame::of(plan);
    let mut out = format!("\nThe plan `{}` takes it.\n", plan.name);
    out.push_str(&against_drawing(plan, parsed));
    for run in &parsed.runs {
        if let Err(unknown) = frame.names(&facts(&instrument.name, run)) {
            out.push_str(&format!(
                "  set aside by the plan: {}: {}\n",
                run.part, unknown.reason
            ));
        }
    }
    out
}
