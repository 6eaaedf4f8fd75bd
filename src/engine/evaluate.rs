//! The chance of each block of a plan.
//!
//! Every method here takes sums and products of positive terms in both tails,
//! so relative errors add up and never multiply; [`bound`] counts them.

use super::at_least::{all, at_least};
use super::network::{Interval, Limits};
use super::plan::{Block, BlockId, Plan};
use crate::number::Chance;

/// The chance of each block, given the chances of the things by number.
///
/// A thing without a chance counts as one that has failed.
pub fn evaluate(plan: &Plan, chances: &[Chance]) -> Vec<Chance> {
    run(plan, chances, &mut |interval, _| interval.low)
}

/// The chances of a plan's blocks, or the bounds that limits have left of them.
#[derive(Clone, Debug)]
pub struct Assessed {
    /// By block. Where a limit was reached, at least as likely as this.
    pub values: Vec<Chance>,
    /// Where a limit was reached: by block, at most as likely as this.
    pub high: Option<Vec<Chance>>,
    /// Bound of the relative error of the root's smaller tail.
    pub bound: f64,
}

/// The chances of all blocks with what is known of their errors. The system
/// is no worse for a part that is better, so bounds of parts bound the whole.
pub fn assess(plan: &Plan, chances: &[Chance]) -> Assessed {
    let mut networks = Vec::new();
    let mut limited = false;
    let values = run(plan, chances, &mut |interval, block| {
        networks.push((block, interval.error));
        limited |= interval.value().is_none();
        interval.low
    });
    let high = limited.then(|| run(plan, chances, &mut |interval, _| interval.high));
    Assessed { values, high, bound: bound(plan, &networks) }
}

fn run(plan: &Plan, chances: &[Chance], pick: &mut dyn FnMut(Interval, BlockId) -> Chance) -> Vec<Chance> {
    let mut values: Vec<Chance> = Vec::with_capacity(plan.len());
    let mut inputs = Vec::new();
    for id in plan.blocks() {
        let of = |b: BlockId| values[b.0 as usize];
        let value = match plan.block(id) {
            Block::Leaf(leaf) => chances.get(leaf as usize).copied().unwrap_or(Chance::HOPELESS),
            Block::Works => Chance::PERFECT,
            Block::Fails => Chance::HOPELESS,
            Block::Independent { need, .. } => {
                let members = plan.members(id);
                if need as usize == members.len() {
                    all(members.iter().map(|&m| of(m)))
                } else if need == 1 {
                    all(members.iter().map(|&m| of(m).flip())).flip()
                } else {
                    inputs.clear();
                    inputs.extend(members.iter().map(|&m| of(m)));
                    at_least(need as usize, &inputs)
                }
            }
            Block::Conditioned { on, works, failed } => of(on).choose(of(works), of(failed)),
            Block::Diagram => match plan.group(id).and_then(|g| g.diagram().ok().map(|d| (g, d))) {
                Some((group, diagram)) => {
                    inputs.clear();
                    inputs.extend(group.frontier.iter().map(|&b| of(b)));
                    diagram.evaluate(&inputs)[diagram.root() as usize]
                }
                None => Chance::HOPELESS,
            },
            Block::Network => match plan.group(id).and_then(|g| g.network.as_ref().map(|n| (g, n))) {
                Some((group, network)) => {
                    inputs.clear();
                    inputs.extend(group.frontier.iter().map(|&b| of(b)));
                    pick(network.frontier(&inputs, &Limits::default()), id)
                }
                None => Chance::HOPELESS,
            },
        };
        values.push(value);
    }
    values
}

