//! States of a network some of whose links lead one way: which open stops are
//! reached, and which would reach which.
//!
//! Only what can still matter is kept, so that equal futures are equal states:
//! of an open stop that is not reached, which stops with links to come it
//! leads to, and that only if it has links to come that lead into it.

use super::super::modules::NONE;
use super::Network;
use super::order;
use super::sweep::{Next, State, Step, Sweep, mixed};

/// The relation among up to `N` open stops.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub(super) struct Relation<const N: usize> {
    leads: [u32; N],
    reached: u32,
    alive: u32,
}

impl<const N: usize> State for Relation<N> {
    const NONE: Relation<N> = Relation { leads: [0; N], reached: u32::MAX, alive: 0 };

    #[inline]
    fn mix(&self) -> u64 {
        let own = mixed(u64::from(self.reached) << 32 | u64::from(self.alive));
        self.leads.chunks(2).fold(own, |h, pair| {
            let word = pair.iter().fold(0u64, |w, &b| w << 32 | u64::from(b));
            mixed(h.rotate_left(23) ^ word)
        })
    }
}

/// One stop decided.
#[derive(Clone, Copy, Debug)]
struct Layer {
    thing: Option<u32>,
    slot: u8,
    /// The start leads here.
    from_start: bool,
    /// Open slots with a link to the stop, and those that it has a link to.
    into: u32,
    out: u32,
    /// Slots that close after it.
    close: u32,
    /// Slots, after it, with links to come that lead in, or out.
    entries: u32,
    exits: u32,
    /// Slots of ends that are open after it, and how many ends come later.
    ends: u32,
    later: u32,
    /// The start leads to stops that come later.
    begins: bool,
}

/// The network in the order in which it is swept.
#[derive(Clone, Debug, Default)]
pub(super) struct Passage {
    layers: Vec<Layer>,
    slots: usize,
    need: u32,
}

impl Passage {
    pub(super) fn new(network: &Network) -> Passage {
        let n = network.stops.len();
        let start = network.start;
        let (mut into, mut out, mut near) = (vec![Vec::new(); n], vec![Vec::new(); n], vec![Vec::new(); n]);
        let mut begins = vec![false; n];
        for &(a, b) in network.links.iter().filter(|(a, b)| a != b && *b != start) {
            if a == start {
                begins[b as usize] = true;
                continue;
            }
            out[a as usize].push(b);
            into[b as usize].push(a);
            near[a as usize].push(b);
            near[b as usize].push(a);
        }
        for list in &mut near {
            list.sort_unstable();
            list.dedup();
        }
        let firsts: Vec<u32> = (0..n as u32)
            .filter(|&s| begins[s as usize])
            .take(2)
            .chain(network.ends.iter().copied().take(2))
            .collect();
        let given = topological(&into, &out).map(|order| (order, 2.0)).into_iter().collect();
        let mut order = order::order(&near, &firsts, given, 4.0);
        order.retain(|&s| s != start);
        let maker = Maker { network, into, out, begins, order };
        maker.make()
    }

    pub(super) fn slots(&self) -> usize {
        self.slots
    }
}

/// An order in which every link leads forward, if there is one. Those whose
/// predecessors came last come first, so that few stops stay open.
fn topological(into: &[Vec<u32>], out: &[Vec<u32>]) -> Option<Vec<u32>> {
    let mut left: Vec<usize> = into.iter().map(Vec::len).collect();
    let mut order: Vec<u32> = (0..into.len() as u32).filter(|&s| left[s as usize] == 0).collect();
    let mut next = 0;
    while let Some(&at) = order.get(next) {
        next += 1;
        for &to in &out[at as usize] {
            left[to as usize] -= 1;
            if left[to as usize] == 0 {
                order.push(to);
            }
        }
    }
    (order.len() == into.len()).then_some(order)
}

struct Maker<'a> {
    network: &'a Network,
    into: Vec<Vec<u32>>,
    out: Vec<Vec<u32>>,
    begins: Vec<bool>,
    order: Vec<u32>,
}

