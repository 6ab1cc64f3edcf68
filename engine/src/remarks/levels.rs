//! Levels of a factor that stand out, such as one appraiser: by an own repeatability, or by an offset from the others.
//!
//! The level named is the one that stands out most of all that were looked at: its p allows for that (Bonferroni), and so
//! do the limits of an offset, which hold for all levels at once. Limits of an own repeatability are those of that level
//! alone.

use super::LEVEL;
use super::luck::f_above;
use super::material::{Material, remark};
use super::step;
use super::words::{list, number};
use crate::consistency::{Cell, Own, RangeChart, mandel_h, mandel_k};
use crate::quantile::{Side, f};
use crate::record::Remark;

/// An offset is worth a remark from this part of the gauge's variance on.
const MATTERS: f64 = 0.1;
/// The other levels are named up to this many.
const NAMED_MAX: usize = 3;

struct Widest {
    factor: usize,
    level: usize,
    own: Own,
    others: Own,
    k: f64,
    p: f64,
}

/// The level whose repeats spread wider than those of all others; `named` cells are left out.
pub(super) fn spread(material: &Material<'_>, named: &[usize]) -> Option<Remark> {
    let tests = compared(material)
        .map(|f| material.design.factors()[f].levels)
        .sum::<usize>();
    let widest = compared(material)
        .filter_map(|factor| widest(material, factor, tests, named))
        .min_by(|a, b| a.p.total_cmp(&b.p))?;
    (widest.p <= LEVEL).then(|| wide(material, &widest))
}

/// Factors whose levels are the same in every combination of the others, parts apart.
fn compared<'a>(material: &'a Material<'_>) -> impl Iterator<Item = usize> + 'a {
    let factors = material.design.factors().iter().enumerate();
    factors
        .filter(|(f, factor)| {
            *f != material.design.part() && factor.levels > 1 && factor.within.is_empty()
        })
        .map(|(f, _)| f)
}

fn widest(material: &Material<'_>, factor: usize, tests: usize, named: &[usize]) -> Option<Widest> {
    let levels = material.design.factors()[factor].levels;
    let mut cells_of: Vec<Vec<Cell>> = vec![Vec::new(); levels];
    for (cell, brief) in material.brief.iter().enumerate() {
        if !named.contains(&cell) {
            cells_of[material.design.levels_of(cell)[factor]].push(*brief);
        }
    }
    let own: Vec<Own> = cells_of.iter().map(Own::pooled).collect::<Option<_>>()?;
    let variances: Vec<f64> = own.iter().map(|o| o.variance).collect();
    let k = mandel_k(&variances)?;
    let level =
        (0..levels).max_by(|&a, &b| variances[a].total_cmp(&variances[b]).then(b.cmp(&a)))?;
    let others = cells_of.iter().enumerate().filter(|(l, _)| *l != level);
    let others = Own::pooled(others.flat_map(|(_, cells)| cells))?;
    let beside = others.variance.max(step::least_variance(material));
    let ratio = own[level].variance / beside;
    let p = tests as f64 * f_above(ratio, own[level].df as f64, others.df as f64);
    Some(Widest {
        factor,
        level,
        own: own[level],
        others,
        k: k[level],
        p: if beside == 0.0 { 0.0 } else { p.min(1.0) },
    })
}

fn wide(material: &Material<'_>, widest: &Widest) -> Remark {
    let (lower, upper) = widest.own.limits(material.study.confidence);
    let (lower, upper) = (lower.sqrt(), upper.sqrt());
    let sd = widest.own.variance.sqrt();
    let others = widest.others.variance.sqrt();
    let who = material.level(widest.factor, widest.level);
    let text = format!(
        "{who} repeats worse than the others: an own repeatability of {} ({} limits {}) against {} for the others.{}",
        material.length(sd),
        material.confidence(),
        material.lengths(lower, upper),
        material.length(others),
        widest_cell(material, widest).unwrap_or_default(),
    );
    let figures = [
        ("sd", sd),
        ("lower", lower),
        ("upper", upper),
        ("sd of the others", others),
        ("mandel k", widest.k),
        ("p", widest.p),
    ];
    remark("repeatability of a level", text, &figures)
}

/// The level's widest cell, when it is beyond the limit of the range chart.
fn widest_cell(material: &Material<'_>, widest: &Widest) -> Option<String> {
    let chart = RangeChart::of(material.trials()?)?;
    let cells = &material.brief;
    let limit = chart.upper * cells.iter().map(|c| c.range).sum::<f64>() / cells.len() as f64;
    let cell = (0..cells.len())
        .filter(|&c| material.design.levels_of(c)[widest.factor] == widest.level)
        .max_by(|&a, &b| cells[a].range.total_cmp(&cells[b].range).then(b.cmp(&a)))
        .filter(|&c| cells[c].range > limit)?;
    Some(format!(
        " The widest cell is {}: range {}, range-chart limit {}.",
        material.cell(cell),
        number(cells[cell].range),
        number(limit),
    ))
}

