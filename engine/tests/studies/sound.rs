//! Studies that are checked to be sound: numbers finite or absent, absent ones with a reason.

use restudy_engine::{Interaction, Judge, Limits, Settings, Study, Tolerance, analyse};
use serde_json::Value;

use crate::invented::Readings;

pub(crate) const TWO_SIDED: Tolerance = Tolerance {
    lower: Some(-30.0),
    upper: Some(30.0),
    one_sided: None,
};

pub(crate) fn settings() -> Settings {
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

pub(crate) fn study(readings: &Readings) -> Study {
    study_with(readings, &TWO_SIDED, &settings())
}

pub(crate) fn study_with(readings: &Readings, tolerance: &Tolerance, settings: &Settings) -> Study {
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
