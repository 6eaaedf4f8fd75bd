//! How answers are written.
