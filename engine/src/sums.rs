//! Sums of squares of a complete study, by sweeping out means, smallest terms first.
//!
//! Every cell is first described by its deviations from its own first reading, and the cells by theirs
//! from the first cell; then each term's means are taken out of what is left. Offsets of any size and
//! parts that differ a million times more than repeats cost no digits, because means are twofold numbers.
//!
//! Invariant: readings of a cell are put in ascending order, so that the order of rows changes nothing.

use crate::design::{Design, FactorSet};
use crate::twofold::Twofold;

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
#[derive(Debug, Clone)]
pub(crate) struct Sums {
    terms: Vec<(FactorSet, f64)>,
    within: f64,
    pub(crate) grand_mean: f64,
}

impl Sums {
    /// Sum of squares of one term.
    pub(crate) fn of(&self, term: FactorSet) -> f64 {
        self.terms
            .iter()
            .find(|(set, _)| *set == term)
            .map_or(0.0, |(_, ss)| *ss)
    }

    /// Sum of squares about the grand mean.
    pub(crate) fn total(&self) -> f64 {
        self.terms.iter().map(|(_, ss)| ss).sum::<f64>() + self.within
    }

    /// What the error of a model holds that keeps only some of the terms.
    pub(crate) fn beside(&self, kept: impl Fn(FactorSet) -> bool) -> f64 {
        self.terms
            .iter()
            .filter(|(set, _)| !kept(*set))
            .map(|(_, ss)| ss)
            .sum::<f64>()
            + self.within
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

    /// Sums of squares of readings that lie cell by cell, ascending within each.
    pub(crate) fn sums(&self, readings: &[f64]) -> Sums {
        let origin = readings[0];
        let largest = readings
            .iter()
            .map(|y| (y - origin).abs())
            .fold(0.0, f64::max);
        let floor = readings.len() as f64 * largest * largest * ROUNDING;
        let or_zero = |ss: f64| if ss > floor { ss } else { 0.0 };

        let mut within = Twofold::ZERO;
        let mut left = Vec::with_capacity(self.cells);
        for cell in readings.chunks_exact(self.trials) {
            let from_first = |y: f64| Twofold::difference(y, cell[0]);
            let mean = cell
                .iter()
                .map(|&y| from_first(y))
                .fold(Twofold::ZERO, Twofold::plus)
                .over(self.trials as f64);
            within = cell
                .iter()
                .map(|&y| from_first(y).minus(mean).squared())
                .fold(within, Twofold::plus);
            left.push(Twofold::difference(cell[0], origin).plus(mean));
        }
        let mean = left
            .iter()
            .copied()
            .fold(Twofold::ZERO, Twofold::plus)
            .over(self.cells as f64);
        left.iter_mut().for_each(|x| *x = x.minus(mean));

        let terms = self
            .terms
            .iter()
            .map(|term| (term.set, or_zero(term.sweep(&mut left, self.trials))))
            .collect();
        let grand_mean = mean.plus(Twofold::difference(origin, 0.0)).value();
        Sums {
            terms,
            within: or_zero(within.value()),
            grand_mean,
        }
    }
}

impl Term {
    /// Takes the term's means out of what is left of the cell means; returns its sum of squares.
    fn sweep(&self, left: &mut [Twofold], trials: usize) -> f64 {
        let share = left.len() / self.combinations;
        let mut means = vec![Twofold::ZERO; self.combinations];
        for (x, &place) in left.iter().zip(&self.place) {
            means[place as usize] = means[place as usize].plus(*x);
        }
        means.iter_mut().for_each(|m| *m = m.over(share as f64));
        for (x, &place) in left.iter_mut().zip(&self.place) {
            *x = x.minus(means[place as usize]);
        }
        let squares = means
            .iter()
            .map(|m| m.squared())
            .fold(Twofold::ZERO, Twofold::plus);
        squares.value() * (share * trials) as f64
    }
}
