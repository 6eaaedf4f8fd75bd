//! Sheets as text: the cells of a workbook or of a delimited file, end to end,
//! so that the language reads them like any other source and every span still
//! knows its cell.

use crate::source::Span;
use std::ops::Range;

/// What stands in a cell, as far as the language cares.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Kind {
    /// Text, or nothing.
    Text,
    /// A number.
    Number,
    /// A date or a time: the spreadsheet has turned something into one.
    Date,
    /// True or false.
    Logical,
    /// A formula's error, such as a division by zero.
    Failed,
    /// A formula that the file holds no value for.
    NoValue,
}

/// A cell of a sheet.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct SheetCell {
    /// Which sheet.
    pub sheet: u32,
    /// Row, from 0.
    pub row: u32,
    /// Column, from 0.
    pub column: u32,
    /// What stands in it.
    pub kind: Kind,
    /// Whether a formula computes it.
    pub formula: bool,
    start: u32,
    end: u32,
}

/// The cells of all sheets of one file, row by row.
#[derive(Clone, Debug, Default)]
pub struct Sheets {
    /// The texts of all cells, each on a line of its own.
    pub text: String,
    /// The names of the sheets.
    pub names: Vec<String>,
    cells: Vec<SheetCell>,
}

impl Sheets {
    /// Starts a sheet; cells that are added from now on are its.
    pub fn start_sheet(&mut self, name: &str) {
        self.names.push(name.to_string());
    }

    /// Adds a cell; cells come row by row, each row from left to right.
    pub fn add(&mut self, row: u32, column: u32, kind: Kind, formula: bool, text: &str) {
        let start = self.text.len() as u32;
        self.text.push_str(text.trim());
        let end = self.text.len() as u32;
        self.text.push('\n');
        let sheet = self.names.len().saturating_sub(1) as u32;
        self.cells.push(SheetCell { sheet, row, column, kind, formula, start, end });
    }

    /// The cell that holds a place in the text.
    pub fn cell_at(&self, offset: u32) -> Option<&SheetCell> {
        let after = self.cells.partition_point(|c| c.start <= offset);
        self.cells.get(after.checked_sub(1)?)
    }

    /// The text of a cell.
    pub fn text_of(&self, cell: &SheetCell) -> &str {
        &self.text[cell.start as usize..cell.end as usize]
    }

    /// Where a cell's text stands, in the common count of sources.
    pub fn span(&self, cell: &SheetCell, base: u32) -> Span {
        Span { start: base + cell.start, end: base + cell.end }
    }

    /// The rows that hold cells: sheet, row, and the range of their cells.
    fn rows(&self) -> Vec<Range<usize>> {
        let mut rows = Vec::new();
        let mut start = 0;
        for at in 1..=self.cells.len() {
            let here = &self.cells[at - 1];
            let ends = self.cells.get(at).is_none_or(|c| (c.sheet, c.row) != (here.sheet, here.row));
            if ends {
                rows.push(start..at);
                start = at;
            }
        }
        rows
    }

    /// The cells of a range.
    fn cells(&self, range: &Range<usize>) -> &[SheetCell] {
        &self.cells[range.clone()]
    }
}

/// A table found on a sheet: its header cells and, for each row under it, the
/// cells by column of the header.
#[derive(Clone, Debug)]
pub struct SheetTable {
    /// The sheet.
    pub sheet: u32,
    /// The header cells, left to right.
    pub header: Vec<SheetCell>,
    /// The rows: row number, and for each header its cell if it is not blank.
    pub rows: Vec<(u32, Vec<Option<SheetCell>>)>,
}

/// A setting above a table: the word in one cell, its value in the next.
pub type SheetSetting = (SheetCell, SheetCell);

