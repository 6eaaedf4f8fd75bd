//! How a system is computed, before any number is known.
//!
//! A plan is a list of blocks, each resting on earlier ones. Parts that share
//! nothing use the closed forms of series, parallel and k of n. Parts that do
//! share things form a [`Group`]; it is computed by cases (total probability
//! over the shared things, as an engineer writes it down) while few cases do,
//! and by a decision diagram otherwise.
//!
//! Sources: pivotal decomposition after R. E. Barlow, F. Proschan,
//! "Statistical Theory of Reliability and Life Testing" (1975), section 1.2;
//! modules and diagrams as cited in [`super::modules`] and [`super::diagram`].
//!
//! The main blocks form a tree: [`Plan::parts`] of a block share nothing with
//! each other, so that each main block has one place in the system. Blocks of
//! a case restate a group under a condition and rest on the same main blocks;
//! [`Plan::is_case`] tells them apart.

use super::diagram::{Diagram, TooLarge};
use super::modules::NONE;
use super::planner;
use crate::system::network::Network;
use crate::system::{NodeId, Structure};
use std::sync::{Arc, OnceLock};

/// A block of a [`Plan`]. What a block rests on has smaller numbers.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct BlockId(pub u32);

/// A range of a plan's list of members.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Span {
    pub(super) start: u32,
    pub(super) end: u32,
}

/// How a block is computed.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Block {
    /// The thing with this number.
    Leaf(u32),
    /// Always works.
    Works,
    /// Has failed for certain; stands in cases only.
    Fails,
    /// At least `need` of members that share nothing; see [`Plan::members`].
    Independent {
        /// How many must work.
        need: u32,
        /// Its members.
        members: Span,
    },
    /// `works` if the block `on` works, `failed` if it has failed.
    Conditioned {
        /// The shared thing.
        on: BlockId,
        /// What is left if it works.
        works: BlockId,
        /// What is left if it has failed.
        failed: BlockId,
    },
    /// By the decision diagram of its group; see [`Plan::group`].
    Diagram,
    /// By the frontier method over the network of its group.
    Network,
}

/// What a block stands for.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Stands {
    /// The whole of a structure node.
    Node(NodeId),
    /// Those members of a series or parallel node that share things among
    /// themselves; [`Group::members`] says which.
    Part(NodeId),
    /// What is left of a node under the conditions on the way to it.
    Given(NodeId),
}

/// Parts of a system that share things, or that stand in a network.
#[derive(Clone, Debug)]
pub struct Group {
    /// The members of the structure node that the group is made of: all of
    /// them, or those of a series or parallel that share ([`Stands::Part`]).
    pub members: Vec<NodeId>,
    /// The blocks that the group rests on, which share nothing with each
    /// other. Their positions are the variables of the diagram.
    pub frontier: Vec<BlockId>,
    /// How many times each of the frontier is used in the group.
    pub uses: Vec<u32>,
    /// The network that the group is, where nothing stands twice in it; the
    /// numbers at its stops are positions in the frontier.
    pub network: Option<Arc<Network>>,
    pub(super) diagram: OnceLock<Result<Diagram, TooLarge>>,
    pub(super) nodes: usize,
}

impl Group {
    /// The group as a decision diagram; it exists also where the value is
    /// computed in another way, for importance and cut sets. That of a network
    /// is made when it is first asked for.
    ///
    /// # Errors
    /// If it has more nodes than the plan's limit.
    pub fn diagram(&self) -> Result<&Diagram, TooLarge> {
        let made = self.diagram.get_or_init(|| match &self.network {
            Some(network) => super::planner::network_diagram(network, self.nodes),
            None => Err(TooLarge { limit: self.nodes }),
        });
        made.as_ref().map_err(|error| *error)
    }
}

/// How to plan.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Options {
    /// The most cases that one group may be split into; more make a diagram, or
    /// go to the frontier method. With 1 no group is split.
    pub cases: usize,
    /// The most nodes of one diagram.
    pub nodes: usize,
}

impl Default for Options {
    fn default() -> Options {
        Options { cases: 16, nodes: 4_000_000 }
    }
}

