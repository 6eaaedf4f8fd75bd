//! The zip around a workbook's parts.

use std::borrow::Cow;
use std::collections::BTreeMap;
use std::io::{BufWriter, Cursor, Read, Write};

use zip::write::SimpleFileOptions;
use zip::{CompressionMethod, ZipArchive, ZipWriter};

use super::xml::Tags;
use super::{BookTrouble, Limits};
use crate::document::patch::Edit;

/// A part of a package as text.
#[derive(Clone, PartialEq, Eq, Debug)]
pub(super) struct Part {
    /// Whether a byte-order mark stood before the text.
    mark: bool,
    /// The text after the mark.
    pub(super) xml: String,
}

impl Part {
    /// The part with these edits; `None` if they change nothing.
    pub(super) fn edited(self, mut edits: Vec<Edit>) -> Option<Edited> {
        edits.retain(|edit| self.xml.get(edit.span.clone()) != Some(edit.text.as_str()));
        edits.sort_by_key(|edit| (edit.span.start, edit.span.end));
        (!edits.is_empty()).then_some(Edited { part: self, edits })
    }
}

/// A part and its edits in order. They are put together only on their way into
/// the zip, so that a large sheet is in memory once.
pub(super) struct Edited {
    part: Part,
    edits: Vec<Edit>,
}

impl Edited {
    fn write(&self, out: &mut impl Write) -> std::io::Result<()> {
        let invalid = || std::io::Error::other("two edits overlap");
        if self.part.mark {
            out.write_all("\u{feff}".as_bytes())?;
        }
        let mut at = 0;
        for edit in &self.edits {
            let before = self.part.xml.get(at..edit.span.start).ok_or_else(invalid)?;
            out.write_all(before.as_bytes())?;
            out.write_all(edit.text.as_bytes())?;
            at = edit.span.end;
        }
        let rest = self.part.xml.get(at..).ok_or_else(invalid)?;
        out.write_all(rest.as_bytes())
    }
}

/// A zip that was looked over before anything is read from it.
pub(super) struct Package<'a> {
    archive: ZipArchive<Cursor<&'a [u8]>>,
    packed: u64,
    left: u64,
    limit: u64,
}

