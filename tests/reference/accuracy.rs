//! The table of digits in `ACCURACY.md` claims no more than what is measured here.

use restudy_engine::Study;
use serde_json::Value;

use crate::check::digits;
use crate::data::{Fixture, PART_APPRAISER, PART_ONLY, fixture, name_of_line, rational, settings};

const PAGE: &str = include_str!("../../engine/ACCURACY.md");
/// Beyond these, f64 arithmetic on the exact values rounds as much as the engine does.
const MOST: f64 = 15.0;
const WANTED: f64 = 13.0;

/// Fewest digits of any sum of squares and of any F, and of any sum of squares of the decimals as printed.
struct Measured {
    sums: f64,
    tests: f64,
    as_printed: f64,
}

fn measured(fixture: &Fixture) -> Measured {
    let (factors, tests): (_, &[(&str, &str)]) = match fixture.name.starts_with("d_strd_") {
        true => (PART_ONLY, &[("part", "error")]),
        false => (
            PART_APPRAISER,
            &[
                ("part", "interaction"),
                ("appraiser", "interaction"),
                ("interaction", "error"),
            ],
        ),
    };
    let study = fixture.study(factors, &settings(0.95, 6.0));
    let exact = |of: &str, line: &str| -> f64 {
        let value: &Value = &fixture.expected["exact_ss"][of][line]["exact"];
        rational(value.as_str().unwrap())
    };
    let sums = |of: &str| {
        (study.mean_squares.iter())
            .map(|line| digits(line.ss, exact(of, reference(&line.name))))
            .fold(MOST, f64::min)
    };
    let f = |(line, against): &(&str, &str)| {
        let of = |line| exact("of_f64_rounded_values", line) / found(&study, line).df as f64;
        digits(found(&study, line).f.unwrap(), of(line) / of(against))
    };
    Measured {
        sums: sums("of_f64_rounded_values"),
        tests: tests.iter().map(f).fold(MOST, f64::min),
        as_printed: sums("of_printed_decimals"),
    }
}

fn found<'a>(study: &'a Study, line: &str) -> &'a restudy_engine::MeanSquare {
    let name = name_of_line(line);
    study.mean_squares.iter().find(|l| l.name == name).unwrap()
}

fn reference(name: &str) -> &str {
    match name {
        "part × appraiser" => "interaction",
        "within cells" => "error",
        name => name,
    }
}

#[test]
fn the_page_claims_no_more_than_is_measured() {
    let fixtures = [
        fixture!("d_strd_AtmWtAg"),
        fixture!("d_strd_SiRstv"),
        fixture!("d_strd_SmLs01"),
        fixture!("d_strd_SmLs04"),
        fixture!("d_strd_SmLs07"),
        fixture!("a_offset_1e6"),
        fixture!("a_offset_1e9"),
        fixture!("a_offset_1e12"),
        fixture!("b_offset_1e9"),
        fixture!("a_times_1e-3_plus_1000"),
        fixture!("a_times_1e-9"),
        fixture!("a_times_1e9"),
    ];
    let mut wrong = Vec::new();
    for fixture in fixtures {
        let m = measured(&fixture);
        let found = [m.sums, m.tests, m.as_printed];
        let row = PAGE
            .lines()
            .find(|line| line.contains(&format!("`{}`", fixture.name)));
        let claimed: Vec<f64> = row
            .map(|row| {
                row.split('|')
                    .filter_map(|cell| cell.trim().parse().ok())
                    .collect()
            })
            .unwrap_or_default();
        let held = claimed.len() == 3 && claimed.iter().zip(found).all(|(c, f)| *c <= f);
        if !held || m.sums < WANTED || m.tests < WANTED {
            let down = |x: f64| (x * 10.0).floor() / 10.0;
            let [sums, tests, printed] = found.map(down);
            wrong.push(format!(
                "`{}` | {sums:.1} | {tests:.1} | {printed:.1} |",
                fixture.name
            ));
        }
    }
    assert!(wrong.is_empty(), "measured:\n{}", wrong.join("\n"));
}
