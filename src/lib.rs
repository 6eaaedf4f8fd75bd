//! tieback.

pub mod answer;
pub mod command;
pub mod document;
pub mod engine;
pub mod language;
pub mod note;
pub mod number;
pub mod report;
pub mod source;
pub mod steps;
pub mod system;
