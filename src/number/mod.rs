//! Numbers that keep their digits: about 31 decimal digits of precision, and
//! probabilities that hold both tails.
//!
//! A probability near 1 is as precise as one near 0, because [`Chance`] holds
//! "works" and "fails" side by side and every operation computes the smaller
//! of the two from sums and products of positive terms.
//!
//! [`Decimal`] is how a number comes in, exactly as written.

mod chance;
mod constants;
mod decimal;
mod functions;
mod real;
#[cfg(test)]
mod testing;

pub use chance::Chance;
pub use decimal::Decimal;
pub use real::Real;
