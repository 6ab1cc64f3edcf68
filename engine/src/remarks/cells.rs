//! Cells that stand out: by the spread of their repeats, or by a mean that neither part nor level explains.
//!
//! Sources: ISO 5725-2:1994, 7.3.3 (Cochran); Stefansky, *Technometrics* 14 (1972) 469–479 (largest departure in a
//! two-way table).

use super::LEVEL;
use super::luck::{at_least, f_above};
use super::material::{Found, Material, Square, remark};
use super::step;
use super::words::{list, number, percent};
use crate::consistency::{Cell, Cochran, Own, RangeChart, cochran};

/// The interaction is worth a remark from this part of the gauge's variance on.
const MATTERS: f64 = 0.1;
/// Cells named in one sentence.
const NAMED_MAX: usize = 3;

/// One cell repeats worse than all others, or more cells than luck explains exceed the limit of the range chart.
pub(super) fn spread(material: &Material<'_>) -> Option<Found> {
    let trials = material.trials().filter(|&t| t > 1)?;
    let cells = &material.brief;
    let cochran = beside_rounding(cochran(cells)?, cells, step::least_variance(material));
    let chart = RangeChart::of(trials);
    let mean_range = cells.iter().map(|c| c.range).sum::<f64>() / cells.len() as f64;
    // A range of rounded readings may be one step wider than the readings were.
    let rounding = step::step(&material.shifted).unwrap_or(0.0);
    let mut above: Vec<usize> = chart.map_or_else(Vec::new, |chart| {
        let limit = chart.upper * mean_range + rounding;
        (0..cells.len())
            .filter(|&c| cells[c].range > limit)
            .collect()
    });
    above.sort_by(|&a, &b| cells[b].range.total_cmp(&cells[a].range).then(a.cmp(&b)));
    let p_count = chart.map_or(1.0, |chart| {
        at_least(above.len(), cells.len(), chart.beyond)
    });
    if cochran.p.min(p_count) > LEVEL / 2.0 {
        return None;
    }
    let limit = chart.map(|chart| chart.upper * mean_range);
    let found = if cochran.p <= p_count || above.len() < 2 {
        one_wide(material, &cochran, limit)
    } else {
        several_wide(material, &above, limit.unwrap_or(0.0), p_count)
    };
    Some(found)
}

/// Cochran's C with the p that it has when the other cells spread by rounding at least.
fn beside_rounding(cochran: Cochran, cells: &[Cell], least: f64) -> Cochran {
    let beside = cells.iter().enumerate().filter(|(c, _)| *c != cochran.cell);
    let others = Own::pooled(beside.map(|(_, cell)| cell));
    let (Some(own), Some(others)) = (Own::pooled([&cells[cochran.cell]]), others) else {
        return cochran;
    };
    if others.variance >= least {
        return cochran;
    }
    let tail = f_above(own.variance / least, own.df as f64, others.df as f64);
    Cochran {
        p: (cells.len() as f64 * tail).min(1.0),
        ..cochran
    }
}

fn one_wide(material: &Material<'_>, cochran: &Cochran, limit: Option<f64>) -> Found {
    let range = material.brief[cochran.cell].range;
    let chart = limit.map_or_else(String::new, |limit| {
        format!(" (range-chart limit {})", number(limit))
    });
    let text = format!(
        "{} repeats worse than every other cell: its range is {}{chart}, and it holds {} of the squared deviations \
         within all {} cells. Look for a slip in one of its runs before trusting the repeatability.",
        material.cell(cochran.cell),
        material.length(range),
        percent(cochran.statistic),
        material.brief.len(),
    );
    Found {
        cells: vec![cochran.cell],
        remark: remark(
            "spread of a cell",
            text,
            &[
                ("range", range),
                ("range limit", limit.unwrap_or(f64::NAN)),
                ("cochran", cochran.statistic),
                ("p", cochran.p),
            ],
        ),
    }
}

fn several_wide(material: &Material<'_>, above: &[usize], limit: f64, p: f64) -> Found {
    let named: Vec<String> = above
        .iter()
        .take(NAMED_MAX)
        .map(|&c| format!("{} ({})", material.cell(c), number(material.brief[c].range)))
        .collect();
    let most = if above.len() > NAMED_MAX {
        "the widest are"
    } else {
        "they are"
    };
    let text = format!(
        "{} of {} cells have a range above the range-chart limit of {}, more than luck gives; {most} {}.",
        above.len(),
        material.brief.len(),
        material.length(limit),
        list(&named),
    );
    Found {
        cells: above.to_vec(),
        remark: remark(
            "spread of cells",
            text,
            &[
                ("cells above", above.len() as f64),
                ("range limit", limit),
                ("p", p),
            ],
        ),
    }
}

