//! Whether the same parts read higher or lower as a whole than in another round: bias that no gauge study shows.
//!
//! Parts are paired by name; the mean of their differences has Student's limits from the scatter of the differences
//! over the parts. A shift that all parts share is the instrument's, the set-up's or the people's; which, the
//! readings do not say.

use super::trend::student;
use crate::figure::{Bounds, Figure, Interval};
use crate::quantile::f_above;

const TOO_FEW: &str = "fewer than two parts were measured in both rounds";
const ALIKE: &str = "all parts differ by the same amount, so the data set no limits";

/// How far the parts of two rounds lie apart.
#[derive(Debug, Clone, PartialEq)]
pub struct Shift {
    /// Mean of now minus earlier over the parts, in reading units; limits by Student's t.
    pub mean: Figure,
    /// Two-sided p of no shift.
    pub p: Option<f64>,
    /// Parts measured in both rounds.
    pub parts: usize,
    /// Of those, parts that moved to the side to which the mean did.
    pub alike: usize,
}

impl Shift {
    /// Whether all parts moved to one side, and by more than luck at a two-sided confidence; that of one look, at one
    /// characteristic.
    pub fn is_common(&self, confidence: f64) -> bool {
        self.alike == self.parts && self.p.is_some_and(|p| p <= 1.0 - confidence)
    }
}

/// `now` and `earlier`: name and mean of each part, in reading units. A name counts once.
pub fn shift(now: &[(&str, f64)], earlier: &[(&str, f64)], confidence: f64) -> Shift {
    let mut names: Vec<&str> = Vec::with_capacity(now.len());
    let mut differences: Vec<f64> = Vec::with_capacity(now.len());
    for (name, mean) in now {
        let before = earlier.iter().find(|(n, _)| n == name);
        if let Some((_, before)) = before.filter(|_| !names.contains(name)) {
            names.push(name);
            differences.push(mean - before);
        }
    }
    let n = differences.len() as f64;
    let mean = differences.iter().sum::<f64>() / n;
    let (figure, p) = if differences.len() < 2 {
        (Figure::absent(TOO_FEW), None)
    } else {
        let squares: f64 = differences.iter().map(|d| (d - mean).powi(2)).sum();
        let error = (squares / (n - 1.0) / n).sqrt();
        if error > 0.0 {
            let alpha = 1.0 - confidence;
            let reach = |tail: f64| student(tail, n - 1.0) * error;
            let bounds = Bounds {
                lower: mean - reach(alpha / 2.0),
                upper: mean + reach(alpha / 2.0),
                at_least: mean - reach(alpha),
                interval: Interval::Exact,
            };
            let p = f_above((mean / error).powi(2), 1.0, n - 1.0);
            (Figure::new(mean, bounds), Some(p))
        } else {
            let p = if mean == 0.0 { 1.0 } else { 0.0 };
            (Figure::without_limits(mean, ALIKE), Some(p))
        }
    };
    Shift {
        mean: figure,
        p,
        parts: differences.len(),
        alike: differences.iter().filter(|d| *d * mean > 0.0).count(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Limits and p by scipy 1.17.1 (`stats.t.ppf`, `stats.ttest_1samp`).
    #[test]
    fn student_limits_of_paired_parts() {
        let now = [10.1, 20.9, 33.4, 42.6, 52.2, 63.0, 71.5, 82.9];
        let before = [8.0, 19.0, 30.0, 40.0, 50.0, 60.0, 70.0, 80.0];
        let names = ["a", "b", "c", "d", "e", "f", "g", "h"];
        let pairs = |values: [f64; 8]| {
            let mut pairs: Vec<(&str, f64)> = names.into_iter().zip(values).collect();
            pairs.rotate_left(3);
            pairs
        };
        let mut earlier = pairs(before);
        earlier.reverse();
        earlier.push(("z", 5.0));
        let shift = shift(&pairs(now), &earlier, 0.95);
        let close = |found: f64, expected: f64| {
            assert!((found / expected - 1.0).abs() < 1e-10, "{found} {expected}");
        };
        close(shift.mean.estimate.unwrap(), 2.45);
        close(shift.mean.lower.unwrap(), 1.919_368_924_560_399_8);
        close(shift.mean.upper.unwrap(), 2.980_631_075_439_600_6);
        close(shift.p.unwrap(), 1.195_853_094_302_966e-5);
        assert_eq!((shift.parts, shift.alike), (8, 8));
        assert!(shift.is_common(0.95));
    }

    #[test]
    fn one_part_or_none_tells_nothing() {
        for pairs in [&[][..], &[("a", 1.0)][..], &[("a", 1.0), ("a", 2.0)][..]] {
            let shift = shift(pairs, &[("a", 3.0), ("b", 4.0)], 0.95);
            assert_eq!(shift.mean.estimate, None);
            assert!(shift.mean.why.is_some() && !shift.is_common(0.95));
        }
    }

    #[test]
    fn equal_differences_are_sure_without_limits() {
        let moved = shift(&[("a", 2.0), ("b", 3.0)], &[("a", 1.0), ("b", 2.0)], 0.95);
        assert!(moved.is_common(0.95) && moved.mean.lower.is_none());
        let same = shift(&[("a", 1.0), ("b", 2.0)], &[("a", 1.0), ("b", 2.0)], 0.95);
        assert!(!same.is_common(0.95));
        assert_eq!(same.mean.estimate, Some(0.0));
    }
}
