//! A straight scale from numbers to the width of a picture.
//!
//! Model: positions are percent of the picture's width, so that a picture fits every screen while its letters
//! keep their size.
//!
//! Invariant: a position is a finite number from 0 to 100, whatever number is asked for.

use std::ops::RangeInclusive;

/// Where the scale begins and ends, in percent of the picture's width.
const LEFT: f64 = 0.0;
const RIGHT: f64 = 100.0;
/// More ticks than this are never drawn.
const TICKS_MAX: usize = 24;
/// Where a tick's label has room, in percent of the picture's width.
const LABELLED: RangeInclusive<f64> = 6.0..=94.0;
/// Labelled ticks beside zero that make a scale readable.
const READABLE: usize = 2;

/// A scale.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Axis {
    low: f64,
    high: f64,
}

impl Axis {
    /// The scale that just holds all values; `None` when there is none or the span is no finite number.
    pub(super) fn over(values: impl IntoIterator<Item = f64>) -> Option<Axis> {
        let (low, high) = values
            .into_iter()
            .filter(|x| x.is_finite())
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), x| {
                (low.min(x), high.max(x))
            });
        if low > high {
            return None;
        }
        let room = match high > low {
            true => 0.0,
            false if low == 0.0 => 1.0,
            false => 0.1 * low.abs(),
        };
        let axis = Axis {
            low: low - room,
            high: high + room,
        };
        let span = axis.high - axis.low;
        (span.is_finite() && span > 0.0).then_some(axis)
    }

    /// Position of a value; beyond the scale it is the nearer end.
    pub(super) fn at(self, x: f64) -> f64 {
        let part = (x - self.low) / (self.high - self.low);
        let part = if part.is_nan() {
            0.0
        } else {
            part.clamp(0.0, 1.0)
        };
        LEFT + part * (RIGHT - LEFT)
    }

    /// Whether a value lies on the scale.
    pub(super) fn holds(self, x: f64) -> bool {
        (self.low..=self.high).contains(&x)
    }

    pub(super) fn low(self) -> f64 {
        self.low
    }

    pub(super) fn high(self) -> f64 {
        self.high
    }

    /// Round values on the scale, about `wanted` of them; more where fewer than two beside zero had a label.
    pub(super) fn ticks(self, wanted: u32) -> Vec<f64> {
        let readable = |ticks: &Vec<f64>| {
            let labelled = |x: &&f64| **x != 0.0 && self.labels(**x);
            ticks.iter().filter(labelled).count() >= READABLE
        };
        (wanted..=TICKS_MAX as u32)
            .map(|wanted| self.about(wanted))
            .find(readable)
            .unwrap_or_else(|| self.about(wanted))
    }

    /// Whether a label has room at a value.
    pub(super) fn labels(self, x: f64) -> bool {
        LABELLED.contains(&self.at(x))
    }

    fn about(self, wanted: u32) -> Vec<f64> {
        let step = round_step((self.high - self.low) / f64::from(wanted.max(1)));
        let first = (self.low / step).ceil();
        (0..TICKS_MAX)
            .map(|i| (first + i as f64) * step)
            .take_while(|&x| x <= self.high)
            .filter(|x| x.is_finite())
            .map(|x| x + 0.0)
            .collect()
    }
}

/// The step of 1, 2 or 5 times a power of ten that is nearest above.
fn round_step(least: f64) -> f64 {
    let power = 10f64.powf(least.log10().floor());
    [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .map(|m| m * power)
        .find(|&s| s >= least)
        .unwrap_or(least)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn positions_are_to_scale_and_stay_in_the_picture() {
        let axis = Axis::over([0.0, 50.0]).unwrap();
        assert_eq!(
            (axis.at(0.0), axis.at(50.0), axis.at(25.0)),
            (LEFT, RIGHT, 50.0)
        );
        assert_eq!(
            (axis.at(f64::NEG_INFINITY), axis.at(f64::INFINITY)),
            (LEFT, RIGHT)
        );
        for x in [f64::NAN, -1e308, 1e308] {
            assert!((0.0..=100.0).contains(&axis.at(x)), "{x}");
        }
    }

    #[test]
    fn equal_values_and_spans_beyond_numbers() {
        for x in [0.0, 3.0, -1e300, 1e-300] {
            let axis = Axis::over([x, x]).unwrap();
            assert!((axis.at(x) - 50.0).abs() < 1e-6, "{x}");
            assert!(axis.ticks(4).len() <= TICKS_MAX);
        }
        assert_eq!(Axis::over([]), None);
        assert_eq!(Axis::over([f64::NAN]), None);
        assert_eq!(Axis::over([-1.7e308, 1.7e308]), None);
    }

    #[test]
    fn ticks_are_round() {
        assert_eq!(
            Axis::over([-11.0, 9.0]).unwrap().ticks(4),
            [-10.0, -5.0, 0.0, 5.0]
        );
        assert_eq!(Axis::over([0.0, 0.5]).unwrap().ticks(4), [0.0, 0.2, 0.4]);
    }

    #[test]
    fn a_scale_about_zero_always_has_two_labels_beside_it() {
        let ticks = |reach: f64| Axis::over([-reach, reach]).unwrap().ticks(4);
        assert_eq!(ticks(10.5), [-10.0, -5.0, 0.0, 5.0, 10.0]);
        assert_eq!(ticks(4.2), [-4.0, -2.0, 0.0, 2.0, 4.0]);
        assert_eq!(ticks(1e-3), [-1e-3, -5e-4, 0.0, 5e-4, 1e-3]);
        for reach in (10..1000).map(|n| 0.1 * f64::from(n)) {
            let axis = Axis::over([-reach, reach]).unwrap();
            let labelled = axis.ticks(4).into_iter().filter(|x| axis.labels(*x));
            let beside: Vec<f64> = labelled.filter(|x| *x != 0.0).collect();
            assert!(
                (READABLE..=4).contains(&beside.len()),
                "{reach}: {beside:?}"
            );
        }
    }
}