struct Offset {
    factor: usize,
    level: usize,
    /// Levels that were looked at.
    tests: usize,
    /// From the mean of the other levels.
    by: f64,
    error: f64,
    df: f64,
    h: f64,
    p: f64,
}

/// The level that reads furthest from the others, when that is more than luck and matters to the gauge.
pub(super) fn offset(material: &Material<'_>) -> Option<Remark> {
    let tests = compared(material)
        .map(|f| material.design.factors()[f].levels)
        .sum::<usize>();
    let furthest = compared(material)
        .filter_map(|factor| furthest(material, factor, tests))
        .min_by(|a, b| a.p.total_cmp(&b.p))?;
    let name = &material.design.factors()[furthest.factor].name;
    let matters = material
        .of_gauge(name)
        .is_some_and(|share| share >= MATTERS);
    (furthest.p <= LEVEL && matters).then(|| apart(material, &furthest))
}

fn furthest(material: &Material<'_>, factor: usize, tests: usize) -> Option<Offset> {
    let trials = material.trials().filter(|&t| t > 0)? as f64;
    let levels = material.design.factors()[factor].levels;
    let n = material.brief.len() as f64 * trials;
    let mut means = vec![0.0; levels];
    for (cell, brief) in material.brief.iter().enumerate() {
        means[material.design.levels_of(cell)[factor]] += brief.mean * trials * levels as f64 / n;
    }
    let line = of_factor(material, factor)?;
    let denominator = denominator(material, factor)?;
    let df = line.against_df?;
    let h = mandel_h(&means)?;
    let level = (0..levels).max_by(|&a, &b| h[a].abs().total_cmp(&h[b].abs()).then(b.cmp(&a)))?;
    let others = means.iter().sum::<f64>() - means[level];
    let by = means[level] - others / (levels - 1) as f64;
    // Variance of a level's mean less the mean of the other levels, when the levels do not differ.
    let error = (denominator / n * (levels * levels) as f64 / (levels - 1) as f64).sqrt();
    let p = tests as f64 * f_above((by / error).powi(2), 1.0, df);
    Some(Offset {
        factor,
        level,
        tests,
        by,
        error,
        df,
        h: h[level],
        p: p.min(1.0),
    })
}

fn of_factor<'a>(material: &Material<'a>, factor: usize) -> Option<&'a crate::record::MeanSquare> {
    let name = &material.design.factors()[factor].name;
    let lines = &material.study.mean_squares;
    lines
        .iter()
        .find(|l| l.within.is_empty() && l.of.len() == 1 && l.of[0] == *name)
}

/// The mean square that the factor is held against; absent where it is not above zero.
fn denominator(material: &Material<'_>, factor: usize) -> Option<f64> {
    let against = of_factor(material, factor)?.against.as_ref()?;
    let lines = &material.study.mean_squares;
    let terms = against.iter().map(|term| {
        let line = lines.iter().find(|l| l.name == term.name.as_str())?;
        Some(term.weight * line.ms?)
    });
    let sum = terms.sum::<Option<f64>>()?;
    (sum >= 0.0).then_some(sum)
}

fn apart(material: &Material<'_>, offset: &Offset) -> Remark {
    let outside = (1.0 - material.study.confidence) / offset.tests as f64;
    let reach = offset.error * f(Side::Above, outside, 1.0, offset.df).sqrt();
    let (near, far) = (offset.by.abs() - reach, offset.by.abs() + reach);
    let levels = material.design.factors()[offset.factor].levels;
    let others: Vec<String> = (0..levels)
        .filter(|&l| l != offset.level)
        .map(|l| material.level(offset.factor, l))
        .collect();
    let others = if others.len() > NAMED_MAX {
        format!("the other {}", others.len())
    } else {
        list(&others)
    };
    let side = if offset.by > 0.0 { "above" } else { "below" };
    let text = format!(
        "{} reads {} {side} {others} on average ({} limits {}){}.",
        material.level(offset.factor, offset.level),
        material.length(offset.by.abs()),
        material.confidence(),
        material.lengths(near, far),
        on_parts(material, offset).unwrap_or_default(),
    );
    let figures = [
        ("offset", offset.by),
        ("lower", offset.by - reach),
        ("upper", offset.by + reach),
        ("mandel h", offset.h),
        ("p", offset.p),
    ];
    remark("offset of a level", text, &figures)
}

/// On how many parts the offset has its sign.
fn on_parts(material: &Material<'_>, offset: &Offset) -> Option<String> {
    let square = material.square().filter(|s| s.factor == offset.factor)?;
    let from_others = |part: usize| {
        let mean = |level: usize| material.brief[square.cell(part, level)].mean;
        let others: f64 = (0..square.levels)
            .filter(|&l| l != offset.level)
            .map(mean)
            .sum();
        mean(offset.level) - others / (square.levels - 1) as f64
    };
    let same = (0..square.parts)
        .filter(|&i| from_others(i) * offset.by > 0.0)
        .count();
    Some(if same == square.parts {
        format!(", on all {same} parts")
    } else {
        format!(", on {same} of {} parts", square.parts)
    })
}
