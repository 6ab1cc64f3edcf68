//! Intake: settled files to exports, runs and readings in the ledger.
//!
//! Model: one [`Intake`] an instrument. A pass looks through its folders, reads what has settled and differs
//! from what the ledger knows, and records each file in a transaction: the export, its raw bytes, its runs, and
//! what was set aside. A pass may be killed anywhere and run again.
//!
//! Not here: which cell a run fills (`rounds`).
//!
//! Invariant: a file is marked as dealt with in the same transaction as all that was found in it.

pub mod child;
pub mod file;
pub mod merge;
pub mod plausible;
pub mod request;
pub mod workbook;

#[cfg(test)]
mod tests;

use std::collections::{HashMap, HashSet};
use std::ffi::OsStr;
use std::os::unix::ffi::OsStrExt as _;
use std::path::Path;
use std::sync::Arc;
use std::time::{Duration, Instant};

use restudy_config::{Config, Instrument, Plan};
use restudy_parsers::{Export, Parsed, Reader, Refused};
use sha2::{Digest as _, Sha256};

use crate::causes::chain;
use crate::ledger::{
    Digest, ExportState, LedgerError, NewExport, PackedExport, SharedLedger, Stat, Write,
};
use crate::now::Now;
use crate::record::hex;
use crate::settle::Settler;
use crate::watch::walk::{Found, Unreadable, shown, walk};
use merge::Before;
use request::Ask;
use workbook::Workbooks;

/// Readers of one content that may die before the export is refused.
const STRIKES: u32 = 3;
/// Files recorded in one transaction at most, and for how long files are gathered for it.
const BATCH_FILES: usize = 64;
const BATCH_TIME: Duration = Duration::from_millis(100);
/// After a machine's fault (a child that cannot be started, a full disk) the next look waits this long.
const AFTER_FAULT: Duration = Duration::from_secs(5);

/// The stage that reads one instrument's exports.
pub struct Intake {
    ledger: SharedLedger,
    config: Arc<Config>,
    instrument: usize,
    reader: Reader,
    settler: Settler,
    known: Option<HashMap<Vec<u8>, Known>>,
    workbooks: Workbooks,
}

/// What the ledger knows of a path.
#[derive(Debug, Clone, Copy)]
struct Known {
    stat: Stat,
    export: Option<i64>,
    attempts: u32,
    /// Read by a rule, for a plan or with a list that has changed since: worth another reading.
    stale: bool,
    gone: bool,
}

/// What a pass did.
#[derive(Debug)]
pub struct Looked {
    /// Exports recorded.
    pub recorded: usize,
    /// How long nothing new can happen without an event.
    pub next: Duration,
    /// Folders that could not be looked at.
    pub unreadable: Vec<Unreadable>,
    /// Files that have not settled yet.
    pub settling: bool,
}

/// Why an instrument's rule cannot be used.
pub use restudy_parsers::RuleError;

/// A file read whole, and what it turned out to be.
struct Prepared<'a> {
    found: Found,
    content: Content<'a>,
}

enum Content<'a> {
    /// The bytes that the ledger knows already: only the file's times changed.
    Touched { export: i64 },
    /// Its reader died; another try is due.
    Struck { attempts: u32 },
    New {
        before: Before,
        mark: String,
        sha256: Digest,
        raw: Option<PackedExport>,
        plan: Option<&'a Plan>,
        outcome: Result<Parsed, Refused>,
    },
}

impl Intake {
    /// A stage for the `instrument`-th instrument of the configuration.
    ///
    /// # Errors
    /// A rule that does not compile; `check` finds it first.
    pub fn new(
        ledger: SharedLedger,
        config: Arc<Config>,
        instrument: usize,
    ) -> Result<Self, RuleError> {
        let own = &config.instruments[instrument];
        Ok(Self {
            reader: Reader::new(&own.rule)?,
            settler: Settler::new(own.settle),
            known: None,
            workbooks: Workbooks::new(),
            ledger,
            config,
            instrument,
        })
    }

