//! The used cells of a sheet, packed.
//!
//! A parts list may hold a million cells. Each takes sixteen bytes here and
//! texts are kept once, so that a sheet in memory is smaller than its XML.

use std::hash::BuildHasher;

use rustc_hash::FxBuildHasher;

pub use crate::source::cell_name as a1;

/// What a cell shows.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Value<'a> {
    /// Nothing.
    Empty,
    /// Text; also a number that is stored as text.
    Text(&'a str),
    /// A number as it is stored (25 % is 0.25). [`number_text`] writes it.
    Number(f64),
    /// `TRUE` or `FALSE`.
    Bool(bool),
    /// A number or text that the cell's format shows as a date, a time or a
    /// duration; here in ISO form.
    Date(&'a str),
    /// An error value such as `#DIV/0!`.
    Error(&'a str),
    /// A formula whose value was not stored by the program that wrote it.
    NoCache,
}

/// The shortest text that reads back as the same number.
pub fn number_text(value: f64) -> String {
    let plain = format!("{value}");
    // Very large and very small numbers would be hundreds of digits long.
    if plain.len() > 21 { format!("{value:e}").replace('e', "E") } else { plain }
}

/// One cell of a sheet.
#[derive(Clone, Copy, PartialEq, Debug)]
#[non_exhaustive]
pub struct Cell<'a> {
    /// The row, counted from 0.
    pub row: u32,
    /// The column, counted from 0.
    pub column: u32,
    /// What it shows; the stored result where it holds a formula.
    pub value: Value<'a>,
    /// Whether it holds a formula or is part of an array formula's result.
    /// Such a cell is never written.
    pub formula: bool,
    /// Whether its number format is a percentage.
    pub percent: bool,
    /// Whether it has no number format of the user's: General, none at all, or
    /// one that [`Book::write`](super::Book::write) gave it.
    pub general: bool,
    /// The first cell of the merged range that hides this one. The first cell
    /// itself has `None`.
    pub merged_into: Option<(u32, u32)>,
    /// Whether the sheet's protection keeps users from typing here.
    pub protected: bool,
}

/// The largest row and column that a sheet can have, counted from 0.
pub(super) const LAST_ROW: u32 = (1 << 20) - 1;
pub(super) const LAST_COLUMN: u32 = (1 << 14) - 1;

/// Row and column of `B7`, `$B$7`; `None` for anything else.
pub(super) fn parse_a1(text: &str) -> Option<(u32, u32)> {
    let mut column = 0u32;
    let text = text.strip_prefix('$').unwrap_or(text).as_bytes();
    let mut at = 0;
    while let Some(letter) = text.get(at).filter(|b| b.is_ascii_alphabetic()) {
        column = column * 26 + u32::from(letter.to_ascii_uppercase() - b'A') + 1;
        at += 1;
        if at > 3 {
            return None;
        }
    }
    let digits = &text[at..];
    let digits = digits.strip_prefix(b"$").unwrap_or(digits);
    if digits.is_empty() || digits.len() > 7 || !digits.iter().all(u8::is_ascii_digit) {
        return None;
    }
    let row = digits.iter().fold(0u32, |n, d| n * 10 + u32::from(d - b'0'));
    let (row, column) = (row.checked_sub(1)?, column.checked_sub(1)?);
    (row <= LAST_ROW && column <= LAST_COLUMN).then_some((row, column))
}

/// A block of cells, both corners included.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) struct Block {
    pub(super) first: (u32, u32),
    pub(super) last: (u32, u32),
}

impl Block {
    /// The block that `B2:C7` or `B2` names.
    pub(super) fn parse(text: &str) -> Option<Block> {
        let (a, b) = text.split_once(':').unwrap_or((text, text));
        let (a, b) = (parse_a1(a)?, parse_a1(b)?);
        Some(Block { first: (a.0.min(b.0), a.1.min(b.1)), last: (a.0.max(b.0), a.1.max(b.1)) })
    }

