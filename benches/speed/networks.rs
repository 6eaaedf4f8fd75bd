//! Two-terminal grids: n by n stops that cannot fail, corner to corner, with a
//! thing on every link.
//!
//! Two floors. The sweep below does nothing but this one thing: the classes
//! of the open stops as nibbles of one word, one double for a mass, a
//! diagonal order that is written in. And the function of all ways as a
//! decision diagram, which is what a general diagram library would be given.

use super::{paired, row, timed};
use tieback::engine::diagram::{Builder, FAILS, WORKS};
use tieback::engine::network::{Limits, Network};
use tieback::number::{Chance, Real};

/// The links of a grid, in the order of its diagonals.
fn links(n: usize) -> Vec<(usize, usize)> {
    let mut links = Vec::new();
    for d in 0..2 * n - 1 {
        for i in d.saturating_sub(n - 1)..n.min(d + 1) {
            let (j, at) = (d - i, i * n + d - i);
            // The neighbour whose last link this is comes first.
            if i > 0 {
                links.push((at - n, at));
            }
            if j > 0 {
                links.push((at - 1, at));
            }
        }
    }
    links
}

pub(crate) fn grid(n: usize) -> Network {
    let mut network = Network {
        stops: vec![None; n * n],
        links: Vec::new(),
        start: 0,
        ends: vec![(n * n - 1) as u32],
        need: 1,
    };
    for (thing, (a, b)) in links(n).into_iter().enumerate() {
        let via = network.stops.len() as u32;
        network.stops.push(Some(thing as u32));
        for (from, to) in [(a as u32, via), (via, b as u32)] {
            network.links.extend([(from, to), (to, from)]);
        }
    }
    network
}

fn chances(n: usize, fails: f64) -> Vec<Chance> {
    let q = Real::from(fails);
    vec![Chance::new(Real::ONE - q, q); 2 * n * (n - 1)]
}

const ONES: u64 = 0x1111_1111_1111_1111;
const START: u64 = 14;
const END: u64 = 15;

struct Slots {
    keys: Vec<u64>,
    masses: Vec<f64>,
    len: usize,
}

impl Slots {
    fn new(size: usize) -> Slots {
        Slots { keys: vec![u64::MAX; size], masses: vec![0.0; size], len: 0 }
    }

    #[inline]
    fn add(&mut self, key: u64, mass: f64) {
        let mask = self.keys.len() - 1;
        let mut at = (key.wrapping_mul(0x9E37_79B9_7F4A_7C15) >> 20) as usize & mask;
        while self.keys[at] != key {
            if self.keys[at] == u64::MAX {
                self.keys[at] = key;
                self.len += 1;
                break;
            }
            at = (at + 1) & mask;
        }
        self.masses[at] += mass;
        if self.len * 8 > self.keys.len() * 7 {
            let mut more = Slots::new(self.keys.len() * 2);
            for (&key, &mass) in self.keys.iter().zip(&self.masses).filter(|(k, _)| **k != u64::MAX) {
                more.add(key, mass);
            }
            *self = more;
        }
    }
}

