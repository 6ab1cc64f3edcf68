//! A server that thinks about a mail is waited for, and a stop is not kept waiting by it.

use super::*;

#[tokio::test]
async fn a_mail_that_is_looked_through_before_it_is_taken_is_sent_once() {
    let server = FakeServer::start(Manner::SlowAfterDot(SHORT.steps.command * 2));
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    bench.until("delivered", <[_]>::is_empty).await;
    assert_eq!(server.received.lock().unwrap().len(), 1);
    bench.stopped().await;
}

#[tokio::test]
async fn the_log_goes_on_while_the_server_thinks() {
    let server = FakeServer::start(Manner::SlowAfterDot(DEADLINE));
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    until(|| !server.received.lock().unwrap().is_empty()).await;
    bench.owe("log", "");
    let rows = bench
        .until("the log line written", |rows| rows.len() == 1)
        .await;
    assert_eq!((rows[0].channel.as_str(), rows[0].attempts), ("mail", 0));
    bench.stopped().await;
}

#[tokio::test]
async fn a_stop_does_not_wait_for_a_server_that_thinks() {
    let server = FakeServer::start(Manner::SlowAfterDot(DEADLINE));
    let mut bench = Bench::new();
    bench.owe("mail", "quality@halden.example");
    bench.start(config(&plain(server.port)));
    until(|| !server.received.lock().unwrap().is_empty()).await;
    let ledger = bench.ledger.clone();
    let took = bench.stopped().await;
    assert!(took < SHORT.stop + Duration::from_secs(2), "{took:?}");
    assert_eq!(ledger.lock().read().undelivered().unwrap().len(), 1);
    assert!(LIMITS.stop <= Duration::from_secs(3));
}
