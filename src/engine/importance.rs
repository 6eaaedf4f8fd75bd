//! How much each part of a system matters.
//!
//! Sources: Z. W. Birnbaum, "On the importance of different components in a
//! multicomponent system" (1969); J. B. Fussell, "How to hand-calculate system
//! reliability and safety characteristics", IEEE Trans. Reliability R-24
//! (1975); the sweep over a diagram after Y. Dutuit, A. Rauzy, "Efficient
//! algorithms to assess component and gate importance in fault tree analysis",
//! Reliability Engineering and System Safety 72 (2001). From memory.
//!
//! One sweep goes down the main blocks of a plan, which form a tree, and
//! carries three things to each block: the system given that the block has
//! failed, given that it works, and the probability that the block decides.
//! Each is passed on by sums and products of positive terms.

use super::at_least::effects;
use super::diagram::{Diagram, FAILS, WORKS};
use super::minimal::{Family, Which};
use super::plan::{BlockId, Plan};
use crate::number::{Chance, Real};
use rustc_hash::FxHashMap;

/// What one part does to the system.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Importance {
    /// The part itself.
    pub own: Chance,
    /// The system, given that the part has failed.
    pub if_failed: Chance,
    /// The system, given that the part works.
    pub if_works: Chance,
    /// Birnbaum's importance: the probability that the system works if and
    /// only if the part does.
    pub birnbaum: Real,
    /// Probability that some minimal cut set with the part in it has failed.
    /// Missing below a group whose minimal cut sets are too many.
    pub cut_failed: Option<Real>,
}

impl Importance {
    /// Fussell-Vesely importance, given the probability that the system
    /// fails; missing where that is 0 or the cut sets are too many.
    pub fn fussell_vesely(&self, fails: Real) -> Option<Real> {
        self.cut_failed.filter(|_| !fails.is_zero()).map(|cut| cut / fails)
    }

    /// By how much the system improves if the part never fails: B q.
    pub fn gain_perfect(&self) -> Real {
        self.birnbaum * self.own.fails()
    }

    /// By how much the system improves if the part is doubled, either of the
    /// two sufficing: B q p.
    pub fn gain_doubled(&self) -> Real {
        self.birnbaum * self.own.fails() * self.own.works()
    }
}

/// The importance of all main blocks, by block; blocks of cases have none.
/// `values` are the chances of all blocks as [`super::evaluate::evaluate`]
/// gives them, `nodes` the most nodes for the cut sets of one group; the latter
/// take most of the time where parts share things, and 0 leaves them out there.
pub fn importance(plan: &Plan, values: &[Chance], nodes: usize) -> Vec<Option<Importance>> {
    let mut found: Vec<Option<Importance>> = vec![None; plan.len()];
    // The probability that all the rest of some minimal cut set with the block
    // in it has failed; times the block's own it is `cut_failed`.
    let mut rest: Vec<Option<Real>> = vec![None; plan.len()];
    let root = plan.root().0 as usize;
    rest[root] = Some(Real::ONE);
    found[root] = Some(Importance {
        own: values[root],
        if_failed: Chance::HOPELESS,
        if_works: Chance::PERFECT,
        birnbaum: Real::ONE,
        cut_failed: Some(values[root].fails()),
    });
    for id in plan.blocks().rev() {
        let Some(above) = found[id.0 as usize] else { continue };
        let parts = plan.parts(id);
        if parts.is_empty() {
            continue;
        }
        let chances: Vec<Chance> = parts.iter().map(|b| values[b.0 as usize]).collect();
        for (&part, within) in parts.iter().zip(within(plan, id, &chances, nodes)) {
            let at = part.0 as usize;
            // No block has two places, so nothing is written twice.
            rest[at] = match (rest[id.0 as usize], within.rest) {
                (Some(a), Some(b)) => Some(a * b),
                _ => None,
            };
            found[at] = Some(Importance {
                own: values[at],
                if_failed: within.if_failed.choose(above.if_works, above.if_failed),
                if_works: within.if_works.choose(above.if_works, above.if_failed),
                birnbaum: above.birnbaum * within.birnbaum,
                cut_failed: rest[at].map(|rest| rest * values[at].fails()),
            });
        }
    }
    found
}

