//! Lists minimal cut or path sets, the smallest first and then the likeliest,
//! without making those that are not asked for.
//!
//! The method is dynamic programming over the blocks of a plan: for each block
//! and each order, the best so many sets. The probability of a set is the
//! product over its things, and parts share nothing, so the best sets of a
//! block are made of the best sets of its parts; cutting each list to the
//! number asked for loses none of them. Orders are let in step by step, until
//! there are enough sets. The cut-off by order is the one usual for fault
//! trees (W. E. Vesely et al., "Fault Tree Handbook", NUREG-0492, 1981).

use super::cuts::{Minimal, NEVER};
use super::minimal::Which;
use super::plan::{Block, BlockId};
use crate::number::{Chance, Real};
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// How much to list.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Limits {
    /// The most things in one set.
    pub order: Option<u64>,
    /// The most sets.
    pub first: usize,
    /// The most partial sets made on the way.
    pub work: usize,
}

impl Default for Limits {
    fn default() -> Limits {
        Limits { order: None, first: 1000, work: 5_000_000 }
    }
}

/// Which limit left sets out.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum CutBy {
    /// There are sets of a higher order.
    Order,
    /// There are more than the number asked for.
    First,
    /// The work to find more was too much; all sets up to this order are
    /// listed (and no more than the number asked for).
    Work {
        /// The highest order that is complete; 0 for none.
        complete: u64,
    },
}

/// Sets of things, by rising order, then falling probability, then numbers.
#[derive(Clone, PartialEq, Debug)]
pub struct Sets {
    /// The things of each set, in rising order.
    pub sets: Vec<Vec<u32>>,
    /// The probability that all of a cut set has failed, or that all of a path
    /// set works.
    pub chances: Vec<Real>,
    /// Which limit left sets out; nothing if all are listed.
    pub cut_by: Option<CutBy>,
}

/// One set while it is put together: its things are a tree in a common list.
#[derive(Clone, Copy)]
pub(super) struct Entry {
    pub(super) chance: Real,
    first: u32,
    pub(super) piece: u32,
}

/// The best sets of each order, best first.
pub(super) type Table = BTreeMap<u64, Vec<Entry>>;

#[derive(Clone, Copy)]
enum Piece {
    Empty,
    Leaf(u32),
    Both(u32, u32),
}

/// The limit on work is reached.
pub(super) struct TooMuch;

pub(super) struct Lister<'a> {
    sets: &'a Minimal<'a>,
    chances: &'a [Chance],
    /// One more than asked for, to tell whether there are more.
    pub(super) keep: usize,
    work: usize,
    pieces: Vec<Piece>,
}

impl Minimal<'_> {
    /// Lists sets up to the limits; `chances` by the number of the thing.
    ///
    /// Two probabilities whose nearest doubles are the same count as equal, so
    /// that sets of like things come in the order of their numbers.
    pub fn list(&self, chances: &[Chance], limits: Limits) -> Sets {
        let none = |cut_by| Sets { sets: Vec::new(), chances: Vec::new(), cut_by };
        let Some((least, most)) = self.orders() else { return none(None) };
        let highest = limits.order.map_or(most, |order| order.min(most));
        if highest < least {
            return none(Some(CutBy::Order));
        }
        let mut lister = Lister {
            sets: self,
            chances,
            keep: limits.first.saturating_add(1),
            work: limits.work,
            pieces: Vec::new(),
        };
        let mut best = none(None);
        let (mut order, mut step, mut complete) = (least, 1, 0);
        loop {
            let Ok(table) = lister.run(order) else {
                best.cut_by = Some(CutBy::Work { complete });
                return best;
            };
            best = lister.finish(table, limits.first);
            if best.cut_by.is_some() {
                return best;
            }
            if order == highest {
                best.cut_by = (highest < most).then_some(CutBy::Order);
                return best;
            }
            complete = order;
            order = (order + step).min(highest);
            step *= 2;
        }
    }
}

