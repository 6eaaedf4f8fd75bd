//! How long a large parts list takes, beside what reading and packing it costs
//! at least: `cargo bench --bench workbook`.
//!
//! A workbook of 100,000 rows and twelve columns is filled beside calamine
//! reading it and its parts being unzipped and zipped again. A delimited file
//! of 1,000,000 rows is filled beside the `csv` crate reading it and writing
//! it again. `cargo bench --bench workbook -- csv` runs one of the two.
#![allow(clippy::print_stdout)]

use std::io::{Cursor, Read, Write};
use std::path::PathBuf;
use std::sync::Mutex;
use std::time::{Duration, Instant};

use calamine::{Reader, Xlsx};
use rust_xlsxwriter::Workbook;
use tieback::answer::Filled;
use tieback::document::patch::Rewrite;
use tieback::sheets::{Options, SheetForm, Stage, fill};
use zip::write::SimpleFileOptions;
use zip::{ZipArchive, ZipWriter};

const ROWS: u32 = 100_000;
const LINES: u32 = 1_000_000;

/// The assembly of a part: a thousand of them, which belong to one.
fn assembly(row: u32) -> String {
    format!("bay {}", row % 1000)
}

/// A rate in FIT.
fn rate(row: u32) -> f64 {
    0.001 + f64::from(row % 997) * 0.0037
}

/// Rows of twelve columns, two of which wait for answers.
fn parts() -> Vec<u8> {
    let mut book = Workbook::new();
    let sheet = book.add_worksheet();
    sheet.write(0, 0, "mission").unwrap().write(0, 1, "4000 h").unwrap();
    let heads = [
        "name",
        "part no.",
        "rate (FIT)",
        "duty",
        "in",
        "source",
        "maker",
        "price",
        "mass (kg)",
        "R ?",
        "F in chances ?",
        "remark",
    ];
    for (column, head) in (0..).zip(heads) {
        sheet.write(2, column, head).unwrap();
    }
    for row in 0..ROWS {
        let at = row + 3;
        if row >= ROWS - 1001 {
            let number = ROWS - 1 - row;
            let name = if number == 1000 { "plant".to_string() } else { assembly(number) };
            sheet.write(at, 0, name).unwrap();
            if number < 1000 {
                sheet.write(at, 4, "plant").unwrap();
            }
            continue;
        }
        sheet.write(at, 0, format!("valve {row}")).unwrap();
        sheet.write(at, 1, format!("V-{:05}-{}", row * 7 % 99_991, row % 13)).unwrap();
        sheet.write(at, 2, rate(row)).unwrap();
        sheet.write(at, 3, 0.25 + f64::from(row % 3) * 0.25).unwrap();
        sheet.write(at, 4, assembly(row)).unwrap();
        sheet.write(at, 5, format!("sheet {}", row % 40)).unwrap();
        sheet.write(at, 6, "Tallis & Daughters").unwrap();
        sheet.write(at, 7, f64::from(row) * 0.37 + 12.5).unwrap();
        sheet.write(at, 8, f64::from(row % 91) / 7.0).unwrap();
        sheet.write(at, 11, "in the intake house").unwrap();
    }
    book.save_to_buffer().unwrap()
}

/// The same as lines of text, with seven columns.
fn lines() -> Vec<u8> {
    let mut text = String::from("mission,4000 h\nname,rate (FIT),in,source,maker,R ?,remark\n");
    for row in 0..LINES {
        let name = assembly(row);
        text.push_str(&format!(
            "valve {row},{},{name},sheet {},Tallis & Daughters,,\"yes, checked\"\n",
            rate(row),
            row % 40
        ));
    }
    text.into_bytes()
}

fn filled(name: &str, form: SheetForm, bytes: &[u8]) -> (Duration, usize) {
    let start = Instant::now();
    let stages: Mutex<Vec<(&str, Duration)>> = Mutex::new(Vec::new());
    let tell = |stage| {
        let word = match stage {
            Stage::Reading => "reading",
            Stage::Answering(..) => "answering",
            Stage::Writing => "writing",
        };
        let mut stages = stages.lock().unwrap();
        if stages.last().is_none_or(|(last, _)| *last != word) {
            stages.push((word, start.elapsed()));
        }
    };
    let options = Options { progress: Some(&tell), ..Options::default() };
    let Filled { problems, asked, rewrite, .. } = fill(name, form, bytes.to_vec(), &options);
    let took = start.elapsed();
    for (stage, at) in stages.into_inner().unwrap() {
        print!("{stage} from {:.2} s, ", at.as_secs_f64());
    }
    assert!(problems.is_empty(), "{problems:?}");
    assert!(asked.iter().all(|a| !a.error));
    let Rewrite::Patched(new) = rewrite else { panic!("nothing was filled") };
    (took, new.len())
}