impl Maker<'_> {
    fn make(&self) -> Passage {
        let n = self.network.stops.len();
        let is_end = |s: u32| self.network.ends.contains(&s);
        let mut slot = vec![NONE; n];
        let mut done = vec![false; n];
        let mut holder: Vec<u32> = Vec::new();
        let mut passage = Passage { need: self.network.need, ..Passage::default() };
        let mut later = self.network.ends.iter().filter(|&&e| e != self.network.start).count() as u32;
        let mut begins = self.begins.iter().filter(|b| **b).count();
        for &v in &self.order {
            let bits = |list: &[u32], slot: &[u32]| -> u32 {
                list.iter().map(|&u| slot[u as usize]).filter(|&s| s < 32).fold(0, |set, s| set | 1 << s)
            };
            let (into, out) = (bits(&self.into[v as usize], &slot), bits(&self.out[v as usize], &slot));
            let own = holder.iter().position(|&h| h == NONE).unwrap_or(holder.len());
            if own == holder.len() {
                holder.push(NONE);
            }
            holder[own] = v;
            slot[v as usize] = own as u32;
            done[v as usize] = true;
            passage.slots = passage.slots.max(holder.len());
            later -= u32::from(is_end(v));
            begins -= usize::from(self.begins[v as usize]);
            let (mut close, mut entries, mut exits, mut ends) = (0u32, 0u32, 0u32, 0u32);
            for (at, held) in holder.iter_mut().enumerate().filter(|(_, h)| **h != NONE) {
                let stop = *held as usize;
                let bit = 1u32.checked_shl(at as u32).unwrap_or(0);
                let comes = |list: &[u32]| list.iter().any(|&u| !done[u as usize]);
                if comes(&self.into[stop]) {
                    entries |= bit;
                }
                if comes(&self.out[stop]) {
                    exits |= bit;
                }
                if is_end(*held) {
                    ends |= bit;
                } else if (entries | exits) & bit == 0 {
                    close |= bit;
                    slot[stop] = NONE;
                    *held = NONE;
                }
            }
            passage.layers.push(Layer {
                thing: self.network.stops[v as usize],
                slot: own.min(255) as u8,
                from_start: self.begins[v as usize],
                into,
                out,
                close,
                entries,
                exits,
                ends,
                later,
                begins: begins > 0,
            });
        }
        passage
    }
}

/// The sweep over relations of at most `N` slots.
#[derive(Clone, Debug)]
pub(super) struct Reach<const N: usize> {
    passage: Passage,
}

impl<const N: usize> Reach<N> {
    pub(super) fn new(passage: Passage) -> Option<Reach<N>> {
        (passage.slots <= N.min(32)).then_some(Reach { passage })
    }

    /// The stop works: what leads to it leads on to what it leads to.
    fn opened(layer: &Layer, mut s: Relation<N>) -> Relation<N> {
        let own = 1u32 << layer.slot;
        let (into, out) = (layer.into & s.alive, layer.out & s.alive);
        let mut row = out;
        for (at, leads) in s.leads.iter().enumerate() {
            if out >> at & 1 == 1 {
                row |= leads;
            }
        }
        for (at, leads) in s.leads.iter_mut().enumerate() {
            if (*leads | 1 << at) & into != 0 {
                *leads |= row | own;
            }
        }
        s.alive |= own;
        s.leads[layer.slot as usize % N] = row & !own;
        if layer.from_start || s.reached & into != 0 {
            s.reached |= row | own;
        }
        s
    }

    /// Forgets what cannot matter any more.
    fn tidied(&self, layer: &Layer, mut s: Relation<N>) -> Next<Relation<N>> {
        let reached_ends = (s.reached & layer.ends).count_ones();
        if reached_ends >= self.passage.need {
            return Next::Works;
        }
        s.alive &= !layer.close;
        s.reached &= s.alive & (layer.exits | layer.ends);
        let columns = (layer.exits | layer.ends) & s.alive & !s.reached;
        let first_end = layer.ends & columns;
        let mut wanted = 0u32;
        for (at, leads) in s.leads.iter_mut().enumerate() {
            let bit = 1u32 << at;
            if bit & s.alive & layer.entries & !s.reached == 0 {
                *leads = 0;
                continue;
            }
            *leads &= columns & !bit;
            // Where one end is enough, what leads to one need lead nowhere else.
            if self.passage.need == 1 && *leads & first_end != 0 {
                let hit = *leads & first_end;
                *leads = hit & hit.wrapping_neg();
            }
            wanted |= *leads;
        }
        let mut alive = s.reached;
        for (at, leads) in s.leads.iter().enumerate() {
            let bit = 1u32 << at;
            let ahead = bit & (layer.exits | layer.ends) != 0 || *leads != 0;
            let behind = bit & (layer.entries | wanted) != 0;
            if s.alive & bit != 0 && ahead && behind {
                alive |= bit;
            }
        }
        s.alive = alive;
        let possible = (alive & layer.ends).count_ones() + layer.later;
        if possible < self.passage.need || !(layer.begins || s.reached & layer.exits != 0) {
            return Next::Fails;
        }
        Next::On(s)
    }
}

impl<const N: usize> Sweep for Reach<N> {
    type State = Relation<N>;

    fn first(&self) -> Next<Relation<N>> {
        Next::On(Relation { leads: [0; N], reached: 0, alive: 0 })
    }

    fn layers(&self) -> usize {
        self.passage.layers.len()
    }

    fn thing(&self, layer: usize) -> Option<u32> {
        self.passage.layers.get(layer).and_then(|l| l.thing)
    }

    fn step(&self, layer: usize, state: Relation<N>) -> Step<Relation<N>> {
        let layer = &self.passage.layers[layer];
        let works = self.tidied(layer, Self::opened(layer, state));
        if layer.thing.is_none() {
            return Step::Same(works);
        }
        Step::Split(works, self.tidied(layer, state))
    }
}
