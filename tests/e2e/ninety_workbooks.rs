//! The main job: ninety workbooks of a published study arrive in any order and in every way, and once more with
//! the service killed in the middle.

use std::collections::BTreeSet;
use std::thread;
use std::time::Duration;

use mail_parser::{Message, MessageParser};
use serde_json::{Value, json};

use crate::export::{Feature, Run, time_of};
use crate::ledger::Content;
use crate::mailbox::{Mailbox, Received};
use crate::plant::{Design, Plant, RECIPIENTS};
use crate::program::{Service, record, records};
use crate::published::{self, TERMS, assert_agrees, line};
use crate::record_keys;

const DESIGN: Design<'_> = Design {
    parts: 10,
    appraisers: &["A", "B", "C"],
    trials: 3,
};
/// Digits in which recorded figures agree with the published ones.
const DIGITS: i32 = 10;
/// Pause between two exports.
const BETWEEN_EXPORTS: Duration = Duration::from_millis(20);

/// The characteristics: where their readings are published, and their tolerance.
const FEATURES: [(&str, &str, f64, f64); 4] = [
    ("bore A", "a_aiag_10x3x3", 0.0, 4.0),
    ("height B", "g_aiag_within_times_1_5", 0.0, 4.0),
    ("face C", "a_times_1e-3_plus_1000", 1000.0, 0.003),
    ("slot width", "a_aiag_10x3x3", 0.0, 20.0),
];

/// One export a run, in the order in which they are measured.
fn runs() -> Vec<Run> {
    let columns = FEATURES.map(|(_, published, ..)| published::readings(published));
    let order = |r: &published::Reading| (r.trial, r.appraiser.clone(), r.part);
    let mut indices: Vec<usize> = (0..columns[0].len()).collect();
    indices.sort_by_key(|&i| order(&columns[0][i]));
    let runs = indices.iter().enumerate().map(|(n, &i)| {
        let first = &columns[0][i];
        let features =
            FEATURES
                .iter()
                .zip(&columns)
                .map(|(&(name, _, nominal, deviation), column)| {
                    assert_eq!(
                        order(&column[i]),
                        order(first),
                        "the published studies share their design"
                    );
                    Feature {
                        name,
                        nominal,
                        deviation,
                        value: column[i].value,
                    }
                });
        Run {
            part: format!("HP-{:02}", first.part),
            appraiser: first.appraiser.clone(),
            trial: first.trial,
            taken: time_of(3, n),
            program: "hub rev 12".to_owned(),
            features: features.collect(),
        }
    });
    runs.collect()
}

/// The runs in a random order that is always the same (Fisher and Yates, with Knuth's MMIX generator).
fn shuffled(mut runs: Vec<Run>) -> Vec<Run> {
    let mut state = 20_260_301_u64;
    for last in (1..runs.len()).rev() {
        state = state
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        let other = usize::try_from(state >> 33).expect("31 bits") % (last + 1);
        runs.swap(last, other);
    }
    runs
}

/// Has the exports arrive: a sixth written slowly in pieces, a third renamed into place, the rest at once.
fn arrive(plant: &Plant, runs: &[Run]) {
    thread::scope(|writers| {
        for (n, run) in runs.iter().enumerate() {
            let (name, bytes) = (format!("{}.xlsx", run.name()), run.workbook());
            match n % 6 {
                0 => drop(writers.spawn(move || plant.put_slowly(&name, &bytes))),
                1 | 2 => plant.put_by_rename(&name, &bytes),
                _ => plant.put(&name, &bytes),
            }
            thread::sleep(BETWEEN_EXPORTS);
        }
    });
}

#[test]
fn ninety_workbooks() {
    let Some(mailbox) = Mailbox::open("ninety_workbooks") else {
        return;
    };
    let plant = Plant::new(DESIGN, Some(mailbox.port));
    let runs = shuffled(runs());
    arrive(&plant, &runs[..2]);
    let mut service = Service::start(&plant);
    arrive(&plant, &runs[2..]);
    let status = service.wait_for_round(1, 1);

    assert_one_complete_round(&status);
    assert_published_values(&plant);
    let messages = mailbox.messages();
    assert_told_once(&messages);
    service.stop();
    assert_eq!(mailbox.messages(), messages);
}

