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

use crate::percentile::{BLOCK, percentiles};
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

    /// How many there are.
    pub(crate) fn count(&self) -> usize {
        self.normal.len()
    }

    /// `sum c_q W_q` for the draws from the `first` on; may be negative.
    pub(crate) fn sum(&self, weights: &[f64], ms: &[f64], first: usize, out: &mut [f64]) {
        let mut terms = weights
            .iter()
            .zip(ms.iter().zip(&self.ratios))
            .map(|(weight, (ms, ratios))| (weight * ms, &ratios[first..]))
            .filter(|(scale, _)| *scale != 0.0);
        let Some((scale, ratios)) = terms.next() else {
            return out.fill(0.0);
        };
        for (sum, ratio) in out.iter_mut().zip(ratios) {
            *sum = scale * ratio;
        }
        for (scale, ratios) in terms {
            for (sum, ratio) in out.iter_mut().zip(ratios) {
                *sum += scale * ratio;
            }
        }
    }

    /// A variance: the sum, cut at zero.
    pub(crate) fn variance(&self, weights: &[f64], ms: &[f64], first: usize, out: &mut [f64]) {
        self.sum(weights, ms, first, out);
        out.iter_mut().for_each(|x| *x = x.max(0.0));
    }

    /// The gauge variance where something is divided by it: never below the repeatability of the same draw.
    pub(crate) fn divisor(&self, gauge: &[f64], ms: &[f64], first: usize, out: &mut [f64]) {
        self.sum(gauge, ms, first, out);
        if gauge.iter().any(|&c| c < 0.0)
            && let (Some(ratios), Some(&ms)) = (self.ratios.last(), ms.last())
        {
            for (sum, ratio) in out.iter_mut().zip(&ratios[first..]) {
                *sum = sum.max(ms * ratio);
            }
        }
    }

    /// The grand mean.
    pub(crate) fn mean(
        &self,
        grand_mean: f64,
        its_variance: &[f64],
        ms: &[f64],
        first: usize,
        out: &mut [f64],
    ) {
        self.variance(its_variance, ms, first, out);
        for (x, z) in out.iter_mut().zip(&self.normal[first..]) {
            *x = grand_mean - z * x.sqrt();
        }
    }

    /// Percentiles of what `fill` makes of the draws from some place on.
    pub(crate) fn percentiles<const N: usize>(
        &self,
        probabilities: [f64; N],
        fill: impl FnMut(usize, &mut [f64]),
    ) -> [f64; N] {
        percentiles(self.count(), probabilities, fill)
    }

    /// What `fill` makes of all draws, at most [`BLOCK`] at a time.
    pub(crate) fn all(&self, fill: impl Fn(usize, &mut [f64])) -> Vec<f64> {
        let mut all = vec![0.0; self.count()];
        for (i, out) in all.chunks_mut(BLOCK).enumerate() {
            fill(i * BLOCK, out);
        }
        all
    }
}

#[cfg(test)]
mod tests {
    use super::*;

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
