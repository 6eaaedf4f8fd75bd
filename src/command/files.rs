//! Reading and saving files: the one door to the disk, through [`crate::document::save`].

use crate::document::save::{self, FileTrouble};
use std::io;
use std::path::Path;

/// The bytes of a file.
pub(super) fn read(path: &Path) -> Result<Vec<u8>, FileTrouble> {
    save::read_note(path)
}

/// Puts `bytes` into a file, in one piece; where that fails the file is as it
/// was. `read` is what the file held when it was read: a file that an editor
/// has saved meanwhile is not overwritten.
pub(super) fn save(path: &Path, read: Option<&[u8]>, bytes: &[u8]) -> Result<(), FileTrouble> {
    save::save(path, read, bytes).map(|_| ())
}

/// What went wrong, in words that do not depend on the system where it matters.
pub(super) fn cause(error: &io::Error) -> String {
    match error.kind() {
        io::ErrorKind::NotFound => "there is no such file or folder".to_string(),
        io::ErrorKind::PermissionDenied => "access is denied".to_string(),
        io::ErrorKind::IsADirectory => "it is a folder".to_string(),
        _ => error.to_string().to_lowercase(),
    }
}
