//! Reading ods workbooks.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use super::cells::{Block, Grid, Look, Packed, Sort, Texts};
use super::ods_styles::OdsStyles;
use super::ods_table::{CellItem, Met, RowItem, cells, shown, walk};
use super::package::Package;
use super::xml::{Tag, Tags, XmlTrouble, unescape};
use super::{BookTrouble, Limits, Read, Shared, Sheet, Storage, finish};

/// An empty cell is kept for its style only where it repeats less than this:
/// sheets commonly style a million empty rows.
const KEPT_REPEAT: u32 = 64;

/// Reads an ods.
pub(super) fn open(mut package: Package<'_>, limits: &Limits) -> Result<Read, BookTrouble> {
    if package.holds("META-INF/manifest.xml") {
        let manifest = package.part("META-INF/manifest.xml")?;
        if manifest.xml.contains("encryption-data") {
            return Err(BookTrouble::file("it is encrypted", "save it without a password"));
        }
    }
    let signed = package.holds("META-INF/documentsignatures.xml");
    let content = package.part("content.xml")?;
    let common = if package.holds("styles.xml") { Some(package.part("styles.xml")?) } else { None };
    drop(package);
    let mut styles = OdsStyles::default();
    if let Some(common) = &common {
        styles.read(&common.xml, false).map_err(|e| BookTrouble::part("styles.xml", e))?;
    }
    let broken = |e: XmlTrouble| BookTrouble::part("content.xml", e);
    styles.read(&content.xml, true).map_err(broken)?;
    let hidden = hidden_tables(&content.xml).map_err(broken)?;

    let mut reader = Tables {
        xml: &content.xml,
        hidden,
        styles,
        looks: vec![Look::default()],
        known: BTreeMap::new(),
        texts: Texts::default(),
        sheets: Vec::new(),
        left: limits.cells,
    };
    walk(&content.xml, |met| reader.meet(met)).map_err(broken)?;
    for sheet in &mut reader.sheets {
        finish(&mut sheet.grid, &sheet.name)?;
    }
    Ok(Read {
        storage: Storage::Ods,
        sheets: reader.sheets,
        shared: Shared { texts: reader.texts, looks: reader.looks },
        read_only: signed.then(|| "it is signed, and every change would break the signature".into()),
    })
}

/// The names of table styles that hide their tables.
fn hidden_tables(xml: &str) -> Result<BTreeSet<&str>, XmlTrouble> {
    let mut out = BTreeSet::new();
    let mut tags = Tags::new(xml);
    while let Some(tag) = tags.next()? {
        if tag.depth == 1 && tag.local() == "body" {
            break;
        }
        if tag.depth == 2 && tag.starts() && tag.raw_attribute("style:family") == Some("table") {
            let end = tags.skip(&tag)?;
            let hides =
                xml.get(tag.span.start..end).is_some_and(|raw| raw.contains("table:display=\"false\""));
            out.extend(tag.raw_attribute("style:name").filter(|_| hides));
        }
    }
    Ok(out)
}

struct Tables<'a> {
    xml: &'a str,
    hidden: BTreeSet<&'a str>,
    styles: OdsStyles<'a>,
    looks: Vec<Look>,
    known: BTreeMap<&'a str, u32>,
    texts: Texts,
    sheets: Vec<Sheet>,
    left: u64,
}

impl<'a> Tables<'a> {
    fn meet(&mut self, met: Met<'a>) -> Result<(), XmlTrouble> {
        match met {
            Met::Table(tag) => self.begin(&tag),
            Met::Columns(first, count, style) => {
                let look = style.map(|style| self.look(style)).filter(|look| *look != 0);
                if let (Some(look), Some(sheet)) = (look, self.sheets.last_mut()) {
                    sheet.grid.columns.push((first, first + count - 1, look));
                }
            }
            Met::Row(row) => self.row(&row)?,
            Met::End(..) | Met::Name(..) => {}
        }
        Ok(())
    }

    fn begin(&mut self, tag: &Tag<'a>) {
        let style = tag.raw_attribute("table:style-name");
        self.sheets.push(Sheet {
            name: tag.attribute("table:name").unwrap_or_default().into_owned(),
            visible: !style.is_some_and(|style| self.hidden.contains(style)),
            protected: tag.flag("table:protected") || tag.raw_attribute("table:protected") == Some("true"),
            grid: Grid::default(),
            part: "content.xml".into(),
            shared: Arc::default(),
        });
    }

