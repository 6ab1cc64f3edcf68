//! The readings of all files, sorted by characteristic.

use std::collections::BTreeMap;

use jiff::civil::DateTime;
use restudy_parsers::{Parsed, fold};

use super::asked::Asked;
use crate::natural;
use crate::record::{Measured, Source};

pub(super) struct File {
    pub(super) shown: String,
    pub(super) sha256: String,
    pub(super) parsed: Parsed,
}

/// All readings of one characteristic, over all files.
#[derive(Default)]
pub(super) struct Gathered {
    pub(super) label: String,
    pub(super) unit: Option<String>,
    pub(super) nominal: Option<f64>,
    pub(super) lower: Option<f64>,
    pub(super) upper: Option<f64>,
    pub(super) rows: Vec<Row>,
    seen: BTreeMap<String, f64>,
    pub(super) fault: Option<String>,
}

/// One reading.
pub(super) struct Row {
    /// Part, appraiser, further factors.
    pub(super) labels: Vec<String>,
    /// Folded.
    pub(super) trial: Option<String>,
    pub(super) taken: Option<DateTime>,
    pub(super) value: f64,
}

/// The readings of all files.
pub(super) struct Material {
    pub(super) factors: Vec<String>,
    pub(super) characteristics: Vec<Gathered>,
    pub(super) measured: Option<Measured>,
    pub(super) same: BTreeMap<String, Vec<String>>,
    pub(super) source: Vec<Source>,
}

pub(super) fn gather(files: &[File], asked: &Asked) -> Material {
    let runs = || files.iter().flat_map(|f| &f.parsed.runs);
    let has_appraiser = runs().any(|r| r.appraiser.is_some());
    let mut further: Vec<String> = runs().flat_map(|r| r.factors.keys().cloned()).collect();
    further.sort();
    further.dedup();
    let mut factors = vec!["part".to_owned()];
    factors.extend(has_appraiser.then(|| "appraiser".to_owned()));
    factors.extend(
        further
            .iter()
            .map(|column| asked.name_of(column).to_owned()),
    );

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

/// Which trial of its cell each reading is: by its label, which every cell must hold once, or else by its time.
pub(super) fn trials(gathered: &Gathered, cells: &[usize]) -> Option<Vec<usize>> {
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
