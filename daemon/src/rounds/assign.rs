//! Which round, cell and trial each run of a plan belongs to.
//!
//! Model: [`assign`] is a pure function of the plan's frame, its closed rounds and every run that no closed
//! round holds. Runs are looked at in the order in which they were *taken* (arrival only breaks ties), so the
//! order of arrival does not matter. A round closes at the first run with which every cell is filled; runs
//! taken later start the next one.
//!
//! Not here: the ledger (`stage`), what a standing is.
//!
//! Invariant: every run given is in exactly one round of the answer, in `late` or in `elsewhere`.

use std::collections::{BTreeSet, HashMap};

use jiff::civil::DateTime;
use restudy_parsers::fold;

use super::fill::{Candidate, Placed, Seat, place};
use super::frame::Frame;
use crate::ledger::{RoundState, RunRow, RunStatus};

/// A round that is closed already.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Closed {
    /// The round.
    pub id: i64,
    /// The export's own name of it.
    pub label: Option<String>,
    /// Latest time of its runs.
    pub through: Option<DateTime>,
}

/// The wall clock, for rounds whose time is up.
///
/// `None` while it is not sure that every export at hand has been read: no round is closed unfinished then.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Clock {
    /// ms since 1970.
    pub now: Option<i64>,
}

/// A round that filled, is filling, or waits.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Laid {
    /// The export's own name of it.
    pub label: Option<String>,
    /// Where it is in its life.
    pub state: RoundState,
    /// Why it is held or unfinished.
    pub reason: Option<String>,
    /// Latest time of its used runs.
    pub through: Option<DateTime>,
    /// Where each of its runs is.
    pub seats: Vec<Seat>,
}

/// Where all runs are.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Assigned {
    /// Rounds in order.
    pub rounds: Vec<Laid>,
    /// Runs of rounds that are closed already.
    pub late: Vec<(i64, Seat)>,
    /// Runs that belong to no round.
    pub elsewhere: Vec<Seat>,
}

/// Lays all runs out in rounds.
///
/// `opened` says when the round of that label, still open, was opened (ms since 1970).
#[must_use]
pub fn assign(
    frame: &Frame,
    closed: &[Closed],
    runs: &[RunRow],
    clock: Clock,
    opened: &dyn Fn(Option<&str>) -> Option<i64>,
) -> Assigned {
    let mut elsewhere = Vec::new();
    let mut late = Vec::new();
    let mut candidates = Vec::new();
    for run in runs {
        if let Some(tie) = &run.tie {
            elsewhere.push(Seat::out(run.id, RunStatus::SetAside, tie.clone()));
            continue;
        }
        match (frame.names(&run.facts), missed(run, closed)) {
            (Err(unknown), _) => {
                elsewhere.push(Seat::out(run.id, RunStatus::SetAside, unknown.reason));
            }
            (Ok(_), Some(round)) => {
                let reason = "arrived after its round was closed".into();
                late.push((round, Seat::out(run.id, RunStatus::Late, reason)));
            }
            (Ok(names), None) => candidates.push(Candidate { run, names }),
        }
    }
    candidates.sort_by_key(|c| (c.run.facts.taken, c.run.id));
    let (labelled, plain): (Vec<_>, Vec<_>) = candidates
        .into_iter()
        .partition(|c| c.run.facts.round_label.is_some());

    let mut rounds = labelled_rounds(frame, labelled, clock, opened);
    let first_ever = closed.is_empty() && rounds.is_empty();
    plain_rounds(
        frame,
        &plain,
        clock,
        opened(None),
        first_ever,
        &mut rounds,
        &mut elsewhere,
    );
    Assigned {
        rounds,
        late,
        elsewhere,
    }
}

/// The closed round that a run came too late for.
fn missed(run: &RunRow, closed: &[Closed]) -> Option<i64> {
    let mut its = closed
        .iter()
        .filter(|c| c.label.as_deref().map(fold) == run.facts.round_label.as_deref().map(fold));
    let round = match (&run.facts.round_label, run.facts.taken) {
        (Some(_), _) => its.next(),
        (None, Some(taken)) => its.find(|c| Some(taken) <= c.through),
        (None, None) => its.next_back(),
    };
    round.map(|c| c.id)
}

fn labelled_rounds(
    frame: &Frame,
    mut candidates: Vec<Candidate<'_>>,
    clock: Clock,
    opened: &dyn Fn(Option<&str>) -> Option<i64>,
) -> Vec<Laid> {
    let label = |c: &Candidate<'_>| c.run.facts.round_label.clone().unwrap_or_default();
    let mut seen = BTreeSet::new();
    let mut order = Vec::new();
    for candidate in &candidates {
        if seen.insert(fold(&label(candidate))) {
            order.push(label(candidate));
        }
    }
    let mut rounds = Vec::new();
    for name in order {
        let (its, rest): (Vec<_>, Vec<_>) = candidates
            .into_iter()
            .partition(|c| fold(&label(c)) == fold(&name));
        candidates = rest;
        let close = filled_by(frame, &its).unwrap_or(its.len());
        let placed = place(frame, &its[..close]);
        let mut laid = lay(frame, Some(name.clone()), placed, &its[..close], true);
        expire(frame, &mut laid, opened(Some(&name)), clock);
        laid.seats.extend(
            its[close..]
                .iter()
                .map(|c| Seat::out(c.run.id, RunStatus::Late, "its round was full".into())),
        );
        rounds.push(laid);
    }
    rounds
}

