//! How often sound studies get a remark that rests on chance.

use std::collections::BTreeMap;

use restudy_engine::{FALSE_ALARMS, Tolerance};

use crate::invented::{Plant, REPEATABILITY_ALONE, Truth};

/// Kinds that only chance can raise in a sound study.
const BY_CHANCE: [&str; 7] = [
    "parts exchanged",
    "identical repeats",
    "spread of a cell",
    "spread of cells",
    "mean of a cell",
    "repeatability of a level",
    "drift",
];
/// These are true remarks where levels or cells do differ.
const OF_DIFFERENCES: [&str; 2] = ["cells of the interaction", "offset of a level"];

/// Share of studies with a remark of one of the kinds, and how often each came.
fn raised(
    shape: [usize; 3],
    truth: Truth,
    step: Option<f64>,
    studies: u64,
    kinds: &[&str],
) -> (f64, BTreeMap<&'static str, u32>) {
    let prepared = Plant::new(0, shape, truth).prepared();
    let mut counts = BTreeMap::new();
    let mut with = 0;
    for seed in 0..studies {
        let plant = Plant::new(seed, shape, truth);
        let plant = match step {
            Some(step) => plant.rounded(step),
            None => plant,
        };
        let remarks = plant.remarks_with(&prepared, &Tolerance::default());
        let alarms: Vec<_> = remarks.iter().filter(|r| kinds.contains(&r.kind)).collect();
        with += u32::from(!alarms.is_empty());
        alarms
            .iter()
            .for_each(|r| *counts.entry(r.kind).or_insert(0) += 1);
    }
    (f64::from(with) / studies as f64, counts)
}

/// Three standard errors of a share of so many studies.
fn margin(share: f64, studies: u64) -> f64 {
    3.0 * (share * (1.0 - share) / studies as f64).sqrt()
}

#[test]
fn sound_studies_are_left_alone() {
    const STUDIES: u64 = 2000;
    let kinds: Vec<&str> = BY_CHANCE.into_iter().chain(OF_DIFFERENCES).collect();
    for shape in [[10, 3, 3], [8, 4, 2]] {
        let (share, counts) = raised(shape, REPEATABILITY_ALONE, None, STUDIES, &kinds);
        assert!(
            share <= FALSE_ALARMS + margin(FALSE_ALARMS, STUDIES),
            "{shape:?}: {share}, {counts:?}"
        );
        // A level far below the stated one would mean that faults are missed for nothing.
        assert!(
            share >= FALSE_ALARMS / 5.0,
            "{shape:?}: {share}, {counts:?}"
        );
    }
}

#[test]
fn differing_appraisers_and_rounding_raise_no_more() {
    const STUDIES: u64 = 1000;
    let truth = Truth {
        part: 10.0,
        appraiser: 1.5,
        interaction: 0.6,
        repeat: 1.0,
    };
    for step in [0.05, 0.5, 2.0] {
        let (share, counts) = raised([10, 3, 3], truth, Some(step), STUDIES, &BY_CHANCE);
        assert!(
            share <= FALSE_ALARMS + margin(FALSE_ALARMS, STUDIES),
            "step {step}: {share}, {counts:?}"
        );
    }
}

/// A step far wider than the repeats' spread: most cells agree, and the few that do not differ by the step.
#[test]
fn a_coarse_step_raises_no_more() {
    const STUDIES: u64 = 1000;
    let truth = Truth {
        part: 200.0,
        ..REPEATABILITY_ALONE
    };
    let kinds: Vec<&str> = BY_CHANCE.into_iter().chain(OF_DIFFERENCES).collect();
    for (shape, step) in [
        ([10, 3, 2], 5.0),
        ([10, 3, 2], 10.0),
        ([10, 3, 3], 20.0),
        ([8, 4, 2], 50.0),
    ] {
        let (share, counts) = raised(shape, truth, Some(step), STUDIES, &kinds);
        assert!(
            share <= FALSE_ALARMS + margin(FALSE_ALARMS, STUDIES),
            "{shape:?}, step {step}: {share}, {counts:?}"
        );
    }
}