#[test]
fn killed_in_the_middle() {
    let Some(clean_mailbox) = Mailbox::open("killed_in_the_middle") else {
        return;
    };
    let clean = Plant::new(DESIGN, Some(clean_mailbox.port));
    let runs = shuffled(runs());
    arrive(&clean, &runs);
    let mut service = Service::start(&clean);
    service.wait_for_round(1, 1);
    service.stop();

    let mailbox = Mailbox::open_on("killed_in_the_middle", 0, 1).expect("a mail server again");
    let killed = Plant::new(DESIGN, Some(mailbox.port));
    let mut service = Service::start(&killed);
    arrive(&killed, &runs[..50]);
    service.wait_until("some exports recorded", |s| {
        s["readings"]["used"].as_i64() >= Some(60)
    });
    service.kill();
    arrive(&killed, &runs[50..70]);
    let mut service = Service::start(&killed);
    arrive(&killed, &runs[70..]);
    mailbox.wait_for(1);
    let status = service.wait_until("a complete round", |s| {
        s["rounds"][0]["state"] == "complete"
    });
    assert_eq!(
        status["owed"].as_array().map(Vec::len),
        Some(RECIPIENTS.len())
    );
    service.kill();
    let mut service = Service::start(&killed);
    let status = service.wait_for_round(1, 1);
    service.stop();

    assert_one_complete_round(&status);
    Content::of(&killed).assert_same_as(&Content::of(&clean));
    let messages = mailbox.messages();
    assert_eq!(
        messages.len(),
        RECIPIENTS.len() + 1,
        "the unanswered message is sent again"
    );
    assert_told_once(&distinct(&messages));
    let ids = |messages: &[Received]| messages.iter().map(message_id).collect::<BTreeSet<_>>();
    assert_eq!(ids(&messages), ids(&clean_mailbox.messages()));
}

/// The messages without those that are another's very bytes.
fn distinct(messages: &[Received]) -> Vec<Received> {
    let mut distinct: Vec<Received> = Vec::new();
    for message in messages {
        if !distinct.contains(message) {
            distinct.push(message.clone());
        }
    }
    distinct
}

fn assert_one_complete_round(status: &Value) {
    let rounds = status["rounds"].as_array().expect("rounds");
    assert_eq!(rounds.len(), 1, "{rounds:#?}");
    let round = &rounds[0];
    assert_eq!(round["state"], "complete");
    assert_eq!(
        (&round["runs_used"], &round["runs_planned"]),
        (&json!(90), &json!(90))
    );
    assert_eq!(round["missing"], json!([]));
    assert_eq!(status["refused"], json!([]));
    assert_eq!(status["set_aside"], json!([]));
    assert_eq!(status["readings"]["total"], 360);
    assert_eq!(status["readings"]["used"], 360);
}

fn assert_published_values(plant: &Plant) {
    let records = records(plant);
    assert_eq!(records.len(), FEATURES.len());
    for record in &records {
        record_keys::assert_of_a_plan(record);
        assert_eq!(record["source"].as_array().map(Vec::len), Some(90));
    }
    for (name, data, ..) in FEATURES {
        let record = record(plant, name);
        let values = published::values(data);
        for (term, published) in TERMS {
            let line = line(&record, term);
            let what = format!("{name}, {term}");
            let exact = &values["exact_ss"]["of_f64_rounded_values"][published]["value"];
            if !exact.is_null() {
                assert_agrees(&line["ss"], exact, DIGITS, &what);
                continue;
            }
            assert_agrees(
                &line["ss"],
                &values["anova"][published]["ss"],
                DIGITS,
                &what,
            );
            let mean_square = &values["with_interaction"]["mean_squares"][published]["ms"];
            assert_agrees(&line["ms"], mean_square, DIGITS, &what);
        }
    }
    for (name, data) in [
        ("bore A", "a_aiag_10x3x3"),
        ("height B", "g_aiag_within_times_1_5"),
    ] {
        let share = &record(plant, name)["figures"]["gauge"]["share_of_tolerance"];
        let values = published::values(data);
        let published =
            &values["with_interaction"]["estimates"]["share_of_tolerance"]["6"]["gauge"];
        assert_agrees(&share["estimate"], published, DIGITS, name);
    }
    let standing = |name| record(plant, name)["standing"]["now"].clone();
    let standings = FEATURES.map(|(name, ..)| standing(name));
    assert_eq!(standings, ["watch", "watch", "act", "under"]);
}

/// Each recipient got one message of its own, which names the worst characteristic in its subject.
fn assert_told_once(messages: &[Received]) {
    let recipients: BTreeSet<&str> = messages.iter().map(|m| m.recipient.as_str()).collect();
    assert_eq!(recipients, BTreeSet::from(RECIPIENTS));
    assert_eq!(messages.len(), RECIPIENTS.len());
    let ids: BTreeSet<String> = messages.iter().map(message_id).collect();
    assert_eq!(ids.len(), RECIPIENTS.len(), "{ids:?}");
    for received in messages {
        assert_eq!(received.sender, "restudy@halden.example");
        let message = parsed(received);
        let subject = message.subject().expect("a subject");
        assert!(
            subject.starts_with("ACT") && subject.contains("face C"),
            "{subject}"
        );
        let to = message
            .to()
            .and_then(|to| to.first())
            .and_then(|to| to.address());
        assert_eq!(to, Some(received.recipient.as_str()));
        let (text, html) = (message.body_text(0), message.body_html(0));
        assert_eq!(
            (message.text_body_count(), message.html_body_count()),
            (1, 1)
        );
        for part in [text.expect("a text part"), html.expect("an HTML part")] {
            for (name, ..) in &FEATURES[..3] {
                assert!(part.contains(name), "{name} is not in:\n{part}");
            }
        }
    }
}

fn parsed(received: &Received) -> Message<'_> {
    MessageParser::default()
        .parse(&received.bytes)
        .expect("a message")
}

fn message_id(received: &Received) -> String {
    parsed(received)
        .message_id()
        .expect("a Message-ID")
        .to_owned()
}
