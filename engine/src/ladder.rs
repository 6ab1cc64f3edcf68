//! The ladder of causes: what the gauge's spread would be with one thing taken away.
//!
//! Model: the gauge variance is a sum of components. A rung leaves one of them out, or divides that within cells by
//! the number of readings whose mean would count. The estimate adds the others cut at zero; what is left is still
//! a combination of mean squares, so its limits are those of any such combination: modified large sample, exact
//! where one mean square remains.
//!
//! Not here: what more appraisers or trials would buy. They make the study surer and the gauge no better (`planning`).
//!
//! Limits of a share take the room that the spread is held against as known.

use crate::design::PART;
use crate::figure::{Bounds, Figure, Interval};
use crate::mls::Constants;
use crate::record::{Component, Study};
use crate::recorded::Recorded;

const NO_TABLE: &str = "limits of what would be left need equal numbers of readings in all cells";
const NO_REPEATS: &str = "the mean square that is left is zero, so the data set no limits";
const NO_SD: &str = "all readings are equal";
/// The least part of the spread that a step must take away to count as one.
const WORTH: f64 = 0.01;

/// What is changed about the gauge.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Change {
    /// Nothing.
    AsItIs,
    /// One component left out, by its place in [`Study::components`].
    Without(usize),
    /// Each part loaded and measured so many times, the mean counting.
    MeanOf(u32),
}

/// The gauge's spread after a change.
#[derive(Debug, Clone, PartialEq)]
pub struct Rung {
    /// What is changed.
    pub change: Change,
    /// Standard deviation, in reading units.
    pub sd: Figure,
    /// Spread over the width of the tolerance.
    pub share_of_tolerance: Figure,
}

/// One study's gauge, ready for changes.
#[derive(Debug, Clone)]
pub struct Ladder<'a> {
    study: &'a Study,
    table: Option<Table>,
}

#[derive(Debug, Clone)]
struct Table {
    recorded: Recorded,
    two_sided: Constants,
    one_sided: Constants,
}

