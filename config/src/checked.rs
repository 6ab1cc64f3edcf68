//! The checked settings.

use std::path::PathBuf;
use std::time::Duration;

use restudy_engine::{Interaction, Judge, Limits, OneSided, Process};
use restudy_parsers::Rule;

/// A whole, consistent configuration.
#[derive(Debug, Clone)]
pub struct Config {
    /// The plant.
    pub site: Site,
    /// Folder of the ledger and the reports; local.
    pub state: PathBuf,
    /// At least one.
    pub instruments: Vec<Instrument>,
    /// At least one; the instruments they name exist.
    pub plans: Vec<Plan>,
    /// `None`: notices are logged only.
    pub mail: Option<Mail>,
    /// Who gets what; without any, notices are logged only.
    pub routes: Vec<Route>,
}

/// The plant and its time zone.
#[derive(Debug, Clone)]
pub struct Site {
    /// Its name, in every mail.
    pub name: String,
    /// Its zone.
    pub zone: jiff::tz::TimeZone,
}

/// One source of exports.
#[derive(Debug, Clone)]
pub struct Instrument {
    /// Unique.
    pub name: String,
    /// Watched folders, with their sub-folders.
    pub folders: Vec<PathBuf>,
    /// Which files in them are exports.
    pub files: FilePatterns,
    /// Size and times must hold still this long.
    pub settle: Duration,
    /// How often the folders are walked without being told.
    pub rescan: Duration,
    /// How its exports are read.
    pub rule: Rule,
    /// A text that changes whenever the rule does (for telling old readings of an export from new ones).
    pub rule_mark: String,
}

/// File name patterns (`*.xlsx`), any case.
#[derive(Debug, Clone)]
pub struct FilePatterns {
    /// As written.
    pub written: Vec<String>,
    pub(crate) set: globset::GlobSet,
}

impl FilePatterns {
    /// True when the file's name (without folder) is an export's.
    #[must_use]
    pub fn matches(&self, file_name: &std::ffi::OsStr) -> bool {
        self.set.is_match(file_name)
    }
}

/// One planned study.
#[derive(Debug, Clone)]
pub struct Plan {
    /// Unique.
    pub name: String,
    /// Names of instruments whose runs it takes.
    pub instruments: Vec<String>,
    /// Only exports whose path matches.
    pub only: Option<regex::Regex>,
    /// The parts.
    pub parts: FactorLevels,
    /// The appraisers; `None`: the study has none.
    pub appraisers: Option<Appraisers>,
    /// Runs a cell, at least 1.
    pub trials: u32,
    /// Further factors, crossed.
    pub factors: Vec<PlanFactor>,
    /// Interaction kept or pooled.
    pub interaction: Interaction,
    /// Spread in sds.
    pub spread_sds: f64,
    /// Two-sided confidence.
    pub confidence: f64,
    /// A round not complete by then is closed as unfinished.
    pub finish_within: Option<Duration>,
    /// A re-study is due this long after the last.
    pub repeat_every: Option<Duration>,
    /// Limits on the share of tolerance.
    pub limits: Limits,
    /// Which figure is judged.
    pub judge: Judge,
    /// The process that risks and distances refer to.
    pub process: Option<Process>,
    /// What the plan itself says about characteristics; drawing values win over the export's.
    pub characteristics: Vec<Characteristic>,
    /// True when `characteristics` is the whole list (from a file): a cell is filled when it has all of these.
    pub whole_list: bool,
}

/// Levels of a factor.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum FactorLevels {
    /// So many, whatever they are called.
    Count(usize),
    /// These, in this order.
    Named(Vec<Label>),
}

/// A level's name and its other accepted spellings.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Label {
    /// As shown.
    pub name: String,
    /// Also accepted, any case and blanks folded, like the name itself.
    pub spellings: Vec<String>,
}

/// The appraisers, and what the plant calls that factor.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Appraisers {
    /// Who they are.
    pub levels: FactorLevels,
    /// "appraiser", "loading", "shift"…
    pub word: String,
}

/// A further crossed factor.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PlanFactor {
    /// Its name, as in `[instrument.read] factors`.
    pub name: String,
    /// Its levels.
    pub levels: FactorLevels,
}

/// What the plan says about one characteristic.
#[derive(Debug, Clone, PartialEq)]
pub struct Characteristic {
    /// Its name, as in the exports (any case, blanks folded).
    pub name: String,
    /// Drawing nominal.
    pub nominal: Option<f64>,
    /// Drawing lower limit.
    pub lower: Option<f64>,
    /// Drawing upper limit.
    pub upper: Option<f64>,
    /// Unit of the three above.
    pub unit: Option<String>,
    /// How a one-sided tolerance is judged.
    pub one_sided: Option<OneSided>,
    /// Named first in messages.
    pub special: bool,
    /// Its own limits, already completed from the plan's.
    pub limits: Limits,
    /// Its own process.
    pub process: Option<Process>,
}

/// The mail server.
#[derive(Debug, Clone)]
pub struct Mail {
    /// Host name.
    pub server: String,
    /// Port.
    pub port: u16,
    /// Encryption.
    pub tls: Tls,
    /// Login name, with where its password is.
    pub login: Option<(String, Password)>,
    /// Sender, `Restudy <restudy@halden.example>`.
    pub from: String,
}

/// Encryption of the way to the mail server.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Tls {
    /// None: only if named.
    None,
    /// STARTTLS, required.
    StartTls,
    /// TLS from the first byte.
    Implicit,
}

/// Where a password is kept; never in the configuration itself.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Password {
    /// A file that only the service's user can read.
    File(PathBuf),
    /// An environment variable.
    Environment(String),
}

/// A kind of notice.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, serde::Serialize)]
pub enum NoticeKind {
    /// A standing changed, or a first study is above a limit.
    Standing,
    /// A reported round got a revision.
    Corrected,
}

/// Who gets which notices.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Route {
    /// Kinds; empty: all.
    pub kinds: Vec<NoticeKind>,
    /// Plans; empty: all.
    pub plans: Vec<String>,
    /// Addresses.
    pub to: Vec<String>,
}
