//! Spans as people count: lines and columns.

use crate::source::{CellPlace, SourceFile, Sources, Span};
use std::cell::{Cell, OnceCell};
use std::ops::Range;

/// A span as a file, lines and columns.
///
/// Lines and columns begin at 1; a column counts characters, not bytes, and a
/// tab is one character.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Place<'a> {
    /// The name of the file.
    pub file: &'a str,
    /// Line of the first character.
    pub line: usize,
    /// Column of the first character.
    pub column: usize,
    /// Line of the first character after the span.
    pub end_line: usize,
    /// Column of the first character after the span.
    pub end_column: usize,
    /// The cell, where the file is one of sheets: lines and columns are then
    /// those of a text that nobody sees.
    pub cell: Option<CellPlace<'a>>,
}

/// Finds lines and columns in sources; the line starts of a text are found once.
#[derive(Debug)]
pub struct Lines<'a> {
    sources: &'a Sources,
    starts: Vec<OnceCell<Vec<u32>>>,
    /// File, line start, offset and column of the last look-up. Most reports go
    /// forward, and counting on from there keeps one huge line from being
    /// counted from its start for each place in it.
    last: Cell<(usize, usize, usize, usize)>,
}

impl<'a> Lines<'a> {
    /// Looks into `sources`.
    pub fn new(sources: &'a Sources) -> Lines<'a> {
        let starts = sources.files().iter().map(|_| OnceCell::new()).collect();
        Lines { sources, starts, last: Cell::new((usize::MAX, 0, 0, 0)) }
    }

    /// Where `span` is; `None` when it is in no text.
    pub fn place(&self, span: Span) -> Option<Place<'a>> {
        let (index, file, range) = self.range(span)?;
        let (line, column) = self.line_column(index, file, range.start);
        let (end_line, end_column) = self.line_column(index, file, range.end);
        let cell = self.cell(file, range.start);
        Some(Place { file: &file.name, line, column, end_line, end_column, cell })
    }

    /// The cell that holds `at`, where the file is one of sheets.
    pub(super) fn cell(&self, file: &'a SourceFile, at: usize) -> Option<CellPlace<'a>> {
        let cells = file.cells.as_ref()?;
        cells.place(cells.at(at)?)
    }

    /// The file under `span` with its number, and the range in it, moved to
    /// whole characters so that it can always be cut.
    pub(super) fn range(&self, span: Span) -> Option<(usize, &'a SourceFile, Range<usize>)> {
        let (file, range) = self.sources.find(span)?;
        let index = self.sources.files().partition_point(|f| f.base < file.base);
        let start = char_start(&file.text, range.start);
        let end = char_end(&file.text, range.end).max(start);
        Some((index, file, start..end))
    }

    /// Number of the line that holds `at`, counted from 0.
    pub(super) fn line(&self, index: usize, file: &SourceFile, at: usize) -> usize {
        self.starts(index, file).partition_point(|s| *s as usize <= at).saturating_sub(1)
    }

    /// Range of a line (counted from 0) without its line ending.
    pub(super) fn line_range(&self, index: usize, file: &SourceFile, line: usize) -> Range<usize> {
        let starts = self.starts(index, file);
        let start = starts.get(line).map_or(file.text.len(), |s| *s as usize);
        let mut end = starts.get(line + 1).map_or(file.text.len(), |s| *s as usize - 1);
        let bytes = file.text.as_bytes();
        if end > start && bytes.get(end) == Some(&b'\n') && bytes[end - 1] == b'\r' {
            end -= 1;
        }
        start..end.max(start)
    }

    fn starts(&self, index: usize, file: &SourceFile) -> &[u32] {
        let find = || {
            let bytes = file.text.bytes().enumerate();
            std::iter::once(0).chain(bytes.filter(|(_, b)| *b == b'\n').map(|(i, _)| i as u32 + 1)).collect()
        };
        match self.starts.get(index) {
            Some(cell) => cell.get_or_init(find),
            None => &[],
        }
    }

    fn line_column(&self, index: usize, file: &SourceFile, at: usize) -> (usize, usize) {
        let line = self.line(index, file, at);
        let start = self.line_range(index, file, line).start;
        let (last_index, last_start, last_at, last_column) = self.last.get();
        let column = if (last_index, last_start) == (index, start) && last_at <= at {
            last_column + count(&file.text, last_at, at)
        } else {
            1 + count(&file.text, start, at)
        };
        self.last.set((index, start, at, column));
        (line + 1, column)
    }
}

fn count(text: &str, from: usize, to: usize) -> usize {
    text.get(from..to).map_or(0, |t| t.chars().count())
}

/// The last character boundary at or before `at`.
pub(super) fn char_start(text: &str, at: usize) -> usize {
    let mut at = at.min(text.len());
    while !text.is_char_boundary(at) {
        at -= 1;
    }
    at
}

/// The first character boundary at or after `at`.
pub(super) fn char_end(text: &str, at: usize) -> usize {
    let mut at = at.min(text.len());
    while !text.is_char_boundary(at) {
        at += 1;
    }
    at
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_count_characters_and_lines_end_at_either_ending() {
        let mut sources = Sources::default();
        sources.add("a.md", "größe\r\npump ?\n");
        let lines = Lines::new(&sources);
        let place = |start, end| {
            let p = lines.place(Span::new(start, end)).unwrap();
            (p.line, p.column, p.end_line, p.end_column)
        };
        assert_eq!(place(0, 7), (1, 1, 1, 6));
        assert_eq!(place(3, 4), (1, 3, 1, 4)); // inside `ö`: the whole character
        assert_eq!(place(9, 13), (2, 1, 2, 5));
        assert_eq!(place(16, 99), (3, 1, 3, 1));
        assert_eq!(place(14, 15), (2, 6, 2, 7));
    }

    #[test]
    fn no_text_has_no_place() {
        assert_eq!(Lines::new(&Sources::default()).place(Span::new(0, 1)), None);
    }
}
