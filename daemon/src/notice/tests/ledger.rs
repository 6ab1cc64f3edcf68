//! Rows owed, threads and bytes, on a real ledger; mails are read back with an independent parser.

use mail_parser::{Message as Parsed, MessageParser};
use restudy_config::{Config, NoticeKind};
use tempfile::TempDir;

use super::super::{draft, message_id, owed};
use super::bench::{Reads, config, halden, reads, revised, round, rows};
use super::{good, shifted};
use crate::analyse::worked::Worked;
use crate::ledger::{Ledger, NewNotice};
use crate::now::Now;

struct Bench {
    _folder: TempDir,
    ledger: Ledger,
    now: Now,
}

impl Bench {
    fn new() -> Self {
        let folder = tempfile::tempdir().unwrap();
        let mut ledger = Ledger::open(folder.path()).unwrap();
        for number in 1..=5 {
            let id = ledger
                .write(|w| w.add_round("impeller hub", number, None))
                .unwrap();
            assert_eq!(id, number);
        }
        Self {
            _folder: folder,
            ledger,
            now: Now {
                utc: 1_800_000_000_000,
                uptime: std::time::Duration::ZERO,
            },
        }
    }

    /// Records a round's studies and owes its notices, as the analysis does.
    fn record(&mut self, config: &Config, worked: &Worked) -> Vec<NewNotice> {
        let now = self.now;
        self.ledger
            .write(|w| {
                for row in rows(worked) {
                    w.put_study(&row)?;
                }
                let notices = owed(w.read(), config, &config.plans[0], worked, now)?;
                for notice in &notices {
                    w.owe(notice, now.utc)?;
                }
                Ok::<_, crate::ledger::LedgerError>(notices)
            })
            .unwrap()
    }
}

fn parsed(bytes: &[u8]) -> Parsed<'_> {
    MessageParser::default().parse(bytes).unwrap()
}

fn mail<'a>(notices: &'a [NewNotice], to: &str) -> &'a NewNotice {
    notices.iter().find(|n| n.recipient == to).unwrap()
}

#[test]
fn one_row_for_the_log_and_one_a_recipient_whatever_the_number_of_routes() {
    let config = halden();
    let notices = Bench::new().record(&config, &round(&config, 1, &[shifted("bore A")], None));
    let rows: Vec<(&str, &str)> = notices
        .iter()
        .map(|n| (n.channel, n.recipient.as_str()))
        .collect();
    assert_eq!(
        rows,
        [
            ("log", ""),
            ("mail", "quality@halden.example"),
            ("mail", "room@halden.example"),
            ("mail", "records@halden.example"),
        ]
    );
    assert!(notices.iter().all(|n| {
        n.kind == "standing"
            && n.subject
                .starts_with("ACT: impeller hub / bridge-1: bore A")
    }));
}

#[test]
fn nothing_is_owed_when_there_is_nothing_to_tell_and_only_the_log_without_mail() {
    let config_with = halden();
    let quiet = round(&config_with, 1, &[good("bore A")], None);
    assert!(Bench::new().record(&config_with, &quiet).is_empty());
    let without = config("", "");
    let notices = Bench::new().record(&without, &round(&without, 1, &[shifted("bore A")], None));
    assert_eq!(
        notices.iter().map(|n| n.channel).collect::<Vec<_>>(),
        ["log"]
    );
}

#[test]
fn a_mail_is_sound_and_always_the_same() {
    let config = halden();
    let hostile = Reads {
        name: "bore Ø <b>\r\nBcc: x@y.example",
        ..shifted("")
    };
    let worked = round(&config, 1, &[hostile], None);
    let notices = Bench::new().record(&config, &worked);
    let notice = mail(&notices, "quality@halden.example");
    assert!(notice.bytes.is_ascii() && notice.bytes.len() < 1_000_000);
    assert!(
        notice
            .bytes
            .split(|b| *b == b'\n')
            .all(|line| line.len() <= 100),
        "long lines"
    );
    let mail = parsed(&notice.bytes);
    assert_eq!(mail.subject(), Some(notice.subject.as_str()));
    assert!(notice.subject.contains("bore Ø <b> Bcc: x@y.example"));
    assert_eq!(
        mail.from()
            .and_then(|a| a.first())
            .and_then(|a| a.address()),
        Some("restudy@halden.example")
    );
    assert_eq!(
        mail.to().and_then(|a| a.first()).and_then(|a| a.address()),
        Some("quality@halden.example")
    );
    assert!(mail.bcc().is_none());
    assert_eq!(
        mail.message_id().map(|id| format!("<{id}>")),
        Some(notice.key.clone())
    );
    assert_eq!(
        mail.header_raw("Auto-Submitted").map(str::trim),
        Some("auto-generated")
    );
    assert!(mail.in_reply_to().is_empty());
    // The round closed on 3 March 2026 at 09:00 in Oslo, an hour ahead of UTC.
    assert_eq!(
        mail.date()
            .map(mail_parser::DateTime::to_rfc3339)
            .as_deref(),
        Some("2026-03-03T08:00:00Z")
    );
    let text = mail.body_text(0).unwrap().replace("\r\n", "\n");
    let html = mail.body_html(0).unwrap();
    assert_eq!(mail.parts.len(), 3);
    assert!(
        text.starts_with(
            "Bore Ø <b> Bcc: x@y.example (0.027 mm wide): the gauge takes 36 % of the tolerance."
        ),
        "{text}"
    );
    assert!(
        html.contains("Bore Ø &lt;b&gt; Bcc") && !html.contains("<b>"),
        "{html}"
    );
    assert!(text.contains("2.4 µm above KL and MO") && html.contains("2.4 µm above KL and MO"));
    let again = Bench::new().record(
        &config,
        &round(
            &config,
            1,
            &[Reads {
                name: "bore Ø <b>\r\nBcc: x@y.example",
                ..shifted("")
            }],
            None,
        ),
    );
    assert_eq!(again, notices);
}