/// The bare sweep; gives the failing side and the number of states.
fn bare(n: usize, p: f64) -> (f64, usize) {
    let links = links(n);
    let mut left = vec![0; n * n];
    for &(a, b) in &links {
        left[a] += 1;
        left[b] += 1;
    }
    let mut slot = vec![usize::MAX; n * n];
    let mut open = 1u64;
    slot[0] = 0;
    let (mut now, mut fails, mut states) = (Slots::new(16), 0.0, 0);
    now.add(START, 1.0);
    let equal = |word: u64, label: u64| {
        let x = word ^ (label * ONES);
        !(x | x >> 1 | x >> 2 | x >> 3) & ONES
    };
    for (a, b) in links {
        let fresh = slot[b] == usize::MAX;
        left[a] -= 1;
        left[b] -= 1;
        let closes = left[a] == 0;
        let at = slot[a];
        if fresh {
            slot[b] = if closes { at } else { (0..14).find(|s| open >> (4 * s) & 1 == 0).unwrap_or(0) };
        }
        let to = slot[b];
        let last = b == n * n - 1;
        let label = if last { END } else { to as u64 };
        let before = open;
        open |= 1 << (4 * to);
        let rest = if closes { before & !(1 << (4 * at)) } else { before };
        if closes && !(fresh && at == to) {
            open &= !(1 << (4 * at));
        }
        let mut next = Slots::new(now.keys.len());
        for (&key, &mass) in now.keys.iter().zip(&now.masses).filter(|(k, _)| **k != u64::MAX) {
            states += 1;
            // Without a: its class moves to its next slot, or ends.
            let drop = |key: u64| {
                let own = key >> (4 * at) & 15;
                let key = key & !(15 << (4 * at));
                let others = equal(key, own) & rest;
                if own == at as u64 && others != 0 {
                    let low = u64::from(others.trailing_zeros() / 4);
                    Some(key ^ (others * (own ^ low)))
                } else if own >= START && others == 0 {
                    None
                } else {
                    Some(key)
                }
            };
            let opened = if fresh && at != to { key | label << (4 * to) } else { key };
            let x = opened >> (4 * at) & 15;
            let y = if fresh && at == to { label } else { opened >> (4 * to) & 15 };
            let works = if x == y {
                Some(opened)
            } else if x.max(y) == END && x.min(y) == START {
                None
            } else if fresh && at == to {
                Some(opened)
            } else {
                let (low, high) = (x.min(y), x.max(y));
                let (from, into) = if high < START { (high, low) } else { (low, high) };
                Some(opened ^ ((equal(opened, from) & (before | 1 << (4 * to))) * (from ^ into)))
            };
            let handed = fresh && at == to;
            let done = |key: u64| if closes && !handed { drop(key) } else { Some(key) };
            if let Some(works) = works
                && let Some(to) = done(works)
            {
                next.add(to, if x == y && !handed { mass } else { mass * p });
            }
            if x == y && !handed {
                continue;
            }
            let failed = if handed { drop(opened).map(|k| k | label << (4 * to)) } else { done(opened) };
            match failed {
                Some(to) => next.add(to, mass * (1.0 - p)),
                None => fails += mass * (1.0 - p),
            }
        }
        now = next;
    }
    (fails, states)
}

/// All ways without a loop as a diagram, in the order of the diagonals.
fn by_ways(n: usize) -> usize {
    let links = links(n);
    let mut near: Vec<Vec<(usize, usize)>> = vec![Vec::new(); n * n];
    for (i, &(a, b)) in links.iter().enumerate() {
        near[a].push((b, i));
        near[b].push((a, i));
    }
    let mut builder = Builder::new(50_000_000);
    let variables: Vec<u32> = (0..links.len()).filter_map(|v| builder.variable(v as u32).ok()).collect();
    let (mut used, mut way, mut any) = (vec![false; n * n], Vec::new(), FAILS);
    used[0] = true;
    let mut stack = vec![(0usize, 0usize)];
    while let Some((at, next)) = stack.pop() {
        if at == n * n - 1 || next == near[at].len() {
            if at == n * n - 1 {
                let all = builder.at_least(way.len(), &way).unwrap_or(FAILS);
                any = builder.choose(any, WORKS, all).unwrap_or(FAILS);
            }
            used[at] = false;
            way.pop();
            continue;
        }
        stack.push((at, next + 1));
        let (to, link) = near[at][next];
        if !used[to] {
            used[to] = true;
            way.push(variables[link]);
            stack.push((to, 0));
        }
    }
    builder.finish(any).nodes().len()
}

pub(crate) fn networks() {
    let limits = Limits::default();
    let run = |network: &Network, chances: &[Chance]| {
        network.chance(chances, &limits).value().map(|c| c.fails().to_f64())
    };
    for (n, rounds) in [(6, 15), (8, 9), (10, 5), (11, 3)] {
        let (network, chances) = (grid(n), chances(n, 0.1));
        let (fails, states) = bare(n, 0.9);
        let got = run(&network, &chances).unwrap_or(0.0);
        assert!((got / fails - 1.0).abs() < 1e-9, "{n}: {got} {fails}");
        let mut seconds = 0.0;
        let ratio = paired(
            rounds,
            || {
                let took = timed(|| run(&network, &chances));
                seconds = took.as_secs_f64();
                took
            },
            || timed(|| bare(n, 0.9)),
        );
        let nanos = seconds * 1e9 / states as f64;
        row(
            &format!("grid {n} x {n}, {:.4} s, {nanos:.0} ns a state / a bare sweep", seconds),
            ratio,
            Some(2.0),
        );
    }
    let (network, chances5) = (grid(5), chances(5, 0.1));
    let ratio = paired(5, || timed(|| by_ways(5)), || timed(|| run(&network, &chances5)));
    row("grid 5 x 5: all ways as a diagram / the sweep", ratio, None);
    for (n, fails) in [(14, 0.01), (14, 0.001), (12, 0.1), (14, 0.1)] {
        let (network, chances) = (grid(n), chances(n, fails));
        let took = timed(|| run(&network, &chances));
        row(&format!("grid {n} x {n}, links fail {fails}: seconds"), took.as_secs_f64(), None);
    }
}
