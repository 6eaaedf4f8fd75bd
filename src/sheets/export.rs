//! A new workbook with the values of one that is only read, and the answers.

use crate::document::workbook::{Answer, AnswerValue, Book, BookTrouble, Value};
use rust_xlsxwriter::{DocProperties, ExcelDateTime, Format, Workbook, Worksheet, XlsxError};
use rustc_hash::FxHashMap;

/// The bytes of an xlsx with all values of `book`, and the answers in their cells.
pub(super) fn new_workbook(book: &Book, answers: &[Answer]) -> Result<Vec<u8>, BookTrouble> {
    made(book, answers).map_err(|error| BookTrouble {
        sheet: None,
        cell: None,
        at: None,
        cause: format!("a new workbook cannot be made of it: {error}"),
        mend: "save it as xlsx in a spreadsheet program, and fill that".to_string(),
    })
}

fn made(book: &Book, answers: &[Answer]) -> Result<Vec<u8>, XlsxError> {
    let mut new = Workbook::new();
    // The same input gives the same bytes: no clock is read.
    let properties = DocProperties::new().set_creation_datetime(&ExcelDateTime::from_ymd(2000, 1, 1)?);
    new.set_properties(&properties);
    let by_cell: FxHashMap<(usize, u32, u32), &AnswerValue> =
        answers.iter().map(|a| ((a.sheet, a.row, a.column), &a.value)).collect();
    for (index, old) in book.sheets().iter().enumerate() {
        let sheet = new.add_worksheet();
        sheet.set_name(&old.name)?;
        sheet.set_hidden(!old.visible);
        for row in old.rows() {
            for cell in row.cells() {
                if !by_cell.contains_key(&(index, cell.row, cell.column)) {
                    value(sheet, cell.row, column(cell.column), cell.value, cell.percent)?;
                }
            }
        }
    }
    for answer in answers {
        let sheet = new.worksheet_from_index(answer.sheet)?;
        let (row, column) = (answer.row, column(answer.column));
        match &answer.value {
            AnswerValue::Number { value, format: Some(code) } => {
                sheet.write_number_with_format(row, column, *value, &Format::new().set_num_format(code))?;
            }
            AnswerValue::Number { value, format: None } => {
                sheet.write_number(row, column, *value)?;
            }
            AnswerValue::Text(text) => {
                sheet.write_string(row, column, text)?;
            }
            AnswerValue::Clear => {}
        }
    }
    new.save_to_buffer()
}

fn column(column: u32) -> u16 {
    u16::try_from(column).unwrap_or(u16::MAX)
}

fn value(
    sheet: &mut Worksheet,
    row: u32,
    column: u16,
    value: Value<'_>,
    percent: bool,
) -> Result<(), XlsxError> {
    match value {
        Value::Empty | Value::NoCache => {}
        Value::Number(number) if percent => {
            sheet.write_number_with_format(row, column, number, &Format::new().set_num_format("0.00%"))?;
        }
        Value::Number(number) => {
            sheet.write_number(row, column, number)?;
        }
        Value::Bool(it) => {
            sheet.write_boolean(row, column, it)?;
        }
        Value::Text(text) | Value::Error(text) => {
            sheet.write_string(row, column, text)?;
        }
        Value::Date(iso) => match ExcelDateTime::parse_from_str(iso) {
            Ok(date) => {
                let code = if iso.contains(':') { "yyyy-mm-dd hh:mm:ss" } else { "yyyy-mm-dd" };
                sheet.write_datetime_with_format(row, column, &date, &Format::new().set_num_format(code))?;
            }
            Err(_) => {
                sheet.write_string(row, column, iso)?;
            }
        },
    }
    Ok(())
}
