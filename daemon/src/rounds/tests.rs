//! Rounds as tables of runs; none of these touches a ledger.

use std::collections::BTreeMap;

use restudy_config::{FactorLevels, Label};

use super::assign::{Assigned, Clock, Closed, assign};
use super::fill::Seat;
use super::frame::{Frame, FrameFactor};
use super::missing::missing;
use crate::ledger::{Placement, RoundState, RunFacts, RunRow, RunStatus};

fn named(names: &[&str]) -> FactorLevels {
    let label = |n: &&str| Label {
        name: (*n).into(),
        spellings: Vec::new(),
    };
    FactorLevels::Named(names.iter().map(label).collect())
}

fn frame(parts: FactorLevels, trials: usize) -> Frame {
    let factor = |name: &str, word: &str, levels| FrameFactor {
        name: name.into(),
        word: word.into(),
        levels,
    };
    Frame {
        factors: vec![
            factor("part", "part", parts),
            factor("appraiser", "loading", named(&["KL", "MO"])),
        ],
        trials,
        whole_list: None,
        finish_within: None,
    }
}

/// A run written as "part appraiser trial minute"; trial `-` is counted.
fn run(id: i64, text: &str) -> RunRow {
    let words: Vec<&str> = text.split(' ').collect();
    let minute: i8 = words[3].parse().unwrap();
    RunRow {
        id,
        key: text.into(),
        facts: RunFacts {
            instrument: "bridge-1".into(),
            part: words[0].into(),
            appraiser: Some(words[1].into()),
            trial: (words[2] != "-").then(|| words[2].into()),
            factors: BTreeMap::new(),
            same: BTreeMap::new(),
            taken: Some(jiff::civil::date(2026, 3, 2).at(8, minute, 0, 0)),
            round_label: None,
        },
        holds: [("bore a".to_owned(), Some("mm".to_owned()))].into(),
        tie: None,
        changed: false,
        place: Placement {
            round: None,
            slot: None,
            status: RunStatus::Used,
            reason: None,
        },
    }
}

fn runs(texts: &[&str]) -> Vec<RunRow> {
    (1..).zip(texts).map(|(id, text)| run(id, text)).collect()
}

fn laid(frame: &Frame, runs: &[RunRow]) -> Assigned {
    assign(frame, &[], runs, Clock { now: Some(0) }, &|_| None)
}

fn status(assigned: &Assigned, id: i64) -> &Seat {
    let in_rounds = assigned.rounds.iter().flat_map(|r| &r.seats);
    let late = assigned.late.iter().map(|(_, seat)| seat);
    in_rounds
        .chain(late)
        .chain(&assigned.elsewhere)
        .find(|s| s.run == id)
        .unwrap()
}

const FULL: [&str; 8] = [
    "P1 KL - 1",
    "P1 MO - 2",
    "P2 KL - 3",
    "P2 MO - 4",
    "P1 KL - 5",
    "P1 MO - 6",
    "P2 KL - 7",
    "P2 MO - 8",
];

#[test]
fn the_order_of_arrival_does_not_matter() {
    let frame = frame(named(&["P1", "P2"]), 2);
    let straight = runs(&FULL);
    let mut shuffled = straight.clone();
    shuffled.rotate_left(3);
    shuffled.swap(0, 6);
    let seats = |a: &Assigned| {
        let mut seats: Vec<_> = a.rounds[0].seats.iter().map(|s| (s.run, s.slot)).collect();
        seats.sort_unstable();
        seats
    };
    let (a, b) = (laid(&frame, &straight), laid(&frame, &shuffled));
    assert_eq!(a.rounds[0].state, RoundState::Complete);
    assert_eq!(a.rounds[0].through, straight[7].facts.taken);
    assert_eq!(seats(&a), seats(&b));
    assert_eq!(
        seats(&a)[4],
        (5, Some(1)),
        "the later run of a cell is its second trial"
    );
}

#[test]
fn a_run_after_the_close_waits_until_a_second_part_comes() {
    let frame = frame(named(&["P1", "P2"]), 2);
    let mut texts = FULL.to_vec();
    texts.push("P1 KL - 20");
    let one = laid(&frame, &runs(&texts));
    assert_eq!(one.rounds[1].state, RoundState::Pending);
    texts.push("P2 KL - 21");
    let two = laid(&frame, &runs(&texts));
    assert_eq!(two.rounds[1].state, RoundState::Open);
}