    pub(super) fn holds(&self, row: u32, column: u32) -> bool {
        (self.first.0..=self.last.0).contains(&row) && (self.first.1..=self.last.1).contains(&column)
    }
}

/// Texts that are kept once.
#[derive(Clone, Default, Debug)]
pub(super) struct Texts {
    all: String,
    ends: Vec<usize>,
    /// Open addressing over `ends`: the texts themselves are the keys.
    slots: Vec<u32>,
}

impl Texts {
    pub(super) fn get(&self, id: u32) -> &str {
        let id = id as usize;
        let start = id.checked_sub(1).and_then(|i| self.ends.get(i)).copied().unwrap_or(0);
        self.ends.get(id).and_then(|end| self.all.get(start..*end)).unwrap_or("")
    }

    pub(super) fn add(&mut self, text: &str) -> u32 {
        if self.ends.len() * 2 >= self.slots.len() {
            let size = (self.slots.len() * 2).max(64);
            self.slots = vec![u32::MAX; size];
            for id in 0..u32::try_from(self.ends.len()).unwrap_or(u32::MAX) {
                let slot = self.slot(self.get(id));
                self.slots[slot] = id;
            }
        }
        let slot = self.slot(text);
        if self.slots[slot] == u32::MAX {
            self.all.push_str(text);
            self.slots[slot] = u32::try_from(self.ends.len()).unwrap_or(u32::MAX);
            self.ends.push(self.all.len());
        }
        self.slots[slot]
    }

    /// Where `text` stands or would stand.
    fn slot(&self, text: &str) -> usize {
        let hash = FxBuildHasher.hash_one(text);
        let mask = self.slots.len() - 1;
        let mut slot = usize::try_from(hash & mask as u64).unwrap_or(0);
        while self.slots[slot] != u32::MAX && self.get(self.slots[slot]) != text {
            slot = (slot + 1) & mask;
        }
        slot
    }
}

/// How a style shows numbers.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) struct Look {
    pub(super) percent: bool,
    pub(super) general: bool,
    pub(super) locked: bool,
}

impl Default for Look {
    fn default() -> Look {
        Look { percent: false, general: true, locked: true }
    }
}

/// What the packed value is.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Sort {
    Empty,
    Text,
    Number,
    Bool,
    Date,
    Error,
    NoCache,
}

/// One cell, packed.
#[derive(Clone, Copy, Debug)]
pub(super) struct Packed {
    value: u64,
    /// Style or look, by its number in the file or in the book.
    pub(super) look: u32,
    pub(super) column: u16,
    pub(super) sort: Sort,
    /// Bit 0: formula; bit 1: hidden by a merge.
    flags: u8,
}

const FORMULA: u8 = 1;
const MERGED: u8 = 2;

impl Packed {
    pub(super) fn new(column: u32, look: u32, formula: bool) -> Packed {
        let column = u16::try_from(column.min(LAST_COLUMN)).unwrap_or(0);
        Packed { value: 0, look, column, sort: Sort::Empty, flags: u8::from(formula) * FORMULA }
    }

    /// The same in another column.
    pub(super) fn moved(mut self, column: u32) -> Packed {
        self.column = u16::try_from(column.min(LAST_COLUMN)).unwrap_or(0);
        self
    }

    /// Takes over another cell's value.
    pub(super) fn take(&mut self, other: &Packed) {
        (self.sort, self.value) = (other.sort, other.value);
    }

    pub(super) fn number(&mut self, value: f64) {
        (self.sort, self.value) = (Sort::Number, value.to_bits());
    }

    pub(super) fn set(&mut self, sort: Sort, value: u32) {
        (self.sort, self.value) = (sort, u64::from(value));
    }

    pub(super) fn formula(&self) -> bool {
        self.flags & FORMULA != 0
    }
}

