//! Readings far from zero: sums of squares and F to at least 13 digits of the exact rational values of the
//! readings as f64 holds them, at every offset and every certified difficulty.

use restudy_engine::Study;

use crate::check::{Check, compared};
use crate::data::{Fixture, PART_APPRAISER, PART_ONLY, fixture, name_of_line, rational, settings};

const DIGITS: f64 = 13.0;
/// Digits by which the least rounded of two neighbours may lie closer than the other.
const SLACK: f64 = 0.1;
/// SmLs07, whose readings of 1e12 hold four digits after the point.
const DIGITS_OF_PRINT: f64 = 4.0;

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
        let ss = Some(found(&study, line).ss);
        check.digits(&format!("{line} ss as f64"), ss, &exact[line]["value"]);
        let digits = compared(&exact[line]["digits30"]).as_str().unwrap();
        check.number(&format!("{line} ss"), ss, digits.parse().unwrap());
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
    check.digits(
        "grand mean as f64",
        Some(study.grand_mean),
        &exact["grand_mean"]["value"],
    );
    check.finish(4);
    compare_to_print(fixture, &study);
}

/// The decimals as printed, as far as their rounding to f64 allows.
fn compare_to_print(fixture: &Fixture, study: &Study) {
    let printed = &fixture.expected["exact_ss"]["of_printed_decimals"];
    for (line, exact) in printed.as_object().unwrap() {
        let shift = &fixture.expected["relative_shift_caused_by_f64_rounding"][line];
        let digits = &fixture.expected["log_relative_error_of_f64_rounding"][line];
        let allowed = match (compared(shift).as_f64(), compared(digits).as_f64()) {
            (Some(shift), _) => -shift.log10() - SLACK,
            (_, Some(digits)) => digits - SLACK,
            _ if line == "grand_mean" => DIGITS,
            // The total is rounded as its largest line.
            _ => DIGITS_OF_PRINT,
        };
        let mut check = Check::new(
            &format!("{} {line} as printed", fixture.name),
            allowed.min(DIGITS),
        );
        let found = match &**line {
            "grand_mean" => study.grand_mean,
            _ => found(study, line).ss,
        };
        check.digits("value", Some(found), &exact["value"]);
        let fraction = rational(compared(&exact["exact"]).as_str().unwrap());
        check.number("fraction", Some(found), fraction);
        if let Some(digits) = exact.get("digits30") {
            let digits = compared(digits).as_str().unwrap().parse().unwrap();
            check.number("30 digits", Some(found), digits);
        }
        check.finish(2);
    }
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

/// The certified values, as far as the rounding of the readings allows.
#[test]
pub(crate) fn certified_values_as_far_as_the_readings_allow() {
    for (fixture, digits) in [
        (fixture!("d_strd_SiRstv"), 11.5),
        (fixture!("d_strd_SmLs01"), 14.0),
        (fixture!("d_strd_AtmWtAg"), 8.0),
        (fixture!("d_strd_SmLs04"), 9.5),
        (fixture!("d_strd_SmLs07"), 3.5),
    ] {
        let study = fixture.study(PART_ONLY, &settings(0.95, 6.0));
        let (between, within) = (found(&study, "part"), found(&study, "error"));
        let total = found(&study, "total").ss;
        let mut check = Check::new(fixture.name, digits);
        let certified = &fixture.expected["certified"];
        for (block, key, found) in [
            (&certified["between"], "ss", between.ss),
            (&certified["between"], "df", between.df as f64),
            (&certified["between"], "ms", between.ms.unwrap()),
            (&certified["between"], "f", between.f.unwrap()),
            (&certified["within"], "ss", within.ss),
            (&certified["within"], "df", within.df as f64),
            (&certified["within"], "ms", within.ms.unwrap()),
            (certified, "r_squared", between.ss / total),
            (certified, "residual_sd", within.ms.unwrap().sqrt()),
        ] {
            let value: f64 = compared(&block[key]).as_str().unwrap().parse().unwrap();
            check.number(key, Some(found), value);
        }
        check.finish(9);
    }
}