fn plain_rounds(
    frame: &Frame,
    mut rest: &[Candidate<'_>],
    clock: Clock,
    mut opened: Option<i64>,
    mut opens_at_once: bool,
    rounds: &mut Vec<Laid>,
    elsewhere: &mut Vec<Seat>,
) {
    while !rest.is_empty() {
        let in_time = within_time(frame, rest);
        let end = filled_by(frame, &rest[..in_time]).unwrap_or(in_time);
        let (its, later) = rest.split_at(end);
        rest = later;
        let mut laid = lay(
            frame,
            None,
            place(frame, its),
            its,
            opens_at_once || opened.is_some(),
        );
        let overtaken = end == in_time && parts(later) >= 2 && !laid.state.closed();
        if overtaken && parts(its) < 2 {
            elsewhere.extend(
                its.iter().map(|c| {
                    Seat::out(c.run.id, RunStatus::Surplus, "no round grew from it".into())
                }),
            );
            continue;
        }
        if overtaken {
            unfinish(&mut laid);
        }
        expire(frame, &mut laid, opened.take(), clock);
        opens_at_once = false;
        rounds.push(laid);
    }
}

/// How many of the runs, in order, were taken within the time that a round has.
fn within_time(frame: &Frame, runs: &[Candidate<'_>]) -> usize {
    let (Some(limit), Some(first)) = (
        frame.finish_within,
        runs.iter().find_map(|c| c.run.facts.taken),
    ) else {
        return runs.len();
    };
    let ms = |t: DateTime| {
        (t - first)
            .total(jiff::Unit::Millisecond)
            .unwrap_or(f64::INFINITY)
    };
    runs.iter()
        .position(|c| c.run.facts.taken.is_some_and(|t| ms(t) > limit as f64))
        .unwrap_or(runs.len())
}

/// The smallest number of runs, in order, that fill every cell without a reason to hold.
fn filled_by(frame: &Frame, runs: &[Candidate<'_>]) -> Option<usize> {
    let mut tried = enough_a_cell(frame, runs)?;
    loop {
        let placed = place(frame, &runs[..tried]);
        if placed.filled {
            return placed.hold.is_none().then_some(tried);
        }
        let next = runs[tried..]
            .iter()
            .position(|c| placed.lacking.contains(&c.cell()))?;
        tried += next + 1;
    }
}

/// The smallest number of runs, in order, with which every cell has as many as the plan wants.
fn enough_a_cell(frame: &Frame, runs: &[Candidate<'_>]) -> Option<usize> {
    let mut counts: HashMap<Vec<String>, usize> = HashMap::new();
    let mut full = 0;
    runs.iter()
        .position(|candidate| {
            let count = counts.entry(candidate.cell()).or_default();
            *count += 1;
            full += usize::from(*count == frame.trials);
            full >= frame.cells()
        })
        .map(|last| last + 1)
}

fn lay(
    frame: &Frame,
    label: Option<String>,
    placed: Placed,
    its: &[Candidate<'_>],
    opens_at_once: bool,
) -> Laid {
    let through = its
        .iter()
        .zip(&placed.seats)
        .filter(|(_, seat)| seat.status == RunStatus::Used)
        .filter_map(|(c, _)| c.run.facts.taken)
        .max();
    let state = match (&placed.hold, placed.filled) {
        (Some(_), _) => RoundState::Held,
        (None, true) => RoundState::Complete,
        (None, false) if opens_at_once || label.is_some() || parts(its) >= 2 => RoundState::Open,
        (None, false) => RoundState::Pending,
    };
    debug_assert!(state != RoundState::Complete || its.len() >= frame.cells() * frame.trials);
    let mut laid = Laid {
        label,
        state,
        reason: placed.hold,
        through,
        seats: placed.seats,
    };
    if state == RoundState::Held {
        turn(&mut laid, RunStatus::Held);
    }
    laid
}

fn parts(runs: &[Candidate<'_>]) -> usize {
    runs.iter()
        .map(|c| fold(&c.names[0]))
        .collect::<BTreeSet<String>>()
        .len()
}

fn expire(frame: &Frame, laid: &mut Laid, opened: Option<i64>, clock: Clock) {
    let up = matches!((frame.finish_within, opened, clock.now), (Some(w), Some(o), Some(now)) if now > o.saturating_add(w));
    if up && laid.state == RoundState::Open {
        unfinish(laid);
    }
}

fn unfinish(laid: &mut Laid) {
    laid.state = RoundState::Unfinished;
    laid.reason
        .get_or_insert_with(|| "its time was up before every cell was filled".into());
    turn(laid, RunStatus::Unfinished);
}

fn turn(laid: &mut Laid, status: RunStatus) {
    for seat in &mut laid.seats {
        if matches!(seat.status, RunStatus::Used | RunStatus::Held) {
            seat.status = status;
        }
    }
}
