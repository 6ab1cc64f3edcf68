//! One round's spread over another's: the exact ratio of repeatabilities, the simulated ratio of gauge sds.
//!
//! Mean squares within cells of two rounds are independent, so the ratio of the two, over that of the true
//! variances, is F. The ratio of the gauge variances has no exact limits: those here are generalized, from
//! independent draws for the two rounds. Both take the people of the two rounds for fresh samples; with the same
//! people the gauges differ less by luck than the second ratio's limits say. Where one round pooled its interaction and
//! the other did not, the first ratio sets an error with the interaction in it against one without.
//!
//! Sources: Burdick & Graybill, *Confidence Intervals on Variance Components*, 1992; Weerahandi, *J. Amer. Statist.
//! Assoc.* 88 (1993) 899–905.

use crate::figure::{Bounds, Figure, Interval};
use crate::generalized::{Draws, Simulation};
use crate::limits::MANY_CROSSED;
use crate::percentile::BLOCK;
use crate::quantile::{Side, f, f_above};
use crate::recorded::Recorded;

const ONE_TRIAL: &str = "a round with one trial shows no repeatability of its own";
const NO_SPREAD: &str = "the earlier round shows no spread to divide by";
const NO_REPEATS: &str = "a mean square within cells is zero, so the data set no limits";
const NOT_APART: &str =
    "with one trial and no factor beside the part, the gauge cannot be told from the parts";

/// Now over earlier.
#[derive(Debug, Clone, PartialEq)]
pub struct Ratio {
    /// Ratio of the sds of repeatability; exact limits.
    pub repeatability: Figure,
    /// Ratio of the mean squares within cells.
    pub f: Option<f64>,
    /// Its degrees of freedom, now and earlier.
    pub df: Option<(f64, f64)>,
    /// Two-sided p of equal repeatabilities.
    pub p: Option<f64>,
    /// Ratio of the gauge sds; generalized limits.
    pub gauge: Figure,
}

/// Sets rounds against each other; draws are made once for designs of the same size.
#[derive(Debug, Clone)]
pub struct Ratios {
    confidence: f64,
    simulation: Simulation,
    drawn: Option<Drawn>,
}

#[derive(Debug, Clone)]
struct Drawn {
    df: (Vec<f64>, Vec<f64>),
    now: Draws,
    earlier: Draws,
}

impl Ratios {
    /// `confidence`: of all limits, two-sided, between 0 and 1.
    pub fn new(confidence: f64, simulation: Simulation) -> Ratios {
        Ratios {
            confidence,
            simulation,
            drawn: None,
        }
    }

    /// One round over another.
    pub fn of(&mut self, now: &Recorded, earlier: &Recorded) -> Ratio {
        let repeats = now.repeats().zip(earlier.repeats());
        let seen = repeats.filter(|((ms1, _), (ms2, _))| *ms1 > 0.0 && *ms2 > 0.0);
        Ratio {
            repeatability: self.repeatability(repeats),
            f: seen.map(|((ms2, _), (ms1, _))| ms2 / ms1),
            df: repeats.map(|((_, n2), (_, n1))| (n2, n1)),
            p: seen.map(|((ms2, n2), (ms1, n1))| two_sided(ms2 / ms1, n2, n1)),
            gauge: self.gauge(now, earlier),
        }
    }

    fn repeatability(&self, repeats: Option<((f64, f64), (f64, f64))>) -> Figure {
        let Some(((ms2, n2), (ms1, n1))) = repeats else {
            return Figure::absent(ONE_TRIAL);
        };
        if ms1 == 0.0 {
            return Figure::absent(NO_SPREAD);
        }
        let observed = ms2 / ms1;
        if observed == 0.0 {
            return Figure::without_limits(0.0, NO_REPEATS);
        }
        let alpha = 1.0 - self.confidence;
        let limit = |side, a| (observed / f(side, a, n2, n1)).sqrt();
        let bounds = Bounds {
            lower: limit(Side::Above, alpha / 2.0),
            upper: limit(Side::Below, alpha / 2.0),
            at_least: limit(Side::Above, alpha),
            interval: Interval::Exact,
        };
        Figure::new(observed.sqrt(), bounds)
    }

    fn gauge(&mut self, now: &Recorded, earlier: &Recorded) -> Figure {
        let (Some(sd), Some(before)) = (now.gauge_sd(), earlier.gauge_sd()) else {
            return Figure::absent(NOT_APART);
        };
        if before == 0.0 {
            return Figure::absent(NO_SPREAD);
        }
        if now.model.crossed().max(earlier.model.crossed()) > 2 {
            return Figure::without_limits(sd / before, MANY_CROSSED);
        }
        let alpha = 1.0 - self.confidence;
        let drawn = self.drawn(now, earlier);
        let (gauge, gauge_before) = (now.gauge().weights(), earlier.gauge().weights());
        let ends = [alpha / 2.0, 1.0 - alpha / 2.0, alpha];
        let ratios = |first: usize, out: &mut [f64]| {
            let mut divisors = [0.0; BLOCK];
            let divisors = &mut divisors[..out.len()];
            drawn.now.divisor(&gauge, &now.ms, first, out);
            drawn
                .earlier
                .divisor(&gauge_before, &earlier.ms, first, divisors);
            for (ratio, before) in out.iter_mut().zip(divisors) {
                // Nothing over nothing tells nothing; it counts as no change.
                let both = *ratio <= 0.0 && *before <= 0.0;
                *ratio = if both {
                    1.0
                } else {
                    ratio.max(0.0) / before.max(0.0)
                };
            }
        };
        let [lower, upper, at_least] = drawn.now.percentiles(ends, ratios).map(f64::sqrt);
        let bounds = Bounds {
            lower,
            upper,
            at_least,
            interval: Interval::Generalized,
        };
        Figure::new(sd / before, bounds)
    }

    fn drawn(&mut self, now: &Recorded, earlier: &Recorded) -> &Drawn {
        let fits = |d: &Drawn| d.df.0 == now.df && d.df.1 == earlier.df;
        let simulation = self.simulation;
        let kept = self.drawn.take().filter(fits);
        self.drawn.insert(kept.unwrap_or_else(|| Drawn {
            df: (now.df.clone(), earlier.df.clone()),
            earlier: Draws::new(&earlier.df, simulation),
            now: Draws::new(
                &now.df,
                Simulation {
                    seed: simulation.seed.wrapping_add(1),
                    ..simulation
                },
            ),
        }))
    }
}

/// Twice the smaller tail of F.
fn two_sided(observed: f64, n: f64, m: f64) -> f64 {
    (2.0 * f_above(observed, n, m).min(f_above(1.0 / observed, m, n))).min(1.0)
}
