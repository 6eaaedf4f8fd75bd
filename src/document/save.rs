//! Notes read from disk and put back whole or not at all.

use std::fmt;
use std::fs::{self, File, Metadata, OpenOptions};
use std::io::{self, Read, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};

/// A file that could not be read or written.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct FileTrouble {
    /// Which file, as it was named.
    pub path: PathBuf,
    /// What went wrong.
    pub cause: String,
    /// What to do about it.
    pub mend: String,
    /// For text that is not UTF-8: the first byte that is not.
    pub byte: Option<usize>,
}

impl FileTrouble {
    fn new(path: &Path, cause: impl Into<String>, mend: impl Into<String>) -> FileTrouble {
        FileTrouble { path: path.into(), cause: cause.into(), mend: mend.into(), byte: None }
    }

    fn io(path: &Path, error: &io::Error) -> FileTrouble {
        // In words of our own: the system's carry numbers, and paths of temporary files.
        let cause = match error.kind() {
            io::ErrorKind::NotFound => "there is no such file or folder",
            io::ErrorKind::PermissionDenied => "access is denied",
            io::ErrorKind::IsADirectory => "it is a folder",
            io::ErrorKind::NotADirectory => "a part of its path is no folder",
            io::ErrorKind::StorageFull => "the disk is full",
            io::ErrorKind::ReadOnlyFilesystem => "the disk is read-only",
            io::ErrorKind::Other | io::ErrorKind::Interrupted => "the system failed",
            kind => return FileTrouble::new(path, kind.to_string(), "try again, or write elsewhere with -o"),
        };
        let mend = match error.kind() {
            io::ErrorKind::NotFound => "check the name and the folder",
            io::ErrorKind::PermissionDenied => "give yourself the right to it, or write elsewhere with -o",
            io::ErrorKind::StorageFull => "make room on the disk; the file is as it was",
            _ => "try again, or write elsewhere with -o",
        };
        FileTrouble::new(path, cause, mend)
    }
}

impl fmt::Display for FileTrouble {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: {} ({})", self.path.display(), self.cause, self.mend)
    }
}

impl std::error::Error for FileTrouble {}

/// What [`save`] did.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Saved {
    /// The file held these bytes already and was not touched.
    Unchanged,
    /// The file holds the new bytes.
    Written,
}

/// The bytes of a file.
pub fn read_note(path: &Path) -> Result<Vec<u8>, FileTrouble> {
    fs::read(path).map_err(|e| FileTrouble::io(path, &e))
}

/// The text of a file's bytes.
pub fn to_utf8(path: &Path, bytes: Vec<u8>) -> Result<String, FileTrouble> {
    String::from_utf8(bytes).map_err(|error| {
        let at = error.utf8_error().valid_up_to();
        let bytes = error.as_bytes();
        let line = 1 + bytes[..at].iter().filter(|b| **b == b'\n').count();
        let (cause, mend) = if bytes.starts_with(&[0xff, 0xfe]) || bytes.starts_with(&[0xfe, 0xff]) {
            ("it is UTF-16, not UTF-8".to_string(), "save it as UTF-8")
        } else {
            let byte = bytes.get(at).copied().unwrap_or(0);
            (format!("line {line} is not UTF-8: byte {at} is {byte:#04x}"), "save the file as UTF-8")
        };
        FileTrouble { byte: Some(at), ..FileTrouble::new(path, cause, mend) }
    })
}