impl Lister<'_> {
    pub(super) fn spend(&mut self, work: usize) -> Result<(), TooMuch> {
        self.work = self.work.checked_sub(work).ok_or(TooMuch)?;
        Ok(())
    }

    fn piece(&mut self, piece: Piece) -> u32 {
        self.pieces.push(piece);
        self.pieces.len() as u32 - 1
    }

    pub(super) fn both(&mut self, a: &Entry, b: &Entry) -> Entry {
        let piece = self.piece(Piece::Both(a.piece, b.piece));
        Entry { chance: a.chance * b.chance, first: a.first.min(b.first), piece }
    }

    pub(super) fn expand(&self, piece: u32) -> Vec<u32> {
        let mut set = Vec::new();
        let mut stack = vec![piece];
        while let Some(at) = stack.pop() {
            match self.pieces[at as usize] {
                Piece::Empty => {}
                Piece::Leaf(leaf) => set.push(leaf),
                Piece::Both(a, b) => stack.extend([a, b]),
            }
        }
        set.sort_unstable();
        set
    }

    /// The better of two sets of the same order comes first. Which of two sets
    /// has the lower numbers does not change when both get the same addition,
    /// as the least thing in only one of them decides.
    pub(super) fn compare(&self, a: &Entry, b: &Entry) -> Ordering {
        (b.chance.hi().total_cmp(&a.chance.hi())).then(a.first.cmp(&b.first)).then_with(|| {
            match a.piece == b.piece {
                true => Ordering::Equal,
                false => self.expand(a.piece).cmp(&self.expand(b.piece)),
            }
        })
    }

    fn best(&mut self, mut table: Table) -> Result<Table, TooMuch> {
        for (&order, entries) in &mut table {
            if entries.len() > 1 {
                // Ties between large sets are settled thing by thing.
                self.spend(entries.len() * (order / 32) as usize)?;
                entries.sort_by(|a, b| self.compare(a, b));
                entries.truncate(self.keep);
            }
        }
        Ok(table)
    }

    /// The best sets of the whole system up to an order.
    fn run(&mut self, order: u64) -> Result<Table, TooMuch> {
        self.pieces.clear();
        let plan = self.sets.plan;
        let allowed = self.allowed(order);
        let mut tables: Vec<Table> = vec![Table::new(); plan.len()];
        for id in plan.blocks() {
            let at = id.0 as usize;
            let Some(cap) = allowed[at] else { continue };
            let parts: Vec<Table> =
                (plan.parts(id).iter()).map(|b| std::mem::take(&mut tables[b.0 as usize])).collect();
            self.spend(1 + parts.len())?;
            tables[at] = if self.sets.family(id).is_some() {
                self.family(id, &parts, cap)?
            } else {
                match plan.block(id) {
                    Block::Leaf(leaf) => self.leaf(leaf),
                    Block::Works => self.unit(),
                    Block::Independent { need, .. } => {
                        let taken = self.sets.taken(need, parts.len());
                        self.choose(parts, taken, cap)?
                    }
                    _ => Table::new(),
                }
            };
        }
        Ok(std::mem::take(&mut tables[plan.root().0 as usize]))
    }

    /// The highest order of a set of each block that can still be part of a
    /// set of the system within `order`; nothing where none can.
    fn allowed(&self, order: u64) -> Vec<Option<u64>> {
        let plan = self.sets.plan;
        let orders = &self.sets.orders;
        let least = |b: BlockId| orders[b.0 as usize].0;
        let mut allowed = vec![None; plan.len()];
        allowed[plan.root().0 as usize] = Some(order);
        for id in plan.blocks().rev() {
            let Some(cap) = allowed[id.0 as usize] else { continue };
            let parts = plan.parts(id);
            // With each part, the least that must come from the other parts.
            let others: Vec<u64> = if let Some(family) = self.sets.family(id) {
                let mut up = vec![NEVER, 0];
                for b in &family.nodes()[2..] {
                    let with = least(parts[b.variable as usize]) + up[b.works as usize];
                    up.push(with.min(up[b.fails as usize]));
                }
                let mut down = vec![NEVER; up.len()];
                let mut others = vec![NEVER; parts.len()];
                down[family.root() as usize] = 0;
                for (at, b) in family.nodes().iter().enumerate().skip(2).rev() {
                    let variable = b.variable as usize;
                    let with = down[at] + least(parts[variable]);
                    others[variable] = others[variable].min(down[at] + up[b.works as usize]);
                    down[b.works as usize] = down[b.works as usize].min(with);
                    down[b.fails as usize] = down[b.fails as usize].min(down[at]);
                }
                others
            } else if let Block::Independent { need, .. } = plan.block(id) {
                let taken = self.sets.taken(need, parts.len());
                let mut sorted: Vec<u64> = parts.iter().map(|&b| least(b)).collect();
                sorted.sort_unstable();
                let all: u64 = sorted[..taken].iter().sum();
                let last = sorted[taken - 1];
                parts.iter().map(|&b| if least(b) <= last { all - least(b) } else { all - last }).collect()
            } else {
                continue;
            };
            for (&part, others) in parts.iter().zip(others) {
                allowed[part.0 as usize] = cap.checked_sub(others).filter(|&cap| cap >= least(part));
            }
        }
        allowed
    }

    fn leaf(&mut self, leaf: u32) -> Table {
        let chance = self.chances.get(leaf as usize).copied().unwrap_or(Chance::HOPELESS);
        let chance = match self.sets.which {
            Which::Cuts => chance.fails(),
            Which::Paths => chance.works(),
        };
        let piece = self.piece(Piece::Leaf(leaf));
        Table::from([(1, vec![Entry { chance, first: leaf, piece }])])
    }

    pub(super) fn unit(&mut self) -> Table {
        let piece = self.piece(Piece::Empty);
        Table::from([(0, vec![Entry { chance: Real::ONE, first: u32::MAX, piece }])])
    }

    /// Adds to `into` each set of `a` together with each of `b`, as far as the
    /// best so many can be among them: the i-th with the j-th has i j - 1
    /// others before it.
    fn join(&mut self, a: &Table, b: &Table, cap: u64, into: &mut Table) -> Result<(), TooMuch> {
        for (&x, left) in a {
            for (&y, right) in b.range(..=cap.saturating_sub(x)) {
                if x + y > cap {
                    break;
                }
                let mut made = Vec::new();
                for (i, l) in left.iter().enumerate() {
                    let most = (self.keep / (i + 1)).min(right.len());
                    if most == 0 {
                        break;
                    }
                    self.spend(most)?;
                    for r in &right[..most] {
                        made.push(self.both(l, r));
                    }
                }
                into.entry(x + y).or_default().extend(made);
            }
        }
        Ok(())
    }

    /// Sets that take one set each of any `taken` of the parts.
    fn choose(&mut self, mut parts: Vec<Table>, taken: usize, cap: u64) -> Result<Table, TooMuch> {
        if taken == 1 {
            // The largest is kept as it is and the others are added to it.
            let size = |t: &Table| t.values().map(Vec::len).sum::<usize>();
            let largest = (0..parts.len()).max_by_key(|&i| (size(&parts[i]), usize::MAX - i));
            let mut all = largest.map(|i| std::mem::take(&mut parts[i])).unwrap_or_default();
            all.retain(|&order, _| order <= cap);
            for part in parts {
                self.spend(size(&part))?;
                for (order, entries) in part.into_iter().filter(|p| p.0 <= cap) {
                    all.entry(order).or_default().extend(entries);
                }
            }
            return self.best(all);
        }
        if taken == parts.len() {
            let mut all = self.unit();
            for part in &parts {
                let mut next = Table::new();
                self.join(&all, part, cap, &mut next)?;
                all = self.best(next)?;
            }
            return Ok(all);
        }
        if let Some(table) = self.alike(&parts, taken, cap)? {
            return Ok(table);
        }
        // rows[r]: sets that take r of the parts seen so far.
        let mut rows = vec![Table::new(); taken + 1];
        rows[0] = self.unit();
        let count = parts.len();
        for (seen, part) in parts.iter().enumerate() {
            let lowest = (taken + seen + 1).saturating_sub(count).max(1);
            for r in (lowest..=taken.min(seen + 1)).rev() {
                self.spend(1)?;
                // Each of the parts still to come adds one thing at least.
                let Some(cap) = cap.checked_sub((taken - r) as u64) else { continue };
                let mut row = std::mem::take(&mut rows[r]);
                self.join(&rows[r - 1], part, cap, &mut row)?;
                rows[r] = self.best(row)?;
            }
        }
        Ok(rows.pop().unwrap_or_default())
    }

    /// The sets of a group: a family of sets of its parts.
    fn family(&mut self, id: BlockId, parts: &[Table], cap: u64) -> Result<Table, TooMuch> {
        let sets = self.sets;
        let Some(family) = sets.family(id) else { return Ok(Table::new()) };
        let mut tables = vec![Table::new(), self.unit()];
        for b in &family.nodes()[2..] {
            let mut table = tables[b.fails as usize].clone();
            self.spend(1 + table.values().map(Vec::len).sum::<usize>())?;
            let with = &parts[b.variable as usize];
            self.join(with, &tables[b.works as usize], cap, &mut table)?;
            let table = self.best(table)?;
            tables.push(table);
        }
        Ok(std::mem::take(&mut tables[family.root() as usize]))
    }

    fn finish(&self, table: Table, first: usize) -> Sets {
        let mut found = Sets { sets: Vec::new(), chances: Vec::new(), cut_by: None };
        for entry in table.into_values().flatten() {
            if found.sets.len() == first {
                found.cut_by = Some(CutBy::First);
                break;
            }
            found.sets.push(self.expand(entry.piece));
            found.chances.push(entry.chance);
        }
        found
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::plan::{Options, Plan};
    use crate::engine::trial::{Dice, close, minimal, table};
    use crate::system::{NodeId, Structure};

    fn bits(set: u32) -> Vec<u32> {
        (0..32).filter(|i| set >> i & 1 == 1).collect()
    }

    #[test]
    fn lists_equal_brute_force_in_order() {
        for seed in 0..300 {
            let mut dice = Dice::new(seed);
            let n = 2 + dice.below(10);
            let (s, top) = dice.system(n);
            // Few distinct chances, so that there are ties.
            let kinds = [dice.chance(), dice.chance()];
            let chances: Vec<Chance> = (0..n).map(|_| kinds[dice.below(2)]).collect();
            let table = table(&s, top, n);
            let options = Options { cases: 1 + 15 * (seed as usize % 2), ..Options::default() };
            let plan = Plan::with(&s, top, options).unwrap();
            for which in [Which::Cuts, Which::Paths] {
                let value = |set: &Vec<u32>| {
                    set.iter()
                        .map(|&l| chances[l as usize])
                        .fold(Real::ONE, |p, c| p * if which == Which::Cuts { c.fails() } else { c.works() })
                };
                let mut want: Vec<Vec<u32>> =
                    minimal(&table, which == Which::Cuts).into_iter().map(bits).collect();
                want.sort_by(|a, b| {
                    let falling = value(b).hi().total_cmp(&value(a).hi());
                    a.len().cmp(&b.len()).then(falling).then(a.cmp(b))
                });
                let sets = Minimal::new(&plan, which, 100_000).unwrap();
                let all = sets.list(&chances, Limits::default());
                assert_eq!((&all.sets, all.cut_by), (&want, None));
                for (set, &chance) in all.sets.iter().zip(&all.chances) {
                    close(chance, value(set), 1e-28);
                }
                for first in [1, 3, 7] {
                    let some = sets.list(&chances, Limits { first, ..Limits::default() });
                    assert_eq!(some.sets, want[..first.min(want.len())]);
                    assert_eq!(some.cut_by == Some(CutBy::First), first < want.len());
                }
                let order = Some(2);
                let some = sets.list(&chances, Limits { order, ..Limits::default() });
                want.retain(|set| set.len() <= 2);
                assert_eq!(some.sets, want);
                assert_eq!(some.cut_by == Some(CutBy::Order), want.len() < all.sets.len());
            }
        }
    }

    fn alike(n: usize) -> Vec<Chance> {
        let q = Real::from(0.001);
        vec![Chance::new(Real::ONE - q, q); n]
    }

    #[test]
    fn the_first_of_very_many_are_quick() {
        // 40 pairs in parallel in series with 500 of 1000: 2^40 cuts of order 40.
        let mut s = Structure::default();
        let leaves: Vec<NodeId> = (0..1080).map(|l| s.leaf(l)).collect();
        let pairs: Vec<NodeId> = leaves[..80].chunks(2).map(|p| s.at_least(2, p)).collect();
        let many = s.at_least(1, &pairs);
        let half = s.at_least(500, &leaves[80..]);
        let top = s.at_least(2, &[many, half]);
        let plan = Plan::new(&s, top).unwrap();
        let cuts = Minimal::new(&plan, Which::Cuts, 1000).unwrap();
        let first = cuts.list(&alike(1080), Limits { first: 20, ..Limits::default() });
        assert_eq!((first.sets.len(), first.cut_by), (20, Some(CutBy::First)));
        // All alike, so by number: the even ones, then one odd at the end.
        let even: Vec<u32> = (0..40).map(|i| 2 * i).collect();
        assert_eq!(first.sets[0], even);
        assert_eq!(first.sets[1][..39], even[..39]);
        assert_eq!(first.sets[1][39], 79);
        let little = cuts.list(&alike(1080), Limits { work: 100, ..Limits::default() });
        assert_eq!(little.cut_by, Some(CutBy::Work { complete: 0 }));
    }

    #[test]
    fn wide_deep_and_nested_systems_end() {
        let mut s = Structure::default();
        let leaves: Vec<NodeId> = (0..100_000).map(|l| s.leaf(l)).collect();
        let wide = s.at_least(1, &leaves);
        let mut deep = s.leaf(100_000);
        for l in 100_001..200_000 {
            let leaf = s.leaf(l);
            deep = s.at_least(1 + l % 2, &[leaf, deep]);
        }
        let (nest, nested) = Dice::new(3).nest(500, 100, 12);
        for (s, top) in [(&s, wide), (&s, deep), (&nest, nested)] {
            let plan = Plan::new(s, top).unwrap();
            for which in [Which::Cuts, Which::Paths] {
                let sets = Minimal::new(&plan, which, 1_000_000).unwrap();
                let list = sets.list(&alike(200_000), Limits { first: 20, ..Limits::default() });
                assert!(!list.sets.is_empty());
                assert!(sets.count().is_ok());
            }
        }
    }
}
