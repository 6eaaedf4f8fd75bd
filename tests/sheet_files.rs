//! Parts lists as files: what the program does with workbooks and delimited
//! files of every kind, sound and unsound.

mod workbook_tools;

use rust_xlsxwriter::{Chart, ChartType, Color, ConditionalFormatCell, ConditionalFormatCellRule};
use rust_xlsxwriter::{DataValidation, Format, Formula, Note, Table, Workbook};
use std::path::Path;
use std::process::Command;
use tempfile::TempDir;
use tieback::document::workbook::{Limits, Value, open};
use workbook_tools::{added, cell_text, entry, replaced, same_but_cells, same_entries};

/// A run of the program: its exit code, standard output and standard error.
fn tieback(folder: &Path, arguments: &[&str]) -> (i32, String, String) {
    let output = Command::new(env!("CARGO_BIN_EXE_tieback"))
        .args(arguments)
        .current_dir(folder)
        .env("NO_COLOR", "1")
        .output()
        .unwrap();
    let text = |bytes| String::from_utf8_lossy(bytes).into_owned();
    (output.status.code().unwrap(), text(&output.stdout), text(&output.stderr))
}

/// A folder with one file, filled: exit code, what was said, the file afterwards.
fn filled(name: &str, bytes: &[u8], more: &[&str]) -> (i32, String, Vec<u8>) {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join(name);
    std::fs::write(&path, bytes).unwrap();
    let (code, _, err) = tieback(folder.path(), &[&["fill", name], more].concat());
    (code, err, std::fs::read(path).unwrap())
}

fn filled_text(name: &str, text: &str) -> (i32, String, String) {
    let (code, err, bytes) = filled(name, text.as_bytes(), &[]);
    (code, err, String::from_utf8(bytes).unwrap())
}

fn fixture(name: &str) -> Vec<u8> {
    std::fs::read(format!("{}/fixtures/{name}", env!("CARGO_MANIFEST_DIR"))).unwrap()
}

/// A parts list with everything around it that a spreadsheet can hold.
fn furnished() -> Vec<u8> {
    let mut book = Workbook::new();
    let bold = Format::new().set_bold().set_background_color(Color::Yellow);
    let fine = Format::new().set_num_format("0.000000");
    let sheet = book.add_worksheet().set_name("Power").unwrap();
    sheet.merge_range(0, 0, 0, 5, "Marram Sound, power of the gate", &bold).unwrap();
    sheet.write(1, 0, "mission").unwrap().write(1, 1, "4000 h").unwrap();
    for (column, head) in (0..).zip(["name", "rate (FIT)", "in", "R ?", "F ?", "remark"]) {
        sheet.write_with_format(3, column, head, &bold).unwrap();
    }
    for (row, (name, rate)) in (4..).zip([("motor", 1800.0), ("brake", 250.0), ("gearbox", 90.0)]) {
        sheet.write(row, 0, name).unwrap().write(row, 1, rate).unwrap().write(row, 2, "drive").unwrap();
        sheet.write_blank(row, 3, &bold).unwrap();
        sheet.write_blank(row, 4, &fine).unwrap();
    }
    sheet.write(7, 0, "drive").unwrap();
    sheet.insert_note(4, 0, &Note::new("rewound in spring")).unwrap();
    sheet.set_row_hidden(5).unwrap();
    sheet.set_freeze_panes(4, 1).unwrap();
    let rule =
        ConditionalFormatCell::new().set_rule(ConditionalFormatCellRule::LessThan(0.99)).set_format(&bold);
    sheet.add_conditional_format(4, 3, 7, 3, &rule).unwrap();
    let list = DataValidation::new().allow_list_strings(&["drive", "gate"]).unwrap();
    sheet.add_data_validation(4, 2, 7, 2, &list).unwrap();
    let mut chart = Chart::new(ChartType::Bar);
    chart.add_series().set_values(("Power", 4, 3, 7, 3));
    sheet.insert_chart(10, 0, &chart).unwrap();
    sheet.protect();
    let other = book.add_worksheet().set_name("Summary").unwrap();
    other.write_formula(0, 0, Formula::new("=Power!D8*100").set_result("0")).unwrap();
    other.write(2, 0, "item").unwrap().write(2, 1, "price").unwrap();
    other.add_table(2, 0, 4, 1, &Table::new()).unwrap();
    book.save_to_buffer().unwrap()
}

