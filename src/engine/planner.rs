//! Makes a [`Plan`]; see there for the idea and the sources.

use super::diagram::{Builder, Diagram, TooLarge};
use super::modules::{Graph, Kind, NONE};
use super::plan::{Block, BlockId, Group, Options, Plan, Shell, Span, Stands};
use crate::system::network::Network;
use crate::system::{Node, NodeId, Structure};
use std::cmp::Reverse;
use std::sync::{Arc, OnceLock};

/// Groups larger than this are not tried by cases: nobody would follow them.
const CASE_NODES: usize = 2000;
/// Nor those with more shared things than this, however the cases fall.
const CASE_SHARED: usize = 40;

/// Networks of more things than this are not tried by cases either.
const CASE_NETWORK: usize = 24;
/// The most nodes of a diagram that a network's value and steps are drawn
/// from; larger ones go to the frontier method without keeping its states.
const NETWORK_NODES: usize = 400;

/// Why a group was not planned.
enum Stop {
    TooLarge(TooLarge),
    TooManyCases,
}

impl From<TooLarge> for Stop {
    fn from(error: TooLarge) -> Stop {
        Stop::TooLarge(error)
    }
}

/// A group on its own: its leaves are numbered by its frontier.
struct Local {
    structure: Structure,
    /// The node of the whole system that each local node came from.
    origin: Vec<NodeId>,
    root: NodeId,
    members: Vec<NodeId>,
    frontier: Vec<BlockId>,
}

/// Where a structure stands that is being planned.
struct Place<'a> {
    graph: &'a Graph,
    modules: Vec<bool>,
    block_of: Vec<u32>,
    /// For a case: the nodes of the whole system that the graph's came from.
    origin: Option<&'a [NodeId]>,
}

impl Place<'_> {
    fn node(&self, at: u32) -> NodeId {
        let local = self.graph.origin(at);
        match self.origin {
            Some(origin) => origin[local.0 as usize],
            None => local,
        }
    }

    fn stands(&self, at: u32) -> Stands {
        match self.origin {
            Some(_) => Stands::Given(self.node(at)),
            None => Stands::Node(self.node(at)),
        }
    }
}

pub(super) fn plan(structure: &Structure, root: NodeId, options: Options) -> Result<Plan, TooLarge> {
    let mut plan = empty(structure);
    if !plan_tree(structure, root, &mut plan) {
        plan_shared(structure, root, options, &mut plan)?;
    }
    Ok(plan)
}

fn empty(structure: &Structure) -> Plan {
    Plan {
        shells: Vec::new(),
        pool: Vec::new(),
        groups: Vec::new(),
        root: BlockId(0),
        by_node: vec![NONE; structure.len()],
        by_leaf: Vec::new(),
    }
}

/// Plans any system.
fn plan_shared(
    structure: &Structure,
    root: NodeId,
    options: Options,
    plan: &mut Plan,
) -> Result<(), TooLarge> {
    let graph = Graph::new(structure, root);
    let mut planner = Planner { plan, options };
    let block_of = match planner.structure(&graph, root, None, &mut 0) {
        Ok(block_of) => block_of,
        Err(Stop::TooLarge(error)) => return Err(error),
        // Only a case can have too many cases, and its group then catches it.
        Err(Stop::TooManyCases) => return Err(TooLarge { limit: options.nodes }),
    };
    for id in 0..structure.len() as u32 {
        if let Some(at) = graph.place(NodeId(id)) {
            plan.by_node[id as usize] = block_of[at as usize];
        }
    }
    plan.root = BlockId(plan.by_node[root.0 as usize]);
    Ok(())
}

