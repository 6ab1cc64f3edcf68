//! What an open round still lacks, by the names people can walk to.

use std::collections::{BTreeMap, BTreeSet};

use restudy_config::FactorLevels;
use restudy_parsers::fold;

use super::frame::Frame;
use crate::ledger::{RunRow, RunStatus};
use crate::natural;

/// A cell, or a whole level that no run has shown yet, and what it lacks.
#[derive(Debug, Clone, PartialEq, Eq, serde::Serialize)]
pub struct Missing {
    /// `null`: a part that the plan counts but no run has named yet.
    pub part: Option<String>,
    /// `null`: the plan has no appraisers, or counts one that no run has named yet.
    pub appraiser: Option<String>,
    /// Levels of further factors.
    pub factors: BTreeMap<String, Option<String>>,
    /// Which trials, from 1.
    pub trials: Vec<usize>,
    /// Characteristics that the run of these trials lacks; empty: there is no run.
    pub characteristics: Vec<String>,
}

/// Every cell of the frame that lacks something, given the runs of the round.
#[must_use]
pub fn missing(frame: &Frame, runs: &[RunRow]) -> Vec<Missing> {
    let seated: Vec<(Vec<String>, usize, &RunRow)> = runs
        .iter()
        .filter(|r| matches!(r.place.status, RunStatus::Used | RunStatus::Held))
        .filter_map(|r| Some((frame.names(&r.facts).ok()?, r.place.slot?, r)))
        .collect();
    let expected: BTreeSet<&String> = match &frame.whole_list {
        Some(list) => list.iter().collect(),
        None => seated.iter().flat_map(|s| s.2.holds.keys()).collect(),
    };
    let mut taken: BTreeMap<(Vec<String>, usize), &RunRow> = BTreeMap::new();
    for (names, slot, run) in &seated {
        taken.insert((names.iter().map(|n| fold(n)).collect(), *slot), run);
    }
    let levels: Vec<Vec<Option<String>>> = (0..frame.factors.len())
        .map(|f| levels(frame, f, &seated))
        .collect();
    let mut out = Vec::new();
    for cell in cells(&levels) {
        let key: Vec<String> = cell
            .iter()
            .map(|l| l.as_deref().map(fold).unwrap_or_default())
            .collect();
        let mut absent = Vec::new();
        for slot in 0..frame.trials {
            match taken.get(&(key.clone(), slot)) {
                None => absent.push(slot + 1),
                Some(run) => {
                    let lacks: Vec<String> = expected
                        .iter()
                        .filter(|c| !run.holds.contains_key(**c))
                        .map(|c| (*c).clone())
                        .collect();
                    if !lacks.is_empty() {
                        out.push(entry(frame, &cell, vec![slot + 1], lacks));
                    }
                }
            }
        }
        if !absent.is_empty() {
            out.push(entry(frame, &cell, absent, Vec::new()));
        }
    }
    out
}

/// The level names of a factor; `None` for each that is planned and not seen yet.
fn levels(
    frame: &Frame,
    f: usize,
    seated: &[(Vec<String>, usize, &RunRow)],
) -> Vec<Option<String>> {
    match &frame.factors[f].levels {
        FactorLevels::Named(names) => names.iter().map(|l| Some(l.name.clone())).collect(),
        FactorLevels::Count(n) => {
            let mut seen = BTreeMap::new();
            for (names, ..) in seated {
                seen.entry(fold(&names[f]))
                    .or_insert_with(|| names[f].clone());
            }
            let mut names: Vec<String> = seen.into_values().collect();
            names.sort_by(|a, b| natural::compare(a, b));
            let unseen = n.saturating_sub(names.len());
            names
                .into_iter()
                .map(Some)
                .chain(std::iter::repeat_n(None, unseen))
                .collect()
        }
    }
}

fn cells(levels: &[Vec<Option<String>>]) -> Vec<Vec<Option<String>>> {
    levels.iter().fold(vec![Vec::new()], |cells, factor| {
        cells
            .into_iter()
            .flat_map(|cell| {
                factor.iter().map(move |level| {
                    let mut cell = cell.clone();
                    cell.push(level.clone());
                    cell
                })
            })
            .collect()
    })
}

fn entry(
    frame: &Frame,
    cell: &[Option<String>],
    trials: Vec<usize>,
    characteristics: Vec<String>,
) -> Missing {
    let mut missing = Missing {
        part: None,
        appraiser: None,
        factors: BTreeMap::new(),
        trials,
        characteristics,
    };
    for (factor, level) in frame.factors.iter().zip(cell) {
        match factor.name.as_str() {
            "part" => missing.part.clone_from(level),
            "appraiser" => missing.appraiser.clone_from(level),
            other => {
                missing.factors.insert(other.to_owned(), level.clone());
            }
        }
    }
    missing
}