/// What one part does to the block that directly rests on it.
struct Within {
    if_failed: Chance,
    if_works: Chance,
    birnbaum: Real,
    rest: Option<Real>,
}

fn within(plan: &Plan, id: BlockId, chances: &[Chance], nodes: usize) -> Vec<Within> {
    if let Some(group) = plan.group(id) {
        // Without a diagram nothing is known of the parts; see Plan::diagrams.
        let Ok(diagram) = group.diagram() else { return Vec::new() };
        return within_diagram(diagram, chances, nodes);
    }
    let super::plan::Block::Independent { need, .. } = plan.block(id) else { return Vec::new() };
    let effects = effects(need as usize, chances);
    let turn = |e: super::at_least::Effect| Within {
        if_failed: e.if_failed,
        if_works: e.if_works,
        birnbaum: e.birnbaum,
        // A minimal cut set takes n - k of the others with it, and that n - k
        // of the others fail is what fails the block once the part has.
        rest: Some(e.if_failed.fails()),
    };
    effects.into_iter().map(turn).collect()
}

fn within_diagram(diagram: &Diagram, chances: &[Chance], nodes: usize) -> Vec<Within> {
    let values = diagram.evaluate(chances);
    let reach = diagram.reach(chances);
    let n = chances.len();
    let zero = (Real::ZERO, Real::ZERO);
    // (works, fails) sums for each variable, over the ways that ask for it ...
    let mut if_failed = vec![zero; n];
    let mut if_works = vec![zero; n];
    let mut birnbaum = vec![Real::ZERO; n];
    // ... and over those that pass its level without asking.
    let mut skipped = Ranges::new(n);
    let mut critical = Critical::new(diagram, chances, &values);
    let level = |at: u32| (diagram.nodes()[at as usize].variable as usize).min(n);
    let mut pass = |flow: Real, from: usize, to: u32| {
        let value = values[to as usize];
        skipped.add(from, level(to), (flow * value.works(), flow * value.fails()));
    };
    pass(Real::ONE, 0, diagram.root());
    for (at, b) in diagram.nodes().iter().enumerate().skip(2) {
        let (flow, variable) = (reach[at], b.variable as usize);
        let (failed, works) = (values[b.fails as usize], values[b.works as usize]);
        add(&mut if_failed[variable], (flow * failed.works(), flow * failed.fails()));
        add(&mut if_works[variable], (flow * works.works(), flow * works.fails()));
        birnbaum[variable] += flow * critical.probability(b.works, b.fails);
        pass(flow * chances[variable].fails(), variable + 1, b.fails);
        pass(flow * chances[variable].works(), variable + 1, b.works);
    }
    let rests = Family::minimal(diagram, Which::Cuts, nodes)
        .and_then(|family| family.rests(chances, nodes))
        .map(|rests| rests.into_iter().map(Some).collect())
        .unwrap_or_else(|_| vec![None; n]);
    let skipped = skipped.points();
    let mut within = Vec::with_capacity(n);
    for v in 0..n {
        add(&mut if_failed[v], skipped[v]);
        add(&mut if_works[v], skipped[v]);
        within.push(Within {
            if_failed: Chance::new(if_failed[v].0, if_failed[v].1),
            if_works: Chance::new(if_works[v].0, if_works[v].1),
            birnbaum: birnbaum[v],
            rest: rests[v],
        });
    }
    within
}

type Pair = (Real, Real);

fn add(to: &mut Pair, more: Pair) {
    to.0 += more.0;
    to.1 += more.1;
}

