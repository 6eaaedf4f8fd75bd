//! How answers are found and written: numbers, tables, requirements.

mod desk;
mod display;
mod figure;
mod importance;
mod lists;
mod reply;
mod require;

pub use desk::{Desk, Prepared, Valued};
pub use display::written;
pub use figure::Number;
pub use lists::assumptions;
pub use reply::Reply;
pub use require::{Verdict, require};

pub(crate) use crate::steps::plain;
