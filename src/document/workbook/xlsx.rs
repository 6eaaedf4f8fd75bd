//! Reading xlsx and xlsm workbooks.

use std::collections::BTreeMap;
use std::io::Cursor;
use std::sync::Arc;

use calamine::{DataRef, ExcelDateTime, Reader, Xlsx};

use super::cells::{Grid, Packed, Sort, Texts};
use super::package::{Package, relationships_of, resolve};
use super::sheet::{Item, Walk};
use super::styles::Styles;
use super::xml::Tags;
use super::{BookTrouble, Limits, Read, Shared, Sheet, Storage, finish};

/// A relationship: the last word of its type, and the part it leads to.
pub(super) type Relationships = BTreeMap<String, (String, String)>;

/// The relationships of a part; none if it has no such list.
pub(super) fn relationships(package: &mut Package<'_>, of: &str) -> Result<Relationships, BookTrouble> {
    let name = relationships_of(of);
    let mut out = BTreeMap::new();
    if !package.holds(&name) {
        return Ok(out);
    }
    let part = package.part(&name)?;
    let mut tags = Tags::new(&part.xml);
    while let Some(tag) = tags.next().map_err(|e| BookTrouble::part(&name, e))? {
        if !tag.starts()
            || tag.local() != "Relationship"
            || tag.raw_attribute("TargetMode") == Some("External")
        {
            continue;
        }
        if let (Some(id), Some(kind), Some(target)) =
            (tag.attribute("Id"), tag.attribute("Type"), tag.attribute("Target"))
        {
            let kind = kind.rsplit('/').next().unwrap_or("").to_string();
            out.insert(id.into_owned(), (kind, resolve(of, &target)));
        }
    }
    Ok(out)
}

/// The name of the workbook part.
pub(super) fn workbook_part(package: &mut Package<'_>) -> Result<String, BookTrouble> {
    let found = relationships(package, "")?.into_values().find(|(kind, _)| kind == "officeDocument");
    let name = found.map(|(_, target)| target).filter(|target| package.holds(target));
    name.ok_or_else(|| {
        BookTrouble::file(
            "it is a zip file, but holds no workbook",
            "give an xlsx, xlsm, ods, xls or xlsb file",
        )
    })
}

/// A sheet as the workbook part lists it.
struct Listed {
    name: String,
    visible: bool,
    relation: String,
}

fn listed(xml: &str) -> Result<Vec<Listed>, String> {
    let mut out = Vec::new();
    let mut tags = Tags::new(xml);
    while let Some(tag) = tags.next()? {
        if tag.starts() && tag.depth == 2 && tag.local() == "sheet" {
            let relation = tag.attributes().find(|a| a.name.ends_with(":id"));
            out.push(Listed {
                name: tag.attribute("name").unwrap_or_default().into_owned(),
                visible: matches!(tag.raw_attribute("state"), None | Some("visible")),
                relation: relation.map(|a| a.value.to_string()).unwrap_or_default(),
            });
        }
    }
    Ok(out)
}

/// Reads a workbook whose workbook part is `workbook`.
pub(super) fn open(
    mut package: Package<'_>,
    bytes: &[u8],
    workbook: &str,
    limits: &Limits,
) -> Result<Read, BookTrouble> {
    let relations = relationships(&mut package, workbook)?;
    let of_kind = |kind: &str| relations.values().find(|(k, _)| k == kind).map(|(_, target)| target.clone());
    let styles = of_kind("styles").filter(|name| package.holds(name));
    let mut looks = Vec::new();
    if let Some(name) = &styles {
        let part = package.part(name)?;
        looks = Styles::new(&part.xml).map_err(|e| BookTrouble::part(name, e))?.looks();
    }
    // calamine unzips this one by itself: it must be known to be sound before.
    if let Some(name) = of_kind("sharedStrings").filter(|name| package.holds(name)) {
        package.part(&name)?;
    }
    let list = package.part(workbook)?;
    let list = listed(&list.xml).map_err(|e| BookTrouble::part(workbook, e))?;

    let mut sheets: Vec<Sheet> = Vec::new();
    let mut cells = 0;
    for Listed { name, visible, relation } in list {
        let Some((kind, part)) = relations.get(&relation).filter(|(_, part)| package.holds(part)) else {
            return Err(BookTrouble::sheet(&name, "its part is missing", "save the workbook again"));
        };
        if kind != "worksheet" {
            continue;
        }
        if sheets.iter().any(|s| s.name == name || s.part == *part) {
            return Err(BookTrouble::sheet(
                &name,
                "it stands twice in the workbook",
                "rename one of the two",
            ));
        }
        let xml = package.part(part)?.xml;
        let (mut grid, protected) =
            scan(&xml, limits.cells - cells).map_err(|e| BookTrouble::part(part, e))?;
        cells += grid.len() as u64;
        finish(&mut grid, &name)?;
        sheets.push(Sheet { name, visible, protected, grid, part: part.clone(), shared: Arc::default() });
    }
    let signed = package.names().iter().any(|name| name.starts_with("_xmlsignatures/"));
    let read_only = signed.then(|| "it is signed, and every change would break the signature".to_string());
    drop(package);

    let mut texts = Texts::default();
    values(bytes, &mut sheets, &mut texts)?;
    Ok(Read {
        storage: Storage::Xlsx { workbook: workbook.into(), styles },
        sheets,
        shared: Shared { texts, looks },
        read_only,
    })
}

