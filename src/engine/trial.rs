//! Random systems, and the same questions answered by brute force.

use crate::number::{Chance, Real};
use crate::system::{Node, NodeId, Structure};

/// A small generator of numbers that look random (Knuth's MMIX constants).
pub(super) struct Dice(u64);

impl Dice {
    pub(super) fn new(seed: u64) -> Dice {
        Dice(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) + 1)
    }

    /// 0 up to `sides`, without it.
    pub(super) fn below(&mut self, sides: usize) -> usize {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) as usize % sides
    }

    /// A chance, mostly with a small tail on either side.
    pub(super) fn chance(&mut self) -> Chance {
        let tail = Real::from(1 + self.below(999) as u32) / Real::from(10f64.powi(3 + self.below(9) as i32));
        let chance = Chance::new(Real::ONE - tail, tail);
        if self.below(4) == 0 { chance.flip() } else { chance }
    }

    /// A system of up to `leaves` things with shared nodes, repeated leaves,
    /// and k of n.
    pub(super) fn system(&mut self, leaves: usize) -> (Structure, NodeId) {
        let mut s = Structure::default();
        let mut open: Vec<NodeId> = (0..leaves).map(|l| s.leaf(l as u32)).collect();
        for _ in 0..self.below(3) {
            open.push(s.leaf(self.below(leaves) as u32));
        }
        let share = self.below(4);
        while open.len() > 1 {
            let count = (2 + self.below(3)).min(open.len());
            let mut members = Vec::new();
            for _ in 0..count {
                let at = self.below(open.len());
                // Keeping a node open lets it be used again.
                if share > 0 && self.below(8) < share && open.len() > 2 {
                    members.push(open[at]);
                } else {
                    members.push(open.swap_remove(at));
                }
            }
            let need = 1 + self.below(members.len()) as u32;
            let made = s.at_least(need, &members);
            open.push(made);
        }
        let root = open[0];
        (s, root)
    }

    /// A tree over `things` things in order, of which `repeated` have a second
    /// place within `near` of the first.
    pub(super) fn nest(&mut self, things: usize, repeated: usize, near: usize) -> (Structure, NodeId) {
        let mut s = Structure::default();
        let leaves: Vec<NodeId> = (0..things).map(|l| s.leaf(l as u32)).collect();
        let mut row: Vec<(usize, NodeId)> = leaves.iter().copied().enumerate().collect();
        for _ in 0..repeated {
            let leaf = self.below(things);
            let place = (leaf + self.below(2 * near + 1)).saturating_sub(near).min(things - 1);
            row.push((place, leaves[leaf]));
        }
        row.sort();
        let mut row: Vec<NodeId> = row.into_iter().map(|(_, id)| id).collect();
        while row.len() > 1 {
            let mut above = Vec::new();
            let mut rest = &row[..];
            while !rest.is_empty() {
                let (members, after) = rest.split_at((2 + self.below(3)).min(rest.len()));
                above.push(s.at_least(1 + self.below(members.len()) as u32, members));
                rest = after;
            }
            row = above;
        }
        (s, row[0])
    }
}

/// Whether the system works when exactly the things in `up` do.
pub(super) fn works(s: &Structure, root: NodeId, up: u32) -> bool {
    let mut values = Vec::with_capacity(s.len());
    for id in (0..=root.0).map(NodeId) {
        values.push(match s.node(id) {
            Node::Works => true,
            Node::Leaf(leaf) => up >> leaf & 1 == 1,
            Node::AtLeast { need, .. } => {
                let working = s.members(id).iter().filter(|m| values[m.0 as usize]).count();
                working >= need as usize
            }
            Node::Network { shape, .. } => {
                let members = s.members(id);
                s.shape(shape).works(|at| values[members[at as usize].0 as usize])
            }
        });
    }
    values[root.0 as usize]
}

/// Whether the system works, for each state of `n` things.
pub(super) fn table(s: &Structure, root: NodeId, n: usize) -> Vec<bool> {
    (0..1u32 << n).map(|up| works(s, root, up)).collect()
}

/// The chance of a function of states, by enumeration.
pub(super) fn enumerate(table: &[bool], chances: &[Chance]) -> Chance {
    let (mut works, mut fails) = (Real::ZERO, Real::ZERO);
    for (up, &good) in table.iter().enumerate() {
        let weight = chances
            .iter()
            .enumerate()
            .fold(Real::ONE, |w, (i, c)| w * if up >> i & 1 == 1 { c.works() } else { c.fails() });
        if good {
            works += weight;
        } else {
            fails += weight;
        }
    }
    Chance::new(works, fails)
}

/// All minimal cut sets (as bits), or path sets, by trying every set.
pub(super) fn minimal(table: &[bool], cuts: bool) -> Vec<u32> {
    let all = table.len() as u32 - 1;
    let hit = |set: u32| if cuts { !table[(all & !set) as usize] } else { table[set as usize] };
    (0..=all)
        .filter(|&set| hit(set))
        .filter(|&set| (0..32).all(|i| set >> i & 1 == 0 || !hit(set & !(1 << i))))
        .collect()
}

/// Asserts that two numbers agree to a relative tolerance.
#[track_caller]
pub(super) fn close(got: Real, want: Real, relative: f64) {
    let error = (got - want).abs();
    assert!(
        error <= want.abs() * Real::from(relative) || got == want,
        "{got:?} is not within {relative} of {want:?}"
    );
}
