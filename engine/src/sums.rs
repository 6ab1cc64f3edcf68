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
    /// The largest difference of a reading from the first.
    pub(crate) spread: f64,
}

/// What is left of the cell means, and the means of a term: room that is used again.
#[derive(Debug, Clone, Default)]
pub(crate) struct Room {
    left: Vec<Running>,
    means: Vec<Running>,
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
        let mut cells = Cells::new(readings[0]);
        room.left.clear();
        // The same for numbers of trials that the compiler knows, which are the usual ones.
        match self.trials {
            2 => {
                let each = readings.as_chunks::<2>().0.iter();
                room.left.extend(each.map(|cell| cells.mean(cell)));
            }
            3 => {
                let each = readings.as_chunks::<3>().0.iter();
                room.left.extend(each.map(|cell| cells.mean(cell)));
            }
            n => {
                let each = readings.chunks_exact(n);
                room.left.extend(each.map(|cell| cells.mean(cell)));
            }
        }
        let (origin, within) = (cells.origin, cells.within.value());
        let spread = (cells.most - origin).max(origin - cells.least);

        let floor = readings.len() as f64 * spread * spread * ROUNDING;
        let or_zero = |ss: f64| if ss > floor || ss.is_nan() { ss } else { 0.0 };
        let (left, means) = (&mut room.left, &mut room.means);
        let trials = self.trials as f64;
        let mut grand_mean = None;
        sums.terms.clear();
        if let Some((_, others)) = self.terms.split_last() {
            for term in others {
                term.take_out(left, means);
                grand_mean.get_or_insert_with(|| centre(means));
                let share = (left.len() / means.len()) as f64;
                sums.terms.push(or_zero(squares(means) * share * trials));
            }
        }
        // The last term holds all factors: its means are what is left.
        let mut grand_mean = grand_mean.unwrap_or_else(|| centre(left));
        sums.terms.push(or_zero(squares(left) * trials));
        grand_mean.add(origin);
        sums.grand_mean = grand_mean.value();
        sums.within = or_zero(within);
        sums.spread = spread;
    }
}

/// What cell after cell adds within cells, and how far readings lie apart.
struct Cells {
    origin: f64,
    least: f64,
    most: f64,
    within: Running,
}

impl Cells {
    fn new(origin: f64) -> Cells {
        Cells {
            origin,
            least: origin,
            most: origin,
            within: Running::ZERO,
        }
    }

    /// Takes a cell; returns its mean relative to the first reading of all.
    #[inline(always)]
    fn mean(&mut self, cell: &[f64]) -> Running {
        let first = cell[0];
        for &y in cell {
            self.least = if y < self.least { y } else { self.least };
            self.most = if y > self.most { y } else { self.most };
        }
        let above_first = sum(cell, |y| y - first) / cell.len() as f64;
        self.within.add(sum(cell, |y| {
            let deviation = (y - first) - above_first;
            deviation * deviation
        }));
        let mut mean = Running::difference(first, self.origin);
        mean.add(above_first);
        mean
    }
}

impl Term {
    /// Takes the means of the term out of what is left of the cell means.
    fn take_out(&self, left: &mut [Running], means: &mut Vec<Running>) {
        means.clear();
        means.resize(self.combinations, Running::ZERO);
        for (x, &place) in left.iter().zip(&self.place) {
            means[place as usize].add_running(*x);
        }
        let share = (left.len() / self.combinations) as f64;
        for mean in means.iter_mut() {
            *mean = mean.over(share);
        }
        for (x, &place) in left.iter_mut().zip(&self.place) {
            x.subtract(means[place as usize]);
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
    let mut sum = Running::ZERO;
    for x in values {
        sum.add(x.value() * x.value());
    }
    sum.value()
}

/// The sum of a function of readings, rounded a few times however many they are.
#[inline(always)]
fn sum(readings: &[f64], f: impl Fn(f64) -> f64) -> f64 {
    const AT_ONCE: usize = 8;
    let plain = |readings: &[f64]| readings.iter().fold(0.0, |sum, &y| sum + f(y));
    if readings.len() <= AT_ONCE {
        return plain(readings);
    }
    let mut sum = Running::ZERO;
    for some in readings.chunks(AT_ONCE) {
        sum.add(plain(some));
    }
    sum.value()
}
