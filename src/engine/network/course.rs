//! The course of a sweep over a network whose links all lead both ways.
//!
//! A stop of two links becomes a link that can fail. Then the stops are opened
//! one by one; each is joined to the earlier ones that it has links to, and a
//! stop whose last link is done is closed. Slots of closed stops are used
//! again.

use super::super::modules::NONE;
use super::Network;
use super::order;
use crate::system::network::Dominators;
use rustc_hash::{FxHashMap, FxHashSet};

/// What an open stop is to the network.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Role {
    Plain,
    Start,
    End,
}

/// What is done to every state alike.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Op {
    Open(u8, Role),
    Join(u8, u8),
    Close(u8),
}

/// What a layer decides.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Act {
    /// Whether the stop that opens in this slot works.
    Stop(u8, Role),
    /// Whether the link between these slots works.
    Link(u8, u8),
    /// Whether the last link of the stop in this slot works, which leads to a
    /// new stop that takes the slot over.
    Hand(u8),
}

/// A decision and what follows from it.
#[derive(Clone, Debug)]
pub(super) struct Layer {
    pub(super) thing: u32,
    pub(super) act: Act,
    pub(super) after: Vec<Op>,
}

/// All decisions in their order.
#[derive(Clone, Debug, Default)]
pub(super) struct Course {
    pub(super) first: Vec<Op>,
    pub(super) layers: Vec<Layer>,
    /// How many slots are in use at most.
    pub(super) slots: usize,
    /// Whether any stop can fail.
    pub(super) stops_fail: bool,
}

struct Link {
    ends: [u32; 2],
    thing: Option<u32>,
}

impl Course {
    /// The course for a network; nothing if some link leads one way only and
    /// it matters.
    pub(super) fn new(network: &Network) -> Option<Course> {
        let pairs = two_way(network)?;
        let (stays, links) = as_links(network, &pairs);
        let stops: Vec<u32> = (0..network.stops.len() as u32).filter(|&s| stays[s as usize]).collect();
        let mut place = vec![NONE; network.stops.len()];
        for (i, &stop) in stops.iter().enumerate() {
            place[stop as usize] = i as u32;
        }
        let mut near: Vec<Vec<u32>> = vec![Vec::new(); stops.len()];
        for link in &links {
            let [a, b] = link.ends.map(|s| place[s as usize]);
            near[a as usize].push(b);
            near[b as usize].push(a);
        }
        let firsts: Vec<u32> = std::iter::once(network.start)
            .chain(network.ends.iter().copied())
            .map(|s| place[s as usize])
            .collect();
        let order = order::order(&near, &firsts, Vec::new(), 4.0);
        let order: Vec<u32> = order.into_iter().map(|at| stops[at as usize]).collect();
        Some(Maker::new(network, &links).make(&order))
    }
}

/// The pairs of stops that are linked both ways, or so that the way back
/// would not matter.
fn two_way(network: &Network) -> Option<Vec<(u32, u32)>> {
    let n = network.stops.len();
    let sink = n as u32;
    let links: FxHashSet<(u32, u32)> = network.links.iter().copied().filter(|(a, b)| a != b).collect();
    let (mut out, mut into) = (vec![Vec::new(); n + 1], vec![Vec::new(); n + 1]);
    for &(a, b) in
        network.links.iter().chain(network.ends.iter().map(|&e| (e, sink)).collect::<Vec<_>>().iter())
    {
        out[a as usize].push(b);
        into[b as usize].push(a);
    }
    let mut ways: Option<[Dominators; 2]> = None;
    let goal = match network.ends[..] {
        [only] if network.stops[only as usize].is_none() => Some(only),
        _ => None,
    };
    let mut pairs = Vec::new();
    for &(a, b) in network.links.iter().filter(|(a, b)| a != b) {
        if links.contains(&(b, a)) {
            if a < b {
                pairs.push((a, b));
            }
            continue;
        }
        // Would a link from b to a lie on a minimal way?
        let shortcut = a == network.start
            || links.contains(&(network.start, a))
            || goal.is_some_and(|g| b == g || links.contains(&(b, g)));
        let useless = shortcut || {
            let [before, after] = ways.get_or_insert_with(|| {
                [Dominators::new(&out, &into, network.start), Dominators::new(&into, &out, sink)]
            });
            before.dominates(a, b) || after.dominates(b, a)
        };
        if !useless {
            return None;
        }
        pairs.push((a.min(b), a.max(b)));
    }
    pairs.sort_unstable();
    pairs.dedup();
    Some(pairs)
}

