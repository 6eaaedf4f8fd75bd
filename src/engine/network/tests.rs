//! Networks against enumeration of all states, closed forms and published
//! values.

use super::*;
use crate::engine::diagram::Builder;
use crate::engine::trial::{Dice, close, enumerate};
use crate::number::{Chance, Real};

fn works_with(network: &Network, up: u32) -> bool {
    network.works(|thing| up >> thing & 1 == 1)
}

fn brute(network: &Network, chances: &[Chance]) -> Chance {
    let table: Vec<bool> = (0..1u32 << chances.len()).map(|up| works_with(network, up)).collect();
    enumerate(&table, chances)
}

/// A value with both tails against another, each relative.
#[track_caller]
fn same(got: Interval, want: Chance, relative: f64) {
    let value = got.value().expect("no limit");
    close(value.works(), want.works(), relative);
    close(value.fails(), want.fails(), relative);
    assert!(got.error <= relative, "{}", got.error);
}

#[derive(Clone, Copy, PartialEq)]
enum Ways {
    One,
    Two,
    Mixed,
}

/// `stops` stops, the first of them the start.
fn random(dice: &mut Dice, stops: usize, links: usize, ways: Ways, ends: usize, perfect: usize) -> Network {
    let mut network = Network { stops: vec![None], links: Vec::new(), start: 0, ends: Vec::new(), need: 1 };
    let mut thing = 0;
    for _ in 1..stops {
        let bare = dice.below(10) < perfect;
        network.stops.push((!bare).then_some(thing));
        thing += u32::from(!bare);
    }
    for _ in 0..links {
        let (a, b) = (dice.below(stops) as u32, dice.below(stops) as u32);
        network.links.push((a, b));
        if ways == Ways::Two || (ways == Ways::Mixed && dice.below(2) == 0) {
            network.links.push((b, a));
        }
    }
    while network.ends.len() < ends {
        let end = 1 + dice.below(stops - 1) as u32;
        if !network.ends.contains(&end) {
            network.ends.push(end);
        }
    }
    network.need = 1 + dice.below(ends) as u32;
    network
}

// Sums of at most 2^11 terms of 11 factors, 2^-100 each: 2e-26 in all.
const ENUMERATED: f64 = 1e-25;

#[test]
fn random_networks_equal_enumeration_in_both_tails() {
    let (mut networks, mut many) = (0, 0);
    for seed in 0..3000 {
        let mut dice = Dice::new(seed);
        let stops = 3 + dice.below(7);
        let ways = [Ways::One, Ways::Two, Ways::Mixed][dice.below(3)];
        let links = stops + dice.below(2 * stops);
        let ends = (1 + dice.below(4)).min(stops - 1);
        let perfect = dice.below(5);
        let mut network =
            random(&mut dice, stops, links, ways, if seed % 2 == 0 { 1 } else { ends }, perfect);
        let things = stops - 1;
        if seed % 5 == 0 {
            // Some thing stands twice, at the start or elsewhere.
            let at = dice.below(stops);
            network.stops[at] = Some(dice.below(things) as u32);
        }
        let chances: Vec<Chance> = (0..things).map(|_| dice.chance()).collect();
        let reduced = network.reduce();
        for term in &reduced.terms {
            if let Term::Network(left) = term {
                networks += 1;
                many += u32::from(left.ends.len() > 1);
            }
        }
        same(network.chance(&chances, &Limits::default()), brute(&network, &chances), ENUMERATED);
    }
    assert!(networks > 300 && many > 200, "{networks} {many}");
}

