//! What a round was worked out from: its cells by name, its runs, and every characteristic's readings.
//!
//! Model: loaded from the ledger whole, for analysis, notices and reports alike.
//!
//! Invariant: every used run of the round is in `runs` once, and a feature's three lists have the same length.

use std::collections::{BTreeMap, BTreeSet};

use jiff::civil::DateTime;
use restudy_config::{FactorLevels, Plan};
use restudy_parsers::fold;

use crate::intake::merge::{Merged, tally};
use crate::ledger::{LedgerError, Read, RoundRow, RunRow, RunStatus};
use crate::natural;
use crate::record::{Counts, Measured, Source, hex};
use crate::rounds::frame::Frame;

/// A round's evidence.
#[derive(Debug, Clone)]
pub struct Evidence {
    /// The round; its `revision` is the one this evidence is for.
    pub round: RoundRow,
    /// Whose runs these are.
    pub instruments: Vec<String>,
    /// Part, appraiser, further factors: with their levels by name.
    pub factors: Vec<Factor>,
    /// Planned runs a cell.
    pub trials: usize,
    /// The used runs.
    pub runs: Vec<Run>,
    /// The characteristics, in natural order of their labels.
    pub features: Vec<Feature>,
    /// Distinct values of what must stay the same.
    pub same: BTreeMap<String, Vec<String>>,
    /// The exports.
    pub source: Vec<Source>,
    /// First and last time stamp.
    pub measured: Option<Measured>,
    /// What was not used, one sentence each.
    pub not_used: Vec<String>,
}

/// A factor with the names that people know its levels by.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Factor {
    /// `part`, `appraiser`, or the further factor's name.
    pub name: String,
    /// What the plant calls it.
    pub word: String,
    /// Those that were measured, in the plan's order, or in natural order where the plan only counts them.
    pub levels: Vec<String>,
}

/// A used run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Run {
    /// Level of each factor.
    pub levels: Vec<usize>,
    /// Cell: mixed radix over the factors, the first slowest.
    pub cell: usize,
    /// Which trial of the cell, from 0.
    pub slot: usize,
    /// When it was measured.
    pub taken: Option<DateTime>,
}

/// One characteristic's readings.
#[derive(Debug, Clone, PartialEq)]
pub struct Feature {
    /// Its label as first seen.
    pub label: String,
    /// Of values, nominal and limits.
    pub unit: Option<String>,
    /// As the export states it.
    pub nominal: Option<f64>,
    /// As the export states it.
    pub lower: Option<f64>,
    /// As the export states it.
    pub upper: Option<f64>,
    /// Cell of each value.
    pub cells: Vec<usize>,
    /// Index into [`Evidence::runs`] of each value.
    pub runs: Vec<usize>,
    /// The values.
    pub values: Vec<f64>,
    /// Why the exports contradict each other about unit or limits: a unit that differs makes a study impossible.
    pub unit_differs: Option<String>,
    /// The exported limits or nominal differ between runs: one sentence.
    pub limits_differ: Option<String>,
    /// Used and not used.
    pub counts: Counts,
}

impl Evidence {
    /// Loads a round's evidence.
    ///
    /// # Errors
    /// The ledger's refusal.
    pub fn load(read: Read<'_>, plan: &Plan, round: RoundRow) -> Result<Self, LedgerError> {
        let frame = Frame::of(plan);
        let rows = read.round_runs(round.id)?;
        let seated: Vec<(&RunRow, Vec<String>, usize)> = rows
            .iter()
            .filter(|row| row.place.status == RunStatus::Used)
            .filter_map(|row| Some((row, frame.names(&row.facts).ok()?, row.place.slot?)))
            .collect();
        let factors = factors(&frame, &seated);
        let mut runs = Vec::new();
        let mut features: BTreeMap<String, Feature> = BTreeMap::new();
        for (row, names, slot) in &seated {
            let Some(levels) = levels(&factors, names) else {
                continue;
            };
            let cell = levels
                .iter()
                .zip(&factors)
                .fold(0, |c, (l, f)| c * f.levels.len() + l);
            let counted = row.facts.trial.is_none() && row.facts.taken.is_some();
            let merged = tally(&read.deliveries(row.id)?, counted);
            gather(&mut features, &merged, cell, runs.len());
            runs.push(Run {
                levels,
                cell,
                slot: *slot,
                taken: row.facts.taken,
            });
        }
        for row in rows.iter().filter(|r| r.place.status != RunStatus::Used) {
            for name in row.holds.keys() {
                let Some(feature) = features.get_mut(name) else {
                    continue;
                };
                let count = match row.place.status {
                    RunStatus::Surplus => &mut feature.counts.surplus,
                    RunStatus::Late => &mut feature.counts.late,
                    RunStatus::Excluded => &mut feature.counts.excluded,
                    _ => &mut feature.counts.set_aside,
                };
                *count += 1;
            }
        }
        let mut features: Vec<Feature> = features.into_values().collect();
        features.sort_by(|a, b| natural::compare(&a.label, &b.label));
        let stamps = || runs.iter().filter_map(|r: &Run| r.taken);
        let measured = stamps()
            .min()
            .zip(stamps().max())
            .map(|(first, last)| Measured { first, last });
        let mut not_used: Vec<String> = rows
            .iter()
            .filter(|r| r.place.status != RunStatus::Used)
            .map(why_not)
            .collect();
        not_used.extend(
            read.set_aside_between(&round.plan, round.opened, round.closed)?
                .into_iter()
                .map(|(export, reason)| format!("{export}: {reason}")),
        );
        let superseded: usize = features.iter().map(|f| f.counts.superseded).sum();
        if superseded > 0 {
            not_used.push(format!(
                "{superseded} readings: superseded by later exports of the same runs"
            ));
        }
        Ok(Self {
            instruments: distinct(seated.iter().map(|s| s.0.facts.instrument.as_str())),
            same: same(&seated),
            source: read
                .sources(round.id)?
                .into_iter()
                .map(|(export, digest)| Source {
                    export,
                    sha256: hex(&digest),
                })
                .collect(),
            trials: frame.trials,
            round,
            factors,
            runs,
            features,
            measured,
            not_used,
        })
    }