#[test]
fn a_draft_is_the_first_mail_of_its_round() {
    let config = halden();
    let worked = round(&config, 1, &[shifted("bore A")], None);
    let notices = Bench::new().record(&config, &worked);
    let draft = draft(&config, &config.plans[0], &worked, "quality@halden.example").unwrap();
    assert_eq!(draft.bytes, mail(&notices, "quality@halden.example").bytes);
    assert_eq!(parsed(&draft.bytes).subject(), Some(draft.subject.as_str()));
}

#[test]
fn a_thread_lasts_until_the_plan_is_back() {
    let config = halden();
    let to = "quality@halden.example";
    let mut bench = Bench::new();
    let first = round(&config, 1, &[shifted("bore A"), good("bore B")], None);
    let one = bench.record(&config, &first);
    let second = round(
        &config,
        2,
        &[shifted("bore A"), shifted("bore B")],
        Some(&first),
    );
    let two = bench.record(&config, &second);
    // 3.6 / 27 is 13.3 %, below 0.85 of both limits.
    let third = round(
        &config,
        3,
        &[reads("bore A", 0.6, 0.0), reads("bore B", 0.6, 0.0)],
        Some(&second),
    );
    let three = bench.record(&config, &third);
    let fourth = round(
        &config,
        4,
        &[shifted("bore A"), good("bore B")],
        Some(&third),
    );
    let four = bench.record(&config, &fourth);
    let root = &mail(&one, to).key;
    for notices in [&one, &two, &three] {
        assert_eq!(&mail(notices, to).thread, root);
    }
    assert_eq!(mail(&four, to).thread, mail(&four, to).key);
    let back = parsed(&mail(&three, to).bytes);
    assert!(back.subject().unwrap().starts_with("BACK: "));
    let of_thread = root.trim_matches(['<', '>']);
    assert_eq!(back.in_reply_to().as_text(), Some(of_thread));
    assert_eq!(back.references().as_text(), Some(of_thread));
}

#[test]
fn a_correction_goes_out_in_the_thread_and_only_where_something_was_told_wrongly() {
    let config = halden();
    let mut bench = Bench::new();
    let before = round(&config, 1, &[good("bore A")], None);
    assert!(bench.record(&config, &before).is_empty());
    let told = bench.record(
        &config,
        &round(&config, 2, &[shifted("bore A")], Some(&before)),
    );
    // 4.81 / 27 is 17.8 % as before in print; 35.6 % stays 35.6 %: nothing to correct.
    let same = revised(&config, 2, 2, &[shifted("bore A")], Some(&before));
    assert!(bench.record(&config, &same).is_empty());
    let corrected = bench.record(
        &config,
        &revised(&config, 2, 3, &[good("bore A")], Some(&before)),
    );
    let to: Vec<&str> = corrected.iter().map(|n| n.recipient.as_str()).collect();
    assert_eq!(
        to,
        ["", "records@halden.example", "quality@halden.example"],
        "the route for corrections"
    );
    let mail = mail(&corrected, "quality@halden.example");
    assert_eq!(mail.kind, "corrected");
    assert_eq!(
        mail.subject,
        "CORRECTED: impeller hub / bridge-1: bore A takes 18 % of tolerance, not 36 %"
    );
    assert_eq!(
        mail.thread,
        told.iter()
            .find(|n| n.recipient == "quality@halden.example")
            .unwrap()
            .thread
    );
    let bytes = parsed(&mail.bytes);
    let text = bytes.body_text(0).unwrap();
    assert!(
        text.contains("\"ACT: impeller hub / bridge-1: bore A takes 36 % of tolerance\""),
        "{text}"
    );
    assert!(
        text.contains("stands at \"under\", not at \"act\""),
        "{text}"
    );
}

#[test]
fn a_revision_of_a_round_that_nobody_was_told_about_is_a_first_message() {
    let config = halden();
    let mut bench = Bench::new();
    assert!(
        bench
            .record(&config, &round(&config, 1, &[good("bore A")], None))
            .is_empty()
    );
    let revised = bench.record(
        &config,
        &revised(&config, 1, 2, &[reads("bore A", 0.8, 2.4)], None),
    );
    assert!(
        revised
            .iter()
            .all(|n| n.kind == "standing" && n.subject.starts_with("ACT: ")),
        "{revised:#?}"
    );
}

#[test]
fn a_message_id_says_what_the_message_is_about_and_nothing_else() {
    let id = |site, plan, round, revision, kind, to| {
        message_id(
            "Restudy <restudy@halden.example>",
            site,
            plan,
            round,
            revision,
            kind,
            to,
        )
    };
    let first = id("Halden", "hub", 1, 1, NoticeKind::Standing, "a@b.example");
    assert_eq!(
        first,
        id("Halden", "hub", 1, 1, NoticeKind::Standing, "a@b.example")
    );
    assert!(
        first.starts_with('<') && first.ends_with("@halden.example>"),
        "{first}"
    );
    let others = [
        id("Haldenhub", "", 1, 1, NoticeKind::Standing, "a@b.example"),
        id("Halden", "hub", 11, 1, NoticeKind::Standing, "a@b.example"),
        id("Halden", "hub", 1, 11, NoticeKind::Standing, "a@b.example"),
        id("Halden", "hub", 1, 1, NoticeKind::Corrected, "a@b.example"),
        id("Halden", "hub", 1, 1, NoticeKind::Standing, "b@b.example"),
    ];
    assert!(others.iter().all(|other| *other != first));
}
