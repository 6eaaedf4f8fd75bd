//! Formulas that refer to cells about to be written.

use std::collections::{BTreeMap, BTreeSet};

use super::cells::{Block, LAST_COLUMN, LAST_ROW};
use super::package::Package;
use super::refs::{Scope, refers};
use super::sheet::{Item, Walk};
use super::xml::{Tags, unescape};
use super::{Book, BookTrouble, Storage, ods_table, xlsx};

/// Passes over the formulas in search of what depends on what depends on an
/// answer; each settles every chain that runs in reading order.
const PASSES: usize = 32;

/// A formula, its cell, and the blocks that it refers to.
struct Held {
    at: (usize, u32, u32),
    blocks: Vec<(usize, Block)>,
}

/// Cells by sheet and column, for asking whether a block holds one.
#[derive(Default)]
struct Stale(BTreeMap<(usize, u32), BTreeSet<u32>>);

impl Stale {
    fn add(&mut self, (sheet, row, column): (usize, u32, u32)) {
        self.0.entry((sheet, column)).or_default().insert(row);
    }

    fn touches(&self, sheet: usize, block: &Block) -> bool {
        (self.0.range((sheet, block.first.1)..=(sheet, block.last.1)))
            .any(|(_, rows)| rows.range(block.first.0..=block.last.0).next().is_some())
    }
}

pub(super) fn depending(book: &Book, cells: &[(usize, u32, u32)]) -> Vec<(usize, u32, u32)> {
    if cells.is_empty() || !book.holds_formula() {
        return Vec::new();
    }
    // A part that was read before can be read again; if not, nothing is known to be stale.
    let held = match &book.storage {
        Storage::Xlsx { workbook, .. } => of_xlsx(book, workbook).unwrap_or_default(),
        Storage::Ods => of_ods(book).unwrap_or_default(),
        Storage::Binary => Vec::new(),
    };
    let mut stale = Stale::default();
    cells.iter().for_each(|cell| stale.add(*cell));
    let mut found = vec![false; held.len()];
    for _ in 0..PASSES {
        let mut more = false;
        for (formula, found) in held.iter().zip(&mut found) {
            if !*found && formula.blocks.iter().any(|(sheet, block)| stale.touches(*sheet, block)) {
                *found = true;
                more = true;
                stale.add(formula.at);
            }
        }
        if !more {
            break;
        }
    }
    let hits = held.iter().zip(&found).filter(|(_, found)| **found);
    hits.map(|(f, _)| f.at).collect()
}

fn of_xlsx(book: &Book, workbook: &str) -> Result<Vec<Held>, BookTrouble> {
    let mut package = Package::open(&book.bytes, &book.limits)?;
    let mut scope = Scope::default();
    for sheet in &book.sheets {
        scope.sheets.push(sheet.name.to_lowercase());
    }
    names(&package.part(workbook)?.xml, &mut scope).map_err(|e| BookTrouble::part(workbook, e))?;
    for (index, sheet) in book.sheets.iter().enumerate() {
        for (kind, part) in xlsx::relationships(&mut package, &sheet.part)?.into_values() {
            if kind == "table" && package.holds(&part) {
                let xml = package.part(&part)?.xml;
                let tag = Tags::new(&xml).next().map_err(|e| BookTrouble::part(&part, e))?;
                let Some(tag) = tag else { continue };
                let name = tag.attribute("displayName").or_else(|| tag.attribute("name"));
                if let (Some(name), Some(block)) = (name, tag.raw_attribute("ref").and_then(Block::parse)) {
                    scope.tables.insert(name.to_lowercase(), (index, block));
                }
            }
        }
    }
    let mut held = Vec::new();
    for (index, sheet) in book.sheets.iter().enumerate().filter(|(_, s)| s.grid.has_formula()) {
        let xml = package.part(&sheet.part)?.xml;
        let mut walk = Walk::new(&xml);
        // The first cell of a group of shared formulas holds the text of all.
        let mut shared: BTreeMap<&str, (u32, u32, &str)> = BTreeMap::new();
        while let Some(item) = walk.next().map_err(|e| BookTrouble::part(&sheet.part, e))? {
            let Item::Cell(cell) = item else { continue };
            let Some(formula) = &cell.formula else { continue };
            let group = formula.tag.raw_attribute("si");
            let (mut text, mut shift) = (formula.text, (0, 0));
            match (group, text.is_empty()) {
                (Some(group), false) => {
                    shared.insert(group, (cell.row, cell.column, text));
                }
                (Some(group), true) => {
                    if let Some((row, column, master)) = shared.get(group) {
                        let down = i64::from(cell.row) - i64::from(*row);
                        (text, shift) = (master, (down, i64::from(cell.column) - i64::from(*column)));
                    }
                }
                _ => {}
            }
            let blocks = refers(&unescape(text), index, shift, &scope);
            if !blocks.is_empty() {
                held.push(Held { at: (index, cell.row, cell.column), blocks });
            }
        }
    }
    Ok(held)
}

/// The defined names of a workbook part.
fn names(xml: &str, scope: &mut Scope) -> Result<(), String> {
    let mut tags = Tags::new(xml);
    while let Some(tag) = tags.next()? {
        if tag.depth == 2 && tag.starts() && tag.local() == "definedName" {
            let end = tags.skip(&tag)?;
            let name = tag.attribute("name").unwrap_or_default().to_lowercase();
            let text = super::xml::text(xml.get(tag.span.end..end).unwrap_or(""))?;
            scope.names.entry(name).or_default().push(text);
        }
    }
    Ok(())
}

fn of_ods(book: &Book) -> Result<Vec<Held>, BookTrouble> {
    let mut package = Package::open(&book.bytes, &book.limits)?;
    let mut scope = Scope::default();
    for sheet in &book.sheets {
        scope.sheets.push(sheet.name.to_lowercase());
    }
    let xml = package.part("content.xml")?.xml;
    let formulas = ods_table::formulas(&xml, &mut scope).map_err(|e| BookTrouble::part("content.xml", e))?;
    Ok((formulas.into_iter())
        .filter_map(|((sheet, row, column), text)| {
            let text = super::refs::plain(&text);
            let blocks = refers(&text, sheet, (0, 0), &scope);
            (!blocks.is_empty()).then_some(Held { at: (sheet, row, column), blocks })
        })
        .collect())
}

/// All rows, all columns.
pub(super) const WHOLE: Block = Block { first: (0, 0), last: (LAST_ROW, LAST_COLUMN) };
