//! The trend of a spread: a straight line through the logs of the sds of some rounds.
//!
//! The scatter about the line is what tells a slope from luck; the limits of the single studies do not come in,
//! because the same people measure every time and their few degrees of freedom do not scatter anew.
//!
//! The crossing is where the line meets a limit. Its limits are Fieller's: the times at which a line that the data
//! allow meets the limit. They are open towards later where the data allow a line that does not rise.
//!
//! Sources: Draper & Smith, *Applied Regression Analysis*, ch. 1 and 3 (line, inverse estimation); Fieller,
//! *J. R. Statist. Soc. B* 16 (1954) 175–185.

use crate::quantile::{Side, f, f_above};

/// Rounds below which a slope is not worked out.
pub const ROUNDS_MIN: usize = 4;

/// A line through the logs of the gauge's sd.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Trend {
    /// Rounds behind it.
    pub rounds: usize,
    /// Slope of ln sd per unit of time; 0.04 is 4 % a unit.
    pub slope: f64,
    /// Two-sided lower limit of the slope.
    pub slope_lower: f64,
    /// Two-sided upper limit of the slope.
    pub slope_upper: f64,
    /// One-sided p of a slope that is not above zero.
    pub p: f64,
    /// Standard deviation of ln sd about the line.
    pub scatter: f64,
    /// Where a rising line meets the limit; absent without a limit or when the line does not rise.
    pub crossing: Option<Crossing>,
}

/// When a line meets a limit; in the past when it has.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Crossing {
    /// Of the line itself.
    pub at: f64,
    /// Lower limit; absent when the limit may have been met at any time before.
    pub earliest: Option<f64>,
    /// Upper limit; absent when it may never be met.
    pub latest: Option<f64>,
}

impl Trend {
    /// `points`: time and sd of each round. `confidence`: two-sided, of all limits. `None` for fewer than
    /// [`ROUNDS_MIN`] points, an sd of zero, or fewer than two distinct times.
    pub fn of(points: &[(f64, f64)], limit_sd: Option<f64>, confidence: f64) -> Option<Trend> {
        let logs: Vec<(f64, f64)> = points.iter().map(|&(at, sd)| (at, sd.ln())).collect();
        let usable = logs.len() >= ROUNDS_MIN
            && logs
                .iter()
                .all(|(at, log)| at.is_finite() && log.is_finite());
        let line = Line::through(&logs).filter(|_| usable)?;
        let t = student(0.5 * (1.0 - confidence), line.df);
        let reach = t * line.slope_error();
        Some(Trend {
            rounds: points.len(),
            slope: line.slope,
            slope_lower: line.slope - reach,
            slope_upper: line.slope + reach,
            p: line.p_not_rising(),
            scatter: line.scatter,
            crossing: limit_sd
                .filter(|sd| *sd > 0.0)
                .and_then(|sd| line.crossing(sd.ln(), t)),
        })
    }

    /// Whether the slope is above zero at a one-sided confidence and the line meets the limit by a time.
    ///
    /// The confidence is that of one look: asked round after round of many characteristics, a steady gauge is called due
    /// more often than the rest to it.
    pub fn is_due(&self, by: f64, confidence: f64) -> bool {
        self.p <= 1.0 - confidence && self.crossing.is_some_and(|c| c.at <= by)
    }
}

/// The value of Student's t that has probability `tail` (below one half) above it.
pub(super) fn student(tail: f64, df: f64) -> f64 {
    f(Side::Above, 2.0 * tail, 1.0, df).sqrt()
}

/// Least squares.
#[derive(Debug, Clone, Copy)]
struct Line {
    n: f64,
    df: f64,
    centre: f64,
    height: f64,
    slope: f64,
    /// Sum of squares of the times about their centre.
    width: f64,
    scatter: f64,
}