/// calamine reads all cells; every part is unzipped and zipped again.
fn least(bytes: &[u8]) -> (Duration, Duration) {
    let start = Instant::now();
    let mut book = Xlsx::new(Cursor::new(bytes)).unwrap();
    let name = book.sheet_names()[0].clone();
    assert_eq!(book.worksheet_range(&name).unwrap().height(), ROWS as usize + 3);
    let read = start.elapsed();
    let mut zip = ZipArchive::new(Cursor::new(bytes)).unwrap();
    let mut out = ZipWriter::new(Cursor::new(Vec::new()));
    for index in 0..zip.len() {
        let mut entry = zip.by_index(index).unwrap();
        let mut data = Vec::new();
        entry.read_to_end(&mut data).unwrap();
        out.start_file(entry.name().unwrap(), SimpleFileOptions::default()).unwrap();
        out.write_all(&data).unwrap();
    }
    out.finish().unwrap();
    (read, start.elapsed())
}

/// The `csv` crate reads all records and writes them again.
fn least_lines(bytes: &[u8]) -> Duration {
    let start = Instant::now();
    let mut reader = csv::ReaderBuilder::new().flexible(true).has_headers(false).from_reader(bytes);
    let mut writer = csv::WriterBuilder::new().flexible(true).from_writer(Vec::new());
    let mut record = csv::ByteRecord::new();
    let mut count = 0;
    while reader.read_byte_record(&mut record).unwrap() {
        writer.write_byte_record(&record).unwrap();
        count += 1;
    }
    assert_eq!(count, LINES + 2);
    assert!(writer.into_inner().unwrap().len() > bytes.len() / 2);
    start.elapsed()
}

/// The process's greatest memory since the last call, in bytes; where Linux tells.
fn peak() -> u64 {
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let line = status.lines().find(|l| l.starts_with("VmHWM")).unwrap_or("");
    let kib = line.split_whitespace().nth(1).and_then(|n| n.parse::<u64>().ok()).unwrap_or(0);
    let _ = std::fs::write("/proc/self/clear_refs", "5");
    kib * 1024
}

/// A file made by an earlier run keeps the making of it out of the memory's peak.
fn kept(name: &str, make: impl Fn() -> Vec<u8>) -> Vec<u8> {
    let path: PathBuf = std::env::temp_dir().join(name);
    std::fs::read(&path).unwrap_or_else(|_| {
        let bytes = make();
        let _ = std::fs::write(&path, &bytes);
        bytes
    })
}

fn main() {
    let wanted: Vec<String> = std::env::args().skip(1).filter(|a| !a.starts_with('-')).collect();
    let wants = |what: &str| wanted.is_empty() || wanted.iter().any(|w| w == what);
    if wants("xlsx") {
        let bytes = kept("tieback-speed-plant.xlsx", parts);
        let mut zip = ZipArchive::new(Cursor::new(bytes.as_slice())).unwrap();
        let xml = zip.by_name("xl/worksheets/sheet1.xml").unwrap().size();
        for _ in 0..3 {
            peak();
            let (ours, size) = filled("parts.xlsx", SheetForm::Workbook, &bytes);
            let most = peak().saturating_sub(bytes.len() as u64);
            let (calamine, least) = least(&bytes);
            println!(
                "xlsx: {ROWS} rows, sheet {xml} bytes, file {} -> {size}; filled in {ours:?}; calamine {calamine:?}, with the zip {least:?}; \
                 ratio {:.2} (goal 1.5); memory {:.2} of the sheet's XML (goal 3)",
                bytes.len(),
                ours.as_secs_f64() / least.as_secs_f64(),
                most as f64 / xml as f64
            );
        }
    }
    if wants("csv") {
        let bytes = kept("tieback-speed-plant.csv", lines);
        for _ in 0..3 {
            peak();
            let (ours, size) = filled("parts.csv", SheetForm::Csv, &bytes);
            let most = peak().saturating_sub(bytes.len() as u64);
            let least = least_lines(&bytes);
            println!(
                "csv: {LINES} rows, {} bytes -> {size}; filled in {ours:?}; read and written {least:?}; ratio {:.2} (goal 2); memory {:.2} of the file",
                bytes.len(),
                ours.as_secs_f64() / least.as_secs_f64(),
                most as f64 / bytes.len() as f64
            );
        }
    }
}
