//! Parts lists in sheets: what is filled, what each mistake is told, and that
//! nothing but answers changes.
//!
//! The cases of `fixtures/sheets/*.txt` stand one after the other:
//!
//! ```text
//! === a title
//! ## Power
//! name | rate (FIT) | R(1 kh) ?
//! P1   | 12         |
//! ---
//! what is said
//! => Power!C2 0.999988000071999 0.000000
//! ```
//!
//! `## Power` begins a sheet; without one there is a sheet `Parts`. A cell that
//! reads as a number is one. `'5` is text, `5%` a number in a percent format,
//! `@2026-03-01` a date, `=A1{5}` a formula with its stored value, `=A1` one
//! without, `TRUE` a logical value, `¦` a `|` within a cell. Below `---` stand the report and, after
//! `=>`, the cells that change, with the number format of a number.
//!
//! With `BLESS=1` in the environment what was found is written into the files.

mod workbook_tools;

use rust_xlsxwriter::{ExcelDateTime, Format, Formula, Workbook, Worksheet};
use std::fmt::Write as _;
use std::path::PathBuf;
use tieback::answer::Filled;
use tieback::document::patch::Rewrite;
use tieback::document::workbook::{Limits, Value, a1, number_text, open};
use tieback::report::render::{Paint, problems};
use tieback::sheets::{Options, SheetForm, fill};
use workbook_tools::{cell_text, entry, replaced};

/// The result of a formula that loses it before the test begins.
const LOST: &str = "424242";

/// A workbook of these lines.
fn book(lines: &[&str]) -> Vec<u8> {
    let mut book = Workbook::new();
    let mut sheet = Worksheet::new();
    let mut row = 0;
    let mut begun = false;
    for line in lines {
        if let Some(name) = line.strip_prefix("## ") {
            if begun {
                book.push_worksheet(std::mem::replace(&mut sheet, Worksheet::new()));
            }
            sheet.set_name(name).unwrap();
            row = 0;
            begun = true;
            continue;
        }
        if !begun {
            sheet.set_name("Parts").unwrap();
            begun = true;
        }
        for (column, cell) in (0..).zip(line.split('|')) {
            write_cell(&mut sheet, row, column, &cell.trim().replace('¦', "|"));
        }
        row += 1;
    }
    book.push_worksheet(sheet);
    let bytes = book.save_to_buffer().unwrap();
    (1..10).map(|n| format!("xl/worksheets/sheet{n}.xml")).fold(bytes, |bytes, part| {
        if !String::from_utf8_lossy(&bytes).contains(&part) {
            return bytes;
        }
        let old = entry(&bytes, &part);
        let new = old.replace(&format!("<v>{LOST}</v>"), "");
        if new == old { bytes } else { replaced(&bytes, &part, new.as_bytes()) }
    })
}

fn write_cell(sheet: &mut Worksheet, row: u32, column: u16, cell: &str) {
    let percent = cell.strip_suffix('%').and_then(|n| n.parse::<f64>().ok());
    if cell.is_empty() {
    } else if let Some(text) = cell.strip_prefix('\'') {
        sheet.write_string(row, column, text).unwrap();
    } else if let Some(date) = cell.strip_prefix('@') {
        let format = Format::new().set_num_format("yyyy-mm-dd");
        let date = ExcelDateTime::parse_from_str(date).unwrap();
        sheet.write_datetime_with_format(row, column, &date, &format).unwrap();
    } else if let Some(formula) = cell.strip_prefix('=') {
        let (formula, value) = formula.split_once('{').unwrap_or((formula, LOST));
        let formula = Formula::new(formula).set_result(value.trim_end_matches('}'));
        sheet.write_formula(row, column, formula).unwrap();
    } else if cell == "TRUE" {
        sheet.write_boolean(row, column, true).unwrap();
    } else if let Some(number) = percent {
        let format = Format::new().set_num_format("0.0%");
        sheet.write_number_with_format(row, column, number / 100.0, &format).unwrap();
    } else if let Ok(number) = cell.parse::<f64>() {
        sheet.write_number(row, column, number).unwrap();
    } else {
        sheet.write_string(row, column, cell).unwrap();
    }
}

