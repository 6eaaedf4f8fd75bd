//! The review workbook: inputs in one sheet, each step in another as a live
//! formula on them, beside tieback's own value and whether the two agree.

use super::front::front;
use super::gather::Review;
use super::inputs::{input_sheet, inputs};
use super::looks::Looks;
use super::ranking::ranking_sheet;
use super::step_rows::{rows, step_sheet};
use crate::source::Sources;
use rust_xlsxwriter::{DocProperties, ExcelDateTime, Workbook, XlsxError};

/// The row where the steps begin, counted from 0.
pub(super) const FIRST: u32 = 3;

/// What a review is stamped with.
#[derive(Clone, Debug, Default)]
pub struct Stamp {
    /// The document.
    pub name: String,
    /// The date that the user gives.
    pub date: Option<String>,
}

/// Writes the workbook.
///
/// # Errors
/// What the writer of workbooks refuses.
pub fn write(review: &Review, sources: &Sources, stamp: &Stamp) -> Result<Vec<u8>, XlsxError> {
    let inputs = inputs(review, sources);
    let rows = rows(review, &inputs);
    let mut book = Workbook::new();
    // The time of writing would make two runs differ.
    let made = ExcelDateTime::from_ymd(2000, 1, 1)?;
    book.set_properties(&DocProperties::new().set_creation_datetime(&made).set_title("Review"));
    let looks = Looks::new();
    front(book.add_worksheet(), review, sources, stamp, &looks)?;
    input_sheet(book.add_worksheet(), &inputs, &looks)?;
    step_sheet(book.add_worksheet(), review, sources, &rows, &looks)?;
    ranking_sheet(book.add_worksheet(), review, &looks)?;
    for (at, input) in inputs.iter().enumerate() {
        book.define_name(&input.name, &format!("=Inputs!$D${}", at + 4))?;
    }
    book.save_to_buffer()
}
