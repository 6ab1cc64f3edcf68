//! Messages of rounds whose figures are known by exact arithmetic (see `bench`).

mod bench;
mod ledger;

use restudy_config::{Config, NoticeKind};
use restudy_engine::Standing;

use super::{Message, Told, compose};
use crate::analyse::Worked;
use bench::{Reads, config, halden, reads, revised, round, rows};

fn told(config: &Config, worked: &Worked) -> Option<Message> {
    compose(config, &config.plans[0], worked, None)
}

fn mail(config: &Config, worked: &Worked) -> Message {
    told(config, worked).unwrap_or_else(|| panic!("no message for {:?}", standings(worked)))
}

fn standings(worked: &Worked) -> Vec<Standing> {
    worked.outcomes.iter().map(crate::analyse::study::Outcome::standing).collect()
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
    insta::assert_snapshot!(format!("{}\n\n{}", message.subject, message.text), @"");
}