/// The cells of a sheet by rows, in order.
#[derive(Clone, Default, Debug)]
pub(super) struct Grid {
    /// Each used row, where its cells begin, and the look of its unused cells.
    rows: Vec<(u32, u32, Option<u32>)>,
    cells: Vec<Packed>,
    /// Looks of whole columns: first, last, look.
    pub(super) columns: Vec<(u32, u32, u32)>,
    pub(super) merges: Vec<Block>,
    pub(super) arrays: Vec<Block>,
    ordered: bool,
}

impl Grid {
    /// Begins a row; its cells follow with [`Grid::push`].
    pub(super) fn row(&mut self, row: u32, look: Option<u32>) {
        let in_order = self.rows.last().is_none_or(|last| last.0 < row);
        self.ordered = in_order && (self.ordered || self.rows.is_empty());
        self.rows.push((row, u32::try_from(self.cells.len()).unwrap_or(u32::MAX), look));
    }

    pub(super) fn push(&mut self, cell: Packed) {
        let start = self.rows.last().map_or(0, |r| r.1 as usize);
        if self.cells.len() > start && self.cells.last().is_some_and(|c| c.column >= cell.column) {
            self.ordered = false;
        }
        self.cells.push(cell);
    }

    pub(super) fn len(&self) -> usize {
        self.cells.len()
    }

    pub(super) fn has_formula(&self) -> bool {
        self.cells.iter().any(Packed::formula)
    }

    fn span(&self, index: usize) -> std::ops::Range<usize> {
        let start = self.rows[index].1 as usize;
        let end = self.rows.get(index + 1).map_or(self.cells.len(), |next| next.1 as usize);
        start..end
    }

    /// Puts rows and cells in order and marks what merges and array formulas
    /// cover. Says what is wrong if cells stand twice or merges overlap.
    pub(super) fn finish(&mut self) -> Result<(), (u32, u32, &'static str)> {
        if !self.ordered && !self.rows.is_empty() {
            return Err(self.disorder());
        }
        self.cells.shrink_to_fit();
        self.rows.shrink_to_fit();
        // Merges may not overlap, so that no cell is visited often.
        let mut budget = self.cells.len() as u64 * 4 + 1_000_000;
        let blocks: Vec<(Block, u8)> = (self.merges.iter().map(|b| (*b, MERGED)))
            .chain(self.arrays.iter().map(|b| (*b, FORMULA)))
            .collect();
        for (block, flag) in blocks {
            let from = self.rows.partition_point(|r| r.0 < block.first.0);
            for index in from..self.rows.len() {
                if self.rows[index].0 > block.last.0 {
                    break;
                }
                let row = self.rows[index].0;
                let span = self.span(index);
                let cells = &mut self.cells[span];
                let start = cells.partition_point(|c| u32::from(c.column) < block.first.1);
                for cell in cells[start..].iter_mut().take_while(|c| u32::from(c.column) <= block.last.1) {
                    if flag == FORMULA || (row, u32::from(cell.column)) != block.first {
                        cell.flags |= flag;
                    }
                    budget = budget.saturating_sub(1);
                }
                budget = budget.saturating_sub(1);
                if budget == 0 {
                    return Err((block.first.0, block.first.1, "merged ranges or array formulas overlap"));
                }
            }
        }
        Ok(())
    }

    fn disorder(&self) -> (u32, u32, &'static str) {
        let why = "rows or cells stand twice or out of order";
        for pair in self.rows.windows(2) {
            if pair[1].0 <= pair[0].0 {
                return (pair[1].0, 0, why);
            }
        }
        for index in 0..self.rows.len() {
            let cells = &self.cells[self.span(index)];
            if let Some(pair) = cells.windows(2).find(|p| p[1].column <= p[0].column) {
                return (self.rows[index].0, u32::from(pair[1].column), why);
            }
        }
        (0, 0, why)
    }

    /// The used rows in order, by index.
    pub(super) fn row_count(&self) -> usize {
        self.rows.len()
    }

