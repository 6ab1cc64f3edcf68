//! The study record's keys, all of them and no others.

use serde_json::{Value, json};

/// Stands for a figure with its certainty.
const FIGURE: &str = "figure";
/// Stands for any value.
const ANY: &str = "any";
const FIGURE_KEYS: [&str; 7] = [
    "estimate", "lower", "upper", "at_least", "interval", "open", "why",
];

/// Checks a record of a round.
#[track_caller]
pub(crate) fn assert_of_a_plan(record: &Value) {
    let mut wanted = wanted();
    wanted["measured"] = json!({ "first": ANY, "last": ANY });
    wanted["standing"]["limits"] = json!({ "watch": ANY, "act": ANY, "back_below": ANY });
    compare(record, &wanted, "record");
}

/// Checks a record of a one-off study: what only a plan knows is null.
#[track_caller]
pub(crate) fn assert_one_off(record: &Value) {
    compare(record, &wanted(), "record");
    for key in [
        "site", "plan", "round", "revision", "measured", "reml", "risk", "draws", "seed",
    ] {
        assert_eq!(record[key], Value::Null, "{key}");
    }
    assert_eq!(record["standing"]["before"], Value::Null);
    assert_eq!(record["schema"], "restudy.study/1");
}

fn wanted() -> Value {
    let spread = json!({
        "variance": FIGURE, "sd": FIGURE, "share_of_tolerance": FIGURE, "share_of_tv": FIGURE,
    });
    json!({
        "schema": ANY, "site": ANY, "plan": ANY, "round": ANY, "revision": ANY, "instruments": ANY,
        "measured": ANY, "characteristic": ANY, "unit": ANY, "nominal": ANY, "lower": ANY, "upper": ANY,
        "tolerance_rule": ANY,
        "design": {
            "factors": [{ "name": ANY, "levels": ANY, "within": ANY }],
            "trials": ANY, "cells": ANY, "readings": ANY, "missing": ANY, "balanced": ANY,
        },
        "method": ANY, "confidence": ANY, "spread_sds": ANY,
        "interaction": { "kept": ANY, "p": ANY, "pool_above": ANY, "other_reading": ANY },
        "mean_squares": [{
            "name": ANY, "of": ANY, "within": ANY, "ss": ANY, "df": ANY, "ms": ANY, "f": ANY, "p": ANY,
            "against": ANY, "against_df": ANY,
        }],
        "reml": ANY,
        "components": [{
            "name": ANY, "of": ANY, "within": ANY, "raw": ANY, "variance": FIGURE, "sd": FIGURE,
        }],
        "figures": {
            "repeatability": spread, "reproducibility": spread, "gauge": spread, "part": spread,
            "total": spread,
        },
        "ndc": { "whole": ANY, "estimate": ANY, "lower": ANY, "upper": ANY },
        "part_to_gauge": FIGURE, "risk": ANY, "chance_above": { "watch": ANY, "act": ANY },
        "standing": { "now": ANY, "before": ANY, "limits": ANY, "judged_by": ANY, "why": ANY },
        "remarks": [{ "kind": ANY, "text": ANY, "figures": ANY }],
        "readings": {
            "used": ANY, "superseded": ANY, "surplus": ANY, "set_aside": ANY, "late": ANY, "excluded": ANY,
        },
        "same": ANY, "decisions": ANY, "source": [{ "export": ANY, "sha256": ANY }],
        "draws": ANY, "seed": ANY, "engine": ANY,
    })
}

#[track_caller]
fn compare(found: &Value, wanted: &Value, place: &str) {
    match wanted {
        Value::Object(wanted) => {
            assert_keys(
                found,
                &wanted.keys().map(String::as_str).collect::<Vec<_>>(),
                place,
            );
            for (key, wanted) in wanted {
                compare(&found[key], wanted, &format!("{place}.{key}"));
            }
        }
        Value::Array(wanted) => {
            let found = found
                .as_array()
                .unwrap_or_else(|| panic!("{place} is no list"));
            for (n, found) in found.iter().enumerate() {
                compare(found, &wanted[0], &format!("{place}[{n}]"));
            }
        }
        Value::String(word) if word == FIGURE => assert_keys(found, &FIGURE_KEYS, place),
        _ => {}
    }
}

/// Checks that an object has these keys and no others.
#[track_caller]
pub(crate) fn assert_keys(found: &Value, wanted: &[&str], place: &str) {
    let found = found
        .as_object()
        .unwrap_or_else(|| panic!("{place} is no object: {found}"));
    let mut keys: Vec<&str> = found.keys().map(String::as_str).collect();
    let mut wanted = wanted.to_vec();
    keys.sort_unstable();
    wanted.sort_unstable();
    assert_eq!(keys, wanted, "{place}");
}
