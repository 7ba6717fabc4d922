//! A measurement into the log, its photos into a folder.

use super::{
    Failure,
    arguments::RecordFlags,
    files::{self, Existing},
    log::photo_path,
    measure::Loaded,
    provenance::now,
};
use crate::{
    log::{Draft, Log},
    report::{LogEntry, Provenance},
};
use std::path::Path;

/// Enters a result, where a log is named; its photos are kept first, so that no entry names a photo that could not be kept.
pub(super) fn enter(record: &RecordFlags, result: &str, provenance: &Provenance, loaded: &Loaded) -> Result<Option<LogEntry>, Failure> {
    let Some(path) = &record.log else { return Ok(None) };
    if let Some(folder) = &record.keep_photos {
        keep(folder, provenance, loaded)?;
    }
    let bench = loaded.bench_file.as_ref().map(|file| file.text.as_str());
    let appended = Log::open(path)?.append(&Draft::of_result(result, bench)?, &now())?;
    Ok(Some(LogEntry { log: path.display().to_string(), entry: appended.entry, sha256: appended.sha256 }))
}

fn keep(folder: &Path, provenance: &Provenance, loaded: &Loaded) -> Result<(), Failure> {
    std::fs::create_dir_all(folder).map_err(|cause| Failure::Unwritable { path: folder.to_owned(), cause })?;
    let files = loaded.patterns.iter().chain(&loaded.targets);
    for ((file, bytes), digest) in files.zip(&provenance.photos) {
        match files::write(&photo_path(folder, &digest.sha256, file), bytes, Existing::Kept) {
            // The same bytes are there already; log verify --photos reads them again.
            Ok(()) | Err(Failure::Exists { .. }) => {}
            Err(failure) => return Err(failure),
        }
    }
    Ok(())
}
