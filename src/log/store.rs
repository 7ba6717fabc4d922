//! The file of the log: opened, made, appended to.

use super::{
    Draft, LogError,
    entry::Kind,
    schema::{APPLICATION_ID, TABLES, VERSION},
};
use rusqlite::{Connection, OpenFlags, OptionalExtension, Transaction, TransactionBehavior};
use std::{
    path::{Path, PathBuf},
    time::Duration,
};

/// How long a writer waits for others. An entry takes milliseconds, a slow network disk some seconds.
pub(super) const PATIENCE: Duration = Duration::from_secs(60);

/// Pause before the change to write-ahead mode is tried again; there SQLite does not wait by itself.
const PAUSE: Duration = Duration::from_millis(20);

/// An append-only log in one SQLite file.
///
/// Any number of programs may read and append at once. What [`Log::append`] has answered is on the disk.
#[derive(Debug)]
pub struct Log {
    pub(super) connection: Connection,
    pub(super) path: PathBuf,
}

/// A new entry, safely on the disk.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Appended {
    /// Its number.
    pub entry: u64,
    /// Its hash: the head of the chain until the next entry.
    pub sha256: String,
}

impl Log {
    /// Opens a log for appending; makes it where there is none.
    ///
    /// # Errors
    /// [`LogError`]; a file that is something else is left as it is.
    pub fn open(path: &Path) -> Result<Self, LogError> {
        let failed = |error: rusqlite::Error| LogError::of(path, &error);
        let flags = OpenFlags::SQLITE_OPEN_READ_WRITE | OpenFlags::SQLITE_OPEN_CREATE | OpenFlags::SQLITE_OPEN_NO_MUTEX;
        let connection = Connection::open_with_flags(path, flags).map_err(failed)?;
        let mut log = Self { connection, path: path.to_owned() };
        log.connection.busy_timeout(PATIENCE).map_err(failed)?;
        let is_new = log.is_new()?;
        log.write_ahead()?;
        // An acknowledged entry must outlive a power cut.
        log.connection.pragma_update(None, "synchronous", "FULL").map_err(failed)?;
        if is_new {
            log.make_tables()?;
        }
        Ok(log)
    }

    /// Opens a log for reading; it must be there.
    ///
    /// # Errors
    /// [`LogError`].
    pub fn read(path: &Path) -> Result<Self, LogError> {
        if !path.is_file() {
            return Err(LogError::Missing { path: path.to_owned() });
        }
        let flags = OpenFlags::SQLITE_OPEN_READ_ONLY | OpenFlags::SQLITE_OPEN_NO_MUTEX;
        let connection = Connection::open_with_flags(path, flags).map_err(|error| LogError::of(path, &error))?;
        let log = Self { connection, path: path.to_owned() };
        log.connection.busy_timeout(PATIENCE).map_err(|error| log.failed(&error))?;
        match log.is_new() {
            Ok(false) => Ok(log),
            Ok(true) => Err(LogError::NotALog { path: path.to_owned() }),
            // Read-ahead mode wants to write a file beside the log; where nobody can write, nobody can change the log either.
            Err(LogError::CannotOpen { .. } | LogError::ReadOnly { .. }) if !beside(path, "-wal").exists() => Self::unchanging(path),
            Err(error) => Err(error),
        }
    }

    /// Opens a log on a medium that nobody writes to.
    fn unchanging(path: &Path) -> Result<Self, LogError> {
        let escaped = path.to_string_lossy().replace('%', "%25").replace('?', "%3f").replace('#', "%23");
        let flags = OpenFlags::SQLITE_OPEN_READ_ONLY | OpenFlags::SQLITE_OPEN_NO_MUTEX | OpenFlags::SQLITE_OPEN_URI;
        let connection =
            Connection::open_with_flags(format!("file:{escaped}?immutable=1"), flags).map_err(|error| LogError::of(path, &error))?;
        let log = Self { connection, path: path.to_owned() };
        if log.is_new()? { Err(LogError::NotALog { path: path.to_owned() }) } else { Ok(log) }
    }

