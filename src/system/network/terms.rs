//! What a reduced network is made of: series, parallel, and networks.

use super::NONE;
use super::Network;
use rustc_hash::FxHashMap;

/// A part of a reduced network.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Term {
    /// Always works.
    Works,
    /// Cannot work: no way leads to enough ends.
    Fails,
    /// The thing with this number.
    Thing(u32),
    /// All of these terms work.
    All(Vec<u32>),
    /// At least one of these terms works.
    Any(Vec<u32>),
    /// A network that no rule reduces; a number at its stops is that of a
    /// term.
    Network(Network),
}

/// A network as series, parallel and networks that no rule reduces.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Reduced {
    /// Members come before what rests on them; the last is the whole.
    pub terms: Vec<Term>,
}

/// Terms in the making.
#[derive(Default)]
pub(super) struct Terms {
    list: Vec<Term>,
    of_thing: FxHashMap<u32, u32>,
}

impl Terms {
    pub(super) fn push(&mut self, term: Term) -> u32 {
        self.list.push(term);
        self.list.len() as u32 - 1
    }

    pub(super) fn thing(&mut self, thing: u32) -> u32 {
        if let Some(&known) = self.of_thing.get(&thing) {
            return known;
        }
        let at = self.push(Term::Thing(thing));
        self.of_thing.insert(thing, at);
        at
    }

    /// Both of two terms, or either of them. A term of several members stands
    /// at one stop only, so that its list can be taken over.
    pub(super) fn join(&mut self, all: bool, a: u32, b: u32) -> u32 {
        if a == b {
            return a;
        }
        let mut members = self.taken(all, a);
        members.extend(self.taken(all, b));
        self.push(if all { Term::All(members) } else { Term::Any(members) })
    }

    fn taken(&mut self, all: bool, at: u32) -> Vec<u32> {
        match (&mut self.list[at as usize], all) {
            (Term::All(list), true) | (Term::Any(list), false) => std::mem::take(list),
            _ => vec![at],
        }
    }

    /// What lies under `root`, members first.
    pub(super) fn under(&self, root: u32) -> Reduced {
        let mut place = vec![NONE; self.list.len()];
        let mut terms = Vec::new();
        let mut stack = vec![(root, false)];
        while let Some((at, ready)) = stack.pop() {
            if place[at as usize] != NONE {
                continue;
            }
            let term = &self.list[at as usize];
            if !ready {
                stack.push((at, true));
                let below: Vec<u32> = match term {
                    Term::All(list) | Term::Any(list) => list.clone(),
                    Term::Network(network) => network.stops.iter().filter_map(|&t| t).collect(),
                    _ => Vec::new(),
                };
                stack.extend(below.into_iter().rev().map(|b| (b, false)));
                continue;
            }
            place[at as usize] = terms.len() as u32;
            let moved = |list: &[u32]| list.iter().map(|&m| place[m as usize]).collect();
            terms.push(match term {
                Term::All(list) => Term::All(moved(list)),
                Term::Any(list) => Term::Any(moved(list)),
                Term::Network(network) => {
                    let mut network = network.clone();
                    for stop in network.stops.iter_mut().flatten() {
                        *stop = place[*stop as usize];
                    }
                    Term::Network(network)
                }
                other => other.clone(),
            });
        }
        Reduced { terms }
    }
}
