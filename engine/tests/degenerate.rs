//! Thin designs, data without spread, and input that is refused.

mod invented;

use invented::{Readings, crossed, simulated};
use restudy_engine::{
    Design, DesignError, Factor, Figure, Interaction, Judge, Limits, OneSided, Prepared, Process,
    Settings, Study, StudyError, Tolerance, analyse,
};
use serde_json::Value;

const TWO_SIDED: Tolerance = Tolerance {
    lower: Some(-30.0),
    upper: Some(30.0),
    one_sided: None,
};

fn settings() -> Settings {
    let limits = Limits {
        watch: 0.1,
        act: 0.3,
        back_below: 0.85,
    };
    Settings {
        confidence: 0.95,
        spread_sds: 6.0,
        interaction: Interaction::Keep,
        process: None,
        limits: Some(limits),
        judge: Judge::Estimate,
    }
}

fn study(readings: &Readings) -> Study {
    study_with(readings, &TWO_SIDED, &settings())
}

fn study_with(readings: &Readings, tolerance: &Tolerance, settings: &Settings) -> Study {
    let study = analyse(
        &readings.design,
        &readings.cells,
        &readings.values,
        tolerance,
        settings,
    )
    .unwrap();
    assert_sound(&study);
    study
}

/// Every number is finite, and every figure that lacks one says why.
fn assert_sound(study: &Study) {
    let written = format!("{study:?}");
    let mut words = written.split(|c: char| !c.is_alphanumeric());
    assert!(
        !words.any(|word| matches!(word, "NaN" | "inf")),
        "{written}"
    );
    assert_reasons(&serde_json::to_value(study).unwrap(), "study");
}

fn assert_reasons(value: &Value, path: &str) {
    match value {
        Value::Object(map) => {
            if map.contains_key("why")
                && ["estimate", "lower", "upper", "at_least"]
                    .iter()
                    .any(|key| map[*key].is_null())
            {
                assert!(
                    map["why"].is_string(),
                    "{path} lacks a number and a reason: {value}"
                );
            }
            map.iter()
                .for_each(|(key, value)| assert_reasons(value, &format!("{path}.{key}")));
        }
        Value::Array(list) => list.iter().for_each(|value| assert_reasons(value, path)),
        Value::Number(number) => assert!(number.as_f64().is_some_and(f64::is_finite), "{path}"),
        _ => {}
    }
}

#[test]
fn the_record_has_its_keys_in_order() {
    let written = serde_json::to_string(&study(&crossed(1, 10, 3, 3))).unwrap();
    let keys = [
        "tolerance_rule",
        "design",
        "method",
        "confidence",
        "spread_sds",
        "interaction",
        "mean_squares",
        "reml",
        "components",
        "figures",
        "ndc",
        "part_to_gauge",
        "risk",
        "chance_above",
        "remarks",
        "draws",
        "seed",
    ];
    let value: Value = serde_json::from_str(&written).unwrap();
    assert_eq!(value.as_object().unwrap().len(), keys.len());
    let mut from = 0;
    for key in keys {
        let place = written[from..].find(&format!("\"{key}\":"));
        from += place.unwrap_or_else(|| panic!("`{key}` is absent or out of order"));
    }
    let names: Vec<&str> = value["mean_squares"]
        .as_array()
        .unwrap()
        .iter()
        .map(|l| l["name"].as_str().unwrap())
        .collect();
    assert_eq!(
        names,
        [
            "part",
            "appraiser",
            "part × appraiser",
            "within cells",
            "total"
        ]
    );
    assert_eq!(
        value["mean_squares"][0]["against"],
        serde_json::json!([{"name": "part × appraiser", "weight": 1.0}])
    );
    for line in value["mean_squares"].as_array().unwrap() {
        assert_eq!(line.as_object().unwrap().len(), 10);
    }
}

#[test]
fn one_appraiser_leaves_reproducibility_open_and_judges_by_repeatability() {
    let study = study(&crossed(2, 8, 1, 3));
    assert!(study.figures.reproducibility.variance.estimate.is_none());
    assert_eq!(
        study.figures.gauge.variance,
        study.figures.repeatability.variance
    );
    assert!(study.judged_share.is_some());
    assert!(study.interaction.other_reading.is_none());
    assert_eq!(study.mean_squares.len(), 3);
}

