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

/// Words that cells are made of, known and unknown, sound and not.
const WORDS: &[&str] = &[
    "name",
    "Name",
    "is",
    "qty",
    "need",
    "in",
    "rate (FIT)",
    "fails",
    "perfect",
    "cost (EUR)",
    "require",
    "R ?",
    "F in chances ?",
    "R(500 h) ?",
    "Birnbaum(gate) ?",
    "met ?",
    "steps ?",
    "cuts ?",
    "rank ?",
    "count(cuts) ?",
    "total(cost) ?",
    "enough ?",
    "R(?",
    "gate",
    "A",
    "B",
    "C",
    "0.1",
    "1 in 50",
    "2",
    "3",
    "0",
    "-1",
    "1e5",
    "yes",
    "A // B",
    "A -> B",
    "2 of (A, B, C)",
    "1 of 2 A",
    "gate -> A",
    "R >= 0.9",
    "F <= 1e-3",
    "mission",
    "Mission:",
    "4000 h",
    "4000",
    "h",
    "attribute",
    "power W",
    "power (W)",
    "total",
    "Subtotal",
    "! no",
    "0.98",
    "none: why",
    "?",
    "\"",
    "ö\u{301}",
    "'",
    "=1+1",
    "a\nb",
    "1. x",
    "",
    "",
    "",
    "",
    "",
];

#[test]
fn any_cells_are_filled_or_told() {
    let mut seed = 0x2545_f491_4f6c_dd1d_u64;
    let mut random = |n: usize| {
        seed ^= seed << 13;
        seed ^= seed >> 7;
        seed ^= seed << 17;
        (seed >> 11) as usize % n
    };
    let cases = std::env::var("TIEBACK_CASES").ok().and_then(|n| n.parse().ok()).unwrap_or(3000);
    for case in 0..cases {
        let (rows, columns) = (1 + random(7), 1 + random(6));
        let mut lines: Vec<Vec<&str>> =
            (0..rows).map(|_| (0..columns).map(|_| WORDS[random(WORDS.len())]).collect()).collect();
        if case % 2 == 0 {
            // Half of them certainly have a table.
            let at = random(rows.min(2));
            lines[at][0] = "name";
            lines[at].push(["R ?", "fails", "is", "steps ?"][random(4)]);
        }
        if case % 16 == 0 {
            let lines: Vec<String> = lines.iter().map(|l| l.join(" | ").replace(['\n', '"'], "")).collect();
            run(&lines.iter().map(String::as_str).collect::<Vec<_>>());
            continue;
        }
        let quoted = |cell: &&str| format!("\"{}\"", cell.replace('"', "\"\""));
        let text: String =
            lines.iter().map(|l| l.iter().map(quoted).collect::<Vec<_>>().join(",") + "\n").collect();
        let csv =
            |text: &str| fill("parts.csv", SheetForm::Csv, text.as_bytes().to_vec(), &Options::default());
        let done = csv(&text);
        problems(&done.sources, &done.problems, Paint::Plain);
        tieback::report::json::FileReport::new("parts.csv", &done, false);
        if let Rewrite::Patched(new) = done.rewrite {
            let new = String::from_utf8(new).unwrap();
            assert_eq!(csv(&new).rewrite, Rewrite::Unchanged, "{text}\n{new}");
        }
    }
}

#[test]
fn a_note_takes_definitions_and_nothing_else() {
    use tieback::language::{Line, Tree};
    use tieback::source::Sources;
    let bytes = book(&[
        "## Power",
        "mission | 10 h",
        "exposure | start",
        "attribute | power W, area",
        "require | R(gate) >= 0.5",
        "name | rate (/start) | power (W) | require | R ? | in",
        "A | 0.1 | 5 | R >= 0.9 | 0.5 | gate",
        "B | 0.2 | 6 | | | gate",
        "## Pumps",
        "name | fails",
        "pump | strainr",
    ]);
    let (mut sources, mut tree, mut problems) = (Sources::default(), Tree::default(), Vec::new());
    let note = "exposure start\nattribute power W\n";
    let at = sources.add("note.md", note).unwrap();
    let lines = note.lines().map(|text| {
        let start = at + (text.as_ptr() as usize - note.as_ptr() as usize) as u32;
        tieback::language::Source { text, at: start }
    });
    tieback::language::read_block(lines, 0, &mut tree, &mut problems);
    let (form, limits) = (SheetForm::Workbook, Limits::default());
    let mut take = |only, tree: &mut Tree, problems: &mut Vec<_>| {
        tieback::sheets::definitions(
            "p.xlsx",
            form,
            bytes.clone(),
            &limits,
            only,
            7,
            &mut sources,
            tree,
            problems,
        )
    };
    assert!(take(Some("Power"), &mut tree, &mut problems));
    assert_eq!(problems, []);
    let names = |tree: &Tree| -> Vec<String> {
        let of = |line: &Line| match line {
            Line::Define { names, .. } => tree.names.text(names[0].0).to_string(),
            Line::Exposure(words) => format!("exposures {}", words.len()),
            Line::Attribute(words) => format!("attributes {}", words.len()),
            other => format!("{other:?}"),
        };
        tree.statements[2..].iter().map(|s| of(&s.line)).collect()
    };
    assert_eq!(names(&tree), ["exposures 0", "attributes 1", "A", "B", "gate"]);
    assert!(tree.statements[2..].iter().all(|s| s.block == 7 && s.mark.is_none()));
    assert!(!take(Some("Pwer"), &mut tree, &mut problems));
    assert_eq!(problems[0].message, "\"p.xlsx\" has no sheet \"Pwer\"");
    assert!(take(None, &mut tree, &mut problems));
    assert_eq!(sources.words(tree.statements.last().unwrap().span), "Pumps!A2");
}
