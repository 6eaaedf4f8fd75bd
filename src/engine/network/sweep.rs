//! What the frontier method needs to know of a kind of network.

use std::fmt::Debug;
use std::hash::Hash;

/// Where a decision leads.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Next<S> {
    /// The network works whatever follows.
    Works,
    /// It has failed whatever follows.
    Fails,
    /// Undecided.
    On(S),
}

/// What one layer does to one state.
#[derive(Clone, Copy, Debug)]
pub(super) enum Step<S> {
    /// The thing of the layer does not matter.
    Same(Next<S>),
    /// Where it leads if the thing works, and if it has failed.
    Split(Next<S>, Next<S>),
}

/// A state small enough to be copied, compared and hashed at once.
pub(super) trait State: Copy + Eq + Hash + Debug + Send + Sync {
    /// No state that occurs.
    const NONE: Self;
    /// A well mixed number of the state, the same on any machine.
    fn mix(&self) -> u64;
}

/// The decisions about the things of a network, one layer each, and how they
/// move its states.
pub(super) trait Sweep {
    /// How the open stops hang together.
    type State: State;
    /// The state before the first decision.
    fn first(&self) -> Next<Self::State>;
    /// How many layers there are. After the last every state is decided.
    fn layers(&self) -> usize;
    /// The thing that a layer decides; none where a layer only tidies.
    fn thing(&self, layer: usize) -> Option<u32>;
    /// Where a state goes.
    fn step(&self, layer: usize, state: Self::State) -> Step<Self::State>;
}

/// Multiplies and folds, so that all bits of `x` reach the upper ones.
pub(super) fn mixed(x: u64) -> u64 {
    let x = (x ^ (x >> 32)).wrapping_mul(0x9E37_79B9_7F4A_7C15);
    (x ^ (x >> 29)).wrapping_mul(0xBF58_476D_1CE4_E5B9)
}
