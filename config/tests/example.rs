//! The example configuration reads to exactly what it says.

mod common;

use std::collections::BTreeMap;
use std::ffi::OsStr;
use std::path::PathBuf;
use std::time::Duration;

use restudy_config::{
    Appraisers, Characteristic, Config, FactorLevels, Label, NoticeKind, Password, PlanFactor,
    Route, Tls,
};
use restudy_engine::{Interaction, Judge, Limits, OneSided, Process};
use restudy_parsers::{
    Bounds, Cell, Count, Find, Form, Header, Layout, Limit, Role, Rule, Sheet, Taken, Trial, Value,
};

use common::{HALDEN, read_at_halden, shown};

fn example() -> Config {
    let (config, warnings) =
        read_at_halden(HALDEN).unwrap_or_else(|faults| panic!("{}", shown(&faults)));
    assert_eq!(shown(&warnings), "");
    config
}

fn column(heading: &str) -> Role {
    Role::plain(Cell::Column(heading.to_owned()))
}

fn at(row: u32, column: u32) -> Role {
    Role::plain(Cell::At { row, column })
}

fn xml(path: &str) -> Role {
    Role::plain(Cell::Xml(path.to_owned()))
}

fn label(name: &str, spellings: &[&str]) -> Label {
    Label {
        name: name.to_owned(),
        spellings: spellings.iter().map(|&text| text.to_owned()).collect(),
    }
}

const HOUR: u64 = 3600;

#[test]
fn site_and_state() {
    let config = example();
    assert_eq!(config.site.name, "Halden Pump Works");
    assert_eq!(config.site.zone.iana_name(), Some("Europe/Oslo"));
    assert_eq!(config.state, PathBuf::from("/var/lib/restudy"));
}

#[test]
fn what_is_watched() {
    let config = example();
    let [bridge, form] = config.instruments.as_slice() else {
        panic!("two instruments")
    };
    assert_eq!(bridge.name, "bridge-1");
    assert_eq!(bridge.folders, [PathBuf::from("/srv/exports/bridge-1")]);
    assert_eq!(bridge.files.written, ["*.xlsx", "*.csv"]);
    assert_eq!(
        (bridge.settle, bridge.rescan),
        (Duration::from_secs(3), Duration::from_secs(30))
    );
    assert_eq!(form.name, "form-2");
    assert_eq!(
        (form.settle, form.rescan),
        (Duration::from_secs(5), Duration::from_secs(30))
    );
    for (name, is_export) in [
        ("GRR 1.xlsx", true),
        ("A.CSV", true),
        ("a.xml", false),
        ("a.csv.tmp", false),
    ] {
        assert_eq!(bridge.files.matches(OsStr::new(name)), is_export, "{name}");
    }
}

#[test]
fn the_rule_of_a_table() {
    let spellings = [("K. Lund", "KL"), ("Moe", "MO")];
    let expected = Rule {
        form: Form::Table {
            sheet: Sheet::Named("Results".to_owned()),
            header: Header::Find("Serial no.".to_owned()),
            delimiter: Some(';'),
        },
        part: column("Serial no."),
        appraiser: Some(Role {
            spellings: spellings
                .into_iter()
                .map(|(text, label)| (text.to_owned(), label.to_owned()))
                .collect(),
            ..at(1, 1)
        }),
        trial: Some(Trial::Stated(Role::plain(Cell::Path(
            r"run-(\d+)".to_owned(),
        )))),
        taken: Some(Taken {
            role: at(3, 1),
            format: Some("%d.%m.%Y %H:%M".to_owned()),
            dates: None,
            written_in: None,
            shown_in: Some("Europe/Oslo".to_owned()),
        }),
        round: None,
        characteristic: Some(column("Feature")),
        value: Value {
            role: column("Actual"),
            unit: Some(Role::plain(Cell::Constant("mm".to_owned()))),
        },
        nominal: Some(column("Nominal")),
        lower: Some(Limit {
            role: column("Lower tol."),
            from_nominal: true,
            unsigned: false,
        }),
        upper: Some(Limit {
            role: column("Upper tol."),
            from_nominal: true,
            unsigned: false,
        }),
        factors: BTreeMap::from([("fixture".to_owned(), at(6, 1))]),
        same: BTreeMap::from([
            ("program".to_owned(), at(4, 1)),
            (
                "stylus".to_owned(),
                Role {
                    find: Some("^[^,]+".to_owned()),
                    ..at(5, 1)
                },
            ),
        ]),
        end: Some(Find {
            find: "End of report".to_owned(),
        }),
        count: None,
        layout: Layout::default(),
        decimal: ',',
        thousands: None,
        line_breaks: false,
        no_value: vec!["---".to_owned(), "9999".to_owned()],
        encoding: Some("windows-1252".to_owned()),
        bounds: Bounds::default(),
    };
    assert_eq!(example().instruments[0].rule, expected);
}

