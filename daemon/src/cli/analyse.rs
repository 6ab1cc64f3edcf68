//! `restudy analyse`: a study from files, without a service.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::str::FromStr;

use indicatif::{ProgressBar, ProgressFinish, ProgressStyle};
use jiff::civil::DateTime;
use restudy_engine::{
    Context, Design, Factor, Interaction, Judge, Names, OneSided, Process, Settings, Standing,
    Study, Tolerance, remarks,
};
use restudy_parsers::{Bounds, Export, Parsed, Plain, Refused, fold};
use sha2::{Digest as _, Sha256};

use super::table::table;
use super::{Answer, End, Failure, complain, configuration, preview, print, print_json};
use crate::analyse::study::seconds;
use crate::figures::significant;
use crate::intake::workbook::Ask;
use crate::natural;
use crate::record::{Counts, Judgement, Measured, Record, SCHEMA, Source, hex};

/// From so many files on, reading them shows a bar.
const MANY_FILES: usize = 20;

/// Work a study out from files, without a service
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Examples:
  restudy analyse study.csv
  restudy analyse study.csv --lower 9.95 --upper 10.05 --unit mm --json
  restudy analyse \"GRR/*.xlsx\" --config restudy.toml --instrument bridge-1

Without --config the columns are headed part, appraiser, trial, characteristic, value, nominal, lower, upper, unit,
taken (any case, any order; only part and value must be there). The options below fill in what the files do not say.
All factors are random. Exit code 1: a file was refused, or a characteristic could not be worked out.")]
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

#[derive(Debug, Clone, Copy)]
struct OneSidedText(OneSided);

impl FromStr for OneSidedText {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let folded = fold(&text.replace('-', " "));
        match folded.as_str() {
            "from zero" => return Ok(Self(OneSided::FromZero)),
            "to process mean" => return Ok(Self(OneSided::ToProcessMean)),
            "to study mean" => return Ok(Self(OneSided::ToStudyMean)),
            _ => {}
        }
        folded
            .strip_prefix("width")
            .and_then(|rest| rest.trim_start_matches([' ', '=']).parse::<f64>().ok())
            .filter(|w| w.is_finite() && *w > 0.0)
            .map(|w| Self(OneSided::Width(w)))
            .ok_or_else(|| {
                "expected `from zero`, `width=NUMBER`, `to process mean` or `to study mean`".into()
            })
    }
}

#[derive(Debug, Clone, Copy)]
struct ProcessText(Process);

impl FromStr for ProcessText {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        if fold(&text.replace('-', " ")) == "study parts" {
            return Ok(Self(Process::StudyParts));
        }
        let numbers = text.split_once(',').and_then(|(mean, sd)| {
            Some((
                mean.trim().parse::<f64>().ok()?,
                sd.trim().parse::<f64>().ok()?,
            ))
        });
        numbers
            .filter(|(mean, sd)| mean.is_finite() && sd.is_finite() && *sd > 0.0)
            .map(|(mean, sd)| Self(Process::Stated { mean, sd }))
            .ok_or_else(|| "expected `MEAN,SD` with an sd above 0, or `study parts`".into())
    }
}

/// All readings of one characteristic, over all files.
#[derive(Default)]
struct Gathered {
    label: String,
    unit: Option<String>,
    nominal: Option<f64>,
    lower: Option<f64>,
    upper: Option<f64>,
    rows: Vec<Row>,
    seen: BTreeMap<String, f64>,
    fault: Option<String>,
}

/// One reading.
struct Row {
    /// Part, appraiser, further factors.
    labels: Vec<String>,
    trial: Option<String>,
    taken: Option<DateTime>,
    value: f64,
}

/// The readings of all files.
struct Material {
    factors: Vec<String>,
    characteristics: Vec<Gathered>,
    measured: Option<Measured>,
    same: BTreeMap<String, Vec<String>>,
    source: Vec<Source>,
}

