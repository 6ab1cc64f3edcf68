//! The readings of a study, arranged for looking at, and the names of their places.
//!
//! Invariant: all values are taken from the first reading, so that a large offset costs no digits.

use std::collections::BTreeMap;

use super::Context;
use super::words::number;
use crate::consistency::{Cell, in_cells};
use crate::design::Design;
use crate::record::{Remark, Study};
use crate::settings::Tolerance;

/// Roundings that a mean or a difference of readings gathers.
const ROUNDINGS: f64 = 8.0;

/// A study's readings with everything the remarks look at.
pub(super) struct Material<'a> {
    pub(super) design: &'a Design,
    pub(super) cells: &'a [usize],
    /// As read.
    pub(super) values: &'a [f64],
    /// From the first reading.
    pub(super) shifted: Vec<f64>,
    /// Differences up to this are rounding of the readings to f64.
    rounding: f64,
    /// Every cell in brief, its mean from the first reading.
    pub(super) brief: Vec<Cell>,
    pub(super) study: &'a Study,
    pub(super) tolerance: &'a Tolerance,
    context: &'a Context<'a>,
}

/// A remark about some cells.
pub(super) struct Found {
    pub(super) cells: Vec<usize>,
    pub(super) remark: Remark,
}

/// A study of parts crossed with one other factor, every cell filled equally.
pub(super) struct Square {
    /// The other factor.
    pub(super) factor: usize,
    pub(super) parts: usize,
    pub(super) levels: usize,
    pub(super) trials: usize,
    part_first: bool,
}

impl Square {
    pub(super) fn cell(&self, part: usize, level: usize) -> usize {
        if self.part_first {
            part * self.levels + level
        } else {
            level * self.parts + part
        }
    }

    /// What each cell mean departs from its part and its level, `[part][level]`.
    pub(super) fn departures(&self, means: impl Fn(usize) -> f64) -> Vec<Vec<f64>> {
        let (p, l) = (self.parts as f64, self.levels as f64);
        let mut table: Vec<Vec<f64>> = (0..self.parts)
            .map(|i| (0..self.levels).map(|j| means(self.cell(i, j))).collect())
            .collect();
        for row in &mut table {
            let mean = row.iter().sum::<f64>() / l;
            row.iter_mut().for_each(|x| *x -= mean);
        }
        for level in 0..self.levels {
            let mean = table.iter().map(|row| row[level]).sum::<f64>() / p;
            table.iter_mut().for_each(|row| row[level] -= mean);
        }
        table
    }

    /// Degrees of freedom of the departures.
    pub(super) fn df(&self) -> usize {
        (self.parts - 1) * (self.levels - 1)
    }
}