#[test]
fn the_rule_of_an_xml_export() {
    let expected = Rule {
        form: Form::Xml {
            each: "/export/run/feature".to_owned(),
        },
        part: xml("../@part"),
        appraiser: None,
        trial: Some(Trial::Counted(Count::Taken)),
        taken: Some(Taken {
            role: xml("../@time"),
            format: None,
            dates: None,
            written_in: Some("UTC".to_owned()),
            shown_in: Some("Europe/Oslo".to_owned()),
        }),
        round: None,
        characteristic: Some(xml("@name")),
        value: Value {
            role: xml("value"),
            unit: Some(xml("value/@unit")),
        },
        nominal: None,
        lower: None,
        upper: Some(Limit {
            role: xml("limits/@upper"),
            from_nominal: false,
            unsigned: false,
        }),
        factors: BTreeMap::new(),
        same: BTreeMap::new(),
        end: None,
        count: None,
        layout: Layout::default(),
        decimal: '.',
        thousands: None,
        line_breaks: false,
        no_value: Vec::new(),
        encoding: None,
        bounds: Bounds::default(),
    };
    assert_eq!(example().instruments[1].rule, expected);
}

#[test]
fn the_parsers_take_both_rules() {
    for instrument in example().instruments {
        let reader = restudy_parsers::Reader::new(&instrument.rule);
        assert_eq!(reader.err(), None, "{}", instrument.name);
    }
}

#[test]
fn a_rule_has_another_mark_when_it_changes_and_only_then() {
    let mark = |text: &str| {
        let (config, _) =
            read_at_halden(text).unwrap_or_else(|faults| panic!("{}", shown(&faults)));
        config.instruments[0].rule_mark.clone()
    };
    let settled = HALDEN
        .replace("settle  = \"3s\"", "settle  = \"4s\"")
        .replace("watch      = 0.10", "watch      = 0.12");
    assert_eq!(mark(HALDEN), mark(&settled));
    for (from, to) in [
        ("{ column = \"Feature\" }", "{ column = \"Features\" }"),
        ("decimal        = \",\"", "decimal        = \".\""),
        ("\"9999\"", "\"99999\""),
        ("\"K. Lund\"", "\"Kari Lund\""),
        ("'^[^,]+'", "'^[^;]+'"),
        ("zone = \"Europe/Oslo\"", "zone = \"Europe/Vienna\""),
    ] {
        assert_ne!(mark(HALDEN), mark(&HALDEN.replace(from, to)), "{from}");
    }
}

#[test]
fn the_plan_with_a_list() {
    let config = example();
    let plan = &config.plans[0];
    assert_eq!(plan.name, "impeller hub");
    assert_eq!(plan.instruments, ["bridge-1"]);
    assert_eq!(plan.only.as_ref().map(|regex| regex.as_str()), Some("GRR"));
    assert_eq!(plan.parts, FactorLevels::Count(10));
    let levels = FactorLevels::Named(vec![
        label("KL", &[]),
        label("MO", &[]),
        label("TS", &["Tor S.", "T. Sund"]),
    ]);
    assert_eq!(
        plan.appraisers,
        Some(Appraisers {
            levels,
            word: "loading".to_owned()
        })
    );
    assert_eq!(plan.trials, 3);
    assert_eq!(
        plan.factors,
        [PlanFactor {
            name: "fixture".to_owned(),
            levels: FactorLevels::Count(2)
        }]
    );
    assert_eq!(plan.interaction, Interaction::Keep);
    assert_eq!((plan.spread_sds, plan.confidence), (6.0, 0.95));
    assert_eq!(plan.finish_within, Some(Duration::from_secs(5 * 24 * HOUR)));
    assert_eq!(plan.repeat_every, Some(Duration::from_secs(90 * 24 * HOUR)));
    assert_eq!(
        plan.limits,
        Limits {
            watch: 0.10,
            act: 0.30,
            back_below: 0.85
        }
    );
    assert_eq!(plan.judge, Judge::Estimate);
    assert_eq!(plan.process, None);
    assert!(plan.whole_list);
}

