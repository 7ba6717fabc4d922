//! What stands around a measurement in a report: the verdict, what it was made from and by whom, its place in a log.

use crate::limits::Verdict;

/// What a report says beside the result itself. The default says nothing.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Context {
    /// The result against its limits, where limits were given.
    pub verdict: Option<Verdict>,
    /// What the result was made from.
    pub provenance: Option<Provenance>,
    /// Where the result is logged.
    pub entry: Option<LogEntry>,
}

/// Everything that is needed to repeat a measurement, and who made it.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Provenance {
    /// When, RFC 3339 in UTC.
    pub time: String,
    /// Who, in the operator's own spelling.
    pub operator: Option<String>,
    /// The operator's words.
    pub remark: Option<String>,
    /// The name given to the sample on the command line; it stands over the one of the bench file.
    pub sample_name: Option<String>,
    /// The bench file.
    pub bench: Option<BenchText>,
    /// Flags that stood over the bench file, as `--throw "812.0(8) mm"`.
    pub flags: Vec<String>,
    /// The photos, patterns first.
    pub photos: Vec<PhotoDigest>,
}

/// A bench file as it was read.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct BenchText {
    /// Name as the user gave it.
    pub file: String,
    /// Its text.
    pub text: String,
    /// SHA-256 of the text.
    pub sha256: String,
}

/// A photo and its fingerprint.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PhotoDigest {
    /// Name as the user gave it.
    pub file: String,
    /// What it shows.
    pub role: PhotoRole,
    /// SHA-256 of the file.
    pub sha256: String,
    /// Size of the file.
    pub bytes: usize,
}

/// What a photo shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PhotoRole {
    /// The laser pattern.
    Pattern,
    /// The dot target.
    Target,
}

impl PhotoRole {
    /// "pattern" or "target".
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Pattern => "pattern",
            Self::Target => "target",
        }
    }
}

/// The place of a result in a log.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct LogEntry {
    /// File of the log.
    pub log: String,
    /// Number of the entry.
    pub entry: u64,
    /// SHA-256 of the entry, which is the head of the log's chain at that moment.
    pub sha256: String,
}
