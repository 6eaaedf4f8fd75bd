//! At least k of n, for independent members that need not be alike.
//!
//! Source: R. E. Barlow, K. D. Heidtmann, "Computing k-out-of-n system
//! reliability", IEEE Trans. Reliability R-33 (1984): the distribution of the
//! number of working members, one member after another, in O(nk). Written from
//! memory of the paper. It is carried here only up to the count that decides,
//! on whichever side needs fewer cells; the last cell gathers "that many or
//! more", so that both tails are sums of positive terms and neither is taken
//! as 1 minus the other.
//!
//! A term that underflows contributes less than 1e-308 for each member to the
//! result, since later steps only multiply it by probabilities.

use crate::number::{Chance, Real};

/// How many of a set of independent events happen: the probability of each
/// count below a cap, and of the cap or more.
#[derive(Clone, Debug)]
pub struct Count {
    cells: Vec<Real>,
    seen: usize,
}

impl Count {
    /// No events yet. `cap` is at least 1.
    pub fn new(cap: usize) -> Count {
        let mut cells = vec![Real::ZERO; cap.max(1) + 1];
        cells[0] = Real::ONE;
        Count { cells, seen: 0 }
    }

    /// One more event.
    pub fn add(&mut self, happens: Real, not: Real) {
        let cap = self.cells.len() - 1;
        if self.seen + 1 >= cap {
            self.cells[cap] = self.cells[cap] + self.cells[cap - 1] * happens;
        }
        for j in (1..=(self.seen + 1).min(cap - 1)).rev() {
            self.cells[j] = self.cells[j] * not + self.cells[j - 1] * happens;
        }
        self.cells[0] *= not;
        self.seen += 1;
    }

    /// The highest count that is told apart.
    pub fn cap(&self) -> usize {
        self.cells.len() - 1
    }

    /// Probability of exactly `count`; `count` below the cap.
    pub fn exactly(&self, count: usize) -> Real {
        self.cells[count]
    }

    /// Probability of `count` or more; `count` up to the cap.
    pub fn or_more(&self, count: usize) -> Real {
        sum(&self.cells[count..])
    }

    /// Probability of fewer than `count`; `count` up to the cap.
    pub fn below(&self, count: usize) -> Real {
        sum(&self.cells[..count])
    }
}

fn sum(terms: &[Real]) -> Real {
    terms.iter().fold(Real::ZERO, |a, &b| a + b)
}

/// Which side is counted, and up to what cap, to decide "at least `need` of
/// `n`": working members up to `need`, or failed ones up to `n - need + 1`.
fn side(need: usize, n: usize) -> (bool, usize) {
    let fatal = n - need + 1;
    if need <= fatal { (true, need) } else { (false, fatal) }
}

/// The chance that all members work; flipped on the way in and out, that any
/// does.
///
/// Four products run side by side, since each step waits for the one before.
/// While failure stays the smaller side, only it is computed.
pub fn all(members: impl Iterator<Item = Chance>) -> Chance {
    let step = |all: Chance, m: Chance| {
        if all.fails().hi() + m.fails().hi() < 0.5 {
            Chance::new(Real::ONE, all.fails() + all.works() * m.fails())
        } else {
            all.and(m)
        }
    };
    let mut lanes = [Chance::PERFECT; 4];
    for (i, m) in members.enumerate() {
        lanes[i % 4] = step(lanes[i % 4], m);
    }
    let [a, b, c, d] = lanes;
    step(step(a, b), step(c, d))
}

/// The chance that at least `need` of `members` work.
pub fn at_least(need: usize, members: &[Chance]) -> Chance {
    let n = members.len();
    if need == 0 {
        return Chance::PERFECT;
    }
    if need > n {
        return Chance::HOPELESS;
    }
    if need == n {
        return all(members.iter().copied());
    }
    if need == 1 {
        return all(members.iter().map(|m| m.flip())).flip();
    }
    let (working, cap) = side(need, n);
    let turned = |m: Chance| if working { m } else { m.flip() };
    let alike = members.iter().all(|m| *m == members[0]);
    let known = if alike { like(cap, n, turned(members[0])) } else { None };
    let happens = known.unwrap_or_else(|| {
        let mut count = Count::new(cap);
        for &m in members {
            let event = turned(m);
            count.add(event.works(), event.fails());
        }
        Chance::new(count.or_more(cap), count.below(cap))
    });
    if working { happens } else { happens.flip() }
}