/// Finds the tables and the settings of all sheets.
///
/// `takes_part` says of a row of header texts whether it heads a table;
/// `starter` whether a word begins a setting.
pub fn find_tables(
    sheets: &Sheets,
    takes_part: &dyn Fn(&[&str]) -> bool,
    starter: &dyn Fn(&str) -> bool,
) -> (Vec<SheetTable>, Vec<SheetSetting>) {
    let mut tables: Vec<SheetTable> = Vec::new();
    let mut settings = Vec::new();
    // Tables of the sheet at hand whose rows still come, by position in `tables`.
    let mut open: Vec<usize> = Vec::new();
    let mut sheet = u32::MAX;
    for row in sheets.rows() {
        let cells = sheets.cells(&row);
        let Some(first) = cells.first() else { continue };
        if first.sheet != sheet {
            sheet = first.sheet;
            open.clear();
        }
        for run in runs(cells, sheets) {
            let texts: Vec<&str> = run.iter().map(|c| sheets.text_of(c)).collect();
            if takes_part(&texts) {
                let columns = run[0].column..=run[run.len() - 1].column;
                open.retain(|t| {
                    let header = &tables[*t].header;
                    let (a, b) = (header[0].column, header[header.len() - 1].column);
                    b < *columns.start() || a > *columns.end()
                });
                open.push(tables.len());
                tables.push(SheetTable { sheet, header: run.to_vec(), rows: Vec::new() });
            }
        }
        let number = first.row;
        for &at in &open {
            let table = &mut tables[at];
            if table.header[0].row == number {
                continue;
            }
            let found: Vec<Option<SheetCell>> = table
                .header
                .iter()
                .map(|h| cells.binary_search_by_key(&h.column, |c| c.column).ok().map(|i| cells[i]))
                .map(|c| c.filter(|c| c.end > c.start || c.formula || c.kind != Kind::Text))
                .collect();
            if found.iter().any(Option::is_some) {
                table.rows.push((number, found));
            }
        }
        if open.is_empty() {
            for pair in cells.windows(2) {
                if pair[1].column == pair[0].column + 1
                    && starter(sheets.text_of(&pair[0]))
                    && !sheets.text_of(&pair[1]).is_empty()
                {
                    settings.push((pair[0], pair[1]));
                }
            }
        }
    }
    (tables, settings)
}

/// Runs of neighbouring cells that are not blank.
fn runs<'c>(cells: &'c [SheetCell], sheets: &Sheets) -> Vec<&'c [SheetCell]> {
    let mut found = Vec::new();
    let mut start = 0;
    for at in 0..=cells.len() {
        let blank = cells.get(at).is_none_or(|c| sheets.text_of(c).is_empty());
        let apart = at > start && cells.get(at).is_some_and(|c| c.column != cells[at - 1].column + 1);
        if blank || apart {
            if at > start {
                found.push(&cells[start..at]);
            }
            start = if blank { at + 1 } else { at };
        }
    }
    found
}

/// A cell's name: `C7`.
pub fn cell_name(row: u32, column: u32) -> String {
    let mut letters = Vec::new();
    let mut at = column + 1;
    while at > 0 {
        letters.push(b'A' + ((at - 1) % 26) as u8);
        at = (at - 1) / 26;
    }
    let letters: String = letters.iter().rev().map(|b| char::from(*b)).collect();
    format!("{letters}{}", row + 1)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sheets(rows: &[&[&str]]) -> Sheets {
        let mut sheets = Sheets::default();
        sheets.start_sheet("One");
        for (r, row) in rows.iter().enumerate() {
            for (c, text) in row.iter().enumerate() {
                sheets.add(r as u32, c as u32, Kind::Text, false, text);
            }
        }
        sheets
    }

    fn found(rows: &[&[&str]]) -> (Vec<(usize, usize)>, usize) {
        let sheets = sheets(rows);
        let heads = |texts: &[&str]| texts.contains(&"name") && texts.len() > 1;
        let (tables, settings) = find_tables(&sheets, &heads, &|w| w == "mission");
        (tables.iter().map(|t| (t.header.len(), t.rows.len())).collect(), settings.len())
    }

    #[test]
    fn headers_stand_anywhere_and_tables_side_by_side() {
        let rows: &[&[&str]] = &[
            &["Title", "", "", "", "", ""],
            &["mission", "4000 h", "", "", "", ""],
            &["", "name", "rate", "", "name", "is"],
            &["", "P1", "3", "", "g", "P1"],
            &["", "", "", "", "", ""],
            &["", "P2", "3", "", "", ""],
            &["", "name", "R ?", "", "", ""],
            &["", "x", "", "", "h", "P2"],
        ];
        assert_eq!(found(rows), (vec![(2, 2), (2, 2), (2, 1)], 1));
    }

    #[test]
    fn cells_have_names() {
        assert_eq!(cell_name(0, 0), "A1");
        assert_eq!(cell_name(6, 25), "Z7");
        assert_eq!(cell_name(9, 26), "AA10");
        assert_eq!(cell_name(0, 701), "ZZ1");
        assert_eq!(cell_name(0, 702), "AAA1");
    }
}
