//! Networks: whether some way leads through working things from a start to
//! its ends.
//!
//! A network is reduced first ([`Network::reduce`]). What no rule reduces
//! further is computed by the frontier method: its things are decided one after the other in an order
//! that keeps few stops open, and all states that agree on how the open stops
//! hang together are one.
//!
//! Sources: J. Carlier, C. Lucet, "A decomposition algorithm for network
//! reliability evaluation", Discrete Applied Mathematics 65 (1996); G. Hardy,
//! C. Lucet, N. Limnios, "K-terminal network reliability measures with binary
//! decision diagrams", IEEE Trans. Reliability 56 (2007). From memory. That stops can fail, and that
//! one-way links keep a relation of reachability in place of classes, is
//! worked out here and checked against enumeration.

mod classes;
mod course;
mod labels;
mod mass;
mod order;
mod reach;
mod sweep;
mod table;
mod tally;
mod trace;
mod value;

#[cfg(test)]
mod tests;

pub use crate::system::network::{Network, Reduced, Term};
pub use mass::{Interval, Limits};
