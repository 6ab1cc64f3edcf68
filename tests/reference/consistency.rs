//! Consistency of cells and appraisers: statistics and critical values of published data, in exact and 40-digit
//! arithmetic, and the range-chart constants by quadrature.
//!
//! The tables of ISO 5725-2 (8 laboratories, 3 replicates) are quoted from memory, to the digits printed there.

use restudy_engine::consistency::{
    Cell, Own, RangeChart, cochran, cochran_critical, in_cells, mandel_h, mandel_h_critical,
    mandel_k, mandel_k_critical,
};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{Fixture, PART_APPRAISER, fixture, values};

/// Cells by part and appraiser, in the order of the reference.
struct Table {
    cells: Vec<Cell>,
    parts: usize,
    appraisers: usize,
}

impl Table {
    fn of(fixture: &Fixture) -> Table {
        let placed = fixture.placed(PART_APPRAISER);
        let levels: Vec<usize> = placed.design.factors().iter().map(|f| f.levels).collect();
        Table {
            cells: in_cells(placed.design.cells(), &placed.cells, &placed.values),
            parts: levels[0],
            appraisers: levels[1],
        }
    }

    fn cell(&self, part: usize, appraiser: usize) -> &Cell {
        &self.cells[part * self.appraisers + appraiser]
    }

    fn of_part(&self, part: usize) -> Vec<Cell> {
        (0..self.appraisers).map(|a| *self.cell(part, a)).collect()
    }

    fn of_appraiser(&self, appraiser: usize) -> Vec<Cell> {
        (0..self.parts).map(|p| *self.cell(p, appraiser)).collect()
    }

    fn df(&self) -> usize {
        self.cells[0].count - 1
    }
}

fn list(check: &mut Check, field: &str, found: Option<Vec<f64>>, expected: &Value) {
    for (i, expected) in expected.as_array().unwrap().iter().enumerate() {
        let found = found.as_ref().map(|f| f[i]);
        check.digits(&format!("{field} {i}"), found, expected);
    }
}

fn cells(check: &mut Check, table: &Table, expected: &Value) {
    for part in 0..table.parts {
        for appraiser in 0..table.appraisers {
            let cell = table.cell(part, appraiser);
            let place = format!("cell {part} {appraiser}");
            for (field, found) in [
                ("cell_mean", Some(cell.mean)),
                ("cell_variance", cell.variance()),
                ("cell_range", Some(cell.range)),
            ] {
                let expected = &expected[field][part][appraiser];
                check.digits(&format!("{place} {field}"), found, expected);
            }
        }
    }
}

fn cochrans_c(check: &mut Check, table: &Table, expected: &Value) {
    let found = cochran(&table.cells);
    check.digits("cells", Some(table.cells.len() as f64), &expected["cells"]);
    check.digits(
        "df of a cell",
        Some(table.df() as f64),
        &expected["df_per_cell"],
    );
    check.digits("C", found.map(|c| c.statistic), &expected["statistic"]);
    check.digits(
        "p of C",
        found.map(|c| c.p),
        &expected["p_value_bonferroni"],
    );
    for level in ["0.05", "0.01"] {
        let critical = cochran_critical(table.cells.len(), table.df(), level.parse().unwrap());
        check.digits("critical C", Some(critical), &expected["critical"][level]);
    }
}

