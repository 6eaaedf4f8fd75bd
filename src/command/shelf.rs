//! The files that notes use: what lies at or below a note's folder, and what
//! the user allows.

use super::files;
use crate::document::workbook::Limits;
use crate::note::{Fetched, NotFetched, Shelf};
use std::path::{Component, Path, PathBuf};

/// The disk, as far as a note may reach.
#[derive(Clone, Debug)]
pub(super) struct Disk {
    /// Folders of which files may be used as well.
    allowed: Vec<PathBuf>,
    limits: Limits,
}

impl Disk {
    pub(super) fn new(allowed: &[PathBuf], limits: Limits) -> Disk {
        let allowed = allowed.iter().filter_map(|folder| folder.canonicalize().ok()).collect();
        Disk { allowed, limits }
    }
}

fn not(cause: impl Into<String>, mend: impl Into<String>) -> NotFetched {
    NotFetched { cause: cause.into(), mend: mend.into() }
}

impl Shelf for Disk {
    fn fetch(&self, from: &str, path: &str) -> Result<Fetched, NotFetched> {
        if path.is_empty() {
            return Err(not("no file is named", "write the path of a file in the quotes"));
        }
        if path.contains('\\') {
            return Err(not(
                "a path has `/` between its folders",
                format!("write `{}`", path.replace('\\', "/")),
            ));
        }
        let relative = Path::new(path);
        if relative.is_absolute() || path.get(1..2) == Some(":") {
            return Err(not(
                "its path is not relative to the note",
                "write the path from the note's folder on",
            ));
        }
        let up = relative.components().any(|c| c == Component::ParentDir);
        if up && self.allowed.is_empty() {
            return Err(not(
                "its path leads out of the note's folder",
                "put the file at or below the note's folder, or allow its folder with `--use-from FOLDER`",
            ));
        }
        // A note from standard input stands in the working folder.
        let folder = match Path::new(from).parent() {
            Some(folder) if !folder.as_os_str().is_empty() => folder.to_path_buf(),
            _ => PathBuf::from("."),
        };
        let target = folder.join(relative);
        let gone =
            |error: std::io::Error| not(files::cause(&error), "look at the path; it is relative to the note");
        let real = target.canonicalize().map_err(gone)?;
        let home = folder.canonicalize().map_err(gone)?;
        if !real.starts_with(&home) && !self.allowed.iter().any(|allowed| real.starts_with(allowed)) {
            return Err(not(
                "it lies outside the note's folder",
                "put the file at or below the note's folder, or allow its folder with `--use-from FOLDER`",
            ));
        }
        // A pipe would be waited for without end.
        if !real.is_file() {
            return Err(not("it is no file", "name a note or a parts list"));
        }
        let bytes = files::read(&real).map_err(|trouble| not(trouble.cause, trouble.mend))?;
        Ok(Fetched { name: tidy(&target), key: real.to_string_lossy().into_owned(), bytes })
    }

    fn key(&self, name: &str) -> String {
        Path::new(name).canonicalize().map_or(name.to_string(), |real| real.to_string_lossy().into_owned())
    }

    fn limits(&self) -> Limits {
        self.limits.clone()
    }
}

/// A path without `.` and, where it can be told, without `..`: one file has one name.
fn tidy(path: &Path) -> String {
    let mut kept = PathBuf::new();
    for part in path.components() {
        match part {
            Component::CurDir => {}
            Component::ParentDir if matches!(kept.components().next_back(), Some(Component::Normal(_))) => {
                kept.pop();
            }
            part => kept.push(part),
        }
    }
    kept.to_string_lossy().into_owned()
}
