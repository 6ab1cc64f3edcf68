//! Degrees of freedom, expected mean squares and components of eleven designs.

use restudy_engine::{Design, Factor, Model};
use serde_json::Value;

use crate::check::{Check, compared};
use crate::data::{Factors, Fixture, fixture, name_of_line, values};

#[test]
pub(crate) fn eleven_designs_have_the_reference_rules() {
    let designs = values!("design_rules").as_object().unwrap();
    assert_eq!(designs.len(), 11);
    for (name, expected) in designs {
        let mut check = Check::new(name, f64::INFINITY);
        let design = design(expected);
        let model = Model::full(
            &design,
            compared(&expected["trials"]).as_u64().unwrap() as usize,
        );
        let terms: Vec<String> = expected["terms"]
            .as_array()
            .unwrap()
            .iter()
            .map(|t| name_of_line(compared(t).as_str().unwrap()))
            .collect();
        check.same(
            "terms",
            model.lines().iter().map(|l| l.name.clone()).collect(),
            terms,
        );
        check.same(
            "readings",
            model.error().cells as u64,
            compared(&expected["readings"]).as_u64().unwrap(),
        );
        let place = |name: &str| {
            model
                .lines()
                .iter()
                .position(|l| l.name == name_of_line(name))
                .unwrap()
        };
        for (term, df) in expected["df"].as_object().unwrap() {
            check.same(
                &format!("df of {term}"),
                model.lines()[place(term)].df as u64,
                compared(df).as_u64().unwrap(),
            );
        }
        for (term, cells) in expected["cells"].as_object().unwrap() {
            check.same(
                &format!("cells of {term}"),
                model.lines()[place(term)].cells as u64,
                compared(cells).as_u64().unwrap(),
            );
        }
        for (term, factors) in expected["factors"].as_object().unwrap() {
            let line = &model.lines()[place(term)];
            let mut found: Vec<&str> = line
                .of
                .iter()
                .chain(&line.within)
                .map(String::as_str)
                .collect();
            let mut wanted: Vec<&str> = factors
                .as_array()
                .unwrap()
                .iter()
                .map(|f| compared(f).as_str().unwrap())
                .collect();
            found.sort_unstable();
            wanted.sort_unstable();
            check.same(&format!("factors of {term}"), found, wanted);
        }
        for (term, weights) in expected["expected_mean_squares"].as_object().unwrap() {
            expected_mean_square(&mut check, &model, term, weights);
        }
        for (term, weights) in expected["component_as_mean_squares"].as_object().unwrap() {
            component(&mut check, &model, term, weights);
        }
        check.finish(8);
    }
}

/// The same rules in the designs of three data sets.
#[test]
pub(crate) fn larger_studies_have_the_reference_rules() {
    let three: Factors = &[("part", &[]), ("appraiser", &[]), ("fixture", &[])];
    let cases: [(Fixture, Factors); 3] = [
        (
            fixture!("c_nist_nested_5x2x5"),
            &[("part", &[]), ("appraiser", &["part"])],
        ),
        (
            fixture!("f_nested_3x8x3"),
            &[("appraiser", &[]), ("part", &["appraiser"])],
        ),
        (fixture!("f_three_factor_8x3x2x2"), three),
    ];
    for (fixture, factors) in cases {
        let placed = fixture.placed(factors);
        let model = Model::full(&placed.design, placed.values.len() / placed.design.cells());
        let mut check = Check::new(fixture.name, f64::INFINITY);
        for (term, line) in fixture.expected["anova"].as_object().unwrap() {
            expected_mean_square(&mut check, &model, term, &line["expected_mean_square"]);
            component(&mut check, &model, term, &line["component_as_mean_squares"]);
        }
        check.finish(6);
    }
}

fn place(model: &Model, name: &str) -> usize {
    let name = name_of_line(name);
    model.lines().iter().position(|l| l.name == name).unwrap()
}

fn expected_mean_square(check: &mut Check, model: &Model, term: &str, weights: &Value) {
    let mut wanted = vec![0; model.lines().len()];
    for (line, weight) in weights.as_object().unwrap() {
        wanted[place(model, line)] = whole(weight);
    }
    let found = model.expected_mean_square(place(model, term));
    check.same(&format!("expected mean square of {term}"), found, wanted);
}

fn component(check: &mut Check, model: &Model, term: &str, weights: &Value) {
    let component = model.component(place(model, term));
    let mut wanted = vec![(0, 1); model.lines().len()];
    for (line, weight) in weights.as_object().unwrap() {
        wanted[place(model, line)] = fraction(compared(weight).as_str().unwrap());
    }
    let found: Vec<(i64, i64)> = (component.numerators().iter())
        .map(|&n| lowest_terms(n, component.denominator() as i64))
        .collect();
    check.same(&format!("component of {term}"), found, wanted);
}

/// A whole number, written as such or as text.
fn whole(value: &Value) -> usize {
    let value = compared(value);
    let number = value.as_u64().map(|n| n as usize);
    number.unwrap_or_else(|| value.as_str().unwrap().parse().unwrap())
}

fn design(expected: &Value) -> Design {
    let within = |name: &str| -> Vec<String> {
        let names = expected["nested_in"].get(name).and_then(Value::as_array);
        names.map_or_else(Vec::new, |names| {
            names
                .iter()
                .map(|n| compared(n).as_str().unwrap().to_owned())
                .collect()
        })
    };
    let factor = |factor: &Value| {
        let name = compared(&factor[0]).as_str().unwrap();
        Factor {
            name: name.to_owned(),
            levels: compared(&factor[1]).as_u64().unwrap() as usize,
            within: within(name),
        }
    };
    Design::new(
        expected["levels"]
            .as_array()
            .unwrap()
            .iter()
            .map(factor)
            .collect(),
    )
    .unwrap()
}

fn fraction(text: &str) -> (i64, i64) {
    let (numerator, denominator) = text.split_once('/').unwrap_or((text, "1"));
    (numerator.parse().unwrap(), denominator.parse().unwrap())
}

fn lowest_terms(numerator: i64, denominator: i64) -> (i64, i64) {
    let (mut a, mut b) = (numerator.abs(), denominator);
    while b != 0 {
        (a, b) = (b, a % b);
    }
    (numerator / a, denominator / a)
}
