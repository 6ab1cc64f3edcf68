//! Two parts that look exchanged under one condition: each reads like the other.
//!
//! Model: a condition is a combination of all factors but the part. Two readings of one trial, or two whole cells,
//! are held against the rest of their cells or of their rows and columns; the contrast of the two is one degree of
//! freedom of the error. It must be larger than luck gives over all pairs that were looked at, and both must fit
//! once they change places. The readings themselves are left as they are.
//!
//! Source: the contrast in a two-way layout, Scheffé, *The Analysis of Variance*, Wiley 1959, ch. 3 and 4.

use std::collections::BTreeMap;

use super::LEVEL;
use super::luck::f_above;
use super::material::{Material, remark};
use super::words::percent;
use crate::quantile::{Side, f};
use crate::record::Remark;
use crate::settings::{Interaction, Judge, Settings, Tolerance};

/// Two cells with the remark that names them.
pub(super) struct Exchanged {
    pub(super) cells: [usize; 2],
    pub(super) remark: Remark,
}

/// After the exchange both must fit their new places as well as luck lets them more often than this.
const FITS: f64 = 0.01;
/// Rounding of a sum of squares against the one before the exchange.
const ROUNDING: f64 = 1e-9;
/// Pairs that are looked at; larger studies are left alone.
const PAIRS_MAX: usize = 1_000_000;

/// The rows that would change places.
struct Pair {
    swaps: Vec<(usize, usize)>,
    names: [String; 2],
    cells: [usize; 2],
    left: f64,
}

/// The exchange that explains most, when there is one.
pub(super) fn find(material: &Material<'_>) -> Option<Exchanged> {
    let pair = of_readings(material).or_else(|| of_cells(material))?;
    let swapped = swapped(material, &pair);
    let before = &material.study.figures.gauge;
    let after = gauge_sd(material, &swapped);
    let ratio = before
        .sd
        .estimate
        .zip(after)
        .map(|(before, after)| after / before);
    let share = before.share_of_tolerance.estimate.zip(ratio);
    let consequence = match (share, before.sd.estimate, after) {
        (Some((now, ratio)), ..) => format!(
            "The gauge takes {} of the tolerance as read, {} if they were",
            percent(now),
            percent(now * ratio)
        ),
        (None, Some(now), Some(then)) => format!(
            "The gauge sd is {} as read, {} if they were",
            material.length(now),
            material.length(then)
        ),
        _ => "The gauge spread would differ if they were".to_owned(),
    };
    let text = format!(
        "{} and {} look exchanged: each reads like the other part. {consequence}; nothing was changed. Look at the \
         parts and their labels.",
        pair.names[0], pair.names[1],
    );
    let mut figures = vec![("error sum of squares left", pair.left)];
    if let Some((now, ratio)) = share {
        figures.extend([("share before", now), ("share after", now * ratio)]);
    }
    if let (Some(now), Some(then)) = (before.sd.estimate, after) {
        figures.extend([("gauge sd before", now), ("gauge sd after", then)]);
    }
    Some(Exchanged {
        cells: pair.cells,
        remark: remark("parts exchanged", text, &figures),
    })
}

/// An error sum of squares with its degrees of freedom; a contrast is one of them.
#[derive(Clone, Copy)]
struct Error {
    squares: f64,
    df: f64,
}

impl Error {
    /// Whether F of a contrast against the rest of the error exceeds a limit.
    fn exceeds(&self, contrast: f64, limit: f64) -> bool {
        contrast * (self.df - 1.0) > limit * (self.squares - contrast).max(0.0)
    }

    /// The F that the largest of so many contrasts exceeds by luck too seldom to be believed; `None` when none does.
    fn limit(&self, contrasts: impl Iterator<Item = f64>, tried: usize) -> Option<f64> {
        let largest = contrasts.fold(0.0, f64::max);
        let ratio = largest / (self.squares - largest).max(0.0) * (self.df - 1.0);
        let level = LEVEL / 2.0 / tried as f64;
        if largest == 0.0 || f_above(ratio, 1.0, self.df - 1.0) > level {
            return None;
        }
        Some(f(Side::Above, level, 1.0, self.df - 1.0))
    }

    /// Whether the squares of two that changed places, `before` in all, are now what luck gives.
    fn fits(&self, of_both: f64, before: f64) -> bool {
        if of_both <= ROUNDING * before || self.df <= 2.0 {
            return of_both <= ROUNDING * before;
        }
        let luck = f(Side::Above, FITS, 2.0, self.df - 2.0);
        of_both / 2.0 * (self.df - 2.0) <= luck * (self.squares - of_both).max(0.0)
    }
}