#[test]
fn the_list_with_the_table_over_it() {
    let plan_limits = Limits {
        watch: 0.10,
        act: 0.30,
        back_below: 0.85,
    };
    let plain = Characteristic {
        name: String::new(),
        nominal: None,
        lower: None,
        upper: None,
        unit: Some("mm".to_owned()),
        one_sided: None,
        special: false,
        limits: plan_limits,
        process: None,
    };
    let expected = [
        Characteristic {
            name: "bore A".to_owned(),
            nominal: Some(50.0),
            lower: Some(49.987),
            upper: Some(50.014),
            special: true,
            ..plain.clone()
        },
        Characteristic {
            name: "bore B roundness".to_owned(),
            upper: Some(0.012),
            one_sided: Some(OneSided::FromZero),
            ..plain.clone()
        },
        Characteristic {
            name: "height B".to_owned(),
            nominal: Some(32.5),
            lower: Some(32.45),
            upper: Some(32.55),
            ..plain.clone()
        },
        Characteristic {
            name: "face C flatness".to_owned(),
            upper: Some(0.08),
            one_sided: Some(OneSided::FromZero),
            special: true,
            limits: Limits {
                act: 0.20,
                ..plan_limits
            },
            ..plain.clone()
        },
        Characteristic {
            name: "hole 3 position".to_owned(),
            upper: Some(0.2),
            one_sided: Some(OneSided::Width(0.2)),
            ..plain
        },
    ];
    assert_eq!(example().plans[0].characteristics, expected);
}

#[test]
fn the_plan_without_appraisers() {
    let config = example();
    let plan = &config.plans[1];
    assert_eq!(
        plan.parts,
        FactorLevels::Named(
            ["C1", "C2", "C3", "C4", "C5"]
                .map(|name| label(name, &[]))
                .to_vec()
        )
    );
    assert_eq!((plan.appraisers.as_ref(), plan.trials), (None, 4));
    assert_eq!(plan.interaction, Interaction::PoolAbove(0.25));
    assert_eq!((plan.spread_sds, plan.confidence), (6.0, 0.95));
    assert_eq!((plan.finish_within, plan.repeat_every), (None, None));
    assert_eq!(plan.judge, Judge::Chance(0.9));
    assert!(!plan.whole_list);
    let [seat] = plan.characteristics.as_slice() else {
        panic!("one characteristic")
    };
    assert_eq!(seat.one_sided, Some(OneSided::ToProcessMean));
    assert_eq!(
        seat.process,
        Some(Process::Stated {
            mean: 0.004,
            sd: 0.001
        })
    );
    assert_eq!(
        seat.limits,
        Limits {
            watch: 0.20,
            act: 0.30,
            back_below: 0.85
        }
    );
}

#[test]
fn mail_and_routes() {
    let config = example();
    let mail = config.mail.expect("a mail server");
    assert_eq!(
        (mail.server.as_str(), mail.port, mail.tls),
        ("mail.halden.example", 587, Tls::StartTls)
    );
    assert_eq!(
        mail.login,
        Some((
            "restudy".to_owned(),
            Password::File(PathBuf::from("/etc/restudy/mail-password"))
        ))
    );
    assert_eq!(mail.from, "Restudy <restudy@halden.example>");
    let expected = [
        Route {
            kinds: vec![NoticeKind::Standing, NoticeKind::Corrected],
            plans: vec!["impeller hub".to_owned()],
            to: vec![
                "quality@halden.example".to_owned(),
                "room@halden.example".to_owned(),
            ],
        },
        Route {
            kinds: Vec::new(),
            plans: Vec::new(),
            to: vec!["records@halden.example".to_owned()],
        },
    ];
    assert_eq!(config.routes, expected);
}

#[test]
fn what_its_comments_offer_is_read_when_it_is_taken_in() {
    let taken_in = HALDEN
        .replace("# appraiser    = ", "appraiser = ")
        .replace("# port        = ", "port = ")
        .replace(
            "parts       = [\"C1\"",
            "appraisers = [\"KL\", \"MO\"]\nparts = [\"C1\"",
        );
    let (config, warnings) =
        read_at_halden(&taken_in).unwrap_or_else(|faults| panic!("{}", shown(&faults)));
    assert_eq!(shown(&warnings), "");
    assert_eq!(
        config.instruments[1].rule.appraiser,
        Some(xml("/export/@operator"))
    );
    let port = |tls: &str, text: &str| {
        let text = text.replace("= \"starttls\"  ", &format!("= \"{tls}\"  "));
        let (config, _) =
            read_at_halden(&text).unwrap_or_else(|faults| panic!("{}", shown(&faults)));
        config.mail.map(|mail| mail.port)
    };
    assert_eq!(port("starttls", &taken_in), Some(587));
    assert_eq!(port("starttls", HALDEN), Some(587));
    assert_eq!(port("implicit", HALDEN), Some(465));
}
