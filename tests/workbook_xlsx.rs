//! Answers written into xlsx and xlsm workbooks of several writers.

mod workbook_tools;

use std::io::Cursor;

use calamine::{Data, Reader, Xlsx};
use proptest::prelude::*;
use tieback::document::workbook::{Answer, AnswerValue, Book, Limits, Value, a1, open};
use workbook_tools::*;

/// Answers for the first sheet of the library's workbook: a General cell with a
/// fill, a cell with a format, text, a missing cell and a missing row.
fn library_answers(book: &Book) -> Vec<Answer> {
    let sheet = book.sheets().iter().position(|s| s.name == "Gate drives").unwrap();
    let pumps = book.sheets().iter().position(|s| s.name == "Pumps").unwrap();
    vec![
        number(sheet, 4, 4, 0.99999999, Some("0.00000000")),
        number(sheet, 5, 4, 0.9857, Some("0.00000")),
        number(sheet, 4, 5, 1.25e-9, Some("0.000E+00")),
        text(sheet, 6, 6, "none: no <rate> & \"no\" trial "),
        number(sheet, 8, 6, 3.0, None),
        number(sheet, 29, 8, -2.5, Some("0.0")),
        number(pumps, 1, 2, 0.5, Some("0.0000")),
    ]
}

fn file(name: &str) -> Vec<u8> {
    std::fs::read(format!("{}/fixtures/{name}", env!("CARGO_MANIFEST_DIR"))).unwrap()
}

#[test]
fn only_answers_change() {
    for name in ["library.xlsx", "macros.xlsm", "office.xlsx"] {
        let old = file(name);
        let book = open(name, old.clone(), &Limits::default()).unwrap();
        assert!(book.can_write());
        let answers = library_answers(&book);
        let new = book.write(&answers).unwrap();
        let allowed =
            ["xl/worksheets/sheet1.xml", "xl/worksheets/sheet2.xml", "xl/workbook.xml", "xl/styles.xml"];
        same_entries(&old, &new, &allowed);
        for (sheet, part) in [(0, "xl/worksheets/sheet1.xml"), (1, "xl/worksheets/sheet2.xml")] {
            let cells: Vec<(u32, u32)> =
                answers.iter().filter(|a| a.sheet == sheet).map(|a| (a.row, a.column)).collect();
            same_but_cells(&entry(&old, part), &entry(&new, part), &cells);
        }
        let flags = entry(&new, "xl/workbook.xml").matches("fullCalcOnLoad=\"1\"").count();
        assert_eq!(flags, 1, "{name}");
        values_stand(&new, &answers);
        // For looking at it in a spreadsheet program.
        std::fs::write(format!("{}/filled-{name}", env!("CARGO_TARGET_TMPDIR")), &new).unwrap();

        // Once more on the result: not one byte changes.
        let again = open(name, new.clone(), &Limits::default()).unwrap();
        assert_eq!(again.write(&library_answers(&again)).unwrap(), new, "{name}");
        assert_eq!(book.write(&answers).unwrap(), new, "{name}");

        // More digits in the next run: the format that tieback chose follows, the user's stays.
        let more =
            vec![number(0, 4, 4, 0.9999999999, Some("0.0000000000")), number(0, 4, 5, 2e-9, Some("0.0E+00"))];
        let third = again.write(&more).unwrap();
        assert!(entry(&third, "xl/styles.xml").contains("0.0000000000;-0.0000000000;0"), "{name}");
        same_but_cells(
            &entry(&new, "xl/worksheets/sheet1.xml"),
            &entry(&third, "xl/worksheets/sheet1.xml"),
            &[(4, 4), (4, 5)],
        );
        let cell = |bytes: &[u8], at: &str| cell_text(&entry(bytes, "xl/worksheets/sheet1.xml"), at);
        let style = |cell: String| cell.split(" s=\"").nth(1).unwrap().split('"').next().unwrap().to_string();
        assert_eq!(style(cell(&third, "F5")), style(cell(&old, "F5")));
        assert_ne!(style(cell(&third, "E5")), style(cell(&new, "E5")));
    }
}

/// calamine finds the answers.
fn values_stand(bytes: &[u8], answers: &[Answer]) {
    let mut book = Xlsx::new(Cursor::new(bytes)).unwrap();
    let names = book.sheet_names();
    for answer in answers {
        let range = book.worksheet_range(&names[answer.sheet]).unwrap();
        let found = range.get_value((answer.row, answer.column)).cloned().unwrap_or_default();
        match &answer.value {
            AnswerValue::Number { value, .. } => assert_eq!(found, Data::Float(*value)),
            AnswerValue::Text(text) => assert_eq!(found, Data::String(text.clone())),
            AnswerValue::Clear => assert_eq!(found, Data::Empty),
        }
    }
}

