//! Can the mail server be reached from here? A connection, no mail, not a word.

use std::io;
use std::net::TcpStream;
use std::sync::mpsc::{RecvTimeoutError, channel};
use std::thread;
use std::time::Duration;

use restudy_config::Mail;

/// Looks the server's name up and connects to it, within `longest`.
///
/// # Errors
/// One sentence.
pub fn reach(mail: &Mail, longest: Duration) -> Result<(), String> {
    let (server, port) = (mail.server.clone(), mail.port);
    let connect = move || TcpStream::connect((server.as_str(), port)).map(drop);
    done_within(longest, connect).map_err(|why| {
        format!(
            "the mail server {}:{} cannot be reached from here: {why}",
            mail.server, mail.port
        )
    })
}

/// A name look-up knows no time limit, so it is left behind when it takes too long.
fn done_within(
    longest: Duration,
    step: impl FnOnce() -> io::Result<()> + Send + 'static,
) -> Result<(), String> {
    let (tell, told) = channel();
    thread::spawn(move || {
        // Nobody listens any more after `longest`.
        let _ = tell.send(step());
    });
    match told.recv_timeout(longest) {
        Ok(result) => result.map_err(|e| super::one_line(&e.to_string())),
        Err(RecvTimeoutError::Timeout) => {
            Err(format!("no connection within {} s", longest.as_secs_f64()))
        }
        Err(RecvTimeoutError::Disconnected) => Err("the attempt ended by itself".into()),
    }
}

#[cfg(test)]
mod tests {
    use std::net::TcpListener;
    use std::time::Instant;

    use restudy_config::Tls;

    use super::*;

    const LONG: Duration = Duration::from_secs(20);

    fn mail(server: &str, port: u16) -> Mail {
        Mail {
            server: server.into(),
            port,
            tls: Tls::None,
            login: None,
            from: "restudy@halden.example".into(),
        }
    }

    #[test]
    fn a_port_that_listens_is_reached_and_one_that_does_not_is_named() {
        let listener = TcpListener::bind(("127.0.0.1", 0)).unwrap();
        let port = listener.local_addr().unwrap().port();
        assert_eq!(reach(&mail("127.0.0.1", port), LONG), Ok(()));
        drop(listener);
        let sentence = reach(&mail("127.0.0.1", port), LONG).unwrap_err();
        let place = format!("the mail server 127.0.0.1:{port} cannot be reached from here: ");
        assert!(
            sentence.starts_with(&place) && sentence.len() > place.len(),
            "{sentence}"
        );
    }

    /// `.invalid` never resolves: RFC 6761 §6.4.
    #[test]
    fn a_name_that_nobody_knows_is_named() {
        let sentence = reach(&mail("mail.halden.invalid", 25), LONG).unwrap_err();
        assert!(sentence.contains("mail.halden.invalid:25"), "{sentence}");
    }

    #[test]
    fn what_takes_too_long_is_left_behind() {
        let (end, ended) = channel::<()>();
        let asked = Instant::now();
        let sentence = done_within(Duration::from_millis(50), move || {
            let _ = ended.recv();
            Ok(())
        })
        .unwrap_err();
        assert!(asked.elapsed() < LONG);
        assert_eq!(sentence, "no connection within 0.05 s");
        drop(end);
    }
}
