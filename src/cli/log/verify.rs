//! `spotrule log verify`.

use super::arguments::VerifyArguments;
use crate::{
    cli::{Failure, failure, files},
    digest::sha256_hex,
    log::{Filter, Log, LogError, PhotoReference},
};
use std::{
    collections::BTreeSet,
    fmt::Write,
    path::{Path, PathBuf},
    process::ExitCode,
};

pub(super) fn verify(arguments: &VerifyArguments) -> Result<ExitCode, Failure> {
    let expected = arguments.expect_head.as_deref().map(full_hash).transpose()?;
    let log = Log::read(&arguments.log)?;
    let report = log.verify(expected.as_deref())?;
    let mut text = format!("{} entries, head {}\n", report.entries, report.head);
    for finding in &report.findings {
        let _ = writeln!(text, "  {finding}");
    }
    if let Some(entry) = report.expected_at {
        let _ = writeln!(text, "the expected hash is that of entry {entry}; everything up to it is as it was then");
    }
    for entry in &report.dated_back {
        let _ = writeln!(text, "to note: entry {entry} is dated before the one before it (a clock set back?)");
    }
    let mut faults = report.findings.len();
    if let Some(folder) = &arguments.photos {
        let wrong = wrong_photos(&log, folder)?;
        faults += wrong.len();
        text.extend(wrong.iter().map(|words| format!("  {words}\n")));
    }
    text += if faults == 0 { "sound\n" } else { "NOT SOUND\n" };
    files::print(&text)?;
    Ok(if faults == 0 { ExitCode::SUCCESS } else { ExitCode::from(failure::REFUSED) })
}

fn full_hash(text: &str) -> Result<String, Failure> {
    let hash = text.trim().to_ascii_lowercase();
    if hash.len() == 64 && hash.bytes().all(|byte| byte.is_ascii_hexdigit()) {
        return Ok(hash);
    }
    Err(Failure::Usage(format!(
        "--expect-head {text}: a SHA-256 has 64 hexadecimal digits, this has {}; copy it whole",
        hash.chars().count()
    )))
}

/// Where a photo is kept: named by its hash, with the ending of its name.
pub(in crate::cli) fn photo_path(folder: &Path, sha256: &str, file: &str) -> PathBuf {
    let ending = Path::new(file).extension().and_then(|ending| ending.to_str()).filter(|ending| ending.chars().all(char::is_alphanumeric));
    folder.join(ending.map_or_else(|| sha256.to_owned(), |ending| format!("{sha256}.{}", ending.to_lowercase())))
}

fn wrong_photos(log: &Log, folder: &Path) -> Result<Vec<String>, Failure> {
    let (mut seen, mut wrong) = (BTreeSet::new(), Vec::new());
    let mut check = |entry: u64, photo: &PhotoReference| {
        if !seen.insert(photo.sha256.clone()) {
            return;
        }
        let path = photo_path(folder, &photo.sha256, &photo.file);
        match files::read(&path) {
            Ok(bytes) if sha256_hex(&bytes) == photo.sha256 => {}
            Ok(_) => wrong.push(format!("photo {} of entry {entry} was changed: {}", photo.file, path.display())),
            Err(_) => wrong.push(format!("photo {} of entry {entry} is not there: {}", photo.file, path.display())),
        }
    };
    log.walk(&Filter::default(), |shown| {
        let entry = &shown.listed.entry;
        entry.photos.iter().for_each(|photo| check(entry.entry, photo));
        Ok::<(), LogError>(())
    })?;
    Ok(wrong)
}
