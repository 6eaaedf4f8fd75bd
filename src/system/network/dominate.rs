//! Which stops every way passes.
//!
//! Source: K. D. Cooper, T. J. Harvey, K. Kennedy, "A simple, fast dominance
//! algorithm" (2001), from memory: immediate dominators by passes over the
//! stops in reverse postorder until nothing changes.

use super::NONE;

/// The dominator tree of what is reached from one stop.
pub struct Dominators {
    /// The next stop above that every way to this one passes; the root's is
    /// itself, and [`NONE`] stands where no way leads.
    pub above: Vec<u32>,
    /// When a walk over the tree comes to each stop; those above come first.
    pub enter: Vec<u32>,
    leave: Vec<u32>,
}

impl Dominators {
    /// Of the stops reached from `root` over `out`.
    pub fn new(out: &[Vec<u32>], into: &[Vec<u32>], root: u32) -> Dominators {
        let order = postorder(out, root);
        let mut rank = vec![NONE; out.len()];
        for (i, &at) in order.iter().enumerate() {
            rank[at as usize] = i as u32;
        }
        let mut above = vec![NONE; out.len()];
        above[root as usize] = root;
        let mut changed = true;
        while changed {
            changed = false;
            for &at in order.iter().rev().filter(|&&at| at != root) {
                let mut new = NONE;
                for &from in into[at as usize].iter().filter(|&&f| above[f as usize] != NONE) {
                    new = if new == NONE { from } else { meet(&above, &rank, new, from) };
                }
                if above[at as usize] != new {
                    above[at as usize] = new;
                    changed = true;
                }
            }
        }
        let (enter, leave) = dates(&above, &order, root);
        Dominators { above, enter, leave }
    }

    /// Whether every way to `below` passes `top`; false where no way leads to
    /// either.
    pub fn dominates(&self, top: u32, below: u32) -> bool {
        let (t, b) = (top as usize, below as usize);
        self.above[t] != NONE
            && self.above[b] != NONE
            && self.enter[t] <= self.enter[b]
            && self.leave[b] <= self.leave[t]
    }

    /// From a stop up to the root, both with it.
    pub fn chain(&self, mut at: u32) -> Vec<u32> {
        let mut chain = vec![at];
        while self.above[at as usize] != at && self.above[at as usize] != NONE {
            at = self.above[at as usize];
            chain.push(at);
        }
        chain
    }
}

/// The lowest stop above both; a stop above another has the higher rank.
fn meet(above: &[u32], rank: &[u32], mut a: u32, mut b: u32) -> u32 {
    while a != b {
        while rank[a as usize] < rank[b as usize] {
            a = above[a as usize];
        }
        while rank[b as usize] < rank[a as usize] {
            b = above[b as usize];
        }
    }
    a
}

fn postorder(out: &[Vec<u32>], root: u32) -> Vec<u32> {
    let mut order = Vec::new();
    let mut seen = vec![false; out.len()];
    seen[root as usize] = true;
    let mut stack = vec![(root, 0usize)];
    while let Some((at, next)) = stack.pop() {
        match out[at as usize].get(next) {
            Some(&to) => {
                stack.push((at, next + 1));
                if !seen[to as usize] {
                    seen[to as usize] = true;
                    stack.push((to, 0));
                }
            }
            None => order.push(at),
        }
    }
    order
}

/// When a walk over the tree enters and leaves each stop.
fn dates(above: &[u32], order: &[u32], root: u32) -> (Vec<u32>, Vec<u32>) {
    let mut below: Vec<Vec<u32>> = vec![Vec::new(); above.len()];
    for &at in order.iter().filter(|&&at| at != root) {
        below[above[at as usize] as usize].push(at);
    }
    let (mut enter, mut leave) = (vec![0; above.len()], vec![0; above.len()]);
    let mut time = 0;
    let mut stack = vec![(root, false)];
    while let Some((at, done)) = stack.pop() {
        time += 1;
        if done {
            leave[at as usize] = time;
        } else {
            enter[at as usize] = time;
            stack.push((at, true));
            stack.extend(below[at as usize].iter().map(|&b| (b, false)));
        }
    }
    (enter, leave)
}
