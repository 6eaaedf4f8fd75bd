//! Minimal cut sets and minimal path sets: how many, of what order, and which
//! single things fail a system.
//!
//! Source: A. Rauzy, "New algorithms for fault trees analysis", Reliability
//! Engineering and System Safety 40 (1993), within groups that share things.
//! Between parts that share nothing the sets follow from the definition: the
//! minimal cut sets of "at least k of n" are those of any n - k + 1 members,
//! one of each put together; the minimal path sets those of any k. So they are
//! counted without being listed, by sums, products and elementary symmetric
//! polynomials. Listing them is in [`super::listing`].

use super::diagram::{FAILS, TooLarge, WORKS};
use super::minimal::{EMPTY, Family, UNIT, Which};
use super::modules::NONE;
use super::plan::{Block, BlockId, Plan};
use dashu_int::UBig;
use std::collections::BTreeMap;

/// The minimal cut sets, or path sets, of a planned system.
#[derive(Clone, Debug)]
pub struct Minimal<'a> {
    pub(super) plan: &'a Plan,
    pub(super) which: Which,
    families: BTreeMap<BlockId, Family>,
    nodes: usize,
    /// The fewest and the most things in a set of each main block; (NONE, 0)
    /// where there is no set.
    pub(super) orders: Vec<(u64, u64)>,
}

/// The order of a set that does not exist.
pub(super) const NEVER: u64 = NONE as u64;