fn filled(bytes: &[u8]) -> Filled {
    fill("parts.xlsx", SheetForm::Workbook, bytes.to_vec(), &Options::default())
}

fn patched(filled: &Filled, old: &[u8]) -> Vec<u8> {
    match &filled.rewrite {
        Rewrite::Patched(bytes) => bytes.clone(),
        Rewrite::Unchanged => old.to_vec(),
    }
}

/// The cells that differ: sheet, address, value, and the digits of a number's format.
fn changes(old: &[u8], new: &[u8]) -> String {
    let (old_book, new_book) = (
        open("old", old.to_vec(), &Limits::default()).unwrap(),
        open("new", new.to_vec(), &Limits::default()).unwrap(),
    );
    let styles = entry(new, "xl/styles.xml");
    let mut out = String::new();
    for (index, (before, after)) in old_book.sheets().iter().zip(new_book.sheets()).enumerate() {
        let xml = entry(new, &format!("xl/worksheets/sheet{}.xml", index + 1));
        for cell in after.rows().flat_map(|row| row.cells().collect::<Vec<_>>()) {
            if before.at(cell.row, cell.column).value == cell.value {
                continue;
            }
            let address = a1(cell.row, cell.column);
            let value = match cell.value {
                Value::Number(number) => {
                    format!("{} {}", number_text(number), format_of(&cell_text(&xml, &address), &styles))
                }
                Value::Text(text) => text.replace('\n', "\n       "),
                other => format!("{other:?}"),
            };
            writeln!(out, "=> {}!{address} {value}", after.name).unwrap();
        }
    }
    out
}

/// The number format of a cell by its XML: the digits that tieback chose, or the code.
fn format_of(cell: &str, styles: &str) -> String {
    let attribute = |text: &str, name: &str| -> Option<String> {
        text.split(&format!(" {name}=\"")).nth(1)?.split('"').next().map(str::to_string)
    };
    let style: usize = attribute(cell, "s").and_then(|s| s.parse().ok()).unwrap_or(0);
    let list = styles.split("<cellXfs").nth(1).unwrap();
    let id = attribute(list.split("<xf ").nth(style + 1).unwrap(), "numFmtId");
    let id = id
        .or_else(|| attribute(&format!(" {}", list.split("<xf ").nth(style + 1).unwrap()), "numFmtId"))
        .unwrap();
    let code = styles
        .split("<numFmt ")
        .find(|f| f.contains(&format!("numFmtId=\"{id}\"")) && f.contains("formatCode"));
    code.and_then(|f| attribute(&format!(" {f}"), "formatCode"))
        .map_or("General".to_string(), |code| code.split(';').next().unwrap_or("").to_string())
}

fn run(lines: &[&str]) -> String {
    let old = book(lines);
    let done = filled(&old);
    let new = patched(&done, &old);
    let again = filled(&new);
    assert_eq!(again.rewrite, Rewrite::Unchanged, "filling twice is filling once: {lines:?}");
    let mut out = problems(&done.sources, &done.problems, Paint::Plain);
    out.push_str(&changes(&old, &new));
    out.lines().map(|l| l.trim_end()).collect::<Vec<_>>().join("\n").trim_end().to_string() + "\n"
}

#[test]
fn every_case_is_filled_and_told_as_it_says() {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("fixtures/sheets");
    let mut files: Vec<PathBuf> =
        std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    files.sort();
    let bless = std::env::var_os("BLESS").is_some();
    let mut wrong = Vec::new();
    for file in files {
        let text = std::fs::read_to_string(&file).unwrap();
        let mut whole = String::new();
        for case in text.split("=== ").skip(1) {
            let (given, expected) = case.split_once("---\n").unwrap_or((case, ""));
            let (title, lines) = given.split_once('\n').unwrap();
            let found = run(&lines.lines().collect::<Vec<_>>());
            if found.trim() != expected.trim() {
                wrong.push(format!("{title}\nexpected:\n{expected}\nfound:\n{found}"));
            }
            writeln!(whole, "=== {given}---\n{found}").unwrap();
        }
        if bless {
            std::fs::write(&file, whole.trim_end().to_string() + "\n").unwrap();
        }
    }
    assert!(bless || wrong.is_empty(), "{}", wrong.join("\n"));
}
