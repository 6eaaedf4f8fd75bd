//! The tables of an ods' content part and where their rows and cells stand.
//!
//! Attributes are looked up under the prefixes that the format's own text uses
//! (`table:`, `office:`, `text:`); a file that chose others is refused.

use std::collections::BTreeMap;
use std::ops::Range;

use quick_xml::escape::resolve_predefined_entity;
use quick_xml::events::Event;
use quick_xml::reader::Reader;

use super::cells::{LAST_COLUMN, LAST_ROW};
use super::refs::{Scope, address};
use super::xml::{Kind, Tag, Tags, XmlTrouble, unescape};

/// What [`walk`] meets.
pub(super) enum Met<'a> {
    /// A table begins.
    Table(Tag<'a>),
    /// Columns: first, how many, the style of their unstyled cells.
    Columns(u32, u32, Option<&'a str>),
    Row(RowItem<'a>),
    /// The table ends: the first row that it does not have, and where one
    /// would be put in.
    End(u32, usize),
    /// A name for a range: the name and the address.
    Name(String, String),
}

/// A row, or several alike.
pub(super) struct RowItem<'a> {
    pub(super) tag: Tag<'a>,
    /// The whole element.
    pub(super) span: Range<usize>,
    pub(super) row: u32,
    pub(super) repeat: u32,
}

/// A cell, or several alike side by side. Places count from the row's start.
#[derive(Clone, Debug)]
pub(super) struct CellItem<'a> {
    pub(super) tag: Tag<'a>,
    pub(super) span: Range<usize>,
    pub(super) column: u32,
    pub(super) repeat: u32,
    pub(super) covered: bool,
    /// What stands within, but for the paragraphs.
    pub(super) kept: Vec<Range<usize>>,
    /// The paragraphs, tags and all.
    pub(super) paragraphs: Vec<Range<usize>>,
}

fn repeat(tag: &Tag<'_>, name: &str) -> Result<u32, XmlTrouble> {
    match tag.raw_attribute(name).map(str::parse::<u32>) {
        None => Ok(1),
        Some(Ok(n @ 1..)) => Ok(n),
        Some(_) => Err(format!("`{name}` is no count")),
    }
}

/// Visits the tables of a content part in order.
pub(super) fn walk<'a>(
    xml: &'a str,
    mut visit: impl FnMut(Met<'a>) -> Result<(), XmlTrouble>,
) -> Result<(), XmlTrouble> {
    let mut tags = Tags::new(xml);
    let mut in_table = false;
    let (mut row, mut column, mut after) = (0u32, 0u32, 0);
    while let Some(tag) = tags.next()? {
        let name = tag.name();
        match tag.depth {
            0 if tag.starts() => {
                let bound = |p: &str| tag.attributes().any(|a| a.name == format!("xmlns:{p}"));
                if !["office", "table", "text"].iter().all(|p| bound(p)) {
                    return Err("its names have prefixes that are not the usual ones".into());
                }
            }
            0..=2 => {}
            3 if name == "table:table" => match tag.kind {
                Kind::Close => {
                    in_table = false;
                    visit(Met::End(row, after))?;
                }
                kind => {
                    (row, column, after, in_table) = (0, 0, tag.span.end, kind == Kind::Open);
                    visit(Met::Table(tag))?;
                    if !in_table {
                        visit(Met::End(LAST_ROW + 1, after))?;
                    }
                }
            },
            3 if matches!(name, "table:named-expressions") => {}
            3 => {
                tags.skip(&tag)?;
            }
            _ if name == "table:named-range" => {
                let get = |name| tag.attribute(name).unwrap_or_default();
                visit(Met::Name(
                    get("table:name").to_lowercase(),
                    address(&get("table:cell-range-address")),
                ))?;
                tags.skip(&tag)?;
            }
            _ if !in_table || name == "table:named-expressions" => {}
            _ if name == "table:table-row" && tag.starts() => {
                let end = tags.skip(&tag)?;
                let repeat = repeat(&tag, "table:number-rows-repeated")?;
                let first = row;
                row = row.checked_add(repeat).filter(|r| *r <= LAST_ROW + 1).ok_or("it has too many rows")?;
                if tag.depth == 4 {
                    after = end;
                }
                visit(Met::Row(RowItem { span: tag.span.start..end, tag, row: first, repeat }))?;
            }
            _ if name == "table:table-column" && tag.starts() => {
                let end = tags.skip(&tag)?;
                let count = repeat(&tag, "table:number-columns-repeated")?.min(LAST_COLUMN + 1);
                visit(Met::Columns(column, count, tag.raw_attribute("table:default-cell-style-name")))?;
                column = column.saturating_add(count);
                if row == 0 && tag.depth == 4 {
                    after = end;
                }
            }
            depth => match name {
                "table:table-row-group"
                | "table:table-rows"
                | "table:table-header-rows"
                | "table:table-columns"
                | "table:table-column-group"
                | "table:table-header-columns" => {
                    if depth == 4 && tag.kind == Kind::Close {
                        after = tag.span.end;
                    }
                }
                _ => {
                    tags.skip(&tag)?;
                }
            },
        }
    }
    Ok(())
}