/// Single readings of one trial.
fn of_readings(material: &Material<'_>) -> Option<Pair> {
    let trial = material.trial_of_row()?;
    let part = material.design.part();
    let mut together: BTreeMap<(Vec<usize>, usize), Vec<usize>> = BTreeMap::new();
    for (row, &cell) in material.cells.iter().enumerate() {
        if material.brief[cell].count > 1 {
            let mut condition = material.design.levels_of(cell);
            condition[part] = 0;
            let key = (condition, trial[row]);
            together.entry(key).or_default().push(row);
        }
    }
    let (squares, df) = material.within();
    let tried = together.values().map(|rows| pairs_of(rows.len())).sum();
    if df < 2 || squares <= 0.0 || !(1..=PAIRS_MAX).contains(&tried) {
        return None;
    }
    let error = Error {
        squares,
        df: df as f64,
    };
    let own = material.within_cells();
    let count = |row: usize| material.brief[material.cells[row]].count as f64;
    let contrast =
        |a: usize, b: usize| (own[a] - own[b]).powi(2) / (2.0 - 1.0 / count(a) - 1.0 / count(b));
    let pairs = || {
        together.values().flat_map(|rows| {
            let from = rows.iter().enumerate();
            from.flat_map(|(i, &a)| rows[i + 1..].iter().map(move |&b| (a, b)))
        })
    };
    let limit = error.limit(pairs().map(|(a, b)| contrast(a, b)), tried)?;
    let mut best: Option<(usize, usize, f64)> = None;
    for (a, b) in pairs() {
        let cells = [material.cells[a], material.cells[b]];
        let before = contrast(a, b);
        if cells[0] == cells[1] || !error.exceeds(before, limit) {
            continue;
        }
        // Each against the mean of the other cell's remaining readings.
        let rest =
            |row: usize, cell: usize| material.brief[cell].mean - own[row] / (count(row) - 1.0);
        let in_a = material.shifted[b] - rest(a, cells[0]);
        let in_b = material.shifted[a] - rest(b, cells[1]);
        let change =
            |n: f64, own: f64, new: f64| new * new * (n - 1.0) / n - own * own * n / (n - 1.0);
        let left = squares + change(count(a), own[a], in_a) + change(count(b), own[b], in_b);
        let after = Error {
            squares: left.max(0.0),
            ..error
        };
        let new_place = |n: f64, new: f64| new * new * (n - 1.0) / n;
        let of_both = new_place(count(a), in_a) + new_place(count(b), in_b);
        if left < best.map_or(squares, |(.., left)| left) && after.fits(of_both, before) {
            best = Some((a, b, left));
        }
    }
    let (a, b, left) = best?;
    let cells = [material.cells[a], material.cells[b]];
    Some(Pair {
        swaps: vec![(a, b)],
        names: cells.map(|cell| format!("{} trial {}", material.cell(cell), trial[a] + 1)),
        cells,
        left: left.max(0.0),
    })
}

fn pairs_of(n: usize) -> usize {
    n * n.saturating_sub(1) / 2
}

/// Whole cells; with two levels nobody could say in which of them.
fn of_cells(material: &Material<'_>) -> Option<Pair> {
    let square = material.square().filter(|s| s.levels > 2 && s.df() > 1)?;
    let levels = square.levels as f64;
    let mean = |cell: usize| material.brief[cell].mean;
    let departures = square.departures(mean);
    let squares = |table: &[Vec<f64>]| table.iter().flatten().map(|d| d * d).sum::<f64>();
    let error = Error {
        squares: squares(&departures),
        df: square.df() as f64,
    };
    let tried = square.levels * pairs_of(square.parts);
    if material.is_rounding(error.squares, material.brief.len()) || tried > PAIRS_MAX {
        return None;
    }
    let contrast = |of: &[Vec<f64>], (a, b, j): (usize, usize, usize)| {
        (of[a][j] - of[b][j]).powi(2) * levels / (2.0 * (levels - 1.0))
    };
    let places = || {
        (0..square.parts).flat_map(|a| {
            let others = a + 1..square.parts;
            others.flat_map(move |b| (0..square.levels).map(move |j| (a, b, j)))
        })
    };
    let limit = error.limit(places().map(|place| contrast(&departures, place)), tried)?;
    let mut best: Option<([usize; 2], f64)> = None;
    for place in places() {
        let before = contrast(&departures, place);
        if !error.exceeds(before, limit) {
            continue;
        }
        let (a, b, j) = place;
        let cells = [square.cell(a, j), square.cell(b, j)];
        let changed = square.departures(|cell| match cell {
            c if c == cells[0] => mean(cells[1]),
            c if c == cells[1] => mean(cells[0]),
            c => mean(c),
        });
        let after = Error {
            squares: squares(&changed),
            ..error
        };
        let (of_a, of_b) = (changed[a][j], changed[b][j]);
        // Difference and sum of the two are independent; with two parts the sum is nothing.
        let of_sum = match square.parts {
            2 => 0.0,
            parts => (of_a + of_b).powi(2) / (1.0 - 2.0 / parts as f64),
        };
        let of_both = ((of_a - of_b).powi(2) + of_sum) * levels / (2.0 * (levels - 1.0));
        if after.squares < best.map_or(error.squares, |(_, left)| left)
            && after.fits(of_both, before)
        {
            best = Some((cells, after.squares));
        }
    }
    let (cells, left) = best?;
    let rows = |cell: usize| {
        let rows = material.cells.iter().enumerate();
        rows.filter(move |&(_, &c)| c == cell).map(|(row, _)| row)
    };
    Some(Pair {
        swaps: rows(cells[0]).zip(rows(cells[1])).collect(),
        names: cells.map(|cell| material.cell(cell)),
        cells,
        left: left * square.trials as f64,
    })
}

fn swapped(material: &Material<'_>, pair: &Pair) -> Vec<f64> {
    let mut values = material.values.to_vec();
    for &(a, b) in &pair.swaps {
        values.swap(a, b);
    }
    values
}

/// Gauge sd of other readings in the same study.
fn gauge_sd(material: &Material<'_>, values: &[f64]) -> Option<f64> {
    let study = material.study;
    let settings = Settings {
        confidence: study.confidence,
        spread_sds: study.spread_sds,
        interaction: match study.interaction.pool_above {
            Some(p) => Interaction::PoolAbove(p),
            None => Interaction::Keep,
        },
        process: None,
        limits: None,
        judge: Judge::Estimate,
    };
    let none = Tolerance::default();
    let study = crate::study::analyse(material.design, material.cells, values, &none, &settings);
    study.ok()?.figures.gauge.sd.estimate
}
