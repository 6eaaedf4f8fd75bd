//! The best subsets of things that stand side by side in a k of n.
//!
//! Source: the order on subsets is that of Young's lattice; that the best of
//! them are found by going from each one to its children, with the open ones
//! in a heap, follows E. L. Lawler, "A procedure for computing the K best
//! solutions to discrete optimization problems", Management Science 18 (1972).
//! From memory.

use super::listing::{Entry, Lister, Table, TooMuch};
use std::cmp::Reverse;
use std::collections::BinaryHeap;

impl Lister<'_> {
    /// [`Lister::choose`] where each part is one set and all are of one order,
    /// as in a k of n of things: the best so many subsets, from the best one
    /// on, without a look at parts that are in none of them.
    ///
    /// With the parts sorted, a subset is told by how far its last, its last
    /// but one, ... member lies behind its place in the best subset: a list
    /// that never rises. Its children have the last entry increased by one, or
    /// a 1 added; so each subset has one parent, which is no worse.
    pub(super) fn alike(
        &mut self,
        parts: &[Table],
        taken: usize,
        cap: u64,
    ) -> Result<Option<Table>, TooMuch> {
        let mut items = Vec::with_capacity(parts.len());
        let mut order = None;
        for part in parts {
            let Some((&own, [entry])) = part.iter().next().map(|(o, e)| (o, &e[..])) else {
                return Ok(None);
            };
            if part.len() > 1 || *order.get_or_insert(own) != own {
                return Ok(None);
            }
            items.push(*entry);
        }
        let order = order.unwrap_or(0) * taken as u64;
        if order > cap {
            return Ok(Some(Table::new()));
        }
        self.spend(items.len())?;
        items.sort_by(|a, b| self.compare(a, b));
        // The first j items together.
        let mut heads = self.unit().into_values().flatten().collect::<Vec<Entry>>();
        for item in &items[..taken] {
            let last = heads[heads.len() - 1];
            let joined = self.both(&last, item);
            heads.push(joined);
        }
        let room = items.len() - taken;
        let size = 1 + (order / 32) as usize;
        // Chances are not negative, so their bits are in the order of their values.
        let rank = |lister: &Self, e: &Entry| (e.chance.hi().to_bits(), Reverse(lister.expand(e.piece)));
        let mut made = vec![(heads[taken], Vec::<usize>::new())];
        let mut open = BinaryHeap::from([(rank(self, &heads[taken]), 0)]);
        let mut found = Vec::new();
        while let Some((_, at)) = open.pop() {
            let (entry, behind) = std::mem::replace(&mut made[at], (heads[0], Vec::new()));
            found.push(entry);
            if found.len() >= self.keep {
                break;
            }
            let mut children = Vec::new();
            if let [.., last] = behind[..] {
                let limit = if behind.len() > 1 { behind[behind.len() - 2] } else { room };
                if last < limit {
                    let mut child = behind.clone();
                    child[behind.len() - 1] += 1;
                    children.push(child);
                }
            }
            if behind.len() < taken && room > 0 {
                let mut child = behind;
                child.push(1);
                children.push(child);
            }
            for child in children {
                self.spend(child.len() + size)?;
                let mut entry = heads[taken - child.len()];
                for (i, by) in child.iter().enumerate() {
                    entry = self.both(&entry, &items[taken - 1 - i + by]);
                }
                open.push((rank(self, &entry), made.len()));
                made.push((entry, child));
            }
        }
        Ok(Some(Table::from([(order, found)])))
    }
}

#[cfg(test)]
mod tests {
    use crate::engine::cuts::Minimal;
    use crate::engine::listing::{CutBy, Limits};
    use crate::engine::minimal::Which;
    use crate::engine::plan::Plan;
    use crate::number::{Chance, Real};
    use crate::system::{NodeId, Structure};

    #[test]
    fn large_k_of_n_lists_in_order_among_equals() {
        let mut s = Structure::default();
        let leaves: Vec<NodeId> = (0..2000).map(|l| s.leaf(l)).collect();
        let top = s.at_least(1900, &leaves);
        let q = Real::from(0.001);
        let chances = vec![Chance::new(Real::ONE - q, q); 2000];
        let plan = Plan::new(&s, top).unwrap();
        for (which, size) in [(Which::Cuts, 101), (Which::Paths, 1900)] {
            let sets = Minimal::new(&plan, which, 1000).unwrap();
            let list = sets.list(&chances, Limits { first: 1000, ..Limits::default() });
            assert_eq!((list.sets.len(), list.cut_by), (1000, Some(CutBy::First)));
            assert!(list.sets.is_sorted());
            assert!(list.sets.iter().all(|set| set.len() == size));
        }
    }
}
