//! How answers are found and written: numbers, tables, requirements.

mod desk;
mod display;
mod figure;
mod filled;
mod find;
mod importance;
mod lists;
mod reply;
mod require;
mod round;
mod steps;

pub use desk::{Desk, Prepared, Valued};
pub use display::written;
pub use figure::Number;
pub use filled::{Asked, Filled};
pub use lists::assumptions;
pub use reply::Reply;
pub(crate) use require::require_parts;
pub use require::{Verdict, require};
pub use round::StepsForm;
pub(crate) use round::{Answered, Inquiry, MANY, Outcome, Own, answer_all, misfit, show_readings, told_once};
pub use steps::End;

pub(crate) use crate::steps::plain;
