//! The cells of a worksheet part and where they stand in its text.

use std::ops::Range;

use super::cells::{Block, LAST_COLUMN, LAST_ROW, parse_a1};
use super::xml::{Kind, Tag, Tags, XmlTrouble};

/// What [`Walk`] meets.
#[derive(Clone, Debug)]
pub(super) enum Item<'a> {
    Dimension(Tag<'a>),
    /// Columns with a style: first, last, style.
    Columns(u32, u32, u32),
    /// The sheet is protected.
    Protection,
    /// The element of all rows begins, or is empty.
    Data(Tag<'a>),
    DataEnd(Tag<'a>),
    /// A row begins, or is empty; its style if it has one.
    Row(Tag<'a>, u32, Option<u32>),
    RowEnd(Tag<'a>),
    Cell(CellItem<'a>),
    Merge(Block),
}

/// A `<c>` element.
#[derive(Clone, Debug)]
pub(super) struct CellItem<'a> {
    pub(super) tag: Tag<'a>,
    /// Where the element ends.
    pub(super) end: usize,
    pub(super) row: u32,
    pub(super) column: u32,
    pub(super) style: u32,
    pub(super) kind: Option<&'a str>,
    pub(super) formula: Option<Formula<'a>>,
    /// Whether a value is stored.
    pub(super) value: bool,
    /// An extension list, which an edit keeps.
    pub(super) extra: Option<Range<usize>>,
}

/// An `<f>` element.
#[derive(Clone, Debug)]
pub(super) struct Formula<'a> {
    pub(super) tag: Tag<'a>,
    /// The formula as it is written, escapes and all.
    pub(super) text: &'a str,
}

impl Formula<'_> {
    /// The cells that an array formula or a data table fills.
    pub(super) fn fills(&self) -> Option<Block> {
        let kind = self.tag.raw_attribute("t")?;
        matches!(kind, "array" | "dataTable").then(|| self.tag.raw_attribute("ref").and_then(Block::parse))?
    }
}

/// A walk through a worksheet part.
pub(super) struct Walk<'a> {
    xml: &'a str,
    tags: Tags<'a>,
    row: u32,
    next_row: u32,
    next_column: u32,
    in_data: bool,
    /// The cell whose content is looked into; every cell if `None`.
    only: Option<Option<(u32, u32)>>,
}

impl<'a> Walk<'a> {
    pub(super) fn new(xml: &'a str) -> Walk<'a> {
        Walk { xml, tags: Tags::new(xml), row: 0, next_row: 0, next_column: 0, in_data: false, only: None }
    }

    /// Looks from now on only into this cell, and passes over all others.
    pub(super) fn only(&mut self, cell: Option<(u32, u32)>) {
        self.only = Some(cell);
    }

    /// The next item; `None` at the end.
    pub(super) fn next(&mut self) -> Result<Option<Item<'a>>, XmlTrouble> {
        while let Some(tag) = self.tags.next()? {
            let item = match (tag.depth, tag.kind) {
                (1, Kind::Close) if self.in_data => {
                    self.in_data = false;
                    Some(Item::DataEnd(tag))
                }
                (1, Kind::Open | Kind::Empty) => self.part(tag)?,
                (2, Kind::Close) if self.in_data => Some(Item::RowEnd(tag)),
                (2, Kind::Open | Kind::Empty) if self.in_data && tag.local() == "row" => {
                    self.begin_row(tag)?
                }
                (2, Kind::Open | Kind::Empty) => other(&tag)?,
                (3, Kind::Open | Kind::Empty) if self.in_data && tag.local() == "c" => Some(self.cell(tag)?),
                _ => None,
            };
            if item.is_some() {
                return Ok(item);
            }
        }
        Ok(None)
    }

    fn part(&mut self, tag: Tag<'a>) -> Result<Option<Item<'a>>, XmlTrouble> {
        Ok(match tag.local() {
            "dimension" => Some(Item::Dimension(tag)),
            "sheetProtection" if tag.flag("sheet") => Some(Item::Protection),
            "sheetData" => {
                self.in_data = tag.kind == Kind::Open;
                Some(Item::Data(tag))
            }
            "cols" | "mergeCells" | "sheetProtection" => None,
            _ => {
                self.tags.skip(&tag)?;
                None
            }
        })
    }

    fn begin_row(&mut self, tag: Tag<'a>) -> Result<Option<Item<'a>>, XmlTrouble> {
        let mut style = None;
        let mut custom = false;
        self.row = self.next_row;
        for attribute in tag.attributes() {
            match attribute.name {
                "r" => {
                    let number: Option<u32> = attribute.value.trim().parse().ok();
                    self.row = number.and_then(|n| n.checked_sub(1)).ok_or("a row has no proper number")?;
                }
                "s" => style = attribute.value.parse().ok(),
                "customFormat" => custom = matches!(attribute.value, "1" | "true"),
                _ => {}
            }
        }
        if self.row > LAST_ROW {
            return Err("it has more rows than a sheet can have".into());
        }
        self.next_row = self.row + 1;
        self.next_column = 0;
        Ok(Some(Item::Row(tag, self.row, style.filter(|_| custom))))
    }

    fn cell(&mut self, tag: Tag<'a>) -> Result<Item<'a>, XmlTrouble> {
        let mut cell = CellItem {
            end: tag.span.end,
            row: self.row,
            column: self.next_column,
            style: 0,
            kind: None,
            formula: None,
            value: false,
            extra: None,
            tag,
        };
        for attribute in cell.tag.attributes() {
            match attribute.name {
                "r" => {
                    let at = parse_a1(attribute.value.trim());
                    (cell.row, cell.column) =
                        at.ok_or_else(|| format!("`{}` is no cell", attribute.value))?;
                }
                "s" => cell.style = attribute.value.parse().unwrap_or(0),
                "t" => cell.kind = Some(attribute.value),
                _ => {}
            }
        }
        if cell.row != self.row || cell.column > LAST_COLUMN {
            return Err(format!("a cell of row {} stands in row {}", cell.row + 1, self.row + 1));
        }
        self.next_column = cell.column + 1;
        match self.only {
            Some(only) if only != Some((cell.row, cell.column)) => cell.end = self.tags.leap(&cell.tag)?,
            _ if cell.tag.kind == Kind::Open => self.content(&mut cell)?,
            _ => {}
        }
        Ok(Item::Cell(cell))
    }

    fn content(&mut self, cell: &mut CellItem<'a>) -> Result<(), XmlTrouble> {
        while let Some(tag) = self.tags.next()? {
            if tag.kind == Kind::Close {
                cell.end = tag.span.end;
                return Ok(());
            }
            let end = self.tags.skip(&tag)?;
            match tag.local() {
                "f" => {
                    let inner = self.xml.get(tag.span.end..end).unwrap_or("");
                    let text = inner.rfind("</").map_or("", |at| &inner[..at]);
                    cell.formula = Some(Formula { tag, text });
                }
                // A program that computes nothing leaves the element empty; an empty text is a result.
                "v" => {
                    let inner = self.xml.get(tag.span.end..end).unwrap_or("");
                    let empty = inner.is_empty() || inner.starts_with("</");
                    cell.value = !empty || cell.kind == Some("str") && tag.kind == Kind::Open;
                }
                "is" => cell.value = true,
                "extLst" => cell.extra = Some(tag.span.start..end),
                _ => {}
            }
        }
        Err("its XML ends within a cell".into())
    }
}

fn other<'a>(tag: &Tag<'a>) -> Result<Option<Item<'a>>, XmlTrouble> {
    Ok(match tag.local() {
        "col" => {
            let number = |name| tag.raw_attribute(name).and_then(|v| v.parse::<u32>().ok());
            match (number("min"), number("max"), number("style")) {
                (Some(first @ 1..), Some(last @ 1..), Some(style)) => {
                    Some(Item::Columns(first - 1, last - 1, style))
                }
                _ => None,
            }
        }
        "mergeCell" => {
            let block = tag.raw_attribute("ref").and_then(Block::parse);
            Some(Item::Merge(block.ok_or("a merged range has no proper address")?))
        }
        _ => None,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cells(xml: &str) -> Vec<(u32, u32, bool, bool)> {
        let mut walk = Walk::new(xml);
        let mut out = Vec::new();
        while let Some(item) = walk.next().unwrap() {
            if let Item::Cell(c) = item {
                out.push((c.row, c.column, c.formula.is_some(), c.value));
            }
        }
        out
    }

    #[test]
    fn numbers_cells_without_addresses() {
        let xml = "<worksheet><sheetData><row><c/><c r='D1'><v>1</v></c><c/></row><row/><row r='5'/>\
                   <row><c t='str'><f>A1</f><v></v></c><c><f>A1</f><v/></c></row></sheetData></worksheet>";
        assert_eq!(
            cells(xml),
            [
                (0, 0, false, false),
                (0, 3, false, true),
                (0, 4, false, false),
                (5, 0, true, true),
                (5, 1, true, false)
            ]
        );
    }

    #[test]
    fn extensions_hold_no_cells() {
        let xml = "<x:worksheet xmlns:x='m'><x:sheetData><x:row r='2'><x:c r='B2'><x:v>1</x:v></x:c></x:row></x:sheetData>\
                   <x:extLst><x:ext><x:row><x:c/></x:row></x:ext></x:extLst></x:worksheet>";
        assert_eq!(cells(xml), [(1, 1, false, true)]);
    }
}
