//! A study against one table of mean squares and one block of estimates of a fixture.

use restudy_engine::quantile::f_above;
use restudy_engine::{MeanSquare, Spread, Study, WITHIN_CELLS};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{name_of_line, rational};

pub(crate) fn compare_design(check: &mut Check, study: &Study, expected: &Value) {
    check.digits(
        "trials",
        Some(study.design.trials as f64),
        &expected["trials"],
    );
    for factor in &study.design.factors {
        let plural = match &*factor.name {
            "part" => "parts",
            _ => "appraisers",
        };
        let levels = (expected.get(plural)).or_else(|| expected.get("levels")?.get(&factor.name));
        if let Some(levels) = levels {
            check.digits(&factor.name, Some(factor.levels as f64), levels);
        }
        if let Some(nested) = expected.get("nested_in").and_then(|n| n.get(&factor.name)) {
            let outer = compared(&nested[0]).as_str().unwrap();
            check.same(&factor.name, factor.within.clone(), vec![outer.to_owned()]);
        }
    }
}

pub(crate) fn compare_table(check: &mut Check, study: &Study, table: &Value) {
    let lines = table.as_object().unwrap();
    let terms = study.mean_squares.len() - usize::from(!lines.contains_key("total"));
    check.same("lines of the table", terms, lines.len());
    for (reference, expected) in lines {
        let name = name_of_line(reference);
        let line = study.mean_squares.iter().find(|l| l.name == name).unwrap();
        check.digits(&format!("{name} ss"), Some(line.ss), &expected["ss"]);
        check.same(
            &format!("{name} df"),
            line.df as u64,
            compared(&expected["df"]).as_u64().unwrap(),
        );
        let exact = rational(compared(&expected["ss_exact"]).as_str().unwrap());
        check.number(&format!("{name} exact ss"), Some(line.ss), exact);
        check.digits(&format!("{name} ms"), line.ms, &expected["ms"]);
        check.digits(&format!("{name} f"), line.f, &expected["f"]);
        check.digits(&format!("{name} p"), line.p, &expected["p"]);
        if let Some(df) = expected.get("denominator_df") {
            check.digits(&format!("{name} against_df"), line.against_df, df);
        }
        let against = line.against.clone().unwrap_or_default();
        match compared(&expected["denominator"]) {
            Value::String(only) => {
                check.same(
                    &format!("{name} against"),
                    against.iter().map(|a| (a.name.clone(), a.weight)).collect(),
                    vec![(name_of_line(only), 1.0)],
                );
            }
            Value::Object(several) => {
                check.same(&format!("{name} against"), against.len(), several.len());
                for (reference, weight) in several {
                    let found = against
                        .iter()
                        .find(|a| a.name == name_of_line(reference))
                        .map(|a| a.weight.to_string());
                    check.same(
                        &format!("{name} against {reference}"),
                        found.as_deref(),
                        compared(weight).as_str(),
                    );
                }
            }
            _ => {}
        }
    }
}

pub(crate) fn compare_mean_squares(check: &mut Check, study: &Study, expected: &Value) {
    for (reference, expected) in expected.as_object().unwrap() {
        let line = line(study, reference);
        check.digits(&format!("{reference} ms"), line.ms, &expected["ms"]);
        check.digits(
            &format!("{reference} df"),
            Some(line.df as f64),
            &expected["df"],
        );
    }
}

/// F and p of each line against the repeats alone, from the table's mean squares.
pub(crate) fn compare_to_repeats(check: &mut Check, study: &Study, expected: &Value) {
    let repeats = line(study, "error");
    for (reference, expected) in expected.as_object().unwrap() {
        let line = line(study, reference);
        let f = line.ms.unwrap() / repeats.ms.unwrap();
        let p = f_above(f, line.df as f64, repeats.df as f64);
        check.digits(
            &format!("{reference} f over repeats"),
            Some(f),
            &expected["f"],
        );
        check.digits(
            &format!("{reference} p over repeats"),
            Some(p),
            &expected["p"],
        );
    }
}

fn line<'a>(study: &'a Study, reference: &str) -> &'a MeanSquare {
    let name = name_of_line(reference);
    study.mean_squares.iter().find(|l| l.name == name).unwrap()
}

