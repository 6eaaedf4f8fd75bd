//! Which cell of which sheet a place in a text is.

use std::fmt;

/// One cell, and where its text begins.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct CellAt {
    /// First byte of its text.
    pub start: u32,
    /// Row, counted from 0.
    pub row: u32,
    /// Sheet, by its place in [`CellMap::sheets`].
    pub sheet: u16,
    /// Column, counted from 0.
    pub column: u16,
}

/// The cells that a text was put together from, end to end, a line feed after each.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct CellMap {
    /// The names of the sheets; the one of a delimited file has the empty name.
    pub sheets: Vec<String>,
    /// The cells in the order of their texts.
    pub cells: Vec<CellAt>,
}

/// A cell's place in words: `sheet "Power", cell C7`, or `cell C7` where there is one sheet without a name.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct CellPlace<'a> {
    /// The sheet; `None` in a delimited file.
    pub sheet: Option<&'a str>,
    /// Row, counted from 0.
    pub row: u32,
    /// Column, counted from 0.
    pub column: u32,
}

impl CellMap {
    /// The number of the cell that holds a byte of the text.
    pub fn at(&self, offset: usize) -> Option<usize> {
        self.cells.partition_point(|c| c.start as usize <= offset).checked_sub(1)
    }

    /// Where a cell is.
    pub fn place(&self, cell: usize) -> Option<CellPlace<'_>> {
        let cell = self.cells.get(cell)?;
        let sheet = self.sheets.get(usize::from(cell.sheet)).map(String::as_str);
        let sheet = sheet.filter(|name| !name.is_empty());
        Some(CellPlace { sheet, row: cell.row, column: cell.column.into() })
    }
}

impl CellPlace<'_> {
    /// The cell alone: `C7`.
    pub fn cell(&self) -> String {
        cell_name(self.row, self.column)
    }

    /// As one word, the way formulas write it: `Power!C7`, `'Main pumps'!C7`.
    pub fn short(&self) -> String {
        let Some(sheet) = self.sheet else { return self.cell() };
        let plain = sheet.chars().all(|c| c.is_alphanumeric() || c == '_')
            && !sheet.starts_with(|c: char| c.is_ascii_digit());
        match plain {
            true => format!("{sheet}!{}", self.cell()),
            false => format!("'{}'!{}", sheet.replace('\'', "''"), self.cell()),
        }
    }
}

impl fmt::Display for CellPlace<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(sheet) = self.sheet {
            write!(f, "sheet \"{sheet}\", ")?;
        }
        write!(f, "cell {}", self.cell())
    }
}

/// The address of a cell, both counted from 0: `(6, 2)` is `C7`.
pub fn cell_name(row: u32, column: u32) -> String {
    let mut letters = Vec::new();
    let mut rest = u64::from(column) + 1;
    while rest > 0 {
        rest -= 1;
        letters.push(b'A' + u8::try_from(rest % 26).unwrap_or(0));
        rest /= 26;
    }
    let letters: String = letters.iter().rev().map(|b| char::from(*b)).collect();
    format!("{letters}{}", u64::from(row) + 1)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cells_have_names() {
        for (row, column, name) in
            [(0, 0, "A1"), (6, 25, "Z7"), (9, 26, "AA10"), (0, 701, "ZZ1"), (0, 702, "AAA1")]
        {
            assert_eq!(cell_name(row, column), name);
        }
    }

    #[test]
    fn places_are_words() {
        let cell = |start, sheet, column| CellAt { start, row: 6, sheet, column };
        let map = CellMap {
            sheets: ["Power", "Main 'A'", ""].map(String::from).to_vec(),
            cells: vec![cell(0, 0, 2), cell(4, 1, 0), cell(9, 2, 1)],
        };
        let words = |offset| map.at(offset).and_then(|c| map.place(c)).map(|p| (p.to_string(), p.short()));
        assert_eq!(words(3), Some(("sheet \"Power\", cell C7".into(), "Power!C7".into())));
        assert_eq!(words(4), Some(("sheet \"Main 'A'\", cell A7".into(), "'Main ''A'''!A7".into())));
        assert_eq!(words(99), Some(("cell B7".into(), "B7".into())));
        assert_eq!(CellMap::default().at(0), None);
    }
}