#[test]
fn the_frontier_method_alone_equals_enumeration() {
    for seed in 0..2000 {
        let mut dice = Dice::new(seed);
        let stops = 3 + dice.below(7);
        let ways = [Ways::One, Ways::Two, Ways::Mixed][dice.below(3)];
        let links = stops + dice.below(2 * stops);
        let ends = (1 + dice.below(4)).min(stops - 1);
        let network = random(&mut dice, stops, links, ways, ends, 3);
        let chances: Vec<Chance> = (1..stops).map(|_| dice.chance()).collect();
        // Unreduced, as far as the method can take it: everything is reached.
        if network.reduce().terms == [Term::Fails] {
            continue;
        }
        let want = brute(&network, &chances);
        same(
            network
                .core(&chances.iter().map(|&c| Interval::exact(c)).collect::<Vec<_>>(), &Limits::default()),
            want,
            ENUMERATED,
        );
        // And as a decision diagram.
        let order = network.order();
        let mut builder = Builder::new(100_000);
        let variables: Vec<u32> = (0..order.len()).map(|v| builder.variable(v as u32).unwrap()).collect();
        let place = |t: u32| variables[order.iter().position(|&o| o == t).unwrap()];
        let root = network.diagram(&mut builder, place, 100_000).unwrap();
        let diagram = builder.finish(root);
        let by_place: Vec<Chance> = order.iter().map(|&t| chances[t as usize]).collect();
        let got = diagram.evaluate(&by_place)[diagram.root() as usize];
        close(got.works(), want.works(), ENUMERATED);
        close(got.fails(), want.fails(), ENUMERATED);
    }
}

/// Links that can fail between stops that cannot: thing i on the i-th link.
fn linked(stops: u32, links: &[(u32, u32)], both: bool, start: u32, ends: &[u32]) -> Network {
    let mut network = Network {
        stops: vec![None; stops as usize],
        links: Vec::new(),
        start,
        ends: ends.to_vec(),
        need: ends.len() as u32,
    };
    for (i, &(a, b)) in links.iter().enumerate() {
        let via = stops + i as u32;
        network.stops.push(Some(i as u32));
        network.links.extend([(a, via), (via, b)]);
        if both {
            network.links.extend([(b, via), (via, a)]);
        }
    }
    network
}

fn alike(n: usize, q: f64) -> Vec<Chance> {
    vec![Chance::new(Real::ONE - Real::from(q), Real::from(q)); n]
}

#[test]
fn random_links_that_fail_equal_enumeration() {
    for seed in 0..60 {
        let mut dice = Dice::new(seed);
        let stops = 4 + dice.below(5) as u32;
        let count = 12 + dice.below(4);
        let pick = |dice: &mut Dice| dice.below(stops as usize) as u32;
        let links: Vec<(u32, u32)> = (0..count).map(|_| (pick(&mut dice), pick(&mut dice))).collect();
        let ends: &[u32] = if seed % 3 == 0 { &[1, 2, 3] } else { &[1] };
        let network = linked(stops, &links, seed % 2 == 0, 0, ends);
        let chances: Vec<Chance> = (0..count).map(|_| dice.chance()).collect();
        // 2^16 terms.
        same(network.chance(&chances, &Limits::default()), brute(&network, &chances), 1e-24);
    }
}

fn grid(n: u32) -> Network {
    let at = |i, j| i * n + j;
    let mut links = Vec::new();
    for i in 0..n {
        for j in 0..n {
            if i > 0 {
                links.push((at(i - 1, j), at(i, j)));
            }
            if j > 0 {
                links.push((at(i, j - 1), at(i, j)));
            }
        }
    }
    linked(n * n, &links, true, 0, &[n * n - 1])
}

fn tenths(n: usize, tenths: u32) -> Vec<Chance> {
    let q = Real::from(tenths) / Real::from(10u32);
    vec![Chance::new(Real::ONE - q, q); n]
}