#[test]
fn the_first_round_ever_opens_at_once() {
    let assigned = laid(&frame(named(&["P1", "P2"]), 2), &runs(&["P1 KL - 1"]));
    assert_eq!(assigned.rounds[0].state, RoundState::Open);
}

#[test]
fn a_run_taken_before_the_close_is_late() {
    let frame = frame(named(&["P1", "P2"]), 2);
    let through = Some(jiff::civil::date(2026, 3, 2).at(8, 8, 0, 0));
    let closed = [Closed {
        id: 7,
        label: None,
        through,
    }];
    let texts = ["P1 KL - 8", "P1 KL - 9"];
    let assigned = assign(
        &frame,
        &closed,
        &runs(&texts),
        Clock { now: Some(0) },
        &|_| None,
    );
    assert_eq!(status(&assigned, 1).status, RunStatus::Late);
    assert_eq!(assigned.rounds[0].state, RoundState::Pending);
}

#[test]
fn the_first_valid_run_counts_and_a_later_one_is_surplus() {
    let frame = frame(named(&["P1", "P2"]), 1);
    let texts = ["P1 KL 1 1", "P1 KL 1 2", "P1 KL 2 3"];
    let assigned = laid(&frame, &runs(&texts));
    assert_eq!(status(&assigned, 1).status, RunStatus::Used);
    assert_eq!(status(&assigned, 2).status, RunStatus::Surplus);
    assert_eq!(
        status(&assigned, 3).reason.as_deref(),
        Some("trial 2; the plan has 1")
    );
}

#[test]
fn a_trial_that_is_no_number_is_set_aside() {
    let assigned = laid(&frame(named(&["P1", "P2"]), 2), &runs(&["P1 KL b 1"]));
    let seat = status(&assigned, 1);
    assert_eq!(seat.status, RunStatus::SetAside);
    assert_eq!(
        seat.reason.as_deref(),
        Some("trial `b` is not a number from 1 to 2")
    );
}

#[test]
fn an_unknown_name_is_set_aside_with_the_nearest_one() {
    let assigned = laid(&frame(named(&["P1", "P2"]), 2), &runs(&["P1 M0 - 1"]));
    assert_eq!(
        status(&assigned, 1).reason.as_deref(),
        Some("loading `M0` is not in the plan (KL, MO); perhaps MO?")
    );
}

#[test]
fn one_part_too_many_holds_a_round_that_only_counts_them() {
    let texts = ["P1 KL - 1", "P2 KL - 2", "P3 KL - 3"];
    let assigned = laid(&frame(FactorLevels::Count(2), 2), &runs(&texts));
    assert_eq!(assigned.rounds[0].state, RoundState::Held);
    assert_eq!(
        assigned.rounds[0].reason.as_deref(),
        Some("`P3` is part number 3; the plan has 2")
    );
    assert_eq!(status(&assigned, 1).status, RunStatus::Held);
}

#[test]
fn a_value_that_must_stay_the_same_holds_a_full_round() {
    let frame = frame(named(&["P1", "P2"]), 2);
    let mut runs = runs(&FULL);
    for run in &mut runs {
        run.facts.same.insert("program".into(), "hub rev 12".into());
    }
    assert_eq!(laid(&frame, &runs).rounds[0].state, RoundState::Complete);
    runs[3]
        .facts
        .same
        .insert("program".into(), "hub rev 13".into());
    let held = laid(&frame, &runs);
    assert_eq!(held.rounds[0].state, RoundState::Held);
    let reason = held.rounds[0].reason.clone().unwrap();
    assert!(
        reason.contains("`hub rev 12` in 7 runs, `hub rev 13` in 1 run"),
        "{reason}"
    );
}

#[test]
fn a_short_run_gives_way_to_a_whole_one() {
    let frame = frame(named(&["P1", "P2"]), 1);
    let mut runs = runs(&["P1 KL 1 1", "P1 KL 1 2", "P2 KL 1 3"]);
    for whole in [1, 2] {
        runs[whole].holds.insert("height b".into(), None);
    }
    let assigned = laid(&frame, &runs);
    assert_eq!(status(&assigned, 1).status, RunStatus::SetAside);
    assert_eq!(
        status(&assigned, 1).reason.as_deref(),
        Some("short: 1 of 2 characteristics; `height b` is missing")
    );
    assert_eq!(status(&assigned, 2).status, RunStatus::Used);
}