/// What follows from a variance, its sd and the total's.
fn compare_shares(
    check: &mut Check,
    study: &Study,
    reference: &str,
    sd: Option<f64>,
    expected: &Value,
) {
    let total = &study.figures.total;
    let of_total = sd.zip(total.sd.estimate).map(|(sd, total)| sd / total);
    let per_sd = total
        .share_of_tolerance
        .estimate
        .zip(total.sd.estimate)
        .map(|(s, sd)| s / sd);
    let of_tolerance = sd.zip(per_sd).map(|(sd, per_sd)| sd * per_sd);
    let shares = &expected["share_of_study_variation"][reference];
    check.digits(&format!("{reference} sd over total sd"), of_total, shares);
    let shares = &expected["share_of_total_variance"][reference];
    check.digits(
        &format!("{reference} over total"),
        of_total.map(|s| s * s),
        shares,
    );
    let shares = &expected["share_of_tolerance"][study.spread_sds.to_string()];
    check.digits(
        &format!("{reference} over tolerance"),
        of_tolerance,
        &shares[reference],
    );
}

pub(crate) fn compare_estimates(check: &mut Check, study: &Study, expected: &Value) {
    for (reference, variance) in expected["variance"].as_object().unwrap() {
        let sd = &expected["sd"][reference];
        if let Some(spread) = spread(study, reference) {
            check.digits(
                &format!("{reference} variance"),
                spread.variance.estimate,
                &variance["truncated"],
            );
            check.digits(&format!("{reference} sd"), spread.sd.estimate, sd);
            let shares = &expected["share_of_tolerance"][study.spread_sds.to_string()];
            check.digits(
                &format!("{reference} share of tolerance"),
                spread.share_of_tolerance.estimate,
                &shares[reference],
            );
            let shares = &expected["share_of_study_variation"];
            check.digits(
                &format!("{reference} share of total"),
                spread.share_of_tv.estimate,
                &shares[reference],
            );
        }
        let component = study
            .components
            .iter()
            .find(|c| c.name == name_of_component(study, reference));
        if let Some(component) = component {
            check.digits(
                &format!("{reference} raw component"),
                Some(component.raw),
                &variance["raw"],
            );
            check.digits(
                &format!("{reference} component"),
                component.variance.estimate,
                &variance["truncated"],
            );
            check.digits(
                &format!("{reference} component sd"),
                component.sd.estimate,
                sd,
            );
            compare_shares(check, study, reference, component.sd.estimate, expected);
        } else {
            let figure = &spread(study, reference).unwrap().sd;
            compare_shares(check, study, reference, figure.estimate, expected);
            let raw: f64 = (study.components.iter())
                .filter(|c| match &**reference {
                    "reproducibility" => c.of != ["part"] && c.name != WITHIN_CELLS,
                    "gauge" => c.of != ["part"],
                    _ => true,
                })
                .map(|c| c.raw)
                .sum();
            check.digits(&format!("{reference} raw"), Some(raw), &variance["raw"]);
            check.same(
                &format!("{reference} is a figure of its own"),
                matches!(&**reference, "reproducibility" | "gauge" | "total"),
                true,
            );
        }
    }
    check.digits(
        "part to gauge",
        study.part_to_gauge.estimate,
        &expected["part_to_gauge_variance_ratio"],
    );
    check.digits(
        "ndc",
        study.ndc.estimate,
        &expected["ndc"]["sqrt2_untruncated"],
    );
    let ndc = study.ndc.estimate;
    check.digits(
        "whole ndc by the root of 2",
        ndc.map(f64::floor),
        &expected["ndc"]["sqrt2_floor"],
    );
    let by_handbook = ndc.map(|ndc| ndc * 1.41 / std::f64::consts::SQRT_2);
    check.digits(
        "ndc by 1.41",
        by_handbook,
        &expected["ndc"]["handbook_1_41_untruncated"],
    );
    check.same(
        "whole ndc",
        study.ndc.whole,
        compared(&expected["ndc"]["handbook_1_41_floor"]).as_u64(),
    );
}

/// The reference calls the part's own line `part`, nested or not.
fn name_of_component(study: &Study, reference: &str) -> String {
    let own = |c: &&restudy_engine::Component| c.of == ["part"];
    match reference {
        "part" => study
            .components
            .iter()
            .find(own)
            .map(|c| c.name.to_string())
            .unwrap_or_default(),
        _ => name_of_line(reference),
    }
}

fn spread<'a>(study: &'a Study, reference: &str) -> Option<&'a Spread> {
    match reference {
        "repeatability" => Some(&study.figures.repeatability),
        "reproducibility" => Some(&study.figures.reproducibility),
        "gauge" => Some(&study.figures.gauge),
        "part" => Some(&study.figures.part),
        "total" => Some(&study.figures.total),
        _ => None,
    }
}