#[test]
fn published_and_exact_values() {
    let value = |network: &Network, n, q| network.chance(&tenths(n, q), &Limits::default()).value().unwrap();
    // The bridge, 1 - R by hand: 2q^2 + 2q^3 - 5q^4 + 2q^5 at q = 0.1.
    let bridge = linked(4, &[(0, 1), (0, 2), (1, 2), (1, 3), (2, 3)], true, 0, &[3]);
    close(value(&bridge, 5, 1).fails(), Real::from(2152u32) / Real::from(100_000u32), 1e-28);
    // A grid of 3 by 3 stops, 12 links of 0.9: enumerated in exact rationals
    // elsewhere to 0.972502171407.
    let want = Real::from_parts(972_502_171_407.0, 0.0) / Real::from(1e12);
    close(value(&grid(3), 12, 1).works(), want, 1e-28);
    // The dodecahedron with 30 links of 0.9 between opposite corners, a
    // benchmark of the field: 0.99712039874660671948, given to 20 digits.
    let links: [(u32, u32); 30] = [
        (0, 1),
        (0, 10),
        (0, 19),
        (1, 2),
        (1, 8),
        (2, 3),
        (2, 6),
        (3, 4),
        (3, 19),
        (4, 5),
        (4, 17),
        (5, 6),
        (5, 15),
        (6, 7),
        (7, 8),
        (7, 14),
        (8, 9),
        (9, 10),
        (9, 13),
        (10, 11),
        (11, 12),
        (11, 18),
        (12, 13),
        (12, 16),
        (13, 14),
        (14, 15),
        (15, 16),
        (16, 17),
        (17, 18),
        (18, 19),
    ];
    let dodecahedron = linked(20, &links, true, 0, &[15]);
    let want = Real::from_parts(9_971_203_987.0, 0.0) / Real::from(1e10)
        + Real::from(4_660_671_948.0) / Real::from(1e20);
    close(value(&dodecahedron, 30, 1).works(), want, 1e-20);
    // The ladder of 10 rungs, 28 links of 0.95: 0.97103182598655023272.
    let mut rungs: Vec<(u32, u32)> = (0..10).map(|i| (2 * i, 2 * i + 1)).collect();
    rungs.extend((0..18).map(|i| (i, i + 2)));
    let ladder = linked(20, &rungs, true, 0, &[18]);
    let q = Real::from(5u32) / Real::from(100u32);
    let got = ladder.chance(&vec![Chance::new(Real::ONE - q, q); 28], &Limits::default()).value().unwrap();
    let want =
        Real::from(9_710_318_259.0) / Real::from(1e10) + Real::from(8_655_023_272.0) / Real::from(1e20);
    close(got.works(), want, 1e-20);
}

/// E. N. Gilbert, "Random graphs", Annals of Mathematical Statistics 30
/// (1959): all stops of a complete graph are joined with
/// 1 - sum over k < n of C(n-1, k-1) R(k) q^(k (n-k)); two stops with 1 minus
/// the sum of C(n-2, k-1) R(k) q^(k (n-k)). These sums are the failing sides.
#[test]
fn complete_graphs_have_gilberts_chances() {
    let q = Real::from(1u32) / Real::from(8u32);
    let power = |e: u32| (0..e).fold(Real::ONE, |x, _| x * q);
    let choose = |n: u32, k: u32| (0..k).fold(Real::ONE, |c, i| c * Real::from(n - i) / Real::from(i + 1));
    let mut all = vec![Real::ZERO, Real::ONE];
    for n in 2u32..=8 {
        let sum = |top: u32| {
            (1..n)
                .filter(|k| k - 1 <= top)
                .fold(Real::ZERO, |s, k| s + choose(top, k - 1) * all[k as usize] * power(k * (n - k)))
        };
        let (whole, pair) = (sum(n - 1), sum(n - 2));
        all.push(Real::ONE - whole);
        let links: Vec<(u32, u32)> = (0..n).flat_map(|b| (0..b).map(move |a| (a, b))).collect();
        let chances = alike(links.len(), 0.125);
        let ends: Vec<u32> = (1..n).collect();
        let got = linked(n, &links, true, 0, &ends).chance(&chances, &Limits::default());
        close(got.value().unwrap().fails(), whole, 1e-26);
        let got = linked(n, &links, true, 0, &[n - 1]).chance(&chances, &Limits::default());
        close(got.value().unwrap().fails(), pair, 1e-26);
    }
}

/// A ring joins all its stops while at most one link has failed; two of them
/// while one of the two arcs is whole.
#[test]
fn rings_have_their_closed_forms() {
    let n = 40u32;
    let links: Vec<(u32, u32)> = (0..n).map(|i| (i, (i + 1) % n)).collect();
    let q = 2f64.powi(-20);
    let chances = alike(n as usize, q);
    let p = Real::ONE - Real::from(q);
    let power = |x: Real, e: u32| (0..e).fold(Real::ONE, |y, _| y * x);
    let ends: Vec<u32> = (1..n).collect();
    let got = linked(n, &links, true, 0, &ends).chance(&chances, &Limits::default()).value().unwrap();
    let want = power(p, n) + Real::from(n) * Real::from(q) * power(p, n - 1);
    close(got.works(), want, 1e-27);
    // Two or more have failed, by its terms.
    let term = |k: u32| {
        (0..k).fold(power(p, n - k), |t, i| t * Real::from(n - i) / Real::from(i + 1) * Real::from(q))
    };
    let fails = (2..=n).fold(Real::ZERO, |s, k| s + term(k));
    close(got.fails(), fails, 1e-26);
    let got = linked(n, &links, true, 0, &[15]).chance(&chances, &Limits::default()).value().unwrap();
    let arc = |e| Chance::new(power(p, e), Real::ONE - power(p, e));
    close(got.fails(), arc(15).fails() * arc(25).fails(), 1e-24);
}

