//! Reading and saving files: the one door to the disk.

use std::io;
use std::path::Path;

/// The bytes of a file.
pub(super) fn read(path: &Path) -> io::Result<Vec<u8>> {
    std::fs::read(path)
}

/// Puts `bytes` into a file; where that fails the file is as it was.
pub(super) fn save(path: &Path, bytes: &[u8]) -> io::Result<()> {
    std::fs::write(path, bytes)
}

/// What went wrong, in words that do not depend on the system where it matters.
pub(super) fn cause(error: &io::Error) -> String {
    match error.kind() {
        io::ErrorKind::NotFound => "there is no such file".to_string(),
        io::ErrorKind::PermissionDenied => "access is denied".to_string(),
        io::ErrorKind::IsADirectory => "it is a folder".to_string(),
        _ => error.to_string().to_lowercase(),
    }
}