/// A cell, or a few, that make the interaction.
pub(super) fn mean(material: &Material<'_>) -> Option<Found> {
    let square = material.square().filter(|s| s.df() > 1)?;
    let departures = square.departures(|cell| material.brief[cell].mean);
    let mut cells: Vec<(usize, f64)> = (0..square.parts)
        .flat_map(|i| (0..square.levels).map(move |j| (i, j)))
        .map(|(i, j)| (square.cell(i, j), departures[i][j]))
        .collect();
    cells.sort_by(|a, b| b.1.abs().total_cmp(&a.1.abs()).then(a.0.cmp(&b.0)));
    let total: f64 = cells.iter().map(|(_, d)| d * d).sum();
    let &(cell, departure) = cells.first()?;
    if material.is_rounding(total, cells.len()) {
        return None;
    }
    let least = step::least_variance(material);
    let p = p_of_largest(&square, departure, total, least);
    if p <= LEVEL / 2.0 {
        return Some(one_off(material, &square, cell, departure, p));
    }
    let seen = material.study.interaction.p.filter(|_| square.trials > 1)?;
    let df = square.df() as f64;
    let rounding = f_above(total / df / least, df, material.within().1 as f64);
    let interaction = seen.max(rounding);
    let name = material.study.components.iter().find(|c| c.of.len() == 2)?;
    let matters = material.of_gauge(&name.name).is_some_and(|s| s >= MATTERS);
    (interaction <= LEVEL / 2.0 && matters)
        .then(|| several_off(material, &square, &cells, total, interaction))
}

/// Upper bound (Bonferroni) of the chance that the largest departure of a sound table is this large, when a cell mean
/// has the variance `least` at least: repeats that round alike average nothing out.
fn p_of_largest(square: &Square, departure: f64, total: f64, least: f64) -> f64 {
    let df = square.df() as f64;
    let cells = (square.parts * square.levels) as f64;
    let own = departure * departure * cells / df;
    let rest = (total - own).max(least * (df - 1.0));
    let ratio = own / rest * (df - 1.0);
    (cells * f_above(ratio, 1.0, df - 1.0)).min(1.0)
}

fn one_off(material: &Material<'_>, square: &Square, cell: usize, departure: f64, p: f64) -> Found {
    // The cell pulls its own part and level along; against the others it departs by more.
    let of_others = departure * (square.parts * square.levels) as f64 / square.df() as f64;
    let side = if departure > 0.0 { "above" } else { "below" };
    let (part, level) = parts_of(material, square, cell);
    let text = format!(
        "{} lies {} {side} what its other readings let expect of {part} and of {level}; no other cell departs like \
         this. Check its runs.",
        material.cell(cell),
        material.length(of_others.abs()),
    );
    Found {
        cells: vec![cell],
        remark: remark(
            "mean of a cell",
            text,
            &[("departure", of_others), ("p", p)],
        ),
    }
}

fn several_off(
    material: &Material<'_>,
    square: &Square,
    cells: &[(usize, f64)],
    total: f64,
    p: f64,
) -> Found {
    let few = &cells[..NAMED_MAX.min(cells.len())];
    let held: f64 = few.iter().map(|(_, d)| d * d).sum::<f64>() / total;
    let named: Vec<String> = few
        .iter()
        .map(|&(cell, d)| {
            let sign = if d < 0.0 { "−" } else { "+" };
            format!("{} ({sign}{})", material.cell(cell), number(d.abs()))
        })
        .collect();
    let text = format!(
        "The interaction of part and {} is larger than luck gives (p {}); {} of it lies in {}.",
        material.word(square.factor),
        number(p),
        percent(held),
        list(&named),
    );
    Found {
        cells: few.iter().map(|&(cell, _)| cell).collect(),
        remark: remark(
            "cells of the interaction",
            text,
            &[("share of the sum of squares", held), ("p", p)],
        ),
    }
}

fn parts_of(material: &Material<'_>, square: &Square, cell: usize) -> (String, String) {
    let levels = material.design.levels_of(cell);
    let part = material.design.part();
    let level = material.level(square.factor, levels[square.factor]);
    (material.level(part, levels[part]), level)
}
