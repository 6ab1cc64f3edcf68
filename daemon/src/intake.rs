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
pub mod request;
pub mod workbook;

use std::collections::HashMap;
use std::os::unix::ffi::OsStrExt as _;
use std::sync::Arc;
use std::time::{Duration, Instant};

use restudy_config::{Config, Instrument, Plan};
use restudy_parsers::{Export, Parsed, Reader, Refused};
use sha2::{Digest as _, Sha256};

use crate::ledger::{
    Digest, ExportState, LedgerError, NewExport, PackedExport, SharedLedger, Stat, Write,
};
use crate::now::Now;
use crate::settle::Settler;
use crate::watch::walk::{Found, Unreadable, walk};
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
    /// Read by a rule that has changed since, with something refused or set aside: worth another reading.
    stale: bool,
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
        let mut ready: Vec<Found> = found
            .into_iter()
            .filter(|file| self.worth_reading(file, now))
            .collect();
        self.settler.keep_only_seen_at(now.uptime);
        ready.sort_by_key(|f| (f.stat.mtime, f.path.clone()));

        let mut recorded = 0;
        let mut fault = false;
        let mut ready = ready.into_iter().peekable();
        while ready.peek().is_some() && !stop() {
            let mut batch = Vec::new();
            let started = Instant::now();
            while batch.len() < BATCH_FILES && started.elapsed() < BATCH_TIME && !stop() {
                let Some(file) = ready.next() else { break };
                match self.prepare(own, &config.plans, file) {
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
            let stale = dealt.is_some_and(|d| d.rule_mark != own.rule_mark && !d.clean);
            known.insert(
                row.path,
                Known {
                    stat: row.stat,
                    export: row.export,
                    attempts: row.attempts,
                    stale,
                },
            );
        }
        self.known = Some(known);
        Ok(())
    }

    fn worth_reading(&mut self, file: &Found, now: Now) -> bool {
        let path = file.path.as_os_str().as_bytes();
        let known = self.known.as_ref().and_then(|k| k.get(path));
        let dealt_with =
            known.is_some_and(|k| k.stat == file.stat && k.export.is_some() && !k.stale);
        !dealt_with && self.settler.observe(path, file.stat, now.uptime)
    }

    /// Reads a file; `None` when it is not to be recorded now (it changed meanwhile, or is gone).
    fn prepare<'a>(
        &mut self,
        own: &Instrument,
        plans: &'a [Plan],
        found: Found,
    ) -> Result<Option<Prepared<'a>>, String> {
        let key = found.path.as_os_str().as_bytes().to_vec();
        self.settler.forget(&key);
        let bound = own.rule.bounds.file_bytes;
        let bytes = match file::read_still(&found.path, &found.stat, bound) {
            file::Content::Bytes(bytes) => Ok(bytes),
            file::Content::TooLarge => Err(file::too_large(found.stat.size, bound)),
            file::Content::Changed => return Ok(None),
            file::Content::Unreadable(error) => {
                tracing::warn!(instrument = own.name, export = found.shown, %error, "export cannot be read yet");
                return Ok(None);
            }
        };
        let plan = plans.iter().find(|p| {
            p.instruments.contains(&own.name)
                && p.only
                    .as_ref()
                    .is_none_or(|only| only.is_match(&found.shown))
        });
        let known = self.known.as_ref().and_then(|k| k.get(&key)).copied();
        let (sha256, raw, outcome) = match bytes {
            Err(refused) => ([0; 32], None, Err(refused)),
            Ok(bytes) => {
                let sha256: Digest = Sha256::digest(&bytes).into();
                if let Some(export) = self.same_content(own, known, &sha256)? {
                    return Ok(Some(Prepared {
                        found,
                        content: Content::Touched { export },
                    }));
                }
                let attempts = known
                    .filter(|k| k.stat == found.stat)
                    .map_or(0, |k| k.attempts);
                let outcome = match self.parse(own, &found.shown, &bytes) {
                    Parse::Done(outcome) => outcome,
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
                (sha256, raw, outcome)
            }
        };
        Ok(Some(Prepared {
            found,
            content: Content::New {
                sha256,
                raw,
                plan,
                outcome,
            },
        }))
    }

    /// The export that this path already is, when its bytes and the rule are the same.
    fn same_content(
        &self,
        own: &Instrument,
        known: Option<Known>,
        sha256: &Digest,
    ) -> Result<Option<i64>, String> {
        let Some(export) = known.and_then(|k| k.export) else {
            return Ok(None);
        };
        let dealt = self
            .ledger
            .lock()
            .read()
            .dealt_with(export)
            .map_err(|e| e.to_string())?;
        Ok(
            (dealt.sha256 == *sha256 && (dealt.rule_mark == own.rule_mark || dealt.clean))
                .then_some(export),
        )
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
        let dealt: Vec<(Option<i64>, u32)> = self.ledger.lock().write(|w| {
            batch
                .iter()
                .map(|prepared| record_one(w, own, prepared, now))
                .collect::<Result<_, LedgerError>>()
        })?;
        let mut recorded = 0;
        for (prepared, (export, attempts)) in batch.iter().zip(dealt) {
            let path = prepared.found.path.as_os_str().as_bytes().to_vec();
            let known = Known {
                stat: prepared.found.stat,
                export,
                attempts,
                stale: false,
            };
            self.known.get_or_insert_default().insert(path, known);
            if let Content::New { plan, outcome, .. } = &prepared.content {
                recorded += 1;
                say(own, &prepared.found.shown, *plan, outcome);
            }
        }
        Ok(recorded)
    }
}

enum Parse {
    Done(Result<Parsed, Refused>),
    Died(String),
    Machine(String),
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
    let path = prepared.found.path.as_os_str().as_bytes();
    let (export, attempts) = match &prepared.content {
        Content::Touched { export } => (Some(*export), 0),
        Content::Struck { attempts } => (None, *attempts),
        Content::New {
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
                rule_mark: &own.rule_mark,
                arrived: now.utc,
                plan: plan.map(|p| p.name.as_str()),
                state: ExportState::Read,
                refusal: None,
                readings: 0,
                unplanned: 0,
            };
            (Some(merge::record(w, &mut new, *plan, outcome)?), 0)
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
            for aside in &parsed.set_aside {
                let hint = aside.hint.as_deref();
                tracing::warn!(instrument, export, hint, "set aside: {}", aside.reason);
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
