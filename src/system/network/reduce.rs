//! Reductions: the same function of the things with fewer stops.
//!
//! Every rule keeps the set of minimal ways, or replaces two things by one
//! that works when both, or either, do. So they hold whether or not a thing
//! stands at several stops. Sources: see [`super`]; the rule of dominators
//! (a link back to a stop that every way has passed is on no minimal way)
//! after C. J. Colbourn, "The Combinatorics of Network Reliability" (1987).

use super::Network;
use super::dominate::Dominators;
use super::terms::{Reduced, Term, Terms};
use rustc_hash::FxHashMap;
use std::collections::BTreeSet;

impl Network {
    /// The same function in terms of series, parallel and smaller networks.
    ///
    /// Stops and links that name no stop are left out.
    pub fn reduce(&self) -> Reduced {
        let mut terms = Terms::default();
        let mut series = Vec::new();
        let mut open = vec![Work::new(self, &mut terms)];
        while let Some(mut work) = open.pop() {
            loop {
                if !work.prune() {
                    return Reduced { terms: vec![Term::Fails] };
                }
                if work.need == 0 {
                    break;
                }
                let changed = work.ways(&mut series);
                if !(work.local(&mut terms) | work.twins(&mut terms) || changed) {
                    break;
                }
            }
            if work.need == 0 {
                continue;
            }
            match work.split() {
                Some(parts) => open.extend(parts.into_iter().rev()),
                None => {
                    let at = terms.push(Term::Network(work.network()));
                    series.push(at);
                }
            }
        }
        let mut once = BTreeSet::new();
        series.retain(|&term| once.insert(term));
        let root = match series[..] {
            [] => terms.push(Term::Works),
            [only] => only,
            _ => terms.push(Term::All(series)),
        };
        terms.under(root)
    }
}

/// A network that is being reduced.
pub(super) struct Work {
    /// The term at each stop.
    pub(super) term: Vec<Option<u32>>,
    pub(super) out: Vec<BTreeSet<u32>>,
    pub(super) into: Vec<BTreeSet<u32>>,
    pub(super) start: u32,
    pub(super) ends: BTreeSet<u32>,
    pub(super) need: u32,
    queue: Vec<u32>,
    queued: Vec<bool>,
}

impl Work {
    pub(super) fn empty(stops: usize, start: u32, need: u32) -> Work {
        Work {
            term: vec![None; stops],
            out: vec![BTreeSet::new(); stops],
            into: vec![BTreeSet::new(); stops],
            start,
            ends: BTreeSet::new(),
            need,
            queue: Vec::new(),
            queued: vec![false; stops],
        }
    }

    fn new(network: &Network, terms: &mut Terms) -> Work {
        let n = network.stops.len();
        let mut work = Work::empty(n, network.start, network.need);
        work.term = network.stops.iter().map(|t| t.map(|t| terms.thing(t))).collect();
        work.ends = network.ends.iter().copied().filter(|&e| (e as usize) < n).collect();
        for &(from, to) in network.links.iter().filter(|(a, b)| a.max(b) < &(n as u32)) {
            work.link(from, to);
        }
        work
    }

    pub(super) fn link(&mut self, from: u32, to: u32) {
        if from != to {
            self.out[from as usize].insert(to);
            self.into[to as usize].insert(from);
        }
    }

    fn unlink(&mut self, from: u32, to: u32) {
        self.out[from as usize].remove(&to);
        self.into[to as usize].remove(&from);
        self.wake(from);
        self.wake(to);
    }

    fn wake(&mut self, stop: u32) {
        if !std::mem::replace(&mut self.queued[stop as usize], true) {
            self.queue.push(stop);
        }
    }

    /// Takes all links of a stop away.
    fn drop_stop(&mut self, stop: u32) {
        for to in std::mem::take(&mut self.out[stop as usize]) {
            self.into[to as usize].remove(&stop);
            self.wake(to);
        }
        for from in std::mem::take(&mut self.into[stop as usize]) {
            self.out[from as usize].remove(&stop);
            self.wake(from);
        }
        self.term[stop as usize] = None;
    }

    /// The only end, where it cannot fail.
    fn goal(&self) -> Option<u32> {
        let only = if self.ends.len() == 1 { self.ends.first().copied() } else { None };
        only.filter(|&e| self.term[e as usize].is_none())
    }

    pub(super) fn fixed(&self, stop: u32) -> bool {
        stop == self.start || self.ends.contains(&stop)
    }

    /// Leaves out what is not reached or reaches no end; whether enough ends
    /// are left.
    fn prune(&mut self) -> bool {
        let n = self.term.len();
        if self.start as usize >= n {
            return false;
        }
        let reached = walk(&self.out, std::iter::once(self.start));
        self.ends.retain(|&e| reached[e as usize]);
        if self.term[self.start as usize].is_none() && self.ends.remove(&self.start) {
            self.need = self.need.saturating_sub(1);
        }
        if self.need == 0 {
            return true;
        }
        let useful = walk(&self.into, self.ends.iter().copied());
        for stop in 0..n as u32 {
            let used = reached[stop as usize] && useful[stop as usize];
            let bare = self.out[stop as usize].is_empty() && self.into[stop as usize].is_empty();
            if !used && !bare {
                self.drop_stop(stop);
            }
        }
        self.ends.len() >= self.need as usize
    }

