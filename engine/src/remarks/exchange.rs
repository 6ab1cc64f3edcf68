//! Two parts that look exchanged under one condition: each reads like the other.
//!
//! Model: a condition is a combination of all factors but the part. Two readings of one trial, or two whole cells,
//! are held against the rest of their cells or of their rows and columns; the contrast of the two is one degree of
//! freedom of the error. It must be larger than luck gives over all pairs that were looked at, and it must vanish
//! once the two change places. The readings themselves are left as they are.
//!
//! Source: the contrast in a two-way layout, Scheffé, *The Analysis of Variance*, Wiley 1959, ch. 3 and 4.

use std::collections::BTreeMap;

use super::LEVEL;
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

/// After the exchange the contrast must be one that luck gives more often than this.
const VANISHES: f64 = 0.05;
/// Rounding of a contrast against the one before the exchange.
const ROUNDING: f64 = 1e-9;

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

/// What is left of a sum of squares of `df` degrees of freedom when one contrast of it is taken out.
struct Test {
    total: f64,
    df: f64,
}

impl Test {
    fn exceeds(&self, contrast: f64, limit: f64) -> bool {
        contrast * (self.df - 1.0) > limit * (self.total - contrast).max(0.0)
    }
}

/// Single readings of one trial.
fn of_readings(material: &Material<'_>) -> Option<Pair> {
    let trial = material.trial_of_row()?;
    let (total, df) = material.within();
    if df < 2 || total <= 0.0 {
        return None;
    }
    let part = material.design.part();
    let mut together: BTreeMap<(Vec<usize>, usize), Vec<usize>> = BTreeMap::new();
    for (row, &cell) in material.cells.iter().enumerate() {
        if material.brief[cell].count > 1 {
            let mut condition = material.design.levels_of(cell);
            condition[part] = 0;
            together
                .entry((condition, trial[row]))
                .or_default()
                .push(row);
        }
    }
    let tried: usize = together
        .values()
        .map(|rows| rows.len() * rows.len().saturating_sub(1) / 2)
        .sum();
    if tried == 0 {
        return None;
    }
    let df = df as f64;
    let limit = f(Side::Above, LEVEL / 2.0 / tried as f64, 1.0, df - 1.0);
    let luck = f(Side::Above, VANISHES, 1.0, df - 1.0);
    let own = material.within_cells();
    let mut best: Option<Pair> = None;
    for rows in together.values() {
        for (i, &a) in rows.iter().enumerate() {
            for &b in &rows[i + 1..] {
                let of_a = &material.brief[material.cells[a]];
                let of_b = &material.brief[material.cells[b]];
                let (n_a, n_b) = (of_a.count as f64, of_b.count as f64);
                let contrast = (own[a] - own[b]).powi(2) / (2.0 - 1.0 / n_a - 1.0 / n_b);
                if material.cells[a] == material.cells[b]
                    || !(Test { total, df }).exceeds(contrast, limit)
                {
                    continue;
                }
                // Each against the mean of the other cell's remaining readings.
                let rest_a = of_a.mean - own[a] / (n_a - 1.0);
                let rest_b = of_b.mean - own[b] / (n_b - 1.0);
                let in_a = material.shifted[b] - rest_a;
                let in_b = material.shifted[a] - rest_b;
                let change = |n: f64, own: f64, new: f64| {
                    new * new * (n - 1.0) / n - own * own * n / (n - 1.0)
                };
                let left = total + change(n_a, own[a], in_a) + change(n_b, own[b], in_b);
                let still = (in_a - in_b).powi(2) / (n_a / (n_a - 1.0) + n_b / (n_b - 1.0));
                if left < best.as_ref().map_or(total, |b| b.left)
                    && vanishes(still, contrast, left, df, luck)
                {
                    let cells = [material.cells[a], material.cells[b]];
                    let name =
                        |cell: usize| format!("{} trial {}", material.cell(cell), trial[a] + 1);
                    best = Some(Pair {
                        swaps: vec![(a, b)],
                        names: cells.map(name),
                        cells,
                        left: left.max(0.0),
                    });
                }
            }
        }
    }
    best
}

fn vanishes(still: f64, before: f64, left: f64, df: f64, luck: f64) -> bool {
    still <= ROUNDING * before || !(Test { total: left, df }).exceeds(still, luck)
}

/// Whole cells; with two levels nobody could say in which of them.
fn of_cells(material: &Material<'_>) -> Option<Pair> {
    let square = material.square().filter(|s| s.levels > 2 && s.df() > 1)?;
    let df = square.df() as f64;
    let levels = square.levels as f64;
    let mean = |cell: usize| material.brief[cell].mean;
    let departures = square.departures(mean);
    let squares = |table: &[Vec<f64>]| table.iter().flatten().map(|d| d * d).sum::<f64>();
    let total = squares(&departures);
    let tried = square.levels * square.parts * (square.parts - 1) / 2;
    let limit = f(Side::Above, LEVEL / 2.0 / tried as f64, 1.0, df - 1.0);
    let luck = f(Side::Above, VANISHES, 1.0, df - 1.0);
    let contrast = |a: f64, b: f64| (a - b).powi(2) * levels / (2.0 * (levels - 1.0));
    let mut best: Option<([usize; 2], f64)> = None;
    for j in 0..square.levels {
        for a in 0..square.parts {
            for b in a + 1..square.parts {
                let before = contrast(departures[a][j], departures[b][j]);
                if total <= 0.0 || !(Test { total, df }).exceeds(before, limit) {
                    continue;
                }
                let cells = [square.cell(a, j), square.cell(b, j)];
                let changed = square.departures(|cell| match cell {
                    c if c == cells[0] => mean(cells[1]),
                    c if c == cells[1] => mean(cells[0]),
                    c => mean(c),
                });
                let left = squares(&changed);
                let still = contrast(changed[a][j], changed[b][j]);
                if left < best.map_or(total, |(_, left)| left)
                    && vanishes(still, before, left, df, luck)
                {
                    best = Some((cells, left));
                }
            }
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