#[test]
fn cells_are_read_with_what_matters() {
    for name in ["library.xlsx", "office.xlsx", "office.ods"] {
        let book = open(name, file(name), &Limits::default()).unwrap();
        let sheet = &book.sheets()[0];
        assert_eq!((sheet.name.as_str(), sheet.visible, sheet.protected), ("Gate drives", true, true));
        assert_eq!(sheet.at(0, 0).value, Value::Text("Flood gate 3, drives & locks <draft>"));
        assert_eq!(sheet.at(0, 3).merged_into, Some((0, 0)), "{name}");
        assert_eq!(sheet.at(0, 0).merged_into, None);
        assert_eq!(sheet.at(4, 1).value, Value::Number(7.5));
        assert_eq!(sheet.at(5, 1).value, Value::Text("12"));
        assert!(sheet.at(4, 3).percent && !sheet.at(4, 3).general, "{name}");
        assert!(sheet.at(4, 4).general && sheet.at(4, 4).protected, "{name}");
        assert!(!sheet.at(4, 5).general && !sheet.at(4, 5).protected, "{name}");
        assert_eq!(sheet.at(6, 2).value, Value::Date("2026-03-01"), "{name}");
        // The office suite stores it as the formula TRUE().
        let yes = if name == "office.ods" { Value::Number(1.0) } else { Value::Bool(true) };
        assert_eq!(sheet.at(11, 1).value, yes, "{name}");
        assert!(sheet.at(4, 7).formula && sheet.at(12, 5).formula && sheet.at(13, 5).formula, "{name}");
        if name == "library.xlsx" {
            assert_eq!(sheet.at(4, 7).value, Value::NoCache);
        }
        assert_eq!(sheet.at(500, 500).value, Value::Empty);
        assert!(!book.sheets()[2].visible);
        let filled: Vec<(u32, u32)> = (sheet.rows())
            .flat_map(|row| row.cells().collect::<Vec<_>>())
            .filter(|c| c.row == 4 && c.value != Value::Empty)
            .map(|c| (c.row, c.column))
            .collect();
        assert_eq!(filled, [(4, 0), (4, 1), (4, 2), (4, 3), (4, 7)], "{name}");
    }
}

#[test]
fn stale_formulas_are_named() {
    for name in ["library.xlsx", "macros.xlsm", "office.xlsx", "office.ods"] {
        let book = open(name, file(name), &Limits::default()).unwrap();
        let named = |cells: &[(usize, u32, u32)]| -> Vec<String> {
            let found = book.formulas_depending_on(cells);
            found.iter().map(|(sheet, row, column)| format!("{sheet}!{}", a1(*row, *column))).collect()
        };
        // E9 stands in its half, the sum, `worst`, and what refers to that.
        assert_eq!(named(&[(0, 8, 4)]), ["0!H9", "0!E13", "1!E1", "1!E3"], "{name}");
        assert_eq!(named(&[(0, 4, 4)]), ["0!H5", "0!E13", "0!F13", "1!E1", "1!E3"], "{name}");
        assert_eq!(named(&[(0, 40, 4)]), [] as [&str; 0], "{name}");
        if !name.ends_with("ods") {
            assert_eq!(named(&[(1, 1, 2)]), ["1!E2", "1!E3"], "{name}");
        }
    }
}

#[test]
fn what_may_not_be_written_is_refused() {
    let book = open("library.xlsx", file("library.xlsx"), &Limits::default()).unwrap();
    let refused = |answer: Answer| {
        let trouble = book.write(&[answer]).unwrap_err();
        assert!(trouble.sheet.as_deref() == Some("Gate drives") && trouble.cell.is_some(), "{trouble}");
        trouble.to_string()
    };
    assert!(refused(number(0, 4, 7, 1.0, None)).contains("cell H5: it holds a formula"));
    assert!(refused(number(0, 13, 5, 1.0, None)).contains("formula"));
    assert!(refused(number(0, 0, 2, 1.0, None)).contains("merged"));
    assert!(refused(text(0, 4, 4, "=A1")).contains("begins like a formula"));
    assert!(refused(text(0, 4, 4, "@x")).contains("begins like a formula"));
    assert!(refused(text(0, 4, 4, "a\u{1}")).contains("character"));
    assert!(refused(text(0, 4, 4, &"x".repeat(40_000))).contains("longer"));
    assert!(refused(number(0, 4, 4, f64::NAN, None)).contains("no number"));
    assert!(refused(number(0, 1 << 20, 4, 1.0, None)).contains("no such cell"));
    assert!(refused(number(0, 4, 4, 1.0, Some("[Red]0"))).contains("digits"));
    assert!(book.write(&[number(9, 0, 0, 1.0, None)]).is_err());
    assert!(book.write(&[number(0, 4, 4, 1.0, None), text(0, 4, 4, "x")]).is_err());
    assert_eq!(book.write(&[]).unwrap(), file("library.xlsx"));
}

