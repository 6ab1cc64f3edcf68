//! Percentiles of many draws, found among the few at their ends.
//!
//! The first draws tell about where the ends are; only what lies beyond is kept. What that misses by bad luck is made
//! good by a look at all draws, so that the answer never depends on it.

use crate::quantile::Side;

/// Draws that are worked out at a time, and that tell where the ends are.
pub(crate) const BLOCK: usize = 512;
/// Standard errors that the ends reach further in than the first draws say.
const SLACK: f64 = 3.0;

/// Percentiles of `draws` draws, each found by linear interpolation at position `(n - 1) p`; `fill(i, out)` works out
/// those from the `i`th on, at most [`BLOCK`].
///
/// They may be infinite, not NaN; at least one.
pub(crate) fn percentiles<const N: usize>(
    draws: usize,
    probabilities: [f64; N],
    mut fill: impl FnMut(usize, &mut [f64]),
) -> [f64; N] {
    let mut block = [0.0; BLOCK];
    if draws > 4 * BLOCK {
        fill(0, &mut block);
        let mut low = End::new(Side::Below, &block, probabilities.iter().copied());
        let mut high = End::new(Side::Above, &block, probabilities.iter().map(|p| 1.0 - p));
        for first in (0..draws).step_by(BLOCK) {
            let out = &mut block[..BLOCK.min(draws - first)];
            fill(first, out);
            keep_ends(out, &mut low, &mut high);
        }
        let found = probabilities.map(|p| {
            interpolated(draws, p, |place| {
                if p <= 0.5 {
                    low.nth(place)
                } else {
                    high.nth(draws - 1 - place)
                }
            })
        });
        if found.iter().all(Option::is_some) {
            return found.map(Option::unwrap_or_default);
        }
    }
    let mut all = vec![0.0; draws];
    for (i, out) in all.chunks_mut(BLOCK).enumerate() {
        fill(i * BLOCK, out);
    }
    probabilities.map(|p| percentile(&mut all, p))
}

/// The least of the draws, or the greatest, as many as are needed.
struct End {
    side: Side,
    /// What lies beyond this is kept.
    reach: f64,
    kept: Vec<f64>,
    /// Draws that equal the reach; counted where the first draws say that there are several.
    equal: Option<usize>,
    room: [f64; BLOCK],
}

impl End {
    /// Reaches as far as those of the probabilities ask for that count from this end.
    fn new(side: Side, sample: &[f64; BLOCK], probabilities: impl Iterator<Item = f64>) -> End {
        let n = BLOCK as f64;
        let furthest = probabilities.filter(|p| *p <= 0.5).reduce(f64::max);
        let reach = furthest.map_or(f64::NAN, |p| {
            let rank = n * p + SLACK * (n * p * (1.0 - p)).sqrt() + 1.0;
            let rank = (rank as usize).min(BLOCK - 1);
            side.nth(&mut sample.clone(), rank)
        });
        End {
            side,
            reach,
            kept: Vec::new(),
            equal: (count_equal(sample, reach) > 1).then_some(0),
            room: [0.0; BLOCK],
        }
    }

    fn keep(&mut self, count: usize, draws: &[f64]) {
        self.kept.extend_from_slice(&self.room[..count]);
        if let Some(equal) = &mut self.equal {
            *equal += count_equal(draws, self.reach);
        }
    }

    /// The draw that `n` others lie beyond; `None` when the end does not reach so far.
    fn nth(&mut self, n: usize) -> Option<f64> {
        if n < self.kept.len() {
            Some(self.side.nth(&mut self.kept, n))
        } else {
            (n < self.kept.len() + self.equal?).then_some(self.reach)
        }
    }
}

/// Keeps what lies beyond the reach of either end.
fn keep_ends(draws: &[f64], low: &mut End, high: &mut End) {
    let (mut n, mut m) = (0, 0);
    for &x in draws {
        // Written down in any case and kept by counting it: a branch would be guessed wrongly too often.
        low.room[n % BLOCK] = x;
        n += usize::from(x < low.reach);
        high.room[m % BLOCK] = x;
        m += usize::from(x > high.reach);
    }
    low.keep(n, draws);
    high.keep(m, draws);
}

fn count_equal(draws: &[f64], to: f64) -> usize {
    draws.iter().filter(|x| **x == to).count()
}

impl Side {
    /// The value that `n` others lie beyond on this side.
    fn nth(self, values: &mut [f64], n: usize) -> f64 {
        let place = match self {
            Side::Below => n,
            Side::Above => values.len() - 1 - n,
        };
        *values.select_nth_unstable_by(place, f64::total_cmp).1
    }
}

/// The value of sorted draws at probability `p`: linear interpolation at position `(n - 1) p`.
///
/// Puts `values` into another order. They may be infinite, not NaN; at least one.
pub(crate) fn percentile(values: &mut [f64], p: f64) -> f64 {
    let draws = values.len();
    let nth = |place: usize| Some(*values.select_nth_unstable_by(place, f64::total_cmp).1);
    interpolated(draws, p, nth).unwrap_or(f64::NAN)
}

fn interpolated(draws: usize, p: f64, mut nth: impl FnMut(usize) -> Option<f64>) -> Option<f64> {
    let position = (draws - 1) as f64 * p.clamp(0.0, 1.0);
    let place = position as usize;
    let here = nth(place)?;
    let part = position - place as f64;
    if part == 0.0 {
        return Some(here);
    }
    let next = nth(place + 1)?;
    Some(if next == here {
        here
    } else {
        here + part * (next - here)
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::Random;

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

    /// Against sorting, for draws of many kinds: also those whose beginning misleads about their ends.
    #[test]
    fn the_ends_say_what_sorting_says() {
        const P: [f64; 6] = [0.0, 0.025, 0.05, 0.5, 0.975, 1.0];
        let mut random = Random::new(11);
        let mut uniform = || random.uniform();
        let kinds: [Vec<f64>; 6] = [
            (0..5000).map(|_| uniform()).collect(),
            (0..5000).map(|_| (uniform() - 0.4).max(0.0)).collect(),
            (0..5000)
                .map(|_| 1.0 / (uniform() - 0.1).max(0.0))
                .collect(),
            (0..5000).map(f64::from).collect(),
            (0..5000).map(|i| f64::from(-i)).collect(),
            vec![3.0; 5000],
        ];
        for draws in kinds {
            let found = percentiles(draws.len(), P, |first, out| {
                out.copy_from_slice(&draws[first..first + out.len()]);
            });
            let mut sorted = draws.clone();
            sorted.sort_by(f64::total_cmp);
            assert_eq!(found, P.map(|p| percentile(&mut sorted, p)));
        }
    }
}