fn mandel(check: &mut Check, table: &Table, expected: &Value) {
    let variances = |cells: &[Cell]| {
        cells
            .iter()
            .map(|c| c.variance().unwrap())
            .collect::<Vec<_>>()
    };
    let means = |cells: &[Cell]| cells.iter().map(|c| c.mean).collect::<Vec<_>>();
    let per_part = &expected["mandel_per_part"];
    for part in 0..table.parts {
        let row = table.of_part(part);
        list(
            check,
            "h of a part",
            mandel_h(&means(&row)),
            &per_part["h"][part],
        );
        list(
            check,
            "k of a part",
            mandel_k(&variances(&row)),
            &per_part["k"][part],
        );
    }
    let appraisers = || (0..table.appraisers).map(|a| table.of_appraiser(a));
    let overall = &expected["mandel_overall"];
    let mean = |cells: Vec<Cell>| means(&cells).iter().sum::<f64>() / cells.len() as f64;
    let pooled = |cells: Vec<Cell>| Own::pooled(&cells).unwrap().variance;
    let h = mandel_h(&appraisers().map(mean).collect::<Vec<_>>());
    let k = mandel_k(&appraisers().map(pooled).collect::<Vec<_>>());
    list(check, "h overall", h, &overall["h"]);
    list(check, "k overall", k, &overall["k"]);
    for (block, df) in [(per_part, table.df()), (overall, table.df() * table.parts)] {
        for level in ["0.05", "0.01"] {
            let alpha = level.parse().unwrap();
            let h = mandel_h_critical(table.appraisers, alpha);
            let k = mandel_k_critical(table.appraisers, df, alpha);
            check.digits("critical h", h, &block["critical"][level]["h"]);
            check.digits("critical k", Some(k), &block["critical"][level]["k"]);
        }
    }
}

fn range_chart(check: &mut Check, table: &Table, expected: &Value) {
    let chart = RangeChart::of(table.df() + 1).unwrap();
    let mean = table.cells.iter().map(|c| c.range).sum::<f64>() / table.cells.len() as f64;
    check.digits("mean range", Some(mean), &expected["mean_range"]);
    check.digits("D3", Some(chart.lower), &expected["D3"]);
    check.digits("D4", Some(chart.upper), &expected["D4"]);
    check.digits(
        "upper limit",
        Some(chart.upper * mean),
        &expected["upper_limit"],
    );
    check.digits(
        "sigma",
        Some(mean / chart.d2),
        &expected["sigma_from_mean_range"],
    );
    check.digits(
        "lower limit",
        Some(chart.lower * mean),
        &expected["lower_limit"],
    );
    let above: Vec<&Cell> = (table.cells.iter())
        .filter(|c| c.range > chart.upper * mean)
        .collect();
    let expected = expected["above"].as_array().unwrap();
    check.same("cells above", above.len(), expected.len());
    for (cell, expected) in above.iter().zip(expected) {
        check.digits("range above", Some(cell.range), &expected["range"]);
    }
}

fn own_repeatability(check: &mut Check, table: &Table, expected: &Value) {
    for (appraiser, expected) in expected.as_array().unwrap().iter().enumerate() {
        let own = Own::pooled(&table.of_appraiser(appraiser)).unwrap();
        check.digits("own variance", Some(own.variance), &expected["variance"]);
        let sd = own.variance.sqrt();
        check.digits("own sd", Some(sd), &expected["sd"]);
        check.digits("own df", Some(own.df as f64), &expected["df"]);
        for (field, confidence) in [("variance_0.90", 0.90), ("variance_0.95", 0.95)] {
            let (lower, upper) = own.limits(confidence);
            check.digits("own lower", Some(lower), &expected[field]["lower"]);
            check.digits("own upper", Some(upper), &expected[field]["upper"]);
        }
    }
}

fn compare(fixture: &Fixture, fields_at_least: usize) {
    let table = Table::of(fixture);
    let expected = &fixture.expected["consistency"];
    let mut check = Check::new(fixture.name, 9.0);
    check.digits(
        "trials",
        Some(table.cells[0].count as f64),
        &expected["trials"],
    );
    cells(&mut check, &table, expected);
    cochrans_c(&mut check, &table, &expected["cochran"]);
    mandel(&mut check, &table, expected);
    range_chart(&mut check, &table, &expected["range_chart"]);
    own_repeatability(&mut check, &table, &expected["repeatability_by_appraiser"]);
    check.finish(fields_at_least);
}