impl Line {
    fn through(points: &[(f64, f64)]) -> Option<Line> {
        let n = points.len() as f64;
        let origin = points.first()?;
        // Dates are large numbers that differ little.
        let near: Vec<(f64, f64)> = points
            .iter()
            .map(|(x, y)| (x - origin.0, y - origin.1))
            .collect();
        let mean = |f: fn(&(f64, f64)) -> f64| near.iter().map(f).sum::<f64>() / n;
        let (x_mean, y_mean) = (mean(|p| p.0), mean(|p| p.1));
        let width: f64 = near.iter().map(|(x, _)| (x - x_mean).powi(2)).sum();
        if points.len() < 3 || width.is_nan() || width <= 0.0 {
            return None;
        }
        let along: f64 = near.iter().map(|(x, y)| (x - x_mean) * (y - y_mean)).sum();
        let slope = along / width;
        let rest: f64 = near
            .iter()
            .map(|(x, y)| (y - y_mean - slope * (x - x_mean)).powi(2))
            .sum();
        Some(Line {
            n,
            df: n - 2.0,
            centre: origin.0 + x_mean,
            height: origin.1 + y_mean,
            slope,
            width,
            scatter: (rest / (n - 2.0)).sqrt(),
        })
    }

    fn slope_error(&self) -> f64 {
        self.scatter / self.width.sqrt()
    }

    fn p_not_rising(&self) -> f64 {
        let t = self.slope / self.slope_error();
        if t.is_nan() {
            return 0.5;
        }
        let beyond = if t.is_infinite() {
            0.0
        } else {
            0.5 * f_above(t * t, 1.0, self.df)
        };
        if t > 0.0 { beyond } else { 1.0 - beyond }
    }

