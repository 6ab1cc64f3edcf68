//! What watching knows of each path.

use rusqlite::params;

use super::{LedgerError, Read, Write};

/// What a look at a file shows without opening it; compared for difference, never for newer.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Stat {
    /// Bytes.
    pub size: u64,
    /// Modification time, ns since 1970.
    pub mtime: i64,
    /// Time of the last change of the file or its entry, ns since 1970.
    pub ctime: i64,
    /// Device number.
    pub device: u64,
    /// Inode number.
    pub inode: u64,
}

/// A path whose content was dealt with.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct FileRow {
    /// Bytes of the absolute path.
    pub path: Vec<u8>,
    /// How it looked then.
    pub stat: Stat,
    /// The export that its content became.
    pub export: Option<i64>,
    /// Readers of this content that died.
    pub attempts: u32,
    /// A full look no longer found it.
    pub gone: bool,
}

impl Read<'_> {
    /// Every known path of an instrument.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn files(&self, instrument: &str) -> Result<Vec<FileRow>, LedgerError> {
        let mut statement = self.connection.prepare_cached(
            "SELECT path, size, mtime, ctime, device, inode, export, attempts, gone FROM file WHERE instrument = ?1",
        )?;
        let rows = statement.query_map([instrument], |r| {
            Ok(FileRow {
                path: r.get(0)?,
                stat: Stat {
                    size: r.get::<_, i64>(1)?.cast_unsigned(),
                    mtime: r.get(2)?,
                    ctime: r.get(3)?,
                    device: r.get::<_, i64>(4)?.cast_unsigned(),
                    inode: r.get::<_, i64>(5)?.cast_unsigned(),
                },
                export: r.get(6)?,
                attempts: r.get(7)?,
                gone: r.get(8)?,
            })
        })?;
        Ok(rows.collect::<Result<_, _>>()?)
    }
}

impl Write<'_> {
    /// Records how a path looked when its content became `export`; `None`: it is still owed a reading.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn put_file(
        &self,
        instrument: &str,
        path: &[u8],
        stat: &Stat,
        export: Option<i64>,
        attempts: u32,
    ) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached(
                "INSERT INTO file (instrument, path, size, mtime, ctime, device, inode, export, attempts)
                 VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9)
                 ON CONFLICT (instrument, path) DO UPDATE SET size = excluded.size, mtime = excluded.mtime,
                   ctime = excluded.ctime, device = excluded.device, inode = excluded.inode,
                   export = excluded.export, attempts = excluded.attempts, gone = 0",
            )?
            .execute(params![
                instrument,
                path,
                stat.size.cast_signed(),
                stat.mtime,
                stat.ctime,
                stat.device.cast_signed(),
                stat.inode.cast_signed(),
                export,
                attempts
            ])?;
        Ok(())
    }

    /// Records that a full look no longer finds a path, or finds it again. What it brought stays.
    ///
    /// # Errors
    /// The database's refusal.
    pub fn mark_gone(&self, instrument: &str, path: &[u8], gone: bool) -> Result<(), LedgerError> {
        self.transaction
            .prepare_cached("UPDATE file SET gone = ?3 WHERE instrument = ?1 AND path = ?2")?
            .execute(params![instrument, path, gone])?;
        Ok(())
    }
}