impl<'a> Package<'a> {
    /// Looks over the zip's directory.
    pub(super) fn open(bytes: &'a [u8], limits: &Limits) -> Result<Package<'a>, BookTrouble> {
        let archive = ZipArchive::new(Cursor::new(bytes)).map_err(|e| {
            BookTrouble::file(
                format!("it is not a whole zip file, which a workbook must be: {e}"),
                "fetch or save the workbook again; it may have been cut short",
            )
        })?;
        if archive.has_duplicate_names() {
            return Err(BookTrouble::file(
                "its zip holds two entries with one name, so that programs may disagree on what it says",
                "open it in the program that wrote it and save it again",
            ));
        }
        let packed = bytes.len() as u64;
        let mut package = Package { archive, packed, left: limits.unzipped, limit: limits.unzipped };
        if package.archive.decompressed_size().is_some_and(|size| size > u128::from(limits.unzipped)) {
            return Err(package.too_large());
        }
        if package.archive.has_overlapping_files().unwrap_or(true) {
            return Err(BookTrouble::file(
                "its zip stores several entries in the same bytes",
                "open it in the program that wrote it and save it again",
            ));
        }
        Ok(package)
    }

    fn too_large(&self) -> BookTrouble {
        let times = self.limit / self.packed.max(1);
        BookTrouble::file(
            format!(
                "unzipped it is larger than the limit of {} bytes, which is {times} times the file's own size",
                self.limit
            ),
            "raise the limit on the unzipped size if the file is known to be sound",
        )
    }

    /// The names of all entries, in the order of the zip.
    pub(super) fn names(&self) -> Vec<String> {
        self.archive.file_names().filter_map(Result::ok).map(Cow::into_owned).collect()
    }

    /// Whether there is an entry of that name.
    pub(super) fn holds(&self, name: &str) -> bool {
        self.archive.index_for_name(name).is_some()
    }

    /// The bytes of an entry, counted against the limit.
    pub(super) fn read(&mut self, name: &str) -> Result<Vec<u8>, BookTrouble> {
        let broken = |e: &dyn std::fmt::Display| {
            BookTrouble::file(
                format!("its part `{name}` cannot be read: {e}"),
                "fetch or save the workbook again; it may be damaged",
            )
        };
        let left = self.left;
        let mut out = Vec::new();
        {
            let entry = self.archive.by_name(name).map_err(|e| broken(&e))?;
            if entry.encrypted() {
                return Err(BookTrouble::file("it is encrypted", "save it without a password"));
            }
            // The declared size may lie, so that it is only a hint of what to set aside.
            out.reserve(usize::try_from(entry.size().min(left).min(1 << 28)).unwrap_or(0));
            entry.take(left.saturating_add(1)).read_to_end(&mut out).map_err(|e| broken(&e))?;
        }
        match left.checked_sub(out.len() as u64) {
            Some(rest) => self.left = rest,
            None => return Err(self.too_large()),
        }
        Ok(out)
    }

    /// The text of an entry.
    pub(super) fn part(&mut self, name: &str) -> Result<Part, BookTrouble> {
        let bytes = self.read(name)?;
        let utf16 = bytes.starts_with(&[0xff, 0xfe])
            || bytes.starts_with(&[0xfe, 0xff])
            || bytes.starts_with(b"<\0")
            || bytes.starts_with(b"\0<");
        let trouble = |cause: String| {
            BookTrouble::file(
                format!("in its part `{name}`: {cause}"),
                "open it in a spreadsheet program and save it again",
            )
        };
        if utf16 {
            return Err(trouble("it is UTF-16, and only UTF-8 is read".into()));
        }
        let mut xml =
            String::from_utf8(bytes).map_err(|_| trouble("it is not UTF-8, and only that is read".into()))?;
        let mark = xml.starts_with('\u{feff}');
        if mark {
            xml.drain(..'\u{feff}'.len_utf8());
        }
        check_prolog(&xml).map_err(trouble)?;
        Ok(Part { mark, xml })
    }

    /// A new zip in which the named parts hold other text and every other
    /// entry is copied as it is, in the same order.
    pub(super) fn rewrite(
        bytes: &[u8],
        mut changed: BTreeMap<String, Edited>,
    ) -> Result<Vec<u8>, BookTrouble> {
        let failed = |e: &dyn std::fmt::Display| {
            BookTrouble::file(
                format!("the new workbook cannot be put together: {e}"),
                "the file is as it was",
            )
        };
        let mut archive = ZipArchive::new(Cursor::new(bytes)).map_err(|e| failed(&e))?;
        let mut out = ZipWriter::new(Cursor::new(Vec::with_capacity(bytes.len() + bytes.len() / 8)));
        out.set_raw_comment(archive.comment().into()).map_err(|e| failed(&e))?;
        for index in 0..archive.len() {
            let entry = archive.by_index_raw(index).map_err(|e| failed(&e))?;
            let name = entry.name().map_err(|e| failed(&e))?.into_owned();
            let Some(edited) = changed.remove(&name) else {
                out.raw_copy_file(entry).map_err(|e| failed(&e))?;
                continue;
            };
            // The time stays the old one: the same answers then give the same bytes.
            let mut options = SimpleFileOptions::default().compression_level(None);
            options = match entry.compression() {
                CompressionMethod::Stored => options.compression_method(CompressionMethod::Stored),
                _ => options.compression_method(CompressionMethod::Deflated),
            };
            if let Some(time) = entry.last_modified() {
                options = options.last_modified_time(time);
            }
            let size = edited.edits.iter().fold(edited.part.xml.len(), |n, e| n.saturating_add(e.text.len()));
            options = options.large_file(size >= u32::MAX as usize / 2);
            out.start_file(name, options).map_err(|e| failed(&e))?;
            let mut buffer = BufWriter::with_capacity(1 << 16, &mut out);
            edited.write(&mut buffer).and_then(|()| buffer.flush()).map_err(|e| failed(&e))?;
        }
        out.finish().map(Cursor::into_inner).map_err(|e| failed(&e))
    }
}

/// Refuses a part whose declaration or document type asks for more than plain
/// UTF-8 text.
fn check_prolog(xml: &str) -> Result<(), String> {
    if let Some(declaration) = xml.trim_start().strip_prefix("<?xml") {
        let declaration = &declaration[..declaration.find("?>").unwrap_or(0)];
        let encoding = super::xml::attributes_of(declaration).find(|a| a.name == "encoding");
        if let Some(encoding) = encoding {
            let plain = ["utf-8", "utf8", "us-ascii", "ascii"];
            if !plain.iter().any(|p| encoding.value.eq_ignore_ascii_case(p)) {
                return Err(format!("it is written in {}, and only UTF-8 is read", encoding.value));
            }
        }
    }
    match Tags::new(xml).next()? {
        Some(_) => Ok(()),
        None => Err("it is empty".into()),
    }
}

/// The name of the entry that `target` means when it stands in the
/// relationships of the part `from`.
pub(super) fn resolve(from: &str, target: &str) -> String {
    let mut path: Vec<&str> = match target.strip_prefix('/') {
        Some(_) => Vec::new(),
        None => from.split('/').rev().skip(1).collect::<Vec<_>>().into_iter().rev().collect(),
    };
    for step in target.split('/') {
        match step {
            "" | "." => {}
            ".." => {
                path.pop();
            }
            step => path.push(step),
        }
    }
    path.join("/")
}

/// The name of the entry that holds the relationships of the part `of`.
pub(super) fn relationships_of(of: &str) -> String {
    match of.rsplit_once('/') {
        Some((folder, name)) => format!("{folder}/_rels/{name}.rels"),
        None => format!("_rels/{of}.rels"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn targets_are_absolute_or_relative() {
        assert_eq!(resolve("xl/workbook.xml", "worksheets/sheet1.xml"), "xl/worksheets/sheet1.xml");
        assert_eq!(resolve("xl/workbook.xml", "/xl/worksheets/a.xml"), "xl/worksheets/a.xml");
        assert_eq!(resolve("xl/worksheets/sheet1.xml", "../tables/t.xml"), "xl/tables/t.xml");
        assert_eq!(resolve("", "xl/workbook.xml"), "xl/workbook.xml");
        assert_eq!(relationships_of("xl/workbook.xml"), "xl/_rels/workbook.xml.rels");
        assert_eq!(relationships_of(""), "_rels/.rels");
    }

    #[test]
    fn other_encodings_are_refused() {
        assert!(check_prolog("<?xml version=\"1.0\" encoding=\"UTF-16\"?><a/>").is_err());
        assert!(check_prolog("<?xml version='1.0' encoding='utf-8'?><a/>").is_ok());
        assert!(check_prolog("<!DOCTYPE a [<!ENTITY b 'c'>]><a/>").is_err());
        assert!(check_prolog("").is_err());
    }
}