#[test]
fn nothing_but_answers_changes() {
    let old = furnished();
    let (code, err, new) = filled("parts.xlsx", &old, &[]);
    assert_eq!(code, 0, "{err}");
    assert!(err.contains("Summary!A1 rests on answers that have changed"), "{err}");
    assert!(err.contains("--> parts.xlsx, sheet \"Summary\", cell A1"), "{err}");
    same_entries(&old, &new, &["xl/worksheets/sheet1.xml", "xl/workbook.xml", "xl/styles.xml"]);
    let answers: Vec<(u32, u32)> = (4..8).flat_map(|row| [(row, 3), (row, 4)]).collect();
    let sheet = "xl/worksheets/sheet1.xml";
    same_but_cells(&entry(&old, sheet), &entry(&new, sheet), &answers);
    let book = open("new", new.clone(), &Limits::default()).unwrap();
    let Value::Number(drive) = book.sheets()[0].at(7, 3).value else { panic!("no number") };
    assert!((drive - (-2140e-9_f64 * 4000.0).exp()).abs() < 1e-15, "{drive}");
    let Value::Number(motor) = book.sheets()[0].at(4, 4).value else { panic!("no number") };
    assert!((motor + (-0.0072_f64).exp_m1()).abs() < 1e-17, "{motor}");
    // The cell with a format of the user's keeps its style.
    let style = |bytes: &[u8], at| cell_text(&entry(bytes, sheet), at).split('"').nth(3).map(String::from);
    assert_eq!(style(&old, "E5"), style(&new, "E5"));
    assert_ne!(style(&old, "D5"), style(&new, "D5"));

    let folder = TempDir::new().unwrap();
    std::fs::write(folder.path().join("parts.xlsx"), &new).unwrap();
    let (code, _, err) = tieback(folder.path(), &["fill", "parts.xlsx"]);
    assert_eq!((code, err.as_str()), (0, ""), "filling twice is filling once");
    let (code, _, err) = tieback(folder.path(), &["check", "parts.xlsx"]);
    assert_eq!((code, err.as_str()), (0, "parts.xlsx: 8 answers as tieback would write them\n"));
}

#[test]
fn workbooks_of_other_writers_are_filled() {
    for name in ["library.xlsx", "office.xlsx", "macros.xlsm", "office.ods"] {
        let old = fixture(name);
        let (code, err, new) = filled(name, &old, &[]);
        assert_eq!(code, 2, "{err}");
        assert!(err.contains(&format!("--> {name}, sheet \"Gate drives\", cell C7")), "{err}");
        let book = open(name, new.clone(), &Limits::default()).unwrap();
        assert_eq!(book.sheets()[0].at(4, 4).value, Value::Number(0.876866957449353), "{name}");
        let steps = book.sheets()[0].at(4, 6).value;
        assert!(matches!(steps, Value::Text(t) if t.starts_with("1. motor[1..2], exponential law\n")));
        let (_, _, again) = filled(name, &new, &[]);
        assert!(again == new, "{name}");
    }
}

#[test]
fn check_says_what_is_stale_and_changes_nothing() {
    let folder = TempDir::new().unwrap();
    let text = "name,fails,R ?\nA,0.1,0.9\nB,0.2,0.75\nC,0.3,\n";
    std::fs::write(folder.path().join("parts.csv"), text).unwrap();
    let (code, _, err) = tieback(folder.path(), &["check", "parts.csv"]);
    assert_eq!(code, 1);
    assert!(err.contains("--> parts.csv, cell C3\n  |\n3 | 0.75\n  | ^^^^ was 0.75, now 0.8\n"), "{err}");
    assert!(err.contains("--> parts.csv, cell C4\n"), "{err}");
    assert!(err.ends_with("parts.csv: 2 of 3 answers stale; `tieback fill` writes them\n"), "{err}");
    assert_eq!(std::fs::read_to_string(folder.path().join("parts.csv")).unwrap(), text);

    std::fs::write(folder.path().join("parts.xlsx"), furnished()).unwrap();
    let (code, out, _) = tieback(folder.path(), &["check", "parts.xlsx", "--json"]);
    let run: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert_eq!(code, 1);
    let question = &run["files"][0]["questions"][0];
    assert_eq!(question["sheet"], "Power");
    assert_eq!(question["cell"], "D5");
    assert_eq!(question["question"], "R(motor)");
    assert_eq!(question["line"], serde_json::Value::Null);
    assert_eq!(run["files"][0]["problems"][0]["cell"], "D5");
    assert_eq!(std::fs::read(folder.path().join("parts.xlsx")).unwrap(), furnished());
}

