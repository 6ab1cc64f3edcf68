//! Peers in other languages: started once, then asked for passes; each answers with the CPU seconds it took.

use std::ffi::OsString;
use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::time::Duration;

use crate::readings::{APPRAISERS, PARTS, TRIALS};

pub(crate) struct Peer {
    pub(crate) name: String,
    /// Characteristics in one pass.
    pub(crate) count: usize,
    child: Child,
    ask: ChildStdin,
    answer: BufReader<ChildStdout>,
}

impl Peer {
    pub(crate) fn python(what: &str, readings: &Path, count: usize) -> Option<Peer> {
        Peer::start("PYTHON", "python3", "analysis.py", what, readings, count)
    }

    pub(crate) fn r(what: &str, readings: &Path, count: usize) -> Option<Peer> {
        Peer::start("RSCRIPT", "Rscript", "analysis.R", what, readings, count)
    }

    fn start(
        variable: &str,
        program: &str,
        script: &str,
        what: &str,
        readings: &Path,
        count: usize,
    ) -> Option<Peer> {
        let program = std::env::var_os(variable).unwrap_or_else(|| OsString::from(program));
        let script = Path::new(env!("CARGO_MANIFEST_DIR"))
            .join("../tests/bench")
            .join(script);
        let size = [PARTS, APPRAISERS, TRIALS, count].map(|n| n.to_string());
        let child = Command::new(&program)
            .arg(script)
            .arg(what)
            .arg(readings)
            .args(size)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .spawn();
        let missing = || {
            println!("left out: `{what}` by {}", program.to_string_lossy());
            None
        };
        let Ok(mut child) = child else {
            return missing();
        };
        let (ask, answer) = (child.stdin.take()?, child.stdout.take()?);
        let mut peer = Peer {
            name: what.to_owned(),
            count,
            child,
            ask,
            answer: BufReader::new(answer),
        };
        // The first pass tells whether it has what it needs.
        if peer.passes(1).is_none() {
            return missing();
        }
        Some(peer)
    }

    /// CPU time of so many passes.
    pub(crate) fn passes(&mut self, passes: u64) -> Option<Duration> {
        writeln!(self.ask, "{passes}").ok()?;
        self.ask.flush().ok()?;
        let mut line = String::new();
        self.answer.read_line(&mut line).ok()?;
        line.trim().parse().ok().map(Duration::from_secs_f64)
    }
}

impl Drop for Peer {
    fn drop(&mut self) {
        // It is done whether it heard so or not.
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}
