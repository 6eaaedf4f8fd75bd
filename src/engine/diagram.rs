//! Reduced ordered binary decision diagrams.
//!
//! Source: R. E. Bryant, "Graph-based algorithms for Boolean function
//! manipulation", IEEE Trans. Computers C-35 (1986); if-then-else and the
//! tables after K. S. Brace, R. L. Rudell, R. E. Bryant, "Efficient
//! implementation of a BDD package", DAC 1990. From memory of both.
//!
//! Variables are numbered in the order of the diagram. Everything is iterative:
//! a diagram may be as deep as it has variables.

use crate::number::{Chance, Real};
use std::fmt;

/// The end of a diagram at which the system has failed.
pub const FAILS: u32 = 0;
/// The end of a diagram at which the system works.
pub const WORKS: u32 = 1;

/// A diagram, or a family of sets, would have more nodes than allowed.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct TooLarge {
    /// How many nodes were allowed.
    pub limit: usize,
}

impl fmt::Display for TooLarge {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "needs a diagram of more than {} nodes", self.limit)
    }
}

impl std::error::Error for TooLarge {}

/// A node that asks whether one variable works.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Branch {
    /// The variable; `u32::MAX` at the two ends.
    pub variable: u32,
    /// Where to go on if it has failed.
    pub fails: u32,
    /// Where to go on if it works.
    pub works: u32,
}

/// Nodes with one number for each distinct (variable, low, high): shared by
/// the diagrams and the families of sets.
#[derive(Clone, Debug)]
pub(super) struct Unique {
    pub(super) nodes: Vec<Branch>,
    table: Vec<u32>,
    limit: usize,
}

