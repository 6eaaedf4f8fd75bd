//! Workbooks: their cells read, and answers written into them in place.
//!
//! [`open`] reads xlsx, xlsm and ods workbooks, and for reading only xls and
//! xlsb. [`Book::write`] gives the bytes of the same workbook with answers in
//! some of its cells. Every part of the zip but the sheets that hold answers
//! is copied as it is stored, with two exceptions in xlsx: the workbook part's
//! calculation flag is set if the book holds formulas, and number formats are
//! appended to the style table for answers in cells that have none. Within a
//! sheet only the answer cells change, and with them what describes them: the
//! sheet's `dimension` and a row's `spans` grow over a cell that was not
//! there, and repeated rows and cells of an ods are divided around it.
//!
//! Values of xlsx, xls and xlsb come from the calamine crate. What it does not
//! tell (styles, merges, protection, formulas without a stored value) is read
//! here beside it. An ods is read here alone: it stores empty stretches as
//! repeats, which calamine unfolds into one dense block.
//!
//! What the layers do: `package` guards the zip, `xml` finds tags and never
//! re-writes one from its meaning, `sheet` and `ods_table` know where cells
//! stand, `cells` keeps them, `styles` and `ods_styles` know number formats.

mod binary;
mod cells;
mod depend;
mod ods;
mod ods_styles;
mod ods_table;
mod ods_write;
mod package;
mod refs;
mod sheet;
mod styles;
mod xlsx;
mod xlsx_write;
mod xml;

use std::fmt;
use std::path::{Path, PathBuf};
use std::sync::Arc;

pub use cells::{Cell, Value, a1, number_text};

use cells::{Grid, LAST_COLUMN, LAST_ROW, Look, Texts};

/// How much a workbook may ask for.
#[derive(Clone, Debug, PartialEq, Eq)]
#[non_exhaustive]
pub struct Limits {
    /// Bytes that the parts of the workbook may take when unzipped, all in
    /// all; 1 GiB unless it is raised.
    pub unzipped: u64,
    /// Cells that the workbook may hold; repeats in an ods count as often as
    /// they stand. Fifty million unless it is raised.
    pub cells: u64,
}

impl Default for Limits {
    fn default() -> Limits {
        Limits { unzipped: 1 << 30, cells: 50_000_000 }
    }
}

impl Limits {
    /// The usual limits but for the bytes that may be unzipped.
    pub fn with_unzipped(bytes: u64) -> Limits {
        Limits { unzipped: bytes, ..Limits::default() }
    }

    /// The same limits but for the cells.
    #[must_use]
    pub fn with_cells(mut self, cells: u64) -> Limits {
        self.cells = cells;
        self
    }
}

/// Why a workbook could not be read or written.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct BookTrouble {
    /// The sheet, where the trouble is in one.
    pub sheet: Option<String>,
    /// The cell's address, where the trouble is in one.
    pub cell: Option<String>,
    /// The same as row and column, counted from 0.
    pub at: Option<(u32, u32)>,
    /// What is wrong.
    pub cause: String,
    /// What to do about it.
    pub mend: String,
}

impl BookTrouble {
    fn file(cause: impl Into<String>, mend: impl Into<String>) -> BookTrouble {
        BookTrouble { sheet: None, cell: None, at: None, cause: cause.into(), mend: mend.into() }
    }

    fn sheet(sheet: &str, cause: impl Into<String>, mend: impl Into<String>) -> BookTrouble {
        BookTrouble { sheet: Some(sheet.into()), ..BookTrouble::file(cause, mend) }
    }

    fn cell(sheet: &str, at: (u32, u32), cause: impl Into<String>, mend: impl Into<String>) -> BookTrouble {
        BookTrouble { cell: Some(a1(at.0, at.1)), at: Some(at), ..BookTrouble::sheet(sheet, cause, mend) }
    }

    /// A part whose XML is not what it should be.
    fn part(part: &str, cause: impl fmt::Display) -> BookTrouble {
        BookTrouble::file(
            format!("in its part `{part}`: {cause}"),
            "open it in a spreadsheet program and save it again",
        )
    }
}

