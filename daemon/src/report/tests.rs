//! Pages of rounds, whole: what they say, and that no round breaks them.

mod honest;
mod lead;
pub(super) mod plant;
mod readable;
mod sound;
mod stage;

use jiff::tz::TimeZone;
use restudy_engine::{OneSided, Standing};

use self::plant::{Drawn, Plant};
use super::page;
use super::words::NBSP;
use crate::analyse::worked::Worked;

fn rendered(plant: &Plant) -> String {
    rendered_with(plant, &plant.worked())
}

fn rendered_with(plant: &Plant, worked: &Worked) -> String {
    let page = page("Halden Pump Works", &TimeZone::UTC, &plant.plan, worked);
    sound::sound(&page);
    page
}

fn plain(page: &str) -> String {
    page.replace(NBSP, " ")
}

/// The attribute `name` in percent of the first element with that class after `from`.
fn percent(page: &str, from: &str, class: &str, name: &str) -> f64 {
    let after = &page[page.find(from).unwrap()..];
    let element = &after[after.find(&format!("class=\"{class}\"")).unwrap()..];
    let element = &element[..element.find('>').unwrap()];
    let value = element.split(&format!(" {name}=\"")).nth(1).unwrap();
    value.split('%').next().unwrap().parse().unwrap()
}

#[test]
fn a_round_of_four_characteristics() {
    let plant = Plant::halden();
    let page = plain(&rendered(&plant));
    for drawn in &plant.drawn {
        assert!(
            page.contains(&format!(">{}</a>", drawn.label)),
            "{}",
            drawn.label
        );
    }
    assert!(page.contains("<title>impeller hub, round 7: act</title>"));
    assert!(page.contains("lang=\"en\""));
    assert!(page.contains("of the tolerance of bore A, above the act limit of 30 %"));
    assert!(
        page.contains("TS reads"),
        "the loading with the offset is named"
    );
    assert!(page.contains("higher than KL and MO, on 10 of 10 parts"));
    assert!(page.contains("Which loading, on which part?"));
    assert!(page.contains("face C flatness"));
    assert!(page.contains("not a release of product"));
    assert!(page.contains(&"ab".repeat(32)), "digests of the exports");
    assert_eq!(
        page,
        plain(&rendered(&plant)),
        "the same bytes for the same round"
    );
}

#[test]
fn the_ranking_runs_from_worst_to_best() {
    let plant = Plant::halden();
    let worked = plant.worked();
    let ranked = super::ranking::ranked(&worked.outcomes);
    let names: Vec<&str> = ranked.iter().map(|o| o.characteristic.as_str()).collect();
    let standings: Vec<Standing> = ranked.iter().map(|o| o.standing()).collect();
    assert_eq!(names[0], "bore A");
    assert_eq!(
        standings,
        [
            Standing::Act,
            Standing::Watch,
            Standing::NotJudged,
            Standing::Under
        ]
    );
}

#[test]
fn the_doubt_zone_is_three_gauge_sds_to_the_scale_of_the_tolerance() {
    let plant = Plant::halden();
    let worked = plant.worked();
    let page = rendered(&plant);
    let outcome = worked
        .outcomes
        .iter()
        .find(|o| o.characteristic == "bore A")
        .unwrap();
    let record = outcome.study.as_ref().unwrap();
    let section = format!("<section id=\"{}\"", super::section::anchor(outcome));
    let tolerance = percent(&page, &section, "tolerance", "width");
    for side in ["doubt hatch-down", "doubt hatch-up"] {
        let zone = percent(&page, &section, side, "width");
        let sd = record.study.figures.gauge.sd.estimate.unwrap();
        let width = record.upper.unwrap() - record.lower.unwrap();
        assert!(
            (zone / tolerance - 2.0 * 3.0 * sd / width).abs() < 1e-3,
            "{zone} of {tolerance}"
        );
    }
    let limit = percent(&page, &section, "limit", "x1");
    let (zone, width) = (
        percent(&page, &section, "doubt hatch-down", "x"),
        percent(&page, &section, "doubt hatch-down", "width"),
    );
    assert!(
        (zone + 0.5 * width - limit).abs() < 2e-3,
        "the limit is in the middle of its zone"
    );
}

#[test]
fn the_bar_ends_at_the_share_and_is_solid_up_to_its_lower_limit() {
    let plant = Plant::halden();
    let worked = plant.worked();
    let page = rendered(&plant);
    let outcome = worked
        .outcomes
        .iter()
        .find(|o| o.characteristic == "bore A")
        .unwrap();
    let share = &outcome
        .study
        .as_ref()
        .unwrap()
        .study
        .figures
        .gauge
        .share_of_tolerance;
    let section = format!("<section id=\"{}\"", super::section::anchor(outcome));
    let (bar, solid) = (
        percent(&page, &section, "share-estimate", "width"),
        percent(&page, &section, "share-sure", "width"),
    );
    assert!((solid / bar - share.at_least.unwrap() / share.estimate.unwrap()).abs() < 1e-3);
}

#[test]
fn hostile_labels_stay_text() {
    let mut plant = Plant::halden();
    plant.drawn[0].label = "<script>alert(1)</script>\" onfocus='x' &amp;".into();
    plant.readers = vec!["<b>".into(), "\"><svg>".into(), "'&".into()];
    plant.plan.name = "</title><img src=x>".into();
    plant.not_used = vec!["</ul><script>1</script>.xlsx: text".into()];
    let page = rendered(&plant);
    assert!(page.contains("&lt;script&gt;alert(1)&lt;/script&gt;&quot; onfocus='x' &amp;amp;"));
    assert!(!page.contains("<b>"));
}