fn mix(a: u32, b: u32, c: u32) -> usize {
    let x = (u64::from(a) << 32 | u64::from(b)).wrapping_mul(0x9E37_79B9_7F4A_7C15);
    let y = (x ^ x >> 29 ^ u64::from(c)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    (y ^ y >> 32) as usize
}

impl Unique {
    pub(super) fn new(limit: usize) -> Unique {
        let end = |at| Branch { variable: u32::MAX, fails: at, works: at };
        Unique { nodes: vec![end(0), end(1)], table: vec![0; 64], limit: limit.max(2) }
    }

    pub(super) fn get(&mut self, branch: Branch) -> Result<u32, TooLarge> {
        let mask = self.table.len() - 1;
        let mut slot = mix(branch.variable, branch.fails, branch.works) & mask;
        loop {
            match self.table[slot] {
                0 => break,
                at if self.nodes[at as usize] == branch => return Ok(at),
                _ => slot = (slot + 1) & mask,
            }
        }
        if self.nodes.len() >= self.limit {
            return Err(TooLarge { limit: self.limit });
        }
        let at = self.nodes.len() as u32;
        self.nodes.push(branch);
        self.table[slot] = at;
        if self.nodes.len() * 2 > self.table.len() {
            self.grow();
        }
        Ok(at)
    }

    fn grow(&mut self) {
        let mask = self.table.len() * 2 - 1;
        let mut table = vec![0; mask + 1];
        for (at, b) in self.nodes.iter().enumerate().skip(2) {
            let mut slot = mix(b.variable, b.fails, b.works) & mask;
            while table[slot] != 0 {
                slot = (slot + 1) & mask;
            }
            table[slot] = at as u32;
        }
        self.table = table;
    }

    /// The nodes under `root`, renumbered; members keep smaller numbers.
    pub(super) fn under(&self, root: u32) -> (Vec<Branch>, u32) {
        let mut place = vec![u32::MAX; root.max(1) as usize + 1];
        place[root as usize] = 0;
        for at in (2..=root).rev() {
            if place[at as usize] == 0 {
                let b = self.nodes[at as usize];
                place[b.fails as usize] = 0;
                place[b.works as usize] = 0;
            }
        }
        let mut nodes = vec![self.nodes[0], self.nodes[1]];
        place[0] = 0;
        place[1] = 1;
        for at in 2..=root {
            if place[at as usize] == 0 {
                let b = self.nodes[at as usize];
                place[at as usize] = nodes.len() as u32;
                nodes.push(Branch {
                    variable: b.variable,
                    fails: place[b.fails as usize],
                    works: place[b.works as usize],
                });
            }
        }
        (nodes, place[root as usize])
    }
}

/// A lossy table of results of operations with up to three operands. It grows
/// with the diagram, so that small diagrams do not pay for large ones.
#[derive(Clone, Debug)]
pub(super) struct Memory {
    slots: Vec<[u32; 4]>,
}

impl Memory {
    const LARGEST: usize = 1 << 22;

    pub(super) fn new() -> Memory {
        Memory { slots: vec![[u32::MAX; 4]; 64] }
    }

    pub(super) fn get(&self, [a, b, c]: [u32; 3]) -> Option<u32> {
        let slot = self.slots[mix(a, b, c) & (self.slots.len() - 1)];
        (slot[..3] == [a, b, c]).then_some(slot[3])
    }

    pub(super) fn set(&mut self, [a, b, c]: [u32; 3], result: u32, nodes: usize) {
        if nodes > self.slots.len() && self.slots.len() < Memory::LARGEST {
            let mut larger = vec![[u32::MAX; 4]; self.slots.len() * 4];
            for &slot in self.slots.iter().filter(|slot| slot[3] != u32::MAX) {
                let at = mix(slot[0], slot[1], slot[2]) & (larger.len() - 1);
                larger[at] = slot;
            }
            self.slots = larger;
        }
        let at = mix(a, b, c) & (self.slots.len() - 1);
        self.slots[at] = [a, b, c, result];
    }
}

/// Where diagrams are made.
#[derive(Clone, Debug)]
pub struct Builder {
    unique: Unique,
    memory: Memory,
}

enum Task {
    Visit(u32, u32, u32),
    Make(u32, u32, u32, u32),
}

impl Builder {
    /// An empty builder that refuses to hold more than `limit` nodes.
    pub fn new(limit: usize) -> Builder {
        Builder { unique: Unique::new(limit), memory: Memory::new() }
    }

    /// The diagram of one variable.
    ///
    /// # Errors
    /// If the limit is reached.
    pub fn variable(&mut self, variable: u32) -> Result<u32, TooLarge> {
        self.branch(variable, FAILS, WORKS)
    }

    /// The node that goes on at `fails` or at `works`, which both must lie
    /// below `variable` in the order.
    ///
    /// # Errors
    /// If the limit is reached.
    pub fn branch(&mut self, variable: u32, fails: u32, works: u32) -> Result<u32, TooLarge> {
        if fails == works {
            return Ok(fails);
        }
        self.unique.get(Branch { variable, fails, works })
    }

    fn top(&self, at: u32) -> u32 {
        self.unique.nodes[at as usize].variable
    }

    fn cofactors(&self, at: u32, variable: u32) -> (u32, u32) {
        let b = self.unique.nodes[at as usize];
        if b.variable == variable { (b.fails, b.works) } else { (at, at) }
    }

    /// `g` where `f` works, `h` where it fails.
    ///
    /// # Errors
    /// If the limit is reached.
    pub fn choose(&mut self, f: u32, g: u32, h: u32) -> Result<u32, TooLarge> {
        let mut tasks = vec![Task::Visit(f, g, h)];
        let mut results: Vec<u32> = Vec::new();
        while let Some(task) = tasks.pop() {
            match task {
                Task::Visit(f, g, h) => {
                    let (mut f, mut g, mut h) = (f, g, h);
                    if f == g {
                        g = WORKS;
                    }
                    if f == h {
                        h = FAILS;
                    }
                    // "and" and "or" do not mind the order: one entry for both.
                    if h == FAILS && g < f {
                        std::mem::swap(&mut f, &mut g);
                    } else if g == WORKS && h < f {
                        std::mem::swap(&mut f, &mut h);
                    }
                    let known = match (f, g, h) {
                        (WORKS, g, _) => Some(g),
                        (FAILS, _, h) => Some(h),
                        (_, g, h) if g == h => Some(g),
                        (f, WORKS, FAILS) => Some(f),
                        _ => self.memory.get([f, g, h]),
                    };
                    if let Some(known) = known {
                        results.push(known);
                        continue;
                    }
                    let top = self.top(f).min(self.top(g)).min(self.top(h));
                    let (f0, f1) = self.cofactors(f, top);
                    let (g0, g1) = self.cofactors(g, top);
                    let (h0, h1) = self.cofactors(h, top);
                    tasks.push(Task::Make(top, f, g, h));
                    tasks.push(Task::Visit(f1, g1, h1));
                    tasks.push(Task::Visit(f0, g0, h0));
                }
                Task::Make(top, f, g, h) => {
                    let works = results.pop().unwrap_or(FAILS);
                    let fails = results.pop().unwrap_or(FAILS);
                    let made = self.branch(top, fails, works)?;
                    self.memory.set([f, g, h], made, self.unique.nodes.len());
                    results.push(made);
                }
            }
        }
        Ok(results.pop().unwrap_or(FAILS))
    }

    /// At least `need` of `members` work. Members are taken from the last in
    /// the order to the first, so that a new one is mostly put on top.
    ///
    /// # Errors
    /// If the limit is reached.
    pub fn at_least(&mut self, need: usize, members: &[u32]) -> Result<u32, TooLarge> {
        if need == 0 {
            return Ok(WORKS);
        }
        if need > members.len() {
            return Ok(FAILS);
        }
        let mut members = members.to_vec();
        members.sort_by_key(|&m| (self.top(m), m));
        if need == members.len() {
            let mut all = WORKS;
            for &m in members.iter().rev() {
                all = self.choose(m, all, FAILS)?;
            }
            return Ok(all);
        }
        if need == 1 {
            let mut any = FAILS;
            for &m in members.iter().rev() {
                any = self.choose(m, WORKS, any)?;
            }
            return Ok(any);
        }
        // rows[r]: at least r of the members taken so far.
        let mut rows = vec![FAILS; need + 1];
        rows[0] = WORKS;
        for (before, &m) in members.iter().enumerate().rev() {
            for r in (need.saturating_sub(before).max(1)..=need).rev() {
                rows[r] = self.choose(m, rows[r - 1], rows[r])?;
            }
        }
        Ok(rows[need])
    }

    /// The chance from each node made so far, continuing a list begun earlier.
    pub(super) fn extend_values(&self, chances: &[Chance], values: &mut Vec<Chance>) {
        extend(&self.unique.nodes, chances, values);
    }

    /// The finished diagram at `root`, without the nodes made on the way.
    pub fn finish(&self, root: u32) -> Diagram {
        let (nodes, root) = self.unique.under(root);
        Diagram { nodes, root }
    }
}

fn extend(nodes: &[Branch], chances: &[Chance], values: &mut Vec<Chance>) {
    if values.is_empty() {
        values.extend([Chance::HOPELESS, Chance::PERFECT]);
    }
    for b in &nodes[values.len()..] {
        let chance = chances[b.variable as usize];
        values.push(chance.choose(values[b.works as usize], values[b.fails as usize]));
    }
}

/// A finished diagram. Nodes come after those that they lead to; the first two
/// are [`FAILS`] and [`WORKS`].
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Diagram {
    nodes: Vec<Branch>,
    root: u32,
}

impl Diagram {
    /// All nodes, with the two ends.
    pub fn nodes(&self) -> &[Branch] {
        &self.nodes
    }

    /// Where it begins.
    pub fn root(&self) -> u32 {
        self.root
    }

    /// The chance from each node on, both tails in one pass upwards; `chances`
    /// by variable.
    pub fn evaluate(&self, chances: &[Chance]) -> Vec<Chance> {
        let mut values = Vec::with_capacity(self.nodes.len());
        extend(&self.nodes, chances, &mut values);
        values
    }

    /// Probability of the way from the root to each node, in one pass down.
    pub fn reach(&self, chances: &[Chance]) -> Vec<Real> {
        let mut reach = vec![Real::ZERO; self.nodes.len()];
        reach[self.root as usize] = Real::ONE;
        for (at, b) in self.nodes.iter().enumerate().skip(2).rev() {
            let chance = chances[b.variable as usize];
            let here = reach[at];
            reach[b.works as usize] += here * chance.works();
            reach[b.fails as usize] += here * chance.fails();
        }
        reach
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::trial::close;

    #[test]
    fn a_chain_of_50_000_variables_does_not_overflow() {
        let n = 50_000;
        let mut b = Builder::new(1_000_000);
        let vars: Vec<u32> = (0..n).map(|v| b.variable(v).unwrap()).collect();
        let all = b.at_least(n as usize, &vars).unwrap();
        let any = b.at_least(1, &vars).unwrap();
        let mut nested = FAILS;
        for (i, &v) in vars.iter().enumerate().rev() {
            nested = b.at_least(1 + i % 2, &[nested, v]).unwrap();
        }
        // An operation that has to walk both chains to their ends.
        let both = b.choose(all, any, nested).unwrap();
        let q = Real::from(1e-6);
        let chances = vec![Chance::new(Real::ONE - q, q); n as usize];
        let d = b.finish(all);
        let series = chances.iter().fold(Chance::PERFECT, |a, &c| a.and(c));
        // 50,000 steps of 2^-100 each.
        close(d.evaluate(&chances)[d.root() as usize].fails(), series.fails(), 1e-24);
        assert!(b.finish(both).nodes().len() > 2);
    }

    #[test]
    fn the_limit_is_an_error_and_no_crash() {
        let mut b = Builder::new(20);
        let vars: Vec<u32> = (0..10).map(|v| b.variable(v).unwrap()).collect();
        assert_eq!(b.at_least(5, &vars), Err(TooLarge { limit: 20 }));
    }

    #[test]
    fn thresholds_have_the_known_size() {
        // At least k of n single variables: k (n - k + 1) nodes.
        let mut b = Builder::new(1000);
        let vars: Vec<u32> = (0..9).map(|v| b.variable(v).unwrap()).collect();
        for need in 1..=9 {
            let root = b.at_least(need, &vars).unwrap();
            assert_eq!(b.finish(root).nodes().len() - 2, need * (9 - need + 1));
        }
    }
}