    /// Enters a draft as the next entry; `time` is now, RFC 3339 in UTC with milliseconds.
    ///
    /// When this returns `Ok`, the entry is on the disk. On an error nothing was entered.
    ///
    /// # Errors
    /// [`LogError`]; for a correction also when its entry is not there.
    pub fn append(&mut self, draft: &Draft, time: &str) -> Result<Appended, LogError> {
        let path = self.path.clone();
        let failed = |error: rusqlite::Error| LogError::of(&path, &error);
        let transaction = self.connection.transaction_with_behavior(TransactionBehavior::Immediate).map_err(failed)?;
        let (count, head) = head(&transaction).map_err(failed)?;
        if let (Kind::Correction, Some(entry)) = (draft.entry.kind, draft.entry.corrects)
            && !(1..=count).contains(&entry)
        {
            return Err(LogError::NoEntry { path, entry, count });
        }
        let mut entry = draft.entry.clone();
        (entry.entry, entry.previous, entry.time) = (count + 1, head, time.to_owned());
        let (body, sha256) = entry.sealed();
        insert(&transaction, entry.entry, &sha256, &body, draft).map_err(failed)?;
        transaction.commit().map_err(failed)?;
        Ok(Appended { entry: entry.entry, sha256 })
    }

    pub(super) fn failed(&self, error: &rusqlite::Error) -> LogError {
        LogError::of(&self.path, error)
    }

    /// Whether the file is empty; anything but an empty file or a log is an error.
    fn is_new(&self) -> Result<bool, LogError> {
        let number = |name: &str| self.connection.pragma_query_value(None, name, |row| row.get::<_, i64>(0));
        let all = || {
            let tables: i64 = self.connection.query_row("SELECT count(*) FROM sqlite_schema", [], |row| row.get(0))?;
            Ok((number("application_id")?, number("user_version")?, tables))
        };
        match all().map_err(|error| self.failed(&error))? {
            (0, 0, 0) => Ok(true),
            (APPLICATION_ID, VERSION, _) => Ok(false),
            (APPLICATION_ID, found, _) if found > VERSION => Err(LogError::Newer { path: self.path.clone(), found, known: VERSION }),
            _ => Err(LogError::NotALog { path: self.path.clone() }),
        }
    }

    /// Write-ahead mode: readers never wait for writers, and a torn write is undone by itself.
    fn write_ahead(&self) -> Result<(), LogError> {
        let mut waited = Duration::ZERO;
        loop {
            match self.connection.pragma_update_and_check(None, "journal_mode", "WAL", |row| row.get::<_, String>(0)) {
                Ok(_) => return Ok(()),
                Err(error) => match self.failed(&error) {
                    LogError::Busy { .. } if waited < PATIENCE => {
                        std::thread::sleep(PAUSE);
                        waited += PAUSE;
                    }
                    other => return Err(other),
                },
            }
        }
    }

    /// Makes the tables, unless another program was quicker.
    fn make_tables(&mut self) -> Result<(), LogError> {
        let path = self.path.clone();
        let failed = |error: rusqlite::Error| LogError::of(&path, &error);
        let transaction = self.connection.transaction_with_behavior(TransactionBehavior::Immediate).map_err(failed)?;
        let made: Option<i64> =
            transaction.query_row("SELECT 1 FROM sqlite_schema WHERE name = 'head'", [], |row| row.get(0)).optional().map_err(failed)?;
        if made.is_none() {
            transaction.execute_batch(TABLES).map_err(failed)?;
            transaction.pragma_update(None, "application_id", APPLICATION_ID).map_err(failed)?;
            transaction.pragma_update(None, "user_version", VERSION).map_err(failed)?;
        }
        transaction.commit().map_err(failed)
    }
}

fn insert(transaction: &Transaction<'_>, sequence: u64, sha256: &str, body: &str, draft: &Draft) -> rusqlite::Result<()> {
    transaction.prepare_cached("INSERT INTO entry (sequence, sha256, body) VALUES (?1, ?2, ?3)")?.execute((sequence, sha256, body))?;
    if let Some(result) = &draft.result {
        transaction.prepare_cached("INSERT INTO result (sequence, json) VALUES (?1, ?2)")?.execute((sequence, result))?;
    }
    if let (Some(text), Some(bench)) = (&draft.bench_text, &draft.entry.bench) {
        let known = transaction.prepare_cached("SELECT 1 FROM document WHERE sha256 = ?1")?.exists([&bench.sha256])?;
        if !known {
            transaction.prepare_cached("INSERT INTO document (sha256, text) VALUES (?1, ?2)")?.execute((&bench.sha256, text))?;
        }
    }
    transaction.prepare_cached("UPDATE head SET count = ?1, sha256 = ?2")?.execute((sequence, sha256)).map(drop)
}

/// Number of entries and hash of the last one.
pub(super) fn head(connection: &Connection) -> rusqlite::Result<(u64, String)> {
    connection.query_row("SELECT count, sha256 FROM head", [], |row| Ok((row.get(0)?, row.get(1)?)))
}

/// The file with an ending after its whole name.
fn beside(path: &Path, ending: &str) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(ending);
    PathBuf::from(name)
}
