//! Figures as printed in the publications, from memory: ours, rounded to the printed decimals, are the same.

use restudy_engine::{Component, MeanSquare, Spread, Study};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{
    Factors, Fixture, PART_APPRAISER, fixture, name_of_line, pooling, settings, values,
};

/// Rounded to as many decimals as the print has.
fn printed(check: &mut Check, field: &str, found: f64, print: &Value) {
    let print = compared(print).as_str().unwrap();
    let decimals = print
        .split_once('.')
        .map_or(0, |(_, decimals)| decimals.len());
    check.same(field, format!("{found:.decimals$}"), print.to_owned());
}

fn line<'a>(study: &'a Study, reference: &str) -> &'a MeanSquare {
    let name = name_of_line(reference);
    study.mean_squares.iter().find(|l| l.name == name).unwrap()
}

fn component<'a>(study: &'a Study, reference: &str) -> &'a Component {
    let name = name_of_line(reference);
    study.components.iter().find(|c| c.name == name).unwrap()
}

fn spread<'a>(study: &'a Study, reference: &str) -> &'a Spread {
    match reference {
        "repeatability" => &study.figures.repeatability,
        "appraiser" => &study.figures.reproducibility,
        "gauge" => &study.figures.gauge,
        _ => &study.figures.part,
    }
}

#[test]
pub(crate) fn printed_figures() {
    const NESTED: Factors = &[("part", &[]), ("appraiser", &["part"])];
    let cases: [(Fixture, Factors); 4] = [
        (fixture!("a_aiag_10x3x3"), PART_APPRAISER),
        (fixture!("b_mr_20x3x2"), PART_APPRAISER),
        (fixture!("c_nist_crossed_5x2x5"), PART_APPRAISER),
        (fixture!("c_nist_nested_5x2x5"), NESTED),
    ];
    for (fixture, factors) in cases {
        let kept = fixture.study(factors, &settings(0.95, 6.0));
        let pooled = fixture.study(factors, &pooling(settings(0.95, 6.0)));
        let repeats = line(&kept, "error").ms.unwrap();
        let mut check = Check::new(fixture.name, f64::INFINITY);
        for (group, figures) in values!("published")[fixture.name].as_object().unwrap() {
            if group == "pooled_ndc" {
                printed(&mut check, group, pooled.ndc.whole.unwrap() as f64, figures);
                continue;
            }
            for (name, print) in figures.as_object().unwrap() {
                let found = match &**group {
                    "ss" => line(&kept, name).ss,
                    "f" => line(&kept, name).f.unwrap(),
                    "f_with_residual_denominator" => line(&kept, name).ms.unwrap() / repeats,
                    "variance_raw" => component(&kept, name).raw,
                    "pooled_sd" => component(&pooled, name).sd.estimate.unwrap(),
                    _ => 100.0 * spread(&pooled, name).share_of_tv.estimate.unwrap(),
                };
                printed(&mut check, &format!("{group} {name}"), found, print);
            }
        }
        check.finish(4);
    }
}
