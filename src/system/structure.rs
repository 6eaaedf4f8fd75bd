//! How things depend on each other, as a graph of "at least k of" nodes.
//!
//! Series is "all of", parallel is "at least one of"; nothing else is needed
//! for what has no memory. The graph is directed and acyclic: a node, or a
//! leaf, that several nodes have as a member is one and the same thing in all.

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
}

/// Nodes and their members.
#[derive(Clone, Debug, Default)]
pub struct Structure {
    nodes: Vec<Node>,
    pool: Vec<NodeId>,
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
            Node::AtLeast { members: (a, b), .. } => &self.pool[a as usize..b as usize],
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
