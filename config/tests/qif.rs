//! The form alone reads a QIF document: every role stands where the standard has it.

mod common;

use std::path::Path;

use restudy_parsers::{Cell, Form, Limit, Qif, Role, Rule, Taken, Trial, Value};

use common::{Memory, shown};

const BEFORE: &str = r#"
[site]
name = "Halden Pump Works"
zone = "Europe/Oslo"
[state]
folder = "/state"
[[instrument]]
name = "bridge-1"
folders = ["/exports"]
files = ["*.qif"]
settle = "2s"
[instrument.read]
form = "qif"
"#;

const AFTER: &str = r#"
[[plan]]
name = "hub"
instruments = ["bridge-1"]
parts = 10
appraisers = ["KL", "MO"]
trials = 3
interaction = "keep"
repeat_every = "90d"
[plan.limits]
watch = 0.1
act = 0.3
"#;

fn rule(lines: &str) -> Rule {
    let disk = Memory::with_folders(&["/state", "/exports"]);
    let text = format!("{BEFORE}{lines}{AFTER}");
    let (config, _) = restudy_config::read(&text, "restudy.toml", Path::new("/etc"), &disk)
        .unwrap_or_else(|faults| panic!("{}", shown(&faults)));
    config.instruments[0].rule.clone()
}

fn says(place: Qif) -> Role {
    Role::plain(Cell::Qif(place))
}

#[test]
fn every_role_stands_where_the_standard_has_it() {
    let limit = |place| {
        Some(Limit {
            role: says(place),
            from_nominal: false,
            unsigned: false,
        })
    };
    let expected = Rule {
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
        round: None,
        characteristic: Some(says(Qif::Name)),
        value: Value {
            role: says(Qif::Value),
            unit: Some(says(Qif::Unit)),
        },
        nominal: Some(says(Qif::Nominal)),
        lower: limit(Qif::Lower),
        upper: limit(Qif::Upper),
        ..rule("")
    };
    assert_eq!(rule(""), expected);
}

#[test]
fn a_role_is_taken_from_elsewhere_or_only_cut_and_respelled() {
    let read = rule(
        r#"
part = { find = '^[^/]+', spellings = { C-1 = ["C1"] } }
appraiser = { path = '^([^/]+)/' }
characteristic = { qif = "designator" }
value = { unit = "mm" }
same = { device = { qif = "device serial" }, program = { attribute = "Program" } }
"#,
    );
    assert_eq!(
        read.part,
        Role {
            from: Cell::Qif(Qif::Serial),
            find: Some("^[^/]+".to_owned()),
            spellings: [("C1".to_owned(), "C-1".to_owned())].into(),
        }
    );
    assert_eq!(
        read.appraiser,
        Some(Role::plain(Cell::Path("^([^/]+)/".to_owned())))
    );
    assert_eq!(read.characteristic, Some(says(Qif::Designator)));
    assert_eq!(read.value.role, says(Qif::Value));
    assert_eq!(
        read.value.unit,
        Some(Role::plain(Cell::Constant("mm".to_owned())))
    );
    assert_eq!(read.same["device"], says(Qif::DeviceSerial));
    assert_eq!(
        read.same["program"],
        says(Qif::Attribute("Program".to_owned()))
    );
}