    /// Takes out the things that every way needs and the links that no
    /// minimal way takes; whether anything changed.
    fn ways(&mut self, series: &mut Vec<u32>) -> bool {
        let n = self.term.len();
        let sink = n as u32;
        let lists = |sets: &[BTreeSet<u32>]| -> Vec<Vec<u32>> {
            sets.iter().map(|s| s.iter().copied().collect()).chain([Vec::new()]).collect()
        };
        let (mut out, mut into) = (lists(&self.out), lists(&self.into));
        into[n].extend(&self.ends);
        for &end in &self.ends {
            out[end as usize].push(sink);
        }
        let before = Dominators::new(&out, &into, self.start);
        let after = Dominators::new(&into, &out, sink);
        let mut needed: BTreeSet<u32> = before.chain(sink).into_iter().collect();
        if self.need as usize == self.ends.len() {
            needed.extend(self.ends.iter().flat_map(|&e| before.chain(e)));
        }
        needed.remove(&sink);
        let mut changed = false;
        // In the order of a way from start to end.
        let mut needed: Vec<u32> = needed.into_iter().collect();
        needed.sort_by_key(|&stop| before.enter[stop as usize]);
        let found: BTreeSet<u32> = needed.iter().filter_map(|&stop| self.term[stop as usize]).collect();
        series.extend(needed.iter().filter_map(|&stop| self.term[stop as usize]));
        if !found.is_empty() {
            changed = true;
            // They work wherever else they stand.
            for term in self.term.iter_mut().filter(|t| t.is_some_and(|t| found.contains(&t))) {
                *term = None;
            }
        }
        for from in 0..sink {
            for &to in &out[from as usize] {
                if to != sink && (before.dominates(to, from) || after.dominates(from, to)) {
                    self.unlink(from, to);
                    changed = true;
                }
            }
        }
        changed
    }

    /// Applies the rules that look at one stop until none applies.
    fn local(&mut self, terms: &mut Terms) -> bool {
        for stop in 0..self.term.len() as u32 {
            self.wake(stop);
        }
        let mut changed = false;
        while let Some(stop) = self.queue.pop() {
            self.queued[stop as usize] = false;
            changed |= self.rules(stop, terms);
        }
        changed
    }

    fn rules(&mut self, u: u32, terms: &mut Terms) -> bool {
        let changed = self.shortcuts(u);
        let (into, out) = (&self.into[u as usize], &self.out[u as usize]);
        if self.fixed(u) || (into.is_empty() && out.is_empty()) {
            return changed;
        }
        let around: BTreeSet<u32> = into.union(out).copied().take(3).collect();
        if into.is_empty() || out.is_empty() || around.len() < 2 {
            self.drop_stop(u);
            return true;
        }
        if self.term[u as usize].is_none() {
            return self.pass(u, &around) | changed;
        }
        self.series(u, &around, terms) || self.twin(u, terms) || changed
    }

    /// Links around a stop that no minimal way takes.
    fn shortcuts(&mut self, u: u32) -> bool {
        let (into, out) = (&self.into[u as usize], &self.out[u as usize]);
        let mut cut: Vec<(u32, u32)> = Vec::new();
        if u == self.start {
            cut.extend(into.iter().map(|&x| (x, u)));
        } else if into.contains(&self.start) {
            cut.extend(into.iter().filter(|&&x| x != self.start).map(|&x| (x, u)));
        }
        if let Some(goal) = self.goal() {
            if u == goal {
                cut.extend(out.iter().map(|&x| (u, x)));
            } else if out.contains(&goal) {
                cut.extend(out.iter().filter(|&&x| x != goal).map(|&x| (u, x)));
            }
        }
        if !self.fixed(u) {
            if let (1, Some(&only)) = (into.len(), into.first())
                && out.contains(&only)
            {
                cut.push((u, only));
            }
            if let (1, Some(&only)) = (out.len(), out.first())
                && into.contains(&only)
            {
                cut.push((only, u));
            }
        }
        for &(from, to) in &cut {
            self.unlink(from, to);
        }
        !cut.is_empty()
    }

    /// Takes a stop that cannot fail out of the ways through it, where that
    /// makes no more links.
    fn pass(&mut self, u: u32, around: &BTreeSet<u32>) -> bool {
        let (into, out) = (self.into[u as usize].clone(), self.out[u as usize].clone());
        let merged = out.iter().find(|&&v| {
            into.contains(&v) && self.term[v as usize].is_none() && v != self.start && !self.ends.contains(&v)
        });
        if let Some(&v) = merged {
            for &from in into.iter().filter(|&&x| x != v) {
                self.link(from, v);
            }
            for &to in out.iter().filter(|&&x| x != v) {
                self.link(v, to);
            }
            self.wake(v);
        } else if into.len() == 1 || out.len() == 1 || around.len() == 2 {
            for &from in &into {
                for &to in &out {
                    self.link(from, to);
                }
            }
        } else {
            return false;
        }
        self.drop_stop(u);
        true
    }

