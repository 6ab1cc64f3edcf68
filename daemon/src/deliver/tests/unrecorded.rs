//! A disk that takes no record repeats no notice.

use std::io::{self, Write};
use std::sync::Mutex;

use super::*;

/// Time for several passes after a fault.
const PASSES: Duration = SHORT.after_fault.saturating_mul(8);

#[tokio::test]
async fn a_mail_whose_record_fails_is_not_sent_again() {
    let server = FakeServer::start(Manner::Takes);
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.owe("mail", "room@halden.example");
    bench.refuse_records();
    bench.start(config(&plain(server.port)));
    until(|| !server.confirmed().is_empty()).await;
    sleep(PASSES).await;
    assert_eq!(server.received.lock().unwrap().len(), 1);
    bench.take_records();
    bench.until("both recorded", <[_]>::is_empty).await;
    let received = server.confirmed();
    let to: Vec<&str> = received.iter().map(|r| r.to.as_str()).collect();
    assert_eq!(to, ["quality@halden.example", "room@halden.example"]);
    bench.stopped().await;
}

#[tokio::test]
async fn a_refusal_whose_record_fails_is_not_asked_for_again() {
    let server = FakeServer::start(Manner::ToContent("554 5.7.1 content not wanted"));
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.refuse_records();
    bench.start(config(&plain(server.port)));
    let received = || server.received.lock().unwrap().len();
    until(|| received() > 0).await;
    sleep(PASSES).await;
    assert_eq!(received(), 1);
    bench.take_records();
    let rows = bench
        .until("refused", |rows| rows.iter().all(|r| r.refused))
        .await;
    assert_eq!((rows[0].attempts, received()), (1, 1));
    bench.stopped().await;
}

#[tokio::test]
async fn a_log_line_whose_record_fails_is_not_written_again() {
    let lines = Lines::default();
    let subscriber = tracing_subscriber::fmt()
        .with_writer({
            let lines = lines.clone();
            move || lines.clone()
        })
        .finish();
    let _guard = tracing::subscriber::set_default(subscriber);
    let mut bench = Bench::new();
    bench.owe("log", "");
    bench.refuse_records();
    bench.start(config(""));
    until(|| lines.count("bore A takes 35 % of tolerance") > 0).await;
    until(|| lines.count("delivery waits and tries again") >= 3).await;
    bench.take_records();
    bench.until("recorded", <[_]>::is_empty).await;
    assert_eq!(lines.count("bore A takes 35 % of tolerance"), 1);
    bench.stopped().await;
}

#[tokio::test]
async fn without_room_for_a_record_nothing_is_delivered() {
    let server = FakeServer::start(Manner::Takes);
    let mut bench = Bench::new();
    bench.owe("log", "");
    bench.owe("mail", "quality@halden.example");
    let state = bench.folder.path().join("not mounted");
    bench.start_in(&state, config(&plain(server.port)));
    sleep(PASSES).await;
    assert_eq!(*server.connections.lock().unwrap(), 0);
    let owed = bench.until("two owed", |rows| rows.len() == 2).await;
    assert!(owed.iter().all(|r| r.attempts == 0), "{owed:#?}");
    fs_err::create_dir(&state).unwrap();
    bench.until("both delivered", <[_]>::is_empty).await;
    assert_eq!(server.confirmed().len(), 1);
    bench.stopped().await;
}

/// What was logged.
#[derive(Clone, Default)]
struct Lines(Arc<Mutex<Vec<u8>>>);

impl Lines {
    fn count(&self, words: &str) -> usize {
        String::from_utf8_lossy(&self.0.lock().unwrap())
            .lines()
            .filter(|line| line.contains(words))
            .count()
    }
}

impl Write for Lines {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.0.lock().unwrap().extend_from_slice(bytes);
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}
