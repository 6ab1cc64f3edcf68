//! Parametric bootstrap: studies drawn from the fitted components, each fitted again.
//!
//! A figure's draws are divided by its estimate. The quotient stands for `estimate / truth`, so that the limit at
//! confidence `p` is the estimate over the quotient's percentile at `p`; for a single mean square that is the
//! chi-square limit. Nothing is drawn for a component at zero, so that upper limits say nothing about it.
//!
//! Source: Efron & Tibshirani, *An Introduction to the Bootstrap*, 1993, ch. 13.

use crate::random::Random;

use super::ascent::Ends;
use super::blocks::{Blocks, Reach};
use super::reduced::Seen;

/// Studies drawn.
pub(super) const DRAWS: usize = 2_000;
/// Where the stream starts.
pub(super) const SEED: u64 = 20_231;
/// Multiplications in one evaluation of the likelihood above which no study is drawn.
pub(super) const WORK_MAX: f64 = 2e6;

/// The drawn studies that could be fitted.
#[derive(Debug, Clone)]
pub(super) struct Draws {
    studies: Vec<Drawn>,
}

/// One drawn study, in the readings' scale.
#[derive(Debug, Clone)]
pub(super) struct Drawn {
    pub(super) components: Vec<f64>,
    /// Its mean; the truth is zero.
    pub(super) mean: f64,
}

/// Sorted quotients `drawn / estimate` of one figure.
#[derive(Debug, Clone)]
pub(super) struct Quotients {
    sorted: Vec<f64>,
}

impl Draws {
    /// `None` where the blocks ask for too much work, or no drawn study could be fitted.
    pub(super) fn new(blocks: &Blocks, components: &[f64]) -> Option<Draws> {
        if blocks.work() > WORK_MAX {
            return None;
        }
        let mut random = Random::new(SEED);
        let fitted = (0..DRAWS).filter_map(|_| {
            let seen = study(&mut random, blocks, components);
            let summit = blocks
                .climb(&seen, components.to_vec(), Ends::Nearly)
                .ok()?;
            Some(Drawn {
                mean: summit.at.mean,
                components: summit.components,
            })
        });
        let studies: Vec<Drawn> = fitted.collect();
        (!studies.is_empty()).then_some(Draws { studies })
    }

    /// How many.
    pub(super) fn len(&self) -> usize {
        self.studies.len()
    }

    /// The quotients of a figure.
    pub(super) fn of(&self, figure: impl Fn(&Drawn) -> f64, estimate: f64) -> Quotients {
        let mut sorted: Vec<f64> = self
            .studies
            .iter()
            .map(|drawn| figure(drawn) / estimate)
            .collect();
        sorted.sort_by(f64::total_cmp);
        Quotients { sorted }
    }
}

impl Quotients {
    /// Linear between the sorted draws, the first at probability 0 and the last at 1.
    pub(super) fn percentile(&self, probability: f64) -> f64 {
        let place = probability.clamp(0.0, 1.0) * (self.sorted.len() - 1) as f64;
        let before = (place.floor() as usize).min(self.sorted.len() - 1);
        let after = (before + 1).min(self.sorted.len() - 1);
        let (low, high) = (self.sorted[before], self.sorted[after]);
        if low == high {
            return low;
        }
        low + (place - before as f64) * (high - low)
    }

    /// The probability whose percentile is `quotient`.
    pub(super) fn probability(&self, quotient: f64) -> f64 {
        let last = self.sorted.len() - 1;
        let above = self.sorted.partition_point(|&q| q <= quotient);
        if above == 0 {
            return 0.0;
        }
        if above > last {
            return 1.0;
        }
        let (low, high) = (self.sorted[above - 1], self.sorted[above]);
        ((above - 1) as f64 + (quotient - low) / (high - low)) / last as f64
    }
}

/// One study with the given components.
fn study(random: &mut Random, blocks: &Blocks, components: &[f64]) -> Seen {
    let error = components[components.len() - 1];
    let mut columns = vec![0.0; blocks.columns];
    let mut inside = Vec::with_capacity(blocks.inside - 1);
    for (component, reach) in components.iter().zip(&blocks.reach) {
        match reach {
            Reach::Across(range) => {
                for effect in &mut columns[range.clone()] {
                    *effect = component.sqrt() * random.normal();
                }
            }
            Reach::Inside(place) if *place + 1 < blocks.inside => inside.push(component.sqrt()),
            Reach::Inside(_) => {}
        }
    }
    let mut values = Vec::new();
    let mut cells = Vec::new();
    for block in &blocks.blocks {
        let class = &blocks.classes[block.class];
        cells.clear();
        cells.extend(
            class
                .counts
                .iter()
                .zip(&class.columns)
                .map(|(&count, of_cell)| {
                    let effects: f64 = of_cell.iter().map(|&column| columns[column]).sum();
                    effects + (error / count as f64).sqrt() * random.normal()
                }),
        );
        for (sd, levels) in inside.iter().zip(&class.levels) {
            for level in 0..cells.len() {
                if levels[level] == level {
                    let effect = sd * random.normal();
                    let alike = levels.iter().zip(cells.iter_mut());
                    alike
                        .filter(|(l, _)| **l == level)
                        .for_each(|(_, y)| *y += effect);
                }
            }
        }
        values.extend(cells[1..].iter().map(|y| y - cells[0]));
        values.push(cells[0]);
    }
    Seen {
        values,
        within: if blocks.within_df > 0 {
            error * random.chi_square(blocks.within_df as f64)
        } else {
            0.0
        },
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentile_and_probability_undo_each_other() {
        let quotients = Quotients {
            sorted: vec![0.5, 0.8, 1.0, 1.0, 2.0],
        };
        assert_eq!(quotients.percentile(0.0), 0.5);
        assert_eq!(quotients.percentile(0.125), 0.65);
        assert_eq!(quotients.percentile(1.0), 2.0);
        assert!((quotients.probability(0.65) - 0.125).abs() < 1e-15);
        assert_eq!(quotients.probability(0.4), 0.0);
        assert_eq!(quotients.probability(3.0), 1.0);
        assert_eq!(quotients.probability(1.5), 0.875);
    }
}
