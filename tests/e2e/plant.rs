//! A plant in a folder of its own: configuration, watched folders, state.

use std::io::Write as _;
use std::path::{Path, PathBuf};
use std::thread;
use std::time::Duration;

use tempfile::TempDir;

/// Pause between two pieces of a slow writer; well below [`SETTLE`].
const BETWEEN_PIECES: Duration = Duration::from_millis(120);
const PIECES: usize = 4;
const SETTLE: &str = "600ms";

/// The mail addresses that get notices.
pub(crate) const RECIPIENTS: [&str; 2] = ["quality@halden.example", "room@halden.example"];

/// What the plan wants.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Design<'a> {
    pub(crate) parts: usize,
    pub(crate) appraisers: &'a [&'a str],
    pub(crate) trials: usize,
}

/// A plant; a folder of its own making goes when it does.
#[derive(Debug)]
pub(crate) struct Plant {
    folder: PathBuf,
    _own: Option<TempDir>,
}

impl Plant {
    /// One bridge machine, one plan; with a mail port, notices are mailed too.
    pub(crate) fn new(design: Design<'_>, mail: Option<u16>) -> Self {
        Self::with(design, mail, "", &[])
    }

    /// The same with further tables and folders.
    pub(crate) fn with(
        design: Design<'_>,
        mail: Option<u16>,
        tables: &str,
        folders: &[&str],
    ) -> Self {
        let own = tempfile::tempdir().expect("a temporary folder");
        let plant = Self {
            folder: own.path().to_owned(),
            _own: Some(own),
        };
        fs_err::create_dir_all(plant.exports().join("GRR")).expect("a folder for exports");
        for name in folders {
            fs_err::create_dir_all(plant.folder().join(name)).expect("a folder");
        }
        let mail = mail.map(mail_tables).unwrap_or_default();
        let text = format!("{}\n{tables}\n{mail}\n", main_tables(design));
        fs_err::write(plant.config(), text).expect("a configuration");
        plant
    }

    /// One that stands there already.
    pub(crate) fn kept(folder: PathBuf) -> Self {
        Self { folder, _own: None }
    }

    pub(crate) fn folder(&self) -> &Path {
        &self.folder
    }

    pub(crate) fn config(&self) -> PathBuf {
        self.folder().join("restudy.toml")
    }

    pub(crate) fn exports(&self) -> PathBuf {
        self.folder().join("exports")
    }

    pub(crate) fn state(&self) -> PathBuf {
        self.folder().join("state")
    }

    fn place(&self, name: &str) -> PathBuf {
        self.exports().join("GRR").join(name)
    }

    /// Writes an export at once, under its own name.
    pub(crate) fn put(&self, name: &str, bytes: &[u8]) {
        fs_err::write(self.place(name), bytes).expect("an export can be written");
    }

    /// Writes an export under a temporary name and moves it into place.
    pub(crate) fn put_by_rename(&self, name: &str, bytes: &[u8]) {
        let place = self.place(name);
        let temporary = place.with_extension("part");
        fs_err::write(&temporary, bytes).expect("an export can be written");
        fs_err::rename(&temporary, &place).expect("an export can be moved");
    }

    /// Writes an export in pieces, under its own name.
    pub(crate) fn put_slowly(&self, name: &str, bytes: &[u8]) {
        let mut file = fs_err::File::create(self.place(name)).expect("an export can be made");
        for piece in bytes.chunks(bytes.len().div_ceil(PIECES)) {
            file.write_all(piece)
                .and_then(|()| file.flush())
                .expect("an export can be written");
            thread::sleep(BETWEEN_PIECES);
        }
    }
}

fn main_tables(design: Design<'_>) -> String {
    let Design {
        parts,
        appraisers,
        trials,
    } = design;
    format!(
        r#"
[site]
name = "Halden Pump Works"
zone = "Europe/Oslo"

[state]
folder = "state"

[[instrument]]
name    = "bridge-1"
folders = ["exports"]
files   = ["*.xlsx", "*.csv"]
settle  = "{SETTLE}"
rescan  = "1s"

[instrument.read]
form           = "table"
sheet          = "Results"
header         = {{ find = "Serial no." }}
part           = {{ column = "Serial no." }}
appraiser      = {{ label = "Loaded by" }}
trial          = {{ path = 'run-(\d+)' }}
taken          = {{ label = "Measured", format = "%Y-%m-%d %H:%M" }}
characteristic = {{ column = "Feature" }}
value          = {{ column = "Actual", unit = "mm" }}
nominal        = {{ column = "Nominal" }}
lower          = {{ column = "Lower tol.", from = "nominal" }}
upper          = {{ column = "Upper tol.", from = "nominal" }}
same           = {{ program = {{ label = "Program" }} }}

[[plan]]
name           = "impeller hub"
instruments    = ["bridge-1"]
only           = {{ path = "GRR" }}
parts          = {parts}
appraisers     = {appraisers:?}
appraiser_word = "loading"
trials         = {trials}
interaction    = "keep"
repeat_every   = "90d"

[plan.limits]
watch = 0.10
act   = 0.30
"#
    )
}

fn mail_tables(port: u16) -> String {
    format!(
        r#"
[mail]
server = "127.0.0.1"
port   = {port}
tls    = "none"
from   = "Restudy <restudy@halden.example>"

[[route]]
to = {RECIPIENTS:?}
"#
    )
}