#[test]
fn small_tails_keep_their_digits() {
    // At q = 1e-100 only the two cuts of two links at the corners count:
    // F = 2 q^2 (1 + o(1)), the rest below 1e-99 of it.
    let grid = grid(4);
    let tiny = Chance::new(Real::ONE, Real::from(1e-100));
    let got = grid.chance(&[tiny; 24], &Limits::default()).value().unwrap();
    close(got.fails(), Real::from(2.0) * tiny.fails() * tiny.fails(), 1e-28);
    // Works with 1e-100 each: C(6, 3) = 20 ways of 6 links; 1e-600 is nothing
    // a double can hold, so 1e-40.
    let tiny = Real::from(1e-40);
    let got = grid.chance(&[Chance::new(tiny, Real::ONE); 24], &Limits::default()).value().unwrap();
    let six = (0..6).fold(Real::ONE, |x, _| x * tiny);
    close(got.works(), Real::from(20.0) * six, 1e-28);
}

#[test]
fn a_limit_leaves_bounds_that_hold() {
    let grid = grid(8);
    let chances = tenths(112, 1);
    let exact = grid.chance(&chances, &Limits::default()).value().unwrap();
    let limits = Limits { bytes: 0, ..Limits::default() };
    let bounds = grid.chance(&chances, &limits);
    assert_eq!(bounds.value(), None);
    assert!(bounds.low.fails() > exact.fails() && bounds.high.fails() < exact.fails());
    assert!(bounds.high.fails() > exact.fails() * Real::from(0.5), "{bounds:?}");
    // Dropped at a coarse tolerance, the value is off by no more than it says.
    let grid = self::grid(9);
    let chances = tenths(144, 1);
    let exact = grid.chance(&chances, &Limits::default()).value().unwrap();
    let rough = grid.chance(&chances, &Limits { error: 1e-6, ..Limits::default() });
    let off = (rough.value().unwrap().fails() - exact.fails()).abs() / exact.fails();
    assert!(!off.is_zero() && off.to_f64() <= rough.error && rough.error < 2e-6, "{off:?} {}", rough.error);
}

#[test]
fn long_chains_and_ladders_are_quick() {
    // A ladder of 20,000 rungs whose stops can fail.
    let n = 20_000u32;
    let mut network = Network {
        stops: (0..2 * n).map(|s| (s > 0).then_some(s)).collect(),
        links: Vec::new(),
        start: 0,
        ends: vec![2 * n - 1],
        need: 1,
    };
    for i in 0..2 * n {
        for to in [i ^ 1, i + 2].into_iter().filter(|&to| to < 2 * n) {
            network.links.extend([(i, to), (to, i)]);
        }
    }
    let got = network.chance(&alike(2 * n as usize, 1e-6), &Limits::default());
    assert!(got.value().is_some() && got.error < 1e-22);
    // A chain that is one series in the end.
    let m = 50_000u32;
    let chain = Network {
        stops: (0..m).map(Some).collect(),
        links: (1..m).map(|i| (i - 1, i)).collect(),
        start: 0,
        ends: vec![m - 1],
        need: 1,
    };
    assert_eq!(chain.reduce().terms.len(), m as usize + 1);
}

#[test]
fn wrong_networks_are_no_panic() {
    let none = Network { stops: vec![], links: vec![(0, 7)], start: 3, ends: vec![9], need: 1 };
    assert_eq!(none.chance(&[], &Limits::default()).value(), Some(Chance::HOPELESS));
    let only = Network { stops: vec![Some(0)], links: vec![(0, 0)], start: 0, ends: vec![0], need: 1 };
    let chances = alike(1, 0.25);
    assert_eq!(only.chance(&chances, &Limits::default()).value(), Some(chances[0]));
    let need = Network { need: 2, ..only };
    assert_eq!(need.chance(&chances, &Limits::default()).value(), Some(Chance::HOPELESS));
}
