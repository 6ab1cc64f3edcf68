//! One round's runs in their cells: which fills which trial, which is surplus or short, what holds the round.

use std::collections::{BTreeMap, BTreeSet};

use restudy_config::FactorLevels;
use restudy_parsers::fold;

use super::frame::Frame;
use crate::ledger::{Holds, RunRow, RunStatus};

/// A run with its level names in the plan's spelling.
pub(super) struct Candidate<'a> {
    pub(super) run: &'a RunRow,
    pub(super) names: Vec<String>,
}

impl Candidate<'_> {
    /// Its cell, folded.
    pub(super) fn cell(&self) -> Vec<String> {
        self.names.iter().map(|name| fold(name)).collect()
    }
}

/// Where one run is.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Seat {
    /// The run.
    pub run: i64,
    /// Where its readings end up.
    pub status: RunStatus,
    /// Which trial of its cell, from 0, when it fills one.
    pub slot: Option<usize>,
    /// Why it fills none.
    pub reason: Option<String>,
}

impl Seat {
    pub(super) fn out(run: i64, status: RunStatus, reason: String) -> Self {
        Self {
            run,
            status,
            slot: None,
            reason: Some(reason),
        }
    }

    fn fills(run: i64, slot: usize) -> Self {
        Self {
            run,
            status: RunStatus::Used,
            slot: Some(slot),
            reason: None,
        }
    }
}

/// Runs in their cells.
pub(super) struct Placed {
    /// One a run, in the order given.
    pub(super) seats: Vec<Seat>,
    /// Every trial of every cell has a run with every characteristic.
    pub(super) filled: bool,
    /// Cells with a run whose trial is not filled.
    pub(super) lacking: BTreeSet<Vec<String>>,
    /// Why the round must wait for a person.
    pub(super) hold: Option<String>,
}

