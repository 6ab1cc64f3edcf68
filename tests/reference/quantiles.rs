//! Quantiles against Newton steps in 40-digit arithmetic, tails against another library.

use restudy_engine::quantile::{Side, chi_square, chi_square_above, f, f_above};
use serde_json::Value;
use statrs::function::{beta::beta_reg, gamma::gamma_ur};

use crate::check::{Check, compared};
use crate::data::values;

fn constants() -> &'static Value {
    values!("constants")
}

/// The table names numbers in decimals; a tail near 1 is handed over as its complement.
fn tail(p: &str) -> (Side, f64) {
    match p {
        "0.95" => (Side::Above, 0.05),
        "0.975" => (Side::Above, 0.025),
        "0.995" => (Side::Above, 0.005),
        _ => (Side::Below, p.parse().unwrap()),
    }
}

fn number(entry: &Value) -> f64 {
    compared(entry)
        .as_f64()
        .unwrap_or_else(|| entry.as_str().unwrap().parse().unwrap())
}

#[test]
pub(crate) fn chi_square_quantiles_have_twelve_digits() {
    let mut check = Check::new("chi-square quantiles", 12.0);
    for entry in constants()["chi2_quantiles"].as_array().unwrap() {
        let (p, df) = (
            compared(&entry["p"]).as_str().unwrap(),
            number(&entry["df"]),
        );
        let (side, tail) = tail(p);
        check.digits(
            &format!("p {p}, df {df}"),
            Some(chi_square(side, tail, df)),
            &entry["x"],
        );
    }
    check.finish(62);
}

#[test]
pub(crate) fn f_quantiles_have_twelve_digits() {
    let mut check = Check::new("F quantiles", 12.0);
    for entry in constants()["f_quantiles"].as_array().unwrap() {
        let (p, df1, df2) = (
            compared(&entry["p"]).as_str().unwrap(),
            number(&entry["df1"]),
            number(&entry["df2"]),
        );
        let (side, tail) = tail(p);
        check.digits(
            &format!("p {p}, df {df1} and {df2}"),
            Some(f(side, tail, df1, df2)),
            &entry["x"],
        );
    }
    check.finish(28);
}

#[test]
pub(crate) fn quantiles_at_the_ends_of_the_range_have_twelve_digits() {
    let table = values!("quantiles");
    let mut check = Check::new("quantiles", 12.0);
    for entry in table["chi_square"].as_array().unwrap() {
        let (p, df) = (number(&entry["p"]), number(&entry["df"]));
        for (side, name) in [(Side::Below, "below"), (Side::Above, "above")] {
            check.digits(
                &format!("chi-square {name}, p {p}, df {df}"),
                Some(chi_square(side, p, df)),
                &entry[name],
            );
        }
    }
    for entry in table["f"].as_array().unwrap() {
        let (p, df1, df2) = (
            number(&entry["p"]),
            number(&entry["df1"]),
            number(&entry["df2"]),
        );
        check.digits(
            &format!("F below, p {p}, df {df1} and {df2}"),
            Some(f(Side::Below, p, df1, df2)),
            &entry["below"],
        );
    }
    for entry in table["chi_square_above"].as_array().unwrap() {
        let (x, df) = (number(&entry["x"]), number(&entry["df"]));
        check.digits(
            &format!("chi-square tail above {x}, df {df}"),
            Some(chi_square_above(x, df)),
            &entry["p"],
        );
    }
    for entry in table["f_above"].as_array().unwrap() {
        let (x, df1, df2) = (
            number(&entry["x"]),
            number(&entry["df1"]),
            number(&entry["df2"]),
        );
        check.digits(
            &format!("F tail above {x}, df {df1} and {df2}"),
            Some(f_above(x, df1, df2)),
            &entry["p"],
        );
    }
    check.finish(300);
}

#[test]
pub(crate) fn tails_agree_with_another_library_where_that_is_accurate() {
    let mut check = Check::new("tails against statrs", 11.0);
    for df1 in [1.0, 2.0, 3.5, 9.0, 18.0, 60.0] {
        for x in [0.2, 1.0, 2.5, 12.0] {
            check.number(
                &format!("chi-square {x}, df {df1}"),
                Some(chi_square_above(x, df1)),
                gamma_ur(df1 / 2.0, x / 2.0),
            );
            for df2 in [1.0, 4.0, 18.0, 60.0] {
                let other = beta_reg(df2 / 2.0, df1 / 2.0, df2 / (df2 + df1 * x));
                check.number(
                    &format!("F {x}, df {df1} and {df2}"),
                    Some(f_above(x, df1, df2)),
                    other,
                );
            }
        }
    }
    check.finish(100);
}
