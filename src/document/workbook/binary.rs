//! Reading xls and xlsb workbooks, into which nothing can be written.

use std::io::Cursor;
use std::sync::Arc;

use calamine::{Data, Reader, Xls, Xlsb};

use super::cells::{Grid, Packed, Sort, Texts};
use super::{Book, BookTrouble, Limits, Read, Shared, Sheet, Storage, finish, xlsx};

fn broken(e: &dyn std::fmt::Display) -> BookTrouble {
    BookTrouble::file(
        format!("it cannot be read: {e}"),
        "open it in a spreadsheet program and save it as xlsx",
    )
}

/// Reads an xls; tells an encrypted workbook, which is stored alike.
pub(super) fn open_xls(bytes: Vec<u8>, limits: &Limits) -> Result<Book, BookTrouble> {
    let entry: Vec<u8> = "EncryptedPackage".encode_utf16().flat_map(u16::to_le_bytes).collect();
    if bytes.windows(entry.len()).any(|w| w == entry) {
        return Err(BookTrouble::file(
            "it is encrypted",
            "save it without a password, in the spreadsheet program that wrote it",
        ));
    }
    if !whole(&bytes) {
        return Err(BookTrouble::file("it is cut short or damaged", "fetch or save the workbook again"));
    }
    let book = Xls::new(Cursor::new(bytes.as_slice())).map_err(|e| broken(&e))?;
    let read = read(book, "xls", limits)?;
    Ok(read.book(bytes, limits))
}

/// Whether every sector that a compound file's table of sectors speaks of lies
/// within the file. calamine trusts the table.
fn whole(bytes: &[u8]) -> bool {
    let word = |at: usize| bytes.get(at..at + 4).map(|b| u32::from_le_bytes([b[0], b[1], b[2], b[3]]));
    let Some(&shift @ (9 | 12)) = bytes.get(30) else { return false };
    let size = 1usize << shift;
    let sectors = bytes.len() / size;
    let inside = |id: u32| (id as usize) < sectors.saturating_sub(1);
    let Some(mut tables) = word(44) else { return false };
    // The first 109 tables are named in the header, more in sectors of names.
    let mut names: Vec<u32> = (0..109).filter_map(|i| word(76 + 4 * i)).collect();
    let (mut more, mut visited) = (word(68).unwrap_or(u32::MAX), 0);
    while more < 0xffff_fff0 {
        visited += 1;
        if !inside(more) || visited > sectors {
            return false;
        }
        let start = (more as usize + 1) * size;
        names.extend((0..size / 4 - 1).filter_map(|i| word(start + 4 * i)));
        more = word(start + size - 4).unwrap_or(u32::MAX);
    }
    let mut sector = 0u32;
    for name in names {
        if tables == 0 {
            break;
        }
        tables -= 1;
        if !inside(name) {
            return false;
        }
        let start = (name as usize + 1) * size;
        for entry in (0..size / 4).filter_map(|i| word(start + 4 * i)) {
            let used = entry != u32::MAX;
            if used && !inside(sector) || entry < 0xffff_fff0 && !inside(entry) {
                return false;
            }
            sector = sector.saturating_add(1);
        }
    }
    tables == 0
}

/// Reads an xlsb.
pub(super) fn open_xlsb(bytes: Vec<u8>, limits: &Limits) -> Result<Book, BookTrouble> {
    let book = Xlsb::new(Cursor::new(bytes.as_slice())).map_err(|e| broken(&e))?;
    let read = read(book, "xlsb", limits)?;
    Ok(read.book(bytes, limits))
}

fn read<'a, R>(mut book: R, kind: &str, limits: &Limits) -> Result<Read, BookTrouble>
where
    R: Reader<Cursor<&'a [u8]>>,
    R::Error: std::fmt::Display,
{
    let mut texts = Texts::default();
    let mut sheets = Vec::new();
    let mut left = limits.cells;
    for listed in book.sheets_metadata().to_vec() {
        let Ok(range) = book.worksheet_range(&listed.name) else { continue };
        // The two ranges begin at different cells.
        let formulas = book.worksheet_formula(&listed.name).unwrap_or_default();
        let mut grid = Grid::default();
        let Some((top, leftmost)) = range.start() else { continue };
        for (row, cells) in (top..).zip(range.rows()) {
            let mut begun = false;
            for (column, data) in (leftmost..).zip(cells) {
                let formula = formulas.get_value((row, column)).is_some_and(|f| !f.is_empty());
                if *data == Data::Empty && !formula {
                    continue;
                }
                left = left.checked_sub(1).ok_or_else(|| {
                    BookTrouble::sheet(
                        &listed.name,
                        "it holds more cells than the limit allows",
                        "raise the limit",
                    )
                })?;
                if !begun {
                    grid.row(row, None);
                    begun = true;
                }
                let mut packed = Packed::new(column, 0, formula);
                fill(&mut packed, data, &mut texts);
                grid.push(packed);
            }
        }
        finish(&mut grid, &listed.name)?;
        sheets.push(Sheet {
            visible: listed.visible == calamine::SheetVisible::Visible,
            name: listed.name,
            protected: false,
            grid,
            part: String::new(),
            shared: Arc::default(),
        });
    }
    Ok(Read {
        storage: Storage::Binary,
        sheets,
        shared: Shared { texts, looks: Vec::new() },
        read_only: Some(format!("an {kind} workbook is only read")),
    })
}

fn fill(packed: &mut Packed, data: &Data, texts: &mut Texts) {
    match data {
        Data::Empty => packed.set(if packed.formula() { Sort::NoCache } else { Sort::Empty }, 0),
        Data::Int(i) => packed.number(*i as f64),
        Data::Float(f) => packed.number(*f),
        Data::Bool(b) => packed.set(Sort::Bool, u32::from(*b)),
        Data::String(s) => packed.set(Sort::Text, texts.add(s)),
        Data::DateTime(d) => packed.set(Sort::Date, texts.add(&xlsx::iso(d))),
        Data::DateTimeIso(s) | Data::DurationIso(s) => packed.set(Sort::Date, texts.add(s)),
        Data::Error(e) => packed.set(Sort::Error, texts.add(&e.to_string())),
    }
}
