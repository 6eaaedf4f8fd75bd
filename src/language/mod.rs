//! The language: text to syntax tree.
//!
//! `token` cuts a line into tokens with nom, `expr`, `clause` and `line` make
//! a [`Tree`] of them, `print` writes a tree back as text, and `shape` knows
//! what an answer looks like. Nothing here knows what a name means.

mod assembly;
mod cell;
mod chain;
mod clause;
mod expr;
mod grid;
mod grid_ask;
mod header;
mod line;
mod literal;
mod prefix;
mod print;
mod read;
mod routes;
mod shape;
mod token;
mod tree;
pub mod words;

pub use grid::{CellKind, Cells, Grid, GridForm, read_grids};
pub use grid_ask::{CellAsk, ask_grids};
pub use header::{HeaderKind, declared as declared_attributes};
pub use print::{print, print_start};
pub use read::{Source, read_block, read_cell_question, read_expression, read_question};
pub use shape::{is_answer, is_answer_block, is_answer_cell, is_answer_line};
pub use tree::written as written_name;
pub use tree::*;

pub(crate) use clause::unknown_clause;
