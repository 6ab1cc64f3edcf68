//! What stands on top of a page.

use std::collections::BTreeSet;

use restudy_engine::{OneSided, Standing};

use super::plant::{Drawn, Plant};
use super::{plain, rendered, rendered_with};

/// The leading sentences as they are read, without the standing before them.
fn lead(page: &str) -> String {
    let page = plain(page);
    let lead = page.split("class=\"lead\">").nth(1).unwrap();
    let lead = lead.split("</p>").next().unwrap();
    lead.split("</span> ").nth(1).unwrap().to_owned()
}

fn sentences(text: &str) -> BTreeSet<usize> {
    text.split_inclusive(". ")
        .map(|s| s.split_whitespace().count())
        .collect()
}

fn without_tolerance(label: &str) -> Drawn {
    Drawn {
        nominal: None,
        lower: None,
        upper: None,
        ..Drawn::named(label)
    }
}

fn one_sided(label: &str) -> Drawn {
    Drawn {
        nominal: None,
        lower: None,
        ..Drawn::named(label)
    }
}

#[test]
fn the_worst_is_one_sentence_and_the_counts_another() {
    let page = rendered(&Plant::halden());
    let text = lead(&page);
    let (worst, counts) = text.split_once(". ").unwrap();
    assert!(
        worst.starts_with("The gauge takes ") && worst.contains(" confidence that "),
        "{text}"
    );
    assert_eq!(
        counts,
        "Of 4 characteristics, 1 is at “act”, 1 at “watch”, 1 under the limits and 1 not judged."
    );
    assert!(sentences(&text).iter().all(|words| *words <= 36), "{text}");
}

#[test]
fn counts_begin_with_their_verb() {
    let quiet = |label: &str| Drawn {
        repeat: 1e-4,
        ..Drawn::named(label)
    };
    let plant = Plant {
        drawn: vec![quiet("bore A"), quiet("bore B"), one_sided("rim")],
        ..Plant::halden()
    };
    assert!(
        lead(&rendered(&plant))
            .ends_with(". Of 3 characteristics, 2 are under the limits and 1 not judged."),
        "{}",
        lead(&rendered(&plant))
    );
}

#[test]
fn an_unjudged_round_says_why_and_what_to_do() {
    let judged = |drawn: Vec<Drawn>, fault: Option<&str>| {
        let plant = Plant {
            drawn,
            fault: fault.map(str::to_owned),
            ..Plant::halden()
        };
        lead(&rendered(&plant))
    };
    assert_eq!(
        judged(vec![one_sided("rim"), one_sided("face")], None),
        "None of the 2 characteristics could be judged: the tolerance is one-sided and no rule is named for it. \
         Next: name in the plan how a one-sided tolerance is to be judged (`one_sided`)."
    );
    assert_eq!(
        judged(
            vec![
                one_sided("rim"),
                without_tolerance("web 1"),
                without_tolerance("web 2")
            ],
            None
        ),
        "None of the 3 characteristics could be judged, 2 of them for this reason: the characteristic has no tolerance. \
         Next: give its limits in the plan, or read them from the exports."
    );
    assert_eq!(
        judged(
            vec![Drawn::named("bore A")],
            Some("its readings come in mm and in inch")
        ),
        "bore A could not be judged: its readings come in mm and in inch. \
         Next: set right what the reason names, in the exports or in the plan."
    );
    assert_eq!(
        judged(
            vec![Drawn {
                one_sided: Some(OneSided::ToProcessMean),
                ..one_sided("rim")
            }],
            None
        ),
        "rim could not be judged: the rule `to process mean` needs a stated process. \
         Next: set right what the reason names, in the exports or in the plan."
    );
}

#[test]
fn a_held_standing_says_so_in_the_ranking() {
    let plant = Plant {
        drawn: vec![Drawn::named("bore A")],
        ..Plant::halden()
    };
    // EV of cells that hold -n, 0, n is n: 6 × 1.5 / 100 = 9 %.
    let values = |levels: &[usize], slot: usize| {
        50.0 + 0.01 * (levels[0] as f64 - 4.5) + 0.0015 * (slot as f64 - 1.0)
    };
    let mut evidence = plant.evidence();
    let read: Vec<f64> = evidence
        .runs
        .iter()
        .map(|run| values(&run.levels, run.slot))
        .collect();
    evidence.features[0].values = read;
    let earlier = plant.worked_after("bore A", Standing::Watch, 0.12).earlier;
    let held = plant.work(evidence, earlier);
    assert_eq!(held.outcomes[0].standing(), Standing::Watch);
    let clause = "held, as it is not below 0.85 × 10 %;";
    assert!(plain(&rendered_with(&plant, &held)).contains(clause));
    assert!(!plain(&rendered_with(&plant, &plant.worked_with(&values))).contains(clause));
}
