//! The cells that matter as one text, so that the language reads them like any
//! other source and every span still knows its cell.

use super::find::{Found, Header, Setting};
use super::rows::{Content, Opened, RowCell};
use crate::language::{CellKind, Cells, Grid, GridForm, HeaderKind, Source};
use crate::source::{CellAt, CellMap, Sources, Span};
use std::fmt::Write;

/// A table by its entries among the cells of the text.
#[derive(Clone, Debug)]
pub(super) struct Table {
    /// The entry of its names' header.
    opener: u32,
    /// The entries of its headers, from left to right.
    header: Vec<u32>,
    /// Of each header, which of a row's entries is its; foreign columns have none.
    kept: Vec<Option<u32>>,
    /// The first entry of each row.
    rows: Vec<u32>,
}

/// The cells of all tables and settings of a file.
#[derive(Clone, Debug, Default)]
pub(super) struct SheetText {
    pub(super) text: String,
    pub(super) map: CellMap,
    /// Of each entry its kind, and whether a formula computes it.
    kinds: Vec<(CellKind, bool)>,
    pub(super) tables: Vec<Table>,
    /// The entries of the settings' lines, with what was found.
    pub(super) settings: Vec<(u32, Setting)>,
}

/// More text than one run can hold.
pub(super) struct TooMuch;

/// A table whose rows still come.
struct Open<'h> {
    header: &'h Header,
    /// Sheet columns of a row's entries, and whether the column takes answers.
    columns: Vec<u32>,
    table: Table,
}

impl SheetText {
    /// Puts the cells together.
    pub(super) fn new(opened: &Opened, found: &Found) -> Result<SheetText, TooMuch> {
        let mut out = SheetText::default();
        out.map.sheets = opened.names();
        for sheet in 0..out.map.sheets.len() {
            for setting in found.settings.iter().filter(|s| s.sheet == sheet) {
                let line = format!("{} {}", setting.word, setting.value);
                let at = out.add(sheet, setting.row, setting.column, setting.kind, false, &line);
                out.settings.push((at, setting.clone()));
            }
            let mut tables: Vec<Open<'_>> = found
                .headers
                .iter()
                .filter(|h| h.sheet == sheet)
                .map(|header| out.open(header, found))
                .collect();
            if tables.is_empty() {
                continue;
            }
            let first = tables.iter().map(|t| t.header.row).min().unwrap_or(0);
            // Tables that are open at a row; they come in the order of their rows.
            let mut from = 0;
            opened.each_row(sheet, |row, cells| {
                if row <= first || out.text.len() > Sources::LIMIT {
                    return;
                }
                while tables.get(from).is_some_and(|t| t.header.end <= row) {
                    from += 1;
                }
                for open in &mut tables[from..] {
                    if open.header.row >= row {
                        break;
                    }
                    if row < open.header.end {
                        out.row(open, row, cells);
                    }
                }
            });
            out.tables.extend(tables.into_iter().map(|open| open.table));
        }
        if out.text.len() > Sources::LIMIT || u32::try_from(out.map.cells.len()).is_err() {
            return Err(TooMuch);
        }
        Ok(out)
    }

    fn open<'h>(&mut self, header: &'h Header, found: &Found) -> Open<'h> {
        let mut table = Table { opener: 0, header: Vec::new(), kept: Vec::new(), rows: Vec::new() };
        let mut columns = Vec::new();
        for ((column, text), kind) in header.cells.iter().zip(header.kinds(&found.declared)) {
            let entry = self.add(header.sheet, header.row, *column, CellKind::Text, false, text);
            table.header.push(entry);
            if kind == HeaderKind::Name {
                table.opener = entry;
            }
            let keep = kind != HeaderKind::Foreign;
            table.kept.push(keep.then_some(columns.len() as u32));
            if keep {
                columns.push(*column);
            }
        }
        Open { header, columns, table }
    }

    /// Adds the cells of a row that stand in a table's columns, blank ones as
    /// well: an answer may go there.
    fn row(&mut self, open: &mut Open<'_>, row: u32, cells: &[RowCell<'_>]) {
        let find = |column: &u32| cells.binary_search_by_key(column, |c| c.column).ok().map(|at| &cells[at]);
        if !open.columns.iter().filter_map(find).any(|c| !c.content.is_blank()) {
            return;
        }
        open.table.rows.push(self.map.cells.len() as u32);
        for column in &open.columns {
            let cell = find(column);
            let content = cell.map_or(&Content::Empty, |c| &c.content);
            let formula = cell.is_some_and(|c| c.formula);
            self.begin(open.header.sheet, row, *column, content.kind(), formula);
            match content {
                Content::Empty | Content::NoValue => {}
                Content::Text(text) => self.push_text(text),
                Content::Number(number) => self.push_number(*number),
                Content::Date(text) | Content::Failed(text) => self.push_text(text),
                Content::Logical(it) => self.text.push_str(if *it { "TRUE" } else { "FALSE" }),
            }
            self.text.push('\n');
        }
    }

    fn begin(&mut self, sheet: usize, row: u32, column: u32, kind: CellKind, formula: bool) {
        let start = self.text.len() as u32;
        self.map.cells.push(CellAt { start, row, sheet: sheet as u16, column: column as u16 });
        self.kinds.push((kind, formula));
    }

    fn add(&mut self, sheet: usize, row: u32, column: u32, kind: CellKind, formula: bool, text: &str) -> u32 {
        self.begin(sheet, row, column, kind, formula);
        self.push_text(text);
        self.text.push('\n');
        self.map.cells.len() as u32 - 1
    }

    /// A cell is one line here, whatever breaks its own text has.
    fn push_text(&mut self, text: &str) {
        let text = text.trim();
        if text.contains(['\n', '\r', '\t']) {
            self.text.extend(text.chars().map(|c| if matches!(c, '\n' | '\r' | '\t') { ' ' } else { c }));
        } else {
            self.text.push_str(text);
        }
    }

    /// The shortest decimal that is this number.
    fn push_number(&mut self, number: f64) {
        let before = self.text.len();
        // A text takes all that is written into it.
        let _ = write!(self.text, "{number}");
        if self.text.len() - before > 21 {
            self.text.truncate(before);
            let _ = write!(self.text, "{number:e}");
        }
    }
}