#[test]
fn delimited_files_keep_their_ways() {
    // Byte-order mark, quotes, line endings, a field that is not there, a last line without ending.
    let (code, err, text) = filled_text(
        "parts.csv",
        "\u{feff}\"name\",fails,\"R ?\",note\r\n\"a, b\",0.1,\"0.5\",\" x \"\r\nB,0.2\r\nC,0.25,,",
    );
    assert_eq!((code, err.as_str()), (0, "parts.csv: 3 answers written, 3 changed\n"));
    assert_eq!(
        text,
        "\u{feff}\"name\",fails,\"R ?\",note\r\n\"a, b\",0.1,\"0.9\",\" x \"\r\nB,0.2,0.8\r\nC,0.25,0.75,"
    );
    // Decimal commas, also in answers of several numbers.
    let old = "name;fails;R ?;F in chances ?;require;met ?\nA;0,13;;;R >= 0.8;\nB;0,25;0,5;1 in 3,00;;\n";
    let (code, err, text) = filled_text("parts.csv", old);
    assert_eq!(code, 0, "{err}");
    assert_eq!(
        text,
        "name;fails;R ?;F in chances ?;require;met ?\nA;0,13;0,87;1 in 7,692;R >= 0.8;met: 0,8700, uses 65,0% of the allowed 0,2\nB;0,25;0,75;1 in 4,000;;\n"
    );
    assert_eq!(filled_text("parts.csv", &text).2, text);
    // Tabs, and a list of many lines in quotes.
    let (_, _, text) = filled_text("parts.tsv", "name\tis\tsingle points ?\nA\t0.9\t\nB\tA\t\n");
    assert_eq!(
        text,
        "name\tis\tsingle points ?\nA\t0.9\t\"single point | F\nA | 0.1000\"\nB\tA\t\"single point | F\nA | 0.1000\"\n"
    );
    assert_eq!(filled_text("parts.tsv", &text).2, text);
}

#[test]
fn a_delimited_file_that_is_not_utf8_is_left_alone() {
    let old = b"name,fails,R ?\nM\xfcller,0.1,\n";
    let (code, err, new) = filled("parts.csv", old, &[]);
    assert_eq!(code, 3);
    assert!(err.contains("byte 17 of it is not UTF-8 text") && err.contains("CSV UTF-8"), "{err}");
    assert_eq!(new, old);
}

#[test]
fn a_workbook_that_is_only_read_needs_another_file() {
    let old = fixture("office.xls");
    let (code, err, new) = filled("office.xls", &old, &[]);
    assert_eq!(code, 3, "{err}");
    assert!(err.contains("an xls workbook is only read") && err.contains("`-o answers.xlsx`"), "{err}");
    assert_eq!(new, old);

    let folder = TempDir::new().unwrap();
    std::fs::write(folder.path().join("office.xls"), &old).unwrap();
    let (code, _, err) = tieback(folder.path(), &["fill", "office.xls", "-o", "new.xlsx"]);
    assert_eq!(code, 2, "{err}");
    assert!(
        err.contains("formulas, styles, widths, charts") && err.contains("are not carried over"),
        "{err}"
    );
    let new = std::fs::read(folder.path().join("new.xlsx")).unwrap();
    let book = open("new.xlsx", new.clone(), &Limits::default()).unwrap();
    assert_eq!(book.sheets()[0].name, "Gate drives");
    assert_eq!(book.sheets()[0].at(0, 0).value, Value::Text("Flood gate 3, drives & locks <draft>"));
    assert_eq!(book.sheets()[0].at(4, 4).value, Value::Number(0.876866957449353));
    assert_eq!(book.sheets()[0].at(6, 2).value, Value::Date("2026-03-01"));
    // What is said to be no answer stays, and the new workbook fills to itself.
    let (_, _, again) = filled("new.xlsx", &new, &[]);
    assert!(again == new);
    let (code, _, err) = tieback(folder.path(), &["fill", "office.xls", "-o", "new.ods"]);
    assert_eq!(code, 3);
    assert!(err.contains("ends in .xlsx"), "{err}");
    assert!(!folder.path().join("new.ods").exists());
    // Comparing needs no place to write to.
    let (code, _, err) = tieback(folder.path(), &["check", "office.xls"]);
    assert!(code == 2 && !err.contains("only read"), "{err}");
}

