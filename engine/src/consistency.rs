//! Consistency of cells, and of the levels of a factor, with one another.
//!
//! Cochran's C holds the largest cell variance against their sum; Mandel's h and k hold the mean and the spread of
//! each level (appraisers in the place of laboratories) against those of all levels; the range chart holds each
//! cell's range against the mean range. Critical values are those of the F distribution.
//!
//! Not here: which of it deserves a sentence (`remarks`).
//!
//! Invariant: a statistic is finite; where it does not exist (no spread, unequal trials) it is absent.
//!
//! Sources: ISO 5725-2:1994, 7.3; Wilrich, *AStA Advances in Statistical Analysis* 97 (2013) 1–10.

mod range;

pub(crate) use range::below_normal;
pub use range::{CHART_TRIALS_MAX, RangeChart};

use crate::quantile::{Side, chi_square, f, f_above};

/// The readings of one cell in brief.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cell {
    /// Number of readings.
    pub count: usize,
    /// Their mean; 0 without readings.
    pub mean: f64,
    /// Sum of squared deviations from the mean.
    pub squares: f64,
    /// Largest less smallest reading.
    pub range: f64,
}

impl Cell {
    /// Variance, in squared reading units; absent below two readings.
    pub fn variance(&self) -> Option<f64> {
        (self.count > 1).then(|| self.squares / (self.count - 1) as f64)
    }
}

/// Every cell in brief: `cells[i]` is the cell, below `count`, of `values[i]`; rows of other cells are passed over.
pub fn in_cells(count: usize, cells: &[usize], values: &[f64]) -> Vec<Cell> {
    let origin = values.first().copied().unwrap_or(0.0);
    let mut of_cell: Vec<Vec<f64>> = vec![Vec::new(); count];
    for (&cell, &value) in cells.iter().zip(values) {
        if let Some(readings) = of_cell.get_mut(cell) {
            readings.push(value - origin);
        }
    }
    of_cell.iter().map(|r| brief(origin, r)).collect()
}

fn brief(origin: f64, readings: &[f64]) -> Cell {
    let count = readings.len();
    if count == 0 {
        return Cell {
            count,
            mean: 0.0,
            squares: 0.0,
            range: 0.0,
        };
    }
    let mean = readings.iter().sum::<f64>() / count as f64;
    let highest = readings.iter().copied().fold(f64::MIN, f64::max);
    let lowest = readings.iter().copied().fold(f64::MAX, f64::min);
    let range = highest - lowest;
    let squares = readings.iter().map(|y| (y - mean).powi(2)).sum();
    Cell {
        count,
        mean: origin + mean,
        squares: if range == 0.0 { 0.0 } else { squares },
        range,
    }
}

/// The largest cell variance against the sum of all.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cochran {
    /// C, from 1 over the number of cells to 1.
    pub statistic: f64,
    /// The cell with the largest variance.
    pub cell: usize,
    /// Upper bound of the chance of a C this large (Bonferroni; exact where C is above 1/2).
    pub p: f64,
}

/// Cochran's C of cells with equally many readings, two or more; absent without spread.
pub fn cochran(cells: &[Cell]) -> Option<Cochran> {
    let df = common_df(cells)? as f64;
    let sum: f64 = cells.iter().map(|c| c.squares).sum();
    let largest = |(a, _): &(usize, &Cell), (b, _): &(usize, &Cell)| {
        cells[*a]
            .squares
            .total_cmp(&cells[*b].squares)
            .then(b.cmp(a))
    };
    let (cell, widest) = cells.iter().enumerate().max_by(largest)?;
    let statistic = widest.squares / sum;
    if !statistic.is_finite() {
        return None;
    }
    let others = (cells.len() - 1) as f64;
    let p = if statistic < 1.0 {
        let ratio = statistic * others / (1.0 - statistic);
        (cells.len() as f64 * f_above(ratio, df, others * df)).min(1.0)
    } else {
        0.0
    };
    Some(Cochran { statistic, cell, p })
}

/// The C that is exceeded with a chance of at most `level`, for at least 2 cells of `df` degrees of freedom each.
pub fn cochran_critical(cells: usize, df: usize, level: f64) -> f64 {
    let others = (cells - 1) as f64;
    let f = f(
        Side::Above,
        level / cells as f64,
        df as f64,
        others * df as f64,
    );
    f / (f + others)
}

/// Mandel's h of each level: its mean less the mean of all means, over their sd. Absent without spread.
pub fn mandel_h(means: &[f64]) -> Option<Vec<f64>> {
    let mean = means.iter().sum::<f64>() / means.len() as f64;
    let squares: f64 = means.iter().map(|m| (m - mean).powi(2)).sum();
    let sd = (squares / (means.len() as f64 - 1.0)).sqrt();
    (sd > 0.0 && sd.is_finite()).then(|| means.iter().map(|m| (m - mean) / sd).collect())
}

/// The |h| that one level exceeds with the chance `level`; none for two levels, whose h is always ± 0.707.
pub fn mandel_h_critical(levels: usize, level: f64) -> Option<f64> {
    if levels < 3 {
        return None;
    }
    let n = levels as f64;
    let t_squared = f(Side::Above, level, 1.0, n - 2.0);
    Some((n - 1.0) * (t_squared / (n * (t_squared + n - 2.0))).sqrt())
}

/// Mandel's k of each level: root of its variance over the mean of all. Absent without spread.
pub fn mandel_k(variances: &[f64]) -> Option<Vec<f64>> {
    let mean = variances.iter().sum::<f64>() / variances.len() as f64;
    (mean > 0.0 && mean.is_finite()).then(|| variances.iter().map(|v| (v / mean).sqrt()).collect())
}

/// The k that one of at least 2 levels, each variance with `df` degrees of freedom, exceeds with the chance `level`.
pub fn mandel_k_critical(levels: usize, df: usize, level: f64) -> f64 {
    let n = levels as f64;
    let f = f(Side::Above, level, df as f64, (n - 1.0) * df as f64);
    (n * f / (f + n - 1.0)).sqrt()
}

/// A variance of normal readings with its degrees of freedom.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Own {
    /// In squared reading units.
    pub variance: f64,
    /// Degrees of freedom.
    pub df: usize,
}

impl Own {
    /// Pooled over some cells; absent when none has two readings.
    pub fn pooled<'a>(cells: impl IntoIterator<Item = &'a Cell>) -> Option<Own> {
        let (squares, df) = cells.into_iter().fold((0.0, 0), |(squares, df), cell| {
            (squares + cell.squares, df + cell.count.saturating_sub(1))
        });
        (df > 0).then(|| Own {
            variance: squares / df as f64,
            df,
        })
    }

    /// Exact two-sided limits of the variance.
    pub fn limits(&self, confidence: f64) -> (f64, f64) {
        let df = self.df as f64;
        let outside = (1.0 - confidence) / 2.0;
        let limit = |side| self.variance * df / chi_square(side, outside, df);
        (limit(Side::Above), limit(Side::Below))
    }
}

fn common_df(cells: &[Cell]) -> Option<usize> {
    let count = cells.first()?.count;
    let common = cells.len() > 1 && count > 1 && cells.iter().all(|c| c.count == count);
    common.then(|| count - 1)
}