/// Plans a system in which nothing stands in two places, which most are: every
/// node is a block on its own, and nothing has to be looked for. Whether it was
/// such a system; if not, the plan is as it was.
///
/// The root must be the last node, and all others must lie under it in the
/// order of a walk: so systems are cut out.
fn plan_tree(structure: &Structure, root: NodeId, plan: &mut Plan) -> bool {
    let len = structure.len();
    if root.0 as usize + 1 != len {
        return false;
    }
    plan.shells.reserve(len);
    plan.pool.reserve(len);
    // In the order of a walk, the members of a node are the topmost that have
    // no owner yet. `by_node` serves as the stack of these.
    let waiting = &mut plan.by_node;
    let mut top = 0;
    for id in (0..len as u32).map(NodeId) {
        let block = match structure.node(id) {
            Node::Works => Block::Works,
            Node::Leaf(leaf) => {
                let by_leaf = &mut plan.by_leaf;
                by_leaf.resize(by_leaf.len().max(leaf as usize + 1), NONE);
                if by_leaf[leaf as usize] != NONE {
                    break;
                }
                by_leaf[leaf as usize] = id.0;
                Block::Leaf(leaf)
            }
            Node::AtLeast { need, .. } => {
                let members = structure.members(id);
                let tidy = top >= members.len()
                    && waiting[top - members.len()..top].iter().zip(members).all(|(w, m)| *w == m.0);
                if !tidy {
                    break;
                }
                top -= members.len();
                let start = plan.pool.len() as u32;
                plan.pool.extend(members.iter().map(|m| BlockId(m.0)));
                Block::Independent { need, members: Span { start, end: plan.pool.len() as u32 } }
            }
            Node::Network { .. } => break,
        };
        plan.shells.push(Shell { block, stands: Stands::Node(id), group: NONE });
        waiting[top] = id.0;
        top += 1;
    }
    if plan.shells.len() == len && top == 1 {
        plan.by_node.iter_mut().zip(0..).for_each(|(at, id)| *at = id);
        plan.root = BlockId(root.0);
        return true;
    }
    plan.shells.clear();
    plan.pool.clear();
    plan.by_leaf.clear();
    plan.by_node.fill(NONE);
    false
}

struct Planner<'a> {
    plan: &'a mut Plan,
    options: Options,
}

