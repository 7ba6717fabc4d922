//! Why the log cannot be written or read.

use rusqlite::ErrorCode;
use std::path::{Path, PathBuf};

/// Why the log cannot be written or read. Nothing is half written in any of these cases.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum LogError {
    /// The file is not there.
    #[error("{}: there is no such log; check the name (spotrule measure --log makes a new one)", path.display())]
    Missing {
        /// The file.
        path: PathBuf,
    },
    /// The file is something else.
    #[error("{}: this is no log of spotrule; choose another file, this one is left as it is", path.display())]
    NotALog {
        /// The file.
        path: PathBuf,
    },
    /// Written by a newer version.
    #[error("{}: the log has format {found}, this program knows {known}; use a newer spotrule", path.display())]
    Newer {
        /// The file.
        path: PathBuf,
        /// Its format.
        found: i64,
        /// Ours.
        known: i64,
    },
    /// The file or its folder cannot be opened.
    #[error("{}: the log cannot be opened ({cause}); its folder must exist and you must be allowed to write in it", path.display())]
    CannotOpen {
        /// The file.
        path: PathBuf,
        /// What SQLite says.
        cause: String,
    },
    /// May not be written.
    #[error("{}: the log cannot be written ({cause}); file and folder must be writable, for a -wal and a -shm file appear beside it while it is in use", path.display())]
    ReadOnly {
        /// The file.
        path: PathBuf,
        /// What SQLite says.
        cause: String,
    },
    /// No room.
    #[error("{}: the disk is full or a quota is used up, nothing was entered; make room and enter the result again (spotrule log add)", path.display())]
    DiskFull {
        /// The file.
        path: PathBuf,
    },
    /// The medium fails.
    #[error("{}: reading or writing failed ({cause}); look for a full disk, a quota, a limit on file sizes or a lost network drive; what was acknowledged is kept", path.display())]
    Medium {
        /// The file.
        path: PathBuf,
        /// What SQLite says.
        cause: String,
    },
    /// Others wrote for too long.
    #[error("{}: other programs kept the log busy for {seconds} s; try again, and look for a program that hangs", path.display())]
    Busy {
        /// The file.
        path: PathBuf,
        /// How long it was waited.
        seconds: u64,
    },
    /// The file is damaged.
    #[error("{}: the file is damaged ({cause}); keep it as it is, and go on with a copy of the last good backup", path.display())]
    Damaged {
        /// The file.
        path: PathBuf,
        /// What SQLite says.
        cause: String,
    },
    /// Anything else that SQLite reports.
    #[error("{}: the log cannot be used ({cause})", path.display())]
    Sqlite {
        /// The file.
        path: PathBuf,
        /// What it says.
        cause: String,
    },
    /// A result that is none.
    #[error("this is no result of spotrule ({cause}); enter files written by spotrule measure --json")]
    NoResult {
        /// Why.
        cause: String,
    },
    /// The bench file is another one.
    #[error("the bench file has SHA-256 {found}, the result was made with {stated}; give the bench file that was used")]
    OtherBench {
        /// Of the text given.
        found: String,
        /// In the result.
        stated: String,
    },
    /// An entry that is not there.
    #[error("{}: there is no entry {entry}; the log has {count}", path.display())]
    NoEntry {
        /// The file.
        path: PathBuf,
        /// Its number.
        entry: u64,
        /// How many there are.
        count: u64,
    },
    /// A correction without a reason.
    #[error("a correction needs a reason: --why \"wrong sample was in the holder\"")]
    NoReason,
}

impl LogError {
    /// What SQLite reported about a file, with what to do.
    pub(super) fn of(path: &Path, error: &rusqlite::Error) -> Self {
        let path = path.to_owned();
        let cause = error.to_string();
        match error.sqlite_error_code() {
            Some(ErrorCode::CannotOpen) => Self::CannotOpen { path, cause },
            Some(ErrorCode::ReadOnly | ErrorCode::PermissionDenied | ErrorCode::AuthorizationForStatementDenied) => {
                Self::ReadOnly { path, cause }
            }
            Some(ErrorCode::SystemIoFailure) => Self::Medium { path, cause },
            Some(ErrorCode::DiskFull) => Self::DiskFull { path },
            Some(ErrorCode::DatabaseBusy | ErrorCode::DatabaseLocked) => Self::Busy { path, seconds: super::store::PATIENCE.as_secs() },
            Some(ErrorCode::NotADatabase) => Self::NotALog { path },
            Some(ErrorCode::DatabaseCorrupt) => Self::Damaged { path, cause },
            _ => Self::Sqlite { path, cause },
        }
    }
}
