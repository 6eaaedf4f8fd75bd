//! Answers written into ods workbooks.

mod workbook_tools;

use std::io::Cursor;

use calamine::{Data, Ods, Reader};
use tieback::document::workbook::{Answer, AnswerValue, Limits, Value, open};
use workbook_tools::*;

fn office() -> Vec<u8> {
    std::fs::read(format!("{}/fixtures/office.ods", env!("CARGO_MANIFEST_DIR"))).unwrap()
}

/// The content part as lines, one tag each, so that a difference is a few of them.
fn lines(bytes: &[u8]) -> Vec<String> {
    entry(bytes, "content.xml").replace('<', "\n<").lines().map(String::from).collect()
}

/// The lines that `old` has and `new` has not, in order.
fn lost(old: &[String], new: &[String]) -> Vec<String> {
    let mut rest: Vec<&String> = new.iter().collect();
    let mut out = Vec::new();
    for line in old {
        match rest.iter().position(|l| *l == line) {
            Some(at) => drop(rest.remove(at)),
            None => out.push(line.clone()),
        }
    }
    out
}

#[test]
fn only_answers_change() {
    let old = office();
    let book = open("office.ods", old.clone(), &Limits::default()).unwrap();
    let answers = vec![
        number(0, 4, 4, 0.99999999, Some("0.00000000")),
        number(0, 4, 5, 1.25e-9, Some("0.000E+00")),
        text(0, 6, 6, "none: no  trial <yet>\nand more"),
        text(0, 4, 0, "new motor"),
        // In the middle of repeated cells, and of a million repeated rows.
        number(0, 8, 900, 3.5, None),
        number(0, 5000, 8, -2.5, Some("0.0")),
        number(1, 1, 2, 0.5, Some("0.0000")),
    ];
    let new = book.write(&answers).unwrap();
    same_entries(&old, &new, &["content.xml"]);
    let (a, b) = (lines(&old), lines(&new));
    let lost = lost(&a, &b);
    assert!(lost.len() < 14, "{lost:#?}");
    for kept in [
        "<office:annotation",
        "<dc:date",
        "<draw:frame",
        "<draw:image",
        "<style:map",
        "calcext:conditional-format",
    ] {
        let count = |lines: &[String]| lines.iter().filter(|l| l.contains(kept)).count();
        assert!(count(&a) > 0 && count(&b) >= count(&a), "{kept}");
    }
    let mut calamine = Ods::new(Cursor::new(new.clone())).unwrap();
    let names = calamine.sheet_names();
    for answer in &answers {
        let range = calamine.worksheet_range(&names[answer.sheet]).unwrap();
        let found = range.get_value((answer.row, answer.column)).cloned().unwrap_or_default();
        match &answer.value {
            AnswerValue::Number { value, .. } => assert_eq!(found, Data::Float(*value)),
            AnswerValue::Text(text) => assert_eq!(found, Data::String(text.clone())),
            AnswerValue::Clear => assert_eq!(found, Data::Empty),
        }
    }
    // For looking at it in a spreadsheet program.
    std::fs::write(format!("{}/filled-office.ods", env!("CARGO_TARGET_TMPDIR")), &new).unwrap();
    let again = open("office.ods", new.clone(), &Limits::default()).unwrap();
    assert_eq!(again.write(&answers).unwrap(), new);
    assert_eq!(again.sheets()[0].at(6, 6).value, Value::Text("none: no  trial <yet>\nand more"));
    assert!(again.sheets()[0].at(4, 4).general && !again.sheets()[0].at(4, 5).general);
    // Every other cell reads as before.
    for (sheet, (old, new)) in book.sheets().iter().zip(again.sheets()).enumerate() {
        for cell in old.rows().flat_map(|r| r.cells().collect::<Vec<_>>()) {
            let answered =
                answers.iter().any(|a| (a.sheet, a.row, a.column) == (sheet, cell.row, cell.column));
            assert!(answered || new.at(cell.row, cell.column) == cell, "{cell:?}");
        }
    }
    let clear: Vec<Answer> =
        answers.iter().map(|a| Answer { value: AnswerValue::Clear, ..a.clone() }).collect();
    let cleared = open("office.ods", again.write(&clear).unwrap(), &Limits::default()).unwrap();
    assert_eq!(cleared.sheets()[0].at(5000, 8).value, Value::Empty);
    // What was never there is not cleared: the file stays as it is.
    let nothing = Answer { sheet: 0, row: 700_000, column: 9000, value: AnswerValue::Clear };
    assert_eq!(book.write(&[nothing]).unwrap(), old);
}

#[test]
fn repeats_are_limited() {
    let row = "<table:table-row table:number-rows-repeated=\"1000000\"><table:table-cell table:number-columns-repeated=\"1000\" office:value-type=\"float\" office:value=\"1\"/></table:table-row>";
    let xml = format!(
        "<office:document-content xmlns:office=\"o\" xmlns:table=\"t\" xmlns:text=\"x\"><office:body><office:spreadsheet><table:table table:name=\"a\">{row}</table:table></office:spreadsheet></office:body></office:document-content>"
    );
    let trouble = open("r.ods", replaced(&office(), "content.xml", xml.as_bytes()), &Limits::default());
    assert!(trouble.unwrap_err().cause.contains("more cells than the limit"));
    let small = xml.replace("1000000", "20").replace("1000", "3");
    let bytes = replaced(&office(), "content.xml", small.as_bytes());
    let book = open("r.ods", bytes, &Limits::default()).unwrap();
    let new = book.write(&[number(0, 10, 1, 7.0, None), number(0, 30, 5, 8.0, None)]).unwrap();
    let book = open("r.ods", new, &Limits::default()).unwrap();
    let value = |row, column| book.sheets()[0].at(row, column).value;
    assert_eq!(value(10, 1), Value::Number(7.0));
    assert_eq!(value(10, 2), Value::Number(1.0));
    assert_eq!(value(9, 1), Value::Number(1.0));
    assert_eq!(value(11, 1), Value::Number(1.0));
    assert_eq!(value(30, 5), Value::Number(8.0));
    assert_eq!(value(20, 0), Value::Empty);
}

#[test]
fn encrypted_is_said() {
    let manifest = b"<manifest:manifest xmlns:manifest='m'><manifest:encryption-data/></manifest:manifest>";
    let bytes = replaced(&office(), "META-INF/manifest.xml", manifest);
    assert!(open("e.ods", bytes, &Limits::default()).unwrap_err().cause.contains("encrypted"));
}