/// Puts `bytes` in the file `path`.
///
/// A link stays a link; a file with several hard links stays one file; mode
/// and owner stay. Otherwise the file is replaced in one step, so that no
/// reader and no power cut ever sees half of it. When `read` is given and the
/// file no longer holds those bytes, somebody else has saved it meanwhile:
/// nothing is written.
pub fn save(path: &Path, read: Option<&[u8]>, bytes: &[u8]) -> Result<Saved, FileTrouble> {
    let trouble = |e: &io::Error| FileTrouble::io(path, e);
    let real = match fs::canonicalize(path) {
        Ok(real) => real,
        Err(e) if e.kind() == io::ErrorKind::NotFound && fs::symlink_metadata(path).is_err() => {
            if read.is_some() {
                return Err(FileTrouble::new(path, "it was taken away meanwhile", "run again"));
            }
            return replace(path, None, bytes).map_err(|e| trouble(&e)).map(|()| Saved::Written);
        }
        Err(e) => return Err(trouble(&e)),
    };
    let meta = fs::metadata(&real).map_err(|e| trouble(&e))?;
    if meta.is_dir() {
        return Err(FileTrouble::new(path, "it is a folder", "name a file"));
    }
    if !meta.is_file() {
        // A pipe or a device has no content to compare or replace.
        let written = OpenOptions::new().write(true).open(&real).and_then(|mut f| f.write_all(bytes));
        return written.map_err(|e| trouble(&e)).map(|()| Saved::Written);
    }
    // Compared piece by piece: the whole old file once more would be held beside both.
    if holds(&real, bytes).map_err(|e| trouble(&e))? {
        return Ok(Saved::Unchanged);
    }
    if let Some(read) = read
        && !holds(&real, read).map_err(|e| trouble(&e))?
    {
        return Err(FileTrouble::new(path, "it was changed by somebody else meanwhile", "run again"));
    }
    if meta.permissions().readonly() {
        return Err(FileTrouble::new(
            path,
            "it is read-only",
            "make it writable, or write elsewhere with -o",
        ));
    }
    let done = if links(&meta) > 1 {
        write_over(&real, bytes)
    } else {
        match replace(&real, Some(&meta), bytes) {
            Err(e) if e.kind() == io::ErrorKind::Unsupported => write_over(&real, bytes),
            Err(e) if e.kind() == io::ErrorKind::PermissionDenied => {
                return Err(FileTrouble::new(
                    path,
                    "its folder is read-only, so that it cannot be replaced safely",
                    "make the folder writable, or write elsewhere with -o",
                ));
            }
            done => done,
        }
    };
    done.map_err(|e| trouble(&e)).map(|()| Saved::Written)
}

/// Writes into the file itself, keeping its old bytes at hand until that is done.
fn write_over(path: &Path, bytes: &[u8]) -> io::Result<()> {
    let old = fs::read(path)?;
    write_through(path, &old, bytes)
}

/// Whether a file holds exactly these bytes.
fn holds(path: &Path, bytes: &[u8]) -> io::Result<bool> {
    let mut file = fs::File::open(path)?;
    if file.metadata()?.len() != bytes.len() as u64 {
        return Ok(false);
    }
    let mut piece = vec![0; 64 * 1024];
    let mut rest = bytes;
    loop {
        match file.read(&mut piece)? {
            0 => return Ok(rest.is_empty()),
            n if rest.get(..n) == Some(&piece[..n]) => rest = &rest[n..],
            _ => return Ok(false),
        }
    }
}

/// Writes a new file beside the old one and puts it in its place.
/// `Unsupported` when that would change the file's owner.
fn replace(path: &Path, old: Option<&Metadata>, bytes: &[u8]) -> io::Result<()> {
    let folder = match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
    let mut builder = tempfile::Builder::new();
    builder.prefix(".tieback-");
    #[cfg(unix)]
    let permissions = std::os::unix::fs::PermissionsExt::from_mode(0o666);
    // A new file gets the rights that the user's mask allows; one that takes
    // another's place stays closed until it has that one's.
    #[cfg(unix)]
    if old.is_none() {
        builder.permissions(permissions);
    }
    let mut temp = builder.tempfile_in(folder)?;
    temp.write_all(bytes)?;
    if let Some(old) = old {
        keep_owner(temp.as_file(), old)?;
        temp.as_file().set_permissions(old.permissions())?;
    }
    temp.as_file().sync_all()?;
    temp.persist(path).map_err(|e| e.error)?;
    // Makes the new name last too; not every file system can, and the bytes are safe already.
    if let Ok(folder) = File::open(folder) {
        let _ = folder.sync_all();
    }
    Ok(())
}

#[cfg(unix)]
fn keep_owner(new: &File, old: &Metadata) -> io::Result<()> {
    use std::os::unix::fs::{MetadataExt, fchown};
    let made = new.metadata()?;
    if (made.uid(), made.gid()) == (old.uid(), old.gid()) {
        return Ok(());
    }
    fchown(new, Some(old.uid()), Some(old.gid())).map_err(|_| io::ErrorKind::Unsupported.into())
}

#[cfg(not(unix))]
fn keep_owner(_: &File, _: &Metadata) -> io::Result<()> {
    Ok(())
}

#[cfg(unix)]
fn links(meta: &Metadata) -> u64 {
    std::os::unix::fs::MetadataExt::nlink(meta)
}

#[cfg(not(unix))]
fn links(_: &Metadata) -> u64 {
    1
}

