//! Sums of squares of a complete study, by sweeping out means, smallest terms first.
//!
//! Every cell is first described by its deviations from its own first reading, and the cells by theirs
//! from the first cell; then each term's means are taken out of what is left. Offsets of any size and
//! parts that differ a million times more than repeats cost no digits, because means are twofold numbers.
//!
//! The order of readings within a cell changes rounding only.

use crate::design::{Design, FactorSet};
use crate::twofold::Running;

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
}

/// What is left of the cell means, the means of a term and those of the next: room that is used again.
#[derive(Debug, Clone, Default)]
pub(crate) struct Room {
    left: Vec<Running>,
    means: Vec<Running>,
    next: Vec<Running>,
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
        let mut within = Running::ZERO;
        room.left.clear();
        // The same for numbers of trials that the compiler knows, which are the usual ones.
        match self.trials {
            2 => {
                let each = readings.as_chunks::<2>().0.iter();
                room.left
                    .extend(each.map(|cell| mean(cell, origin, &mut within)));
            }
            3 => {
                let each = readings.as_chunks::<3>().0.iter();
                room.left
                    .extend(each.map(|cell| mean(cell, origin, &mut within)));
            }
            n => {
                let each = readings.chunks_exact(n);
                room.left
                    .extend(each.map(|cell| mean(cell, origin, &mut within)));
            }
        }
        sums.within = within.value();
        sums.terms.clear();
        let trials = self.trials as f64;
        let mut grand_mean = None;
        if let Some((_, others)) = self.terms.split_last() {
            for (i, term) in others.iter().enumerate() {
                if i == 0 {
                    room.add_up(term);
                }
                let share = room.divide(self.cells);
                room.take_out(term, others.get(i + 1));
                grand_mean.get_or_insert_with(|| centre(&mut room.means));
                sums.terms.push(squares(&room.means) * share * trials);
                std::mem::swap(&mut room.means, &mut room.next);
            }
        }
        // The last term holds all factors: its means are what is left.
        let mut grand_mean = grand_mean.unwrap_or_else(|| centre(&mut room.left));
        sums.terms.push(squares(&room.left) * trials);
        grand_mean.add(origin);
        sums.grand_mean = grand_mean.value();
        sums.without_rounding(readings);
    }
}

impl Sums {
    /// Sets to zero what is nothing but rounding.
    fn without_rounding(&mut self, readings: &[f64]) {
        // At least half the squared spread, so that what is far above this is above the floor as well.
        let total = self.total();
        let doubtful = 4.0 * readings.len() as f64 * total * ROUNDING;
        let all = || self.terms.iter().chain([&self.within]);
        if all().all(|&ss| ss > doubtful) {
            return;
        }
        let floor = readings.len() as f64 * spread(readings).powi(2) * ROUNDING;
        for ss in self.terms.iter_mut().chain([&mut self.within]) {
            if *ss <= floor {
                *ss = 0.0;
            }
        }
    }
}

/// The largest difference of a reading from the first.
pub(crate) fn spread(readings: &[f64]) -> f64 {
    let apart = readings.iter().map(|y| (y - readings[0]).abs());
    apart.fold(0.0, f64::max)
}

/// The mean of a cell relative to `origin`; adds the squares of its deviations to `within`.
#[inline(always)]
fn mean(cell: &[f64], origin: f64, within: &mut Running) -> Running {
    let first = cell[0];
    let above_first = sum(cell, |y| y - first) / cell.len() as f64;
    within.add(sum(cell, |y| {
        let deviation = (y - first) - above_first;
        deviation * deviation
    }));
    let mut mean = Running::difference(first, origin);
    mean.add(above_first);
    mean
}

impl Room {
    /// Adds up what is left over the combinations of a term.
    fn add_up(&mut self, term: &Term) {
        self.means.clear();
        self.means.resize(term.combinations, Running::ZERO);
        for (x, &place) in self.left.iter().zip(&term.place) {
            self.means[place as usize].add_running(*x);
        }
    }

    /// Turns these sums to means; returns how many cells each is of.
    fn divide(&mut self, cells: usize) -> f64 {
        let share = (cells / self.means.len()) as f64;
        self.means.iter_mut().for_each(|x| *x = x.over(share));
        share
    }

    /// Takes the means of a term out of what is left, and adds up the rest over the combinations of the next.
    fn take_out(&mut self, term: &Term, next: Option<&Term>) {
        let means = &self.means[..];
        let cells = self.left.iter_mut().zip(&term.place);
        let Some(next) = next else {
            cells.for_each(|(x, &place)| x.subtract(means[place as usize]));
            return;
        };
        self.next.clear();
        self.next.resize(next.combinations, Running::ZERO);
        for ((x, &place), &next_place) in cells.zip(&next.place) {
            x.subtract(means[place as usize]);
            self.next[next_place as usize].add_running(*x);
        }
    }
}

/// Takes the mean of some values out of them, and returns it.
fn centre(values: &mut [Running]) -> Running {
    let mut total = Running::ZERO;
    values.iter().for_each(|x| total.add_running(*x));
    let mean = total.over(values.len() as f64);
    values.iter_mut().for_each(|x| x.subtract(mean));
    mean
}

fn squares(values: &[Running]) -> f64 {
    sum(values, |x| x.value() * x.value())
}

/// The sum of a function of some values, rounded a few times however many they are.
#[inline(always)]
fn sum<T: Copy>(values: &[T], f: impl Fn(T) -> f64) -> f64 {
    const AT_ONCE: usize = 8;
    let plain = |values: &[T]| values.iter().fold(0.0, |sum, &x| sum + f(x));
    if values.len() <= AT_ONCE {
        return plain(values);
    }
    let mut sum = Running::ZERO;
    for some in values.chunks(AT_ONCE) {
        sum.add(plain(some));
    }
    sum.value()
}
