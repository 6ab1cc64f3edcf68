//! QIF documents from `fixtures/exports/qif`, read by the rule that has nothing but the form.

use std::fmt::Write as _;

use insta::assert_snapshot;
use restudy_parsers::{
    Cell, Export, Form, Limit, Parsed, Qif, Reader, Refused, Role, Rule, Taken, Trial, Value,
};

use crate::damage::{consistent, damaged};
use crate::shared::{accounted, constant, path, read_at, table};

const HUB: &[u8] = include_bytes!("../../../fixtures/exports/qif/hub-3.0.xml");
const CASING_2_0: &[u8] = include_bytes!("../../../fixtures/exports/qif/casing-2.0.xml");
const CASING_2_1: &[u8] = include_bytes!("../../../fixtures/exports/qif/casing-2.1.xml");
const LIMITS: &[u8] = include_bytes!("../../../fixtures/exports/qif/limits-3.0.xml");
const FLAWED: &[u8] = include_bytes!("../../../fixtures/exports/qif/flawed-3.0.xml");
const OUTSIDE: &[u8] = include_bytes!("../../../fixtures/exports/qif/outside-3.0.xml");
const BARE: &[u8] = include_bytes!("../../../fixtures/exports/qif/bare-3.0.xml");
const TRIALS: &[u8] = include_bytes!("../../../fixtures/exports/qif/trials-3.0.xml");

fn says(place: Qif) -> Role {
    Role::plain(Cell::Qif(place))
}

fn attribute(name: &str) -> Role {
    says(Qif::Attribute(name.to_owned()))
}

fn limit(place: Qif) -> Option<Limit> {
    Some(Limit {
        role: says(place),
        from_nominal: false,
    })
}

/// What a configuration makes of `form = "qif"`.
fn qif() -> Rule {
    Rule {
        form: Form::Qif,
        part: says(Qif::Serial),
        appraiser: Some(says(Qif::Operator)),
        trial: Some(Trial::Stated(says(Qif::Trial))),
        taken: Some(Taken {
            role: says(Qif::Time),
            format: None,
            written_in: None,
            shown_in: Some("Europe/Oslo".to_owned()),
        }),
        characteristic: Some(says(Qif::Name)),
        value: Value {
            role: says(Qif::Value),
            unit: Some(says(Qif::Unit)),
        },
        nominal: Some(says(Qif::Nominal)),
        lower: limit(Qif::Lower),
        upper: limit(Qif::Upper),
        ..table()
    }
}

fn parsed(bytes: &[u8], rule: &Rule) -> Result<Parsed, Refused> {
    restudy_parsers::read(
        Export {
            path: "KL/casing-2.qif",
            bytes,
        },
        rule,
    )
}

/// Runs and readings without the places where they stand, so that they can be held against what a
/// document was written from; then what was set aside, and the notes.
fn told(bytes: &[u8], rule: &Rule) -> String {
    let all = read_at("KL/casing-2.qif", bytes, rule);
    let mut out = String::new();
    for line in all.lines() {
        let reading = line.starts_with("  ") && !line.starts_with("  hint");
        let line = match line.rfind(" (line ") {
            Some(at) if reading => &line[..at],
            _ => line,
        };
        writeln!(out, "{line}").unwrap();
    }
    for note in parsed(bytes, rule).map_or(Vec::new(), |parsed| parsed.notes) {
        writeln!(out, "note: {note}").unwrap();
    }
    out
}

#[test]
fn the_hub_reads_as_xpath_reads_it() {
    let expected = include_str!("../../../fixtures/exports/qif/hub-3.0.txt");
    assert_eq!(told(HUB, &qif()), expected);
}

#[test]
fn version_2_0_with_a_prefix_and_two_units() {
    assert_snapshot!(told(CASING_2_0, &qif()), @"");
}

#[test]
fn version_2_1_with_two_parts_in_one_run() {
    assert_snapshot!(told(CASING_2_1, &qif()), @"");
}

#[test]
fn every_way_of_stating_limits() {
    assert_snapshot!(told(LIMITS, &qif()), @"");
}

#[test]
fn every_flaw_is_named_and_costs_its_run() {
    assert_snapshot!(told(FLAWED, &qif()), @"");
}

#[test]
fn characteristics_that_another_document_defines() {
    assert_snapshot!(told(OUTSIDE, &qif()), @"");
}