impl fmt::Display for BookTrouble {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(sheet) = &self.sheet {
            write!(f, "sheet `{sheet}`")?;
            if let Some(cell) = &self.cell {
                write!(f, ", cell {cell}")?;
            }
            f.write_str(": ")?;
        }
        write!(f, "{} ({})", self.cause, self.mend)
    }
}

impl std::error::Error for BookTrouble {}

/// What goes into a cell.
#[derive(Clone, PartialEq, Debug)]
pub enum AnswerValue {
    /// A number.
    Number {
        /// The number.
        value: f64,
        /// The number format code that shows its digits, such as `0.00000000`
        /// or `0.000E+00`. It is given to the cell if that has none of the
        /// user's ([`Cell::general`]), and else passed over.
        format: Option<String>,
    },
    /// Text, which must not begin with `=`, `+`, `-` or `@`.
    Text(String),
    /// Nothing; the cell's look stays.
    Clear,
}

/// An answer and its cell.
#[derive(Clone, PartialEq, Debug)]
pub struct Answer {
    /// The sheet, by its place in [`Book::sheets`].
    pub sheet: usize,
    /// The row, counted from 0.
    pub row: u32,
    /// The column, counted from 0.
    pub column: u32,
    /// What goes there.
    pub value: AnswerValue,
}

/// Texts and looks that the sheets of a book share.
#[derive(Default, Debug)]
struct Shared {
    texts: Texts,
    looks: Vec<Look>,
}

/// One sheet.
#[derive(Clone, Debug)]
#[non_exhaustive]
pub struct Sheet {
    /// Its name.
    pub name: String,
    /// Whether it is shown.
    pub visible: bool,
    /// Whether it is protected against typing. Answers are written all the
    /// same, and it stays protected.
    pub protected: bool,
    grid: Grid,
    /// The part that holds it.
    part: String,
    shared: Arc<Shared>,
}

impl Sheet {
    /// The used rows in order.
    pub fn rows(&self) -> impl DoubleEndedIterator<Item = Row<'_>> + ExactSizeIterator {
        (0..self.grid.row_count()).map(|index| Row { sheet: self, index })
    }

    /// The cell at a place, also where the file has none.
    pub fn at(&self, row: u32, column: u32) -> Cell<'_> {
        self.view(row, column, self.grid.find(row, column))
    }

    /// How many cells the file holds for this sheet, empty ones with a style
    /// included.
    pub fn used(&self) -> usize {
        self.grid.len()
    }

    fn view(&self, row: u32, column: u32, packed: Option<&cells::Packed>) -> Cell<'_> {
        self.grid.view(row, column, packed, &self.shared.texts, &self.shared.looks, self.protected)
    }
}

/// A used row of a sheet.
#[derive(Clone, Copy, Debug)]
pub struct Row<'a> {
    sheet: &'a Sheet,
    index: usize,
}

impl<'a> Row<'a> {
    /// Its number, counted from 0.
    pub fn number(&self) -> u32 {
        self.sheet.grid.row_at(self.index).0
    }

    /// Its used cells in order of their columns. Empty ones are among them if
    /// the file keeps a style for them.
    pub fn cells(&self) -> impl DoubleEndedIterator<Item = Cell<'a>> + ExactSizeIterator + use<'a> {
        let sheet = self.sheet;
        let (row, cells) = sheet.grid.row_at(self.index);
        cells.iter().map(move |packed| sheet.view(row, u32::from(packed.column), Some(packed)))
    }
}

/// How a book is stored.
#[derive(Clone, Debug)]
enum Storage {
    /// An xlsx or xlsm: its workbook part and style table.
    Xlsx { workbook: String, styles: Option<String> },
    /// An ods.
    Ods,
    /// An xls or xlsb, which is only read.
    Binary,
}

/// A workbook as it was read.
#[derive(Debug)]
pub struct Book {
    bytes: Vec<u8>,
    limits: Limits,
    storage: Storage,
    sheets: Vec<Sheet>,
    read_only: Option<String>,
}

