//! Methods: numbers, each with the plan that justifies it.
//!
//! A [`Plan`](plan::Plan) says how a system is computed. It does not depend on
//! the chances: the value, the importance of the parts, the cut sets and the
//! printed steps are all drawn from the same one.

pub mod at_least;
pub mod cuts;
pub mod diagram;
pub mod evaluate;
pub mod importance;
pub mod listing;
pub mod minimal;
pub mod modules;
pub mod network;
pub mod plan;
mod planner;
mod subsets;

#[cfg(test)]
mod trial;