impl<'a> Minimal<'a> {
    /// Prepares the sets; only groups that share things take time.
    ///
    /// # Errors
    /// If the sets within one group need more than `nodes` nodes.
    pub fn new(plan: &'a Plan, which: Which, nodes: usize) -> Result<Minimal<'a>, TooLarge> {
        let mut sets = Minimal { plan, which, families: BTreeMap::new(), nodes, orders: Vec::new() };
        for id in plan.blocks() {
            if let Some(group) = plan.group(id) {
                sets.families.insert(id, Family::minimal(group.diagram()?, which, nodes)?);
            }
            let orders = sets.orders_of(id);
            sets.orders.push(orders);
        }
        Ok(sets)
    }

    /// The sets of a group, over the positions of its frontier.
    pub fn family(&self, id: BlockId) -> Option<&Family> {
        self.families.get(&id)
    }

    /// Of how many members of an independent block a set takes its things.
    pub(super) fn taken(&self, need: u32, members: usize) -> usize {
        match self.which {
            Which::Cuts => members - need as usize + 1,
            Which::Paths => need as usize,
        }
    }

    fn orders_of(&self, id: BlockId) -> (u64, u64) {
        let never = (NEVER, 0);
        let of = |b: &BlockId| self.orders[b.0 as usize];
        if self.plan.is_case(id) {
            return never;
        }
        if let Some(family) = self.family(id) {
            let parts = self.plan.parts(id);
            let mut orders = vec![never, (0, 0)];
            for b in &family.nodes()[2..] {
                let own = of(&parts[b.variable as usize]);
                let (with, without) = (orders[b.works as usize], orders[b.fails as usize]);
                let with = (own.0 + with.0, own.1 + with.1);
                orders.push((with.0.min(without.0), with.1.max(without.1)));
            }
            return orders[family.root() as usize];
        }
        match self.plan.block(id) {
            Block::Leaf(_) => (1, 1),
            Block::Works if self.which == Which::Paths => (0, 0),
            Block::Independent { need, .. } => {
                let members = self.plan.members(id);
                let taken = self.taken(need, members.len());
                let (mut least, mut most): (Vec<u64>, Vec<u64>) = members.iter().map(of).unzip();
                least.sort_unstable();
                most.sort_unstable_by(|a, b| b.cmp(a));
                (least[..taken].iter().sum(), most[..taken].iter().sum())
            }
            _ => never,
        }
    }

    /// The fewest and the most things in one set; nothing if there is no set.
    pub fn orders(&self) -> Option<(u64, u64)> {
        let orders = self.orders[self.plan.root().0 as usize];
        (orders.0 != NEVER).then_some(orders)
    }

    /// How many sets there are, exactly.
    ///
    /// # Errors
    /// If a k of n of very many members that differ in their number of sets
    /// would need too many large numbers.
    pub fn count(&self) -> Result<UBig, TooLarge> {
        // Blocks form a tree, so each count is taken over by the one above.
        let mut counts: Vec<UBig> = Vec::with_capacity(self.plan.len());
        for id in self.plan.blocks() {
            let take = |counts: &mut Vec<UBig>| -> Vec<UBig> {
                let parts = self.plan.parts(id);
                parts.iter().map(|b| std::mem::take(&mut counts[b.0 as usize])).collect()
            };
            let count = if self.plan.is_case(id) {
                UBig::ZERO
            } else if let Some(family) = self.family(id) {
                weigh(family, &take(&mut counts))
            } else {
                match self.plan.block(id) {
                    Block::Leaf(_) => UBig::ONE,
                    Block::Works if self.which == Which::Paths => UBig::ONE,
                    Block::Independent { need, .. } => {
                        let of = take(&mut counts);
                        let taken = self.taken(need, of.len());
                        choose(of, taken, self.nodes)?
                    }
                    _ => UBig::ZERO,
                }
            };
            counts.push(count);
        }
        Ok(std::mem::take(&mut counts[self.plan.root().0 as usize]))
    }
}

/// The number of sets of a family, each variable standing for so many.
fn weigh(family: &Family, weights: &[UBig]) -> UBig {
    let mut counts = vec![UBig::ZERO, UBig::ONE];
    debug_assert_eq!((EMPTY, UNIT), (0, 1));
    for b in &family.nodes()[2..] {
        let with = &weights[b.variable as usize] * &counts[b.works as usize];
        let all = with + &counts[b.fails as usize];
        counts.push(all);
    }
    std::mem::take(&mut counts[family.root() as usize])
}

/// The product, by halves: the factors of each multiplication are alike in
/// size, which is what makes large ones quick.
fn product(mut factors: Vec<UBig>) -> UBig {
    while factors.len() > 1 {
        factors = factors.chunks(2).map(|pair| pair.iter().product()).collect();
    }
    factors.pop().unwrap_or(UBig::ONE)
}

/// Ways to choose `k` of `n`.
fn binomial(n: usize, k: usize) -> UBig {
    let k = k.min(n - k);
    let over = product((n - k + 1..=n).map(UBig::from).collect());
    over / product((1..=k).map(UBig::from).collect())
}

/// Sum over all choices of `taken` of the counts of their product: the
/// elementary symmetric polynomial. Equal counts are taken together.
fn choose(mut counts: Vec<UBig>, taken: usize, limit: usize) -> Result<UBig, TooLarge> {
    if taken == counts.len() {
        return Ok(product(counts));
    }
    if taken == 1 {
        return Ok(counts.iter().sum());
    }
    counts.sort_unstable();
    if counts[0] == counts[counts.len() - 1] {
        return Ok(binomial(counts.len(), taken) * counts[0].pow(taken));
    }
    if counts.len().saturating_mul(taken) > limit {
        return Err(TooLarge { limit });
    }
    let mut sums = vec![UBig::ONE];
    for run in counts.chunk_by(|a, b| a == b) {
        // Coefficients of (1 + c x)^n, each from the last.
        let mut term = UBig::ONE;
        let mut terms = vec![UBig::ONE];
        for j in 1..=run.len().min(taken) {
            term = term * UBig::from(run.len() - j + 1) / UBig::from(j);
            terms.push(&term * run[0].pow(j));
        }
        let mut next = vec![UBig::ZERO; (sums.len() + terms.len() - 1).min(taken + 1)];
        for (i, a) in sums.iter().enumerate() {
            for (j, b) in terms.iter().enumerate().take(taken + 1 - i) {
                next[i + j] += a * b;
            }
        }
        sums = next;
    }
    Ok(sums.pop().unwrap_or_default())
}

/// The things each of which fails the system on its own, in rising order:
/// the cut sets of order one. It takes one walk down and no cut sets.
pub fn single_points(plan: &Plan) -> Vec<u32> {
    let mut single = vec![false; plan.len()];
    single[plan.root().0 as usize] = true;
    let mut leaves = Vec::new();
    for id in plan.blocks().rev() {
        if !single[id.0 as usize] {
            continue;
        }
        if let Some(group) = plan.group(id)
            && let Some(network) = &group.network
        {
            for (at, part) in group.frontier.iter().enumerate() {
                if !network.works(|thing| thing as usize != at) {
                    single[part.0 as usize] = true;
                }
            }
            continue;
        }
        if let Some(group) = plan.group(id)
            && let Ok(diagram) = group.diagram()
        {
            // Along the way on which all works: what fails at once there does
            // so whatever else works, since no system is hurt by a part that works.
            let mut at = diagram.root();
            while at != FAILS && at != WORKS {
                let b = diagram.nodes()[at as usize];
                if b.fails == FAILS {
                    single[group.frontier[b.variable as usize].0 as usize] = true;
                }
                at = b.works;
            }
            continue;
        }
        match plan.block(id) {
            Block::Leaf(leaf) => leaves.push(leaf),
            Block::Independent { need, .. } => {
                let members = plan.members(id);
                if need as usize == members.len() {
                    members.iter().for_each(|m| single[m.0 as usize] = true);
                }
            }
            _ => {}
        }
    }
    leaves.sort_unstable();
    leaves
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::plan::Options;
    use crate::engine::trial::{Dice, minimal, table};
    use crate::system::{NodeId, Structure};

    #[test]
    fn counts_and_single_points_equal_brute_force() {
        for seed in 0..300 {
            let mut dice = Dice::new(seed);
            let n = 2 + dice.below(10);
            let (s, top) = dice.system(n);
            let table = table(&s, top, n);
            for cases in [1, 16] {
                let options = Options { cases, ..Options::default() };
                let plan = Plan::with(&s, top, options).unwrap();
                for which in [Which::Cuts, Which::Paths] {
                    let want = minimal(&table, which == Which::Cuts);
                    let sets = Minimal::new(&plan, which, 100_000).unwrap();
                    assert_eq!(sets.count().unwrap(), UBig::from(want.len()));
                    let orders = want.iter().map(|set| u64::from(set.count_ones()));
                    assert_eq!(sets.orders().map(|o| o.0), orders.clone().min());
                    assert_eq!(sets.orders().map(|o| o.1), orders.max());
                }
                let singles: Vec<u32> = (minimal(&table, true).into_iter())
                    .filter(|set| set.count_ones() == 1)
                    .map(u32::trailing_zeros)
                    .collect();
                assert_eq!(single_points(&plan), singles);
            }
        }
    }

    #[test]
    fn counts_need_no_listing() {
        // 40 pairs of pairs in parallel: 2^40 cut sets; a 500 of 1000 besides.
        let mut s = Structure::default();
        let leaves: Vec<NodeId> = (0..1080).map(|l| s.leaf(l)).collect();
        let pairs: Vec<NodeId> = leaves[..80].chunks(2).map(|p| s.at_least(2, p)).collect();
        let many = s.at_least(1, &pairs);
        let half = s.at_least(500, &leaves[80..]);
        let top = s.at_least(2, &[many, half]);
        let plan = Plan::new(&s, top).unwrap();
        let cuts = Minimal::new(&plan, Which::Cuts, 1000).unwrap();
        let want = (UBig::ONE << 40) + binomial(1000, 501);
        assert_eq!(cuts.count().unwrap(), want);
        assert_eq!(cuts.orders(), Some((40, 501)));
    }

    #[test]
    fn unlike_members_follow_the_symmetric_polynomial() {
        let counts: Vec<UBig> = [2u32, 3, 3, 5].map(UBig::from).to_vec();
        // 2*3*2 + 2*5 + 3*3 + 3*5*2 over pairs.
        assert_eq!(choose(counts.clone(), 2, 1000), Ok(UBig::from(61u32)));
        assert_eq!(choose(counts, 2, 7), Err(TooLarge { limit: 7 }));
    }
}
