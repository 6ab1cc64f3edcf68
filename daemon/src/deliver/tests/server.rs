//! A mail server on loopback that behaves as a test tells it, connection by connection.

use std::io::{BufRead as _, BufReader, Write as _};
use std::net::{TcpListener, TcpStream};
use std::sync::{Arc, Mutex};
use std::thread;
use std::time::Duration;

/// How one connection is treated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Manner {
    /// Takes every mail.
    Takes,
    /// Answers so to this recipient, takes mail for others.
    ToRecipient(&'static str, &'static str),
    /// Answers so to the sender.
    ToSender(&'static str),
    /// Answers so after the final dot.
    ToContent(&'static str),
    /// Greets so and closes.
    Greets(&'static str),
    /// Says nothing at all.
    Silent,
    /// Takes the mail and drops the line before saying so.
    DropsAfterDot,
    /// Takes the mail and says so only after this time.
    SlowAfterDot(Duration),
}

/// A mail that the server has read to its final dot.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Received {
    pub(super) to: String,
    pub(super) bytes: Vec<u8>,
    pub(super) confirmed: bool,
}

#[derive(Clone)]
pub(super) struct FakeServer {
    pub(super) port: u16,
    pub(super) received: Arc<Mutex<Vec<Received>>>,
    pub(super) connections: Arc<Mutex<u32>>,
    manner: Arc<Mutex<Manner>>,
}

impl FakeServer {
    pub(super) fn start(manner: Manner) -> Self {
        let listener = TcpListener::bind(("127.0.0.1", 0)).unwrap();
        let server = Self {
            port: listener.local_addr().unwrap().port(),
            received: Arc::default(),
            connections: Arc::default(),
            manner: Arc::new(Mutex::new(manner)),
        };
        let shared = server.clone();
        thread::spawn(move || {
            while let Ok((stream, _)) = listener.accept() {
                *shared.connections.lock().unwrap() += 1;
                let (manner, received) =
                    (*shared.manner.lock().unwrap(), Arc::clone(&shared.received));
                thread::spawn(move || {
                    // The client may hang up at any time; that is its right.
                    let _ = talk(stream, manner, &received);
                });
            }
        });
        server
    }

    /// For connections from now on.
    pub(super) fn now(&self, manner: Manner) {
        *self.manner.lock().unwrap() = manner;
    }

    pub(super) fn confirmed(&self) -> Vec<Received> {
        self.received
            .lock()
            .unwrap()
            .iter()
            .filter(|r| r.confirmed)
            .cloned()
            .collect()
    }
}

fn talk(stream: TcpStream, manner: Manner, received: &Mutex<Vec<Received>>) -> std::io::Result<()> {
    let mut stream = BufReader::new(stream);
    match manner {
        Manner::Silent => {
            let mut rest = Vec::new();
            stream.read_until(0, &mut rest)?;
            return Ok(());
        }
        Manner::Greets(words) => return say(&mut stream, words),
        _ => say(&mut stream, "220 fake.halden.example")?,
    }
    let mut to = String::new();
    loop {
        let mut line = String::new();
        if stream.read_line(&mut line)? == 0 {
            return Ok(());
        }
        let answer = match (
            line.split([' ', ':', '\r']).next().unwrap_or_default(),
            manner,
        ) {
            ("EHLO", _) => "250 fake.halden.example",
            ("MAIL", Manner::ToSender(words)) => words,
            ("RCPT", _) => {
                to = line
                    .trim_end()
                    .trim_start_matches("RCPT TO:<")
                    .trim_end_matches('>')
                    .to_owned();
                match manner {
                    Manner::ToRecipient(recipient, words) if recipient == to => words,
                    _ => "250 ok",
                }
            }
            ("DATA", _) => {
                say(&mut stream, "354 go on")?;
                let bytes = content(&mut stream)?;
                let confirmed = !matches!(manner, Manner::DropsAfterDot | Manner::ToContent(_));
                received.lock().unwrap().push(Received {
                    to: to.clone(),
                    bytes,
                    confirmed,
                });
                match manner {
                    Manner::DropsAfterDot => return Ok(()),
                    Manner::ToContent(words) => words,
                    Manner::SlowAfterDot(wait) => {
                        thread::sleep(wait);
                        "250 taken"
                    }
                    _ => "250 taken",
                }
            }
            ("QUIT", _) => return say(&mut stream, "221 bye"),
            _ => "250 ok",
        };
        say(&mut stream, answer)?;
    }
}

fn say(stream: &mut BufReader<TcpStream>, words: &str) -> std::io::Result<()> {
    stream
        .get_mut()
        .write_all(format!("{words}\r\n").as_bytes())
}

/// Up to the final dot, with doubled dots undone.
fn content(stream: &mut BufReader<TcpStream>) -> std::io::Result<Vec<u8>> {
    let mut bytes = Vec::new();
    loop {
        let mut line = Vec::new();
        stream.read_until(b'\n', &mut line)?;
        if line == b".\r\n" {
            return Ok(bytes);
        }
        bytes.extend_from_slice(line.strip_prefix(b".").unwrap_or(&line));
    }
}
