//! Readings far from zero: sums of squares and F to at least 13 digits of the exact rational values of the
//! readings as f64 holds them, at every offset and every certified difficulty.

use restudy_engine::Study;
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{Fixture, PART_APPRAISER, PART_ONLY, fixture, name_of_line, rational, settings};

const DIGITS: f64 = 13.0;

fn compare(fixture: &Fixture, factors: &[(&str, &[&str])], tests: &[(&str, &str)]) {
    let study = fixture.study(factors, &settings(0.95, 6.0));
    let exact = &fixture.expected["exact_ss"]["of_f64_rounded_values"];
    let mut check = Check::new(fixture.name, DIGITS);
    let ss = |line: &str| rational(compared(&exact[line]["exact"]).as_str().unwrap());
    for (line, _) in exact
        .as_object()
        .unwrap()
        .iter()
        .filter(|(line, _)| *line != "grand_mean")
    {
        check.number(
            &format!("{line} ss"),
            Some(found(&study, line).ss),
            ss(line),
        );
    }
    for (line, against) in tests {
        let (line_df, against_df) = (
            found(&study, line).df as f64,
            found(&study, against).df as f64,
        );
        let f = ss(line) / ss(against) * against_df / line_df;
        check.number(&format!("{line} f"), found(&study, line).f, f);
    }
    check.number(
        "grand mean",
        Some(study.grand_mean),
        rational(compared(&exact["grand_mean"]["exact"]).as_str().unwrap()),
    );
    check.finish(4);
}

fn found<'a>(study: &'a Study, line: &str) -> &'a restudy_engine::MeanSquare {
    study
        .mean_squares
        .iter()
        .find(|l| l.name == name_of_line(line))
        .unwrap()
}

const CROSSED_TESTS: &[(&str, &str)] = &[
    ("part", "interaction"),
    ("appraiser", "interaction"),
    ("interaction", "error"),
];

#[test]
pub(crate) fn published_examples_shifted_and_scaled() {
    let fixtures = [
        fixture!("a_offset_1e6"),
        fixture!("a_offset_1e9"),
        fixture!("a_offset_1e12"),
        fixture!("b_offset_1e9"),
        fixture!("a_times_1e-3_plus_1000"),
        fixture!("a_times_1e-9"),
        fixture!("a_times_1e9"),
    ];
    for fixture in fixtures {
        compare(&fixture, PART_APPRAISER, CROSSED_TESTS);
    }
}

#[test]
pub(crate) fn certified_data_sets_of_every_difficulty() {
    let fixtures = [
        fixture!("d_strd_AtmWtAg"),
        fixture!("d_strd_SiRstv"),
        fixture!("d_strd_SmLs01"),
        fixture!("d_strd_SmLs04"),
        fixture!("d_strd_SmLs07"),
    ];
    for fixture in fixtures {
        compare(&fixture, PART_ONLY, &[("part", "error")]);
    }
}

/// Where the readings are exact in f64 to all digits that matter, the certified values themselves.
#[test]
pub(crate) fn certified_values_as_far_as_the_readings_allow() {
    for (fixture, digits) in [
        (fixture!("d_strd_SiRstv"), 12.0),
        (fixture!("d_strd_SmLs01"), 14.0),
        (fixture!("d_strd_AtmWtAg"), 8.0),
    ] {
        let study = fixture.study(PART_ONLY, &settings(0.95, 6.0));
        let certified = |line: &str, key: &str| -> f64 {
            let value: &Value = &fixture.expected["certified"][line][key];
            compared(value).as_str().unwrap().parse().unwrap()
        };
        let mut check = Check::new(fixture.name, digits);
        check.number(
            "between ss",
            Some(found(&study, "part").ss),
            certified("between", "ss"),
        );
        check.number(
            "within ss",
            Some(found(&study, "error").ss),
            certified("within", "ss"),
        );
        check.number("f", found(&study, "part").f, certified("between", "f"));
        check.finish(3);
    }
}