/// A small workbook by rust_xlsxwriter: chart, note, rules, validation, table
/// look, a formula with a stored value.
fn written() -> Vec<u8> {
    use rust_xlsxwriter::*;
    let mut book = Workbook::new();
    book.set_properties(
        &DocProperties::new().set_creation_datetime(&ExcelDateTime::from_ymd(2026, 1, 5).unwrap()),
    );
    let percent = Format::new().set_num_format("0.00%");
    let sheet = book.add_worksheet().set_name("Pumps").unwrap();
    for (column, head) in ["name", "rate", "R ?", "twice"].iter().enumerate() {
        sheet.write(0, column as u16, *head).unwrap();
    }
    for row in 1..8u32 {
        sheet.write(row, 0, format!("pump {row}")).unwrap();
        sheet.write_with_format(row, 1, 0.01 * f64::from(row), &percent).unwrap();
        sheet.write(row, 3, Formula::new(format!("=C{}*2", row + 1)).set_result("0.5")).unwrap();
    }
    sheet.insert_note(1, 0, &Note::new("overhauled")).unwrap();
    let mut chart = Chart::new(ChartType::Column);
    chart.add_series().set_values("Pumps!$B$2:$B$8");
    sheet.insert_chart(1, 6, &chart).unwrap();
    sheet.add_conditional_format(1, 1, 7, 1, &ConditionalFormatDataBar::new()).unwrap();
    sheet.set_freeze_panes(1, 0).unwrap();
    sheet.set_column_format(2, &Format::new().set_bold()).unwrap();
    book.save_to_buffer().unwrap()
}

#[test]
fn a_column_style_is_taken_over() {
    let old = written();
    let book = open("w.xlsx", old.clone(), &Limits::default()).unwrap();
    assert_eq!(book.sheets()[0].at(1, 3).value, Value::Number(0.5));
    let new = book.write(&[number(0, 2, 2, 0.875, Some("0.000")), text(0, 3, 2, "met: 3 of 4")]).unwrap();
    same_entries(&old, &new, &["xl/worksheets/sheet1.xml", "xl/styles.xml", "xl/workbook.xml"]);
    let part = "xl/worksheets/sheet1.xml";
    same_but_cells(&entry(&old, part), &entry(&new, part), &[(2, 2), (3, 2)]);
    assert!(cell_text(&entry(&new, part), "C4").contains(" s="), "{}", cell_text(&entry(&new, part), "C4"));
    let cleared = open("w.xlsx", new, &Limits::default()).unwrap();
    let clear = |row| Answer { sheet: 0, row, column: 2, value: AnswerValue::Clear };
    let empty = cleared.write(&[clear(2), clear(3), clear(4)]).unwrap();
    let empty = open("w.xlsx", empty, &Limits::default()).unwrap();
    assert_eq!(empty.sheets()[0].at(2, 2).value, Value::Empty);
    assert!(empty.sheets()[0].at(2, 2).general);
}

#[test]
fn odd_sheets_are_patched() {
    let old = written();
    let part = "xl/worksheets/sheet1.xml";
    let odd = [
        (
            "<worksheet><sheetData/></worksheet>",
            "<sheetData><row r=\"3\"><c r=\"B3\"><v>7</v></c></row></sheetData>",
        ),
        (
            "<worksheet><sheetData><row r='3'/></sheetData></worksheet>",
            "<row r='3'><c r=\"B3\"><v>7</v></c></row>",
        ),
        (
            "<x:worksheet xmlns:x='u'><x:sheetData><x:row/><x:row/><x:row spans='1:1'><x:c/><x:c s='1' t='s' vm='1'/><x:c/></x:row></x:sheetData></x:worksheet>",
            "<x:c/><x:c s='1'><x:v>7</x:v></x:c><x:c/>",
        ),
        (
            "<worksheet><dimension ref='A1:A9'/><sheetData><row r='2'/><row r='9' spans='1:1'><c r='A9'/></row></sheetData></worksheet>",
            "<dimension ref=\"A1:B9\"/><sheetData><row r='2'/><row r=\"3\"><c r=\"B3\"><v>7</v></c></row><row r='9' spans='1:1'>",
        ),
        (
            "<worksheet><sheetData><row r='3' spans='1:1'><c r='A3'/><c r='D3'/></row></sheetData></worksheet>",
            "<row r='3' spans=\"1:2\"><c r='A3'/><c r=\"B3\"><v>7</v></c><c r='D3'/></row>",
        ),
    ];
    for (sheet, expected) in odd {
        let bytes = replaced(&old, part, sheet.as_bytes());
        let book = open("odd.xlsx", bytes, &Limits::default()).unwrap_or_else(|e| panic!("{sheet}: {e}"));
        let new = book.write(&[number(0, 2, 1, 7.0, None)]).unwrap();
        let xml = entry(&new, part);
        assert!(xml.contains(expected), "{sheet}\n{xml}");
        let again = open("odd.xlsx", new.clone(), &Limits::default()).unwrap();
        assert_eq!(again.sheets()[0].at(2, 1).value, Value::Number(7.0));
        assert_eq!(again.write(&[number(0, 2, 1, 7.0, None)]).unwrap(), new);
    }
}