    /// The factor called `appraiser`, when the plan has one with two levels or more.
    #[must_use]
    pub fn appraiser(&self) -> Option<(usize, &Factor)> {
        self.factors
            .iter()
            .enumerate()
            .find(|(_, f)| f.name == "appraiser" && f.levels.len() > 1)
    }

    /// Runs that the plan wants.
    #[must_use]
    pub fn planned_runs(&self) -> usize {
        self.factors
            .iter()
            .map(|f| f.levels.len())
            .product::<usize>()
            * self.trials
    }
}

fn factors(frame: &Frame, seated: &[(&RunRow, Vec<String>, usize)]) -> Vec<Factor> {
    frame
        .factors
        .iter()
        .enumerate()
        .map(|(f, factor)| {
            let levels = match &factor.levels {
                FactorLevels::Named(names) => {
                    let seen: BTreeSet<&String> =
                        seated.iter().map(|(_, names, _)| &names[f]).collect();
                    names
                        .iter()
                        .map(|l| &l.name)
                        .filter(|n| seen.contains(n))
                        .cloned()
                        .collect()
                }
                FactorLevels::Count(_) => {
                    let mut seen = BTreeMap::new();
                    for (_, names, _) in seated {
                        seen.entry(fold(&names[f]))
                            .or_insert_with(|| names[f].clone());
                    }
                    let mut names: Vec<String> = seen.into_values().collect();
                    names.sort_by(|a, b| natural::compare(a, b));
                    names
                }
            };
            Factor {
                name: factor.name.clone(),
                word: factor.word.clone(),
                levels,
            }
        })
        .collect()
}

fn levels(factors: &[Factor], names: &[String]) -> Option<Vec<usize>> {
    factors
        .iter()
        .zip(names)
        .map(|(factor, name)| {
            let name = fold(name);
            factor.levels.iter().position(|level| fold(level) == name)
        })
        .collect()
}

fn gather(features: &mut BTreeMap<String, Feature>, merged: &Merged, cell: usize, run: usize) {
    for (name, reading) in &merged.values {
        let feature = features.entry(name.clone()).or_insert_with(|| Feature {
            label: reading.characteristic.clone(),
            unit: reading.unit.clone(),
            nominal: reading.nominal,
            lower: reading.lower,
            upper: reading.upper,
            cells: Vec::new(),
            runs: Vec::new(),
            values: Vec::new(),
            unit_differs: None,
            limits_differ: None,
            counts: Counts::default(),
        });
        if feature.unit != reading.unit {
            let unit = |u: &Option<String>| u.clone().unwrap_or_else(|| "no unit".into());
            feature.unit_differs.get_or_insert_with(|| {
                format!(
                    "its readings come in {} and in {}",
                    unit(&feature.unit),
                    unit(&reading.unit)
                )
            });
        }
        let stated = |f: &Feature| (f.nominal, f.lower, f.upper);
        if stated(feature) != (reading.nominal, reading.lower, reading.upper) {
            feature.limits_differ.get_or_insert_with(|| {
                format!(
                    "the exports state different limits: {} and {}",
                    limits(feature.nominal, feature.lower, feature.upper),
                    limits(reading.nominal, reading.lower, reading.upper)
                )
            });
        }
        feature.cells.push(cell);
        feature.runs.push(run);
        feature.values.push(reading.value);
        feature.counts.used += 1;
    }
    for name in &merged.replaced {
        if let Some(feature) = features.get_mut(name) {
            feature.counts.superseded += 1;
        }
    }
}

fn limits(nominal: Option<f64>, lower: Option<f64>, upper: Option<f64>) -> String {
    let text = |x: Option<f64>| x.map_or("none".into(), |x| x.to_string());
    format!(
        "nominal {}, {} to {}",
        text(nominal),
        text(lower),
        text(upper)
    )
}

fn why_not(row: &RunRow) -> String {
    let reason = row.place.reason.as_deref().unwrap_or("not used");
    format!(
        "{}: {}: {reason}",
        row.facts.who(),
        row.place.status.as_str()
    )
}

fn same(seated: &[(&RunRow, Vec<String>, usize)]) -> BTreeMap<String, Vec<String>> {
    let names: BTreeSet<&String> = seated.iter().flat_map(|s| s.0.facts.same.keys()).collect();
    names
        .into_iter()
        .map(|name| {
            let values = seated
                .iter()
                .filter_map(|s| s.0.facts.same.get(name))
                .map(String::as_str);
            (name.clone(), distinct(values))
        })
        .collect()
}

fn distinct<'a>(texts: impl Iterator<Item = &'a str>) -> Vec<String> {
    let mut seen = BTreeSet::new();
    texts
        .filter(|t| seen.insert(fold(t)))
        .map(str::to_owned)
        .collect()
}