#[test]
fn one_trial_says_what_the_error_holds() {
    let study = study(&crossed(3, 8, 3, 1));
    let names: Vec<&str> = study.mean_squares.iter().map(|l| l.name.as_ref()).collect();
    assert_eq!(names, ["part", "appraiser", "within cells", "total"]);
    assert!(
        study
            .remarks
            .iter()
            .any(|r| r.kind == "one trial" && r.text.contains("part × appraiser"))
    );
    assert!(!study.interaction.kept);
}

#[test]
fn one_trial_of_parts_alone_tells_nothing_but_the_total() {
    let study = study(&simulated(4, vec![Factor::crossed("part", 8)], 1));
    let f = &study.figures;
    for spread in [&f.repeatability, &f.gauge, &f.part] {
        assert!(spread.variance.estimate.is_none() && spread.variance.why.is_some());
    }
    assert!(f.total.variance.estimate.is_some());
    assert_eq!(
        (study.judged_share, study.ndc.whole, study.chance_above.act),
        (None, None, None)
    );
}

#[test]
fn one_trial_of_parts_nested_in_appraisers_still_shows_the_appraisers() {
    let factors = vec![
        Factor::crossed("appraiser", 3),
        Factor::nested("part", 5, &["appraiser"]),
    ];
    let study = study(&simulated(5, factors, 1));
    assert!(study.figures.gauge.variance.estimate.is_none());
    assert!(study.figures.reproducibility.variance.estimate.is_some());
}

#[test]
fn thin_and_flat_data_give_defined_answers() {
    let pooled = Settings {
        interaction: Interaction::PoolAbove(0.25),
        judge: Judge::Chance(0.9),
        ..settings()
    };
    for (parts, appraisers, trials) in [
        (2, 2, 2),
        (2, 2, 1),
        (2, 1, 2),
        (2, 1, 1),
        (10, 2, 3),
        (3, 3, 1),
        (2, 5, 2),
    ] {
        let readings = crossed(6, parts, appraisers, trials);
        let by_cell =
            |cell: usize, f: &dyn Fn(&[usize]) -> f64| f(&readings.design.levels_of(cell));
        let flat: [&dyn Fn(&[usize]) -> f64; 5] = [
            &|_| 25.4,
            &|levels| levels[0] as f64 * 0.1,
            &|levels| levels[1] as f64 * 0.1,
            &|levels| 0.1 * levels[0] as f64 + 0.7 * levels[1] as f64,
            &|levels| if levels[0] == levels[1] { 0.3 } else { 0.1 },
        ];
        for f in flat {
            let values = readings
                .cells
                .iter()
                .map(|&cell| by_cell(cell, f))
                .collect();
            let readings = Readings {
                values,
                ..readings.clone()
            };
            study_with(&readings, &TWO_SIDED, &settings());
            study_with(&readings, &TWO_SIDED, &pooled);
        }
        for scale in [1e-130, 1e130] {
            study_with(&readings.mapped(|y| y * scale), &TWO_SIDED, &pooled);
        }
    }
}

#[test]
fn additive_readings_have_no_error_and_no_f_of_rounding() {
    let mut readings = crossed(7, 5, 3, 2);
    readings.values = readings
        .cells
        .iter()
        .map(|&cell| {
            let levels = readings.design.levels_of(cell);
            0.1 * levels[0] as f64 + 0.7 * levels[1] as f64
        })
        .collect();
    let study = study(&readings);
    assert!(study.mean_squares.iter().all(|line| line.f.is_none()));
    assert_eq!(study.figures.repeatability.variance.estimate, Some(0.0));
}

