//! Steps: formula trees and their renderings.
//!
//! A step is data first: a formula for each tail, whose value is the step's
//! result. Text, Markdown and JSON are drawn from the same list.

mod build;
mod formula;
mod json;
mod list;
mod names;
mod render;

pub(crate) use build::plain;
pub use build::{Written, write};
pub use formula::{Formula, Side, Tails};
pub use json::json;
pub use list::{Outcome, Rule, Step, StepList};
pub use names::{folded, listed};
pub use render::{Shown, shown, side_text};