    /// Looks through the folders once and records what has settled.
    ///
    /// # Errors
    /// The ledger's refusal.
    pub fn pass(&mut self, now: Now, stop: &dyn Fn() -> bool) -> Result<Looked, LedgerError> {
        let config = Arc::clone(&self.config);
        let own = &config.instruments[self.instrument];
        self.learn(own)?;
        let (found, unreadable) = look_through(own);
        let seen: HashSet<Vec<u8>> = found.iter().map(|f| bytes_of(&f.path)).collect();
        let mut ready: Vec<Found> = found
            .into_iter()
            .filter(|file| self.worth_reading(file, now))
            .collect();
        self.settler.keep_only_seen_at(now.uptime);
        ready.sort_by_key(|f| (f.stat.mtime, f.path.clone()));
        if unreadable.is_empty() {
            self.mark_gone(own, &seen)?;
        }

        let mut recorded = 0;
        let mut fault = false;
        let mut ready = ready.into_iter().peekable();
        while ready.peek().is_some() && !stop() {
            let mut batch = Vec::new();
            let started = Instant::now();
            while batch.len() < BATCH_FILES && started.elapsed() < BATCH_TIME && !stop() {
                let Some(file) = ready.next() else { break };
                match self.prepare(own, &config, file, now) {
                    Ok(Some(prepared)) => batch.push(prepared),
                    Ok(None) => {}
                    Err(sentence) => {
                        fault = true;
                        tracing::error!(instrument = own.name, "{sentence}");
                    }
                }
            }
            recorded += self.record(own, batch, now)?;
        }
        let due = self
            .settler
            .next_due()
            .map(|due| due.saturating_sub(now.uptime));
        let mut next = due.unwrap_or(own.rescan).min(own.rescan);
        if fault {
            next = next.max(AFTER_FAULT);
        }
        Ok(Looked {
            recorded,
            next,
            unreadable,
            settling: due.is_some(),
        })
    }

    fn learn(&mut self, own: &Instrument) -> Result<(), LedgerError> {
        if self.known.is_some() {
            return Ok(());
        }
        let ledger = self.ledger.lock();
        let mut known = HashMap::new();
        for row in ledger.read().files(&own.name)? {
            let dealt = row
                .export
                .map(|e| ledger.read().dealt_with(e))
                .transpose()?;
            let shown = shown_of(own, &row.path);
            let mark = mark(own, plan_of(&self.config.plans, &own.name, &shown));
            let stale = dealt.is_some_and(|d| d.mark != mark && !d.closed);
            let known_as = Known {
                stat: row.stat,
                export: row.export,
                attempts: row.attempts,
                stale,
                gone: row.gone,
            };
            known.insert(row.path, known_as);
        }
        self.known = Some(known);
        Ok(())
    }

    /// Paths that a full look no longer finds are not shown any more, until they come back.
    fn mark_gone(&mut self, own: &Instrument, seen: &HashSet<Vec<u8>>) -> Result<(), LedgerError> {
        let known = self.known.get_or_insert_default();
        let changed: Vec<(Vec<u8>, bool)> = known
            .iter()
            .filter(|(path, known)| seen.contains(*path) == known.gone)
            .map(|(path, known)| (path.clone(), !known.gone))
            .collect();
        if changed.is_empty() {
            return Ok(());
        }
        self.ledger.lock().write(|w| {
            changed
                .iter()
                .try_for_each(|(path, gone)| w.mark_gone(&own.name, path, *gone))
        })?;
        for (path, gone) in changed {
            if let Some(known) = known.get_mut(&path) {
                known.gone = gone;
            }
        }
        Ok(())
    }

    fn worth_reading(&mut self, file: &Found, now: Now) -> bool {
        let path = &bytes_of(&file.path);
        let known = self.known.as_ref().and_then(|k| k.get(path));
        let dealt_with =
            known.is_some_and(|k| k.stat == file.stat && k.export.is_some() && !k.stale);
        !dealt_with && self.settler.observe(path, file.stat, now.uptime)
    }

