//! Reading files whole and writing them whole: a reader never sees half a file, and nothing is replaced by accident.

use super::Failure;
use std::{
    io::Write,
    path::{Path, PathBuf},
};

/// A photo or bench file larger than this is no photo or bench file.
const LARGEST_BYTES: u64 = 2 << 30;

/// Reads a file whole.
pub(super) fn read(path: &Path) -> Result<Vec<u8>, Failure> {
    let unreadable = |cause| Failure::Unreadable { path: path.to_owned(), cause };
    let metadata = std::fs::metadata(path).map_err(unreadable)?;
    if metadata.is_dir() {
        return Err(unreadable(std::io::Error::other("it is a folder, not a file")));
    }
    if metadata.len() > LARGEST_BYTES {
        return Err(unreadable(std::io::Error::other(format!("it has {} bytes, more than any photo", metadata.len()))));
    }
    std::fs::read(path).map_err(unreadable)
}

/// Reads a text file; what is not UTF-8 is refused with the place.
pub(super) fn read_text(path: &Path) -> Result<String, Failure> {
    String::from_utf8(read(path)?).map_err(|error| Failure::Unreadable {
        path: path.to_owned(),
        cause: std::io::Error::other(format!("it is not UTF-8 text (byte {})", error.utf8_error().valid_up_to())),
    })
}

/// Whether an existing file may be replaced.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Existing {
    /// The new file takes its place.
    Replaced,
    /// The command gives up.
    Kept,
}

/// Writes a file whole: into a temporary neighbour first, then renamed, so that no half file is ever left under the name.
pub(super) fn write(path: &Path, bytes: &[u8], existing: Existing) -> Result<(), Failure> {
    let unwritable = |cause| Failure::Unwritable { path: path.to_owned(), cause };
    write_with(path, existing, |out| out.write_all(bytes).map_err(unwritable))
}

/// As [`write()`], for what is too long to be held in memory.
pub(super) fn write_with(path: &Path, existing: Existing, fill: impl FnOnce(&mut dyn Write) -> Result<(), Failure>) -> Result<(), Failure> {
    let unwritable = |cause| Failure::Unwritable { path: path.to_owned(), cause };
    if path.is_dir() {
        return Err(unwritable(std::io::Error::other("it is a folder")));
    }
    let folder = path.parent().filter(|parent| !parent.as_os_str().is_empty()).map_or_else(|| PathBuf::from("."), Path::to_owned);
    let file = tempfile::NamedTempFile::new_in(folder).map_err(unwritable)?;
    let mut out = std::io::BufWriter::new(file);
    fill(&mut out)?;
    let file = out.into_inner().map_err(|error| unwritable(error.into_error()))?;
    readable_by_others(file.as_file()).and_then(|()| file.as_file().sync_all()).map_err(unwritable)?;
    match existing {
        Existing::Replaced => file.persist(path).map(drop).map_err(|error| unwritable(error.error)),
        Existing::Kept => file.persist_noclobber(path).map(drop).map_err(|error| match error.error.kind() {
            std::io::ErrorKind::AlreadyExists => Failure::Exists { path: path.to_owned() },
            _ => unwritable(error.error),
        }),
    }
}

/// A temporary file is the owner's alone; a result is an ordinary file.
#[cfg(unix)]
fn readable_by_others(file: &std::fs::File) -> std::io::Result<()> {
    use std::os::unix::fs::PermissionsExt;
    file.set_permissions(std::fs::Permissions::from_mode(0o644))
}

#[cfg(not(unix))]
fn readable_by_others(_: &std::fs::File) -> std::io::Result<()> {
    Ok(())
}

/// Writes to standard output.
pub(super) fn print(text: &str) -> Result<(), Failure> {
    let mut out = std::io::stdout().lock();
    out.write_all(text.as_bytes()).and_then(|()| out.flush()).map_err(Failure::Output)
}
