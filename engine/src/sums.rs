//! Sums of squares of a complete study, by sweeping out means, smallest terms first.
//!
//! Every cell is first described by its deviations from its own first reading, and the cells by theirs
//! from the first cell; then each term's means are taken out of what is left. Offsets of any size and
//! parts that differ a million times more than repeats cost no digits, because means are twofold numbers.
//!
//! The order of readings within a cell changes rounding only.

use crate::design::{Design, FactorSet};
use crate::twofold::{Running, Twofold};

/// A root of a sum of squares below this part of the largest deviation is nothing but rounding.
const ROUNDING: f64 = 16.0 * f64::EPSILON * f64::EPSILON;

/// Where each cell belongs in each term of a design.
#[derive(Debug, Clone)]
pub(crate) struct Sweep {
    trials: usize,
    cells: usize,
    terms: Vec<Term>,
}

#[derive(Debug, Clone)]
struct Term {
    set: FactorSet,
    combinations: usize,
    place: Vec<u32>,
}

/// Sums of squares of all terms of a design, and within cells.
#[derive(Debug, Clone, Default)]
pub(crate) struct Sums {
    /// In the order of [`Design::terms`].
    pub(crate) terms: Vec<f64>,
    pub(crate) within: f64,
    pub(crate) grand_mean: f64,
    /// The largest difference of a reading from the first.
    pub(crate) spread: f64,
}

/// What is left of the cell means, and the means of a term: room that is used again.
#[derive(Debug, Clone, Default)]
pub(crate) struct Room {
    left: Vec<Twofold>,
    totals: Vec<Running>,
}

impl Sums {
    /// Sum of squares about the grand mean.
    pub(crate) fn total(&self) -> f64 {
        self.terms.iter().sum::<f64>() + self.within
    }
}

impl Sweep {
    pub(crate) fn new(design: &Design, trials: usize) -> Self {
        let term = |set| Term {
            set,
            combinations: design.combinations(set),
            place: design.projection(set),
        };
        Sweep {
            trials,
            cells: design.cells(),
            terms: design.terms().into_iter().map(term).collect(),
        }
    }

    /// The terms in their order.
    pub(crate) fn terms(&self) -> impl Iterator<Item = FactorSet> {
        self.terms.iter().map(|term| term.set)
    }

    /// Number of readings.
    pub(crate) fn readings(&self) -> usize {
        self.cells * self.trials
    }

    /// Sums of squares of readings that lie cell by cell.
    pub(crate) fn sums(&self, readings: &[f64], room: &mut Room, sums: &mut Sums) {
        let origin = readings[0];
        let trials = self.trials as f64;
        let left = &mut room.left;
        left.clear();
        let mut spread = 0.0;
        let mut within = Running::ZERO;
        let mut total = Running::ZERO;
        for cell in readings.chunks_exact(self.trials) {
            let first = cell[0];
            let mut sum = Running::ZERO;
            for &y in cell {
                sum.add_twofold(Twofold::difference(y, first));
                let apart = (y - origin).abs();
                spread = if apart > spread { apart } else { spread };
            }
            let mean = sum.value().over(trials);
            for &y in cell {
                let deviation = Twofold::difference(y, first).less(mean);
                within.add(deviation * deviation);
            }
            let cell = Twofold::difference(first, origin).plus(mean);
            total.add_twofold(cell);
            left.push(cell);
        }
        let mean = total.value().over(self.cells as f64);
        left.iter_mut().for_each(|x| *x = x.minus(mean));

        let floor = readings.len() as f64 * spread * spread * ROUNDING;
        let or_zero = |ss: f64| if ss > floor || ss.is_nan() { ss } else { 0.0 };
        sums.terms.clear();
        if let Some((_, others)) = self.terms.split_last() {
            for term in others {
                let ss = term.sweep(left, &mut room.totals) * trials;
                sums.terms.push(or_zero(ss));
            }
            // The last term holds all factors: its means are what is left.
            sums.terms.push(or_zero(squares(left) * trials));
        }
        sums.within = or_zero(within.value().value());
        sums.grand_mean = mean.plus(Twofold::difference(origin, 0.0)).value();
        sums.spread = spread;
    }
}

impl Term {
    /// Takes the term's means out of what is left of the cell means; returns the sum of their squares over the cells.
    fn sweep(&self, left: &mut [Twofold], totals: &mut Vec<Running>) -> f64 {
        totals.clear();
        totals.resize(self.combinations, Running::ZERO);
        for (x, &place) in left.iter().zip(&self.place) {
            totals[place as usize].add_twofold(*x);
        }
        let share = (left.len() / self.combinations) as f64;
        let mut squares = Running::ZERO;
        for total in totals.iter_mut() {
            let mean = total.value().over(share);
            squares.add(mean.value() * mean.value());
            *total = Running::from(mean);
        }
        for (x, &place) in left.iter_mut().zip(&self.place) {
            *x = x.minus(totals[place as usize].value());
        }
        squares.value().value() * share
    }
}

fn squares(values: &[Twofold]) -> f64 {
    let mut sum = Running::ZERO;
    for x in values {
        sum.add(x.value() * x.value());
    }
    sum.value().value()
}