#[test]
fn bad_files_are_told_apart() {
    let old = written();
    let part = "xl/worksheets/sheet1.xml";
    let cause = |bytes: Vec<u8>, limits: &Limits| open("b.xlsx", bytes, limits).unwrap_err().to_string();
    let usual = Limits::default();
    assert!(cause(b"name,rate\n".to_vec(), &usual).contains("no workbook"));
    assert!(cause(Vec::new(), &usual).contains("no workbook"));
    let bomb = replaced(&old, part, format!("<worksheet>{}</worksheet>", " ".repeat(1 << 22)).as_bytes());
    assert!(cause(bomb, &Limits::with_unzipped(1 << 20)).contains("limit of 1048576 bytes"));
    let entity = b"<!DOCTYPE w [<!ENTITY a 'aaaa'>]><worksheet><sheetData/></worksheet>";
    assert!(cause(replaced(&old, part, entity), &usual).contains("document type"));
    let strings = b"<!DOCTYPE s [<!ENTITY a 'aaaa'>]><sst/>";
    assert!(cause(replaced(&old, "xl/sharedStrings.xml", strings), &usual).contains("document type"));
    let utf16: Vec<u8> = "<worksheet/>".encode_utf16().flat_map(u16::to_le_bytes).collect();
    assert!(cause(replaced(&old, part, &utf16), &usual).contains("UTF-16"));
    let cut = cause(replaced(&old, part, b"<worksheet><sheetData><row>"), &usual);
    assert!(cut.contains("broken") || cut.contains("ends within"), "{cut}");
    let twice = b"<worksheet><sheetData><row r='1'><c r='A1'/><c r='A1'/></row></sheetData></worksheet>";
    assert!(cause(replaced(&old, part, twice), &usual).contains("cell A1: rows or cells stand twice"));
    let mut encrypted = vec![0xd0, 0xcf, 0x11, 0xe0, 0xa1, 0xb1, 0x1a, 0xe1];
    encrypted.extend("EncryptedPackage".encode_utf16().flat_map(u16::to_le_bytes));
    assert!(cause(encrypted, &usual).contains("encrypted"));
    // Two entries of one name: two of equal length are written, then one is renamed in the bytes.
    let mut twin = added(&old, "xl/worksheets/sheetX.xml", b"<worksheet/>");
    let (from, to) = (b"sheetX.xml", b"sheet1.xml");
    for at in 0..twin.len() - from.len() {
        if &twin[at..at + from.len()] == from {
            twin[at..at + from.len()].copy_from_slice(to);
        }
    }
    assert!(cause(twin, &usual).contains("two entries"));
    let signed = open("s.xlsx", added(&old, "_xmlsignatures/sig1.xml", b"<Signature/>"), &usual).unwrap();
    assert!(!signed.can_write());
    assert!(signed.write(&[number(0, 2, 2, 1.0, None)]).unwrap_err().cause.contains("signed"));
}

#[test]
fn xls_is_only_read() {
    let book = open("office.xls", file("office.xls"), &Limits::default()).unwrap();
    assert!(!book.can_write());
    assert_eq!(book.sheets()[0].at(4, 1).value, Value::Number(7.5));
    assert!(book.sheets()[0].at(12, 4).formula);
    assert!(book.write(&[number(0, 4, 4, 1.0, None)]).unwrap_err().mend.contains("-o x.xlsx"));
}

#[test]
fn cut_files_never_panic() {
    for (name, bytes) in
        [("w.xlsx", written()), ("office.ods", file("office.ods")), ("office.xls", file("office.xls"))]
    {
        for end in (0..bytes.len()).step_by(64) {
            let cut = open(name, bytes[..end].to_vec(), &Limits::default());
            assert!(cut.is_err(), "{name} {end}");
        }
    }
}