#[test]
fn output_goes_elsewhere_and_keeps_its_kind() {
    let folder = TempDir::new().unwrap();
    // Made once: it holds the time at which it was made.
    let made = furnished();
    std::fs::write(folder.path().join("parts.xlsx"), &made).unwrap();
    let (code, _, err) = tieback(folder.path(), &["fill", "parts.xlsx", "-o", "done.xlsx"]);
    assert_eq!(code, 0, "{err}");
    assert_eq!(std::fs::read(folder.path().join("parts.xlsx")).unwrap(), made);
    same_entries(
        &made,
        &std::fs::read(folder.path().join("done.xlsx")).unwrap(),
        &["xl/worksheets/sheet1.xml", "xl/workbook.xml", "xl/styles.xml"],
    );
    let (code, _, err) = tieback(folder.path(), &["fill", "parts.xlsx", "-o", "done.csv"]);
    assert_eq!(code, 3);
    assert!(err.contains("give `-o` a name that ends in .xlsx"), "{err}");
}

#[test]
fn unsound_workbooks_are_told_and_left_alone() {
    let sound = furnished();
    let cut = sound[..sound.len() / 2].to_vec();
    let entity = "<?xml version=\"1.0\"?><!DOCTYPE a [<!ENTITY b \"c\"><!ENTITY d \"&b;&b;\">]><worksheet/>";
    let entity = replaced(&sound, "xl/worksheets/sheet1.xml", entity.as_bytes());
    let broken = replaced(&sound, "xl/worksheets/sheet1.xml", b"<worksheet><sheetData><row");
    let mut encrypted = vec![0xd0, 0xcf, 0x11, 0xe0, 0xa1, 0xb1, 0x1a, 0xe1];
    encrypted.extend("EncryptedPackage".encode_utf16().flat_map(u16::to_le_bytes));
    let signed = added(&sound, "_xmlsignatures/sig1.xml", b"<x/>");
    for (bytes, cause) in [
        (cut, "it is not a whole zip file"),
        (b"name,R ?".to_vec(), "is no workbook"),
        (entity, "xl/worksheets/sheet1.xml"),
        (broken, "xl/worksheets/sheet1.xml"),
        (encrypted, "it is encrypted"),
        (signed, "it is signed"),
        (Vec::new(), "is no workbook"),
    ] {
        let (code, err, after) = filled("parts.xlsx", &bytes, &[]);
        assert_eq!(code, 3, "{cause}: {err}");
        assert!(err.contains(cause) && err.contains("help: "), "{cause}: {err}");
        assert_eq!(after, bytes, "{cause}");
    }
}

#[test]
fn the_limit_on_unzipped_size_is_said_and_raised() {
    // Blanks in comments: a small file, and 1.1 GiB of XML.
    let sound = furnished();
    let filler = format!("<!--{}-->", " ".repeat(1 << 20)).repeat(1100);
    let xml = entry(&sound, "xl/worksheets/sheet1.xml");
    let large = replaced(&sound, "xl/worksheets/sheet1.xml", (xml + &filler).as_bytes());
    let (code, err, after) = filled("parts.xlsx", &large, &[]);
    assert_eq!(code, 3);
    assert!(err.contains("unzipped it is larger than the limit of 1073741824 bytes"), "{err}");
    assert!(err.contains("`--unzip-limit 4` allows 4 GiB"), "{err}");
    assert_eq!(after, large);
}