pub(super) fn run(line: &Line) -> Answer {
    let settings = settings(line)?;
    let (files, mut end) = read_all(line)?;
    if files.is_empty() {
        return Ok(End::BadNews);
    }
    let material = gather(&files);
    let mut records = Vec::new();
    for gathered in &material.characteristics {
        match study(line, &settings, &material, gathered) {
            Ok(record) => records.push(record),
            Err(sentence) => {
                end = End::BadNews;
                complain(&format!("{}: {sentence}", gathered.label), None);
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
    let fraction = |name: &str, x: f64| {
        if x > 0.0 && x < 1.0 {
            Ok(x)
        } else {
            Err(Failure::usage(format!(
                "--{name} is {x}; expected a fraction between 0 and 1"
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
        confidence: fraction("confidence", line.confidence)?,
        spread_sds: line.spread_sds,
        interaction: match line.pool_above {
            Some(p) => Interaction::PoolAbove(fraction("pool-above", p)?),
            None => Interaction::Keep,
        },
        process: line.process.map(|p| p.0),
        limits: None,
        judge: Judge::Estimate,
    })
}

struct File {
    shown: String,
    sha256: String,
    parsed: Parsed,
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
            _ => read_plain(path)?,
        };
        match outcome {
            Ok(parsed) => {
                for aside in &parsed.set_aside {
                    end = End::BadNews;
                    complain(
                        &format!("{shown}: set aside: {}", aside.reason),
                        aside.hint.as_deref(),
                    );
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

fn read_plain(path: &Path) -> Result<Result<Parsed, Refused>, Failure> {
    let plain = Plain::default();
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
            &plain,
        ))
    })
}

fn gather(files: &[File]) -> Material {
    let runs = || files.iter().flat_map(|f| &f.parsed.runs);
    let has_appraiser = runs().any(|r| r.appraiser.is_some());
    let mut further: Vec<String> = runs().flat_map(|r| r.factors.keys().cloned()).collect();
    further.sort();
    further.dedup();
    let mut factors = vec!["part".to_owned()];
    factors.extend(has_appraiser.then(|| "appraiser".to_owned()));
    factors.extend(further.iter().cloned());

    let mut characteristics: Vec<Gathered> = Vec::new();
    let mut index: BTreeMap<String, usize> = BTreeMap::new();
    for file in files {
        for reading in &file.parsed.readings {
            let run = &file.parsed.runs[reading.run];
            let at = *index
                .entry(fold(&reading.characteristic))
                .or_insert_with(|| {
                    characteristics.push(Gathered {
                        label: reading.characteristic.clone(),
                        unit: reading.unit.clone(),
                        nominal: reading.nominal,
                        lower: reading.lower,
                        upper: reading.upper,
                        ..Gathered::default()
                    });
                    characteristics.len() - 1
                });
            let gathered = &mut characteristics[at];
            let mut labels = vec![run.part.clone()];
            if has_appraiser {
                labels.push(run.appraiser.clone().unwrap_or_default());
            }
            labels.extend(
                further
                    .iter()
                    .map(|f| run.factors.get(f).cloned().unwrap_or_default()),
            );
            gathered.add(labels, run.trial.as_deref(), run.taken, reading);
        }
    }
    let stamps = || runs().filter_map(|r| r.taken);
    let mut same: BTreeMap<String, Vec<String>> = BTreeMap::new();
    for (name, value) in runs().flat_map(|r| &r.same) {
        let values = same.entry(name.clone()).or_default();
        if !values.iter().any(|v| fold(v) == fold(value)) {
            values.push(value.clone());
        }
    }
    Material {
        factors,
        characteristics,
        measured: stamps()
            .min()
            .zip(stamps().max())
            .map(|(first, last)| Measured { first, last }),
        same,
        source: files
            .iter()
            .map(|f| Source {
                export: f.shown.clone(),
                sha256: f.sha256.clone(),
            })
            .collect(),
    }
}

impl Gathered {
    fn add(
        &mut self,
        labels: Vec<String>,
        trial: Option<&str>,
        taken: Option<DateTime>,
        reading: &restudy_parsers::Reading,
    ) {
        if self.unit != reading.unit {
            self.fault.get_or_insert_with(|| {
                let unit = |u: &Option<String>| u.clone().unwrap_or_else(|| "no unit".into());
                format!(
                    "readings come in {} and in {}",
                    unit(&self.unit),
                    unit(&reading.unit)
                )
            });
        }
        if (self.lower, self.upper) != (reading.lower, reading.upper) {
            self.fault.get_or_insert_with(|| {
                format!(
                    "the tolerance limits differ between readings ({})",
                    reading.origin
                )
            });
        }
        if trial.is_some() || taken.is_some() {
            let folded: Vec<String> = labels.iter().map(|l| fold(l)).collect();
            let key = format!("{folded:?}{:?}{taken:?}", trial.map(fold));
            match self.seen.insert(key, reading.value) {
                Some(value) if value == reading.value => return,
                Some(value) => {
                    let who = labels.join(" ");
                    let trial = trial.map(|t| format!(" trial {t}")).unwrap_or_default();
                    self.fault.get_or_insert_with(|| {
                        format!(
                            "{who}{trial} is given twice, as {value} and as {}",
                            reading.value
                        )
                    });
                }
                None => {}
            }
        }
        self.rows.push(Row {
            labels,
            trial: trial.map(fold),
            taken,
            value: reading.value,
        });
    }
}

fn study(
    line: &Line,
    settings: &Settings,
    material: &Material,
    gathered: &Gathered,
) -> Result<Record, String> {
    if let Some(fault) = &gathered.fault {
        return Err(fault.clone());
    }
    let levels: Vec<Vec<String>> = (0..material.factors.len())
        .map(|f| levels(gathered, f))
        .collect();
    let kept: Vec<usize> = (0..levels.len())
        .filter(|&f| f == 0 || levels[f].len() > 1)
        .collect();
    let factors = kept.iter().map(|&f| Factor {
        name: material.factors[f].clone(),
        levels: levels[f].len(),
        within: Vec::new(),
    });
    let design = Design::new(factors.collect()).map_err(|e| e.to_string())?;
    let cell = |labels: &[String]| {
        kept.iter().fold(0, |cell, &f| {
            let name = fold(&labels[f]);
            let level = levels[f].iter().position(|l| *l == name).unwrap_or(0);
            cell * levels[f].len() + level
        })
    };
    let cells: Vec<usize> = gathered.rows.iter().map(|row| cell(&row.labels)).collect();
    let values: Vec<f64> = gathered.rows.iter().map(|row| row.value).collect();
    let tolerance = Tolerance {
        lower: gathered.lower.or(line.lower),
        upper: gathered.upper.or(line.upper),
        one_sided: line.one_sided.map(|o| o.0),
    };
    let mut study = restudy_engine::analyse(&design, &cells, &values, &tolerance, settings)
        .map_err(|e| in_names(&e, material, &kept, gathered))?;
    let spelled: Vec<Vec<&str>> = kept
        .iter()
        .map(|&f| spelled(gathered, f, &levels[f]))
        .collect();
    let unit = gathered.unit.as_deref().or(line.unit.as_deref());
    let context = Context {
        factors: kept
            .iter()
            .zip(spelled)
            .map(|(&f, levels)| Names {
                word: &material.factors[f],
                levels,
            })
            .collect(),
        taken: gathered
            .rows
            .iter()
            .map(|row| row.taken.map(seconds))
            .collect(),
        trials: trials(gathered, &cells).unwrap_or_default(),
        unit,
    };
    study.remarks = remarks(&design, &cells, &values, &study, &tolerance, &context);
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

/// Folded level names in natural order.
fn levels(gathered: &Gathered, factor: usize) -> Vec<String> {
    let mut names: Vec<String> = gathered
        .rows
        .iter()
        .map(|row| fold(&row.labels[factor]))
        .collect();
    names.sort_by(|a, b| natural::compare(a, b));
    names.dedup();
    names
}

/// The levels as they were first written.
fn spelled<'a>(gathered: &'a Gathered, factor: usize, levels: &[String]) -> Vec<&'a str> {
    let labels = || gathered.rows.iter().map(|row| row.labels[factor].as_str());
    levels
        .iter()
        .map(|level| {
            let written = labels().find(|label| fold(label) == *level);
            written.unwrap_or_default()
        })
        .collect()
}

/// Which trial of its cell each reading is: by its label, which every cell must hold once, or else by its time.
fn trials(gathered: &Gathered, cells: &[usize]) -> Option<Vec<usize>> {
    let labelled: Option<Vec<&String>> = gathered.rows.iter().map(|r| r.trial.as_ref()).collect();
    if let Some(labels) = labelled {
        let mut names = labels.clone();
        names.sort_by(|a, b| natural::compare(a, b));
        names.dedup();
        let of_name: BTreeMap<&String, usize> = names.into_iter().zip(0..).collect();
        let most = cells.iter().fold(BTreeMap::new(), |mut counts, cell| {
            *counts.entry(cell).or_insert(0) += 1;
            counts
        });
        let most = most.into_values().max()?;
        return (of_name.len() == most).then(|| labels.iter().map(|l| of_name[*l]).collect());
    }
    let taken: Vec<DateTime> = gathered
        .rows
        .iter()
        .map(|r| r.taken)
        .collect::<Option<_>>()?;
    let mut order: Vec<usize> = (0..cells.len()).collect();
    order.sort_by_key(|&row| (cells[row], taken[row]));
    let mut trials = vec![0; cells.len()];
    for pair in order.windows(2) {
        if cells[pair[0]] == cells[pair[1]] {
            trials[pair[1]] = trials[pair[0]] + 1;
        }
    }
    Some(trials)
}

/// The engine's refusal, with the cells that have fewer readings than others by name.
fn in_names(
    error: &restudy_engine::StudyError,
    material: &Material,
    kept: &[usize],
    gathered: &Gathered,
) -> String {
    let mut counts: BTreeMap<Vec<String>, usize> = BTreeMap::new();
    let all: Vec<Vec<String>> = kept.iter().map(|&f| levels(gathered, f)).collect();
    for combination in all
        .iter()
        .fold(vec![Vec::new()], |cells: Vec<Vec<String>>, names| {
            cells
                .iter()
                .flat_map(|c| {
                    names
                        .iter()
                        .map(|n| c.iter().cloned().chain([n.clone()]).collect())
                })
                .collect()
        })
    {
        counts.insert(combination, 0);
    }
    for row in &gathered.rows {
        let key: Vec<String> = kept.iter().map(|&f| fold(&row.labels[f])).collect();
        *counts.entry(key).or_default() += 1;
    }
    let most = counts.values().copied().max().unwrap_or(0);
    let odd: Vec<String> = counts
        .iter()
        .filter(|(_, n)| **n != most)
        .take(3)
        .map(|(names, n)| {
            let named: Vec<String> = kept
                .iter()
                .zip(names)
                .map(|(&f, n)| format!("{} {n}", material.factors[f]))
                .collect();
            format!("{} has {n} of {most}", named.join(", "))
        })
        .collect();
    if odd.is_empty() {
        error.to_string()
    } else {
        format!("{error} ({})", odd.join("; "))
    }
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

fn for_people(record: &Record) -> String {
    let study = &record.study;
    let layout = &study.design;
    let factors: Vec<String> = layout
        .factors
        .iter()
        .map(|f| format!("{} {}", f.levels, f.name))
        .collect();
    let unit = record
        .unit
        .as_deref()
        .map(|u| format!(" in {u}"))
        .unwrap_or_default();
    let trials = if layout.balanced {
        format!("{} trials", layout.trials)
    } else {
        format!("up to {} trials", layout.trials)
    };
    let mut out = format!(
        "{}: {} × {trials}, {} readings{unit}\n\n",
        record.characteristic,
        factors.join(" × "),
        layout.readings
    );
    let sd = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| significant(x, 4));
    let percent = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| format!("{:.1} %", 100.0 * x));
    let figures = &study.figures;
    let rows = [
        ("EV, repeatability", &figures.repeatability),
        (
            "AV, reproducibility with interaction",
            &figures.reproducibility,
        ),
        ("GRR, gauge", &figures.gauge),
        ("PV, part", &figures.part),
        ("TV, total", &figures.total),
    ];
    let rows = rows.iter().map(|(name, spread)| {
        let tolerance = match name {
            name if name.starts_with("PV") || name.starts_with("TV") => "–".into(),
            _ => percent(spread.share_of_tolerance.estimate),
        };
        vec![
            (*name).to_owned(),
            sd(spread.sd.estimate),
            sd(spread.sd.lower),
            sd(spread.sd.upper),
            tolerance,
            percent(spread.share_of_tv.estimate),
        ]
    });
    let level = format!(
        "{} % limits: lower",
        significant(100.0 * study.confidence, 3)
    );
    let headings = ["", "sd", level.as_str(), "upper", "of tolerance", "of TV"];
    out.push_str(&table(&headings, &[1, 2, 3, 4, 5], rows.collect()));
    let rows = study.mean_squares.iter().map(|line| {
        let p = line.p.map_or_else(
            || "–".into(),
            |p| {
                if p < 0.0001 {
                    "< 0.0001".into()
                } else {
                    format!("{p:.4}")
                }
            },
        );
        vec![
            line.name.to_string(),
            line.df.to_string(),
            significant(line.ss, 5),
            sd(line.ms),
            line.f.map_or_else(|| "–".into(), |f| significant(f, 4)),
            p,
        ]
    });
    if layout.balanced {
        out.push('\n');
        let headings = [
            "mean squares",
            "df",
            "sum of squares",
            "mean square",
            "F",
            "p",
        ];
        out.push_str(&table(&headings, &[1, 2, 3, 4, 5], rows.collect()));
    }
    let share = &figures.gauge.share_of_tolerance;
    out.push('\n');
    match (share.estimate, share.at_least) {
        (Some(estimate), at_least) => out.push_str(&format!(
            "The gauge takes {} of the tolerance; with {} % confidence at least {}.\n",
            percent(Some(estimate)),
            significant(100.0 * study.confidence, 3),
            percent(at_least)
        )),
        (None, _) => {
            let why = share.why.as_deref().unwrap_or("no tolerance is known");
            out.push_str(&format!("Share of tolerance: none ({why}).\n"));
        }
    }
    if let Some(ndc) = study.ndc.whole {
        out.push_str(&format!("ndc {ndc}.\n"));
    }
    for remark in &study.remarks {
        out.push_str(&format!("{}\n", remark.text));
    }
    out.push_str("A study is evidence about the gauge, not a release of product.\n\n");
    out
}