pub(super) fn place(frame: &Frame, runs: &[Candidate<'_>]) -> Placed {
    let expected = expected(frame, runs);
    let mut seats: Vec<Option<Seat>> = odd_units(runs);
    let mut cells: BTreeMap<Vec<String>, Vec<usize>> = BTreeMap::new();
    for (index, candidate) in runs.iter().enumerate().filter(|(i, _)| seats[*i].is_none()) {
        cells.entry(candidate.cell()).or_default().push(index);
    }
    let mut filled_slots = 0;
    let mut lacking = BTreeSet::new();
    for (cell, members) in cells {
        let filled = fill_cell(frame, runs, &members, &expected, &mut seats);
        filled_slots += filled;
        if filled < frame.trials {
            lacking.insert(cell);
        }
    }
    let seats: Vec<Seat> = seats.into_iter().flatten().collect();
    debug_assert_eq!(seats.len(), runs.len());
    let hold = too_many_levels(frame, runs).or_else(|| same_differs(runs, &seats));
    Placed {
        filled: filled_slots == frame.cells() * frame.trials,
        lacking,
        seats,
        hold,
    }
}

fn expected(frame: &Frame, runs: &[Candidate<'_>]) -> BTreeSet<String> {
    match &frame.whole_list {
        Some(list) => list.clone(),
        None => {
            let distinct: BTreeSet<&Holds> = runs.iter().map(|c| &c.run.holds).collect();
            distinct
                .into_iter()
                .flat_map(|holds| holds.keys().cloned())
                .collect()
        }
    }
}

/// Seats the runs of one cell; answers with the number of trials that are filled.
fn fill_cell(
    frame: &Frame,
    runs: &[Candidate<'_>],
    members: &[usize],
    expected: &BTreeSet<String>,
    seats: &mut [Option<Seat>],
) -> usize {
    let complete = |i: usize| {
        expected
            .iter()
            .all(|name| runs[i].run.holds.contains_key(name))
    };
    let mut slots: Vec<Option<usize>> = vec![None; frame.trials];
    // Complete runs first; a short one gets a trial only where no complete run claims it.
    let (whole, short): (Vec<usize>, Vec<usize>) = members.iter().partition(|&&i| complete(i));
    for &index in whole.iter().chain(&short) {
        let run = runs[index].run;
        let is_short = !complete(index);
        let claimed = match &run.facts.trial {
            Some(label) => match stated_slot(label, frame.trials) {
                Ok(slot) => slots[slot].is_none().then_some(slot),
                Err(seat) => {
                    seats[index] = Some(Seat::out(run.id, seat.0, seat.1));
                    continue;
                }
            },
            None => slots.iter().position(Option::is_none),
        };
        seats[index] = Some(match claimed {
            Some(_) if is_short && frame.whole_list.is_some() => {
                Seat::out(run.id, RunStatus::SetAside, shortfall(&run.holds, expected))
            }
            None if is_short => {
                Seat::out(run.id, RunStatus::SetAside, shortfall(&run.holds, expected))
            }
            Some(slot) => {
                slots[slot] = Some(index);
                Seat::fills(run.id, slot)
            }
            None => Seat::out(
                run.id,
                RunStatus::Surplus,
                "its cell had enough runs".into(),
            ),
        });
    }
    slots.iter().flatten().filter(|&&i| complete(i)).count()
}

fn stated_slot(label: &str, trials: usize) -> Result<usize, (RunStatus, String)> {
    match label.trim().parse::<usize>() {
        Ok(n) if (1..=trials).contains(&n) => Ok(n - 1),
        Ok(n) if n > trials => Err((
            RunStatus::Surplus,
            format!("trial {n}; the plan has {trials}"),
        )),
        _ => Err((
            RunStatus::SetAside,
            format!("trial `{label}` is not a number from 1 to {trials}"),
        )),
    }
}

fn shortfall(holds: &Holds, expected: &BTreeSet<String>) -> String {
    let has = expected
        .iter()
        .filter(|name| holds.contains_key(*name))
        .count();
    let first = expected.iter().find(|name| !holds.contains_key(*name));
    let first = first.map(String::as_str).unwrap_or_default();
    format!(
        "short: {has} of {} characteristics; `{first}` is missing",
        expected.len()
    )
}

/// Runs with a value in another unit than most runs' values of that characteristic.
fn odd_units(runs: &[Candidate<'_>]) -> Vec<Option<Seat>> {
    let mut counts: BTreeMap<&str, BTreeMap<&Option<String>, usize>> = BTreeMap::new();
    for candidate in runs {
        for (name, unit) in &candidate.run.holds {
            *counts.entry(name).or_default().entry(unit).or_default() += 1;
        }
    }
    counts.retain(|_, units| units.len() > 1);
    let usual: BTreeMap<&str, &Option<String>> = counts
        .into_iter()
        .filter_map(|(name, units)| Some((name, units.into_iter().max_by_key(|(_, n)| *n)?.0)))
        .collect();
    let odd = |run: &RunRow| {
        run.holds.iter().find_map(|(name, unit)| {
            let usual = usual.get(name.as_str()).filter(|usual| **usual != unit)?;
            let text = |u: &Option<String>| u.clone().unwrap_or_else(|| "no unit".into());
            let reason = format!(
                "`{name}` comes in {}, in the other runs in {}; export it again in that unit",
                text(unit),
                text(usual)
            );
            Some(Seat::out(run.id, RunStatus::SetAside, reason))
        })
    };
    runs.iter().map(|candidate| odd(candidate.run)).collect()
}

fn too_many_levels(frame: &Frame, runs: &[Candidate<'_>]) -> Option<String> {
    frame.factors.iter().enumerate().find_map(|(f, factor)| {
        let FactorLevels::Count(planned) = factor.levels else {
            return None;
        };
        let mut seen = BTreeSet::new();
        let extra = runs
            .iter()
            .find(|c| seen.insert(fold(&c.names[f])) && seen.len() > planned)?;
        Some(format!(
            "`{}` is {} number {}; the plan has {planned}",
            extra.names[f],
            factor.word,
            planned + 1
        ))
    })
}

fn same_differs(runs: &[Candidate<'_>], seats: &[Seat]) -> Option<String> {
    let mut values: BTreeMap<&str, BTreeMap<String, (&str, usize)>> = BTreeMap::new();
    for (candidate, seat) in runs.iter().zip(seats) {
        if seat.status != RunStatus::Used {
            continue;
        }
        for (name, value) in &candidate.run.facts.same {
            values
                .entry(name)
                .or_default()
                .entry(fold(value))
                .or_insert((value, 0))
                .1 += 1;
        }
    }
    values
        .into_iter()
        .find(|(_, distinct)| distinct.len() > 1)
        .map(|(name, distinct)| {
            let list: Vec<String> = distinct
                .values()
                .map(|(value, n)| {
                    format!("`{value}` in {n} {}", if *n == 1 { "run" } else { "runs" })
                })
                .collect();
            format!(
                "{name} must stay the same within a round, but is {}",
                list.join(", ")
            )
        })
}
