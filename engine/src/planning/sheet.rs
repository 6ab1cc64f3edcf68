//! A run sheet that keeps appraisers from knowing what they measure: labels in the place of part names, random order,
//! appraisers by turns.
//!
//! Each appraiser has other labels for the same parts, so that a label names one part and one appraiser and can be
//! turned back when the readings come in. A pass holds every cell once; a cell never follows itself within the runs
//! of its appraiser when there are two parts or more.

use crate::random::Random;

/// Runs that a sheet may have.
pub const SHEET_RUNS_MAX: usize = 10_000;

/// One run: this appraiser measures the part under this label.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SheetRun {
    /// Which appraiser, from 0.
    pub appraiser: usize,
    /// Which part, from 0.
    pub part: usize,
    /// Which trial, from 0.
    pub trial: usize,
    /// What stands on the part in the place of its name.
    pub label: u32,
}

/// The runs in the order in which they are to be made; `None` for more than [`SHEET_RUNS_MAX`], or for none.
pub fn run_sheet(
    parts: usize,
    appraisers: usize,
    trials: usize,
    seed: u64,
) -> Option<Vec<SheetRun>> {
    let runs = parts.checked_mul(appraisers)?.checked_mul(trials)?;
    if runs == 0 || runs > SHEET_RUNS_MAX {
        return None;
    }
    let mut random = Random::new(seed);
    let labels = labels(parts * appraisers, &mut random);
    let mut sheet = Vec::with_capacity(runs);
    let mut last: Vec<Option<usize>> = vec![None; appraisers];
    for trial in 0..trials {
        let orders: Vec<Vec<usize>> = last
            .iter()
            .map(|last| order(parts, *last, &mut random))
            .collect();
        for place in 0..parts {
            let mut turn: Vec<(usize, usize)> = orders
                .iter()
                .map(|order| order[place])
                .enumerate()
                .collect();
            random.shuffle(&mut turn);
            sheet.extend(turn.into_iter().map(|(appraiser, part)| SheetRun {
                appraiser,
                part,
                trial,
                label: labels[appraiser * parts + part],
            }));
        }
        for (last, order) in last.iter_mut().zip(&orders) {
            *last = order.last().copied();
        }
    }
    Some(sheet)
}

/// The parts in a random order that does not begin with the one measured last.
fn order(parts: usize, last: Option<usize>, random: &mut Random) -> Vec<usize> {
    let mut order: Vec<usize> = (0..parts).collect();
    random.shuffle(&mut order);
    if parts > 1 && last == Some(order[0]) {
        let other = 1 + random.below(parts as u64 - 1) as usize;
        order.swap(0, other);
    }
    order
}

/// Different numbers of equal length, in no order.
fn labels(count: usize, random: &mut Random) -> Vec<u32> {
    let mut low: u32 = 100;
    while (low as usize) * 9 < 2 * count {
        low *= 10;
    }
    let mut numbers: Vec<u32> = (low..10 * low).collect();
    random.shuffle(&mut numbers);
    numbers.truncate(count);
    numbers
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::collections::{BTreeMap, BTreeSet};

    #[test]
    fn every_cell_once_a_pass_and_never_twice_in_a_row() {
        for (parts, appraisers, trials) in [(10, 3, 3), (2, 1, 4), (5, 6, 2), (30, 20, 3)] {
            for seed in 0..20 {
                let sheet = run_sheet(parts, appraisers, trials, seed).unwrap();
                assert_eq!(sheet.len(), parts * appraisers * trials);
                for (trial, pass) in sheet.chunks(parts * appraisers).enumerate() {
                    assert!(pass.iter().all(|run| run.trial == trial));
                    let cells: BTreeSet<_> =
                        pass.iter().map(|run| (run.appraiser, run.part)).collect();
                    assert_eq!(cells.len(), pass.len());
                }
                for appraiser in 0..appraisers {
                    let own: Vec<usize> = sheet
                        .iter()
                        .filter(|run| run.appraiser == appraiser)
                        .map(|run| run.part)
                        .collect();
                    assert!(own.windows(2).all(|pair| pair[0] != pair[1]));
                }
            }
        }
    }

    #[test]
    fn a_label_names_one_cell() {
        let sheet = run_sheet(10, 3, 3, 5).unwrap();
        let mut cells = BTreeMap::new();
        for run in &sheet {
            let cell = (run.appraiser, run.part);
            assert_eq!(*cells.entry(run.label).or_insert(cell), cell);
        }
        assert_eq!(cells.len(), 30);
    }

    #[test]
    fn the_seed_alone_decides() {
        assert_eq!(run_sheet(10, 3, 3, 5), run_sheet(10, 3, 3, 5));
        assert_ne!(run_sheet(10, 3, 3, 5), run_sheet(10, 3, 3, 6));
        assert_eq!(run_sheet(0, 3, 3, 5), None);
        assert_eq!(run_sheet(1000, 3, 4, 5), None);
        assert_eq!(run_sheet(usize::MAX, 3, 4, 5), None);
    }
}
