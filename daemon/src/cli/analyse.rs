//! `restudy analyse`: a study from files, without a service.

mod asked;
mod fault;
mod material;
mod nesting;
mod structure;
mod words;

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

use indicatif::{ProgressBar, ProgressFinish, ProgressStyle};
use restudy_engine::{Context, Interaction, Judge, Settings, Standing, Study, Tolerance, remarks};
use restudy_parsers::{Bounds, Export, Parsed, Plain, Refused, SetAside};
use sha2::{Digest as _, Sha256};

use super::{Answer, End, Failure, complain, configuration, preview, print, print_json};
use crate::analyse::study::seconds;
use crate::intake::request::Ask;
use crate::record::{Counts, Judgement, Record, SCHEMA, hex};
use asked::{Asked, OneSidedText, ProcessText};
use fault::Fault;
use material::{File, Gathered, Material, gather, trials};
use nesting::Nesting;
use structure::Structure;
use words::for_people;

/// From so many files on, reading them shows a bar.
const MANY_FILES: usize = 20;
/// Set-aside runs of a file that are told one by one.
const SET_ASIDE_SHOWN: usize = 5;

/// Work a study out from files, without a service
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Examples:
  restudy analyse study.csv
  restudy analyse study.csv --lower 9.95 --upper 10.05 --unit mm --json
  restudy analyse \"GRR/*.xlsx\" --config restudy.toml --instrument bridge-1
  restudy analyse study.csv --factor fixture          a further factor, from the column headed fixture
  restudy analyse broken.csv --within part=appraiser  each appraiser had parts of their own

Without --config the columns are headed part, appraiser, trial, characteristic, value, nominal, lower, upper, unit,
taken (any case, any order; only part and value must be there). The options below fill in what the files do not say.
All factors are random, and crossed unless --within says otherwise. Exit code 1: a file was refused, or a characteristic could not be worked out.")]
pub(super) struct Line {
    /// The files, all of one study
    #[arg(value_name = "FILE", required = true)]
    files: Vec<PathBuf>,
    /// Read them by an instrument's rule from this configuration
    #[arg(long, value_name = "FILE", requires = "instrument")]
    config: Option<PathBuf>,
    /// Whose rule
    #[arg(long, value_name = "NAME", requires = "config")]
    instrument: Option<String>,
    #[command(flatten)]
    asked: Asked,
    /// Lower tolerance limit
    #[arg(long, value_name = "NUMBER", allow_negative_numbers = true)]
    lower: Option<f64>,
    /// Upper tolerance limit
    #[arg(long, value_name = "NUMBER", allow_negative_numbers = true)]
    upper: Option<f64>,
    /// Unit of readings and limits
    #[arg(long, value_name = "UNIT")]
    unit: Option<String>,
    /// Gauge standard deviations that count as its spread
    #[arg(long, value_name = "NUMBER", default_value_t = 6.0)]
    spread_sds: f64,
    /// Confidence of all limits, two-sided
    #[arg(long, value_name = "FRACTION", default_value_t = 0.95)]
    confidence: f64,
    /// Pool the interaction when its p exceeds this; without it the interaction is kept
    #[arg(long, value_name = "FRACTION")]
    pool_above: Option<f64>,
    /// How a one-sided tolerance gets its width: `from zero`, `width=0.1`, `to process mean`, `to study mean`
    #[arg(long, value_name = "RULE")]
    one_sided: Option<OneSidedText>,
    /// The process: its mean and standard deviation `50.01,0.004`, or `study parts`
    #[arg(long, value_name = "MEAN,SD", allow_hyphen_values = true)]
    process: Option<ProcessText>,
    /// Print the study records as JSON
    #[arg(long)]
    json: bool,
}

