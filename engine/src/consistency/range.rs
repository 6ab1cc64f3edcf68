//! The distribution of the range of normal readings, and the range chart made from it.
//!
//! `P(R <= w) = n ∫ φ(x) [Φ(x + w) - Φ(x)]^(n-1) dx` in units of the sd; its mean is d2, its sd d3.
//! Trapezoids over the whole line for the inner integral, Romberg's scheme for the outer one.
//!
//! Source: Tippett, *Biometrika* 17 (1925) 364–387.

use std::sync::OnceLock;

use crate::quantile::chi_square_above;

/// Readings in a cell up to which its range says about as much as its variance.
pub const CHART_TRIALS_MAX: usize = 25;

const STEPS_PER_SD: usize = 32;
/// Beyond this many sds the normal density vanishes in double precision.
const FAR: usize = 9;
const WIDEST: usize = 16;
/// Steps of the inner integral, in steps of the outer one.
const STRIDE: usize = 4;

/// Factors of the range chart for cells of one size; multiples of the sd or of the mean range.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RangeChart {
    /// Mean of the range over the sd.
    pub d2: f64,
    /// Sd of the range over the sd.
    pub d3: f64,
    /// D3: lower limit over the mean range.
    pub lower: f64,
    /// D4: upper limit over the mean range.
    pub upper: f64,
    /// Chance that the range of a sound cell exceeds the upper limit.
    pub beyond: f64,
}

impl RangeChart {
    /// The chart for cells of so many trials; `None` below 2 and above [`CHART_TRIALS_MAX`].
    pub fn of(trials: usize) -> Option<RangeChart> {
        static CHARTS: [OnceLock<RangeChart>; CHART_TRIALS_MAX + 1] =
            [const { OnceLock::new() }; CHART_TRIALS_MAX + 1];
        let chart = CHARTS.get(trials).filter(|_| trials >= 2)?;
        Some(*chart.get_or_init(|| worked_out(trials)))
    }
}

fn worked_out(trials: usize) -> RangeChart {
    let power = trials as i32 - 1;
    let below = normal_below();
    let phi = |i: usize| below.get(i).copied().unwrap_or(1.0);
    let above: Vec<f64> = (0..=WIDEST * STEPS_PER_SD)
        .map(|w| {
            let within = |i: usize| density(at(i)) * (phi(i + w) - phi(i)).powi(power);
            1.0 - trials as f64 * sum_over_line(within)
        })
        .collect();
    let d2 = romberg(&above);
    let moments: Vec<f64> = above
        .iter()
        .enumerate()
        .map(|(w, above)| 2.0 * (w as f64 / STEPS_PER_SD as f64) * above)
        .collect();
    let d3 = (romberg(&moments) - d2 * d2).sqrt();
    let limit = d2 + 3.0 * d3;
    let within = |i: usize| density(at(i)) * (below_normal(at(i) + limit) - phi(i)).powi(power);
    RangeChart {
        d2,
        d3,
        lower: (1.0 - 3.0 * d3 / d2).max(0.0),
        upper: limit / d2,
        beyond: 1.0 - trials as f64 * sum_over_line(within),
    }
}

fn at(i: usize) -> f64 {
    i as f64 / STEPS_PER_SD as f64 - FAR as f64
}

fn sum_over_line(f: impl Fn(usize) -> f64) -> f64 {
    let sum: f64 = (0..=2 * FAR * STEPS_PER_SD).step_by(STRIDE).map(f).sum();
    sum * STRIDE as f64 / STEPS_PER_SD as f64
}

fn normal_below() -> Vec<f64> {
    (0..=2 * FAR * STEPS_PER_SD)
        .map(|i| below_normal(at(i)))
        .collect()
}

fn density(x: f64) -> f64 {
    (-0.5 * x * x).exp() / (2.0 * std::f64::consts::PI).sqrt()
}

/// Probability of a standard normal value below `x`.
pub(crate) fn below_normal(x: f64) -> f64 {
    let tail = 0.5 * chi_square_above(x * x, 1.0);
    if x < 0.0 { tail } else { 1.0 - tail }
}

/// The integral from 0 to `WIDEST` of a smooth function known at every step.
fn romberg(f: &[f64]) -> f64 {
    let trapezoids = |stride: usize| {
        let inner: f64 = f.iter().step_by(stride).sum();
        let ends = 0.5 * (f[0] + f[f.len() - 1]);
        (inner - ends) * stride as f64 / STEPS_PER_SD as f64
    };
    let mut row = Vec::new();
    let mut stride = STEPS_PER_SD;
    while stride >= 1 {
        let mut next = vec![trapezoids(stride)];
        let mut weight = 4.0;
        for &coarser in &row {
            let finer = next[next.len() - 1];
            next.push(finer + (finer - coarser) / (weight - 1.0));
            weight *= 4.0;
        }
        row = next;
        stride /= 2;
    }
    row[row.len() - 1]
}