impl Planner<'_> {
    /// Plans a whole structure, or what a case has left of a group, given by
    /// its frontier and origins; gives the block of each module.
    ///
    /// It calls itself through [`Planner::condition`] only, which the number
    /// of cases bounds.
    fn structure(
        &mut self,
        graph: &Graph,
        root: NodeId,
        case: Option<(&[BlockId], &[NodeId])>,
        splits: &mut usize,
    ) -> Result<Vec<u32>, Stop> {
        let top = graph.place(root).unwrap_or(0);
        let mut place = Place {
            graph,
            modules: graph.modules(top),
            block_of: vec![NONE; graph.len()],
            origin: case.map(|(_, origin)| origin),
        };
        let mut groups = Grouping::new(graph.len());
        for at in 0..graph.len() as u32 {
            if !place.modules[at as usize] {
                continue;
            }
            let block = match graph.kind(at) {
                Kind::Works => self.push(Block::Works, place.stands(at)),
                Kind::Leaf(leaf) => match case {
                    Some((frontier, _)) => frontier[leaf as usize],
                    None => {
                        let block = self.push(Block::Leaf(leaf), place.stands(at));
                        let by_leaf = &mut self.plan.by_leaf;
                        by_leaf.resize(by_leaf.len().max(leaf as usize + 1), NONE);
                        by_leaf[leaf as usize] = block.0;
                        block
                    }
                },
                Kind::AtLeast { need, .. } => self.node(&place, &mut groups, at, need, splits)?,
                Kind::Network { .. } => {
                    let local = groups.network(&place, at);
                    self.group(local, place.stands(at), splits)?
                }
            };
            place.block_of[at as usize] = block.0;
        }
        Ok(place.block_of)
    }

    fn push(&mut self, block: Block, stands: Stands) -> BlockId {
        self.plan.shells.push(Shell { block, stands, group: NONE });
        BlockId(self.plan.shells.len() as u32 - 1)
    }

    fn independent(&mut self, need: u32, members: &[BlockId], stands: Stands) -> BlockId {
        let start = self.plan.pool.len() as u32;
        self.plan.pool.extend_from_slice(members);
        let end = self.plan.pool.len() as u32;
        self.push(Block::Independent { need, members: Span { start, end } }, stands)
    }

    /// Plans an "at least" node that is a module.
    fn node(
        &mut self,
        place: &Place<'_>,
        groups: &mut Grouping,
        at: u32,
        need: u32,
        splits: &mut usize,
    ) -> Result<BlockId, Stop> {
        let members = place.graph.members(at);
        let stands = place.stands(at);
        let series = need as usize == members.len();
        let Some(split) = groups.split(place, members) else {
            let blocks: Vec<BlockId> = members.iter().map(|&m| BlockId(place.block_of[m as usize])).collect();
            return Ok(self.independent(need, &blocks, stands));
        };
        if split.len() == 1 || !(series || need == 1) {
            let local = groups.local(place, need, members, at);
            return self.group(local, stands, splits);
        }
        let mut blocks = Vec::with_capacity(split.len());
        for part in split {
            blocks.push(match part[..] {
                [only] => BlockId(place.block_of[only as usize]),
                _ => {
                    let need = if series { part.len() as u32 } else { 1 };
                    let local = groups.local(place, need, &part, at);
                    let stands = match stands {
                        Stands::Node(node) => Stands::Part(node),
                        other => other,
                    };
                    self.group(local, stands, splits)?
                }
            });
        }
        let need = if series { blocks.len() as u32 } else { 1 };
        Ok(self.independent(need, &blocks, stands))
    }

    /// Plans parts that share things: by cases if few do, else by a diagram.
    /// Within a case it is by cases or not at all.
    fn group(&mut self, local: Local, stands: Stands, splits: &mut usize) -> Result<BlockId, Stop> {
        let uses = uses(&local.structure, local.root, local.frontier.len());
        if let Stands::Given(_) = stands {
            return self.condition(&local, &uses, stands, splits);
        }
        let nodes = self.options.nodes;
        let network = only_network(&local, &uses);
        let made = OnceLock::new();
        if network.is_none() {
            let _ = made.set(Ok(diagram(&local, nodes)?));
        }
        let shared = uses.iter().filter(|&&u| u > 1).count();
        let mut block = None;
        let few = network.is_none() || local.frontier.len() <= CASE_NETWORK;
        if few && local.structure.len() <= CASE_NODES && shared <= CASE_SHARED && self.options.cases > 1 {
            let mark = (self.plan.shells.len(), self.plan.pool.len());
            let mut splits = self.options.cases - 1;
            match self.condition(&local, &uses, stands, &mut splits) {
                Ok(made) => block = Some(made),
                Err(Stop::TooManyCases) => {
                    self.plan.shells.truncate(mark.0);
                    self.plan.pool.truncate(mark.1);
                }
                Err(error) => return Err(error),
            }
        }
        let block = block.unwrap_or_else(|| {
            let small = network.as_ref().map(|network| network_diagram(network, NETWORK_NODES.min(nodes)));
            let block = match small {
                Some(Err(_)) => Block::Network,
                Some(small) => {
                    let _ = made.set(small);
                    Block::Diagram
                }
                None => Block::Diagram,
            };
            self.push(block, stands)
        });
        self.plan.shells[block.0 as usize].group = self.plan.groups.len() as u32;
        let Local { members, frontier, .. } = local;
        self.plan.groups.push(Group { members, frontier, uses, network, diagram: made, nodes });
        Ok(block)
    }

    /// Splits a group over the thing that it uses most, the first of equals.
    /// Where nothing is used twice it is the thing in a network that leaves
    /// the least of it.
    fn condition(
        &mut self,
        local: &Local,
        uses: &[u32],
        stands: Stands,
        splits: &mut usize,
    ) -> Result<BlockId, Stop> {
        *splits = splits.checked_sub(1).ok_or(Stop::TooManyCases)?;
        let most = uses.iter().copied().max().unwrap_or(0);
        let pivot = match most {
            0 | 1 => {
                (0..local.frontier.len() as u32).min_by_key(|&pivot| left_over(local, pivot)).unwrap_or(0)
            }
            _ => uses.iter().position(|&u| u == most).unwrap_or(0) as u32,
        };
        let works = self.case(local, pivot, true, splits)?;
        let failed = self.case(local, pivot, false, splits)?;
        let on = local.frontier[pivot as usize];
        Ok(self.push(Block::Conditioned { on, works, failed }, stands))
    }

    fn case(&mut self, local: &Local, pivot: u32, works: bool, splits: &mut usize) -> Result<BlockId, Stop> {
        let whole = Stands::Given(local.origin[local.root.0 as usize]);
        match reduce(local, pivot, works) {
            Left::Works => Ok(self.push(Block::Works, whole)),
            Left::Fails => Ok(self.push(Block::Fails, whole)),
            Left::Node { structure, origin, root } => {
                let graph = Graph::new(&structure, root);
                let case = Some((&local.frontier[..], &origin[..]));
                let block_of = self.structure(&graph, root, case, splits)?;
                let at = graph.place(root).unwrap_or(0);
                Ok(BlockId(block_of[at as usize]))
            }
        }
    }
}

/// What a case leaves of a group.
enum Left {
    Works,
    Fails,
    Node { structure: Structure, origin: Vec<NodeId>, root: NodeId },
}