pub(super) fn run(line: &Line) -> Answer {
    let settings = settings(line)?;
    line.asked.check()?;
    if line.config.is_some() && !line.asked.further.is_empty() {
        return Err(Fault::hinted(
            "--factor does not go with --config; there the instrument's rule says where further factors stand",
            "name them under `factors` in the instrument's `read` table",
        )
        .into());
    }
    let (files, mut end) = read_all(line)?;
    if files.is_empty() {
        return Ok(End::BadNews);
    }
    let material = gather(&files, &line.asked);
    if material.characteristics.is_empty() {
        if line.json {
            print_json::<[Record; 0]>(&[])?;
        }
        return Ok(end);
    }
    let nesting = Nesting::of(&material.factors, &line.asked)?;
    let mut records = Vec::new();
    let mut told = BTreeSet::new();
    for gathered in &material.characteristics {
        let structure = Structure::of(gathered, &nesting);
        if let Ok(structure) = &structure {
            for note in &structure.notes {
                if told.insert(note.clone()) {
                    complain(note, None);
                }
            }
        }
        let record = structure.and_then(|s| study(line, &settings, &material, gathered, &s));
        match record {
            Ok(record) => records.push(record),
            Err(fault) => {
                end = End::BadNews;
                let sentence = format!("{}: {}", gathered.label, fault.sentence);
                complain(&sentence, fault.hint.as_deref());
            }
        }
    }
    if line.json {
        print_json(&records)?;
    } else {
        for record in &records {
            print(&for_people(record))?;
        }
    }
    Ok(end)
}

fn settings(line: &Line) -> Result<Settings, Failure> {
    let fraction = |name: &str, x: f64, least: f64| {
        if x >= least && x > 0.0 && x < 1.0 {
            Ok(x)
        } else {
            Err(Failure::usage(format!(
                "--{name} is {x}; expected a fraction between {least} and 1"
            )))
        }
    };
    if !(line.spread_sds.is_finite() && line.spread_sds > 0.0) {
        return Err(Failure::usage(format!(
            "--spread-sds is {}; expected a number above 0",
            line.spread_sds
        )));
    }
    if let (Some(lower), Some(upper)) = (line.lower, line.upper)
        && lower >= upper
    {
        return Err(Failure::usage(format!(
            "--lower {lower} is not below --upper {upper}"
        )));
    }
    Ok(Settings {
        confidence: fraction("confidence", line.confidence, 0.5)?,
        spread_sds: line.spread_sds,
        interaction: match line.pool_above {
            Some(p) => Interaction::PoolAbove(fraction("pool-above", p, 0.0)?),
            None => Interaction::Keep,
        },
        process: line.process.map(|p| p.0),
        limits: None,
        judge: Judge::Estimate,
    })
}

/// Reads the files; a refused one costs only itself.
fn read_all(line: &Line) -> Result<(Vec<File>, End), Failure> {
    let config = line
        .config
        .as_deref()
        .map(configuration::sound)
        .transpose()?;
    let mut files = Vec::new();
    let mut end = End::Fine;
    let bar = progress(line.files.len());
    for path in bar.wrap_iter(line.files.iter()) {
        let shown = path.display().to_string();
        let outcome = match (&config, &line.instrument) {
            (Some(config), Some(name)) => {
                preview::read_file(preview::instrument(config, name)?, path)?
            }
            _ => read_plain(path, &line.asked.plain())?,
        };
        match outcome {
            Ok(parsed) => {
                for note in &parsed.notes {
                    complain(&format!("{shown}: {note}"), None);
                }
                if !parsed.set_aside.is_empty() {
                    end = End::BadNews;
                    complain_of(&shown, &parsed.set_aside);
                }
                let bytes = fs_err::read(path).map_err(|e| Failure::usage(e.to_string()))?;
                files.push(File {
                    shown,
                    sha256: hex(&Sha256::digest(&bytes)),
                    parsed,
                });
            }
            Err(refused) => {
                end = End::BadNews;
                complain(
                    &format!("{shown}: {}", refused.sentence),
                    refused.hint.as_deref(),
                );
            }
        }
    }
    Ok((files, end))
}