    pub(super) fn row_at(&self, index: usize) -> (u32, &[Packed]) {
        (self.rows[index].0, &self.cells[self.span(index)])
    }

    /// The packed cell at a place, if the file has one there.
    pub(super) fn find(&self, row: u32, column: u32) -> Option<&Packed> {
        let index = self.rows.binary_search_by_key(&row, |r| r.0).ok()?;
        let cells = &self.cells[self.span(index)];
        cells.binary_search_by_key(&column, |c| u32::from(c.column)).ok().map(|at| &cells[at])
    }

    /// The look that an unused cell takes from its row or column.
    pub(super) fn inherited(&self, row: u32, column: u32) -> Option<u32> {
        let own = self.rows.binary_search_by_key(&row, |r| r.0).ok().and_then(|i| self.rows[i].2);
        own.or_else(|| {
            self.columns.iter().find(|(a, b, _)| (*a..=*b).contains(&column)).map(|(_, _, look)| *look)
        })
    }

    /// The cell with everything known about it, also where none is used.
    pub(super) fn view<'a>(
        &self,
        row: u32,
        column: u32,
        packed: Option<&Packed>,
        texts: &'a Texts,
        looks: &[Look],
        protected: bool,
    ) -> Cell<'a> {
        let look = packed.map(|p| p.look).or_else(|| self.inherited(row, column)).unwrap_or(0);
        let look = looks.get(look as usize).copied().unwrap_or_default();
        let merged = packed.is_none_or(|p| p.flags & MERGED != 0);
        let block = self.merges.iter().filter(|_| merged).find(|b| b.holds(row, column));
        let formula = match packed {
            Some(p) => p.formula(),
            None => self.arrays.iter().any(|b| b.holds(row, column)),
        };
        let value = packed.map_or(Value::Empty, |p| {
            let text = || texts.get(u32::try_from(p.value).unwrap_or(u32::MAX));
            match p.sort {
                Sort::Empty => Value::Empty,
                Sort::Text => Value::Text(text()),
                Sort::Number => Value::Number(f64::from_bits(p.value)),
                Sort::Bool => Value::Bool(p.value != 0),
                Sort::Date => Value::Date(text()),
                Sort::Error => Value::Error(text()),
                Sort::NoCache => Value::NoCache,
            }
        });
        Cell {
            row,
            column,
            value,
            formula,
            percent: look.percent,
            general: look.general,
            merged_into: block.map(|b| b.first).filter(|first| *first != (row, column)),
            protected: protected && look.locked,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn addresses_go_both_ways() {
        for (row, column, text) in
            [(0, 0, "A1"), (1, 27, "AB2"), (9, 25, "Z10"), (LAST_ROW, LAST_COLUMN, "XFD1048576")]
        {
            assert_eq!(a1(row, column), text);
            assert_eq!(parse_a1(text), Some((row, column)));
        }
        assert_eq!(parse_a1("$C$4"), Some((3, 2)));
        for bad in ["", "A", "1", "A0", "XFE1", "A1048577", "ABCD1", "A1B", "A99999999"] {
            assert_eq!(parse_a1(bad), None, "{bad}");
        }
    }

    #[test]
    fn texts_are_kept_once() {
        let mut texts = Texts::default();
        let ids: Vec<u32> = (0..500).map(|i| texts.add(&format!("t{}", i % 200))).collect();
        assert_eq!(ids[3], ids[203]);
        assert_eq!(texts.get(ids[199]), "t199");
        assert_eq!(texts.add(""), texts.add(""));
    }

    #[test]
    fn numbers_are_written_shortest() {
        assert_eq!(number_text(0.1), "0.1");
        assert_eq!(number_text(1e-300), "1E-300");
        assert_eq!(number_text(-1234.5), "-1234.5");
        assert_eq!(number_text(6.02e23), "6.02E23");
    }

    #[test]
    fn a_packed_cell_is_small() {
        assert!(size_of::<Packed>() <= 16);
    }
}