/// A group with one of its things known to work or to have failed.
fn reduce(local: &Local, pivot: u32, works: bool) -> Left {
    #[derive(Clone, Copy)]
    enum Now {
        Works,
        Fails,
        Is(NodeId),
    }
    let old = &local.structure;
    let mut structure = Structure::default();
    let mut origin = Vec::with_capacity(old.len());
    let mut now: Vec<Now> = Vec::with_capacity(old.len());
    let mut left = Vec::new();
    for id in (0..old.len() as u32).map(NodeId) {
        let value = match old.node(id) {
            Node::Works => Now::Works,
            Node::Leaf(leaf) if leaf == pivot => {
                if works {
                    Now::Works
                } else {
                    Now::Fails
                }
            }
            Node::Leaf(leaf) => Now::Is(structure.leaf(leaf)),
            Node::AtLeast { need, .. } => {
                let mut need = need as usize;
                left.clear();
                for member in old.members(id) {
                    match now[member.0 as usize] {
                        Now::Works => need = need.saturating_sub(1),
                        Now::Fails => {}
                        Now::Is(node) => left.push(node),
                    }
                }
                if need == 0 {
                    Now::Works
                } else if need > left.len() {
                    Now::Fails
                } else {
                    Now::Is(structure.at_least(need as u32, &left))
                }
            }
            Node::Network { shape, .. } => {
                let members: Vec<Result<NodeId, bool>> = old
                    .members(id)
                    .iter()
                    .map(|m| match now[m.0 as usize] {
                        Now::Works => Err(true),
                        Now::Fails => Err(false),
                        Now::Is(node) => Ok(node),
                    })
                    .collect();
                match structure.network_left(old.shape(shape), &members) {
                    Ok(node) => Now::Is(node),
                    Err(true) => Now::Works,
                    Err(false) => Now::Fails,
                }
            }
        };
        // A node of one member is that member and adds none; a network may add many.
        origin.resize(structure.len(), local.origin[id.0 as usize]);
        now.push(value);
    }
    match now[local.root.0 as usize] {
        Now::Works => Left::Works,
        Now::Fails => Left::Fails,
        Now::Is(root) => Left::Node { structure, origin, root },
    }
}

/// How many times each of the frontier is used as a member in a group.
fn uses(structure: &Structure, root: NodeId, frontier: usize) -> Vec<u32> {
    let mut uses = vec![0; frontier];
    let mut live = vec![false; structure.len()];
    live[root.0 as usize] = true;
    for id in (0..=root.0).rev().map(NodeId) {
        if live[id.0 as usize] {
            let stands = |at: usize| match structure.node(id) {
                Node::Network { shape, .. } => {
                    structure.shape(shape).stops.iter().filter(|s| **s == Some(at as u32)).count() as u32
                }
                _ => 1,
            };
            for (at, &member) in structure.members(id).iter().enumerate() {
                live[member.0 as usize] = true;
                if let Node::Leaf(leaf) = structure.node(member) {
                    uses[leaf as usize] += stands(at);
                }
            }
        }
    }
    uses
}

fn diagram(local: &Local, limit: usize) -> Result<Diagram, TooLarge> {
    let mut builder = Builder::new(limit);
    let mut made: Vec<u32> = Vec::with_capacity(local.structure.len());
    let mut members = Vec::new();
    for id in (0..local.structure.len() as u32).map(NodeId) {
        made.push(match local.structure.node(id) {
            Node::Works => super::diagram::WORKS,
            Node::Leaf(leaf) => builder.variable(leaf)?,
            Node::AtLeast { need, .. } => {
                members.clear();
                members.extend(local.structure.members(id).iter().map(|m| made[m.0 as usize]));
                builder.at_least(need as usize, &members)?
            }
            Node::Network { shape, .. } => {
                let members = local.structure.members(id);
                let of = |at: u32| made[members[at as usize].0 as usize];
                local.structure.shape(shape).diagram(&mut builder, of, limit)?
            }
        });
    }
    Ok(builder.finish(made[local.root.0 as usize]))
}

/// The diagram of a network whose things are the variables.
pub(super) fn network_diagram(network: &Network, limit: usize) -> Result<Diagram, TooLarge> {
    let mut builder = Builder::new(limit);
    let things = network.stops.iter().flatten().max().map_or(0, |&most| most + 1);
    let variables = (0..things).map(|v| builder.variable(v)).collect::<Result<Vec<u32>, TooLarge>>()?;
    let root = network.diagram(&mut builder, |thing| variables[thing as usize], limit)?;
    Ok(builder.finish(root))
}

