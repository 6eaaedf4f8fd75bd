//! Looking into workbooks from outside, without the code under test.
#![allow(dead_code, unreachable_pub)]

use std::collections::BTreeMap;
use std::io::{Cursor, Read, Write};

use tieback::document::workbook::{Answer, AnswerValue};
use zip::write::SimpleFileOptions;
use zip::{ZipArchive, ZipWriter};

/// A number for a cell.
pub fn number(sheet: usize, row: u32, column: u32, value: f64, format: Option<&str>) -> Answer {
    Answer { sheet, row, column, value: AnswerValue::Number { value, format: format.map(String::from) } }
}

/// A text for a cell.
pub fn text(sheet: usize, row: u32, column: u32, text: &str) -> Answer {
    Answer { sheet, row, column, value: AnswerValue::Text(text.into()) }
}

/// All entries of a zip in order: name, method, stored bytes.
fn entries(bytes: &[u8]) -> Vec<(String, String, Vec<u8>)> {
    let mut zip = ZipArchive::new(Cursor::new(bytes)).unwrap();
    (0..zip.len())
        .map(|index| {
            let mut entry = zip.by_index_raw(index).unwrap();
            let mut raw = Vec::new();
            entry.read_to_end(&mut raw).unwrap();
            let facts = format!("{} {:?}", entry.compression(), entry.last_modified());
            (entry.name().unwrap().into_owned(), facts, raw)
        })
        .collect()
}

/// The text of an entry.
pub fn entry(bytes: &[u8], name: &str) -> String {
    let mut zip = ZipArchive::new(Cursor::new(bytes)).unwrap();
    let mut out = String::new();
    zip.by_name(name).unwrap().read_to_string(&mut out).unwrap();
    out
}

/// Every entry is there, in order, and stored alike but for some.
pub fn same_entries(old: &[u8], new: &[u8], but: &[&str]) {
    let (old, new) = (entries(old), entries(new));
    let names = |e: &[(String, String, Vec<u8>)]| e.iter().map(|e| e.0.clone()).collect::<Vec<_>>();
    assert_eq!(names(&old), names(&new));
    for (old, new) in old.iter().zip(&new) {
        assert_eq!(old.1, new.1, "{}", old.0);
        assert!(old.2 == new.2 || but.contains(&old.0.as_str()), "{} changed", old.0);
    }
}

/// A zip with one entry's content replaced.
pub fn replaced(bytes: &[u8], name: &str, content: &[u8]) -> Vec<u8> {
    rebuilt(bytes, |old, data| if old == name { content.to_vec() } else { data }, None)
}

/// A zip with one more entry.
pub fn added(bytes: &[u8], name: &str, content: &[u8]) -> Vec<u8> {
    rebuilt(bytes, |_, data| data, Some((name, content)))
}

fn rebuilt(bytes: &[u8], change: impl Fn(&str, Vec<u8>) -> Vec<u8>, more: Option<(&str, &[u8])>) -> Vec<u8> {
    let mut zip = ZipArchive::new(Cursor::new(bytes)).unwrap();
    let mut out = ZipWriter::new(Cursor::new(Vec::new()));
    for index in 0..zip.len() {
        let mut entry = zip.by_index(index).unwrap();
        let mut data = Vec::new();
        entry.read_to_end(&mut data).unwrap();
        let name = entry.name().unwrap().into_owned();
        out.start_file(name.clone(), SimpleFileOptions::default().compression_method(entry.compression()))
            .unwrap();
        out.write_all(&change(&name, data)).unwrap();
    }
    if let Some((name, content)) = more {
        out.start_file(name, SimpleFileOptions::default()).unwrap();
        out.write_all(content).unwrap();
    }
    out.finish().unwrap().into_inner()
}

/// A sheet's XML taken apart: cells by address, rows by their tags, and what
/// stands around them. Only for sheets whose rows and cells have addresses.
fn taken_apart(xml: &str) -> (BTreeMap<String, String>, BTreeMap<String, String>, String) {
    let (mut cells, mut rows, mut around) = (BTreeMap::new(), BTreeMap::new(), String::new());
    let mut rest = xml;
    let attribute = |tag: &str, name: &str| {
        let at = tag.find(&format!(" {name}=\"")).unwrap_or_else(|| panic!("{tag}")) + name.len() + 3;
        tag[at..].split('"').next().unwrap().to_string()
    };
    while let Some(at) = rest.find('<') {
        around.push_str(&rest[..at]);
        rest = &rest[at..];
        let tag = &rest[..=rest.find('>').unwrap()];
        if tag.starts_with("<c ") || tag.starts_with("<c>") {
            let end = if tag.ends_with("/>") { tag.len() } else { rest.find("</c>").unwrap() + 4 };
            assert!(cells.insert(attribute(tag, "r"), rest[..end].to_string()).is_none(), "{tag} twice");
            rest = &rest[end..];
        } else if tag.starts_with("<row ") {
            let mut shown = tag.replace("/>", ">");
            if let Some(at) = shown.find(" spans=\"") {
                let length = shown[at + 8..].find('"').unwrap() + 9;
                shown.replace_range(at..at + length, "");
            }
            rows.insert(attribute(tag, "r"), shown);
            rest = &rest[tag.len()..];
        } else {
            if !tag.starts_with("<dimension") && tag != "</row>" {
                around.push_str(tag);
            }
            rest = &rest[tag.len()..];
        }
    }
    around.push_str(rest);
    (cells, rows, around)
}

/// The XML of one cell.
pub fn cell_text(xml: &str, address: &str) -> String {
    taken_apart(xml).0.get(address).unwrap_or_else(|| panic!("{address}")).clone()
}

/// Two sheets are alike but for some cells: every other cell, every row's tag
/// but for its `spans`, and everything around the rows but `dimension`.
pub fn same_but_cells(old: &str, new: &str, but: &[(u32, u32)]) {
    let (mut old, mut new) = (taken_apart(old), taken_apart(new));
    for (row, column) in but {
        let address = tieback::document::workbook::a1(*row, *column);
        old.0.remove(&address);
        new.0.remove(&address);
    }
    assert_eq!(old.0, new.0);
    for (row, tag) in &old.1 {
        assert_eq!(Some(tag), new.1.get(row));
    }
    for row in new.1.keys().filter(|row| !old.1.contains_key(*row)) {
        assert!(but.iter().any(|(r, _)| (r + 1).to_string() == *row), "row {row} is new");
    }
    assert_eq!(old.2, new.2);
}