    /// Where the line meets a height: the times `u` from the centre with
    /// `(d - slope u)² <= t² scatter² (1/n + u²/width)`, `d` the way up.
    fn crossing(&self, height: f64, t: f64) -> Option<Crossing> {
        if self.slope.is_nan() || self.slope <= 0.0 {
            return None;
        }
        let d = height - self.height;
        let noise = (t * self.scatter).powi(2);
        let square = self.slope.powi(2) - noise / self.width;
        let constant = d * d - noise / self.n;
        let under_root = (d * self.slope).powi(2) - square * constant;
        let root = under_root.max(0.0).sqrt();
        let time = |u: f64| Some(self.centre + u).filter(|x| x.is_finite());
        let (earliest, latest) = if square > 0.0 {
            (
                time((d * self.slope - root) / square),
                time((d * self.slope + root) / square),
            )
        } else if constant > 0.0 && d > 0.0 {
            // Two stretches, before and after the rounds: the later one begins here and does not end.
            (time((d * self.slope - root) / square), None)
        } else if constant > 0.0 {
            (None, time((d * self.slope + root) / square))
        } else {
            (None, None)
        };
        Some(Crossing {
            at: self.centre + d / self.slope,
            earliest,
            latest,
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::Random;

    /// The first of the four sets of Anscombe, *American Statistician* 27 (1973) 17–21.
    const ANSCOMBE: [(f64, f64); 11] = [
        (10.0, 8.04),
        (8.0, 6.95),
        (13.0, 7.58),
        (9.0, 8.81),
        (11.0, 8.33),
        (14.0, 9.96),
        (6.0, 7.24),
        (4.0, 4.26),
        (12.0, 10.84),
        (7.0, 4.82),
        (5.0, 5.68),
    ];

    fn close(found: f64, expected: f64) {
        assert!(
            (found / expected - 1.0).abs() < 1e-9,
            "found {found}, expected {expected}"
        );
    }

    fn trend(height: f64, confidence: f64) -> Trend {
        let points = ANSCOMBE.map(|(x, y)| (x, y.exp()));
        Trend::of(&points, Some(height.exp()), confidence).unwrap()
    }

    /// Published: slope 0.500, standard error 0.118. All digits: scipy 1.17.1 (`stats.linregress`, `stats.t`).
    #[test]
    fn the_line_of_a_published_example() {
        let trend = trend(12.0, 0.95);
        close(trend.slope, 0.500_090_909_090_909_1);
        close(trend.slope_lower, 0.233_370_136_385_187_5);
        close(trend.slope_upper, 0.766_811_681_796_630_8);
        close(trend.scatter, 1.236_603_322_726_321);
        close(trend.p, 0.001_084_814_436_539_395_3);
    }

    /// Where the confidence band about the line contains a height: scipy 1.17.1, `optimize.brentq` on the band.
    #[test]
    fn the_crossing_is_where_the_band_holds_the_height() {
        let (early, late) = (17.996_546_082_530_443, 0.999_636_429_740_044_9);
        let table = [
            (
                12.0,
                0.8,
                early,
                Some(15.607_868_504_261_665),
                Some(22.525_936_869_053_933),
            ),
            (
                12.0,
                0.95,
                early,
                Some(14.577_130_125_052_559),
                Some(28.568_916_917_596_69),
            ),
            (12.0, 0.999, early, Some(12.597_536_539_431_013), None),
            (3.5, 0.999, late, None, Some(5.951_059_172_668_454)),
            (9.0, 0.999, 11.997_636_793_310_305, None, None),
        ];
        for (height, confidence, at, earliest, latest) in table {
            let crossing = trend(height, confidence).crossing.unwrap();
            close(crossing.at, at);
            for (found, expected) in [(crossing.earliest, earliest), (crossing.latest, latest)] {
                match (found, expected) {
                    (Some(found), Some(expected)) => close(found, expected),
                    (found, expected) => assert_eq!(found, expected, "{height} {confidence}"),
                }
            }
        }
    }

    #[test]
    fn four_rounds_that_rise_are_needed() {
        let rising = |n: i32| {
            (0..n)
                .map(|i| (f64::from(i), 1.04f64.powi(i)))
                .collect::<Vec<_>>()
        };
        assert_eq!(Trend::of(&rising(3), Some(2.0), 0.95), None);
        let trend = Trend::of(&rising(4), Some(2.0), 0.95).unwrap();
        close(trend.slope, 1.04f64.ln());
        close(trend.crossing.unwrap().at, 2f64.ln() / 1.04f64.ln());
        assert!(trend.is_due(18.0, 0.95) && !trend.is_due(17.0, 0.95));

        let level = [(0.0, 2.0), (1.0, 2.0), (2.0, 2.0), (3.0, 2.0)];
        let trend = Trend::of(&level, Some(3.0), 0.95).unwrap();
        assert_eq!((trend.slope, trend.p, trend.crossing), (0.0, 0.5, None));
        assert_eq!(Trend::of(&[(1.0, 2.0); 6], Some(3.0), 0.95), None);
        assert_eq!(
            Trend::of(
                &[(0.0, 1.0), (1.0, 0.0), (2.0, 1.0), (3.0, 1.0)],
                None,
                0.95
            ),
            None
        );
    }

    /// A drift of 4 % a round, scatter 5 %, eight rounds: the span stated at 80 % holds the true crossing in 80 % of
    /// trials, within 3 Monte Carlo errors.
    #[test]
    fn the_stated_span_holds_the_truth_as_often_as_stated() {
        const TRIALS: u32 = 4000;
        let mut random = Random::new(11);
        let mut normal = || {
            // The sum of twelve uniforms: variance 1, near enough to normal.
            let unit = |bits: u64| (bits >> 11) as f64 / (1u64 << 53) as f64;
            (0..12).map(|_| unit(random.bits())).sum::<f64>() - 6.0
        };
        let slope = 1.04f64.ln();
        let truth = 1.5f64.ln() / slope;
        let mut held = 0;
        for _ in 0..TRIALS {
            let points: Vec<(f64, f64)> = (0..8)
                .map(f64::from)
                .map(|x| (x, (slope * x + 0.05 * normal()).exp()))
                .collect();
            let trend = Trend::of(&points, Some(1.5), 0.8).unwrap();
            held += u32::from(trend.crossing.is_some_and(|c| {
                c.earliest.is_none_or(|e| e <= truth) && c.latest.is_none_or(|l| l >= truth)
            }));
        }
        let rate = f64::from(held) / f64::from(TRIALS);
        let error = (0.8 * 0.2 / f64::from(TRIALS)).sqrt();
        assert!((rate - 0.8).abs() < 3.0 * error, "{rate}");
    }
}
