//! Cutting a system out of everything that has been built.

use super::{Leaf, NONE};
use crate::language::ExprId;
use crate::system::model::{Fault, Model, Out};
use crate::system::structure::{Node, NodeId, Structure};

/// A system cut out for the engine: the part of the structure under one root.
#[derive(Clone, Debug)]
pub struct System {
    /// Nodes under the root, leaves numbered from 0.
    pub structure: Structure,
    /// The root.
    pub root: NodeId,
    /// The things, by leaf number.
    pub leaves: Vec<Leaf>,
    /// The label of each node, or [`NONE`]; few are ever written.
    pub(super) labels: Vec<u32>,
    /// Where each node was written.
    pub places: Vec<Option<ExprId>>,
    /// Nodes that stand in several places.
    pub repeated: Vec<NodeId>,
    /// What is taken for granted, and of which nodes it changes something.
    given: Option<(String, Vec<bool>)>,
}

impl System {
    /// What is taken for granted of a part of this node, in words.
    pub fn given(&self, node: NodeId) -> Option<&str> {
        let (words, touched) = self.given.as_ref()?;
        touched.get(node.0 as usize).copied().unwrap_or(false).then_some(words)
    }

    /// What is left of the system where a node is known to work or to have
    /// failed, said in `words`; whether it works, where that is then certain.
    ///
    /// # Errors
    /// `Ok` of no system, but what is certain.
    pub fn knowing(&self, pinned: NodeId, works: bool, words: String) -> Result<System, bool> {
        let old = &self.structure;
        let mut left = System {
            structure: Structure::default(),
            root: NodeId(0),
            leaves: self.leaves.clone(),
            labels: Vec::new(),
            places: Vec::new(),
            repeated: Vec::new(),
            given: None,
        };
        let mut touched: Vec<bool> = Vec::new();
        // Whether each old node works for certain, or its new node and whether it has changed.
        let mut now: Vec<Result<(NodeId, bool), bool>> = Vec::with_capacity(old.len());
        let mut members = Vec::new();
        for id in (0..old.len() as u32).map(NodeId) {
            let value = match old.node(id) {
                _ if id == pinned => Err(works),
                Node::Works => Err(true),
                Node::Leaf(leaf) => Ok((left.structure.leaf(leaf), false)),
                Node::AtLeast { need, .. } => {
                    let mut need = need as usize;
                    let mut changed = false;
                    members.clear();
                    for member in old.members(id) {
                        match now[member.0 as usize] {
                            Ok((node, has_changed)) => {
                                members.push(node);
                                changed |= has_changed;
                            }
                            Err(works) => {
                                need = need.saturating_sub(usize::from(works));
                                changed = true;
                            }
                        }
                    }
                    if need == 0 {
                        Err(true)
                    } else if need > members.len() {
                        Err(false)
                    } else {
                        Ok((left.structure.at_least(need as u32, &members), changed))
                    }
                }
                Node::Network { shape, .. } => {
                    let of = |m: &NodeId| now[m.0 as usize];
                    let changed = old.members(id).iter().map(of).any(|m| m.is_ok_and(|m| m.1) || m.is_err());
                    let known: Vec<_> = old.members(id).iter().map(|m| of(m).map(|m| m.0)).collect();
                    left.structure.network_left(old.shape(shape), &known).map(|node| (node, changed))
                }
            };
            // A node of one member is that member and adds none; a network may add many.
            let changed = value.is_ok_and(|(_, changed)| changed);
            while left.structure.len() > touched.len() {
                touched.push(changed);
                left.labels.push(self.labels.get(id.0 as usize).copied().unwrap_or(NONE));
                left.places.push(self.places.get(id.0 as usize).copied().flatten());
            }
            now.push(value);
        }
        left.root = now[self.root.0 as usize]?.0;
        left.given = Some((words, touched));
        Ok(left)
    }
}

/// Tables that each system takes over from the one before.
#[derive(Clone, Debug, Default)]
pub(super) struct Room {
    order: Vec<NodeId>,
    stack: Vec<(NodeId, usize)>,
    places: Vec<u32>,
    members: Vec<NodeId>,
}

impl Model<'_> {
    /// Cuts out the part of the structure under an asked thing.
    ///
    /// # Errors
    /// The fault that it was built with.
    pub fn system(&mut self, asked: u32) -> Out<System> {
        let built = &mut self.built;
        let root = built.instances[asked as usize].out.unwrap_or(Err(Fault(0)))?;
        // A table that all systems use in turn: hash tables for each took a
        // fifth of the time that a small system needs in all.
        built.cut.resize(built.structure.len(), NONE);
        // Depth first in the order written, so that the numbers do not depend on
        // what else was asked before.
        const OPEN: u32 = NONE - 1;
        let room = &mut built.room;
        room.order.clear();
        let (order, stack) = (&mut room.order, &mut room.stack);
        stack.push((root, 0));
        built.cut[root.0 as usize] = OPEN;
        while let Some((node, next)) = stack.last_mut() {
            if let Some(&member) = built.structure.members(*node).get(*next) {
                *next += 1;
                let cut = &mut built.cut[member.0 as usize];
                if *cut == NONE {
                    *cut = OPEN;
                    stack.push((member, 0));
                }
            } else {
                built.cut[node.0 as usize] = order.len() as u32;
                order.push(*node);
                stack.pop();
            }
        }
        let mut system = System {
            structure: Structure::default(),
            root: NodeId(built.cut[root.0 as usize]),
            leaves: Vec::new(),
            labels: Vec::with_capacity(order.len()),
            places: Vec::with_capacity(order.len()),
            repeated: Vec::new(),
            given: None,
        };
        system.structure.reserve(order.len());
        let (places, members) = (&mut room.places, &mut room.members);
        places.clear();
        places.resize(order.len(), 0_u32);
        for old in order.iter() {
            match built.structure.node(*old) {
                Node::Works => system.structure.works(),
                Node::Leaf(leaf) => {
                    system.leaves.push(built.leaves[leaf as usize]);
                    system.structure.leaf(system.leaves.len() as u32 - 1)
                }
                Node::AtLeast { need, .. } => {
                    members.clear();
                    let olds = built.structure.members(*old).iter();
                    members.extend(olds.map(|m| NodeId(built.cut[m.0 as usize])));
                    for member in members.iter() {
                        places[member.0 as usize] += 1;
                    }
                    system.structure.at_least(need, members)
                }
                Node::Network { shape, .. } => {
                    members.clear();
                    let olds = built.structure.members(*old).iter();
                    members.extend(olds.map(|m| NodeId(built.cut[m.0 as usize])));
                    for member in members.iter() {
                        places[member.0 as usize] += 1;
                    }
                    system.structure.shaped(built.structure.shape(shape).clone(), members)
                }
            };
            system.places.push(built.origin.get(old.0 as usize).copied());
            system.labels.push(built.names.get(old).copied().unwrap_or(NONE));
        }
        for old in order.iter() {
            built.cut[old.0 as usize] = NONE;
        }
        system.repeated = (0..places.len()).filter(|i| places[*i] > 1).map(|i| NodeId(i as u32)).collect();
        Ok(system)
    }
}
