//! The shape of the record and of its remarks.

use serde_json::Value;

use crate::invented::crossed;
use crate::sound::study;

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
