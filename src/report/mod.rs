//! What a run has to say, in the forms it is said in.
//!
//! [`render`] makes text for a terminal, [`json`] makes data for other
//! programs, [`explain`] says at length what each code means. None of them
//! writes anything anywhere: that is for [`crate::command`].

pub mod explain;
pub mod json;
mod lines;
pub mod render;

pub use lines::{Lines, Place};

use crate::source::Problem;

/// The problems in the order of their places, so that a report reads like the note.
///
/// Problems at one place keep the order in which they were found.
pub fn in_order(problems: &[Problem]) -> Vec<&Problem> {
    let mut sorted: Vec<&Problem> = problems.iter().collect();
    sorted.sort_by_key(|p| p.place.start);
    sorted
}
