//! Where text comes from and what can be said about a place in it.
//!
//! Every later layer points at text with a [`Span`]; every complaint is a
//! [`Problem`] with a place, a cause and a mend. Nothing here knows the
//! language or prints anything.

mod cells;
mod problem;
mod span;

pub use cells::{CellAt, CellMap, CellPlace, cell_name};
pub use problem::{Code, Label, Level, Problem};
pub use span::{SourceFile, Sources, Span};
