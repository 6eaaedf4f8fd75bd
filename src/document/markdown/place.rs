//! What can be found in a note. All offsets are in the common count of bytes.

use crate::source::{Problem, Span};

/// Everything found in one note.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Found {
    /// The places in the order of the file; a table stands at its end, after
    /// the pairs in its cells, because it may add cells behind them.
    pub places: Vec<Place>,
    /// Complaints about places that are not as they should be, in no particular order.
    pub problems: Vec<Problem>,
}

/// A place where questions stand.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Place {
    /// A fenced block.
    Fence(Fence),
    /// A question in a comment.
    Pair(Pair),
    /// A table that follows a `<!--? table -->` line.
    Table(Table),
}

/// A fenced block whose info word is `tieback`.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Fence {
    /// From the first fence character to the end of the closing fence, or of the container.
    pub whole: Span,
    /// The lines between the fences.
    pub lines: Vec<Line>,
}

/// One line of a fenced block.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Line {
    /// The content, without block-quote and list prefix and without the line ending.
    pub text: Span,
    /// First byte of the physical line.
    pub start: u32,
    /// First byte of the next physical line; the end of the file when there is none.
    pub next: u32,
}

/// A question in a comment, with its answer when it has been filled.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Pair {
    /// The question between `<!--?` and `-->`, trimmed. It may be empty.
    pub question: Span,
    /// The whole opening comment.
    pub opener: Span,
    /// The bytes between opener and closer; `None` while unfilled. For a
    /// block pair over several lines it starts after the opener's trailing
    /// blanks and so begins with the line ending.
    pub answer: Option<Span>,
    /// Opener, answer and closer; the opener alone while unfilled.
    pub whole: Span,
    /// How it stands in the text.
    pub form: PairForm,
}

impl Pair {
    /// Whether an answer of many lines can be written here.
    pub fn is_block(&self) -> bool {
        matches!(self.form, PairForm::Block { .. })
    }
}

/// How a comment pair stands in the text.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum PairForm {
    /// Among other text; the answer is one piece of text.
    Inline {
        /// In a table cell, where `|` must be escaped.
        in_cell: bool,
        /// On a line that Markdown takes as HTML, where escapes are HTML's.
        in_html: bool,
    },
    /// Alone on its line, with or without an answer on that line.
    Block {
        /// What stands before the opener on its line: quote and list marks, indents.
        prefix: Span,
        /// Where the blanks after the opener end: an answer of lines goes here.
        blanks: u32,
        /// Filled, with the closer on the opener's own line.
        on_line: bool,
    },
}

/// A table that takes part.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Table {
    /// The `<!--? table -->` comment.
    pub opener: Span,
    /// The header row.
    pub header: Row,
    /// The rows below the header, each with as many cells as the header.
    pub rows: Vec<Row>,
}

/// One row of a table.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Row {
    /// Its cells; those that the writer left out at the end are there as missing ones.
    pub cells: Vec<Cell>,
    /// The end of the row's text, where missing cells would be added.
    pub end: u32,
    /// The row does not end in `|`.
    pub open: bool,
    /// The row has more cells than the header (reported): nothing may be written here.
    pub too_many: bool,
}

/// One cell of a table.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Cell {
    /// The trimmed content, `\|` still escaped; an empty span where text would go when blank.
    pub text: Span,
    /// A space must be written before text put here.
    pub space_before: bool,
    /// A space must be written after text put here.
    pub space_after: bool,
    /// The row ends before this cell.
    pub missing: bool,
}