/// The network that a group is, over its frontier, if it is one and nothing
/// stands in it twice.
fn only_network(local: &Local, uses: &[u32]) -> Option<Arc<Network>> {
    let Node::Network { shape, .. } = local.structure.node(local.root) else { return None };
    if uses.iter().any(|&u| u > 1) {
        return None;
    }
    let members = local.structure.members(local.root);
    let mut network = (**local.structure.shape(shape)).clone();
    for stop in network.stops.iter_mut().flatten() {
        let Node::Leaf(leaf) = local.structure.node(members[*stop as usize]) else { return None };
        *stop = leaf;
    }
    Some(Arc::new(network))
}

/// How many stops of networks both cases of a thing leave; of equals the one
/// with the most links comes first: a cross link, as it is done by hand.
fn left_over(local: &Local, pivot: u32) -> (usize, Reverse<usize>) {
    let mut links = 0;
    for id in (0..local.structure.len() as u32).map(NodeId) {
        let Node::Network { shape, .. } = local.structure.node(id) else { continue };
        let (network, members) = (local.structure.shape(shape), local.structure.members(id));
        let here = |stop: u32| {
            network.stops[stop as usize]
                .is_some_and(|at| local.structure.node(members[at as usize]) == Node::Leaf(pivot))
        };
        links += network.links.iter().filter(|(a, b)| here(*a) || here(*b)).count();
    }
    let stops = |works| match reduce(local, pivot, works) {
        Left::Node { structure, .. } => (0..structure.len() as u32)
            .map(|id| match structure.node(NodeId(id)) {
                Node::Network { shape, .. } => structure.shape(shape).stops.len(),
                _ => 0,
            })
            .sum(),
        Left::Works | Left::Fails => 0,
    };
    (stops(true) + stops(false), Reverse(links))
}

/// Splits the members of nodes by what they share. The nodes between a module
/// and the modules next below it belong to no other module, so the marks of
/// all nodes fit in one table and the whole takes linear time.
struct Grouping {
    owner: Vec<u32>,
    local: Vec<u32>,
    stack: Vec<u32>,
}

impl Grouping {
    fn new(nodes: usize) -> Grouping {
        Grouping { owner: vec![NONE; nodes], local: vec![NONE; nodes], stack: Vec::new() }
    }

    /// The members in parts that share nothing with each other, in the order
    /// of their first members; nothing if no two members share anything.
    fn split(&mut self, place: &Place<'_>, members: &[u32]) -> Option<Vec<Vec<u32>>> {
        let mut parent: Vec<u32> = (0..members.len() as u32).collect();
        fn find(parent: &mut [u32], mut at: u32) -> u32 {
            while parent[at as usize] != at {
                parent[at as usize] = parent[parent[at as usize] as usize];
                at = parent[at as usize];
            }
            at
        }
        // A member twice in a k of n is shared with itself.
        let mut joined = false;
        for (i, &member) in members.iter().enumerate() {
            let mine = i as u32;
            self.stack.push(member);
            while let Some(at) = self.stack.pop() {
                let owner = &mut self.owner[at as usize];
                if *owner == NONE {
                    *owner = mine;
                    if !place.modules[at as usize] {
                        self.stack.extend_from_slice(place.graph.members(at));
                    }
                } else if *owner != mine {
                    joined = true;
                    let (a, b) = (find(&mut parent, *owner), find(&mut parent, mine));
                    parent[a.max(b) as usize] = a.min(b);
                }
            }
        }
        if !joined {
            return None;
        }
        let mut part_of = vec![NONE; members.len()];
        let mut parts: Vec<Vec<u32>> = Vec::new();
        for (i, &member) in members.iter().enumerate() {
            let top = find(&mut parent, i as u32) as usize;
            if part_of[top] == NONE {
                part_of[top] = parts.len() as u32;
                parts.push(Vec::new());
            }
            parts[part_of[top] as usize].push(member);
        }
        Some(parts)
    }

    /// "At least `need` of `members`" down to the next modules, on its own.
    ///
    /// A node's own leaves are taken before its other members: in a deep nest
    /// the diagram then grows from the inside out, each level in one step.
    fn local(&mut self, place: &Place<'_>, need: u32, members: &[u32], at: u32) -> Local {
        let mut local = self.members(place, members, at);
        let tops: Vec<NodeId> = members.iter().map(|&m| NodeId(self.local[m as usize])).collect();
        local.root = local.structure.at_least(need, &tops);
        local.origin.resize(local.structure.len(), place.node(at));
        local
    }