#[test]
fn an_open_workbook_is_remarked() {
    let folder = TempDir::new().unwrap();
    std::fs::write(folder.path().join("parts.xlsx"), furnished()).unwrap();
    std::fs::write(folder.path().join(".~lock.parts.xlsx#"), "").unwrap();
    let (code, _, err) = tieback(folder.path(), &["fill", "parts.xlsx"]);
    assert_eq!(code, 0);
    assert!(err.contains("remark[open-elsewhere]") && err.contains(".~lock.parts.xlsx#"), "{err}");
}

#[test]
fn folders_and_patterns_find_parts_lists() {
    let folder = TempDir::new().unwrap();
    let write = |name: &str, bytes: &[u8]| std::fs::write(folder.path().join(name), bytes).unwrap();
    write("gate.md", b"```tieback\ngate = 0.98\nR(gate) ?\n```\n");
    write("parts.xlsx", &furnished());
    write("list.csv", b"name,fails,R ?\nA,0.1,\n");
    // None of these is a parts list that asks: nothing is said of them.
    write("people.csv", b"name,source,cost\nAnn,fair,about 12\n");
    write("prices.csv", b"item;price\nbolt;0,12\n");
    write("~$parts.xlsx", b"lock");
    write("damaged.xlsx", b"PK");
    let (code, out, _) = tieback(folder.path(), &["fill", ".", "--json"]);
    let run: serde_json::Value = serde_json::from_str(&out).unwrap();
    let files: Vec<(&str, usize, usize)> = run["files"]
        .as_array()
        .unwrap()
        .iter()
        .map(|f| {
            let count = |key: &str| f[key].as_array().unwrap().len();
            (f["name"].as_str().unwrap(), count("questions"), count("problems"))
        })
        .collect();
    assert_eq!(code, 0, "{out}");
    assert_eq!(
        files,
        [
            ("damaged.xlsx", 0, 1),
            ("gate.md", 1, 0),
            ("list.csv", 1, 0),
            ("parts.xlsx", 8, 2),
            ("people.csv", 0, 0),
            ("prices.csv", 0, 0)
        ]
    );
    let (code, _, err) = tieback(folder.path(), &["check", "*.csv"]);
    assert_eq!((code, err.as_str()), (0, "list.csv: 1 answer as tieback would write them\n"));
    let (code, _, err) = tieback(folder.path(), &["check", "prices.csv"]);
    assert_eq!(code, 0);
    assert!(err.contains("remark[nothing-to-do]: this file holds no table for tieback"), "{err}");
}

#[test]
fn a_parts_list_answers_single_questions() {
    let folder = TempDir::new().unwrap();
    std::fs::write(folder.path().join("parts.xlsx"), furnished()).unwrap();
    let (code, out, err) = tieback(folder.path(), &["ask", "parts.xlsx", "R(drive, 100 h)"]);
    assert_eq!((code, out.as_str(), err.as_str()), (0, "0.9997860\n", ""));
    let (code, out, _) = tieback(
        folder.path(),
        &["ask", "parts.xlsx", "--given", "two = 1 of 2 drive", "F(two, 100 h) in chances"],
    );
    assert_eq!((code, out.as_str()), (0, "1 in 2.184e7\n"));
    let (code, out, _) = tieback(folder.path(), &["steps", "parts.xlsx", "R(drive)"]);
    assert_eq!(code, 0);
    assert!(out.starts_with("1. motor, Power!A5, exponential law\n"), "{out}");
    let (_, out, _) = tieback(folder.path(), &["steps", "parts.xlsx", "R(drive)", "--json"]);
    let run: serde_json::Value = serde_json::from_str(&out).unwrap();
    let step = &run["files"][0]["questions"][0]["steps"]["steps"][0];
    assert_eq!((&step["sheet"], &step["cell"]), (&"Power".into(), &"A5".into()));
    let (code, _, err) = tieback(folder.path(), &["ask", "parts.xlsx", "R(dirve)"]);
    assert_eq!(code, 2);
    assert!(err.contains("did you mean \"drive\"?"), "{err}");
}