#[test]
fn a_run_in_another_unit_is_set_aside() {
    let frame = frame(named(&["P1", "P2"]), 2);
    let mut runs = runs(&FULL);
    runs[2].holds.insert("bore a".into(), Some("µm".into()));
    let assigned = laid(&frame, &runs);
    assert_eq!(assigned.rounds[0].state, RoundState::Open);
    assert_eq!(
        status(&assigned, 3).reason.as_deref(),
        Some("`bore a` comes in µm, in the other runs in mm; export it again in that unit")
    );
}

#[test]
fn time_runs_out_by_the_wall_clock_and_by_the_stamps() {
    let mut frame = frame(named(&["P1", "P2"]), 2);
    frame.finish_within = Some(5 * 60_000);
    let texts = ["P1 KL - 1", "P2 KL - 2"];
    let clock = Clock {
        now: Some(10 * 60_000),
    };
    let by_wall = assign(&frame, &[], &runs(&texts), clock, &|_| Some(0));
    assert_eq!(by_wall.rounds[0].state, RoundState::Unfinished);
    assert_eq!(status(&by_wall, 1).status, RunStatus::Unfinished);

    let texts = ["P1 KL - 1", "P2 KL - 2", "P1 KL - 30", "P2 MO - 31"];
    let by_stamp = laid(&frame, &runs(&texts));
    assert_eq!(by_stamp.rounds[0].state, RoundState::Unfinished);
    assert_eq!(by_stamp.rounds[1].state, RoundState::Open);
    assert_eq!(status(&by_stamp, 3).status, RunStatus::Used);
}

#[test]
fn one_wrong_clock_closes_no_round() {
    let mut frame = frame(named(&["P1", "P2"]), 1);
    frame.finish_within = Some(5 * 60_000);
    let late = laid(&frame, &runs(&["P1 KL - 10", "P2 KL - 11", "P1 MO - 50"]));
    assert_eq!(late.rounds[0].state, RoundState::Open);
    assert_eq!(late.rounds[1].state, RoundState::Pending);
    let early = laid(&frame, &runs(&["P1 MO - 1", "P1 KL - 50", "P2 KL - 51"]));
    assert_eq!(status(&early, 1).status, RunStatus::Surplus);
    assert_eq!(early.rounds[0].state, RoundState::Open);
}

#[test]
fn no_round_is_given_up_before_everything_was_read() {
    let mut frame = frame(named(&["P1", "P2"]), 2);
    frame.finish_within = Some(5 * 60_000);
    let runs = runs(&["P1 KL - 1", "P2 KL - 2"]);
    let unread = assign(&frame, &[], &runs, Clock { now: None }, &|_| Some(0));
    assert_eq!(unread.rounds[0].state, RoundState::Open);
}

#[test]
fn rounds_with_a_name_are_filled_by_name() {
    let frame = frame(named(&["P1", "P2"]), 1);
    let mut runs = runs(&[
        "P1 KL 1 1",
        "P1 MO 1 2",
        "P2 KL 1 3",
        "P2 MO 1 4",
        "P1 KL 1 5",
    ]);
    for (run, label) in runs.iter_mut().zip(["r1", "R1", "r1", "r1", "r2"]) {
        run.facts.round_label = Some(label.into());
    }
    let assigned = laid(&frame, &runs);
    let states: Vec<_> = assigned
        .rounds
        .iter()
        .map(|r| (r.label.as_deref(), r.state))
        .collect();
    assert_eq!(
        states,
        [
            (Some("r1"), RoundState::Complete),
            (Some("r2"), RoundState::Open)
        ]
    );
}

#[test]
fn what_is_missing_is_named() {
    let frame = frame(FactorLevels::Count(2), 2);
    let mut rows = runs(&["P1 KL - 1", "P1 MO - 2", "P1 KL - 3"]);
    let assigned = laid(&frame, &rows);
    for row in &mut rows {
        let seat = status(&assigned, row.id);
        row.place = Placement {
            round: Some(1),
            slot: seat.slot,
            status: seat.status,
            reason: None,
        };
    }
    let cells: Vec<_> = missing(&frame, &rows)
        .into_iter()
        .map(|m| (m.part, m.appraiser.unwrap(), m.trials))
        .collect();
    assert_eq!(
        cells,
        [
            (Some("P1".into()), "MO".into(), vec![2]),
            (None, "KL".into(), vec![1, 2]),
            (None, "MO".into(), vec![1, 2]),
        ]
    );
}