#[test]
pub(crate) fn statistics_of_published_studies() {
    compare(&fixture!("a_aiag_10x3x3"), 180);
    compare(&fixture!("a_aiag_10x3x3", "a_aiag_10x3x3_one_sided"), 180);
    compare(&fixture!("b_mr_20x3x2"), 330);
    compare(&fixture!("c_nist_crossed_5x2x5"), 70);
    compare(&fixture!("g_aiag_within_times_1_5"), 180);
}

#[test]
pub(crate) fn statistics_of_thin_studies() {
    compare(&fixture!("edge_two_appraisers"), 120);
    compare(&fixture!("edge_equal_trials"), 180);
}

#[test]
pub(crate) fn critical_values() {
    let constants = values!("constants");
    let mut check = Check::new("constants", 9.0);
    let number = |entry: &Value, key: &str| compared(&entry[key]).as_u64().unwrap() as usize;
    let level = |entry: &Value| {
        compared(&entry["alpha"])
            .as_str()
            .unwrap()
            .parse::<f64>()
            .unwrap()
    };
    for entry in constants["cochran"].as_array().unwrap() {
        let (cells, df) = (number(entry, "cells"), number(entry, "df_per_cell"));
        let found = cochran_critical(cells, df, level(entry));
        check.digits(&format!("C {cells} {df}"), Some(found), &entry["critical"]);
    }
    for entry in constants["mandel"].as_array().unwrap() {
        let (levels, df) = (number(entry, "appraisers"), number(entry, "df_per_cell"));
        let h = mandel_h_critical(levels, level(entry));
        let k = mandel_k_critical(levels, df, level(entry));
        check.digits(&format!("h {levels}"), h, &entry["h"]);
        check.digits(&format!("k {levels} {df}"), Some(k), &entry["k"]);
    }
    for entry in constants["range"].as_array().unwrap() {
        let n = number(entry, "n");
        let chart = RangeChart::of(n).unwrap();
        for (field, found) in [
            ("d2", chart.d2),
            ("d3", chart.d3),
            ("D3", chart.lower),
            ("D4", chart.upper),
        ] {
            check.digits(&format!("{field} of {n}"), Some(found), &entry[field]);
        }
    }
    check.finish(24 + 48 + 36);
}

/// ISO 5725-2:1994, tables 4 (C), 6 and 7 (h and k), from memory: 8 laboratories, 3 replicates.
#[test]
pub(crate) fn tables_of_the_standard() {
    let printed = |x: f64, decimals: usize| format!("{x:.decimals$}");
    assert_eq!(printed(cochran_critical(8, 2, 0.05), 3), "0.516");
    assert_eq!(printed(cochran_critical(8, 2, 0.01), 3), "0.615");
    assert_eq!(printed(mandel_h_critical(8, 0.05).unwrap(), 2), "1.75");
    assert_eq!(printed(mandel_h_critical(8, 0.01).unwrap(), 2), "2.06");
    assert_eq!(printed(mandel_k_critical(8, 2, 0.05), 2), "1.67");
    assert_eq!(printed(mandel_k_critical(8, 2, 0.01), 2), "1.96");
}

/// For two readings the range is the absolute difference: sd √2, mean 2/√π, chance beyond by the normal tail.
#[test]
pub(crate) fn range_of_two_readings() {
    let chart = RangeChart::of(2).unwrap();
    let d2 = 2.0 / std::f64::consts::PI.sqrt();
    let d3 = (2.0 - d2 * d2).sqrt();
    let limit = d2 + 3.0 * d3;
    let beyond = restudy_engine::quantile::chi_square_above(limit * limit / 2.0, 1.0);
    let mut check = Check::new("two readings", 11.0);
    check.number("d2", Some(chart.d2), d2);
    check.number("d3", Some(chart.d3), d3);
    check.number("beyond", Some(chart.beyond), beyond);
    check.finish(3);
}