#[test]
fn tolerance_rules() {
    let readings = crossed(8, 10, 3, 3);
    let mean = study(&readings).grand_mean;
    let sd = study(&readings).figures.gauge.sd.estimate.unwrap();
    let share = |lower, upper, one_sided, process| {
        let tolerance = Tolerance {
            lower,
            upper,
            one_sided,
        };
        let study = study_with(
            &readings,
            &tolerance,
            &Settings {
                process,
                ..settings()
            },
        );
        let Figure { estimate, why, .. } = study.figures.gauge.share_of_tolerance;
        (
            study.tolerance_rule,
            estimate.map(|share| share / sd),
            why.map(|w| w.into_owned()),
        )
    };
    let process = Some(Process::Stated {
        mean: 10.0,
        sd: 1.0,
    });
    let close = |found: (&str, Option<f64>, Option<String>), rule: &str, per_sd: f64| {
        assert_eq!(found.0, rule);
        assert!(
            (found.1.unwrap() - per_sd).abs() < 1e-12 * per_sd,
            "{found:?}"
        );
    };
    close(
        share(Some(-40.0), Some(50.0), None, None),
        "two-sided",
        6.0 / 90.0,
    );
    close(
        share(None, Some(50.0), Some(OneSided::FromZero), None),
        "from zero",
        6.0 / 50.0,
    );
    close(
        share(None, Some(50.0), Some(OneSided::Width(20.0)), None),
        "width",
        6.0 / 20.0,
    );
    close(
        share(None, Some(50.0), Some(OneSided::ToProcessMean), process),
        "to process mean",
        3.0 / 40.0,
    );
    close(
        share(Some(-40.0), None, Some(OneSided::ToStudyMean), None),
        "to study mean",
        3.0 / (mean + 40.0),
    );
    for (found, rule) in [
        (share(None, None, None, None), "none"),
        (share(None, Some(50.0), None, None), "none"),
        (
            share(None, Some(50.0), Some(OneSided::ToProcessMean), None),
            "to process mean",
        ),
        (
            share(None, Some(5.0), Some(OneSided::ToProcessMean), process),
            "to process mean",
        ),
        (
            share(None, Some(0.0), Some(OneSided::FromZero), None),
            "from zero",
        ),
        (share(Some(1.0), Some(1.0), None, None), "two-sided"),
    ] {
        assert_eq!((found.0, found.1), (rule, None));
        assert!(found.2.is_some());
    }
}

#[test]
fn pooling_goes_from_the_largest_interaction_down() {
    let readings = invented::three_factors(9);
    let study = |interaction| {
        study_with(
            &readings,
            &TWO_SIDED,
            &Settings {
                interaction,
                ..settings()
            },
        )
    };
    let names = |study: &Study| -> Vec<String> {
        study
            .mean_squares
            .iter()
            .map(|l| l.name.to_string())
            .collect()
    };
    let kept = study(Interaction::Keep);
    assert_eq!(names(&kept).len(), 9);
    let all = study(Interaction::PoolAbove(0.0));
    assert_eq!(
        names(&all),
        [
            "part",
            "appraiser",
            "fixture",
            "appraiser × fixture",
            "within cells",
            "total"
        ]
    );
    assert!(!all.interaction.kept);
    // The other reading of one choice is the figure of the other.
    assert_eq!(
        kept.interaction.other_reading.unwrap().gauge_sd,
        all.figures.gauge.sd.estimate
    );
    assert_eq!(
        all.interaction.other_reading.unwrap().gauge_sd,
        kept.figures.gauge.sd.estimate
    );
    let none = study(Interaction::PoolAbove(1.0));
    assert_eq!(names(&none), names(&kept));
    let ss = |study: &Study| {
        study
            .mean_squares
            .iter()
            .rev()
            .skip(1)
            .map(|l| l.ss)
            .sum::<f64>()
    };
    assert!((ss(&all) - ss(&kept)).abs() < 1e-12 * ss(&kept));
}

#[test]
fn an_estimate_outside_its_limits_is_explained() {
    // All cells have one mean, so that every component but repeatability falls below zero.
    let mut readings = crossed(10, 20, 10, 2);
    readings.values = readings
        .cells
        .iter()
        .enumerate()
        .map(|(row, _)| if row % 2 == 0 { 0.0 } else { 1.0 })
        .collect();
    let study = study(&readings);
    let remark = study
        .remarks
        .iter()
        .find(|r| r.kind == "estimate outside limits")
        .unwrap();
    assert!(
        remark.text.contains("cuts components below zero"),
        "{}",
        remark.text
    );
    let outside = remark.figures["estimate"] > remark.figures["upper"]
        || remark.figures["estimate"] < remark.figures["lower"];
    assert!(outside, "{:?}", remark.figures);
}