/// Reads a workbook. Its name is only used in messages: what it is, is told
/// from its bytes.
pub fn open(name: &str, bytes: Vec<u8>, limits: &Limits) -> Result<Book, BookTrouble> {
    const COMPOUND: &[u8] = &[0xd0, 0xcf, 0x11, 0xe0, 0xa1, 0xb1, 0x1a, 0xe1];
    if bytes.starts_with(COMPOUND) {
        return binary::open_xls(bytes, limits);
    }
    if !bytes.starts_with(b"PK") {
        return Err(BookTrouble::file(
            format!("`{name}` is no workbook: neither a zip file nor an xls"),
            "give an xlsx, xlsm, ods, xls or xlsb file, or a CSV whose name says so",
        ));
    }
    let mut package = package::Package::open(&bytes, limits)?;
    if package.holds("content.xml") {
        let read = ods::open(package, limits)?;
        return Ok(read.book(bytes, limits));
    }
    let workbook = xlsx::workbook_part(&mut package)?;
    if workbook.ends_with(".bin") {
        drop(package);
        return binary::open_xlsb(bytes, limits);
    }
    let read = xlsx::open(package, &bytes, &workbook, limits)?;
    Ok(read.book(bytes, limits))
}

/// What the readers hand over.
struct Read {
    storage: Storage,
    sheets: Vec<Sheet>,
    shared: Shared,
    read_only: Option<String>,
}

impl Read {
    fn book(self, bytes: Vec<u8>, limits: &Limits) -> Book {
        let shared = Arc::new(self.shared);
        let mut sheets = self.sheets;
        for sheet in &mut sheets {
            sheet.shared = Arc::clone(&shared);
        }
        Book { bytes, limits: limits.clone(), storage: self.storage, sheets, read_only: self.read_only }
    }
}

/// Closes a grid, saying what is wrong with the sheet if its cells are in no
/// order.
fn finish(grid: &mut Grid, sheet: &str) -> Result<(), BookTrouble> {
    grid.finish().map_err(|(row, column, why)| {
        BookTrouble::cell(sheet, (row, column), why, "open it in a spreadsheet program and save it again")
    })
}

impl Book {
    /// The sheets that hold cells, in the order of their tabs.
    pub fn sheets(&self) -> &[Sheet] {
        &self.sheets
    }

    /// Whether [`Book::write`] can write.
    pub fn can_write(&self) -> bool {
        self.read_only.is_none()
    }

    /// The bytes that were read.
    pub fn bytes(&self) -> &[u8] {
        &self.bytes
    }

    /// Why it cannot: the workbook is of a kind that is only read, or signed.
    pub fn read_only_because(&self) -> Option<&str> {
        self.read_only.as_deref()
    }

    /// The bytes of the workbook with these answers in it.
    ///
    /// They are the very bytes that were read if all answers stand there
    /// already. No answer is written over a formula, into the hidden cells of
    /// a merged range, or as text that a spreadsheet would take for a formula:
    /// then nothing is written and the trouble names the cell.
    pub fn write(&self, answers: &[Answer]) -> Result<Vec<u8>, BookTrouble> {
        if let Some(why) = &self.read_only {
            return Err(BookTrouble::file(why.clone(), "write the answers to another file with -o x.xlsx"));
        }
        let mut by_sheet: Vec<Vec<&Answer>> = vec![Vec::new(); self.sheets.len()];
        for answer in answers {
            match (self.sheets.get(answer.sheet), by_sheet.get_mut(answer.sheet)) {
                (Some(sheet), Some(list)) => {
                    check(sheet, answer)?;
                    list.push(answer);
                }
                _ => {
                    return Err(BookTrouble::file(
                        "an answer is for a sheet that is not there",
                        "name a sheet of the book",
                    ));
                }
            }
        }
        for (sheet, list) in self.sheets.iter().zip(&mut by_sheet) {
            list.sort_by_key(|a| (a.row, a.column));
            if let Some(pair) = list.windows(2).find(|p| (p[0].row, p[0].column) == (p[1].row, p[1].column)) {
                let at = (pair[0].row, pair[0].column);
                return Err(BookTrouble::cell(&sheet.name, at, "two answers are for this cell", "ask once"));
            }
            list.retain(|a| !stands(sheet, a));
        }
        if by_sheet.iter().all(Vec::is_empty) {
            return Ok(self.bytes.clone());
        }
        match &self.storage {
            Storage::Xlsx { workbook, styles } => {
                xlsx_write::write(self, workbook, styles.as_deref(), &by_sheet)
            }
            Storage::Ods => ods_write::write(self, &by_sheet),
            Storage::Binary => Ok(self.bytes.clone()),
        }
    }

