//! How answers are found and written: numbers, tables, requirements.

mod desk;
mod figure;
mod lists;
mod reply;
mod require;

pub use desk::{Desk, Prepared, Valued};
pub use figure::{Number, written};
pub use lists::assumptions;
pub use reply::Reply;
pub use require::{Verdict, require};

pub(crate) use crate::steps::plain;
