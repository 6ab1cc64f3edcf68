//! Exports: one content under one path, read once by one rule.

use std::io::{Read as _, Write as _};

use flate2::{Compression, read::ZlibDecoder, write::ZlibEncoder};
use restudy_parsers::SetAside;
use rusqlite::{OptionalExtension, params};

use super::{LedgerError, Read, Write};

/// SHA-256 of a file's bytes.
pub type Digest = [u8; 32];

/// What became of an export as a whole.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ExportState {
    /// Its runs and what was set aside are recorded.
    Read,
    /// It could not be read as its rule says.
    Refused,
    /// It was read and counted; no plan takes it.
    NoPlan,
}

impl ExportState {
    fn as_str(self) -> &'static str {
        match self {
            Self::Read => "read",
            Self::Refused => "refused",
            Self::NoPlan => "no plan",
        }
    }
}

/// An export about to be recorded.
#[derive(Debug, Clone)]
pub struct NewExport<'a> {
    /// Whose it is.
    pub instrument: &'a str,
    /// Bytes of the absolute path.
    pub path: &'a [u8],
    /// Path below the watched folder, for people.
    pub shown: &'a str,
    /// Of all its bytes.
    pub sha256: &'a Digest,
    /// The rule, plan and list it was read by.
    pub mark: &'a str,
    /// ms since 1970.
    pub arrived: i64,
    /// The plan that takes it.
    pub plan: Option<&'a str>,
    /// What became of it.
    pub state: ExportState,
    /// Why it was refused, and what could be done.
    pub refusal: Option<(&'a str, Option<&'a str>)>,
    /// Every reading met in it.
    pub readings: usize,
    /// Of these: of characteristics that the plan's list does not name.
    pub unplanned: usize,
}

/// How a known path's content was dealt with.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct DealtWith {
    /// Of its bytes.
    pub sha256: Digest,
    /// The rule, plan and list it was read by.
    pub mark: String,
    /// True when a closed round has a run of it: its reading stands.
    pub closed: bool,
}

impl Read<'_> {
    /// How an export was dealt with.
    ///
    /// # Errors
    /// The database's refusal, or a digest of another length.
    pub fn dealt_with(&self, export: i64) -> Result<DealtWith, LedgerError> {
        let (sha256, mark, closed): (Vec<u8>, String, bool) = self
            .connection
            .prepare_cached(
                "SELECT sha256, rule_mark, EXISTS
                   (SELECT 1 FROM delivery JOIN run ON run.id = delivery.run
                      JOIN round ON round.id = run.round
                    WHERE delivery.export = export.id AND round.state IN ('complete', 'unfinished'))
                 FROM export WHERE id = ?1",
            )?
            .query_row([export], |r| Ok((r.get(0)?, r.get(1)?, r.get(2)?)))?;
        let sha256 = sha256
            .try_into()
            .map_err(|_| LedgerError::Damaged("digest".into()))?;
        Ok(DealtWith {
            sha256,
            mark,
            closed,
        })
    }

    /// The kept bytes of an export.
    ///
    /// # Errors
    /// The database's refusal, or bytes that do not inflate.
    pub fn raw(&self, sha256: &Digest) -> Result<Option<Vec<u8>>, LedgerError> {
        let packed: Option<Vec<u8>> = self
            .connection
            .prepare_cached("SELECT packed FROM raw WHERE sha256 = ?1")?
            .query_row([&sha256[..]], |r| r.get(0))
            .optional()?;
        let Some(packed) = packed else {
            return Ok(None);
        };
        let mut bytes = Vec::new();
        ZlibDecoder::new(&packed[..])
            .read_to_end(&mut bytes)
            .map_err(|_| LedgerError::Damaged("raw export".into()))?;
        Ok(Some(bytes))
    }

    /// Path and digest of the exports whose runs a round used, in order of arrival.
    ///
    /// # Errors
    /// The database's refusal, or a digest of another length.
    pub fn sources(&self, round: i64) -> Result<Vec<(String, Digest)>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT DISTINCT export.id, export.shown, export.sha256
             FROM run JOIN delivery ON delivery.run = run.id JOIN export ON export.id = delivery.export
             WHERE run.round = ?1 AND run.status = 'used' ORDER BY export.id",
        )?;
        let rows = statement.query_map([round], |r| Ok((r.get(1)?, r.get::<_, Vec<u8>>(2)?)))?;
        rows.map(|row| {
            let (shown, digest) = row?;
            let digest = digest
                .try_into()
                .map_err(|_| LedgerError::Damaged("digest".into()))?;
            Ok((shown, digest))
        })
        .collect()
    }
}

/// Bytes of an export, packed for keeping: the slow half of recording it, done before the transaction.
pub struct PackedExport {
    size: usize,
    packed: Vec<u8>,
}

impl PackedExport {
    /// Compresses.
    ///
    /// # Errors
    /// None in practice: the memory writer's.
    pub fn new(bytes: &[u8]) -> std::io::Result<Self> {
        let mut encoder = ZlibEncoder::new(Vec::new(), Compression::fast());
        encoder.write_all(bytes)?;
        Ok(Self {
            size: bytes.len(),
            packed: encoder.finish()?,
        })
    }
}

impl Write<'_> {
    /// Keeps an export's bytes, once per digest.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn keep_raw(&self, sha256: &Digest, raw: &PackedExport) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached("INSERT OR IGNORE INTO raw (sha256, size, packed) VALUES (?1, ?2, ?3)")?
            .execute(params![&sha256[..], raw.size as i64, raw.packed])?;
        Ok(())
    }

    /// Records an export; answers with its number.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn add_export(&self, new: &NewExport<'_>) -> Result<i64, LedgerError> {
        let (sentence, hint) = new.refusal.map_or((None, None), |(s, h)| (Some(s), h));
        self.transaction
            .prepare_cached(
                "INSERT INTO export (instrument, path, shown, sha256, rule_mark, arrived, plan, state,
                   sentence, hint, readings, unplanned)
                 VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10, ?11, ?12)",
            )?
            .execute(params![
                new.instrument,
                new.path,
                new.shown,
                &new.sha256[..],
                new.mark,
                new.arrived,
                new.plan,
                new.state.as_str(),
                sentence,
                hint,
                new.readings as i64,
                new.unplanned as i64,
            ])?;
        Ok(self.transaction.last_insert_rowid())
    }

    /// Records what of an export could not be used.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn add_set_aside(&self, export: i64, aside: &SetAside) -> Result<(), LedgerError> {
        let run = aside.run.as_ref().map(serde_json::to_string).transpose();
        let run = run.map_err(|_| LedgerError::Damaged("run".into()))?;
        self.transaction
            .prepare_cached(
                "INSERT INTO set_aside (export, place, found, expected, hint, reason, run, readings)
                 VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8)",
            )?
            .execute(params![
                export,
                aside.place,
                aside.found,
                aside.expected,
                aside.hint,
                aside.reason,
                run,
                aside.readings as i64,
            ])?;
        Ok(())
    }

    /// Takes back what an export brought: its bytes are read anew, by another rule.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn take_back(&self, export: i64) -> Result<(), LedgerError> {
        for statement in [
            "DELETE FROM delivery WHERE export = ?1",
            "DELETE FROM set_aside WHERE export = ?1",
            "UPDATE export SET state = 'replaced', readings = 0, unplanned = 0 WHERE id = ?1",
        ] {
            self.transaction
                .prepare_cached(statement)?
                .execute([export])?;
        }
        Ok(())
    }
}
