//! What a reviewer signs from: an answer's steps as live formulas of a workbook.

mod front;
mod gather;
mod inputs;
mod looks;
mod ranking;
mod review_workbook;
mod sheet_formula;
mod step_rows;

pub use gather::{Answer, Review, gather};
pub use review_workbook::{Stamp, write};
