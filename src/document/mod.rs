//! The places in documents where questions stand and answers go.
//!
//! A document is its original bytes and a list of edits. [`markdown`] finds
//! the fences, comment pairs and tables of a note; [`answer_place`] turns
//! answers into edits there; [`patch`] applies edits and keeps every other
//! byte; [`save`] puts the result on disk whole or not at all.
//! [`workbook`] does the same for spreadsheets, cell by cell, [`delimited`] for
//! CSV and TSV.

pub mod answer_place;
pub mod delimited;
pub mod escape;
pub mod markdown;
pub mod patch;
pub mod save;
pub mod workbook;