/// Sums over ranges of levels, as a segment tree: with running differences
/// instead, the sums would be had by subtraction.
struct Ranges {
    sums: Vec<Pair>,
    size: usize,
}

impl Ranges {
    fn new(levels: usize) -> Ranges {
        let size = levels.next_power_of_two();
        Ranges { sums: vec![(Real::ZERO, Real::ZERO); 2 * size], size }
    }

    /// Adds to the levels `from` up to `to`, without `to`.
    fn add(&mut self, from: usize, to: usize, more: Pair) {
        let (mut from, mut to) = (from + self.size, to + self.size);
        while from < to {
            if from & 1 == 1 {
                add(&mut self.sums[from], more);
                from += 1;
            }
            if to & 1 == 1 {
                to -= 1;
                add(&mut self.sums[to], more);
            }
            from /= 2;
            to /= 2;
        }
    }

    /// The sum at each level.
    fn points(mut self) -> Vec<Pair> {
        for at in 2..self.sums.len() {
            let above = self.sums[at / 2];
            add(&mut self.sums[at], above);
        }
        self.sums.split_off(self.size)
    }
}

/// The probability that one node of a diagram works while another fails. The
/// difference of their values would lose the digits that they share.
struct Critical<'a> {
    diagram: &'a Diagram,
    chances: &'a [Chance],
    values: &'a [Chance],
    known: FxHashMap<(u32, u32), Real>,
}

impl<'a> Critical<'a> {
    /// The most pairs of nodes that are followed up. After that a difference
    /// is taken, of numbers with 30 digits.
    const PAIRS: usize = 2_000_000;

