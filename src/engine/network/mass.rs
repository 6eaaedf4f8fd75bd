//! The probability of a sweep's ends, in both tails, with what was left out.
//!
//! The masses that reach "works" and "fails" are each summed from positive
//! terms, so neither is 1 minus the other. Where states are many, those whose
//! mass together cannot touch the wanted digits are dropped; where they are
//! too many, the least likely are. What is dropped is summed as well: the
//! value lies between the mass that works and that plus the dropped one.

use super::sweep::{Next, State, Step, Sweep};
use super::table::{Entry, Table};
use crate::number::{Chance, Real};

/// How far a network may be computed.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Limits {
    /// The most memory for states, in bytes; at most this much is in use
    /// while one layer is turned into the next.
    pub bytes: usize,
    /// The relative part of the smaller tail that dropped states may amount
    /// to. It is used only where there are thousands of states.
    pub error: f64,
}

impl Default for Limits {
    fn default() -> Limits {
        Limits { bytes: 1_000_000_000, error: 2f64.powi(-60) }
    }
}

/// A value, or the bounds that a limit has left of it.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Interval {
    /// It works at least as likely as this.
    pub low: Chance,
    /// It works at most as likely as this; equal to `low` unless a limit was
    /// reached.
    pub high: Chance,
    /// Bound of the relative error of the smaller tail of both.
    pub error: f64,
}

impl Interval {
    /// A value with the relative error of one operation.
    pub(super) fn exact(chance: Chance) -> Interval {
        Interval { low: chance, high: chance, error: UNIT }
    }

    /// The value, or the middle of the bounds that a limit has left.
    pub fn middle(&self) -> Chance {
        let half = Real::from(0.5);
        let (low, high) = (self.low, self.high);
        match self.value() {
            Some(value) => value,
            None => Chance::new((low.works() + high.works()) * half, (low.fails() + high.fails()) * half),
        }
    }

    /// How far [`Interval::middle`] may be off, in parts of its smaller tail.
    pub fn off(&self) -> f64 {
        if self.low == self.high {
            return self.error;
        }
        let (low, high, middle) = (self.low, self.high, self.middle().smaller());
        let works = (high.works() - low.works()).abs();
        let width = works.max((low.fails() - high.fails()).abs()) * Real::from(0.5);
        let part = if middle.is_zero() { 1.0 } else { (width / middle).to_f64() };
        self.error + part * 1.000_001
    }

    /// The value, if no limit was reached.
    pub fn value(&self) -> Option<Chance> {
        (self.low == self.high).then_some(self.low)
    }
}

/// The relative error of one operation on a `Real`.
pub(super) const UNIT: f64 = 1.0 / (1u128 << 100) as f64;

/// Layers with fewer states than this are kept whole.
const WHOLE: usize = 4096;
/// How many states the first estimate of the smaller tail keeps.
const ESTIMATE: usize = 2048;

/// What a sweep has summed up.
#[derive(Clone, Copy, Debug)]
struct Mass {
    works: Real,
    fails: Real,
    dropped: Real,
    /// Sums and products that one term can have passed through, at most.
    operations: f64,
}

/// The chance of a sweep, given the chances of its things.
pub(super) fn interval<T: Sweep>(sweep: &T, chance: impl Fn(u32) -> Chance, limits: &Limits) -> Interval {
    let entry = std::mem::size_of::<Entry<T::State>>();
    // A layer makes at most twice as many states; a table that grows holds
    // its old and its new slots; the layer before is there as well.
    let keep = (limits.bytes / (entry * 6)).max(ESTIMATE);
    let small = Run { sweep, chance: &chance, keep, budget: 0.0, whole: true }.go();
    let mass = small.or_else(|| {
        let first = Run { sweep, chance: &chance, keep: ESTIMATE, budget: 0.0, whole: false }.go()?;
        let budget = limits.error * first.works.min(first.fails).to_f64();
        Run { sweep, chance: &chance, keep, budget, whole: false }.go()
    });
    let Some(mass) = mass else {
        return Interval { low: Chance::HOPELESS, high: Chance::PERFECT, error: 0.0 };
    };
    let smaller = mass.works.min(mass.fails);
    let rounding = mass.operations * UNIT;
    if mass.dropped <= smaller * Real::from(limits.error) {
        let part = if mass.dropped.is_zero() { 0.0 } else { (mass.dropped / smaller).to_f64() };
        let chance = Chance::new(mass.works, mass.fails);
        return Interval { low: chance, high: chance, error: rounding + part };
    }
    Interval {
        low: Chance::new(mass.works, mass.fails + mass.dropped),
        high: Chance::new(mass.works + mass.dropped, mass.fails),
        error: rounding,
    }
}

