//! Reading xlsx and xlsm workbooks.

use std::collections::BTreeMap;
use std::io::Cursor;
use std::sync::Arc;
use std::sync::mpsc::{SyncSender, sync_channel};

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
        let empty = Grid::default();
        sheets.push(Sheet {
            name,
            visible,
            protected: false,
            grid: empty,
            part: part.clone(),
            shared: Arc::default(),
        });
    }
    let signed = package.names().iter().any(|name| name.starts_with("_xmlsignatures/"));
    let read_only = signed.then(|| "it is signed, and every change would break the signature".to_string());
    let mut texts = Texts::default();
    let mut book = None;
    let mut left = limits.cells;
    for sheet in &mut sheets {
        // Checked before calamine sees it.
        let xml = package.part(&sheet.part)?.xml;
        // calamine reads beside the scan and hands its values over in batches: neither waits long for
        // the other, and no more than a few batches are in memory.
        let (send, receive) = sync_channel(8);
        let (scanned, read) = std::thread::scope(|scope| {
            let name = sheet.name.as_str();
            let reading = scope.spawn(|| values(bytes, &mut book, name, &mut texts, send));
            let mut batch = Vec::new().into_iter();
            let next = || loop {
                match batch.next() {
                    Some(value) => return Some(value),
                    None => batch = Vec::into_iter(receive.recv().ok()?),
                }
            };
            let scanned = scan(&xml, left, next);
            drop(receive);
            // calamine's sums are checked in some builds, and end its thread on absurd addresses.
            let read = reading.join().unwrap_or_else(|_| Err(broken(Some(name), &"its values are broken")));
            (scanned, read)
        });
        // Where one of the two stops, the other misses its cells; the first cause is the one to show.
        let (mut grid, protected) = match (scanned, read) {
            (Ok(scanned), Ok(())) => scanned,
            (Err(cause), Err(trouble)) if cause == DIFFER => return Err(trouble),
            (Ok(_), Err(trouble)) => return Err(trouble),
            (Err(cause), _) => {
                let trouble = BookTrouble::part(&sheet.part, cause);
                return Err(BookTrouble { sheet: Some(sheet.name.clone()), ..trouble });
            }
        };
        drop(xml);
        left -= grid.len() as u64;
        finish(&mut grid, &sheet.name)?;
        (sheet.grid, sheet.protected) = (grid, protected);
    }
    Ok(Read {
        storage: Storage::Xlsx { workbook: workbook.into(), styles },
        sheets,
        shared: Shared { texts, looks },
        read_only,
    })
}

/// The two readers do not agree.
const DIFFER: &str = "its cells are numbered in two ways";

/// A value and its row.
type Valued = (u32, Packed);

/// The cells of a sheet part and whether the sheet is protected. `next` gives
/// calamine's values, which must be those of the same cells in the same order.
fn scan(xml: &str, limit: u64, mut next: impl FnMut() -> Option<Valued>) -> Result<(Grid, bool), String> {
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
                let (row, value) = next().ok_or(DIFFER)?;
                if (row, u32::from(value.column)) != (cell.row, cell.column) {
                    return Err(DIFFER.into());
                }
                let mut packed = Packed::new(cell.column, cell.style, cell.formula.is_some());
                if cell.formula.is_some() && !cell.value {
                    packed.set(Sort::NoCache, 0);
                } else {
                    packed.take(&value);
                }
                grid.arrays
                    .extend(cell.formula.as_ref().and_then(|f| f.fills()).filter(|b| b.first != b.last));
                grid.push(packed);
            }
            Item::Dimension(_) | Item::Data(_) | Item::DataEnd(_) | Item::RowEnd(_) => {}
        }
    }
    if next().is_some() { Err(DIFFER.into()) } else { Ok((grid, protected)) }
}

/// What calamine has read so far.
struct Values<'a> {
    book: Xlsx<Cursor<&'a [u8]>>,
    /// Shared texts keep their place while the book is open: it is their key.
    shared: rustc_hash::FxHashMap<(usize, usize), u32>,
}

fn broken(sheet: Option<&str>, e: &dyn std::fmt::Display) -> BookTrouble {
    let cause = format!("it cannot be read: {e}");
    let mend = "open it in a spreadsheet program and save it again";
    BookTrouble { sheet: sheet.map(String::from), ..BookTrouble::file(cause, mend) }
}

/// Sends the values of a sheet in the order of the file.
fn values<'a>(
    bytes: &'a [u8],
    kept: &mut Option<Values<'a>>,
    sheet: &str,
    texts: &mut Texts,
    send: SyncSender<Vec<Valued>>,
) -> Result<(), BookTrouble> {
    const BATCH: usize = 4096;
    let Values { book, shared } = match kept {
        Some(values) => values,
        None => {
            let book = Xlsx::new(Cursor::new(bytes)).map_err(|e| broken(None, &e))?;
            kept.insert(Values { book, shared: rustc_hash::FxHashMap::default() })
        }
    };
    let mut reader = book.worksheet_cells_reader(sheet).map_err(|e| broken(Some(sheet), &e))?;
    let mut out: Vec<Valued> = Vec::with_capacity(BATCH);
    let mut last = None;
    loop {
        let cell = match reader.next_cell() {
            Ok(Some(cell)) => cell,
            Ok(None) => {
                // Who does not listen any more has met an error and says so.
                let _ = send.send(out);
                return Ok(());
            }
            Err(e) => {
                let place = match last {
                    Some((row, column)) => format!("after cell {}", super::a1(row, column)),
                    None => "in its first cell".into(),
                };
                return Err(broken(Some(sheet), &format!("{place}: {e}")));
            }
        };
        let (row, column) = cell.get_position();
        let mut packed = Packed::new(column, 0, false);
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
        last = Some((row, column));
        out.push((row, packed));
        if out.len() == BATCH && send.send(std::mem::replace(&mut out, Vec::with_capacity(BATCH))).is_err() {
            return Ok(());
        }
    }
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