#[test]
fn faulty_input_is_refused_in_one_sentence() {
    let readings = crossed(11, 4, 3, 2);
    let refused = |cells: &[usize], values: &[f64], settings: &Settings| {
        analyse(&readings.design, cells, values, &TWO_SIDED, settings).unwrap_err()
    };
    let (cells, values) = (readings.cells.as_slice(), readings.values.as_slice());
    let n = values.len();
    assert_eq!(
        refused(&cells[..n - 1], &values[..n - 1], &settings()).to_string(),
        "cell 11 (part 4, appraiser 3) holds 1 readings; expected 2 as in the other cells"
    );
    let mut twice = cells.to_vec();
    twice[0] = 5;
    assert!(matches!(
        refused(&twice, values, &settings()),
        StudyError::Unbalanced {
            cell: 0,
            count: 1,
            expected: 2,
            ..
        }
    ));
    for bad in [f64::NAN, f64::INFINITY] {
        let mut values = values.to_vec();
        values[3] = bad;
        assert!(matches!(
            refused(cells, &values, &settings()),
            StudyError::NotFinite { row: 3, .. }
        ));
    }
    assert!(matches!(
        refused(cells, &values[1..], &settings()),
        StudyError::Lengths { .. }
    ));
    assert_eq!(refused(&[], &[], &settings()), StudyError::Empty);
    let mut beyond = cells.to_vec();
    beyond[2] = 12;
    assert!(matches!(
        refused(&beyond, values, &settings()),
        StudyError::NoSuchCell {
            row: 2,
            cell: 12,
            last: 11
        }
    ));
    let huge: Vec<f64> = values.iter().map(|y| y * 1e300).collect();
    assert!(matches!(
        refused(cells, &huge, &settings()),
        StudyError::Spread(_)
    ));
    for confidence in [0.0, 0.4, 1.0, f64::NAN] {
        assert!(matches!(
            refused(
                cells,
                values,
                &Settings {
                    confidence,
                    ..settings()
                }
            ),
            StudyError::Setting { .. }
        ));
    }
    let one_part = crossed(12, 1, 3, 2);
    assert_eq!(
        analyse(
            &one_part.design,
            &one_part.cells,
            &one_part.values,
            &TWO_SIDED,
            &settings()
        )
        .unwrap_err(),
        StudyError::TooFewParts(1)
    );
    let prepared = Prepared::new(&readings.design, 3, &settings()).unwrap();
    assert!(matches!(
        prepared.study(cells, values, &TWO_SIDED),
        Err(StudyError::Unbalanced { expected: 3, .. })
    ));
}

#[test]
fn faulty_designs_are_refused() {
    let refused = |factors: Vec<Factor>| Design::new(factors).unwrap_err();
    let part = || Factor::crossed("part", 3);
    assert_eq!(
        refused(vec![Factor::crossed("appraiser", 3)]),
        DesignError::NoPart
    );
    assert_eq!(
        refused(vec![part(), part()]),
        DesignError::SameName("part".into())
    );
    assert_eq!(
        refused(vec![part(), Factor::crossed("shift", 0)]),
        DesignError::NoLevels("shift".into())
    );
    assert_eq!(
        refused(vec![part(), Factor::crossed(" ", 2)]),
        DesignError::NoName(2)
    );
    assert!(matches!(
        refused(vec![part(), Factor::nested("shift", 2, &["plant"])]),
        DesignError::UnknownContainer { .. }
    ));
    let circle = vec![
        part(),
        Factor::nested("a", 2, &["b"]),
        Factor::nested("b", 2, &["a"]),
    ];
    assert!(matches!(refused(circle), DesignError::Circle(_)));
    assert_eq!(
        refused(vec![part(), Factor::crossed("a", usize::MAX)]),
        DesignError::TooManyCells
    );
    let many: Vec<Factor> = (0..6)
        .map(|i| Factor::crossed(&format!("f{i}"), 2))
        .chain([part()])
        .collect();
    assert_eq!(refused(many), DesignError::TooManyFactors(7));
}
