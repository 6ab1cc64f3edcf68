//! First studies, and studies that could not be worked out.

use restudy_config::NoticeKind;
use restudy_engine::Standing;

use super::bench::{Reads, halden, reads, revised, round, rows};
use super::{good, line, mail, middling, shifted, standings, told};
use crate::notice::{Told, compose};

const MIXED: &str = "its readings come in mm and in inch";

fn mixed(name: &'static str) -> Reads {
    Reads {
        fault: Some(MIXED),
        ..good(name)
    }
}

#[test]
fn a_first_study_is_not_called_a_change() {
    let config = halden();
    let known = round(&config, 1, &[good("bore A")], None);
    let table = [
        (
            vec![shifted("bore A")],
            None,
            "1 first study lies above a limit",
            "no other characteristic was studied.",
        ),
        (
            vec![shifted("bore A"), good("bore B")],
            None,
            "1 first study lies above a limit",
            "no other first study lies above a limit.",
        ),
        (
            vec![shifted("bore A"), middling("bore B")],
            None,
            "2 first studies lie above a limit",
            "new at watch: bore B 27 %.",
        ),
        (
            vec![good("bore A"), shifted("bore B")],
            Some(&known),
            "1 first study lies above a limit",
            "no other standing changed.",
        ),
        (
            vec![shifted("bore A"), middling("bore B")],
            Some(&known),
            "1 standing changed and 1 first study lies above a limit",
            "new at watch: bore B 27 %.",
        ),
        (
            vec![shifted("bore A"), mixed("bore B")],
            Some(&known),
            "1 standing changed and 1 characteristic could not be worked out",
            "could not be worked out: bore B (its readings come in mm and in inch).",
        ),
    ];
    for (features, before, because, also) in table {
        let message = mail(&config, &round(&config, 2, &features, before));
        assert_eq!(
            line(&message, "You get this "),
            format!("You get this because {because}. The next mail comes when a standing changes.")
        );
        assert_eq!(line(&message, "Also: "), format!("Also: {also}"));
    }
}