    /// Reads a file; `None` when it is not to be recorded now (it changed meanwhile, or is gone).
    fn prepare<'a>(
        &mut self,
        own: &Instrument,
        config: &'a Config,
        found: Found,
        now: Now,
    ) -> Result<Option<Prepared<'a>>, String> {
        let key = bytes_of(&found.path);
        self.settler.forget(&key);
        let bound = own.rule.bounds.file_bytes;
        let bytes = match file::read_still(&found.path, &found.stat, bound) {
            file::Content::Bytes(bytes) => Ok(bytes),
            file::Content::TooLarge => Err(file::too_large(found.stat.size, bound)),
            file::Content::Changed => return Ok(None),
            file::Content::Unreadable(error)
                if error.kind() == std::io::ErrorKind::PermissionDenied =>
            {
                Err(file::forbidden())
            }
            file::Content::Unreadable(error) => {
                tracing::warn!(instrument = own.name, export = found.shown, %error, "export cannot be read yet");
                return Ok(None);
            }
        };
        let plan = plan_of(&config.plans, &own.name, &found.shown);
        let mark = mark(own, plan);
        let known = self.known.as_ref().and_then(|k| k.get(&key)).copied();
        let (before, sha256, raw, outcome) = match bytes {
            Err(refused) => (Before::Nothing, [0; 32], None, Err(refused)),
            Ok(bytes) => {
                let sha256: Digest = Sha256::digest(&bytes).into();
                let before = self.before(known, &sha256, &mark)?;
                if let Err(export) = before {
                    return Ok(Some(Prepared {
                        found,
                        content: Content::Touched { export },
                    }));
                }
                let attempts = known
                    .filter(|k| k.stat == found.stat)
                    .map_or(0, |k| k.attempts);
                let outcome = match self.parse(own, &found.shown, &bytes) {
                    Parse::Done(outcome) => match plan {
                        Some(plan) => {
                            let latest = plausible::latest(now, &config.site.zone);
                            outcome.map(|parsed| plausible::sift(parsed, plan, latest))
                        }
                        None => outcome,
                    },
                    Parse::Died(_) if attempts + 1 < STRIKES => {
                        let content = Content::Struck {
                            attempts: attempts + 1,
                        };
                        return Ok(Some(Prepared { found, content }));
                    }
                    Parse::Died(how) => Err(workbook::refusal(&how, STRIKES)),
                    Parse::Machine(sentence) => return Err(sentence),
                };
                let raw = plan.map(|_| PackedExport::new(&bytes)).transpose();
                let raw = raw.map_err(|e| format!("`{}` could not be packed: {e}", found.shown))?;
                (before.unwrap_or(Before::Nothing), sha256, raw, outcome)
            }
        };
        Ok(Some(Prepared {
            found,
            content: Content::New {
                before,
                mark,
                sha256,
                raw,
                plan,
                outcome,
            },
        }))
    }

    /// What this path brought before; `Err` with the export when there is nothing new to read.
    fn before(
        &self,
        known: Option<Known>,
        sha256: &Digest,
        mark: &str,
    ) -> Result<Result<Before, i64>, String> {
        let Some(export) = known.and_then(|k| k.export) else {
            return Ok(Ok(Before::Nothing));
        };
        let dealt = self
            .ledger
            .lock()
            .read()
            .dealt_with(export)
            .map_err(|e| chain(&e))?;
        Ok(match dealt.sha256 == *sha256 {
            true if dealt.mark == mark || dealt.closed => Err(export),
            true => Ok(Before::SameBytes(export)),
            false => Ok(Before::OtherBytes(export)),
        })
    }

    fn parse(&mut self, own: &Instrument, shown: &str, bytes: &[u8]) -> Parse {
        if !restudy_parsers::is_workbook(bytes) {
            return Parse::Done(self.reader.read(Export { path: shown, bytes }));
        }
        match self
            .workbooks
            .read(shown, bytes, &Ask::Rule(Box::new(own.rule.clone())))
        {
            Ok(outcome) => Parse::Done(outcome),
            Err(workbook::Failure::Died(how)) => Parse::Died(how),
            Err(workbook::Failure::CannotStart(e)) => {
                Parse::Machine(format!("the workbook reader could not be started: {e}"))
            }
        }
    }

    fn record(
        &mut self,
        own: &Instrument,
        batch: Vec<Prepared<'_>>,
        now: Now,
    ) -> Result<usize, LedgerError> {
        if batch.is_empty() {
            return Ok(0);
        }
        let together: Result<Vec<_>, LedgerError> = self.ledger.lock().write(|w| {
            batch
                .iter()
                .map(|prepared| record_one(w, own, prepared, now))
                .collect()
        });
        match together {
            Ok(dealt) => {
                for (prepared, dealt) in batch.iter().zip(dealt) {
                    self.note(own, prepared, dealt);
                }
                Ok(batch.len())
            }
            Err(error) if batch.len() == 1 => Err(error),
            Err(_) => self.record_one_by_one(own, &batch, now),
        }
    }

    /// A file that cannot be recorded costs only itself.
    fn record_one_by_one(
        &mut self,
        own: &Instrument,
        batch: &[Prepared<'_>],
        now: Now,
    ) -> Result<usize, LedgerError> {
        let mut recorded = 0;
        let mut failure = None;
        for prepared in batch {
            let alone = self
                .ledger
                .lock()
                .write(|w| record_one(w, own, prepared, now));
            match alone {
                Ok(dealt) => {
                    recorded += 1;
                    self.note(own, prepared, dealt);
                }
                Err(error) => {
                    let (instrument, export) = (own.name.as_str(), prepared.found.shown.as_str());
                    tracing::error!(instrument, export, error = %chain(&error), "cannot be recorded");
                    failure = Some(error);
                }
            }
        }
        match failure {
            Some(error) if recorded == 0 => Err(error),
            _ => Ok(recorded),
        }
    }

    fn note(
        &mut self,
        own: &Instrument,
        prepared: &Prepared<'_>,
        (export, attempts): (Option<i64>, u32),
    ) {
        let stat = prepared.found.stat;
        let known = Known {
            stat,
            export,
            attempts,
            stale: false,
            gone: false,
        };
        self.known
            .get_or_insert_default()
            .insert(bytes_of(&prepared.found.path), known);
        if let Content::New { plan, outcome, .. } = &prepared.content {
            say(own, &prepared.found.shown, *plan, outcome);
        }
    }
}

