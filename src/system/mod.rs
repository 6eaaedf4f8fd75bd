//! The checked thing that the engine reads: names bound, copies made, structure as a graph.

mod structure;

pub use structure::{Node, NodeId, Structure};
