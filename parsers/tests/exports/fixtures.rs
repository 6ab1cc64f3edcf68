//! Whole exports from `fixtures/exports`, each read by the rule that its machine would have.

use crate::shared::{
    absolute, column, constant, deviation, label, path, read, read_at, shown, table, xml,
};
use insta::assert_snapshot;
use restudy_parsers::{
    Count, Export, Find, Form, Header, Plain, Role, Rule, Sheet, Taken, Trial, Value, read_plain,
};

pub(crate) const BRIDGE_1: &[u8] = include_bytes!("../../../fixtures/exports/bridge-1-run-2.csv");
const GAUGE_3: &[u8] = include_bytes!("../../../fixtures/exports/gauge-3.csv");
pub(crate) const BENCH_2: &[u8] = include_bytes!("../../../fixtures/exports/bench-2.txt");
pub(crate) const BRIDGE_2: &[u8] = include_bytes!("../../../fixtures/exports/bridge-2.xml");

fn found(role: Role, find: &str) -> Role {
    Role {
        find: Some(find.to_owned()),
        ..role
    }
}

pub(crate) fn bridge_1() -> Rule {
    Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Find("serial no.".to_owned()),
            delimiter: None,
        },
        part: column("Serial no."),
        appraiser: Some(label("Loaded by")),
        trial: Some(Trial::Stated(path(r"run-(\d+)"))),
        taken: Some(Taken {
            role: crate::shared::at(2, 1),
            format: Some("%d.%m.%Y %H:%M".to_owned()),
            dates: None,
            written_in: None,
            shown_in: None,
        }),
        characteristic: Some(column("Feature")),
        value: Value {
            role: column("Actual"),
            unit: Some(column("Unit")),
        },
        nominal: Some(column("Nominal")),
        lower: deviation(column("Lower tol.")),
        upper: deviation(column("Upper tol.")),
        factors: [("fixture".to_owned(), constant("left"))].into(),
        same: [
            ("program".to_owned(), label("Program")),
            ("stylus".to_owned(), found(label("Stylus"), "^[^,]+")),
        ]
        .into(),
        end: Some(Find {
            find: "end of report".to_owned(),
        }),
        ..table()
    }
}

#[test]
fn one_run_with_a_block_of_labels_above_its_headings() {
    assert_snapshot!(read_at("hub/GRR/run-2.csv", BRIDGE_1, &bridge_1()), @r#"
    run HP-0417 | KL | 2 | fixture left | same program `hub rev 12` | same stylus `T3` | 2026-06-02T14:20:00
      bore A: 50.0123 mm [49.95 50 50.05] (line 8, column `Actual`)
      height "B": 12.034 mm [11.9 12 12.1] (line 9, column `Actual`)
      face C flatness: 0.021 mm [- 0 0.08] (line 11, column `Actual`)
    "#);
}

#[test]
fn several_runs_in_windows_1252_with_decimal_commas() {
    let rule = Rule {
        part: column("STÜCK"),
        appraiser: Some(column("Prüfer")),
        trial: Some(Trial::Stated(column("Durchgang"))),
        characteristic: Some(column("Merkmal")),
        value: Value {
            role: column("Istwert"),
            unit: Some(constant("mm")),
        },
        nominal: Some(column("Nennmaß")),
        lower: absolute(column("Untergrenze")),
        upper: absolute(column("Obergrenze")),
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Row(2),
            delimiter: None,
        },
        decimal: ',',
        no_value: vec!["---".to_owned(), "9999".to_owned()],
        encoding: Some("windows-1252".to_owned()),
        ..table()
    };
    assert_snapshot!(read(GAUGE_3, &rule), @r#"
    run P1 | KL | 1
      Bohrung Ø12: 12.003 mm [11.95 12 12.05] (line 3, column `Istwert`)
      Höhe: 30.11 mm [29.8 30 30.2] (line 4, column `Istwert`)
    run P2 | MO | 1
      Bohrung Ø12: 12.001 mm [11.95 12 12.05] (line 10, column `Istwert`)
    set aside (2): line 6, column `Istwert`: `---` stands for no value
      hint: measure this run again
    set aside (2): line 7, column `Istwert`: `12.004` is not a number; this instrument's decimal mark is `,`
      hint: is `.` the decimal mark (`decimal = "."`), or does it stand between thousands (`thousands = "."`)?
    set aside (1): line 9, column `Stück`: blank, where the part should stand
      hint: have every row filled in: nothing is taken over from the row above
    "#);
}

#[test]
fn utf_16_with_tabs_and_trials_told_apart_by_time() {
    let rule = Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Row(1),
            delimiter: Some('\t'),
        },
        appraiser: Some(column("appraiser")),
        trial: Some(Trial::Counted(Count::Taken)),
        taken: Some(Taken {
            role: column("taken"),
            format: None,
            dates: None,
            written_in: None,
            shown_in: None,
        }),
        value: Value {
            role: column("value"),
            unit: Some(column("unit")),
        },
        ..table()
    };
    assert_snapshot!(read(BENCH_2, &rule), @"
    run P1 | KL | 2026-06-02T14:20:05
      value: 1.0015 µm (line 2, column `value`)
    run P1 | KL | 2026-06-02T14:25:05
      value: 1.0017 µm (line 3, column `value`)
    run P1 | MO | 2026-06-02T14:30:05
      value: 1.0021 µm (line 4, column `value`)
    run P2 | MO | 2026-06-02T14:31:05
      value: 1.0121 µm (line 5, column `value`)
    ");
}