    /// The formulas whose stored values are stale once these cells (sheet, row,
    /// column) are written, in order.
    ///
    /// Found are formulas that name such a cell, a range, a whole row or column
    /// over it, a defined name or a table that holds it, and formulas that
    /// refer to those formulas in turn. Not found are references that a formula
    /// only computes (`INDIRECT`, `OFFSET`), those of other workbooks, and what
    /// charts, rules and validations refer to. In xls and xlsb none are found.
    pub fn formulas_depending_on(&self, cells: &[(usize, u32, u32)]) -> Vec<(usize, u32, u32)> {
        depend::depending(self, cells)
    }

    fn holds_formula(&self) -> bool {
        self.sheets.iter().any(|s| s.grid.has_formula())
    }
}

/// Refuses an answer that may not go where it should.
fn check(sheet: &Sheet, answer: &Answer) -> Result<(), BookTrouble> {
    let at = (answer.row, answer.column);
    let trouble = |cause: &str, mend: &str| Err(BookTrouble::cell(&sheet.name, at, cause, mend));
    if answer.row > LAST_ROW || answer.column > LAST_COLUMN {
        return trouble("a sheet has no such cell", "move the table up or to the left");
    }
    let cell = sheet.at(answer.row, answer.column);
    if cell.formula {
        return trouble(
            "it holds a formula, which no answer replaces",
            "clear the cell, or ask in another column",
        );
    }
    if cell.merged_into.is_some() {
        return trouble("it lies hidden in a merged range", "split the merged range");
    }
    match &answer.value {
        AnswerValue::Number { value, .. } if !value.is_finite() => {
            trouble("the answer is no number that a cell can hold", "ask for a figure that is finite")
        }
        AnswerValue::Number { format: Some(format), .. } if !styles::plain_digits(format) => {
            trouble(&format!("`{format}` says more than how many digits to show"), "use a format like 0.000")
        }
        AnswerValue::Text(text) if text.starts_with(['=', '+', '-', '@']) => {
            trouble("the answer's text begins like a formula", "name things so that they begin with a letter")
        }
        AnswerValue::Text(text) if text.encode_utf16().count() > 32_767 => {
            trouble("the answer is longer than a cell can hold", "ask for it in a note instead")
        }
        AnswerValue::Text(text) => match xml::unwritable(text) {
            Some(c) => trouble(&format!("no cell can hold the character {c:?}"), "take it out of the name"),
            None => Ok(()),
        },
        _ => Ok(()),
    }
}

/// Whether an answer stands in its cell already, so that not one byte of the
/// cell needs to change. The number format is not looked at.
fn stands_as_value(sheet: &Sheet, answer: &Answer) -> bool {
    match (&answer.value, sheet.at(answer.row, answer.column).value) {
        (AnswerValue::Number { value, .. }, Value::Number(old)) => value.to_bits() == old.to_bits(),
        (AnswerValue::Text(text), Value::Text(old)) => text == old,
        (AnswerValue::Clear, Value::Empty) => true,
        _ => false,
    }
}

fn stands(sheet: &Sheet, answer: &Answer) -> bool {
    let formatted = match &answer.value {
        AnswerValue::Number { format: Some(_), .. } => !sheet.at(answer.row, answer.column).general,
        _ => true,
    };
    formatted && stands_as_value(sheet, answer)
}

/// The lock file that a spreadsheet program keeps beside a workbook while it
/// is open there, if there is one.
pub fn lock_file(path: &Path) -> Option<PathBuf> {
    let name = path.file_name()?.to_string_lossy();
    // The owner file leaves out the first two characters of a long name in some versions.
    let short: String = name.chars().skip(2).collect();
    [format!("~${name}"), format!("~${short}"), format!(".~lock.{name}#")]
        .into_iter()
        .filter(|lock| lock.len() > 2)
        .map(|lock| path.with_file_name(lock))
        .find(|lock| lock.exists())
}
