//! Why a command gives up, and the exit code that tells a script.

use crate::Error;
use std::{io::Write, path::PathBuf, process::ExitCode};

/// Nothing can honestly be said.
pub(super) const REFUSED: u8 = 1;
/// Wrong use or unreadable input.
pub(super) const WRONG_USE: u8 = 2;
/// Measured, outside the limits.
pub(super) const OUTSIDE: u8 = 3;
/// Measured, undecided.
pub(super) const UNDECIDED: u8 = 4;

/// Why a command gives up.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum Failure {
    /// A file could not be read.
    #[error("{}: cannot be read ({cause}); check the name and that you may read it", path.display())]
    Unreadable {
        /// The file.
        path: PathBuf,
        /// What the system says.
        cause: std::io::Error,
    },
    /// A file could not be written.
    #[error("{}: cannot be written ({cause}); choose a place where you may write", path.display())]
    Unwritable {
        /// The file.
        path: PathBuf,
        /// What the system says.
        cause: std::io::Error,
    },
    /// A file is there already.
    #[error("{}: exists already; give another name, or --force to replace it", path.display())]
    Exists {
        /// The file.
        path: PathBuf,
    },
    /// A file has an ending that says nothing.
    #[error("{}: the ending decides the format; use one of {endings}", path.display())]
    UnknownEnding {
        /// The file.
        path: PathBuf,
        /// Endings that are known.
        endings: &'static str,
    },
    /// The measurement was refused, or its input was not usable.
    #[error("{}{error}", about.as_ref().map(|name| format!("{name}: ")).unwrap_or_default())]
    Measurement {
        /// The file that is to blame, if it is one.
        about: Option<String>,
        /// Why.
        error: Box<Error>,
    },
    /// The limits cannot be read, or limit what is not there.
    #[error("{0}")]
    Limits(#[from] crate::limits::LimitsError),
    /// The log cannot be written or read.
    #[error("{0}")]
    Log(#[from] crate::log::LogError),
    /// The command line does not make sense.
    #[error("{0}")]
    Usage(String),
    /// Standard output is gone.
    #[error("the output cannot be written ({0})")]
    Output(std::io::Error),
}

impl Failure {
    /// Exit code of the contract: 1 refused, 2 wrong use or unreadable input.
    #[must_use]
    pub fn exit_code(&self) -> u8 {
        match self {
            Self::Measurement { error, .. } if !error.is_unusable_input() => REFUSED,
            _ => WRONG_USE,
        }
    }

    /// Short machine-readable name of the reason.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::Measurement { error, .. } => error.code(),
            Self::Unreadable { .. } => "file-unreadable",
            Self::Unwritable { .. } | Self::Output(_) => "file-unwritable",
            Self::Exists { .. } => "file-exists",
            Self::Limits(_) => "limits",
            Self::Log(_) => "log",
            Self::UnknownEnding { .. } | Self::Usage(_) => "wrong-use",
        }
    }

    /// Tells the user on stderr and gives the exit code.
    #[must_use]
    pub(super) fn report(&self) -> ExitCode {
        let kind = if self.exit_code() == REFUSED { "no result" } else { "error" };
        // Nothing is left to do when stderr is gone.
        let _ = writeln!(std::io::stderr(), "{kind}: {self}");
        ExitCode::from(self.exit_code())
    }
}
