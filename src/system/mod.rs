//! The checked thing that the engine reads: names bound, copies made, data
//! read, structure as a graph.

mod build;
mod exposure;
mod figure;
mod item;
mod model;
pub mod network;
mod quantity;
mod scope;
mod structure;
mod units;

pub use build::{Built, Ctx, Leaf, System};
pub use exposure::{Exposure, Part};
pub use figure::Oracle;
pub use item::{Ageing, Item, Pace};
pub use model::{Def, DefId, Fault, Model, Out};
pub use quantity::{Base, Dim, Quantity, STEP};
pub use structure::{Node, NodeId, Structure};
pub use units::{Units, unit_word};