enum Parse {
    Done(Result<Parsed, Refused>),
    Died(String),
    Machine(String),
}

/// The first plan that takes an instrument's export of that path.
#[must_use]
pub fn plan_of<'a>(plans: &'a [Plan], instrument: &str, shown: &str) -> Option<&'a Plan> {
    plans.iter().find(|plan| {
        plan.instruments.iter().any(|i| i == instrument)
            && plan.only.as_ref().is_none_or(|only| only.is_match(shown))
    })
}

/// What an export's reading depends on beside its bytes: the rule, the plan that takes it, that plan's list.
fn mark(own: &Instrument, plan: Option<&Plan>) -> String {
    let mut digest = Sha256::new();
    digest.update(&own.rule_mark);
    if let Some(plan) = plan {
        digest.update(format!("\0{}", plan.name));
        for characteristic in plan.characteristics.iter().filter(|_| plan.whole_list) {
            digest.update(format!("\0{}", characteristic.name));
        }
    }
    hex(&digest.finalize()[..16])
}

fn bytes_of(path: &Path) -> Vec<u8> {
    path.as_os_str().as_bytes().to_vec()
}

/// A recorded path as people and `path` roles see it.
fn shown_of(own: &Instrument, path: &[u8]) -> String {
    let path = Path::new(OsStr::from_bytes(path));
    let root = own.folders.iter().find(|root| path.starts_with(root));
    root.map_or_else(
        || path.to_string_lossy().into_owned(),
        |root| shown(root, path),
    )
}

fn look_through(own: &Instrument) -> (Vec<Found>, Vec<Unreadable>) {
    let mut all = (Vec::new(), Vec::new());
    for folder in &own.folders {
        let (found, unreadable) = walk(folder, &own.files);
        all.0.extend(found);
        all.1.extend(unreadable);
    }
    all
}

fn record_one(
    w: &Write<'_>,
    own: &Instrument,
    prepared: &Prepared<'_>,
    now: Now,
) -> Result<(Option<i64>, u32), LedgerError> {
    let path = &bytes_of(&prepared.found.path);
    let (export, attempts) = match &prepared.content {
        Content::Touched { export } => (Some(*export), 0),
        Content::Struck { attempts } => (None, *attempts),
        Content::New {
            before,
            mark,
            sha256,
            raw,
            plan,
            outcome,
        } => {
            if let Some(raw) = raw {
                w.keep_raw(sha256, raw)?;
            }
            let mut new = NewExport {
                instrument: &own.name,
                path,
                shown: &prepared.found.shown,
                sha256,
                mark,
                arrived: now.utc,
                plan: plan.map(|p| p.name.as_str()),
                state: ExportState::Read,
                refusal: None,
                readings: 0,
                unplanned: 0,
            };
            (
                Some(merge::record(w, &mut new, *plan, outcome, *before)?),
                0,
            )
        }
    };
    w.put_file(&own.name, path, &prepared.found.stat, export, attempts)?;
    Ok((export, attempts))
}

fn say(own: &Instrument, export: &str, plan: Option<&Plan>, outcome: &Result<Parsed, Refused>) {
    let instrument = own.name.as_str();
    if plan.is_none() {
        tracing::debug!(instrument, export, "export is not for a plan");
        return;
    }
    match outcome {
        Ok(parsed) => {
            let (runs, readings) = (parsed.runs.len(), parsed.readings.len());
            tracing::debug!(instrument, export, runs, readings, "export read");
            if let Some(first) = parsed.set_aside.first() {
                let (hint, all) = (first.hint.as_deref(), parsed.set_aside.len());
                tracing::warn!(instrument, export, hint, all, "set aside: {}", first.reason);
            }
        }
        Err(refused) => {
            let hint = refused.hint.as_deref();
            tracing::warn!(
                instrument,
                export,
                hint,
                "export refused: {}",
                refused.sentence
            );
        }
    }
}
