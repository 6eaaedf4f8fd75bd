//! Rows and cells of a table that takes part.

use super::{Cell, Row};
use crate::source::Span;
use std::ops::Range;

/// Collects the rows of one table while the walk passes over it.
pub(super) struct Rows<'a> {
    text: &'a str,
    base: usize,
    /// Byte range of the row's text without trailing blanks, in the file.
    row: Range<usize>,
    cells: Vec<Cell>,
    /// End of the last cell that is really there, with its blanks.
    last: usize,
}

impl<'a> Rows<'a> {
    pub(super) fn new(text: &'a str, base: u32) -> Rows<'a> {
        Rows { text, base: base as usize, row: 0..0, cells: Vec::new(), last: 0 }
    }

    /// A row begins.
    pub(super) fn begin(&mut self, range: Range<usize>) {
        let row = &self.text[range.clone()];
        self.row = range.start..range.start + row.trim_end().len();
        self.cells.clear();
        self.last = range.start;
    }

    /// A cell of the row, with its padding. Cells that the row lacks come as
    /// empty ranges at or past its end.
    pub(super) fn cell(&mut self, range: Range<usize>) {
        let missing = range.is_empty() && range.start >= self.row.end;
        let end = range.end.min(self.row.end);
        let inner = &self.text[range.start.min(end)..end];
        let trimmed = inner.trim();
        let (at, len, before, after) = if missing {
            (self.row.end, 0, false, false)
        } else if trimmed.is_empty() {
            let first = inner.chars().next().map_or(0, char::len_utf8);
            // Text goes behind the first blank and keeps the others behind it.
            (range.start + first, 0, first == 0, inner.len() == first)
        } else {
            (range.start + (inner.len() - inner.trim_start().len()), trimmed.len(), false, false)
        };
        if !missing {
            self.last = end;
        }
        self.cells.push(Cell {
            text: Span::new(self.base + at, self.base + at + len),
            space_before: before,
            space_after: after,
            missing,
        });
    }

    /// The row ends. pulldown-cmark drops cells beyond the header's count
    /// without a word, so what stands after the last cell is looked at here.
    pub(super) fn end(&mut self) -> Row {
        let rest = self.text[self.last.min(self.row.end)..self.row.end].trim_start();
        let after = rest.strip_prefix('|').unwrap_or(rest);
        let complete = self.cells.last().is_some_and(|c| !c.missing);
        Row {
            open: rest.is_empty(),
            end: (self.base + self.row.end) as u32,
            too_many: complete && !after.trim().is_empty(),
            cells: std::mem::take(&mut self.cells),
        }
    }

    /// The span of the current row.
    pub(super) fn span(&self) -> Span {
        Span::new(self.base + self.row.start, self.base + self.row.end)
    }
}