    /// Two stops that are passed together become one.
    fn series(&mut self, u: u32, around: &BTreeSet<u32>, terms: &mut Terms) -> bool {
        let own = |s: &Work, v: u32| s.term[v as usize].is_some() && !s.fixed(v);
        // One way: all that leaves u enters v, and nothing else does.
        if let (1, Some(&v)) = (self.out[u as usize].len(), self.out[u as usize].first())
            && own(self, v)
            && self.into[v as usize].len() == 1
        {
            let (mut into, mut out) = (self.into[u as usize].clone(), self.out[v as usize].clone());
            into.remove(&v);
            out.remove(&u);
            return self.merge((u, v), into, out, terms);
        }
        if around.len() != 2 {
            return false;
        }
        for &v in around {
            let beyond: BTreeSet<u32> = self.into[v as usize]
                .union(&self.out[v as usize])
                .copied()
                .filter(|&y| y != u)
                .take(2)
                .collect();
            let x = around.iter().copied().find(|&x| x != v);
            let (Some(x), Some(&y)) = (x, beyond.first()) else { continue };
            if !own(self, v) || beyond.len() != 1 {
                continue;
            }
            let leads = |a: u32, b: u32| self.out[a as usize].contains(&b);
            let forth = x != y && leads(x, u) && leads(u, v) && leads(v, y);
            let back = x != y && leads(y, v) && leads(v, u) && leads(u, x);
            let ends = [(forth, x), (back, y)].into_iter().filter(|(is, _)| *is).map(|(_, s)| s).collect();
            let begins = [(forth, y), (back, x)].into_iter().filter(|(is, _)| *is).map(|(_, s)| s).collect();
            return self.merge((u, v), ends, begins, terms);
        }
        false
    }

    fn merge(
        &mut self,
        (u, v): (u32, u32),
        into: BTreeSet<u32>,
        out: BTreeSet<u32>,
        terms: &mut Terms,
    ) -> bool {
        let both = match (self.term[u as usize], self.term[v as usize]) {
            (Some(a), Some(b)) => Some(terms.join(true, a, b)),
            (one, other) => one.or(other),
        };
        self.drop_stop(v);
        self.drop_stop(u);
        self.term[u as usize] = both;
        for from in into {
            self.link(from, u);
        }
        for to in out {
            self.link(u, to);
        }
        self.wake(u);
        true
    }

    /// Finds a stop with the same links among few neighbours' neighbours.
    fn twin(&mut self, u: u32, terms: &mut Terms) -> bool {
        const LOOK: usize = 16;
        let (into, out) = (&self.into[u as usize], &self.out[u as usize]);
        let near = into.iter().map(|&x| &self.out[x as usize]);
        let Some(near) = near.chain(out.iter().map(|&x| &self.into[x as usize])).min_by_key(|s| s.len())
        else {
            return false;
        };
        let same = |v: u32| {
            v != u && !self.fixed(v) && self.into[v as usize] == *into && self.out[v as usize] == *out
        };
        let Some(v) = near.iter().copied().take(LOOK).find(|&v| same(v)) else { return false };
        self.parallel(u.min(v), u.max(v), terms);
        true
    }

    /// Joins all stops that have the same links, or the same but for those
    /// between themselves.
    fn twins(&mut self, terms: &mut Terms) -> bool {
        let mut changed = false;
        for closed in [false, true] {
            let mut met: FxHashMap<(BTreeSet<u32>, BTreeSet<u32>), u32> = FxHashMap::default();
            for v in 0..self.term.len() as u32 {
                if self.fixed(v) {
                    continue;
                }
                let mut key = (self.into[v as usize].clone(), self.out[v as usize].clone());
                if key.0.is_empty() || key.1.is_empty() {
                    continue;
                }
                if closed {
                    key.0.insert(v);
                    key.1.insert(v);
                }
                match met.get(&key) {
                    Some(&u) if closed && self.into[u as usize].is_empty() => {}
                    Some(&u) => {
                        self.parallel(u, v, terms);
                        changed = true;
                        if closed {
                            // The sets around have changed; the next round goes on.
                            return true;
                        }
                    }
                    None => {
                        met.insert(key, v);
                    }
                }
            }
        }
        changed
    }

    fn parallel(&mut self, u: u32, v: u32, terms: &mut Terms) {
        let either = match (self.term[u as usize], self.term[v as usize]) {
            (Some(a), Some(b)) => Some(terms.join(false, a, b)),
            _ => None,
        };
        self.drop_stop(v);
        self.term[u as usize] = either;
        self.wake(u);
    }
}

fn walk(next: &[BTreeSet<u32>], from: impl Iterator<Item = u32>) -> Vec<bool> {
    let mut seen = vec![false; next.len()];
    let mut stack: Vec<u32> = from.collect();
    while let Some(at) = stack.pop() {
        if !std::mem::replace(&mut seen[at as usize], true) {
            stack.extend(&next[at as usize]);
        }
    }
    seen
}
