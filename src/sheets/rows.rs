//! Workbooks and delimited files as one thing: sheets of rows of cells.

use crate::document::delimited::Delimited;
use crate::document::workbook::{Book, Value};
use crate::language::CellKind;
use std::borrow::Cow;
use std::sync::Arc;

/// What stands in a cell.
#[derive(Clone, PartialEq, Debug)]
pub(super) enum Content<'a> {
    Empty,
    Text(Cow<'a, str>),
    Number(f64),
    Date(&'a str),
    Logical(bool),
    Failed(&'a str),
    NoValue,
}

impl Content<'_> {
    /// What the language is to know of it.
    pub(super) fn kind(&self) -> CellKind {
        match self {
            Content::Empty | Content::Text(_) => CellKind::Text,
            Content::Number(_) => CellKind::Number,
            Content::Date(_) => CellKind::Date,
            Content::Logical(_) => CellKind::Logical,
            Content::Failed(_) => CellKind::Failed,
            Content::NoValue => CellKind::NoValue,
        }
    }

    /// Whether nothing is to be seen in it.
    pub(super) fn is_blank(&self) -> bool {
        match self {
            Content::Empty => true,
            Content::Text(text) => text.trim().is_empty(),
            _ => false,
        }
    }

    /// Its text, if it is one.
    pub(super) fn text(&self) -> Option<&str> {
        match self {
            Content::Text(text) => Some(text.trim()),
            _ => None,
        }
    }
}

impl<'a> From<Value<'a>> for Content<'a> {
    fn from(value: Value<'a>) -> Content<'a> {
        match value {
            Value::Empty => Content::Empty,
            Value::Text(text) => Content::Text(Cow::Borrowed(text)),
            Value::Number(number) => Content::Number(number),
            Value::Bool(it) => Content::Logical(it),
            Value::Date(iso) => Content::Date(iso),
            Value::Error(text) => Content::Failed(text),
            Value::NoCache => Content::NoValue,
        }
    }
}

/// A cell in its row.
#[derive(Clone, Debug)]
pub(super) struct RowCell<'a> {
    pub(super) column: u32,
    pub(super) content: Content<'a>,
    pub(super) formula: bool,
}

/// A file of sheets that has been read.
#[derive(Debug)]
pub(super) enum Opened {
    Book(Book),
    Delimited(Arc<str>, Delimited),
}

/// Columns and sheets beyond these are not looked at; no spreadsheet has so many.
const MOST: usize = u16::MAX as usize;

impl Opened {
    /// The names of the sheets; that of a delimited file is empty.
    pub(super) fn names(&self) -> Vec<String> {
        match self {
            Opened::Book(book) => book.sheets().iter().take(MOST).map(|s| s.name.clone()).collect(),
            Opened::Delimited(..) => vec![String::new()],
        }
    }

    /// Calls with the number and the cells of each used row of a sheet, in order.
    pub(super) fn each_row(&self, sheet: usize, mut with: impl FnMut(u32, &[RowCell<'_>])) {
        match self {
            Opened::Book(book) => {
                let Some(sheet) = book.sheets().get(sheet) else { return };
                let mut cells = Vec::new();
                for row in sheet.rows() {
                    cells.clear();
                    cells.extend(row.cells().take_while(|c| (c.column as usize) < MOST).map(|c| RowCell {
                        column: c.column,
                        content: c.value.into(),
                        formula: c.formula,
                    }));
                    with(row.number(), &cells);
                }
            }
            Opened::Delimited(text, cut) => {
                let mut cells = Vec::new();
                for record in 0..cut.len() {
                    cells.clear();
                    let fields = cut.record_fields(record).iter().take(MOST);
                    cells.extend((0..).zip(fields).map(|(column, field)| RowCell {
                        column,
                        content: Content::Text(cut.value(text, field)),
                        formula: false,
                    }));
                    with(record as u32, &cells);
                }
            }
        }
    }

    /// What stands in one cell.
    pub(super) fn content(&self, sheet: usize, row: u32, column: u32) -> Content<'_> {
        match self {
            Opened::Book(book) => match book.sheets().get(sheet) {
                Some(sheet) => sheet.at(row, column).value.into(),
                None => Content::Empty,
            },
            Opened::Delimited(text, cut) => match cut.record_fields(row as usize).get(column as usize) {
                Some(field) => Content::Text(cut.value(text, field)),
                None => Content::Empty,
            },
        }
    }
}