#[test]
fn what_a_document_does_not_say_comes_from_the_path_or_is_asked_for() {
    assert_snapshot!(told(BARE, &qif()), @"");
    let rule = Rule {
        part: path("([a-z]+)-[0-9]"),
        appraiser: Some(path("^([^/]+)/")),
        trial: Some(Trial::Stated(path("-([0-9])[.]qif$"))),
        taken: None,
        value: Value {
            role: says(Qif::Value),
            unit: Some(constant("mm")),
        },
        ..qif()
    };
    assert_snapshot!(told(BARE, &rule), @"");
}

#[test]
fn trials_devices_and_user_attributes() {
    let rule = Rule {
        factors: [("fixture".to_owned(), attribute("fixture"))].into(),
        same: [("device".to_owned(), says(Qif::Device))].into(),
        ..qif()
    };
    assert_snapshot!(told(TRIALS, &rule), @"");
}

#[test]
fn a_unit_of_the_rule_against_the_documents_own() {
    let unit = |unit: &str| Rule {
        value: Value {
            role: says(Qif::Value),
            unit: Some(constant(unit)),
        },
        ..qif()
    };
    assert!(!parsed(HUB, &unit("millimetre")).unwrap().readings.is_empty());
    let inch = parsed(HUB, &unit("inch")).unwrap();
    assert!(inch.readings.is_empty());
    assert!(inch.set_aside[0].reason.ends_with("the value is in `mm`, but the rule says `inch`"));
}

#[test]
fn a_unit_whose_name_and_factor_differ_is_not_believed() {
    let text = String::from_utf8(HUB.to_vec()).unwrap();
    let text = text.replace("<Factor>0.001</Factor>", "<Factor>0.0254</Factor>");
    let aside = parsed(text.as_bytes(), &qif()).unwrap();
    assert!(aside.readings.is_empty());
    assert!(aside.set_aside[0].reason.ends_with(
        "the unit is named `mm`, but its factor is 0.0254, that of inch"
    ));
}

#[test]
fn other_documents_are_refused_with_what_was_found_and_expected() {
    let refused = |text: &str| parsed(text.as_bytes(), &qif()).unwrap_err().sentence;
    let mut all = String::new();
    for text in [
        "serial,value\n1,2\n".to_owned(),
        "<export xmlns=\"urn:example\"/>".to_owned(),
        "<QIFDocument/>".to_owned(),
        "<QIFDocument xmlns=\"http://qifstandards.org/xsd/qif4\"/>".to_owned(),
        "<QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\"><Product/></QIFDocument>".to_owned(),
        "<QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\"><Results/></QIFDocument>".to_owned(),
        "<!DOCTYPE QIFDocument [<!ENTITY a \"b\">]><QIFDocument/>".to_owned(),
        format!(
            "<QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\">{}",
            "<Results>".repeat(100)
        ),
        "<q:QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\"/>".to_owned(),
    ] {
        writeln!(all, "{}", refused(&text)).unwrap();
    }
    assert_snapshot!(all, @"");
}

#[test]
fn places_fit_the_form() {
    let wrong = |rule: Rule| Reader::new(&rule).unwrap_err().to_string();
    let column = Rule {
        part: crate::shared::column("part"),
        ..qif()
    };
    assert_eq!(wrong(column), "part: no place in a QIF document, but the form is QIF");
    let elsewhere = Rule {
        part: says(Qif::Serial),
        ..table()
    };
    assert_eq!(wrong(elsewhere), "part: a place in a QIF document, but the form is another");
    let comma = Rule {
        decimal: ',',
        ..qif()
    };
    assert_eq!(wrong(comma), "decimal: QIF writes a point");
}

#[test]
fn a_cut_document_is_never_taken_for_a_whole_one() {
    for bytes in [HUB, CASING_2_0, LIMITS, FLAWED] {
        let reader = Reader::new(&qif()).unwrap();
        let read = |bytes| reader.read(Export { path: "", bytes });
        assert!(read(bytes).is_ok());
        for end in (0..bytes.len() - 64).step_by(64).chain(1..64) {
            let refused = read(&bytes[..end]).unwrap_err();
            assert!(refused.perhaps_unfinished, "cut at {end}: {refused}");
        }
    }
}

#[test]
fn a_changed_byte_adds_no_reading() {
    let reader = Reader::new(&qif()).unwrap();
    let read = |bytes: &[u8]| reader.read(Export { path: "", bytes });
    let whole = accounted(&read(CASING_2_1).unwrap());
    damaged(CASING_2_1, &[0x01, 0x20], |bytes| {
        let outcome = read(bytes);
        consistent(&outcome);
        if let Ok(parsed) = outcome {
            assert!(accounted(&parsed) <= whole);
        }
    });
}
