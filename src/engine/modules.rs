//! Which parts of a system share nothing with the rest.
//!
//! Source: Y. Dutuit, A. Rauzy, "A linear-time algorithm to find modules of
//! fault trees", IEEE Trans. Reliability 45 (1996), from memory: a walk gives
//! each node the dates of its first and last visit, and a node is a module
//! when all visits of all nodes under it lie within its own first visit.

use crate::system::network::Network;
use crate::system::{Node, NodeId, Structure};
use rustc_hash::FxHashMap;
use std::sync::Arc;

/// Stands for "not there" in tables of numbers.
pub(super) const NONE: u32 = u32::MAX;

/// What a node of a [`Graph`] is.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Kind {
    /// Always works.
    Works,
    /// The thing with this number; there is one node for it.
    Leaf(u32),
    /// At least `need` of the members in this range of the pool.
    AtLeast {
        /// How many must work.
        need: u32,
        /// Range of its members in the pool.
        members: (u32, u32),
    },
    /// A network at whose stops stand the members in this range of the pool.
    Network {
        /// Which network; see [`Graph::shape`].
        shape: u32,
        /// Range of its members in the pool.
        members: (u32, u32),
    },
}

/// The part of a structure under one node, tidied: numbered so that members
/// come before their owners, one node for each thing, `A // A` replaced by A.
#[derive(Clone, Debug, Default)]
pub struct Graph {
    kinds: Vec<Kind>,
    pool: Vec<u32>,
    shapes: Vec<Arc<Network>>,
    origin: Vec<NodeId>,
    place: Vec<u32>,
}

impl Graph {
    /// The tidied part of `structure` under `root`, which becomes the last node
    /// or one of those that it is equal to; see [`Graph::place`].
    pub fn new(structure: &Structure, root: NodeId) -> Graph {
        let mut graph = Graph { place: vec![NONE; structure.len()], ..Graph::default() };
        let mut leaves: FxHashMap<u32, u32> = FxHashMap::default();
        let mut works = NONE;
        // Marks the members already met in the node being tidied.
        let mut met: Vec<u32> = Vec::new();
        let mut round = 0;
        let mut stack = vec![(root, 0usize)];
        while let Some((id, next)) = stack.pop() {
            if graph.place[id.0 as usize] != NONE {
                continue;
            }
            let at = match structure.node(id) {
                Node::Works => {
                    if works == NONE {
                        works = graph.push(Kind::Works, id);
                    }
                    works
                }
                Node::Leaf(leaf) => *leaves.entry(leaf).or_insert_with(|| graph.push(Kind::Leaf(leaf), id)),
                node @ (Node::AtLeast { .. } | Node::Network { .. }) => {
                    let members = structure.members(id);
                    if let Some(&member) = members.get(next) {
                        stack.push((id, next + 1));
                        if graph.place[member.0 as usize] == NONE {
                            stack.push((member, 0));
                        }
                        continue;
                    }
                    match node {
                        Node::AtLeast { need, .. } => {
                            round += 1;
                            met.resize(graph.kinds.len(), 0);
                            graph.tidy(id, need, members, (&mut met, round), &mut works)
                        }
                        Node::Network { shape, .. } => graph.network(id, structure.shape(shape), members),
                        Node::Works | Node::Leaf(_) => NONE,
                    }
                }
            };
            graph.place[id.0 as usize] = at;
        }
        graph
    }

    fn push(&mut self, kind: Kind, origin: NodeId) -> u32 {
        self.kinds.push(kind);
        self.origin.push(origin);
        self.kinds.len() as u32 - 1
    }

    /// Adds a network all of whose members have a place; members that are one
    /// and the same become one.
    fn network(&mut self, id: NodeId, shape: &Arc<Network>, members: &[NodeId]) -> u32 {
        let start = self.pool.len();
        let mut known: FxHashMap<u32, u32> = FxHashMap::default();
        let mut moved: Vec<u32> = Vec::with_capacity(members.len());
        for member in members {
            let at = self.place[member.0 as usize];
            let next = (self.pool.len() - start) as u32;
            let place = *known.entry(at).or_insert(next);
            if place == next {
                self.pool.push(at);
            }
            moved.push(place);
        }
        let mut shape = shape.clone();
        if self.pool.len() - start < members.len() {
            let mut network = (*shape).clone();
            for stop in network.stops.iter_mut().flatten() {
                *stop = moved[*stop as usize];
            }
            shape = Arc::new(network);
        }
        self.shapes.push(shape);
        let members = (start as u32, self.pool.len() as u32);
        self.push(Kind::Network { shape: self.shapes.len() as u32 - 1, members }, id)
    }

    /// The network of a [`Kind::Network`]; a number at its stops is a place
    /// among the node's members.
    pub fn shape(&self, shape: u32) -> &Arc<Network> {
        &self.shapes[shape as usize]
    }