#[test]
fn a_characteristic_without_tolerance_is_shown_in_its_own_unit() {
    let mut plant = Plant::halden();
    plant.drawn = vec![Drawn {
        lower: None,
        upper: None,
        nominal: None,
        ..Drawn::named("web 4")
    }];
    let page = plain(&rendered(&plant));
    assert!(page.contains(
        "web 4 could not be judged: the characteristic has no tolerance. Next: give its limits in the plan, or read \
         them from the exports."
    ));
    assert!(page.contains("Not judged: the characteristic has no tolerance."));
    assert!(page.contains("How wide is the gauge beside the parts?"));
    assert!(page.contains("as a mark about its part's mean, in µm"));
}

#[test]
fn one_sided_limits_are_drawn_by_their_rule_or_not_judged() {
    for (rule, words) in [
        (None, "Not judged: the tolerance is one-sided"),
        (
            Some(OneSided::FromZero),
            "its width by the rule “from zero”",
        ),
        (Some(OneSided::Width(0.03)), "its width by the rule “width”"),
        (
            Some(OneSided::ToStudyMean),
            "its width by the rule “to study mean”",
        ),
    ] {
        for upper in [true, false] {
            let mut plant = Plant::halden();
            let drawn = Drawn {
                one_sided: rule,
                nominal: None,
                ..Drawn::named("flatness")
            };
            plant.drawn = vec![if upper {
                Drawn {
                    lower: None,
                    ..drawn
                }
            } else {
                Drawn {
                    upper: None,
                    ..drawn
                }
            }];
            let page = rendered(&plant);
            assert!(page.contains(words), "{rule:?}");
            assert!(page.contains(if upper {
                "at most 50.05"
            } else {
                "at least 49.95"
            }));
        }
    }
}

#[test]
fn degenerate_rounds_break_nothing() {
    let base = Plant::halden;
    let one = |drawn: Drawn| Plant {
        drawn: vec![drawn],
        ..base()
    };
    let plants = [
        one(Drawn {
            part: 0.0,
            repeat: 0.0,
            reader: 0.0,
            ..Drawn::named("all equal")
        }),
        one(Drawn {
            repeat: 0.0,
            reader: 0.0,
            ..Drawn::named("parts only")
        }),
        one(Drawn {
            repeat: 5.0,
            ..Drawn::named("wild")
        }),
        one(Drawn {
            centre: 1e9,
            ..Drawn::named("far outside")
        }),
        one(Drawn {
            centre: 0.0,
            part: 1e100,
            repeat: 1e99,
            ..Drawn::named("huge")
        }),
        one(Drawn {
            lower: Some(-1.7e308),
            upper: Some(1.7e308),
            ..Drawn::named("endless tolerance")
        }),
        one(Drawn {
            lower: Some(50.0),
            upper: Some(50.0),
            ..Drawn::named("no width")
        }),
        one(Drawn {
            lower: Some(51.0),
            upper: Some(50.0),
            ..Drawn::named("limits exchanged")
        }),
        one(Drawn {
            unit: None,
            ..Drawn::named("no unit")
        }),
        Plant {
            trials: 1,
            ..base()
        },
        Plant {
            readers: vec!["KL".into()],
            ..base()
        },
        Plant {
            readers: vec!["KL".into()],
            trials: 1,
            ..base()
        },
        Plant {
            parts: 2,
            readers: vec!["KL".into(), "MO".into()],
            trials: 1,
            ..base()
        },
        Plant {
            readers: (0..20).map(|i| format!("seat {i}")).collect(),
            ..base()
        },
        Plant {
            parts: 90,
            trials: 2,
            ..base()
        },
        Plant {
            drawn: Vec::new(),
            ..base()
        },
        Plant {
            fault: Some("its readings come in mm and in inch".into()),
            ..base()
        },
    ];
    for plant in &plants {
        let page = rendered(plant);
        for drawn in &plant.drawn {
            assert!(page.contains(&drawn.label));
        }
    }
    assert!(rendered(&plants[15]).contains("Nothing was measured."));
    assert!(rendered(&plants[16]).contains("Not judged: its readings come in mm and in inch."));
    assert!(
        plain(&rendered(&plants[14])).contains("50 parts with narrower deviations are not drawn.")
    );
}

#[test]
fn many_characteristics_get_pictures_only_where_something_is_to_be_seen() {
    let mut plant = Plant::halden();
    let quiet = (1..=45).map(|i| Drawn {
        reader: 0.0,
        repeat: 1e-4,
        ..Drawn::named(&format!("hole {i}"))
    });
    plant.drawn.retain(|d| d.label == "bore A");
    plant.drawn.extend(quiet);
    let page = plain(&rendered(&plant));
    assert_eq!(
        page.matches("How much of the tolerance is gauge?</h3>")
            .count(),
        1
    );
    assert!(page.contains("With more than 40 characteristics, only those above a limit"));
    assert_eq!(page.matches("class=\"figures\"").count(), 46);
    let with_change = plant.worked_after("hole 3", Standing::Watch, 0.12);
    let changed = plain(&rendered_with(&plant, &with_change));
    assert_eq!(
        changed
            .matches("How much of the tolerance is gauge?</h3>")
            .count(),
        2
    );
    assert!(changed.contains("In round 6 it was 12 %, “watch”."));
}
