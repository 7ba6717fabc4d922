//! What a result was made from, in the JSON result.

use schemars::JsonSchema;
use serde::Serialize;

use super::context::{LogEntry, Provenance};

#[derive(Debug, Serialize, JsonSchema)]
pub(super) struct InputsJson<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    bench: Option<BenchJson<'a>>,
    /// Flags that stood over the bench file.
    #[serde(skip_serializing_if = "<[String]>::is_empty")]
    flags: &'a [String],
    photos: Vec<PhotoInputJson<'a>>,
}

#[derive(Debug, Serialize, JsonSchema)]
struct BenchJson<'a> {
    file: &'a str,
    sha256: &'a str,
}

#[derive(Debug, Serialize, JsonSchema)]
struct PhotoInputJson<'a> {
    file: &'a str,
    /// `pattern` or `target`.
    #[schemars(extend("enum" = ["pattern", "target"]))]
    role: &'static str,
    sha256: &'a str,
    /// Size of the file.
    bytes: usize,
}

/// The place of the result in a log.
#[derive(Debug, Serialize, JsonSchema)]
pub(super) struct LogEntryJson<'a> {
    log: &'a str,
    entry: u64,
    sha256: &'a str,
}

pub(super) fn inputs_json(provenance: &Provenance) -> InputsJson<'_> {
    let photos = provenance.photos.iter();
    InputsJson {
        bench: provenance.bench.as_ref().map(|bench| BenchJson { file: &bench.file, sha256: &bench.sha256 }),
        flags: &provenance.flags,
        photos: photos
            .map(|photo| PhotoInputJson { file: &photo.file, role: photo.role.name(), sha256: &photo.sha256, bytes: photo.bytes })
            .collect(),
    }
}

pub(super) fn entry_json(entry: &LogEntry) -> LogEntryJson<'_> {
    LogEntryJson { log: &entry.log, entry: entry.entry, sha256: &entry.sha256 }
}