pub(crate) fn bridge_2() -> Rule {
    Rule {
        form: Form::Xml {
            each: "/export/run/feature".to_owned(),
        },
        part: xml("../@part"),
        appraiser: Some(Role {
            spellings: [("k. l.".to_owned(), "KL".to_owned())].into(),
            ..xml("/export/head/operator")
        }),
        trial: Some(Trial::Stated(xml("../@trial"))),
        taken: Some(Taken {
            role: xml("/export/run/@start"),
            format: None,
            dates: None,
            written_in: None,
            shown_in: Some("Europe/Oslo".to_owned()),
        }),
        round: Some(xml("/export/@id")),
        characteristic: Some(xml("@id")),
        value: Value {
            role: xml("value"),
            unit: Some(xml("value/@unit")),
        },
        nominal: Some(xml("nominal")),
        lower: deviation(xml("lower")),
        upper: deviation(xml("upper")),
        same: [("program".to_owned(), xml("/export/head/program"))].into(),
        end: Some(Find {
            find: "End of report".to_owned(),
        }),
        ..table()
    }
}

#[test]
fn xml_with_a_namespace_split_texts_and_one_text_for_a_value() {
    assert_snapshot!(read(BRIDGE_2, &bridge_2()), @"
    run P03 | KL | 1 | same program `housing & cover rev <4>` | 2026-06-11T21:50:00 | round 31
      bore A: 50.012 mm [49.95 50 50.05] (line 10, /export/run/feature/value)
      face C flatness: 0.021 mm [- 0 0.08] (line 16, /export/run/feature/value)
    set aside (2): line 23, /export/run/feature/value: `n/a` is not a number; this instrument's decimal mark is `.`
      hint: if it means that nothing was measured, list it in `no_value`
    ");
}

#[test]
fn plain_headings_need_no_rule() {
    let plain = |bytes| {
        shown(&read_plain(
            Export {
                path: "plain",
                bytes,
            },
            &Plain::default(),
        ))
    };
    assert_snapshot!(plain(include_bytes!("../../../fixtures/exports/plain.csv")), @"
    run P1 | KL | 1 | 2026-06-02T14:20:05
      bore A: 50.0123 mm [49.95 50 50.05] (line 2, column `Value`)
    run P1 | KL | 2 | 2026-06-02T14:24:05
      bore A: 50.0131 mm [49.95 50 50.05] (line 3, column `Value`)
    run P1 | MO | 1 | 2026-06-02T14:28:05
      bore A: 50.014 mm [49.95 50 50.05] (line 4, column `Value`)
    ");
    assert_snapshot!(plain(include_bytes!("../../../fixtures/exports/plain-comma.csv")), @"
    run P1 | 1
      value: 50.0123 [49.95 - 50.05] (line 2, column `Value`)
    run P1 | 2
      value: 50.0131 [49.95 - 50.05] (line 3, column `Value`)
    run P2 | 1
      value: 50.0229 [49.95 - 50.05] (line 4, column `Value`)
    ");
}

#[test]
fn columns_that_plain_reading_does_not_use_are_named() {
    let notes = |text: &str, factors: &[&str]| {
        let asked = Plain {
            factors: factors.iter().map(|&name| name.to_owned()).collect(),
        };
        let export = Export {
            path: "",
            bytes: text.as_bytes(),
        };
        read_plain(export, &asked).unwrap().notes
    };
    assert_snapshot!(notes("part,Operator,value\nP1,KL,1\n", &[]).join("\n"), @"line 1: the column `Operator` (perhaps `appraiser`?) is not used");
    assert_snapshot!(notes("\npart;Run;Dimension;batch;value\nP1;1;bore;7;1\n", &[]).join("\n"), @"line 2: the columns `Run` (perhaps `trial`?), `Dimension` (perhaps `characteristic`?), `batch` are not used");
    assert_snapshot!(notes("part,sample,value\nP1,3,1\n", &[]).join("\n"), @"line 1: the column `sample` is not used");
    let many: Vec<String> = (1..=15).map(|n| format!("x{n}")).collect();
    let many = format!("part,value,{}\nP1,1{}\n", many.join(","), ",2".repeat(15));
    assert_snapshot!(notes(&many, &[]).join("\n"), @"line 1: the columns `x1`, `x2`, `x3`, `x4`, `x5`, `x6`, `x7`, `x8`, `x9`, `x10`, `x11`, `x12` and 3 more are not used");
    assert!(notes("Part,User,Value\nP1,KL,1\n", &["user"]).is_empty());
    assert!(notes("part,value\nP1,1\n", &[]).is_empty());
}

#[test]
fn an_outcome_without_notes_is_one_with_none() {
    let parsed: restudy_parsers::Parsed =
        serde_json::from_str(r#"{"runs":[],"readings":[],"set_aside":[]}"#).unwrap();
    assert!(parsed.notes.is_empty());
}

#[test]
fn stamps_of_an_instrument_that_runs_on_utc_are_shown_in_the_sites_zone() {
    let rule = Rule {
        taken: Some(Taken {
            role: column("taken"),
            format: None,
            dates: None,
            written_in: Some("UTC".to_owned()),
            shown_in: Some("Europe/Oslo".to_owned()),
        }),
        ..table()
    };
    let text = "part,value,taken\nP1,1,2026-06-11T19:50:00\nP2,2,2026-06-11T21:50:00+02:00\n";
    assert_snapshot!(read(text, &rule), @"
    run P1 | 2026-06-11T21:50:00
      value: 1 (line 2, column `value`)
    run P2 | 2026-06-11T21:50:00
      value: 2 (line 3, column `value`)
    ");
}

#[test]
fn an_outcome_survives_the_way_through_json() {
    let export = Export {
        path: "hub/run-2.csv",
        bytes: BRIDGE_1,
    };
    let parsed = restudy_parsers::read(export, &bridge_1()).unwrap();
    let json = serde_json::to_string(&parsed).unwrap();
    assert_eq!(
        serde_json::from_str::<restudy_parsers::Parsed>(&json).unwrap(),
        parsed
    );
}