/// The cells of a row's text.
pub(super) fn cells(row: &str) -> Result<Vec<CellItem<'_>>, XmlTrouble> {
    let mut out = Vec::new();
    let mut column = 0u32;
    let mut tags = Tags::new(row);
    while let Some(tag) = tags.next()? {
        if tag.depth != 1 || !tag.starts() {
            continue;
        }
        let covered = tag.name() == "table:covered-table-cell";
        if !covered && tag.name() != "table:table-cell" {
            tags.skip(&tag)?;
            continue;
        }
        let repeat = repeat(&tag, "table:number-columns-repeated")?;
        let mut cell = CellItem {
            span: tag.span.clone(),
            column,
            repeat,
            covered,
            kept: Vec::new(),
            paragraphs: Vec::new(),
            tag,
        };
        column =
            column.checked_add(repeat).filter(|c| *c <= LAST_COLUMN + 1).ok_or("it has too many columns")?;
        while cell.tag.kind == Kind::Open {
            let Some(inner) = tags.next()? else { return Err("its XML ends within a cell".into()) };
            if inner.kind == Kind::Close {
                cell.span.end = inner.span.end;
                break;
            }
            let span = inner.span.start..tags.skip(&inner)?;
            let list = if inner.name() == "text:p" { &mut cell.paragraphs } else { &mut cell.kept };
            list.push(span);
        }
        out.push(cell);
    }
    Ok(out)
}

/// The text that a cell's paragraphs show.
pub(super) fn shown(row: &str, paragraphs: &[Range<usize>]) -> Result<String, XmlTrouble> {
    let texts: Result<Vec<String>, XmlTrouble> =
        paragraphs.iter().map(|range| paragraph(row.get(range.clone()).unwrap_or(""))).collect();
    Ok(texts?.join("\n"))
}

fn paragraph(xml: &str) -> Result<String, XmlTrouble> {
    let mut out = String::new();
    let mut reader = Reader::from_str(xml);
    // White space counts once; what counts more stands in elements of its own.
    let push = |out: &mut String, text: &str| {
        for c in text.chars() {
            let blank = matches!(c, ' ' | '\t' | '\r' | '\n');
            if !blank {
                out.push(c);
            } else if !out.ends_with(' ') {
                out.push(' ');
            }
        }
    };
    loop {
        match reader.read_event().map_err(|e| format!("its XML is broken: {e}"))? {
            Event::Text(t) => push(&mut out, &t.xml10_content()),
            Event::CData(t) => push(&mut out, &t.xml10_content()),
            Event::GeneralRef(name) => match name.resolve_char_ref() {
                Ok(Some(c)) => out.push(c),
                _ => out.push_str(resolve_predefined_entity(&name.into_inner()).unwrap_or("\u{fffd}")),
            },
            Event::Start(tag) | Event::Empty(tag) => match tag.name().into_inner() {
                "text:s" => {
                    let count = tag.try_get_attribute("text:c").ok().flatten();
                    let count = count.and_then(|c| c.value.parse::<usize>().ok()).unwrap_or(1);
                    out.extend(std::iter::repeat_n(' ', count.min(32_767)));
                }
                "text:tab" => out.push('\t'),
                "text:line-break" => out.push('\n'),
                _ => {}
            },
            Event::Eof => return Ok(out),
            _ => {}
        }
    }
}

/// Sheet, row and column of a cell, and the formula there.
pub(super) type PlacedFormula = ((usize, u32, u32), String);

/// All formulas of a content part; its names for ranges go into `scope`.
pub(super) fn formulas(xml: &str, scope: &mut Scope) -> Result<Vec<PlacedFormula>, XmlTrouble> {
    let mut out = Vec::new();
    let mut table = 0usize;
    let mut names: BTreeMap<String, Vec<String>> = BTreeMap::new();
    walk(xml, |met| {
        match met {
            Met::End(..) => table += 1,
            Met::Name(name, address) => names.entry(name).or_default().push(address),
            Met::Row(row) if xml.get(row.span.clone()).is_some_and(|text| text.contains("table:formula")) => {
                for cell in cells(xml.get(row.span.clone()).unwrap_or(""))? {
                    if let Some(formula) = cell.tag.raw_attribute("table:formula") {
                        out.push(((table, row.row, cell.column), unescape(formula).into_owned()));
                    }
                }
            }
            _ => {}
        }
        Ok(())
    })?;
    scope.names = names;
    Ok(out)
}
