//! Why a gauge takes what it takes: the largest source of its variance, and where in the readings it shows.
//!
//! Model: sources are the components of the study, cut at zero. The largest names the cause; means and ranges of
//! the readings name the level or the cell.
//!
//! Not here: words (`telling`); what would be left without the source, which is the engine's ladder.

use restudy_engine::ladder::Ladder;
use restudy_engine::{PART, WITHIN_CELLS};

use crate::evidence::{Evidence, Feature};
use crate::plain::{in_error, stands_out};
use crate::record::Record;

/// The largest source.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Cause {
    pub(super) source: Source,
    /// Of the gauge's variance, 0 to 1.
    pub(super) of_gauge: f64,
    /// Share of tolerance without this source.
    pub(super) without: Option<f64>,
}

/// Where the variance comes from; lengths in reading units.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Source {
    /// One level of a factor reads higher (or lower, below zero) than the others.
    Level {
        factor: usize,
        level: usize,
        by: f64,
        parts: usize,
    },
    /// The levels of a factor differ, none alone.
    Levels {
        factor: usize,
        lowest: usize,
        highest: usize,
        by: f64,
    },
    /// Factors act together; with the part in it, the cell of part and level that is furthest off.
    Together {
        factors: Vec<usize>,
        furthest: Option<(usize, usize, f64)>,
    },
    /// Repeats within a cell: the widest cell's levels and its range, and the term that one trial leaves in them.
    Repeatability {
        widest: Option<(Vec<usize>, f64)>,
        with: Option<String>,
    },
}

/// The largest source of the gauge's variance; `None` when there is no variance, or it cannot be told apart.
pub(super) fn of(evidence: &Evidence, feature: &Feature, record: &Record) -> Option<Cause> {
    let study = &record.study;
    let gauge = study.figures.gauge.variance.estimate.filter(|v| *v > 0.0)?;
    let components = study.components.iter().enumerate();
    let (place, component, variance) = components
        .filter(|(_, c)| c.of != [PART])
        .filter_map(|(i, c)| Some((i, c, c.variance.estimate?)))
        .max_by(|a, b| a.2.total_cmp(&b.2))?;
    let source = if component.name == WITHIN_CELLS {
        Source::Repeatability {
            widest: widest(evidence, feature),
            with: in_error(study).map(|term| term.name),
        }
    } else {
        let factors: Vec<usize> = component
            .of
            .iter()
            .filter_map(|name| evidence.factors.iter().position(|f| f.name == *name))
            .collect();
        match factors[..] {
            [factor] => levels(evidence, feature, factor)?,
            _ => Source::Together {
                furthest: furthest(evidence, feature, &factors),
                factors,
            },
        }
    };
    let left = Ladder::of(study).map(|ladder| ladder.without(place));
    Some(Cause {
        source,
        of_gauge: (variance / gauge).min(1.0),
        without: left.and_then(|rung| rung.share_of_tolerance.estimate),
    })
}

/// `means[part][level]`; `None` when a combination has no reading.
fn means(evidence: &Evidence, feature: &Feature, factor: usize) -> Option<Vec<Vec<f64>>> {
    let part = evidence.factors.iter().position(|f| f.name == PART)?;
    let (parts, levels) = (
        evidence.factors[part].levels.len(),
        evidence.factors[factor].levels.len(),
    );
    let mut sums = vec![vec![(0.0, 0_u32); levels]; parts];
    let origin = *feature.values.first()?;
    for (run, value) in feature.runs.iter().zip(&feature.values) {
        let at = &evidence.runs.get(*run)?.levels;
        let (sum, n) = &mut sums[*at.get(part)?][*at.get(factor)?];
        *sum += value - origin;
        *n += 1;
    }
    let mean = |(sum, n): (f64, u32)| (n > 0).then(|| sum / f64::from(n));
    sums.into_iter()
        .map(|row| row.into_iter().map(mean).collect())
        .collect()
}

fn levels(evidence: &Evidence, feature: &Feature, factor: usize) -> Option<Source> {
    let means = means(evidence, feature, factor)?;
    let parts = means.len();
    let count = evidence.factors[factor].levels.len();
    let overall: Vec<f64> = (0..count)
        .map(|l| means.iter().map(|row| row[l]).sum::<f64>() / parts as f64)
        .collect();
    let from_others = |row: &[f64], level: usize| {
        let others = row
            .iter()
            .enumerate()
            .filter(|(l, _)| *l != level)
            .map(|(_, m)| m);
        row[level] - others.sum::<f64>() / (count - 1) as f64
    };
    let extreme =
        |sign: f64| (0..count).max_by(|a, b| (sign * overall[*a]).total_cmp(&(sign * overall[*b])));
    let (lowest, highest) = (extreme(-1.0)?, extreme(1.0)?);
    if let Some((level, by)) = stands_out(&overall) {
        let parts = means
            .iter()
            .filter(|row| from_others(row, level) * by > 0.0)
            .count();
        return Some(Source::Level {
            factor,
            level,
            by,
            parts,
        });
    }
    Some(Source::Levels {
        factor,
        lowest,
        highest,
        by: overall[highest] - overall[lowest],
    })
}

/// The part and level whose mean is furthest from what part and level alone would give.
fn furthest(
    evidence: &Evidence,
    feature: &Feature,
    factors: &[usize],
) -> Option<(usize, usize, f64)> {
    let [part, factor] = factors[..] else {
        return None;
    };
    if evidence.factors[part].name != PART {
        return None;
    }
    let means = means(evidence, feature, factor)?;
    let (parts, count) = (means.len() as f64, evidence.factors[factor].levels.len());
    let row_mean = |row: &[f64]| row.iter().sum::<f64>() / count as f64;
    let columns: Vec<f64> = (0..count)
        .map(|l| means.iter().map(|row| row[l]).sum::<f64>() / parts)
        .collect();
    let grand = row_mean(&columns);
    let off = means.iter().enumerate().flat_map(|(p, row)| {
        let columns = &columns;
        let of_row = row_mean(row);
        row.iter()
            .enumerate()
            .map(move |(l, mean)| (p, l, mean - of_row - columns[l] + grand))
    });
    off.max_by(|a, b| a.2.abs().total_cmp(&b.2.abs()))
}

/// The cell with the largest range, where cells have repeats.
fn widest(evidence: &Evidence, feature: &Feature) -> Option<(Vec<usize>, f64)> {
    let mut cells: Vec<Option<(usize, f64, f64)>> = Vec::new();
    for ((cell, run), value) in feature.cells.iter().zip(&feature.runs).zip(&feature.values) {
        if cells.len() <= *cell {
            cells.resize(cell + 1, None);
        }
        let (_, low, high) = cells[*cell].get_or_insert((*run, *value, *value));
        (*low, *high) = (low.min(*value), high.max(*value));
    }
    let (run, low, high) = cells
        .into_iter()
        .flatten()
        .max_by(|a, b| (a.2 - a.1).total_cmp(&(b.2 - b.1)))?;
    (high > low).then(|| Some((evidence.runs.get(run)?.levels.clone(), high - low)))?
}