/// The text of a file's cells within the common count of sources.
#[derive(Clone, Copy)]
pub(super) struct Based<'a> {
    pub(super) text: &'a str,
    pub(super) base: u32,
    pub(super) map: &'a CellMap,
    pub(super) kinds: &'a [(CellKind, bool)],
}

impl<'a> Based<'a> {
    /// The place of an entry's text.
    pub(super) fn span(&self, entry: usize) -> Span {
        let start = self.map.cells.get(entry).map_or(self.text.len(), |c| c.start as usize);
        let end = self.map.cells.get(entry + 1).map_or(self.text.len(), |c| c.start as usize);
        let end = end.saturating_sub(1).max(start);
        Span { start: self.base + start as u32, end: self.base + end as u32 }
    }

    /// The text of an entry with its place.
    pub(super) fn source(&self, entry: usize) -> Source<'a> {
        let span = self.span(entry);
        let range = (span.start - self.base) as usize..(span.end - self.base) as usize;
        Source { text: self.text.get(range).unwrap_or(""), at: span.start }
    }

    /// The grid of a table.
    pub(super) fn grid(self, table: &'a Table, formulas: bool, block: u32) -> Grid<'a> {
        Grid {
            opener: self.span(table.opener as usize),
            header: table.header.iter().map(|entry| self.source(*entry as usize)).collect(),
            cells: Box::new(TableCells { based: self, table }),
            broken: Vec::new(),
            form: GridForm::Sheet { formulas },
            block,
        }
    }
}

impl Table {
    /// The entry of a cell, by row and column of the grid.
    pub(super) fn entry(&self, row: usize, column: usize) -> Option<usize> {
        let kept = (*self.kept.get(column)?)?;
        Some((*self.rows.get(row)? + kept) as usize)
    }

    /// The entries of a row: the first, and one past the last.
    pub(super) fn row_entries(&self, row: usize) -> (usize, usize) {
        let first = self.rows.get(row).map_or(0, |first| *first as usize);
        (first, first + self.kept.iter().flatten().count())
    }

    /// The entry of a header.
    pub(super) fn header_entry(&self, column: usize) -> usize {
        self.header.get(column).map_or(0, |entry| *entry as usize)
    }
}

struct TableCells<'a> {
    based: Based<'a>,
    table: &'a Table,
}

impl<'a> Cells<'a> for TableCells<'a> {
    fn rows(&self) -> usize {
        self.table.rows.len()
    }

    fn text(&self, row: usize, column: usize) -> Option<Source<'a>> {
        self.table.entry(row, column).map(|entry| self.based.source(entry))
    }

    fn kind(&self, row: usize, column: usize) -> CellKind {
        let entry = self.table.entry(row, column);
        entry.and_then(|entry| self.based.kinds.get(entry)).map_or(CellKind::Text, |kind| kind.0)
    }

    fn formula(&self, row: usize, column: usize) -> bool {
        self.table.entry(row, column).and_then(|entry| self.based.kinds.get(entry)).is_some_and(|kind| kind.1)
    }
}

impl SheetText {
    /// The same once its text stands among the sources.
    pub(super) fn kinds(&mut self) -> Vec<(CellKind, bool)> {
        std::mem::take(&mut self.kinds)
    }
}
