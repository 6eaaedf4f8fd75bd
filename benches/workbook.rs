//! How long a large parts list takes, beside what reading and packing it costs
//! at least: `cargo bench --bench workbook`.
#![allow(clippy::print_stdout)]

use std::io::{Cursor, Read, Write};
use std::time::{Duration, Instant};

use calamine::{Reader, Xlsx};
use rust_xlsxwriter::Workbook;
use tieback::document::workbook::{Answer, AnswerValue, Limits, open};
use zip::write::SimpleFileOptions;
use zip::{ZipArchive, ZipWriter};

const ROWS: u32 = 100_000;

/// Rows of twelve columns, the last of which waits for answers.
fn parts() -> Vec<u8> {
    let mut book = Workbook::new();
    let sheet = book.add_worksheet();
    for row in 0..ROWS {
        sheet.write(row, 0, format!("valve {row}")).unwrap();
        sheet.write(row, 1, "in the intake house").unwrap();
        for column in 2..11u16 {
            sheet.write(row, column, f64::from(row) * 0.37 + f64::from(column) / 7.0).unwrap();
        }
        sheet.write(row, 11, 0.5).unwrap();
    }
    book.save_to_buffer().unwrap()
}

fn fill(bytes: &[u8]) -> (Duration, Duration, usize) {
    let start = Instant::now();
    let book = open("parts.xlsx", bytes.to_vec(), &Limits::default()).unwrap();
    let read = start.elapsed();
    let answers: Vec<Answer> = (0..ROWS)
        .map(|row| {
            let value = 1.0 - 1.0 / (f64::from(row) + 3.0);
            let value = AnswerValue::Number { value, format: Some("0.000000".into()) };
            Answer { sheet: 0, row, column: 11, value }
        })
        .collect();
    let new = book.write(&answers).unwrap();
    (read, start.elapsed(), new.len())
}

/// calamine reads all cells; every part is unzipped and zipped again.
fn least(bytes: &[u8]) -> (Duration, Duration) {
    let start = Instant::now();
    let mut book = Xlsx::new(Cursor::new(bytes)).unwrap();
    let name = book.sheet_names()[0].clone();
    assert_eq!(book.worksheet_range(&name).unwrap().height(), ROWS as usize);
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

/// The process's greatest memory since the last call, in bytes; where Linux tells.
fn peak() -> u64 {
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let line = status.lines().find(|l| l.starts_with("VmHWM")).unwrap_or("");
    let kib = line.split_whitespace().nth(1).and_then(|n| n.parse::<u64>().ok()).unwrap_or(0);
    let _ = std::fs::write("/proc/self/clear_refs", "5");
    kib * 1024
}

fn main() {
    // A file made by an earlier run keeps the making of it out of the memory's peak.
    let kept = std::env::temp_dir().join("tieback-speed-parts.xlsx");
    let bytes = std::fs::read(&kept).unwrap_or_else(|_| parts());
    let _ = std::fs::write(&kept, &bytes);
    let mut zip = ZipArchive::new(Cursor::new(bytes.as_slice())).unwrap();
    let xml = zip.by_name("xl/worksheets/sheet1.xml").unwrap().size();
    for _ in 0..3 {
        peak();
        let before = bytes.len() as u64;
        let (read, ours, size) = fill(&bytes);
        let most = peak();
        let (calamine, least) = least(&bytes);
        println!(
            "sheet {xml} bytes, file {} -> {size}; read {read:?}, read and write {ours:?}; calamine {calamine:?}, least {least:?}; \
             ratio {:.2}; memory {:.2} of the sheet's XML",
            bytes.len(),
            ours.as_secs_f64() / least.as_secs_f64(),
            most.saturating_sub(before) as f64 / xml as f64
        );
    }
}
