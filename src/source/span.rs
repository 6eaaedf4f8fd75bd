//! Spans and the files that they point into.

use super::cells::{CellMap, CellPlace};
use std::sync::Arc;

/// A range of bytes, counted over all sources one after the other.
///
/// The first source starts at offset 0, so for a run over one file a span is
/// the byte range in that file. [`Sources::find`] turns any span into a file
/// and a range inside it.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug, Default)]
pub struct Span {
    /// First byte.
    pub start: u32,
    /// One past the last byte.
    pub end: u32,
}

impl Span {
    /// The span from `start` up to, not including, `end`.
    pub fn new(start: usize, end: usize) -> Span {
        Span { start: start as u32, end: end as u32 }
    }

    /// The smallest span that holds both.
    pub fn to(self, other: Span) -> Span {
        Span { start: self.start.min(other.start), end: self.end.max(other.end) }
    }

    /// Length in bytes.
    pub fn len(self) -> usize {
        (self.end - self.start) as usize
    }

    /// Whether it covers no byte.
    pub fn is_empty(self) -> bool {
        self.start == self.end
    }
}

/// One text that was read: a file, standard input, or a line given as an argument.
#[derive(Clone, Debug)]
pub struct SourceFile {
    /// The name that messages show.
    pub name: String,
    /// Offset of its first byte in the common count.
    pub base: u32,
    /// Its whole text.
    pub text: Arc<str>,
    /// Which cells the text was put together from, if it is that of a sheet.
    pub cells: Option<Arc<CellMap>>,
}

/// All texts of one run, in one count of bytes.
#[derive(Clone, Debug, Default)]
pub struct Sources {
    files: Vec<SourceFile>,
}

impl Sources {
    /// The most text that one run can hold: offsets are 32 bits wide.
    pub const LIMIT: usize = u32::MAX as usize - 16;

    /// Adds a text and returns the offset of its first byte, or `None` when
    /// the texts together would pass [`Sources::LIMIT`].
    pub fn add(&mut self, name: impl Into<String>, text: impl Into<Arc<str>>) -> Option<u32> {
        self.add_text(name.into(), text.into(), None)
    }

    /// Adds the text of a sheet, put together from these cells.
    pub fn add_cells(
        &mut self,
        name: impl Into<String>,
        text: impl Into<Arc<str>>,
        cells: impl Into<Arc<CellMap>>,
    ) -> Option<u32> {
        self.add_text(name.into(), text.into(), Some(cells.into()))
    }

    fn add_text(&mut self, name: String, text: Arc<str>, cells: Option<Arc<CellMap>>) -> Option<u32> {
        let base = self.files.last().map_or(0, |f| f.base as usize + f.text.len() + 1);
        if base + text.len() > Self::LIMIT {
            return None;
        }
        self.files.push(SourceFile { name, base: base as u32, text, cells });
        Some(base as u32)
    }

    /// All files in the order they were added.
    pub fn files(&self) -> &[SourceFile] {
        &self.files
    }

    /// The file that holds `span`, with its range inside that file's text.
    /// `None` when nothing has been added.
    pub fn find(&self, span: Span) -> Option<(&SourceFile, std::ops::Range<usize>)> {
        let after = self.files.partition_point(|f| f.base <= span.start);
        let file = self.files.get(after.checked_sub(1)?)?;
        let cut = |at: u32| ((at - file.base) as usize).min(file.text.len());
        Some((file, cut(span.start)..cut(span.end.max(span.start))))
    }

    /// The text under `span`; empty when it is nowhere.
    pub fn text(&self, span: Span) -> &str {
        self.find(span).and_then(|(file, range)| file.text.get(range)).unwrap_or("")
    }

    /// The cell that holds the start of `span`, where it lies in a sheet.
    pub fn cell(&self, span: Span) -> Option<CellPlace<'_>> {
        let (file, range) = self.find(span)?;
        let cells = file.cells.as_ref()?;
        cells.place(cells.at(range.start)?)
    }

    /// The start of `span` in words: `line 12`, or `Power!C7` in a sheet.
    pub fn words(&self, span: Span) -> String {
        match self.cell(span) {
            Some(cell) => cell.short(),
            None => format!("line {}", self.line(span).map_or(0, |l| l.1)),
        }
    }

    /// File name and one-based line number of the start of `span`.
    pub fn line(&self, span: Span) -> Option<(&str, usize)> {
        let (file, range) = self.find(span)?;
        let before = &file.text.as_bytes()[..range.start];
        Some((&file.name, 1 + before.iter().filter(|b| **b == b'\n').count()))
    }
}