impl<'a> Material<'a> {
    /// `None` when the readings do not belong to the design.
    pub(super) fn new(
        design: &'a Design,
        cells: &'a [usize],
        values: &'a [f64],
        study: &'a Study,
        tolerance: &'a Tolerance,
        context: &'a Context<'a>,
    ) -> Option<Material<'a>> {
        let origin = *values.first()?;
        let belongs = cells.len() == values.len()
            && cells.iter().all(|&c| c < design.cells())
            && values.iter().all(|y| y.is_finite());
        if !belongs {
            return None;
        }
        let shifted: Vec<f64> = values.iter().map(|y| y - origin).collect();
        let rounding =
            ROUNDINGS * f64::EPSILON * values.iter().map(|y| y.abs()).fold(0.0, f64::max);
        let mut brief = in_cells(design.cells(), cells, &shifted);
        for cell in brief.iter_mut().filter(|cell| cell.range <= rounding) {
            cell.range = 0.0;
            cell.squares = 0.0;
        }
        Some(Material {
            design,
            cells,
            values,
            brief,
            shifted,
            rounding,
            study,
            tolerance,
            context,
        })
    }

    /// Readings in every cell, when all have equally many.
    pub(super) fn trials(&self) -> Option<usize> {
        let count = self.brief.first()?.count;
        self.brief.iter().all(|c| c.count == count).then_some(count)
    }

    pub(super) fn square(&self) -> Option<Square> {
        let [first, second] = self.design.factors() else {
            return None;
        };
        let part = self.design.part();
        let crossed = first.within.is_empty() && second.within.is_empty();
        let (parts, levels) = if part == 0 {
            (first.levels, second.levels)
        } else {
            (second.levels, first.levels)
        };
        let trials = self.trials().filter(|&t| t > 0)?;
        (crossed && parts > 1 && levels > 1).then_some(Square {
            factor: 1 - part,
            parts,
            levels,
            trials,
            part_first: part == 0,
        })
    }

    /// Each reading less the mean of its cell.
    pub(super) fn within_cells(&self) -> Vec<f64> {
        let rows = self.cells.iter().zip(&self.shifted);
        rows.map(|(&c, y)| match &self.brief[c] {
            cell if cell.range == 0.0 => 0.0,
            cell => y - cell.mean,
        })
        .collect()
    }

    /// Whether a sum of so many squares is rounding alone.
    pub(super) fn is_rounding(&self, squares: f64, count: usize) -> bool {
        squares <= count as f64 * self.rounding * self.rounding
    }

    /// Sum of squares and degrees of freedom within cells.
    pub(super) fn within(&self) -> (f64, usize) {
        self.brief.iter().fold((0.0, 0), |(squares, df), cell| {
            (squares + cell.squares, df + cell.count.saturating_sub(1))
        })
    }

    /// When each reading was taken; only when every one is known.
    pub(super) fn taken(&self) -> Option<Vec<f64>> {
        let taken: Option<Vec<f64>> = self.context.taken.iter().copied().collect();
        taken.filter(|t| t.len() == self.values.len() && t.iter().all(|t| t.is_finite()))
    }

    /// Which trial of its cell each reading is.
    pub(super) fn trial_of_row(&self) -> Option<&[usize]> {
        let trials = self.context.trials.as_slice();
        (trials.len() == self.values.len()).then_some(trials)
    }

    /// What the factor is called.
    pub(super) fn word(&self, factor: usize) -> &str {
        self.context
            .factors
            .get(factor)
            .map(|names| names.word)
            .filter(|word| !word.is_empty())
            .unwrap_or(&self.design.factors()[factor].name)
    }

    /// What a level of a factor that is not nested is called; a mere number gets the factor's word.
    pub(super) fn level(&self, factor: usize, level: usize) -> String {
        self.named(factor, level, level)
    }

    fn named(&self, factor: usize, place: usize, level: usize) -> String {
        let names = self.context.factors.get(factor);
        match names.and_then(|names| names.levels.get(place)) {
            Some(name) if name.starts_with(|c: char| c.is_ascii_digit()) => {
                format!("{} {name}", self.word(factor))
            }
            Some(name) => (*name).to_owned(),
            None => format!("{} {}", self.word(factor), level + 1),
        }
    }

    /// What a cell is called: `P03 MO`.
    pub(super) fn cell(&self, cell: usize) -> String {
        let levels = self.design.levels_of(cell);
        let names = levels.iter().enumerate().map(|(f, &level)| {
            let place = self.design.place_within_containers(f, &levels);
            self.named(f, place, level)
        });
        names.collect::<Vec<String>>().join(" ")
    }

    /// A length with its unit.
    pub(super) fn length(&self, x: f64) -> String {
        match self.context.unit {
            Some(unit) => format!("{} {unit}", number(x)),
            None => number(x),
        }
    }

    /// Two lengths with their unit: `0.23 to 0.44 mm`.
    pub(super) fn lengths(&self, from: f64, to: f64) -> String {
        format!("{} to {}", number(from), self.length(to))
    }

    /// `95 %`.
    pub(super) fn confidence(&self) -> String {
        let text = format!("{:.4}", 100.0 * self.study.confidence);
        format!("{} %", text.trim_end_matches('0').trim_end_matches('.'))
    }

    /// Gauge variance that a component accounts for, 0 to 1.
    pub(super) fn of_gauge(&self, component: &str) -> Option<f64> {
        let gauge = self.study.figures.gauge.variance.estimate?;
        let component = self.study.components.iter().find(|c| c.name == component)?;
        let share = component.variance.estimate? / gauge;
        share.is_finite().then_some(share)
    }
}

/// A remark; figures that are no finite number are left out.
pub(super) fn remark(kind: &'static str, text: String, figures: &[(&str, f64)]) -> Remark {
    let figures: BTreeMap<String, f64> = figures
        .iter()
        .filter(|(_, x)| x.is_finite())
        .map(|&(name, x)| (name.to_owned(), x))
        .collect();
    Remark {
        kind,
        text,
        figures,
    }
}