    fn new(diagram: &'a Diagram, chances: &'a [Chance], values: &'a [Chance]) -> Critical<'a> {
        Critical { diagram, chances, values, known: FxHashMap::default() }
    }

    fn simple(&self, works: u32, fails: u32) -> Option<Real> {
        let value = |at: u32| self.values[at as usize];
        if works == fails || works == FAILS || fails == WORKS {
            Some(Real::ZERO)
        } else if fails == FAILS {
            Some(value(works).works())
        } else if works == WORKS {
            Some(value(fails).fails())
        } else if let Some(&known) = self.known.get(&(works, fails)) {
            Some(known)
        } else if self.known.len() >= Critical::PAIRS {
            let (a, b) = (value(works), value(fails));
            Some(if b.fails() < a.works() { b.fails() - a.fails() } else { a.works() - b.works() })
        } else {
            None
        }
    }

    /// Probability that `works` works and `fails` fails.
    fn probability(&mut self, works: u32, fails: u32) -> Real {
        let mut stack = vec![(works, fails)];
        while let Some(&(a, b)) = stack.last() {
            if self.simple(a, b).is_some() {
                stack.pop();
                continue;
            }
            let (x, y) = (self.diagram.nodes()[a as usize], self.diagram.nodes()[b as usize]);
            let top = x.variable.min(y.variable);
            let (a0, a1) = if x.variable == top { (x.fails, x.works) } else { (a, a) };
            let (b0, b1) = if y.variable == top { (y.fails, y.works) } else { (b, b) };
            match (self.simple(a1, b1), self.simple(a0, b0)) {
                (Some(up), Some(down)) => {
                    let chance = self.chances[top as usize];
                    let sum = chance.works() * up + chance.fails() * down;
                    self.known.insert((a, b), sum);
                    stack.pop();
                }
                (up, down) => {
                    if up.is_none() {
                        stack.push((a1, b1));
                    }
                    if down.is_none() {
                        stack.push((a0, b0));
                    }
                }
            }
        }
        self.simple(works, fails).unwrap_or(Real::ZERO)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::evaluate::evaluate;
    use crate::engine::plan::Options;
    use crate::engine::trial::{Dice, close, enumerate, minimal, table};
    use crate::system::{NodeId, Structure};

    /// P(the part works exactly when the system does, as one decides the other).
    fn decides(table: &[bool], i: usize, chances: &[Chance]) -> Real {
        let decided: Vec<bool> =
            (0..table.len()).map(|up| table[up | 1 << i] && !table[up & !(1 << i)]).collect();
        enumerate(&decided, chances).works()
    }

    // Each enumerated sum has at most 2^9 positive terms of 9 factors.
    #[test]
    fn every_measure_equals_enumeration() {
        for seed in 0..300 {
            let mut dice = Dice::new(seed);
            let n = 2 + dice.below(8);
            let (s, top) = dice.system(n);
            let chances: Vec<Chance> = (0..n).map(|_| dice.chance()).collect();
            let table = table(&s, top, n);
            let cuts = minimal(&table, true);
            for cases in [1, 16] {
                let options = Options { cases, ..Options::default() };
                let plan = Plan::with(&s, top, options).unwrap();
                let values = evaluate(&plan, &chances);
                let found = importance(&plan, &values, 100_000);
                for i in 0..n {
                    let known = plan.of_leaf(i as u32).and_then(|b| found[b.0 as usize]);
                    let birnbaum = decides(&table, i, &chances);
                    let Some(known) = known else {
                        assert!(birnbaum.is_zero());
                        continue;
                    };
                    let given = |chance| {
                        let mut chances = chances.clone();
                        chances[i] = chance;
                        enumerate(&table, &chances)
                    };
                    for (got, want) in [
                        (known.if_failed, given(Chance::HOPELESS)),
                        (known.if_works, given(Chance::PERFECT)),
                        (known.own, chances[i]),
                    ] {
                        close(got.fails(), want.fails(), 1e-25);
                        close(got.works(), want.works(), 1e-25);
                    }
                    close(known.birnbaum, birnbaum, 1e-25);
                    let unhurt: Vec<bool> = (0..1u32 << n)
                        .map(|up| cuts.iter().all(|c| c >> i & 1 == 0 || c & up != 0))
                        .collect();
                    let want = enumerate(&unhurt, &chances).fails();
                    close(known.cut_failed.unwrap(), want, 1e-25);
                }
            }
        }
    }

    #[test]
    fn a_nearly_idle_part_keeps_its_digits() {
        // (A -> X) // (B -> X) // (A -> B -> Y): X decides, Y hardly ever does.
        let mut s = Structure::default();
        let [a, b, x, y] = [0, 1, 2, 3].map(|l| s.leaf(l));
        let ways = [&[a, x][..], &[b, x], &[a, b, y]].map(|w| s.at_least(w.len() as u32, w));
        let top = s.at_least(1, &ways);
        let plan = Plan::new(&s, top).unwrap();
        let q = Real::from(1e-30);
        let chances = vec![Chance::new(Real::ONE - q, q); 4];
        let values = evaluate(&plan, &chances);
        let found = importance(&plan, &values, 1000);
        let y = found[plan.of_leaf(3).unwrap().0 as usize].unwrap();
        // Y decides when A and B work and X has failed: q (1 - q)^2.
        close(y.birnbaum, q, 1e-25);
        close(y.gain_perfect(), q * q, 1e-25);
    }

    #[test]
    fn wide_and_deep_systems_end() {
        let mut s = Structure::default();
        let leaves: Vec<NodeId> = (0..100_000).map(|l| s.leaf(l)).collect();
        let mut top = s.at_least(50, &leaves);
        for l in 100_000..200_000 {
            let leaf = s.leaf(l);
            top = s.at_least(1 + l % 2, &[leaf, top]);
        }
        let plan = Plan::new(&s, top).unwrap();
        let chance = Chance::new(Real::from(0.5), Real::from(0.5));
        let values = evaluate(&plan, &vec![chance; 200_000]);
        let found = importance(&plan, &values, 1000);
        assert!(found.iter().all(|i| i.is_some()));
    }
}