impl<'a> Ladder<'a> {
    /// `None` when the gauge's spread is not known.
    pub fn of(study: &'a Study) -> Option<Ladder<'a>> {
        study.figures.gauge.sd.estimate?;
        let table = Recorded::try_from(study).ok().map(|recorded| {
            let alpha = 1.0 - study.confidence;
            Table {
                two_sided: Constants::all(&recorded.df, alpha / 2.0),
                one_sided: Constants::all(&recorded.df, alpha),
                recorded,
            }
        });
        Some(Ladder { study, table })
    }

    /// The gauge as it is.
    pub fn now(&self) -> Rung {
        let gauge = &self.study.figures.gauge;
        Rung {
            change: Change::AsItIs,
            sd: gauge.sd.clone(),
            share_of_tolerance: gauge.share_of_tolerance.clone(),
        }
    }

    /// One rung a component of the gauge, in the order of the components: without it, and for that within cells
    /// the mean of two readings.
    pub fn steps(&self) -> Vec<Rung> {
        let error = self.study.components.len() - 1;
        (0..=error)
            .filter(|&i| self.is_of_gauge(i))
            .map(|i| {
                if i == error {
                    self.mean_of(2)
                } else {
                    self.without(i)
                }
            })
            .collect()
    }

    /// The step that leaves least; `None` when no change by itself brings the spread down by a hundredth.
    pub fn longest(&self) -> Option<Rung> {
        let now = self.study.figures.gauge.sd.estimate?;
        let steps = self.steps().into_iter();
        let (least, rung) = steps
            .filter_map(|rung| Some((rung.sd.estimate?, rung)))
            .reduce(|a, b| if b.0 < a.0 { b } else { a })?;
        (least < (1.0 - WORTH) * now).then_some(rung)
    }

    /// Without one component, by its place in [`Study::components`].
    pub fn without(&self, component: usize) -> Rung {
        self.rung(Change::Without(component), |i| {
            if i == component { 0.0 } else { 1.0 }
        })
    }

    /// With the mean of so many readings in the place of one, each with a loading of its own.
    pub fn mean_of(&self, readings: u32) -> Rung {
        let error = self.study.components.len() - 1;
        self.rung(Change::MeanOf(readings), |i| {
            if i == error {
                1.0 / f64::from(readings.max(1))
            } else {
                1.0
            }
        })
    }

    fn is_of_gauge(&self, component: usize) -> bool {
        self.study
            .components
            .get(component)
            .is_some_and(|c| c.of != [PART])
    }

    /// The gauge with each component weighted.
    fn rung(&self, change: Change, weight: impl Fn(usize) -> f64) -> Rung {
        let cut = |c: &Component| c.variance.estimate.unwrap_or(0.0);
        let components = self.study.components.iter().enumerate();
        let estimate = components
            .filter(|(i, _)| self.is_of_gauge(*i))
            .map(|(i, c)| weight(i) * cut(c))
            .sum();
        let sd = self.variance(estimate, weight).rising(f64::sqrt);
        let share = &self.study.figures.gauge.share_of_tolerance;
        let total = &self.study.figures.total;
        let per_sd = total.share_of_tolerance.estimate.zip(total.sd.estimate);
        let share_of_tolerance = match (share.estimate, per_sd) {
            (None, _) => Figure::absent(share.why.clone().unwrap_or(NO_SD.into())),
            (Some(_), Some((share, total))) if total > 0.0 => sd.rising(|sd| sd * share / total),
            _ => Figure::absent(NO_SD),
        };
        Rung {
            change,
            sd,
            share_of_tolerance,
        }
    }

    fn variance(&self, estimate: f64, weight: impl Fn(usize) -> f64) -> Figure {
        let Some(table) = &self.table else {
            return Figure::without_limits(estimate, NO_TABLE);
        };
        let ms = &table.recorded.ms;
        let mut left = vec![0.0; ms.len()];
        for (i, component) in table.recorded.components().iter().enumerate() {
            if self.is_of_gauge(i) {
                for (sum, c) in left.iter_mut().zip(component.weights()) {
                    *sum += weight(i) * c;
                }
            }
        }
        // Weights that cancel leave their rounding.
        let largest = left.iter().fold(0.0, |a: f64, c| a.max(c.abs()));
        for c in &mut left {
            if c.abs() < 1e-12 * largest {
                *c = 0.0;
            }
        }
        let members: Vec<usize> = (0..left.len()).filter(|&q| left[q] != 0.0).collect();
        let interval = match members[..] {
            [only]
                if ms[only] == 0.0 && self.study.figures.total.variance.estimate != Some(0.0) =>
            {
                return Figure::without_limits(estimate, NO_REPEATS);
            }
            [] | [_] => Interval::Exact,
            _ => Interval::Mls,
        };
        let bounds = Bounds {
            lower: table.two_sided.lower(&left, ms),
            upper: table.two_sided.upper(&left, ms),
            at_least: table.one_sided.lower(&left, ms),
            interval,
        };
        Figure::new(estimate, bounds.rising(|x| x.max(0.0)))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::{Design, Factor};
    use crate::settings::{Interaction, Judge, Settings, Tolerance};
    use crate::study::analyse;

    fn settings(interaction: Interaction) -> Settings {
        Settings {
            confidence: 0.95,
            spread_sds: 6.0,
            interaction,
            process: None,
            limits: None,
            judge: Judge::Estimate,
        }
    }

    fn study(interaction: Interaction, value: impl Fn(&[usize], usize) -> f64) -> Study {
        let design = Design::new(vec![
            Factor::crossed("part", 4),
            Factor::crossed("appraiser", 3),
        ])
        .unwrap();
        let rows: Vec<(usize, f64)> = (0..12)
            .flat_map(|cell| (0..2).map(move |k| (cell, k)))
            .map(|(cell, k)| (cell, value(&design.levels_of(cell), k)))
            .collect();
        let (cells, values): (Vec<usize>, Vec<f64>) = rows.into_iter().unzip();
        let tolerance = Tolerance {
            lower: Some(-20.0),
            upper: Some(20.0),
            one_sided: None,
        };
        analyse(&design, &cells, &values, &tolerance, &settings(interaction)).unwrap()
    }

    /// Parts -6, -2, 2, 6; appraisers -3, 0, 3; repeats ± 1 about them; interaction by a sign.
    fn invented(levels: &[usize], k: usize) -> f64 {
        let sign = if (levels[0] + levels[1]).is_multiple_of(2) {
            1.0
        } else {
            -1.0
        };
        -6.0 + 4.0 * levels[0] as f64 + 3.0 * (levels[1] as f64 - 1.0) + 2.0 * sign + [-1.0, 1.0][k]
    }

    /// Leaving every other component out one by one must agree with the figures of the study itself.
    #[test]
    fn without_reproducibility_the_gauge_is_its_repeatability() {
        let study = study(Interaction::PoolAbove(0.0), invented);
        assert_eq!(study.components.len(), 3);
        let ladder = Ladder::of(&study).unwrap();
        let rung = ladder.without(1);
        let alone = &study.figures.repeatability;
        let pairs = [
            (rung.sd.estimate, alone.sd.estimate),
            (rung.sd.lower, alone.sd.lower),
            (rung.sd.upper, alone.sd.upper),
            (rung.sd.at_least, alone.sd.at_least),
            (
                rung.share_of_tolerance.upper,
                alone.share_of_tolerance.upper,
            ),
        ];
        for (found, expected) in pairs {
            let (found, expected) = (found.unwrap(), expected.unwrap());
            assert!((found / expected - 1.0).abs() < 1e-12, "{found} {expected}");
        }
        assert_eq!(rung.sd.interval, Some(Interval::Exact));
    }

    #[test]
    fn each_step_leaves_the_sum_of_the_others() {
        let study = study(Interaction::Keep, invented);
        let ladder = Ladder::of(&study).unwrap();
        let v: Vec<f64> = study.components.iter().map(|c| c.raw).collect();
        assert!(v.iter().all(|&v| v > 0.0), "{v:?}");
        let expected = [v[2] + v[3], v[1] + v[3], v[1] + v[2] + v[3] / 2.0];
        let steps = ladder.steps();
        assert_eq!(
            steps.iter().map(|r| r.change).collect::<Vec<_>>(),
            [Change::Without(1), Change::Without(2), Change::MeanOf(2)]
        );
        for (rung, expected) in steps.iter().zip(expected) {
            let sd = rung.sd.estimate.unwrap();
            assert!((sd / expected.sqrt() - 1.0).abs() < 1e-12, "{rung:?}");
            let share = rung.share_of_tolerance.estimate.unwrap();
            assert!((share / (6.0 * sd / 40.0) - 1.0).abs() < 1e-12);
            assert!(rung.sd.lower.unwrap() <= sd && sd <= rung.sd.upper.unwrap());
            assert!(rung.sd.upper <= ladder.now().sd.upper);
        }
        assert_eq!(ladder.longest().unwrap().change, Change::Without(1));
    }

    #[test]
    fn equal_readings_have_nothing_to_take_away() {
        let study = study(Interaction::Keep, |_, _| 7.0);
        let ladder = Ladder::of(&study).unwrap();
        assert_eq!(ladder.longest(), None);
        for rung in ladder.steps() {
            assert_eq!(rung.sd.estimate, Some(0.0));
            assert_eq!(rung.share_of_tolerance.estimate, None);
            assert!(rung.share_of_tolerance.why.is_some());
        }
    }
}
