//! Parts between the stops that every way passes.

use super::NONE;
use super::Network;
use super::dominate::Dominators;
use super::reduce::Work;
use std::collections::BTreeSet;

impl Work {
    /// The parts between the stops that every way passes; nothing if there is
    /// only one part.
    pub(super) fn split(&self) -> Option<Vec<Work>> {
        let n = self.term.len();
        let lists = |sets: &[BTreeSet<u32>]| -> Vec<Vec<u32>> {
            sets.iter().map(|s| s.iter().copied().collect()).chain([Vec::new()]).collect()
        };
        let (mut out, mut into) = (lists(&self.out), lists(&self.into));
        into[n].extend(&self.ends);
        for &end in &self.ends {
            out[end as usize].push(n as u32);
        }
        let before = Dominators::new(&out, &into, self.start);
        let mut chain = before.chain(n as u32);
        chain.reverse();
        chain.pop();
        let single = self.ends.len() == 1;
        if chain.len() <= 1 + usize::from(single) {
            let direct = single && chain.len() == 2 && self.out[self.start as usize].contains(&chain[1]);
            return direct.then(Vec::new);
        }
        let part = part_of(&before.above, &chain, n);
        let mut inner: Vec<Vec<u32>> = vec![Vec::new(); chain.len()];
        for stop in 0..n as u32 {
            if let Some(list) = inner.get_mut(part[stop as usize] as usize) {
                list.push(stop);
            }
        }
        let mut place = vec![NONE; n];
        let mut parts = Vec::new();
        for (i, &from) in chain.iter().enumerate() {
            let next = chain.get(i + 1).copied();
            if next.is_some() || !single {
                parts.push(self.part(from, next, &inner[i], &mut place));
            }
        }
        Some(parts)
    }

    /// The part from a stop that every way passes to the next, or, after the
    /// last, to the ends. `place` is [`NONE`] throughout and is left so.
    fn part(&self, from: u32, next: Option<u32>, inner: &[u32], place: &mut [u32]) -> Work {
        let stops: Vec<u32> =
            std::iter::once(from).chain(inner.iter().copied().filter(|&s| s != from)).chain(next).collect();
        for (j, &stop) in stops.iter().enumerate() {
            place[stop as usize] = j as u32;
        }
        let need = if next.is_some() { 1 } else { self.need - u32::from(self.ends.contains(&from)) };
        let mut work = Work::empty(stops.len(), 0, need);
        for (at, &stop) in stops.iter().enumerate() {
            // What every way passes has been taken out already.
            work.term[at] = self.term[stop as usize];
            if next != Some(stop) {
                for &to in self.out[stop as usize].iter().filter(|&&to| place[to as usize] != NONE) {
                    work.link(at as u32, place[to as usize]);
                }
            }
        }
        work.ends = match next {
            Some(next) => BTreeSet::from([place[next as usize]]),
            None => {
                let ends = self.ends.iter().map(|&e| place[e as usize]);
                ends.filter(|&e| e != NONE && e != 0).collect()
            }
        };
        for stop in stops {
            place[stop as usize] = NONE;
        }
        work
    }

    /// The network as it stands, without the stops that are gone.
    pub(super) fn network(&self) -> Network {
        let n = self.term.len() as u32;
        let stays =
            |s: u32| self.fixed(s) || !self.out[s as usize].is_empty() || !self.into[s as usize].is_empty();
        let kept: Vec<u32> = (0..n).filter(|&s| stays(s)).collect();
        let mut place = vec![NONE; n as usize];
        for (i, &stop) in kept.iter().enumerate() {
            place[stop as usize] = i as u32;
        }
        let at = |s: u32| place[s as usize];
        Network {
            stops: kept.iter().map(|&s| self.term[s as usize]).collect(),
            links: kept
                .iter()
                .flat_map(|&s| self.out[s as usize].iter().map(move |&t| (at(s), at(t))))
                .collect(),
            start: at(self.start),
            ends: self.ends.iter().map(|&e| at(e)).collect(),
            need: self.need,
        }
    }
}

/// For each stop, the last of `chain` that dominates it.
fn part_of(above: &[u32], chain: &[u32], stops: usize) -> Vec<u32> {
    let mut part = vec![NONE; above.len()];
    for (i, &stop) in chain.iter().enumerate() {
        part[stop as usize] = i as u32;
    }
    for stop in 0..stops {
        let mut way = Vec::new();
        let mut at = stop;
        while part[at] == NONE && above[at] != NONE {
            way.push(at);
            at = above[at] as usize;
        }
        for passed in way {
            part[passed] = part[at];
        }
    }
    part
}