    /// A network down to the next modules, on its own. Its members are taken in
    /// the order of the frontier method.
    fn network(&mut self, place: &Place<'_>, at: u32) -> Local {
        let members = place.graph.members(at);
        let mut local = self.members(place, &swept(place.graph, at), at);
        let tops: Vec<NodeId> = members.iter().map(|&m| NodeId(self.local[m as usize])).collect();
        if let Kind::Network { shape, .. } = place.graph.kind(at) {
            local.root = local.structure.shaped(place.graph.shape(shape).clone(), &tops);
        }
        local.origin.resize(local.structure.len(), place.node(at));
        local
    }

    /// All that lies under some members, down to the next modules.
    fn members(&mut self, place: &Place<'_>, members: &[u32], at: u32) -> Local {
        let mut structure = Structure::default();
        let mut origin = Vec::new();
        let mut frontier = Vec::new();
        let ordered = |members: &[u32]| -> Vec<u32> {
            let (leaves, others): (Vec<u32>, Vec<u32>) =
                members.iter().partition(|&&m| place.modules[m as usize]);
            [leaves, others].concat()
        };
        // A visit is entered once to send its members ahead, then left.
        let first = match place.graph.kind(at) {
            Kind::Network { .. } => members.to_vec(),
            _ => ordered(members),
        };
        let mut stack: Vec<(u32, bool)> = first.into_iter().rev().map(|m| (m, false)).collect();
        let mut inner = Vec::new();
        while let Some((node, ready)) = stack.pop() {
            if self.local[node as usize] != NONE {
                continue;
            }
            if place.modules[node as usize] {
                self.local[node as usize] = structure.leaf(frontier.len() as u32).0;
                frontier.push(BlockId(place.block_of[node as usize]));
            } else if !ready {
                stack.push((node, true));
                let below = match place.graph.kind(node) {
                    Kind::Network { .. } => swept(place.graph, node),
                    _ => ordered(place.graph.members(node)),
                };
                stack.extend(below.into_iter().rev().map(|m| (m, false)));
                continue;
            } else if let Kind::Network { shape, .. } = place.graph.kind(node) {
                inner.clear();
                let members = place.graph.members(node);
                inner.extend(members.iter().map(|&m| NodeId(self.local[m as usize])));
                self.local[node as usize] = structure.shaped(place.graph.shape(shape).clone(), &inner).0;
            } else if let Kind::AtLeast { need, .. } = place.graph.kind(node) {
                inner.clear();
                let members = place.graph.members(node);
                inner.extend(members.iter().map(|&m| NodeId(self.local[m as usize])));
                self.local[node as usize] = structure.at_least(need, &inner).0;
            }
            origin.resize(structure.len(), place.node(node));
        }
        let members = members.iter().map(|&m| place.node(m)).collect();
        Local { structure, origin, root: NodeId(0), members, frontier }
    }
}

/// The members of a network in the order of the frontier method, with those
/// last that it need not decide.
fn swept(graph: &Graph, at: u32) -> Vec<u32> {
    let members = graph.members(at);
    let Kind::Network { shape, .. } = graph.kind(at) else { return members.to_vec() };
    let mut left = vec![true; members.len()];
    let mut order: Vec<u32> = Vec::with_capacity(members.len());
    for place in graph.shape(shape).order() {
        if std::mem::replace(&mut left[place as usize], false) {
            order.push(members[place as usize]);
        }
    }
    order.extend(members.iter().zip(&left).filter(|(_, left)| **left).map(|(&m, _)| m));
    order
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::trial::Dice;

    /// The same plan, looked for in the long way.
    fn searched(structure: &Structure, root: NodeId) -> Plan {
        let mut plan = empty(structure);
        assert!(plan_shared(structure, root, Options::default(), &mut plan).is_ok());
        plan
    }

    #[test]
    fn a_tree_is_planned_as_the_search_would() {
        let (mut trees, mut others) = (0, 0);
        for seed in 0..2000 {
            let mut dice = Dice::new(seed);
            let n = 1 + dice.below(6);
            let (structure, root) = dice.system(n);
            let mut quick = empty(&structure);
            if plan_tree(&structure, root, &mut quick) {
                trees += 1;
                assert_eq!(format!("{quick:?}"), format!("{:?}", searched(&structure, root)));
            } else {
                others += 1;
                assert_eq!(format!("{quick:?}"), format!("{:?}", empty(&structure)));
            }
        }
        assert!(trees > 20 && others > 100, "{trees} {others}");
    }
}
