//! Numbers that keep their digits: about 31 decimal digits of precision, and
//! probabilities that hold both tails.
//!
//! A probability near 1 is as precise as one near 0, because [`Chance`] holds
//! "works" and "fails" side by side and every operation computes the smaller
//! of the two from sums and products of positive terms.
//!
//! [`Decimal`] is how a number comes in, exactly as written; [`Digits`] and the
//! `format_` functions are how it goes out, with no digit that the error bound
//! does not decide.

mod chance;
mod constants;
mod decimal;
mod digits;
mod format;
mod functions;
mod real;
#[cfg(test)]
mod testing;

pub use chance::Chance;
pub use decimal::Decimal;
pub use digits::{Digits, Rounding, decided_digits, round_decimals, round_significant};
pub use format::{format_fails, format_number, format_to_decimals, format_works};
pub use real::Real;
