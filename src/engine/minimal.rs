//! Families of sets as zero-suppressed diagrams, and the minimal cut and path
//! sets of a decision diagram.
//!
//! Sources: S. Minato, "Zero-suppressed BDDs for set manipulation in
//! combinatorial problems", DAC 1993; A. Rauzy, "New algorithms for fault
//! trees analysis", Reliability Engineering and System Safety 40 (1993), for
//! minimal solutions and the operation `without`. From memory of both.

use super::diagram::{Branch, Builder, Diagram, FAILS, Memory, TooLarge, Unique, WORKS};
use crate::number::{Chance, Real};

/// The family without any set.
pub const EMPTY: u32 = 0;
/// The family whose only set is the empty one.
pub const UNIT: u32 = 1;

/// Cut sets or path sets.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Which {
    /// Sets whose failure fails the system.
    Cuts,
    /// Sets whose working keeps the system working.
    Paths,
}

/// A family of sets of variables. A node's `works` leads to the sets that
/// contain its variable, without it; `fails` to those that do not.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Family {
    nodes: Vec<Branch>,
    root: u32,
}

struct Sets {
    unique: Unique,
    memory: Memory,
}

enum Task {
    Visit(u32, u32),
    Then(u32),
    Make(u32, u32, u32),
}

impl Sets {
    fn branch(&mut self, variable: u32, without: u32, with: u32) -> Result<u32, TooLarge> {
        if with == EMPTY {
            return Ok(without);
        }
        self.unique.get(Branch { variable, fails: without, works: with })
    }

    /// The sets of `f` that include no set of `g`, which must be an antichain.
    fn without(&mut self, f: u32, g: u32) -> Result<u32, TooLarge> {
        let mut tasks = vec![Task::Visit(f, g)];
        let mut results: Vec<u32> = Vec::new();
        while let Some(task) = tasks.pop() {
            match task {
                Task::Visit(f, mut g) => {
                    // Sets of g with a variable above f's cannot lie within f's.
                    let top = self.unique.nodes[f as usize].variable;
                    while self.unique.nodes[g as usize].variable < top {
                        g = self.unique.nodes[g as usize].fails;
                    }
                    if f == EMPTY || g == UNIT || f == g {
                        results.push(EMPTY);
                        continue;
                    }
                    if g == EMPTY {
                        results.push(f);
                        continue;
                    }
                    if let Some(known) = self.memory.get([f, g, 0]) {
                        results.push(known);
                        continue;
                    }
                    let (a, b) = (self.unique.nodes[f as usize], self.unique.nodes[g as usize]);
                    tasks.push(Task::Make(top, f, g));
                    if b.variable == top {
                        tasks.push(Task::Then(b.fails));
                        tasks.push(Task::Visit(a.works, b.works));
                        tasks.push(Task::Visit(a.fails, b.fails));
                    } else {
                        tasks.push(Task::Visit(a.works, g));
                        tasks.push(Task::Visit(a.fails, g));
                    }
                }
                Task::Then(g) => {
                    let f = results.pop().unwrap_or(EMPTY);
                    tasks.push(Task::Visit(f, g));
                }
                Task::Make(top, f, g) => {
                    let with = results.pop().unwrap_or(EMPTY);
                    let without = results.pop().unwrap_or(EMPTY);
                    let made = self.branch(top, without, with)?;
                    self.memory.set([f, g, 0], made, self.unique.nodes.len());
                    results.push(made);
                }
            }
        }
        Ok(results.pop().unwrap_or(EMPTY))
    }
}