    fn look(&mut self, style: &'a str) -> u32 {
        if let Some(known) = self.known.get(style) {
            return *known;
        }
        let look = self.styles.look(&unescape(style));
        let index = self.looks.iter().position(|l| *l == look).unwrap_or_else(|| {
            self.looks.push(look);
            self.looks.len() - 1
        });
        let index = u32::try_from(index).unwrap_or(0);
        self.known.insert(style, index);
        index
    }

    fn row(&mut self, item: &RowItem<'a>) -> Result<(), XmlTrouble> {
        let text = self.xml.get(item.span.clone()).unwrap_or("");
        let row_look = item.tag.raw_attribute("table:default-cell-style-name").map(|s| self.look(s));
        let mut packed: Vec<Packed> = Vec::new();
        let mut filled = false;
        for cell in cells(text)? {
            let rows = cell.tag.raw_attribute("table:number-rows-spanned").and_then(|n| n.parse().ok());
            let columns = cell.tag.raw_attribute("table:number-columns-spanned").and_then(|n| n.parse().ok());
            let block = |rows: Option<u32>, columns: Option<u32>| {
                let last = (rows.unwrap_or(1).max(1) - 1, columns.unwrap_or(1).max(1) - 1);
                let last = (item.row.saturating_add(last.0), cell.column.saturating_add(last.1));
                (last != (item.row, cell.column)).then_some(Block { first: (item.row, cell.column), last })
            };
            let number = |name: &str| cell.tag.raw_attribute(name).and_then(|n| n.parse().ok());
            let array = block(
                number("table:number-matrix-rows-spanned"),
                number("table:number-matrix-columns-spanned"),
            );
            let Some(sheet) = self.sheets.last_mut() else { return Ok(()) };
            sheet.grid.merges.extend(block(rows, columns));
            sheet.grid.arrays.extend(array);
            let own = cell.tag.raw_attribute("table:style-name").map(|style| self.look(style));
            let inherited = row_look.or_else(|| self.sheets.last()?.grid.inherited(item.row, cell.column));
            let formula = cell.tag.raw_attribute("table:formula").is_some();
            let mut one = Packed::new(cell.column, own.or(inherited).unwrap_or(0), formula);
            self.value(text, &cell, &mut one)?;
            let empty = one.sort == Sort::Empty;
            filled |= !empty;
            if empty && (own.is_none() || cell.repeat > KEPT_REPEAT) {
                continue;
            }
            if u64::from(cell.repeat) > self.left {
                return Err("it holds more cells than the limit allows".into());
            }
            packed.extend((0..cell.repeat).map(|more| one.moved(cell.column + more)));
        }
        if packed.is_empty() || !filled && item.repeat > KEPT_REPEAT {
            return Ok(());
        }
        let count = packed.len() as u64 * u64::from(item.repeat);
        self.left = self.left.checked_sub(count).ok_or("it holds more cells than the limit allows")?;
        let Some(sheet) = self.sheets.last_mut() else { return Ok(()) };
        for row in item.row..item.row + item.repeat {
            sheet.grid.row(row, row_look);
            packed.iter().for_each(|cell| sheet.grid.push(*cell));
        }
        Ok(())
    }

    fn value(&mut self, row: &str, cell: &CellItem<'_>, packed: &mut Packed) -> Result<(), XmlTrouble> {
        let get = |name: &str| cell.tag.attribute(name);
        let kind = cell.tag.raw_attribute("office:value-type");
        match kind {
            Some("float" | "currency" | "percentage") => {
                let number = get("office:value").and_then(|v| v.trim().parse::<f64>().ok());
                match number.filter(|n| n.is_finite()) {
                    Some(number) => packed.number(number),
                    None => return Err("a cell's number cannot be read".into()),
                }
            }
            Some("boolean") => {
                let yes = get("office:boolean-value").is_some_and(|v| v == "true");
                packed.set(Sort::Bool, u32::from(yes));
            }
            Some(kind @ ("date" | "time")) => {
                let text = get(&format!("office:{kind}-value")).unwrap_or_default();
                packed.set(Sort::Date, self.texts.add(&text));
            }
            Some("string") => {
                let text = match get("office:string-value") {
                    Some(text) => text.into_owned(),
                    None => shown(row, &cell.paragraphs)?,
                };
                let error = cell.tag.raw_attribute("calcext:value-type") == Some("error");
                packed.set(if error { Sort::Error } else { Sort::Text }, self.texts.add(&text));
            }
            _ if packed.formula() => packed.set(Sort::NoCache, 0),
            _ => {}
        }
        Ok(())
    }
}