/// The first few runs that were set aside, and how many more.
fn complain_of(file: &str, set_aside: &[SetAside]) {
    for aside in set_aside.iter().take(SET_ASIDE_SHOWN) {
        let sentence = format!("{file}: set aside: {}", aside.reason);
        complain(&sentence, aside.hint.as_deref());
    }
    if let Some(more) = set_aside
        .len()
        .checked_sub(SET_ASIDE_SHOWN)
        .filter(|n| *n > 0)
    {
        complain(&format!("{file}: and {more} more were set aside"), None);
    }
}

/// A bar for many files; hidden when nobody sits at a terminal.
fn progress(files: usize) -> ProgressBar {
    if files < MANY_FILES {
        return ProgressBar::hidden();
    }
    let style = ProgressStyle::with_template("{bar:40} {pos} of {len} files");
    ProgressBar::new(files as u64)
        .with_style(style.unwrap_or_else(|_| ProgressStyle::default_bar()))
        .with_finish(ProgressFinish::AndClear)
}

fn read_plain(path: &Path, plain: &Plain) -> Result<Result<Parsed, Refused>, Failure> {
    let shown = path.to_string_lossy().into_owned();
    preview::read_bytes(path, Bounds::default().file_bytes, |bytes| {
        if restudy_parsers::is_workbook(bytes) {
            return preview::read_workbook(&shown, bytes, &Ask::Plain(plain.clone()));
        }
        Ok(restudy_parsers::read_plain(
            Export {
                path: &shown,
                bytes,
            },
            plain,
        ))
    })
}

fn study(
    line: &Line,
    settings: &Settings,
    material: &Material,
    gathered: &Gathered,
    structure: &Structure,
) -> Result<Record, Fault> {
    let Structure { design, cells, .. } = structure;
    let values: Vec<f64> = gathered.rows.iter().map(|row| row.value).collect();
    let tolerance = Tolerance {
        lower: gathered.lower.or(line.lower),
        upper: gathered.upper.or(line.upper),
        one_sided: line.one_sided.map(|o| o.0),
    };
    if line.one_sided.is_some() && tolerance.lower.is_some() && tolerance.upper.is_some() {
        let name = &gathered.label;
        complain(
            &format!("{name}: --one-sided is not used, both limits are known"),
            None,
        );
    }
    let mut study = restudy_engine::analyse(design, cells, &values, &tolerance, settings)
        .map_err(|e| Fault::new(e.to_string()))?;
    let context = Context {
        factors: structure.names(),
        taken: gathered
            .rows
            .iter()
            .map(|row| row.taken.map(seconds))
            .collect(),
        trials: trials(gathered, cells).unwrap_or_default(),
        unit: gathered.unit.as_deref().or(line.unit.as_deref()),
    };
    study.remarks = remarks(design, cells, &values, &study, &tolerance, &context);
    Ok(Record {
        schema: SCHEMA,
        site: None,
        plan: None,
        round: None,
        revision: None,
        instruments: line.instrument.iter().cloned().collect(),
        measured: material.measured,
        characteristic: gathered.label.clone(),
        unit: gathered.unit.clone().or_else(|| line.unit.clone()),
        nominal: gathered.nominal,
        lower: tolerance.lower,
        upper: tolerance.upper,
        standing: unjudged(&study),
        readings: Counts {
            used: values.len(),
            ..Counts::default()
        },
        study,
        same: material.same.clone(),
        decisions: Vec::new(),
        source: material.source.clone(),
        engine: env!("CARGO_PKG_VERSION"),
    })
}

fn unjudged(study: &Study) -> Judgement {
    let share = &study.figures.gauge.share_of_tolerance;
    let why = match share.estimate {
        Some(_) => "outside a plan there are no limits to judge by",
        None => share
            .why
            .as_deref()
            .unwrap_or("there is no share of tolerance"),
    };
    Judgement {
        now: Standing::NotJudged,
        before: None,
        limits: None,
        judged_by: None,
        why: why.to_owned(),
    }
}
