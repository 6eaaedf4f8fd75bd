//! How things depend on each other, as a graph of "at least k of" nodes.
//!
//! Series is "all of", parallel is "at least one of"; for what has no memory
//! nothing else is needed but networks that these two cannot say. The graph is directed and acyclic: a node, or a
//! leaf, that several nodes have as a member is one and the same thing in all.

use super::network::{Network, Term};
use rustc_hash::FxHashMap;
use std::sync::Arc;

/// A node of a [`Structure`]. Members always have smaller numbers than the
/// node that holds them, so a plain loop over the numbers goes upwards.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct NodeId(pub u32);

/// What a node is.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Node {
    /// Always works; stands only where nothing that can fail is left.
    Works,
    /// The thing with this number; the caller says what it is.
    Leaf(u32),
    /// Works when at least `need` of its members work; 1 <= need <= members.
    AtLeast {
        /// How many must work.
        need: u32,
        /// Range of its members in the pool.
        members: (u32, u32),
    },
    /// Works when its network does, which no reduction makes smaller.
    Network {
        /// Which network; see [`Structure::shape`].
        shape: u32,
        /// Range of its members in the pool.
        members: (u32, u32),
    },
}

/// Nodes and their members.
#[derive(Clone, Debug, Default)]
pub struct Structure {
    nodes: Vec<Node>,
    pool: Vec<NodeId>,
    shapes: Vec<Arc<Network>>,
}

impl Structure {
    /// Makes room for so many nodes more.
    pub fn reserve(&mut self, nodes: usize) {
        self.nodes.reserve(nodes);
        self.pool.reserve(nodes);
    }

    /// Adds the thing with number `leaf`. Adding it twice makes two nodes for
    /// one thing; callers keep the first.
    pub fn leaf(&mut self, leaf: u32) -> NodeId {
        self.push(Node::Leaf(leaf))
    }

    /// A node that always works.
    pub fn works(&mut self) -> NodeId {
        self.push(Node::Works)
    }

    /// Adds "at least `need` of `members`". Members that always work count
    /// towards `need` at once; a node with one member is that member.
    ///
    /// `need` must not be more than the number of members: callers have told
    /// the writer so before.
    pub fn at_least(&mut self, need: u32, members: &[NodeId]) -> NodeId {
        debug_assert!(need as usize <= members.len());
        let start = self.pool.len();
        let mut left = need;
        for &member in members {
            if self.node(member) == Node::Works {
                left = left.saturating_sub(1);
            } else {
                self.pool.push(member);
            }
        }
        let count = self.pool.len() - start;
        if left == 0 {
            self.pool.truncate(start);
            return self.works();
        }
        if count == 1 {
            return self.pool.pop().unwrap_or(NodeId(0));
        }
        self.push(Node::AtLeast { need: left, members: (start as u32, self.pool.len() as u32) })
    }

    /// Adds a network at whose stops stand nodes of this structure, as series,
    /// parallel and such networks as are left of it; nothing if it cannot work.
    pub fn network(&mut self, network: &Network) -> Option<NodeId> {
        let mut network = network.clone();
        for stop in &mut network.stops {
            *stop = stop.filter(|&node| self.node(NodeId(node)) != Node::Works);
        }
        let mut made: Vec<NodeId> = Vec::new();
        for term in network.reduce().terms {
            let of = |list: &[u32]| -> Vec<NodeId> { list.iter().map(|&m| made[m as usize]).collect() };
            let node = match term {
                Term::Works => self.works(),
                Term::Fails => return None,
                Term::Thing(node) => NodeId(node),
                Term::All(list) => {
                    let members = of(&list);
                    self.at_least(members.len() as u32, &members)
                }
                Term::Any(list) => {
                    let members = of(&list);
                    self.at_least(1, &members)
                }
                Term::Network(mut left) => {
                    let mut members: Vec<NodeId> = Vec::new();
                    let mut place: FxHashMap<NodeId, u32> = FxHashMap::default();
                    for stop in left.stops.iter_mut().flatten() {
                        let node = made[*stop as usize];
                        *stop = *place.entry(node).or_insert_with(|| {
                            members.push(node);
                            members.len() as u32 - 1
                        });
                    }
                    self.shaped(Arc::new(left), &members)
                }
            };
            made.push(node);
        }
        made.pop()
    }

    /// Adds what is left of a network whose members have come to this, in the
    /// order of their places; whether it works, where that is certain.
    ///
    /// # Errors
    /// `Err` is no failure here: it says what is certain.
    pub fn network_left(
        &mut self,
        shape: &Network,
        members: &[Result<NodeId, bool>],
    ) -> Result<NodeId, bool> {
        let mut network = shape.clone();
        for (at, member) in members.iter().enumerate() {
            if *member == Err(false) {
                network = network.given(at as u32, false);
            }
        }
        for stop in &mut network.stops {
            *stop = stop.and_then(|at| members.get(at as usize).and_then(|m| m.ok()).map(|node| node.0));
        }
        match self.network(&network) {
            Some(node) if self.node(node) == Node::Works => Err(true),
            Some(node) => Ok(node),
            None => Err(false),
        }
    }

    /// Adds a network that no reduction makes smaller; the numbers at its stops
    /// are places in `members`.
    pub fn shaped(&mut self, shape: Arc<Network>, members: &[NodeId]) -> NodeId {
        let start = self.pool.len() as u32;
        self.pool.extend_from_slice(members);
        self.shapes.push(shape);
        let shape = self.shapes.len() as u32 - 1;
        self.push(Node::Network { shape, members: (start, self.pool.len() as u32) })
    }

    /// The network of a [`Node::Network`].
    pub fn shape(&self, shape: u32) -> &Arc<Network> {
        &self.shapes[shape as usize]
    }

    fn push(&mut self, node: Node) -> NodeId {
        self.nodes.push(node);
        NodeId(self.nodes.len() as u32 - 1)
    }

    /// What a node is.
    pub fn node(&self, id: NodeId) -> Node {
        self.nodes[id.0 as usize]
    }

    /// The members of a node; empty for a leaf.
    pub fn members(&self, id: NodeId) -> &[NodeId] {
        match self.node(id) {
            Node::AtLeast { members: (a, b), .. } | Node::Network { members: (a, b), .. } => {
                &self.pool[a as usize..b as usize]
            }
            _ => &[],
        }
    }

    /// How many nodes there are.
    pub fn len(&self) -> usize {
        self.nodes.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.nodes.is_empty()
    }
}