/// `cap` or more of `n` like events, by the binomial law: each term from the
/// one before, in linear time. `None` for events that are certain.
fn like(cap: usize, n: usize, event: Chance) -> Option<Chance> {
    if event.works().is_zero() || event.fails().is_zero() {
        return None;
    }
    let ratio = Scaled::of(event.works()).times(Scaled::of(event.fails().recip()));
    let mut term = Scaled::of(event.fails()).power(n);
    let (mut below, mut or_more) = (Real::ZERO, Real::ZERO);
    for j in 0..=n {
        if j < cap {
            below += term.value();
        } else {
            or_more += term.value();
        }
        let step = Real::from_u64((n - j) as u64) / Real::from_u64(j as u64 + 1);
        term = term.times(ratio).times(Scaled::of(step));
    }
    Some(Chance::new(or_more, below))
}

/// A positive number whose exponent has room: the first term of a long
/// binomial sum underflows where the middle ones decide.
#[derive(Clone, Copy)]
struct Scaled {
    part: Real,
    /// The number is `part` times 2^(500 · shifts).
    shifts: i64,
}

impl Scaled {
    const UP: f64 = f64::from_bits((1023 + 500) << 52);
    const DOWN: f64 = f64::from_bits((1023 - 500) << 52);

    fn of(part: Real) -> Scaled {
        Scaled { part, shifts: 0 }.settled()
    }

    /// The part brought between 2^-250 and 2^250, so that a product of two fits.
    fn settled(mut self) -> Scaled {
        while !self.part.is_zero() && self.part.hi() < 1e-75 {
            self = Scaled { part: self.part * Real::from(Self::UP), shifts: self.shifts - 1 };
        }
        while self.part.hi() > 4e75 && self.part.is_finite() {
            self = Scaled { part: self.part * Real::from(Self::DOWN), shifts: self.shifts + 1 };
        }
        self
    }

    fn times(self, other: Scaled) -> Scaled {
        Scaled { part: self.part * other.part, shifts: self.shifts + other.shifts }.settled()
    }

    fn power(self, mut n: usize) -> Scaled {
        let (mut square, mut result) = (self, Scaled::of(Real::ONE));
        while n > 0 {
            if n & 1 == 1 {
                result = result.times(square);
            }
            square = square.times(square);
            n >>= 1;
        }
        result
    }

    /// Zero where it underflows.
    fn value(self) -> Real {
        match self.shifts {
            0 => self.part,
            -1 => self.part * Real::from(Self::DOWN),
            1 => self.part * Real::from(Self::UP),
            -2 => self.part * Real::from(Self::DOWN) * Real::from(Self::DOWN),
            _ => Real::ZERO,
        }
    }
}

/// What one member does to "at least k of n", the others being as they are.
#[derive(Clone, Copy, Debug)]
pub struct Effect {
    /// The group, given that the member has failed.
    pub if_failed: Chance,
    /// The group, given that the member works.
    pub if_works: Chance,
    /// Probability that the others leave the decision to this member.
    pub birnbaum: Real,
}

/// The effect of each member on "at least `need` of `members`".
///
/// Series and parallel take prefix and suffix products. Otherwise the counts
/// of "all but one" come by halving: the events outside a range are added once
/// for the whole range, in O(nk log n), since taking a member back out of a
/// count would be a subtraction.
pub fn effects(need: usize, members: &[Chance]) -> Vec<Effect> {
    let n = members.len();
    if need == n {
        return series_effects(members);
    }
    if need == 1 {
        let flipped: Vec<Chance> = members.iter().map(|m| m.flip()).collect();
        let turn = |e: Effect| Effect {
            if_failed: e.if_works.flip(),
            if_works: e.if_failed.flip(),
            birnbaum: e.birnbaum,
        };
        return series_effects(&flipped).into_iter().map(turn).collect();
    }
    if members.iter().all(|m| *m == members[0]) {
        return vec![like_effect(need, members); n];
    }
    let (working, cap) = side(need, n);
    let mut effects = Vec::with_capacity(n);
    // The stack holds at most one open half for each halving: about log2 n.
    let mut stack = vec![(0, n, Count::new(cap))];
    while let Some((from, to, outside)) = stack.pop() {
        if to - from == 1 {
            let more = Chance::new(outside.or_more(cap), outside.below(cap));
            let less = Chance::new(outside.or_more(cap - 1), outside.below(cap - 1));
            effects.push(Effect {
                if_failed: if working { more } else { less.flip() },
                if_works: if working { less } else { more.flip() },
                birnbaum: outside.exactly(cap - 1),
            });
            continue;
        }
        let middle = from + (to - from) / 2;
        let mut left = outside.clone();
        let mut right = outside;
        for (count, range) in [(&mut left, middle..to), (&mut right, from..middle)] {
            for &m in &members[range] {
                let event = if working { m } else { m.flip() };
                count.add(event.works(), event.fails());
            }
        }
        stack.push((middle, to, right));
        stack.push((from, middle, left));
    }
    effects
}

