//! Messages of rounds whose figures are known by exact arithmetic (see `bench`).

mod bench;
mod first;
mod honest;
mod ledger;

use restudy_config::{Config, NoticeKind};
use restudy_engine::Standing;

use super::{Message, Told, compose};
use crate::analyse::worked::Worked;
use bench::{Reads, config, halden, reads, revised, round, rows};

fn told(config: &Config, worked: &Worked) -> Option<Message> {
    compose(config, &config.plans[0], worked, None)
}

fn mail(config: &Config, worked: &Worked) -> Message {
    told(config, worked).unwrap_or_else(|| panic!("no message for {:?}", standings(worked)))
}

fn standings(worked: &Worked) -> Vec<Standing> {
    worked
        .outcomes
        .iter()
        .map(crate::analyse::study::Outcome::standing)
        .collect()
}

/// GRR = 0.8 µm, share 4.8 / 27 = 17.8 %.
fn good(name: &'static str) -> Reads {
    reads(name, 0.8, 0.0)
}

/// GRR² = 0.64 + 2.4²/3 = 2.56 µm², share 9.6 / 27 = 35.6 %.
fn shifted(name: &'static str) -> Reads {
    reads(name, 0.8, 2.4)
}

/// GRR = 1.2 µm, share 7.2 / 27 = 26.7 %.
fn middling(name: &'static str) -> Reads {
    reads(name, 1.2, 0.0)
}

#[test]
fn nothing_is_sent_when_nothing_needs_a_person() {
    let config = halden();
    let first = round(&config, 1, &[good("bore A"), good("bore B")], None);
    assert_eq!(standings(&first), [Standing::Under; 2]);
    assert_eq!(told(&config, &first), None);
    let mut before = round(&config, 1, &[shifted("bore A")], None);
    assert!(told(&config, &before).is_some());
    for number in 2..=5 {
        let now = round(&config, number, &[shifted("bore A")], Some(&before));
        assert_eq!(told(&config, &now), None, "round {number}");
        before = now;
    }
}

#[test]
fn a_share_inside_the_margin_keeps_its_standing_and_is_not_told() {
    let config = halden();
    let act = round(&config, 1, &[shifted("bore A")], None);
    // 8.1 × 0.85 = 6.885 µm; 7.2 µm lies between.
    let held = round(&config, 2, &[middling("bore A")], Some(&act));
    assert_eq!(standings(&held), [Standing::Act]);
    assert_eq!(told(&config, &held), None);
}

#[test]
fn a_crossing_is_told_with_its_cause_and_what_it_would_be_without() {
    let config = halden();
    let before = round(&config, 1, &[good("bore A")], None);
    let worked = round(&config, 2, &[shifted("bore A")], Some(&before));
    let message = mail(&config, &worked);
    assert_eq!(message.kind, NoticeKind::Standing);
    insta::assert_snapshot!(format!("{}\n\n{}", message.subject, message.text), @r#"
    ACT: impeller hub / bridge-1: bore A takes 36 % of tolerance

    Bore A (0.027 mm wide): the gauge takes 36 % of the tolerance. Limit for act: 30 %. It was 18 % on 1 March 2026.
    How sure: confidence 75 % that the true share is above 30 %, 95 % that it is above 22 %. Three loadings give no useful upper end.
    Why: TS reads 2.4 µm above KL and MO, on all 10 parts; differences between loadings make 75 % of the gauge's variance. Without differences between loadings: 18 %. Repeatability: 18 % of tolerance (was 18 %), no more change than chance makes.
    Also: nothing else changed.
    Next: go through one part with TS, step by step, until the physical reason is found; then repeat the whole round. Measured since 1 March 2026, the last round below this limit: whether those results are affected is your call.

    Round 2, closed 2 June 2026 10:00. Measured 1 March 2026 08:00 to 08:44. 90 of 90 runs used.
    1 characteristic: act 1 (was 0), watch 0 (was 0), under 0 (was 1), not judged 0 (was 0).
    Bore A, standard deviations in µm: EV 0.800, AV 1.39, GRR 1.60, PV 6.06; ndc 5.
    Mean squares in µm² (df): part 330.0 (9), loading 57.60 (2), part × loading 0 (18), within cells 0.6400 (60).
    Report (on the server that runs Restudy): /var/lib/restudy/reports/impeller_hub/round-0002.html

    You get this because 1 standing changed. The next mail comes when a standing changes.
    A study is evidence about a gauge, not a release of product. Decisions, and rules of your customer or of the law, are for the people responsible for them.
    Restudy at Halden Pump Works, plan impeller hub.
    "#);
}

/// Every line of a text that starts so.
fn line<'a>(message: &'a Message, start: &str) -> &'a str {
    message
        .text
        .lines()
        .find(|l| l.starts_with(start))
        .unwrap_or_else(|| panic!("no `{start}` in\n{}", message.text))
}

