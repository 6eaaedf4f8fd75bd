//! Finds the places of a Markdown note that are tieback's concern.
//!
//! pulldown-cmark decides what is a fence, a paragraph, a cell or mere HTML;
//! this module walks over its events once and keeps spans only. Text that is
//! not touched is never copied.

mod halves;
mod html;
mod pairs;
mod place;
mod rows;
mod walk;

pub use place::{Cell, Fence, Found, Line, Pair, PairForm, Place, Row, Table};
pub use walk::find;

/// What begins a question in a comment.
pub const OPENER: &str = "<!--?";
/// What ends the answer of a comment pair.
pub const CLOSER: &str = "<!--/?-->";
/// The info word of a fence.
pub const INFO_WORD: &str = "tieback";
/// The question of a comment that makes the next table take part.
pub const TABLE_WORD: &str = "table";

#[cfg(test)]
mod tests;