impl Family {
    /// The minimal cut or path sets of a diagram of a coherent system.
    ///
    /// # Errors
    /// If more than `limit` nodes are needed.
    pub fn minimal(diagram: &Diagram, which: Which, limit: usize) -> Result<Family, TooLarge> {
        let mut sets = Sets { unique: Unique::new(limit), memory: Memory::new() };
        let (fails, works) = match which {
            Which::Cuts => (UNIT, EMPTY),
            Which::Paths => (EMPTY, UNIT),
        };
        let mut made = vec![fails, works];
        for b in &diagram.nodes()[2..] {
            let (fails, works) = (made[b.fails as usize], made[b.works as usize]);
            let (given, otherwise) = match which {
                Which::Cuts => (fails, works),
                Which::Paths => (works, fails),
            };
            let with = sets.without(given, otherwise)?;
            made.push(sets.branch(b.variable, otherwise, with)?);
        }
        let (nodes, root) = sets.unique.under(made[diagram.root() as usize]);
        Ok(Family { nodes, root })
    }

    /// All nodes; the first two are [`EMPTY`] and [`UNIT`].
    pub fn nodes(&self) -> &[Branch] {
        &self.nodes
    }

    /// Where it begins.
    pub fn root(&self) -> u32 {
        self.root
    }

    /// For each of `variables` many variables: probability that all the rest
    /// of some set that contains it has failed, for cut sets with these
    /// chances.
    ///
    /// The sets that contain the variable are singled out and turned into a
    /// monotone diagram ("some of them has failed"), whose chance is taken.
    ///
    /// # Errors
    /// If more than `limit` nodes, or steps of that order, are needed.
    pub fn rests(&self, chances: &[Chance], limit: usize) -> Result<Vec<Real>, TooLarge> {
        if self.nodes.len().saturating_mul(chances.len()) > limit.saturating_mul(16) {
            return Err(TooLarge { limit });
        }
        let mut builder = Builder::new(limit);
        // For each node: the system of which the family's sets are the cuts.
        let mut whole = vec![WORKS, FAILS];
        for b in &self.nodes[2..] {
            let (with, without) = (whole[b.works as usize], whole[b.fails as usize]);
            let fails = builder.choose(with, without, FAILS)?;
            whole.push(builder.branch(b.variable, fails, without)?);
        }
        let mut rests = Vec::with_capacity(chances.len());
        let mut some = vec![WORKS; self.nodes.len()];
        let mut values = Vec::new();
        for variable in 0..chances.len() as u32 {
            // The same for the sets that contain the variable, taken out of them.
            for (at, b) in self.nodes.iter().enumerate().skip(2) {
                some[at] = if b.variable > variable {
                    WORKS
                } else if b.variable == variable {
                    whole[b.works as usize]
                } else {
                    let (with, without) = (some[b.works as usize], some[b.fails as usize]);
                    let fails = builder.choose(with, without, FAILS)?;
                    builder.branch(b.variable, fails, without)?
                };
            }
            builder.extend_values(chances, &mut values);
            rests.push(values[some[self.root as usize] as usize].fails());
        }
        Ok(rests)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_supply_shared_by_two_of_three_lanes() {
        // Variables: X, then A, B, C; works when X and two of A, B, C do.
        let mut b = Builder::new(1000);
        let v: Vec<u32> = (0..4).map(|v| b.variable(v).unwrap()).collect();
        let two = b.at_least(2, &v[1..]).unwrap();
        let root = b.at_least(2, &[v[0], two]).unwrap();
        let d = b.finish(root);
        let list = |which| {
            let f = Family::minimal(&d, which, 1000).unwrap();
            let mut sets: Vec<Vec<u32>> = Vec::new();
            let mut stack = vec![(f.root(), Vec::new())];
            while let Some((at, set)) = stack.pop() {
                if at == UNIT {
                    sets.push(set);
                } else if at != EMPTY {
                    let n = f.nodes()[at as usize];
                    stack.push((n.fails, set.clone()));
                    let mut with = set;
                    with.push(n.variable);
                    stack.push((n.works, with));
                }
            }
            sets.sort();
            sets
        };
        assert_eq!(list(Which::Cuts), vec![vec![0], vec![1, 2], vec![1, 3], vec![2, 3]]);
        assert_eq!(list(Which::Paths), vec![vec![0, 1, 2], vec![0, 1, 3], vec![0, 2, 3]]);
    }
}
