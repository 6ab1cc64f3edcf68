//! The worked example of the AIAG manual: what its numbers are known to show.

use restudy_engine::{Context, Design, Factor, Names, Tolerance, analyse, remarks};

use crate::invented::settings;

/// Readings: AIAG, *Measurement Systems Analysis*, 4th ed. 2010; 10 parts, appraisers A, B and C, 3 trials.
const TABLE: &str = include_str!("../../../fixtures/reference/a_aiag_10x3x3.csv");

/// Published range chart of this example: the sds and k are those of the exact arithmetic in the fixture beside it.
#[test]
fn appraiser_b_repeats_worse_and_c_reads_low() {
    let rows: Vec<Vec<&str>> = TABLE
        .lines()
        .skip(1)
        .map(|l| l.split(',').collect())
        .collect();
    let place = |row: &Vec<&str>| {
        let part: usize = row[0].parse().unwrap();
        (part - 1) * 3 + ["A", "B", "C"].iter().position(|a| *a == row[1]).unwrap()
    };
    let cells: Vec<usize> = rows.iter().map(place).collect();
    let values: Vec<f64> = rows.iter().map(|r| r[3].parse().unwrap()).collect();
    let trials: Vec<usize> = rows
        .iter()
        .map(|r| r[2].parse::<usize>().unwrap() - 1)
        .collect();
    let design = Design::new(vec![
        Factor::crossed("part", 10),
        Factor::crossed("appraiser", 3),
    ])
    .unwrap();
    let tolerance = Tolerance::default();
    let study = analyse(&design, &cells, &values, &tolerance, &settings()).unwrap();
    let context = Context {
        factors: vec![
            Names {
                word: "part",
                levels: vec!["1", "2", "3", "4", "5", "6", "7", "8", "9", "10"],
            },
            Names {
                word: "appraiser",
                levels: vec!["A", "B", "C"],
            },
        ],
        trials,
        ..Context::default()
    };
    let found = remarks(&design, &cells, &values, &study, &tolerance, &context);
    let texts: Vec<&str> = found.iter().map(|r| r.text.as_str()).collect();
    assert!(texts.iter().any(|t| t.starts_with(
        "B repeats worse than the others: an own repeatability of 0.302 (95 % limits 0.231 to 0.436) against 0.153 \
         for the others. The widest cell is part 4 B: range 1.02, range-chart limit 0.880."
    )));
}