#[test]
fn a_loading_that_reads_low_is_named_so() {
    let config = halden();
    let worked = round(&config, 1, &[reads("bore A", 0.8, -2.4)], None);
    assert!(
        line(&mail(&config, &worked), "Why: ")
            .starts_with("Why: TS reads 2.4 µm below KL and MO, on all 10 parts")
    );
}

#[test]
fn loadings_that_all_differ_are_told_from_lowest_to_highest() {
    let config = halden();
    let spread = Reads {
        by: [0.0, 0.0014, 0.0028],
        ..good("bore A")
    };
    let message = mail(&config, &round(&config, 1, &[spread], None));
    assert!(
        line(&message, "Why: ")
            .starts_with("Why: Loadings differ by 2.8 µm, from KL (lowest) to TS (highest)"),
        "{}",
        message.text
    );
}

#[test]
fn an_interaction_is_told_by_its_cell() {
    let config = halden();
    let crossed = Reads {
        crossed: [0.0, 0.0, 0.0024],
        ..good("bore A")
    };
    let message = mail(&config, &round(&config, 1, &[crossed], None));
    let why = line(&message, "Why: ");
    assert!(
        why.starts_with(
            "Why: Differences between loadings change from part to part, most for part P"
        ),
        "{why}"
    );
    assert!(why.contains("with TS (1.6 µm "), "{why}");
}

#[test]
fn repeatability_is_told_against_the_round_before() {
    let config = halden();
    let before = round(&config, 1, &[reads("bore A", 0.8, 0.0)], None);
    let worked = round(&config, 2, &[reads("bore A", 1.6, 0.0)], Some(&before));
    let message = mail(&config, &worked);
    let why = line(&message, "Why: ");
    assert!(
        why.starts_with("Why: Repeatability makes 100 % of the gauge's variance; widest: part P"),
        "{why}"
    );
    assert!(why.contains("3.2 µm over 3 runs"), "{why}");
    assert!(
        line(&message, "How sure: ").ends_with(
            "The estimate lies above its upper limit: components below zero count as zero in it."
        ),
        "{}",
        message.text
    );
    assert!(
        why.contains(
            "Repeatability: 36 % of tolerance (was 18 %), higher, by more than chance explains"
        ),
        "{why}"
    );
}

#[test]
fn coming_back_is_told_once_with_what_shrank() {
    let config = halden();
    let act = round(&config, 1, &[shifted("bore A"), shifted("bore B")], None);
    let worked = round(
        &config,
        2,
        &[good("bore A"), middling("bore B")],
        Some(&act),
    );
    let message = mail(&config, &worked);
    assert_eq!(
        message.subject,
        "BACK: impeller hub / bridge-1: bore A at 18 % of tolerance (was 36 %)"
    );
    assert!(message.text.starts_with("Bore A has left \"act\": 18 % (was 36 %), below the 25.5 % needed to come back (0.85 × 30 %). Now"), "{}", message.text);
    assert!(line(&message, "How sure: ").contains("that the true share is below 30 %"));
    // The loadings' sd was √(2.4²/3) = 1.39 µm.
    assert!(
        line(&message, "What changed: ")
            .contains("Differences between loadings: sd 0 µm, was 1.4 µm"),
        "{}",
        message.text
    );
    assert!(
        line(&message, "Also: ")
            .contains("Bore B is at 27 %: under 30 %, not yet under 25.5 %, so it stays at act"),
        "{}",
        message.text
    );
    let after = round(
        &config,
        3,
        &[good("bore A"), middling("bore B")],
        Some(&worked),
    );
    assert_eq!(told(&config, &after), None);
}