/// What a sheet part says of its cells beside their values, and whether the
/// sheet is protected.
fn scan(xml: &str, limit: u64) -> Result<(Grid, bool), String> {
    let mut grid = Grid::default();
    let mut protected = false;
    let mut walk = Walk::new(xml);
    while let Some(item) = walk.next()? {
        match item {
            Item::Row(_, row, style) => grid.row(row, style),
            Item::Columns(first, last, style) => grid.columns.push((first, last, style)),
            Item::Merge(block) => grid.merges.push(block),
            Item::Protection => protected = true,
            Item::Cell(cell) => {
                if grid.len() as u64 >= limit {
                    return Err("it holds more cells than the limit allows".into());
                }
                let mut packed = Packed::new(cell.column, cell.style, cell.formula.is_some());
                if cell.formula.is_some() && !cell.value {
                    packed.set(Sort::NoCache, 0);
                }
                grid.arrays
                    .extend(cell.formula.as_ref().and_then(|f| f.fills()).filter(|b| b.first != b.last));
                grid.push(packed);
            }
            Item::Dimension(_) | Item::Data(_) | Item::DataEnd(_) | Item::RowEnd(_) => {}
        }
    }
    Ok((grid, protected))
}

/// Fills in the values of all sheets.
fn values(bytes: &[u8], sheets: &mut [Sheet], texts: &mut Texts) -> Result<(), BookTrouble> {
    let broken = |e: &dyn std::fmt::Display| {
        BookTrouble::file(
            format!("it cannot be read: {e}"),
            "open it in a spreadsheet program and save it again",
        )
    };
    let mut book = Xlsx::new(Cursor::new(bytes)).map_err(|e| broken(&e))?;
    // Shared texts keep their place while the book is open: the place is their key.
    let mut shared: rustc_hash::FxHashMap<(usize, usize), u32> = rustc_hash::FxHashMap::default();
    for sheet in sheets {
        let name = sheet.name.clone();
        let broken = |e: &dyn std::fmt::Display| BookTrouble { sheet: Some(name.clone()), ..broken(e) };
        let differs = || broken(&"its cells are numbered in two ways");
        let mut reader = book.worksheet_cells_reader(&name).map_err(|e| broken(&e))?;
        let mut failed = None;
        sheet.grid.each_mut(|row, packed| {
            let cell = match reader.next_cell() {
                Ok(Some(cell)) if cell.get_position() == (row, u32::from(packed.column)) => cell,
                Ok(_) => {
                    failed = Some(differs());
                    return false;
                }
                Err(e) => {
                    let at = super::a1(row, u32::from(packed.column));
                    failed = Some(BookTrouble { cell: Some(at), ..broken(&e) });
                    return false;
                }
            };
            if packed.sort == Sort::NoCache {
                return true;
            }
            match cell.get_value() {
                DataRef::Empty => {}
                DataRef::Int(i) => packed.number(*i as f64),
                DataRef::Float(f) => packed.number(*f),
                DataRef::Bool(b) => packed.set(Sort::Bool, u32::from(*b)),
                DataRef::String(s) => packed.set(Sort::Text, texts.add(s)),
                DataRef::SharedString(s) => {
                    let key = (s.as_ptr() as usize, s.len());
                    packed.set(Sort::Text, *shared.entry(key).or_insert_with(|| texts.add(s)));
                }
                DataRef::DateTime(d) => packed.set(Sort::Date, texts.add(&iso(d))),
                DataRef::DateTimeIso(s) | DataRef::DurationIso(s) => packed.set(Sort::Date, texts.add(s)),
                DataRef::Error(e) => packed.set(Sort::Error, texts.add(&e.to_string())),
            }
            true
        });
        if let Some(failed) = failed {
            return Err(failed);
        }
        if reader.next_cell().map_err(|e| broken(&e))?.is_some() {
            return Err(differs());
        }
    }
    Ok(())
}

/// A date, a time of day or a duration in ISO form.
pub(super) fn iso(date: &ExcelDateTime) -> String {
    let days = date.as_f64();
    if date.is_duration() {
        let seconds = (days * 86_400.0).round();
        let (h, rest) = ((seconds / 3600.0).trunc(), (seconds % 3600.0).abs());
        return format!("PT{h}H{}M{}S", (rest / 60.0).trunc(), rest % 60.0);
    }
    let (year, month, day, hour, minute, second, _) = date.to_ymd_hms_milli();
    match (days < 1.0, days.fract() == 0.0) {
        (true, _) => format!("{hour:02}:{minute:02}:{second:02}"),
        (_, true) => format!("{year:04}-{month:02}-{day:02}"),
        _ => format!("{year:04}-{month:02}-{day:02}T{hour:02}:{minute:02}:{second:02}"),
    }
}