/// Turns stops of two links into links; which stops stay.
fn as_links(network: &Network, pairs: &[(u32, u32)]) -> (Vec<bool>, Vec<Link>) {
    let n = network.stops.len();
    let mut near: Vec<Vec<u32>> = vec![Vec::new(); n];
    for &(a, b) in pairs {
        near[a as usize].push(b);
        near[b as usize].push(a);
    }
    let fixed = |s: u32| s == network.start || network.ends.contains(&s);
    let mut stays: Vec<bool> = (0..n as u32).map(|s| fixed(s) || !near[s as usize].is_empty()).collect();
    let mut held = vec![false; n];
    let mut links = Vec::new();
    for stop in 0..n as u32 {
        let [a, b] = near[stop as usize][..] else { continue };
        let free = !held[stop as usize] && stays[a as usize] && stays[b as usize];
        if !fixed(stop) && free && network.stops[stop as usize].is_some() {
            stays[stop as usize] = false;
            // What a link ends at must stay a stop.
            held[a as usize] = true;
            held[b as usize] = true;
            links.push(Link { ends: [a, b], thing: network.stops[stop as usize] });
        }
    }
    let plain = pairs.iter().filter(|(a, b)| stays[*a as usize] && stays[*b as usize]);
    links.extend(plain.map(|&(a, b)| Link { ends: [a, b], thing: None }));
    (stays, links)
}

struct Maker<'a> {
    network: &'a Network,
    links: &'a [Link],
    course: Course,
    slot: FxHashMap<u32, u8>,
    left: Vec<usize>,
    free: Vec<u8>,
}

impl<'a> Maker<'a> {
    fn new(network: &'a Network, links: &'a [Link]) -> Maker<'a> {
        let mut left = vec![0; network.stops.len()];
        for stop in links.iter().flat_map(|l| l.ends) {
            left[stop as usize] += 1;
        }
        let course = Course::default();
        Maker { network, links, course, slot: FxHashMap::default(), left, free: Vec::new() }
    }

    fn make(mut self, order: &[u32]) -> Course {
        let mut position = vec![0u32; self.network.stops.len()];
        for (i, &stop) in order.iter().enumerate() {
            position[stop as usize] = i as u32;
        }
        // The links of each stop to earlier ones.
        let mut back: Vec<Vec<(u32, Option<u32>)>> = vec![Vec::new(); self.network.stops.len()];
        for link in self.links {
            let [a, b] = link.ends;
            let (early, late) = if position[a as usize] < position[b as usize] { (a, b) } else { (b, a) };
            back[late as usize].push((early, link.thing));
        }
        for &stop in order {
            let mut links = std::mem::take(&mut back[stop as usize]);
            links.sort_by_key(|&(u, _)| (self.left[u as usize] != 1, position[u as usize]));
            self.stop(stop, &links);
        }
        self.course
    }

    fn role(&self, stop: u32) -> Role {
        if stop == self.network.start {
            Role::Start
        } else if self.network.ends.contains(&stop) {
            Role::End
        } else {
            Role::Plain
        }
    }

    fn op(&mut self, op: Op) {
        match self.course.layers.last_mut() {
            Some(layer) => layer.after.push(op),
            None => self.course.first.push(op),
        }
    }

    fn act(&mut self, thing: u32, act: Act) {
        self.course.layers.push(Layer { thing, act, after: Vec::new() });
    }

    fn stop(&mut self, stop: u32, links: &[(u32, Option<u32>)]) {
        let role = self.role(stop);
        let thing = self.network.stops[stop as usize];
        let mut rest = links;
        match links {
            [(u, link), after @ ..]
                if thing.is_none()
                    && role == Role::Plain
                    && self.left[*u as usize] == 1
                    && self.network.stops[*u as usize].is_none() =>
            {
                if let Some(slot) = self.slot.remove(u) {
                    if let Some(link) = *link {
                        self.act(link, Act::Hand(slot));
                    }
                    self.slot.insert(stop, slot);
                    self.left[*u as usize] = 0;
                    self.left[stop as usize] -= 1;
                    rest = after;
                }
            }
            _ => {
                let slot = self.take_slot();
                self.slot.insert(stop, slot);
                match thing {
                    Some(thing) => {
                        self.course.stops_fail = true;
                        self.act(thing, Act::Stop(slot, role));
                    }
                    None => self.op(Op::Open(slot, role)),
                }
            }
        }
        for &(u, thing) in rest {
            if let (Some(&a), Some(&b)) = (self.slot.get(&u), self.slot.get(&stop)) {
                match thing {
                    Some(thing) => self.act(thing, Act::Link(a, b)),
                    None => self.op(Op::Join(a, b)),
                }
            }
            self.left[stop as usize] -= 1;
            self.left[u as usize] -= 1;
            if self.left[u as usize] == 0 {
                self.close(u);
            }
        }
        if self.left[stop as usize] == 0 {
            self.close(stop);
        }
    }

    /// The lowest free slot.
    fn take_slot(&mut self) -> u8 {
        if let Some(slot) = self.free.pop() {
            return slot;
        }
        let slot = self.course.slots;
        self.course.slots += 1;
        // More than 255 are refused when a word is chosen for the states.
        slot.min(255) as u8
    }

    fn close(&mut self, stop: u32) {
        if let Some(slot) = self.slot.remove(&stop) {
            self.op(Op::Close(slot));
            self.free.push(slot);
            self.free.sort_unstable_by(|a, b| b.cmp(a));
        }
    }
}
