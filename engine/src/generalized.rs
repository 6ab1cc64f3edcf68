//! Generalized (simulated) limits: percentiles of what a figure could be, given the mean squares seen.
//!
//! Every mean square is replaced by `W_q = n_q MS_q / χ²(n_q)`, the grand mean by `ȳ - Z √(its variance in W)`.
//! A sum of components is taken as its combination of `W` and cut at zero only at the end; cutting each
//! component first would cover far too seldom. `n_q / χ²(n_q)` and `Z` depend on degrees of freedom and seed
//! alone: they are drawn once and serve every characteristic of a design, so that two characteristics differ
//! by their readings and not by luck.
//!
//! Not for designs with three or more factors crossed: there the limits cover too seldom (88 to 94 % for 95 %
//! when several components are near zero).
//!
//! Sources: Weerahandi, *J. Amer. Statist. Assoc.* 88 (1993) 899–905; Hamada & Weerahandi, *J. Quality
//! Technology* 32 (2000) 241–253.

use crate::combination::Combination;
use crate::random::Random;

/// Draws when nothing else is asked for.
pub const DRAWS: u32 = 100_000;
/// Seed when nothing else is asked for.
pub const SEED: u64 = 20_260_301;

/// How many draws, and from which seed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Simulation {
    /// Number of draws, at least 1.
    pub draws: u32,
    /// Seed; the same seed gives the same limits. Two studies that are set against each other need two.
    pub seed: u64,
}

impl Default for Simulation {
    fn default() -> Self {
        Simulation {
            draws: DRAWS,
            seed: SEED,
        }
    }
}

/// Draws of `n_q / χ²(n_q)` for every mean square, and of a standard normal.
#[derive(Debug, Clone)]
pub(crate) struct Draws {
    normal: Vec<f64>,
    /// One row a mean square.
    ratios: Vec<Vec<f64>>,
}

impl Draws {
    pub(crate) fn new(df: &[f64], simulation: Simulation) -> Draws {
        let draws = simulation.draws;
        let mut random = Random::new(simulation.seed);
        let mut normals = random.stream();
        let mut row = |&n: &f64| {
            let mut stream = random.stream();
            (0..draws).map(|_| n / stream.chi_square(n)).collect()
        };
        Draws {
            ratios: df.iter().map(&mut row).collect(),
            normal: (0..draws).map(|_| normals.normal()).collect(),
        }
    }

    /// `sum c_q W_q`, one value a draw; may be negative.
    pub(crate) fn sum(&self, combination: &Combination, ms: &[f64]) -> Vec<f64> {
        let mut sums = vec![0.0; self.normal.len()];
        let weights = combination.weights();
        for (weight, (ms, ratios)) in weights.iter().zip(ms.iter().zip(&self.ratios)) {
            let scale = weight * ms;
            if scale != 0.0 {
                for (sum, ratio) in sums.iter_mut().zip(ratios) {
                    *sum += scale * ratio;
                }
            }
        }
        sums
    }

    /// A variance: the combination of `W`, cut at zero.
    pub(crate) fn variance(&self, combination: &Combination, ms: &[f64]) -> Vec<f64> {
        let mut sums = self.sum(combination, ms);
        sums.iter_mut().for_each(|x| *x = x.max(0.0));
        sums
    }

    /// The gauge variance where something is divided by it: never below the repeatability of the same draw.
    pub(crate) fn divisor(&self, gauge: &Combination, ms: &[f64]) -> Vec<f64> {
        let mut sums = self.sum(gauge, ms);
        if gauge.numerators().iter().any(|&n| n < 0)
            && let (Some(ratios), Some(&ms)) = (self.ratios.last(), ms.last())
        {
            for (sum, ratio) in sums.iter_mut().zip(ratios) {
                *sum = sum.max(ms * ratio);
            }
        }
        sums
    }

    /// The grand mean.
    pub(crate) fn mean(&self, grand_mean: f64, its_variance: &Combination, ms: &[f64]) -> Vec<f64> {
        let mut means = self.variance(its_variance, ms);
        for (x, z) in means.iter_mut().zip(&self.normal) {
            *x = grand_mean - z * x.sqrt();
        }
        means
    }
}

/// The value of sorted draws at probability `p`: linear interpolation at position `(n - 1) p`.
///
/// Puts `values` into another order. They may be infinite, not NaN; at least one.
pub(crate) fn percentile(values: &mut [f64], p: f64) -> f64 {
    let position = (values.len() - 1) as f64 * p.clamp(0.0, 1.0);
    let place = position as usize;
    let (_, &mut here, above) = values.select_nth_unstable_by(place, f64::total_cmp);
    let part = position - place as f64;
    if part == 0.0 {
        return here;
    }
    let next = above.iter().copied().fold(f64::INFINITY, f64::min);
    if next == here {
        here
    } else {
        here + part * (next - here)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentiles_interpolate_between_order_statistics() {
        let mut values = [4.0, 1.0, f64::INFINITY, 2.0, 3.0];
        assert_eq!(percentile(&mut values, 0.0), 1.0);
        assert_eq!(percentile(&mut values, 0.5), 3.0);
        assert!((percentile(&mut values, 0.4) - 2.6).abs() < 1e-15);
        assert_eq!(percentile(&mut values, 0.75), 4.0);
        assert_eq!(percentile(&mut values, 0.9), f64::INFINITY);
        assert_eq!(percentile(&mut values, 1.0), f64::INFINITY);
        assert_eq!(percentile(&mut [2.5], 0.3), 2.5);
    }

    #[test]
    fn draws_depend_on_df_and_seed_alone() {
        let simulation = Simulation { draws: 50, seed: 3 };
        let draws = |df: &[f64], seed| Draws::new(df, Simulation { seed, ..simulation });
        let (a, b) = (draws(&[9.0, 2.0], 3), draws(&[9.0, 2.0, 18.0], 3));
        assert_eq!((&a.normal, &a.ratios[..]), (&b.normal, &b.ratios[..2]));
        assert_ne!(a.ratios, draws(&[9.0, 2.0], 4).ratios);
        assert_ne!(
            draws(&[9.0, 9.0], 3).ratios[0],
            draws(&[9.0, 9.0], 3).ratios[1]
        );
    }
}