/// Writes into the file itself, for one whose place must not change. The part
/// beyond the old length goes first: a full disk shows there, while the old
/// bytes still stand. If the rest fails, the old bytes are put back.
fn write_through(path: &Path, old: &[u8], bytes: &[u8]) -> io::Result<()> {
    let mut file = OpenOptions::new().write(true).open(path)?;
    let shared = old.len().min(bytes.len());
    let mut put = |from: usize, part: &[u8]| -> io::Result<()> {
        file.seek(SeekFrom::Start(from as u64))?;
        file.write_all(part)
    };
    let done = put(shared, &bytes[shared..]).and_then(|()| put(0, &bytes[..shared]));
    match done {
        Ok(()) => {
            file.set_len(bytes.len() as u64)?;
            file.sync_all()
        }
        Err(error) => {
            // The first error is the one to tell of.
            let _ = put(0, old);
            let _ = file.set_len(old.len() as u64);
            Err(error)
        }
    }
}

#[cfg(all(test, unix))]
mod tests {
    use super::*;
    use std::os::unix::fs::{MetadataExt, PermissionsExt, symlink};

    fn names(folder: &Path) -> usize {
        fs::read_dir(folder).unwrap().count()
    }

    #[test]
    fn replaces_and_keeps_the_mode() {
        let dir = tempfile::tempdir().unwrap();
        let note = dir.path().join("note.md");
        fs::write(&note, "old").unwrap();
        fs::set_permissions(&note, fs::Permissions::from_mode(0o640)).unwrap();
        assert_eq!(save(&note, Some(b"old"), b"new bytes"), Ok(Saved::Written));
        assert_eq!(fs::read(&note).unwrap(), b"new bytes");
        assert_eq!(fs::metadata(&note).unwrap().mode() & 0o7777, 0o640);
        assert_eq!(names(dir.path()), 1);
    }

    #[test]
    fn equal_bytes_are_not_written() {
        let dir = tempfile::tempdir().unwrap();
        let note = dir.path().join("note.md");
        fs::write(&note, "same").unwrap();
        let before = fs::metadata(&note).unwrap();
        assert_eq!(save(&note, None, b"same"), Ok(Saved::Unchanged));
        let after = fs::metadata(&note).unwrap();
        assert_eq!((before.ino(), before.mtime_nsec()), (after.ino(), after.mtime_nsec()));
    }

    #[test]
    fn links_stay_links() {
        let dir = tempfile::tempdir().unwrap();
        let note = dir.path().join("note.md");
        fs::create_dir(dir.path().join("sub")).unwrap();
        let soft = dir.path().join("sub/soft.md");
        let hard = dir.path().join("hard.md");
        fs::write(&note, "a long old text").unwrap();
        symlink("../note.md", &soft).unwrap();
        assert_eq!(save(&soft, None, b"one"), Ok(Saved::Written));
        assert!(fs::symlink_metadata(&soft).unwrap().is_symlink());
        assert_eq!(fs::read(&note).unwrap(), b"one");
        fs::hard_link(&note, &hard).unwrap();
        assert_eq!(save(&note, None, b"longer"), Ok(Saved::Written));
        assert_eq!(save(&note, None, b"two"), Ok(Saved::Written));
        assert_eq!(fs::read(&hard).unwrap(), b"two");
        assert_eq!(fs::metadata(&hard).unwrap().nlink(), 2);
    }

    #[test]
    fn new_files_and_troubles() {
        let dir = tempfile::tempdir().unwrap();
        let note = dir.path().join("new.md");
        assert_eq!(save(&note, None, b"x"), Ok(Saved::Written));
        let plain = dir.path().join("plain");
        fs::write(&plain, "").unwrap();
        let mode = |p: &Path| fs::metadata(p).unwrap().mode();
        assert_eq!(mode(&note), mode(&plain));
        assert!(save(&note, Some(b"y"), b"z").unwrap_err().cause.contains("somebody else"));
        fs::set_permissions(&note, fs::Permissions::from_mode(0o444)).unwrap();
        assert!(save(&note, None, b"z").unwrap_err().cause.contains("read-only"));
        assert!(save(dir.path(), None, b"z").unwrap_err().cause.contains("folder"));
        assert!(save(&dir.path().join("no/such.md"), None, b"z").is_err());
        symlink("nowhere", dir.path().join("dangling")).unwrap();
        assert!(save(&dir.path().join("dangling"), None, b"z").is_err());
        assert!(read_note(&dir.path().join("absent")).is_err());
    }

    #[test]
    fn says_which_byte_is_no_utf8() {
        let path = Path::new("n.md");
        let trouble = to_utf8(path, b"ab\nc\xe9d".to_vec()).unwrap_err();
        assert_eq!(trouble.byte, Some(4));
        assert!(trouble.cause.contains("line 2"));
        assert!(to_utf8(path, b"\xff\xfea\0".to_vec()).unwrap_err().cause.contains("UTF-16"));
        assert_eq!(to_utf8(path, "\u{feff}é\0".into()).unwrap(), "\u{feff}é\0");
    }
}