/// Parts with bytes changed at random are read or refused; and written, if they are read.
#[test]
fn damaged_parts_never_panic() {
    use std::sync::atomic::{AtomicBool, Ordering};
    // A reader runs in a thread of its own, whose panic would not end this one.
    static PANIC: AtomicBool = AtomicBool::new(false);
    let usual = std::panic::take_hook();
    std::panic::set_hook(Box::new(move |panic| {
        // calamine adds up addresses without care: checked builds stop its thread, which is met as an
        // error, and others wrap and read another cell than the scan does, which is one too.
        let theirs = panic.location().is_some_and(|place| place.file().contains("calamine"));
        if theirs && panic.to_string().contains("overflow") {
            return;
        }
        PANIC.store(true, Ordering::Relaxed);
        usual(panic);
    }));
    let mut seed = 7u64;
    let mut random = move |below: usize| {
        seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (seed >> 33) as usize % below
    };
    let parts =
        ["xl/worksheets/sheet1.xml", "xl/styles.xml", "xl/workbook.xml", "xl/_rels/workbook.xml.rels"];
    let cases = (parts.iter().map(|part| ("office.xlsx", *part))).chain([("office.ods", "content.xml")]);
    for (name, part) in cases {
        let old = file(name);
        let text = entry(&old, part).into_bytes();
        for _ in 0..150 {
            let mut damaged = text.clone();
            for _ in 0..1 + random(4) {
                let at = random(damaged.len());
                match random(3) {
                    0 => damaged[at] = b"<>/\"'=0 9A:-&;"[random(14)],
                    1 => drop(damaged.drain(at..(at + random(40)).min(damaged.len() - 1).max(at))),
                    _ => {
                        let from = random(damaged.len());
                        let piece = damaged[from..(from + random(60)).min(damaged.len())].to_vec();
                        damaged.splice(at..at, piece);
                    }
                }
            }
            let Ok(book) = open(name, replaced(&old, part, &damaged), &Limits::default()) else { continue };
            if !book.sheets().is_empty() {
                let _ = book.write(&[number(0, 4, 4, 0.5, Some("0.00")), text_at(40)]);
                book.formulas_depending_on(&[(0, 4, 4)]);
            }
        }
    }
    assert!(!PANIC.load(Ordering::Relaxed));
}

fn text_at(row: u32) -> Answer {
    text(0, row, 3, "met: yes")
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(40))]

    #[test]
    fn random_answers_change_nothing_else(places in prop::collection::btree_map((0u32..40, 0u32..30), (0u8..3, -1e6f64..1e6), 1..25)) {
        for name in ["library.xlsx", "macros.xlsm", "office.xlsx"] {
            let old = file(name);
            let book = open(name, old.clone(), &Limits::default()).unwrap();
            let answers: Vec<Answer> = (places.iter())
                .filter(|((row, column), _)| {
                    let cell = book.sheets()[0].at(*row, *column);
                    !cell.formula && cell.merged_into.is_none()
                })
                .map(|((row, column), (kind, value))| match kind {
                    0 => number(0, *row, *column, *value, Some("0.00")),
                    1 => text(0, *row, *column, &format!("a{value} ")),
                    _ => Answer { sheet: 0, row: *row, column: *column, value: AnswerValue::Clear },
                })
                .collect();
            let new = book.write(&answers).unwrap();
            let part = "xl/worksheets/sheet1.xml";
            let cells: Vec<(u32, u32)> = answers.iter().map(|a| (a.row, a.column)).collect();
            same_entries(&old, &new, &[part, "xl/workbook.xml", "xl/styles.xml"]);
            same_but_cells(&entry(&old, part), &entry(&new, part), &cells);
            let again = open(name, new.clone(), &Limits::default()).unwrap();
            prop_assert_eq!(again.write(&answers).unwrap(), new);
            for answer in &answers {
                let found = again.sheets()[0].at(answer.row, answer.column).value;
                let right = match (&answer.value, found) {
                    (AnswerValue::Number { value, .. }, Value::Number(n)) => *value == n,
                    // Where the user's format shows dates, a number reads back as one.
                    (AnswerValue::Number { .. }, Value::Date(_)) => (answer.row, answer.column) == (6, 2),
                    (AnswerValue::Text(t), Value::Text(f)) => t == f,
                    (AnswerValue::Clear, Value::Empty) => true,
                    _ => false,
                };
                prop_assert!(right, "{:?} {:?}", answer, found);
            }
        }
    }
}