/// The effect of each of like members: the others are the same for all.
fn like_effect(need: usize, members: &[Chance]) -> Effect {
    let (n, others) = (members.len(), &members[1..]);
    let (working, cap) = side(need, n);
    let mut exactly = Count::new(cap);
    let one = if working { members[0] } else { members[0].flip() };
    let birnbaum = match exactly_like(cap - 1, n - 1, one) {
        Some(value) => value,
        None => {
            others.iter().for_each(|_| exactly.add(one.works(), one.fails()));
            exactly.exactly(cap - 1)
        }
    };
    Effect { if_failed: at_least(need, others), if_works: at_least(need - 1, others), birnbaum }
}

/// Exactly `count` of `n` like events; `None` for events that are certain.
fn exactly_like(count: usize, n: usize, event: Chance) -> Option<Real> {
    if event.works().is_zero() || event.fails().is_zero() {
        return None;
    }
    let (p, q) = (Scaled::of(event.works()), Scaled::of(event.fails()));
    let mut term = p.power(count).times(q.power(n - count));
    for j in 0..count.min(n - count) {
        let step = Real::from_u64((n - j) as u64) / Real::from_u64(j as u64 + 1);
        term = term.times(Scaled::of(step));
    }
    Some(term.value())
}

fn series_effects(members: &[Chance]) -> Vec<Effect> {
    let mut after = Vec::with_capacity(members.len());
    let mut all = Chance::PERFECT;
    for &m in members.iter().rev() {
        after.push(all);
        all = all.and(m);
    }
    let mut before = Chance::PERFECT;
    let mut effects = Vec::with_capacity(members.len());
    for (&m, &rest) in members.iter().zip(after.iter().rev()) {
        let others = before.and(rest);
        effects.push(Effect { if_failed: Chance::HOPELESS, if_works: others, birnbaum: others.works() });
        before = before.and(m);
    }
    effects
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::trial::{Dice, close};

    /// Enumeration: the sum over all states of the members.
    fn enumerated(need: usize, members: &[Chance], fixed: Option<(usize, bool)>) -> Chance {
        let (mut works, mut fails) = (Real::ZERO, Real::ZERO);
        for state in 0u32..1 << members.len() {
            let mut weight = Real::ONE;
            for (i, m) in members.iter().enumerate() {
                let up = state >> i & 1 == 1;
                weight *= match fixed {
                    Some((j, value)) if j == i => Real::from(f64::from(u8::from(value == up))),
                    _ if up => m.works(),
                    _ => m.fails(),
                };
            }
            if state.count_ones() as usize >= need {
                works += weight;
            } else {
                fails += weight;
            }
        }
        Chance::new(works, fails)
    }

    // 2^12 terms of 12 factors, each step good to 2^-100: 5e-27 at worst.
    #[test]
    fn equals_enumeration_in_both_tails() {
        let mut dice = Dice::new(1);
        for n in 1..=9 {
            let members: Vec<Chance> = (0..n).map(|_| dice.chance()).collect();
            for need in 1..=n {
                let got = at_least(need, &members);
                let want = enumerated(need, &members, None);
                close(got.works(), want.works(), 1e-25);
                close(got.fails(), want.fails(), 1e-25);
                for (i, effect) in effects(need, &members).into_iter().enumerate() {
                    let failed = enumerated(need, &members, Some((i, false)));
                    let works = enumerated(need, &members, Some((i, true)));
                    close(effect.if_failed.fails(), failed.fails(), 1e-25);
                    close(effect.if_failed.works(), failed.works(), 1e-25);
                    close(effect.if_works.fails(), works.fails(), 1e-25);
                    close(effect.if_works.works(), works.works(), 1e-25);
                    // The expectation subtracts, so the tolerance is absolute.
                    let birnbaum = failed.fails() - works.fails();
                    assert!((effect.birnbaum - birnbaum).abs() < Real::from(1e-28));
                }
            }
        }
    }

    #[test]
    fn small_tails_down_to_1e_300_keep_their_digits() {
        // 100 members that fail with 1e-3: all of them fail with 1e-300, at
        // least 99 of them with (100 * 0.999 + 0.001) * 1e-297.
        let q = Real::from(1.0) / Real::from(1000.0);
        let members = vec![Chance::new(Real::ONE - q, q); 100];
        let mut power = Real::ONE;
        for _ in 0..99 {
            power *= q;
        }
        close(at_least(1, &members).fails(), power * q, 1e-20);
        let want = power * (Real::from(100.0) * (Real::ONE - q) + q);
        close(at_least(2, &members).fails(), want, 1e-20);
        let flipped: Vec<Chance> = members.iter().map(|m| m.flip()).collect();
        close(at_least(99, &flipped).works(), want, 1e-20);
    }
}