#[test]
fn a_one_sided_limit_without_a_rule_is_told_when_it_was_judged_before() {
    let config = halden();
    let one_sided = Reads {
        lower: None,
        ..good("bore A")
    };
    let first = round(&config, 1, std::slice::from_ref(&one_sided), None);
    assert_eq!(standings(&first), [Standing::NotJudged]);
    assert_eq!(told(&config, &first), None);
    let judged = round(&config, 1, &[good("bore A")], None);
    let message = mail(&config, &round(&config, 2, &[one_sided], Some(&judged)));
    assert_eq!(
        message.subject,
        "NOT JUDGED: impeller hub / bridge-1: bore A (was 18 % of tolerance)"
    );
    assert!(
        line(&message, "Why: ").contains("one-sided"),
        "{}",
        message.text
    );
}

#[test]
fn one_message_ranks_all_and_names_five() {
    let special = "[[plan.characteristic]]\nname = \"web 4\"\nspecial = true\n";
    let config = config("", special);
    let names = [
        "bore A", "bore B", "bore C", "height", "slot", "web 4", "rim", "face",
    ];
    let before = round(&config, 1, &names.map(good), None);
    let mut now = names.map(shifted);
    now[0] = reads("bore A", 0.8, 3.6);
    now[1] = middling("bore B");
    now[2] = good("bore C");
    let worked = round(&config, 2, &now, Some(&before));
    let message = mail(&config, &worked);
    assert!(
        message
            .subject
            .starts_with("ACT: impeller hub / bridge-1: web 4 takes 36 % of tolerance (+5 more)"),
        "{}",
        message.subject
    );
    let ranked: Vec<&str> = message
        .text
        .lines()
        .filter_map(|l| l.strip_prefix("  - "))
        .collect();
    assert_eq!(ranked.len(), 6, "{}", message.text);
    assert!(
        ranked[0].starts_with("web 4: act (was under), 36 % (was 18 %), at least ")
            && ranked[0].ends_with("; special"),
        "{}",
        ranked[0]
    );
    assert!(ranked[1].starts_with("bore A: act (was under)"));
    assert_eq!(ranked[5], "and 2 more, in the report");
    let also = line(&message, "Also: ");
    assert!(
        also.contains("TS stands out on all 5 of these too"),
        "{also}"
    );
    assert!(also.contains("New at watch: bore B 27 %."), "{also}");
    assert!(
        line(&message, "8 characteristics: ")
            .contains("act 6 (was 0), watch 1 (was 0), under 1 (was 8), not judged 0 (was 0)"),
        "{}",
        message.text
    );
}

#[test]
fn a_correction_names_what_is_gone() {
    let config = halden();
    let worked = revised(&config, 1, 2, &[shifted("bore A")], None);
    let before = revised(&config, 1, 1, &[shifted("bore A"), shifted("bore B")], None);
    let said = Told {
        subject: "ACT: something".into(),
        studies: rows(&before),
    };
    let message = compose(&config, &config.plans[0], &worked, Some(&said)).unwrap();
    assert_eq!(message.kind, NoticeKind::Corrected);
    assert_eq!(
        message.subject,
        "CORRECTED: impeller hub / bridge-1: bore B no longer in the round"
    );
    let nothing = Told {
        subject: "ACT: something".into(),
        studies: rows(&worked),
    };
    assert_eq!(
        compose(&config, &config.plans[0], &worked, Some(&nothing)),
        None
    );
}

#[test]
fn readings_that_tell_nothing_make_no_nonsense() {
    let config = halden();
    let flat = Reads {
        repeat: 0.0,
        upper: Some(50.0001),
        ..good("bore A")
    };
    let wide = Reads {
        repeat: 1.0,
        ..good("bore B")
    };
    let before = round(&config, 1, &[good("bore A"), good("bore B")], None);
    let message = mail(&config, &round(&config, 2, &[flat, wide], Some(&before)));
    for text in [&message.text, &message.html, &message.subject] {
        assert!(
            !text.contains("NaN") && !text.contains("inf ") && !text.contains("None"),
            "{text}"
        );
    }
}
