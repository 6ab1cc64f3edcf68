//! The real delivery against a server on loopback that takes, refuses, hangs and drops.

mod bench;
mod patient;
mod server;
mod unrecorded;

use super::outbox::BATCH;
use super::*;
use crate::ledger::OutboxRow;
use bench::{Bench, DEADLINE, SHORT, config, plain, until};
use server::{FakeServer, Manner};

#[tokio::test]
async fn what_is_owed_is_taken_once_and_to_the_byte() {
    let server = FakeServer::start(Manner::Takes);
    let mut bench = Bench::new();
    bench.owe("log", "");
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    bench.until("both delivered", <[_]>::is_empty).await;
    bench.owe("mail", "room@halden.example");
    bench
        .until("the later one delivered", <[_]>::is_empty)
        .await;
    let received = server.confirmed();
    let to: Vec<&str> = received.iter().map(|r| r.to.as_str()).collect();
    assert_eq!(to, ["quality@halden.example", "room@halden.example"]);
    let sent = b"To: quality@halden.example\r\nMessage-ID: <quality@halden.example-1>\r\n\r\n.a line with a dot\r\n";
    assert!(
        received[0].bytes.starts_with(sent),
        "{}",
        String::from_utf8_lossy(&received[0].bytes)
    );
    bench.stopped().await;
}

#[tokio::test]
async fn many_mails_travel_in_one_session() {
    let server = FakeServer::start(Manner::Takes);
    let mut bench = Bench::new();
    for n in 0..2 * BATCH + 1 {
        bench.owe("mail", &format!("reader{n}@halden.example"));
    }
    bench.start(config(&plain(server.port)));
    bench.until("all delivered", <[_]>::is_empty).await;
    assert_eq!(server.confirmed().len(), 2 * BATCH + 1);
    assert_eq!(*server.connections.lock().unwrap(), 1);
    bench.stopped().await;
}

#[tokio::test]
async fn a_refused_recipient_keeps_the_servers_sentence_and_stops_nobody_else() {
    let server = FakeServer::start(Manner::ToRecipient(
        "gone@halden.example",
        "550 5.1.1 no such mailbox",
    ));
    let mut bench = Bench::new();
    bench.owe("mail", "gone@halden.example");
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    let rows = bench
        .until("one refused, one delivered", |rows| {
            rows.len() == 1 && rows[0].refused
        })
        .await;
    assert_eq!(
        rows[0].last_error.as_deref(),
        Some("550 5.1.1 no such mailbox")
    );
    assert_eq!(server.confirmed().len(), 1);
    bench.stopped().await;
}

#[tokio::test]
async fn a_recipient_that_is_put_off_is_tried_again_while_others_go_on() {
    let server = FakeServer::start(Manner::ToRecipient(
        "slow@halden.example",
        "451 4.7.1 greylisted",
    ));
    let mut bench = Bench::new();
    bench.owe("mail", "slow@halden.example");
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    let rows = bench
        .until("tried twice", |rows| {
            rows.len() == 1 && rows[0].attempts >= 2
        })
        .await;
    assert_eq!(rows[0].last_error.as_deref(), Some("451 4.7.1 greylisted"));
    assert!(!rows[0].refused);
    server.now(Manner::Takes);
    bench.until("delivered", <[_]>::is_empty).await;
    assert_eq!(server.confirmed().len(), 2);
    bench.stopped().await;
}

#[tokio::test]
async fn refused_content_is_refused_for_good() {
    let server = FakeServer::start(Manner::ToContent("554 5.7.1 content not wanted"));
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    let rows = bench
        .until("refused", |rows| rows.iter().all(|r| r.refused))
        .await;
    assert_eq!(
        rows[0].last_error.as_deref(),
        Some("554 5.7.1 content not wanted")
    );
    bench.stopped().await;
}

#[tokio::test]
async fn what_concerns_the_account_or_the_server_is_never_a_refusal() {
    for manner in [
        Manner::ToSender("550 5.7.1 sender not allowed"),
        Manner::ToRecipient("quality@halden.example", "530 5.7.0 log in first"),
        Manner::ToRecipient("quality@halden.example", "421 4.3.2 shutting down"),
        Manner::Greets("554 5.3.2 no mail today"),
        Manner::DropsAfterDot,
        Manner::Silent,
    ] {
        let server = FakeServer::start(manner);
        let mut bench = Bench::new();
        bench.owe("mail", "quality@halden.example");
        bench.owe("mail", "room@halden.example");
        bench.start(config(&plain(server.port)));
        let tried = |rows: &[OutboxRow]| rows.iter().map(|r| r.attempts).sum::<u32>() >= 2;
        let rows = bench.until("two tries", tried).await;
        assert!(rows.iter().all(|r| !r.refused), "{manner:?}: {rows:#?}");
        server.now(Manner::Takes);
        bench
            .until("both delivered in the end", <[_]>::is_empty)
            .await;
        let mut to: Vec<String> = server.confirmed().into_iter().map(|r| r.to).collect();
        to.sort();
        assert_eq!(
            to,
            ["quality@halden.example", "room@halden.example"],
            "{manner:?}"
        );
        bench.stopped().await;
    }
}