    /// Adds an "at least" node all of whose members have a place.
    fn tidy(
        &mut self,
        id: NodeId,
        need: u32,
        members: &[NodeId],
        (met, round): (&mut [u32], u32),
        works: &mut u32,
    ) -> u32 {
        let start = self.pool.len();
        let mut left = need as usize;
        let plain = need == 1 || need as usize == members.len();
        let all = need as usize == members.len();
        for member in members {
            let at = self.place[member.0 as usize];
            if self.kinds[at as usize] == Kind::Works {
                left = left.saturating_sub(1);
            } else if plain && met[at as usize] == round {
                left -= usize::from(all);
            } else {
                met[at as usize] = round;
                self.pool.push(at);
            }
        }
        let count = self.pool.len() - start;
        if left == 0 {
            self.pool.truncate(start);
            if *works == NONE {
                *works = self.push(Kind::Works, id);
            }
            return *works;
        }
        if count == 1
            && let Some(only) = self.pool.pop()
        {
            return only;
        }
        let members = (start as u32, self.pool.len() as u32);
        self.push(Kind::AtLeast { need: left as u32, members }, id)
    }

    /// What a node is.
    pub fn kind(&self, at: u32) -> Kind {
        self.kinds[at as usize]
    }

    /// The members of a node.
    pub fn members(&self, at: u32) -> &[u32] {
        match self.kinds[at as usize] {
            Kind::AtLeast { members: (a, b), .. } | Kind::Network { members: (a, b), .. } => {
                &self.pool[a as usize..b as usize]
            }
            _ => &[],
        }
    }

    /// The structure node that a node was first made for.
    pub fn origin(&self, at: u32) -> NodeId {
        self.origin[at as usize]
    }

    /// The node that stands for a structure node, if it lies under the root.
    pub fn place(&self, id: NodeId) -> Option<u32> {
        self.place.get(id.0 as usize).copied().filter(|&at| at != NONE)
    }

    /// How many nodes there are.
    pub fn len(&self) -> usize {
        self.kinds.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.kinds.is_empty()
    }

    /// For each node, whether no node under it is reached from `root` other
    /// than through it. Leaves always are modules.
    pub fn modules(&self, root: u32) -> Vec<bool> {
        let n = self.len();
        let (mut first, mut last, mut left) = (vec![NONE; n], vec![0u32; n], vec![0u32; n]);
        let mut time = 0;
        let mut stack = vec![(root, 0usize)];
        first[root as usize] = 0;
        while let Some((at, next)) = stack.pop() {
            time += 1;
            let Some(&member) = self.members(at).get(next) else {
                left[at as usize] = time;
                continue;
            };
            stack.push((at, next + 1));
            last[member as usize] = time;
            if first[member as usize] == NONE {
                first[member as usize] = time;
                stack.push((member, 0));
            }
        }
        let (mut earliest, mut latest) = (vec![NONE; n], vec![0u32; n]);
        let mut modules = vec![true; n];
        for at in 0..n {
            if first[at] == NONE {
                continue;
            }
            for &member in self.members(at as u32) {
                let m = member as usize;
                earliest[at] = earliest[at].min(first[m]).min(earliest[m]);
                latest[at] = latest[at].max(last[m]).max(latest[m]);
            }
            // A leaf has nothing under it: its dates are the latest and the first.
            modules[at] = earliest[at] > first[at] && latest[at] < left[at];
        }
        modules
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_part_is_a_module_only_if_nothing_in_it_is_used_outside() {
        let mut s = Structure::default();
        let [a, b, c, d, x] = [0, 1, 2, 3, 4].map(|l| s.leaf(l));
        let x_again = s.leaf(4);
        let cd = s.at_least(2, &[c, d]);
        let left = s.at_least(2, &[a, x]);
        let right = s.at_least(2, &[b, x_again]);
        let pair = s.at_least(1, &[left, right]);
        let root = s.at_least(2, &[pair, cd]);
        let g = Graph::new(&s, root);
        let at = |id| g.place(id).unwrap();
        let modules = g.modules(at(root));
        assert_eq!(at(x), at(x_again));
        for (id, want) in [(a, true), (x, true), (cd, true), (left, false), (right, false), (pair, true)] {
            assert_eq!(modules[at(id) as usize], want);
        }
        assert!(modules[at(root) as usize]);
    }

    #[test]
    fn repeated_members_are_dropped_in_series_and_parallel_only() {
        let mut s = Structure::default();
        let [a, b] = [0, 1].map(|l| s.leaf(l));
        let twice = s.at_least(1, &[a, a]);
        let all = s.at_least(3, &[a, twice, b]);
        let two = s.at_least(2, &[a, a, b]);
        let root = s.at_least(2, &[all, two]);
        let g = Graph::new(&s, root);
        assert_eq!(g.place(twice), g.place(a));
        assert_eq!(g.members(g.place(all).unwrap()).len(), 2);
        assert_eq!(g.members(g.place(two).unwrap()).len(), 3);
    }

    #[test]
    fn depth_is_no_recursion() {
        let mut s = Structure::default();
        let mut top = s.leaf(0);
        for l in 1..100_000 {
            let leaf = s.leaf(l);
            top = s.at_least(1 + l % 2, &[top, leaf]);
        }
        let g = Graph::new(&s, top);
        assert!(g.modules(g.place(top).unwrap()).into_iter().all(|m| m));
    }
}