/// Bound of the relative error of the root's smaller tail: the number of
/// operations that one term of it can pass through, times 2^-100.
///
/// The chances of the things are taken to be good to 2^-100 themselves. It
/// holds as long as nothing is so near 1e-300 that the low part of a number
/// underflows. `networks` are the errors that the frontier method has stated.
fn bound(plan: &Plan, networks: &[(BlockId, f64)]) -> f64 {
    // One `and`, `or` or `choose` is at most a product, a sum and the reset of
    // the larger side; adding one member to a count is no more.
    const STEP: f64 = 4.0;
    let mut errors: Vec<f64> = Vec::with_capacity(plan.len());
    for id in plan.blocks() {
        let of = |b: BlockId| errors[b.0 as usize];
        let error = match plan.block(id) {
            Block::Leaf(_) => 1.0,
            Block::Works | Block::Fails => 0.0,
            Block::Independent { need, .. } => {
                let members = plan.members(id);
                let plain = need == 1 || need as usize == members.len();
                // A count is summed over its cells in the end.
                let cells = if plain { 0 } else { members.len() };
                // The four lanes of a plain one are joined in two steps.
                members.iter().map(|&m| of(m) + STEP).sum::<f64>() + cells as f64 + 2.0 * STEP
            }
            Block::Conditioned { on, works, failed } => of(on) + of(works).max(of(failed)) + STEP,
            Block::Diagram => plan.parts(id).iter().map(|&b| of(b) + STEP).sum(),
            Block::Network => {
                let own = networks.iter().find(|(block, _)| *block == id).map_or(0.0, |(_, error)| *error);
                plan.parts(id).iter().map(|&b| of(b)).sum::<f64>() + own * 2f64.powi(100)
            }
        };
        errors.push(error);
    }
    errors[plan.root().0 as usize] * 2f64.powi(-100)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::plan::Options;
    use crate::engine::trial::{Dice, close, enumerate, table};
    use crate::number::Real;
    use crate::system::{NodeId, Structure};

    fn root(plan: &Plan, chances: &[Chance]) -> Chance {
        evaluate(plan, chances)[plan.root().0 as usize]
    }

    // Enumeration adds up to 2^12 positive terms of 12 factors: about 4100
    // operations of 2^-100 or 4e-27 in all; the plan has far fewer.
    #[test]
    fn cases_and_diagrams_equal_enumeration_in_both_tails() {
        let (mut cases, mut diagrams) = (0, 0);
        for seed in 0..400 {
            let mut dice = Dice::new(seed);
            let n = 2 + dice.below(10);
            let (s, top) = dice.system(n);
            let chances: Vec<Chance> = (0..n).map(|_| dice.chance()).collect();
            let want = enumerate(&table(&s, top, n), &chances);
            for limit in [1, 16, 1000] {
                let options = Options { cases: limit, ..Options::default() };
                let plan = Plan::with(&s, top, options).unwrap();
                for id in plan.blocks() {
                    cases += u32::from(matches!(plan.block(id), Block::Conditioned { .. }));
                    diagrams += u32::from(plan.block(id) == Block::Diagram);
                }
                let got = root(&plan, &chances);
                close(got.works(), want.works(), 1e-25);
                close(got.fails(), want.fails(), 1e-25);
                assert!(assess(&plan, &chances).bound < 1e-25);
            }
        }
        assert!(cases > 300 && diagrams > 300, "{cases} {diagrams}");
    }

    #[test]
    fn every_module_has_a_block_with_its_own_chance() {
        for seed in 0..100 {
            let mut dice = Dice::new(seed);
            let (s, top) = dice.system(8);
            let chances: Vec<Chance> = (0..8).map(|_| dice.chance()).collect();
            let plan = Plan::new(&s, top).unwrap();
            let values = evaluate(&plan, &chances);
            for id in (0..s.len() as u32).map(NodeId) {
                if let Some(block) = plan.of_node(id) {
                    let want = enumerate(&table(&s, id, 8), &chances);
                    close(values[block.0 as usize].fails(), want.fails(), 1e-25);
                }
            }
        }
    }

    fn alike(n: usize, q: f64) -> Vec<Chance> {
        vec![Chance::new(Real::ONE - Real::from(q), Real::from(q)); n]
    }

    #[test]
    fn a_thing_shared_by_two_lanes_is_one_condition() {
        let mut s = Structure::default();
        let [a, b, x] = [0, 1, 2].map(|l| s.leaf(l));
        let left = s.at_least(2, &[a, x]);
        let right = s.at_least(2, &[b, x]);
        let top = s.at_least(1, &[left, right]);
        let plan = Plan::new(&s, top).unwrap();
        let Block::Conditioned { on, works, failed } = plan.block(plan.root()) else {
            panic!("not by cases")
        };
        assert_eq!(Some(on), plan.of_leaf(2));
        assert_eq!(plan.block(failed), Block::Fails);
        assert!(matches!(plan.block(works), Block::Independent { need: 1, .. }));
        assert_eq!(plan.shared(), vec![on]);
        assert_eq!(plan.of_node(left), None);
        let got = root(&plan, &alike(3, 0.125));
        // X works and not both of A, B have failed: 7/8 (1 - 1/64), exact.
        assert_eq!(got.works().hi(), 0.875 * (63.0 / 64.0));
    }

    #[test]
    fn a_named_part_used_twice_is_one_block() {
        // (P -> A) // (P -> B) with P = C // D.
        let mut s = Structure::default();
        let [a, b, c, d] = [0, 1, 2, 3].map(|l| s.leaf(l));
        let p = s.at_least(1, &[c, d]);
        let left = s.at_least(2, &[p, a]);
        let right = s.at_least(2, &[p, b]);
        let top = s.at_least(1, &[left, right]);
        let plan = Plan::new(&s, top).unwrap();
        assert!(matches!(plan.block(plan.root()),
            Block::Conditioned { on, .. } if Some(on) == plan.of_node(p)));
    }

    #[test]
    fn the_bridge_written_with_shared_parts() {
        // Paths AD, BE, ACE, BCD. Conditioned on C: (A//B)->(D//E), (A->D)//(B->E).
        let mut s = Structure::default();
        let [a, b, c, d, e] = [0, 1, 2, 3, 4].map(|l| s.leaf(l));
        let paths =
            [&[a, d][..], &[b, e], &[a, c, e], &[b, c, d]].map(|path| s.at_least(path.len() as u32, path));
        let top = s.at_least(1, &paths);
        let p = 0.875f64;
        let or = 1.0 - (1.0 - p).powi(2);
        let and = 1.0 - (1.0 - p * p).powi(2);
        let want = p * or * or + (1.0 - p) * and;
        for cases in [1, 16] {
            let plan = Plan::with(&s, top, Options { cases, ..Options::default() }).unwrap();
            // Eighths to the fifth power: exact in a double.
            assert_eq!(root(&plan, &alike(5, 0.125)).works().hi(), want);
        }
    }

    #[test]
    fn wide_and_deep_systems_end() {
        let mut s = Structure::default();
        let leaves: Vec<NodeId> = (0..1_000_000).map(|l| s.leaf(l)).collect();
        let top = s.at_least(1_000_000, &leaves);
        let plan = Plan::new(&s, top).unwrap();
        let got = root(&plan, &alike(1_000_000, 2f64.powi(-30)));
        // 1 - (1 - q)^n by its series to fourth order, to a double's digits.
        let (n, q) = (1e6, 2f64.powi(-30));
        let x = n * q;
        let want = x * (1.0 - (x - q) / 2.0 * (1.0 - (x - 2.0 * q) / 3.0 * (1.0 - x / 4.0)));
        assert!((got.fails().hi() / want - 1.0).abs() < 1e-14);

        for share in [false, true] {
            let mut s = Structure::default();
            let first = s.leaf(0);
            let mut top = first;
            for l in 1..100_000 {
                let leaf = s.leaf(l);
                top = s.at_least(1 + l % 2, &[top, leaf]);
            }
            if share {
                let again = s.at_least(2, &[first, top]);
                top = s.at_least(1, &[again, s.members(top)[1]]);
            }
            let plan = Plan::new(&s, top).unwrap();
            assert!(root(&plan, &alike(100_000, 0.125)).works().is_finite());
        }
    }

    #[test]
    fn five_hundred_things_some_repeated_nearby_are_quick() {
        for seed in 0..5 {
            let (s, top) = Dice::new(seed).nest(500, 100, 12);
            let plan = Plan::new(&s, top).unwrap();
            assert!(root(&plan, &alike(500, 0.01)).works().is_finite());
        }
    }
}