#[tokio::test]
async fn a_mail_that_was_taken_without_a_word_is_repeated_with_the_same_bytes() {
    let server = FakeServer::start(Manner::DropsAfterDot);
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    bench
        .until("one try", |rows| rows.iter().all(|r| r.attempts > 0))
        .await;
    server.now(Manner::Takes);
    bench.until("delivered", <[_]>::is_empty).await;
    let received = server.received.lock().unwrap().clone();
    assert!(received.len() >= 2);
    assert!(received.iter().all(|r| r.bytes == received[0].bytes));
    bench.stopped().await;
}

#[tokio::test]
async fn a_dead_server_is_probed_with_one_mail_while_the_log_goes_on() {
    let port = {
        let unused = std::net::TcpListener::bind(("127.0.0.1", 0)).unwrap();
        unused.local_addr().unwrap().port()
    };
    let mut bench = Bench::new();
    for n in 0..2 * BATCH {
        bench.owe("mail", &format!("reader{n}@halden.example"));
    }
    bench.start(config(&plain(port)));
    let rows = bench
        .until("three tries", |rows| {
            rows.iter().map(|r| r.attempts).sum::<u32>() >= 3
        })
        .await;
    assert_eq!(rows.len(), 2 * BATCH);
    let error = rows.iter().find_map(|r| r.last_error.as_deref()).unwrap();
    assert!(error.contains(&format!("127.0.0.1:{port}")), "{error}");
    let tries: u32 = rows.iter().map(|r| r.attempts).sum();
    assert!(tries < BATCH as u32, "{tries} tries");
    bench.owe("log", "");
    bench
        .until("the log line written", |rows| {
            rows.iter().all(|r| r.channel == "mail")
        })
        .await;
    bench.stopped().await;
}

#[tokio::test]
async fn a_stop_does_not_wait_for_a_silent_server() {
    let server = FakeServer::start(Manner::Silent);
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    until(|| *server.connections.lock().unwrap() > 0).await;
    let ledger = bench.ledger.clone();
    let took = bench.stopped().await;
    assert!(took < SHORT.stop + Duration::from_secs(2), "{took:?}");
    assert_eq!(ledger.lock().read().undelivered().unwrap().len(), 1);
}

#[tokio::test]
async fn an_address_that_no_server_takes_is_refused_with_a_sentence() {
    let server = FakeServer::start(Manner::Takes);
    let mut bench = Bench::new();
    bench.owe("mail", "quality at halden");
    bench.start(config(&plain(server.port)));
    let rows = bench
        .until("refused", |rows| rows.iter().all(|r| r.refused))
        .await;
    assert!(
        rows[0]
            .last_error
            .as_deref()
            .unwrap()
            .contains("cannot be mailed to")
    );
    bench.stopped().await;
}

#[cfg(unix)]
#[tokio::test]
async fn a_password_file_open_to_others_keeps_the_mail_owed() {
    let server = FakeServer::start(Manner::Takes);
    let mut bench = Bench::new();
    let path = bench.folder.path().join("mail-password");
    fs_err::write(&path, "secret\n").unwrap();
    fs_err::set_permissions(&path, std::os::unix::fs::PermissionsExt::from_mode(0o644)).unwrap();
    bench.owe("mail", "quality@halden.example");
    let login = format!(
        "user = \"restudy\"\npassword_file = \"{}\"\n",
        path.display()
    );
    bench.start(config(
        &(plain(server.port).replace("none", "starttls") + &login),
    ));
    let rows = bench
        .until("tried", |rows| rows.iter().all(|r| r.attempts > 0))
        .await;
    let error = rows[0].last_error.clone().unwrap();
    assert!(
        !rows[0].refused && error.contains("expected 0600") && !error.contains("secret"),
        "{error}"
    );
    bench.stopped().await;
}

#[tokio::test]
async fn without_encryption_offered_nothing_is_sent() {
    let server = FakeServer::start(Manner::Takes);
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port).replace("none", "starttls")));
    let rows = bench
        .until("tried", |rows| rows.iter().all(|r| r.attempts > 0))
        .await;
    assert!(
        !rows[0].refused && rows[0].last_error.as_deref().unwrap().contains("STARTTLS"),
        "{rows:#?}"
    );
    assert!(server.received.lock().unwrap().is_empty());
    bench.stopped().await;
}

#[tokio::test]
async fn without_a_server_the_log_is_written_and_mail_stays_owed() {
    let mut bench = Bench::new();
    bench.owe("log", "");
    bench.owe("mail", "quality@halden.example");
    bench.start(config(""));
    let rows = bench
        .until("the log line written", |rows| rows.len() == 1)
        .await;
    assert_eq!((rows[0].channel.as_str(), rows[0].attempts), ("mail", 0));
    bench.stopped().await;
}