#[test]
fn a_first_study_that_could_not_be_worked_out_reaches_a_person_once() {
    let config = halden();
    let first = round(&config, 1, &[mixed("bore A"), good("bore B")], None);
    assert_eq!(standings(&first), [Standing::NotJudged, Standing::Under]);
    let message = mail(&config, &first);
    assert_eq!(message.kind, NoticeKind::Standing);
    insta::assert_snapshot!(format!("{}\n\n{}", message.subject, message.text), @r#"
    NOT JUDGED: impeller hub / bridge-1: bore A could not be worked out

    Bore A could not be worked out. This is its first study.
    Why: its readings come in mm and in inch.
    Also: no first study lies above a limit.
    Next: set right what the reason names, in the exports or in the plan. Until then nothing says where it stands.

    Round 1, closed 3 March 2026 09:00. Measured 1 March 2026 08:00 to 08:44. 90 of 90 runs used.
    2 characteristics: act 0, watch 0, under 1, not judged 1. Not judged: bore A: its readings come in mm and in inch.
    Report (on the server that runs Restudy): /var/lib/restudy/reports/impeller_hub/round-0001.html

    You get this because 1 characteristic could not be worked out. The next mail comes when a standing changes.
    A study is evidence about a gauge, not a release of product. Decisions, and rules of your customer or of the law, are for the people responsible for them.
    Restudy at Halden Pump Works, plan impeller hub.
    "#);
    let again = round(&config, 2, &[mixed("bore A"), good("bore B")], Some(&first));
    assert_eq!(told(&config, &again), None);
}

#[test]
fn what_was_judged_and_cannot_be_worked_out_any_more_is_told_with_what_it_was() {
    let config = halden();
    let before = round(&config, 1, &[good("bore A"), good("bore B")], None);
    let now = [mixed("bore A"), mixed("bore B")];
    let message = mail(&config, &round(&config, 2, &now, Some(&before)));
    assert_eq!(
        message.subject,
        "NOT JUDGED: impeller hub / bridge-1: bore A could not be worked out (was 18 % of tolerance) (+1 more)"
    );
    let told = "Bore A could not be worked out. It was 18 % of the tolerance on 1 March 2026.\n\
                Why: its readings come in mm and in inch.\nAlso: could not be worked out: bore B";
    assert!(message.text.starts_with(told), "{}", message.text);
    assert!(
        message
            .text
            .contains("  - bore B: could not be worked out (was under, 18 %)\n")
    );
}

#[test]
fn what_could_not_be_worked_out_has_its_line_beside_something_worse() {
    let config = halden();
    let now = [shifted("bore A"), mixed("bore B")];
    let message = mail(&config, &round(&config, 1, &now, None));
    assert!(
        message
            .subject
            .starts_with("ACT: impeller hub / bridge-1: bore A takes")
    );
    assert_eq!(
        line(&message, "Also: "),
        format!("Also: could not be worked out: bore B ({MIXED}).")
    );
    assert!(
        message
            .text
            .contains("  - bore B: could not be worked out (first study)\n")
    );
}

#[test]
fn a_correction_names_what_could_not_be_worked_out() {
    let config = halden();
    let told = |worked| Told {
        subject: "ACT: something".into(),
        studies: rows(worked),
    };
    let before = round(&config, 1, &[shifted("bore A")], None);
    let now = [shifted("bore A"), mixed("bore B")];
    let joined = revised(&config, 1, 2, &now, None);
    let message = compose(&config, &config.plans[0], &joined, Some(&told(&before))).unwrap();
    assert_eq!(
        message.subject,
        "CORRECTED: impeller hub / bridge-1: bore B could not be worked out"
    );
    assert!(line(&message, "Why: ").contains(MIXED), "{}", message.text);
    let broken = revised(&config, 1, 3, &[mixed("bore A"), mixed("bore B")], None);
    let message = compose(&config, &config.plans[0], &broken, Some(&told(&joined))).unwrap();
    assert_eq!(
        message.subject,
        "CORRECTED: impeller hub / bridge-1: bore A could not be worked out, and had been told with 36 %"
    );
    let same = revised(&config, 1, 4, &[mixed("bore A"), mixed("bore B")], None);
    assert_eq!(
        compose(&config, &config.plans[0], &same, Some(&told(&broken))),
        None
    );
}

#[test]
fn a_real_drop_of_repeatability_is_called_lower() {
    let config = halden();
    let act = round(&config, 1, &[reads("bore A", 1.6, 0.0)], None);
    let message = mail(&config, &round(&config, 2, &[good("bore A")], Some(&act)));
    assert!(
        line(&message, "What changed: ").ends_with(
            "Repeatability: 18 % of tolerance (was 36 %), lower, by more than chance explains."
        ),
        "{}",
        message.text
    );
}

#[test]
fn a_held_standing_is_ranked_with_its_reason() {
    let config = halden();
    let before = round(&config, 1, &[shifted("bore A"), good("bore B")], None);
    let now = [middling("bore A"), shifted("bore B")];
    let message = mail(&config, &round(&config, 2, &now, Some(&before)));
    assert!(
        line(&message, "  - bore A").starts_with(
            "  - bore A: act as before, 27 % (was 36 %), held, as it is not below 0.85 × 30 %"
        ),
        "{}",
        message.text
    );
    assert!(
        !line(&message, "  - bore B").contains("held"),
        "{}",
        message.text
    );
}

#[test]
fn dates_have_one_form() {
    let config = halden();
    let mut worked = round(&config, 1, &[shifted("bore A")], None);
    worked.evidence.not_used = vec![
        "P04 MO of 2026-06-02 14:20: surplus: its cell is full".into(),
        "GRR/run.csv: its time stamp 2026-06-02T14:20:00 lies in the future".into(),
    ];
    let message = mail(&config, &worked);
    assert!(
        message
            .text
            .contains("\n  - P04 MO of 2 June 2026 14:20: surplus: its cell is full\n")
    );
    assert!(
        message
            .text
            .contains("its time stamp 2 June 2026 14:20 lies in the future\n")
    );
    for text in [&message.text, &message.html] {
        assert!(!text.contains("2026-"), "{text}");
    }
}
