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
        unsigned: false,
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
            dates: None,
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
    assert_snapshot!(told(CASING_2_0, &qif()), @"
    run C-1 | TS | 2026-06-02T16:20:05.5
      Flange length: 1.1012 in [1.099 1.1 1.102]
      Flange width: 50.8 mm [- - 51.054]
    ");
}

#[test]
fn version_2_1_with_two_parts_in_one_run() {
    assert_snapshot!(told(CASING_2_1, &qif()), @"
    run C-1 | KL | 2026-06-02T08:00:00
      B1: 12.003 mm [11.95 12 12.05]
      Chamfer: 45.02 ° [44.5 45 45.5]
    run C-2 | KL | 2026-06-02T08:00:00
      B1: 11.998 mm [11.95 12 12.05]
      Chamfer: 44.97 ° [44.5 45 45.5]
    ");
}

#[test]
fn every_way_of_stating_limits() {
    assert_snapshot!(told(LIMITS, &qif()), @"
    run C-1 | KL | 2026-06-02T08:00:00
      deviations: 0.25 mm [-0.1 0.2 0.3]
      upper only: 30.1 mm [- 30 30.2]
      lower only: 30.1 mm [29.8 30 -]
      absolute, no target: 25.4 mm [25.35 - 25.45]
      deviations, no target: 25.4 mm
      by default: 4.01 mm [3.98 4 4.02]
      not toleranced: 80.03 mm [- 80 -]
      fit: 12.004 mm [- 12 -]
      form: 0.021 mm [- - 0.08]
      form by area: 0.021 mm
      position, material: 0.11 mm [- - 0.2]
      profile: -0.011 mm [-0.025 - 0.025]
      profile, outer: 0.02 mm [-0.2 - 0.1]
      profile, unequal: 0.02 mm [-0.05 - 0.25]
      angle: 45.25 ° [44.5 45 45.5]
      user unit: 58.4 HRC [56 58 60]
      in inches: 25.401 mm [25.3873 25.4 25.4127]
    note: `deviations, no target`: its limits are deviations from a target that is not stated: none are taken
    note: `fit`: its limits are a fit's code, which is not worked out: none are taken
    note: `position, material`: its tolerance grows with the part's material condition, and the bonus is not added: the limit is stricter than the drawing
    ");
}

#[test]
fn every_flaw_is_named_and_costs_its_run() {
    assert_snapshot!(told(FLAWED, &qif()), @r#"
    run C-1 | KL | 2026-06-02T08:00:00
      Bore: 12.003 mm [11.95 12 12.05]
      Height: 30.1 mm
    run C-2 | MO | 2026-06-02T08:44:00
      Bore: 12.006 mm [11.95 12 12.05]
    set aside (2): line 129, CharacteristicMeasurement/Value: `Bore` occurs twice in one run
      hint: if these are trials, say where the trial stands or how trials are counted
    set aside (2): line 156, CharacteristicMeasurement: there is no value, only the status `SYSERROR`
      hint: measure this run again
    set aside (1): line 180, CharacteristicMeasurement: there is no Value, only MaxValue and MinValue
      hint: if one of them is what is studied, say so, as in `value = { qif = "max" }`
    set aside (2): line 211, CharacteristicMeasurement/Value: `O.004` behind the number is no unit that is known here
      hint: if it is the unit, state it with `unit = "O.004"` beside the value; else take the number alone with `find`
    set aside (1): line 242, CharacteristicMeasurement: the characteristic item with the id 99 is not in this document
      hint: the document is not whole: export it again
    set aside (1): line 275, ActualComponent/SerialNumber: the run lists 2 parts, and the value does not say which of them it is of
      hint: have serial numbers written, or say where the part stands, as in `part = { path = '([^/]+)[.]qif$' }`
    set aside (1): line 487, ActualComponent/SerialNumber: blank, where the part should stand
      hint: have serial numbers written, or say where the part stands, as in `part = { path = '([^/]+)[.]qif$' }`
    set aside (1): line 311, InspectionOperator/Name: blank, where the appraiser should stand
      hint: have the operator written, or say where the appraiser stands, as in `appraiser = { path = '^([^/]+)/' }`
    set aside (1): line 327, InspectionTraceability/InspectionStart: no time of inspection is stated for this run
      hint: have the inspection's start written, or say where `taken` stands, or how trials are told apart, as in `trial = { path = '-([0-9]+)[.]qif$' }`
    set aside (1): line 27, CharacteristicDefinition: `perhaps` does not say whether the tolerance's values are limits or deviations
      hint: `DefinedAsLimit` is `true` or `false`; export it again
    set aside (1): line 424, CharacteristicMeasurement/Value: the unit `furlong` is not among the units of this document: `mm`
      hint: correct the units where the export is made
    set aside (1): line 93, CharacteristicMeasurement: there is no value, only the status `PASS`
      hint: a go/no-go result cannot be studied as a measured value
    set aside (1): line 361, CharacteristicMeasurement: the run in line 351 is the one in line 69 once more, with the same identifier
      hint: the first is used
    set aside (1): line 368, CharacteristicMeasurement: the run in line 351 is the one in line 69 once more, with the same identifier
      hint: the first is used
    set aside (1): line 375, CharacteristicMeasurement: the run in line 351 is the one in line 69 once more, with the same identifier
      hint: the first is used
    set aside (1): line 449, CharacteristicMeasurement: a user-defined attribute has a text, no number
      hint: it is not studied
    "#);
}

#[test]
fn characteristics_that_another_document_defines() {
    assert_snapshot!(told(OUTSIDE, &qif()), @r"
    set aside (1): line 35, CharacteristicMeasurement: the characteristic item 14 is defined in `plans\casing.qif` (6f1a7c1e-0000-4000-8000-000000000001), which is not at hand
      hint: have results written in one document with what they refer to
    ");
}

#[test]
fn what_a_document_does_not_say_comes_from_the_path_or_is_asked_for() {
    assert_snapshot!(told(BARE, &qif()), @r"
    set aside (1): line 9, ActualComponent/SerialNumber: blank, where the part should stand
      hint: have serial numbers written, or say where the part stands, as in `part = { path = '([^/]+)[.]qif$' }`
    set aside (1): line 16, ActualComponent/SerialNumber: blank, where the part should stand
      hint: have serial numbers written, or say where the part stands, as in `part = { path = '([^/]+)[.]qif$' }`
    set aside (1): line 23, ActualComponent/SerialNumber: blank, where the part should stand
      hint: have serial numbers written, or say where the part stands, as in `part = { path = '([^/]+)[.]qif$' }`
    note: the document names no operator; say where the appraiser stands, as in `appraiser = { path = '^([^/]+)/' }`
    ");
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
    assert_snapshot!(told(BARE, &rule), @"
    run casing | KL | 2
      Bore & <rim> (B1): 12.003 mm
      bore & <RIM> (B2): 12 mm
      16: 0.5 mm
    ");
}

#[test]
fn trials_devices_and_user_attributes() {
    let rule = Rule {
        factors: [("fixture".to_owned(), attribute("fixture"))].into(),
        same: [("device".to_owned(), says(Qif::Device))].into(),
        ..qif()
    };
    assert_snapshot!(told(TRIALS, &rule), @"
    run C-1 | KL | 1 | fixture left | same device `bridge-1` | 2026-06-02T10:01:00
      Bore: 12.003 mm
      Height: 30.1 mm
    run C-1 | KL | 2 | fixture left | same device `bridge-1` | 2026-06-02T10:12:00
      Bore: 12.004 mm
      Height: 30.2 mm
    ");
}

#[test]
fn other_places_of_a_document() {
    let rule = Rule {
        part: says(Qif::Component),
        characteristic: Some(says(Qif::Designator)),
        value: Value {
            role: says(Qif::Greatest),
            unit: Some(says(Qif::Unit)),
        },
        same: [("status".to_owned(), says(Qif::Status))].into(),
        ..qif()
    };
    let read = parsed(FLAWED, &rule).unwrap();
    let [reading] = read.readings.as_slice() else {
        panic!("{:?}", read.readings);
    };
    assert_eq!(
        (reading.characteristic.as_str(), reading.value),
        ("B1", 12.01)
    );
    assert_eq!((reading.lower, reading.upper), (Some(11.95), Some(12.05)));
    assert_eq!(read.runs[0].part, "31");
    assert_eq!(read.runs[0].same["status"], "PASS");
    let reasons: Vec<&str> = read
        .set_aside
        .iter()
        .map(|aside| aside.reason.as_str())
        .collect();
    assert!(
        reasons
            .iter()
            .any(|reason| reason.ends_with("there is no MaxValue, only Value")),
        "{reasons:?}"
    );
    let serial = Rule {
        same: [
            ("device".to_owned(), says(Qif::DeviceSerial)),
            ("run".to_owned(), says(Qif::Run)),
        ]
        .into(),
        ..qif()
    };
    let run = &parsed(HUB, &serial).unwrap().runs[0];
    assert_eq!(run.same["device"], "HPW-0417");
    assert_eq!(run.same["run"], "36f675cc-81e7-4ef5-a8e2-5d940ed90475");
}

/// Runs without time and trial would supersede one another.
#[test]
fn runs_that_nothing_tells_apart_are_set_aside() {
    let text = String::from_utf8(HUB.to_vec()).unwrap();
    let text = regex::Regex::new("<InspectionStart>.*|<InspectionEnd>.*|<Attributes.*")
        .unwrap()
        .replace_all(&text, "");
    let parsed_by = |rule: &Rule| parsed(text.as_bytes(), rule).unwrap();
    let aside = parsed_by(&qif());
    assert_eq!((aside.readings.len(), accounted(&aside)), (0, 24));
    assert_snapshot!(aside.set_aside[0].reason, @"line 117, InspectionTraceability/InspectionStart: no time of inspection is stated for this run");
    let by_path = Rule {
        trial: Some(Trial::Stated(path("-([0-9])[.]qif$"))),
        ..qif()
    };
    let read = parsed_by(&by_path);
    assert!(read.runs.iter().all(|run| run.taken.is_none()));
    assert_eq!(
        read.set_aside[0].readings, 6,
        "two runs of each part and operator are one"
    );
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
    assert!(
        !parsed(HUB, &unit("millimetre"))
            .unwrap()
            .readings
            .is_empty()
    );
    let inch = parsed(HUB, &unit("inch")).unwrap();
    assert!(inch.readings.is_empty());
    assert!(
        inch.set_aside[0]
            .reason
            .contains("the value is in `mm`, but the rule says `inch`")
    );
}

#[test]
fn a_unit_whose_name_and_factor_differ_is_not_believed() {
    let text = String::from_utf8(HUB.to_vec()).unwrap();
    let text = text.replace("<Factor>0.001</Factor>", "<Factor>0.0254</Factor>");
    let aside = parsed(text.as_bytes(), &qif()).unwrap();
    assert!(aside.readings.is_empty());
    assert!(
        aside.set_aside[0]
            .reason
            .contains("the unit is named `mm`, but its factor is 0.0254, that of in")
    );
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
        "<QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\"><Product/></QIFDocument>"
            .to_owned(),
        "<QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\"><Results/></QIFDocument>"
            .to_owned(),
        "<!DOCTYPE QIFDocument [<!ENTITY a \"b\">]><QIFDocument/>".to_owned(),
        format!(
            "<QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\">{}",
            "<Results>".repeat(100)
        ),
        "<q:QIFDocument xmlns=\"http://qifstandards.org/xsd/qif3\"/>".to_owned(),
    ] {
        writeln!(all, "{}", refused(&text)).unwrap();
    }
    assert_snapshot!(all, @"
    this is not XML, as QIF documents are; it begins with `serial,value 1,2`
    line 1: the root element is `export` in `urn:example`; a QIF document has `QIFDocument` in `http://qifstandards.org/xsd/qif2` or `http://qifstandards.org/xsd/qif3`
    line 1: `QIFDocument` lies in `no namespace`; this version reads `http://qifstandards.org/xsd/qif2` and `http://qifstandards.org/xsd/qif3`
    line 1: `QIFDocument` lies in `http://qifstandards.org/xsd/qif4`; this version reads `http://qifstandards.org/xsd/qif2` and `http://qifstandards.org/xsd/qif3`
    this QIF document holds no results, only what is to be measured
    the results of this QIF document (line 1) hold no measured characteristic
    line 1: a document type (DOCTYPE); exports that declare one are not read
    line 1: elements lie deeper than 64; that is the limit
    line 1: the namespace prefix `q` is not declared
    ");
}

#[test]
fn places_fit_the_form() {
    let wrong = |rule: Rule| Reader::new(&rule).unwrap_err().to_string();
    let column = Rule {
        part: crate::shared::column("part"),
        ..qif()
    };
    assert_eq!(
        wrong(column),
        "part: no place in a QIF document, but the form is QIF"
    );
    let elsewhere = Rule {
        part: says(Qif::Serial),
        ..table()
    };
    assert_eq!(
        wrong(elsewhere),
        "part: a place in a QIF document, but the form is another"
    );
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
        for end in (0..bytes.len() - 64).step_by(64).chain(2..64) {
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

/// The same document as other writers and the older versions of the standard would have it.
#[test]
fn the_hub_in_any_dress_reads_the_same() {
    let text = String::from_utf8(HUB.to_vec()).unwrap();
    let with = |pattern: &str, to: &str| {
        let pattern = regex::Regex::new(pattern).unwrap();
        assert!(pattern.is_match(&text), "{pattern}");
        pattern.replace_all(&text, to).into_owned()
    };
    let (before, rest) = text.split_once("  <Characteristics>").unwrap();
    let (characteristics, results) = rest.split_once("  <Results>").unwrap();
    let version_2_1 = text
        .replace("xsd/qif3", "xsd/qif2")
        .replace("3.0.0", "2.1.0")
        .replace("<Results>", "<MeasurementsResults>")
        .replace("</Results>", "</MeasurementsResults>")
        .replace("CharacteristicMeasurement", "CharacteristicActual")
        .replace("CharacteristicDesignator", "KeyCharacteristic");
    let wrapper =
        regex::Regex::new("</?(MeasurementResultsSet|ActualComponentSets)[^>]*>").unwrap();
    let dresses = [
        (
            "prefixed",
            with("<(/?)([A-Z])", "<${1}q:$2").replace("xmlns=", "xmlns:q="),
        ),
        ("blanks", with(">([^<>\\s][^<>]*)</", ">\n\t $1 \r\n</")),
        (
            "character data",
            with(">([^<>\\s][^<>]*)</", "><![CDATA[$1]]></"),
        ),
        (
            "a comment in every number",
            with(">(-?[0-9])([0-9.]*)</", "><?n?>$1<!-- 7 -->$2</"),
        ),
        ("references", with(">([0-9])([0-9.]*)</", ">&#x3$1;$2</")),
        (
            "a long way between elements",
            with(
                "<MeasurementResultsSet[^>]*>",
                &format!("$0{}", " ".repeat(70_000)),
            ),
        ),
        ("single quotes", with("=\"([^\"]*)\"", " = '$1'")),
        (
            "other attributes",
            with(
                "<([A-Z][A-Za-z]*) id=",
                "<$1 xmlns:v=\"urn:v\" v:id=\"9\" label=\"x\" id=",
            ),
        ),
        (
            "other elements",
            with(
                "<Status>",
                "<v:Value xmlns:v=\"urn:v\">9</v:Value><Notes><Value>9</Value></Notes><Status>",
            ),
        ),
        (
            "results first",
            format!(
                "{before}  <Results>{}",
                results.replace(
                    "</QIFDocument>",
                    &format!("  <Characteristics>{characteristics}</QIFDocument>")
                )
            ),
        ),
        (
            "version 2.0",
            wrapper.replace_all(&version_2_1, "").into_owned(),
        ),
        ("version 2.1", version_2_1),
        (
            "counts that are wrong",
            with(" n=\"[0-9]+\"", " n=\"4000000000\""),
        ),
        ("CR LF", text.replace('\n', "\r\n")),
    ];
    for (name, dressed) in &dresses {
        assert_ne!(*dressed, text, "{name}");
        assert_eq!(
            told(dressed.as_bytes(), &qif()),
            told(HUB, &qif()),
            "{name}"
        );
    }
    let utf_16: Vec<u8> = std::iter::once(0xFEFF)
        .chain(text.replace("UTF-8", "UTF-16").encode_utf16())
        .flat_map(u16::to_be_bytes)
        .collect();
    assert_eq!(told(&utf_16, &qif()), told(HUB, &qif()));
}

/// References that lead nowhere, round, or to two places: each run is set aside, none is guessed.
#[test]
fn no_reference_is_guessed() {
    let text = String::from_utf8(HUB.to_vec()).unwrap();
    let spoilt = |from: &str, to: &str| {
        assert!(text.contains(from), "{from}");
        let parsed = parsed(text.replace(from, to).as_bytes(), &qif()).unwrap();
        assert_eq!(accounted(&parsed), 24, "{to}");
        let reason = parsed.set_aside.first().map(|aside| aside.reason.clone());
        format!(
            "{} left; {}\n",
            parsed.readings.len(),
            reason.unwrap_or_default()
        )
    };
    let mut all = String::new();
    for (from, to) in [
        ("<CharacteristicItemId>16</CharacteristicItemId>", ""),
        (
            "<CharacteristicItemId>16<",
            "<CharacteristicItemId>sixteen<",
        ),
        (
            "<CharacteristicNominalId>13<",
            "<CharacteristicNominalId>130<",
        ),
        (
            "<CharacteristicDefinitionId>12<",
            "<CharacteristicDefinitionId>-12<",
        ),
        (
            "CharacteristicItem id=\"17\"",
            "CharacteristicItem id=\"16\"",
        ),
        ("<Id>21</Id>", "<Id>22</Id>"),
        ("<Id>21</Id>", "<Id>20</Id><Id>21</Id>"),
        ("<TargetValue>12<", "<TargetValue>12,0<"),
        ("<MaxValue>25.45<", "<MaxValue>25.25<"),
        (
            "<ToleranceValue>0.05<",
            "<ToleranceValue linearUnit=\"lines\">0.05<",
        ),
        ("<Value decimalPlaces=\"4\">12.0020<", "<Value>INF<"),
        ("<Value decimalPlaces=\"4\">12.0020<", "<Value><"),
        (
            "<InspectionOperator><Name>MO<",
            "<InspectionOperator><Name>KL</Name></InspectionOperator><InspectionOperator><Name>MO<",
        ),
        ("name=\"Trial\" value=\"2\"", "name=\"Trial\""),
        ("2026-03-05T11", "11"),
    ] {
        all.push_str(&spoilt(from, to));
    }
    assert_snapshot!(all, @"
    0 left; line 127, CharacteristicMeasurement: the value does not say which characteristic item it is of
    0 left; line 129, CharacteristicMeasurement: `sixteen` is no id, where the characteristic item should be named
    0 left; line 99, CharacteristicDefinition: the characteristic's nominal with the id 130 is not in this document
    0 left; line 91, CharacteristicDefinition: `-12` is no id, where the characteristic's definition should be named
    0 left; line 129, CharacteristicMeasurement: the id 16 of the characteristic item stands twice, in lines 95 and 101 (and 1 further unusable reading in this run)
    12 left; line 175, ActualComponent/SerialNumber: the part with the id 22 is not in this document
    12 left; line 175, ActualComponent/SerialNumber: the run lists 2 parts, and the value does not say which of them it is of
    0 left; line 84, CharacteristicDefinition: `12,0` is not a number, as TargetValue is
    0 left; line 132, CharacteristicDefinition: the lower limit 25.35 lies above the upper limit 25.25
    0 left; line 75, CharacteristicDefinition: the unit `lines` is not among the units of this document: `mm`
    21 left; line 130, CharacteristicMeasurement/Value: `INF` is not a number; this instrument's decimal mark is `.`
    21 left; line 127, CharacteristicMeasurement/Value: blank, where the value should stand
    12 left; line 182, InspectionOperator/Name: two operators are named, `KL` and `MO`
    12 left; line 238, Attributes/Trial: blank, where the trial should stand
    15 left; line 270, InspectionTraceability/InspectionStart: `11:00:00+01:00` is not a time as `2026-06-02T14:20:05`
    ");
}