struct Run<'a, T, C> {
    sweep: &'a T,
    chance: &'a C,
    /// The most states of a layer.
    keep: usize,
    /// How much mass may be dropped where it need not be.
    budget: f64,
    /// Give up at [`WHOLE`] states.
    whole: bool,
}

impl<T: Sweep, C: Fn(u32) -> Chance> Run<'_, T, C> {
    fn go(&self) -> Option<Mass> {
        let mut mass = Mass { works: Real::ZERO, fails: Real::ZERO, dropped: Real::ZERO, operations: 2.0 };
        let mut now: Table<T::State> = Table::with_room(1);
        put(self.sweep.first(), Real::ONE, &mut now, &mut mass);
        let layers = self.sweep.layers();
        let mut cuts = Cuts::default();
        for layer in 0..layers {
            if self.whole && now.len() > WHOLE {
                return None;
            }
            let allowance = (self.budget - mass.dropped.to_f64()) / (layers - layer) as f64;
            let cut = cuts.find(&now, self.keep, allowance);
            let thing = self.sweep.thing(layer);
            let chance = thing.map_or(Chance::PERFECT, |t| (self.chance)(t));
            let mut next = Table::with_room(now.len());
            self.layer(layer, chance, (&now, cut), &mut next, &mut mass);
            now = next;
        }
        // Every state is decided after the last layer; a sweep that leaves one
        // open would be wrong, and its mass then stays undecided.
        for entry in now.iter() {
            mass.dropped += entry.mass;
        }
        Some(mass)
    }

    fn layer(
        &self,
        layer: usize,
        chance: Chance,
        (now, mut cut): (&Table<T::State>, Cut),
        next: &mut Table<T::State>,
        mass: &mut Mass,
    ) {
        let (p, q) = (chance.works(), chance.fails());
        let sure = (q.is_zero(), p.is_zero());
        let mut steps = 0u64;
        for entry in now.iter() {
            if cut.drops(entry.mass) {
                mass.dropped += entry.mass;
                continue;
            }
            match self.sweep.step(layer, entry.state) {
                Step::Same(to) => put(to, entry.mass, next, mass),
                Step::Split(works, fails) => {
                    if !sure.1 {
                        put(works, entry.mass * p, next, mass);
                    }
                    if !sure.0 {
                        put(fails, entry.mass * q, next, mass);
                    }
                }
            }
            steps += 2;
        }
        // Each of these is at most one addition to a sum; one product for all.
        mass.operations += steps as f64 + 1.0;
    }
}

#[inline]
fn put<S: State>(to: Next<S>, part: Real, next: &mut Table<S>, mass: &mut Mass) {
    match to {
        Next::Works => mass.works += part,
        Next::Fails => mass.fails += part,
        Next::On(state) => next.add(state, part),
    }
}

/// Which masses are dropped: those in classes below `class`, and those in it
/// once `quota` of them are kept.
#[derive(Clone, Copy)]
struct Cut {
    class: u16,
    quota: usize,
}

impl Cut {
    #[inline]
    fn drops(&mut self, mass: Real) -> bool {
        let class = class(mass);
        if class != self.class {
            return class < self.class;
        }
        match self.quota.checked_sub(1) {
            Some(left) => {
                self.quota = left;
                false
            }
            None => true,
        }
    }
}

/// The exponent and the first bits of a mass: masses of a higher class are
/// larger.
#[inline]
fn class(mass: Real) -> u16 {
    (mass.hi().to_bits() >> 48) as u16 & 0x7FFF
}

/// How many states of a layer lie in each class, and their mass.
#[derive(Default)]
struct Cuts {
    classes: Vec<(usize, f64)>,
}

impl Cuts {
    fn find<S: State>(&mut self, table: &Table<S>, keep: usize, allowance: f64) -> Cut {
        let none = Cut { class: 0, quota: usize::MAX };
        if table.len() <= WHOLE.min(keep) || (table.len() <= keep && allowance <= 0.0) {
            return none;
        }
        self.classes.clear();
        self.classes.resize(1 << 15, (0, 0.0));
        for entry in table.iter() {
            let found = &mut self.classes[class(entry.mass) as usize];
            found.0 += 1;
            found.1 += entry.mass.to_f64();
        }
        let (mut left, mut dropped) = (table.len(), 0.0);
        for (class, &(count, sum)) in self.classes.iter().enumerate() {
            // Sums of doubles are off by far less than a part in a thousand.
            dropped += sum * 1.001;
            let excess = left.saturating_sub(keep);
            if excess == 0 && dropped > allowance {
                return Cut { class: class as u16, quota: usize::MAX };
            }
            if excess > 0 && excess <= count && dropped > allowance {
                return Cut { class: class as u16, quota: count - excess };
            }
            left -= count;
        }
        none
    }
}
