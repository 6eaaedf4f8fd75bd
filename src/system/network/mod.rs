//! Networks: stops joined by links, and what reductions leave of them.
//!
//! It works when enough of its ends are reached from its start. What lies on
//! no way goes, things in series and in parallel become one, and a stop that
//! every way passes splits a network in two; what is left is the engine's.
//!
//! Source: C. J. Colbourn, "The Combinatorics of Network Reliability" (1987),
//! from memory. That stops can fail and links can lead one way is worked out
//! here and checked against enumeration.

mod dominate;
mod reduce;
mod split;
mod terms;

pub use dominate::Dominators;
pub use terms::{Reduced, Term};

/// Stands for "not there" in tables of numbers.
const NONE: u32 = u32::MAX;

/// Stops joined by links that cannot fail, each stop perhaps with a thing that
/// can.
///
/// It works when at least `need` of its ends are reached: a way of links
/// leads there from the start, and the things at all stops of it work, with
/// those at the start and at the end.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Network {
    /// The thing at each stop, by a number of the caller's; nothing stands at
    /// a stop that cannot fail.
    pub stops: Vec<Option<u32>>,
    /// Links from the first stop to the second; a two-way link is two.
    pub links: Vec<(u32, u32)>,
    /// Where every way begins.
    pub start: u32,
    /// Where ways end.
    pub ends: Vec<u32>,
    /// How many of the ends must be reached; at least 1.
    pub need: u32,
}

impl Network {
    /// The network under the condition that a thing works or has failed.
    #[must_use]
    pub fn given(&self, thing: u32, works: bool) -> Network {
        let hit: Vec<bool> = self.stops.iter().map(|&t| t == Some(thing)).collect();
        let mut left = self.clone();
        if works {
            for (stop, _) in left.stops.iter_mut().zip(&hit).filter(|(_, hit)| **hit) {
                *stop = None;
            }
            return left;
        }
        let up = |stop: u32| !hit.get(stop as usize).copied().unwrap_or(true);
        left.links.retain(|&(from, to)| up(from) && up(to));
        left.ends.retain(|&end| up(end));
        if !up(left.start) {
            left.ends.clear();
        }
        left
    }

    /// The things that stand at more than one stop, in the order of their
    /// numbers.
    pub fn repeated(&self) -> Vec<u32> {
        let mut things: Vec<u32> = self.stops.iter().filter_map(|&t| t).collect();
        things.sort_unstable();
        let mut twice: Vec<u32> = things.windows(2).filter(|w| w[0] == w[1]).map(|w| w[0]).collect();
        twice.dedup();
        twice
    }

    /// Whether exactly these things working make it work.
    pub fn works(&self, up: impl Fn(u32) -> bool) -> bool {
        let n = self.stops.len();
        let alive = |stop: u32| self.stops.get(stop as usize).is_some_and(|t| t.is_none_or(&up));
        let mut out: Vec<Vec<u32>> = vec![Vec::new(); n];
        for &(from, to) in &self.links {
            if let Some(list) = out.get_mut(from as usize) {
                list.push(to);
            }
        }
        let mut seen = vec![false; n];
        let mut stack = vec![self.start];
        while let Some(at) = stack.pop() {
            if alive(at) && !seen[at as usize] {
                seen[at as usize] = true;
                stack.extend(&out[at as usize]);
            }
        }
        let mut ends: Vec<u32> = self.ends.clone();
        ends.sort_unstable();
        ends.dedup();
        ends.iter().filter(|&&e| seen.get(e as usize) == Some(&true)).count() >= self.need as usize
    }
}