#[derive(Clone, Copy, Debug)]
pub(super) struct Shell {
    pub(super) block: Block,
    pub(super) stands: Stands,
    pub(super) group: u32,
}

/// How a system is computed.
#[derive(Clone, Debug)]
pub struct Plan {
    pub(super) shells: Vec<Shell>,
    pub(super) pool: Vec<BlockId>,
    pub(super) groups: Vec<Group>,
    pub(super) root: BlockId,
    pub(super) by_node: Vec<u32>,
    pub(super) by_leaf: Vec<u32>,
}

impl Plan {
    /// The plan for the system at `root`, with the usual limits.
    ///
    /// # Errors
    /// If a group of parts that share things needs too large a diagram.
    pub fn new(structure: &Structure, root: NodeId) -> Result<Plan, TooLarge> {
        Plan::with(structure, root, Options::default())
    }

    /// The plan with limits of one's own.
    ///
    /// # Errors
    /// If a group of parts that share things needs too large a diagram.
    pub fn with(structure: &Structure, root: NodeId, options: Options) -> Result<Plan, TooLarge> {
        planner::plan(structure, root, options)
    }

    /// The block that stands for the whole system.
    pub fn root(&self) -> BlockId {
        self.root
    }

    /// How many blocks there are; their numbers are 0 up to it.
    pub fn len(&self) -> usize {
        self.shells.len()
    }

    /// Whether there are none; there always is a root.
    pub fn is_empty(&self) -> bool {
        self.shells.is_empty()
    }

    /// All blocks, from the leaves up.
    pub fn blocks(&self) -> impl DoubleEndedIterator<Item = BlockId> + use<> {
        (0..self.shells.len() as u32).map(BlockId)
    }

    /// How a block is computed.
    pub fn block(&self, id: BlockId) -> Block {
        self.shells[id.0 as usize].block
    }

    /// The members of an [`Block::Independent`] block; none for others.
    pub fn members(&self, id: BlockId) -> &[BlockId] {
        match self.block(id) {
            Block::Independent { members, .. } => &self.pool[members.start as usize..members.end as usize],
            _ => &[],
        }
    }

    /// What a block stands for.
    pub fn stands(&self, id: BlockId) -> Stands {
        self.shells[id.0 as usize].stands
    }

    /// Whether a block belongs to a case of a group, and not to the main tree.
    pub fn is_case(&self, id: BlockId) -> bool {
        matches!(self.stands(id), Stands::Given(_))
    }

    /// The group that a main block computes, by cases or by its diagram.
    pub fn group(&self, id: BlockId) -> Option<&Group> {
        self.groups.get(self.shells[id.0 as usize].group as usize)
    }

    /// The main blocks that a main block rests on: the members of an
    /// independent block, the frontier of a group.
    pub fn parts(&self, id: BlockId) -> &[BlockId] {
        match self.group(id) {
            Some(group) => &group.frontier,
            None => self.members(id),
        }
    }

    /// The block of a structure node, if the node lies under the root and
    /// shares nothing with the rest of the system.
    pub fn of_node(&self, node: NodeId) -> Option<BlockId> {
        self.by_node.get(node.0 as usize).copied().filter(|&at| at != NONE).map(BlockId)
    }

    /// The block of a thing, if it takes part in the system.
    pub fn of_leaf(&self, leaf: u32) -> Option<BlockId> {
        self.by_leaf.get(leaf as usize).copied().filter(|&at| at != NONE).map(BlockId)
    }

    /// Makes all diagrams, which importance and cut sets rest on.
    ///
    /// # Errors
    /// If one of them is too large.
    pub fn diagrams(&self) -> Result<(), TooLarge> {
        self.groups.iter().try_for_each(|group| group.diagram().map(|_| ()))
    }

    /// The things that are used more than once within some group, by block.
    pub fn shared(&self) -> Vec<BlockId> {
        let mut shared: Vec<BlockId> = (self.groups.iter())
            .flat_map(|g| g.frontier.iter().zip(&g.uses))
            .filter_map(|(&block, &uses)| (uses > 1).then_some(block))
            .collect();
        shared.sort_unstable();
        shared
    }
}
