//! The chance of a network, and of what its reduction leaves.

use super::super::diagram::{Builder, TooLarge};
use super::classes::Classes;
use super::course::Course;
use super::labels::Bytes;
use super::mass::{Interval, Limits, UNIT, interval};
use super::reach::{Passage, Reach};
use super::sweep::Sweep;
use super::tally::Tallies;
use super::{Network, Reduced, Term, trace};
use crate::number::Chance;

/// How many times a network is split over things that stand at several stops.
const SPLITS: usize = 12;

/// Something to be done with the sweep that fits a network.
trait Job {
    type Out;
    fn run<T: Sweep>(self, sweep: &T) -> Self::Out;
}

/// Chooses the kind of states, and the shortest word that holds them.
///
/// Reduction has taken out what stands at the start.
fn with_sweep<J: Job>(network: &Network, job: J) -> Option<J::Out> {
    if network.stops.get(network.start as usize) != Some(&None) {
        return None;
    }
    if let Some(course) = Course::new(network) {
        let single = match network.ends[..] {
            [end] => end != network.start && network.stops[end as usize].is_none(),
            _ => false,
        };
        if single {
            return classes(&course, job);
        }
        return tallies(&course, network, job);
    }
    let passage = Passage::new(network);
    match passage.slots() {
        0..=8 => Reach::<8>::new(passage).map(|s| job.run(&s)),
        9..=16 => Reach::<16>::new(passage).map(|s| job.run(&s)),
        _ => Reach::<32>::new(passage).map(|s| job.run(&s)),
    }
}

fn classes<J: Job>(course: &Course, job: J) -> Option<J::Out> {
    if let Some(sweep) = Classes::<u64>::new(course) {
        return Some(job.run(&sweep));
    }
    if let Some(sweep) = Classes::<Bytes<16>>::new(course) {
        return Some(job.run(&sweep));
    }
    if let Some(sweep) = Classes::<Bytes<32>>::new(course) {
        return Some(job.run(&sweep));
    }
    Classes::<Bytes<128>>::new(course).map(|sweep| job.run(&sweep))
}

fn tallies<J: Job>(course: &Course, network: &Network, job: J) -> Option<J::Out> {
    let (ends, need) = (network.ends.len(), network.need as usize);
    if let Some(sweep) = Tallies::<8>::new(course, ends, need) {
        return Some(job.run(&sweep));
    }
    if let Some(sweep) = Tallies::<16>::new(course, ends, need) {
        return Some(job.run(&sweep));
    }
    if let Some(sweep) = Tallies::<32>::new(course, ends, need) {
        return Some(job.run(&sweep));
    }
    Tallies::<128>::new(course, ends, need).map(|sweep| job.run(&sweep))
}

struct Value<'a, C> {
    chance: C,
    limits: &'a Limits,
}

impl<C: Fn(u32) -> Chance> Job for Value<'_, C> {
    type Out = Interval;
    fn run<T: Sweep>(self, sweep: &T) -> Interval {
        interval(sweep, self.chance, self.limits)
    }
}

struct Order;

impl Job for Order {
    type Out = Vec<u32>;
    fn run<T: Sweep>(self, sweep: &T) -> Vec<u32> {
        (0..sweep.layers()).filter_map(|layer| sweep.thing(layer)).collect()
    }
}

struct Trace<'a, V> {
    builder: &'a mut Builder,
    variable: V,
    limit: usize,
}

impl<V: Fn(u32) -> u32> Job for Trace<'_, V> {
    type Out = Result<u32, TooLarge>;
    fn run<T: Sweep>(self, sweep: &T) -> Self::Out {
        trace::diagram(sweep, self.builder, self.variable, self.limit)
    }
}

/// A value that can be anything.
const UNKNOWN: Interval = Interval { low: Chance::HOPELESS, high: Chance::PERFECT, error: 0.0 };

impl Network {
    /// The chance that it works, given those of its things by number; a thing
    /// without a chance counts as failed. Things are independent.
    ///
    /// Both tails are summed from positive terms and good to
    /// [`Interval::error`]; beyond a limit the result is bounds. A thing that
    /// stands at several stops is split over; after 12 such splits the rest of
    /// the probability stays between the bounds.
    pub fn chance(&self, chances: &[Chance], limits: &Limits) -> Interval {
        self.split(chances, limits, &mut (1 << SPLITS), SPLITS)
    }

    fn split(&self, chances: &[Chance], limits: &Limits, left: &mut usize, depth: usize) -> Interval {
        let reduced = self.reduce();
        let Some(thing) = reduced.repeated() else { return reduced.chance(chances, limits) };
        if depth == 0 || *left == 0 {
            return UNKNOWN;
        }
        *left -= 1;
        let on = chances.get(thing as usize).copied().unwrap_or(Chance::HOPELESS);
        let works = self.given(thing, true).split(chances, limits, left, depth - 1);
        let fails = self.given(thing, false).split(chances, limits, left, depth - 1);
        Interval {
            low: on.choose(works.low, fails.low),
            high: on.choose(works.high, fails.high),
            error: works.error.max(fails.error) + 4.0 * UNIT,
        }
    }

    /// The things of a [`Term::Network`] in the order in which the frontier
    /// method decides them, those that it need not decide left out.
    pub fn order(&self) -> Vec<u32> {
        with_sweep(self, Order).unwrap_or_default()
    }

    /// Adds a [`Term::Network`] to a builder of decision diagrams; `variable` gives
    /// the diagram of a thing. Things may stand at several stops. It is quick
    /// where these diagrams are variables in the order of [`Network::order`].
    ///
    /// # Errors
    /// If there are more states, or nodes, than `limit`.
    pub fn diagram(
        &self,
        builder: &mut Builder,
        variable: impl Fn(u32) -> u32,
        limit: usize,
    ) -> Result<u32, TooLarge> {
        with_sweep(self, Trace { builder, variable, limit }).unwrap_or(Err(TooLarge { limit }))
    }
}

impl Reduced {
    /// The thing that stands in most places, the first of equals; nothing if
    /// none stands in two.
    pub fn repeated(&self) -> Option<u32> {
        let mut uses = vec![0usize; self.terms.len()];
        for term in &self.terms {
            match term {
                Term::All(list) | Term::Any(list) => list.iter().for_each(|&m| uses[m as usize] += 1),
                Term::Network(network) => {
                    network.stops.iter().flatten().for_each(|&m| uses[m as usize] += 1);
                }
                _ => {}
            }
        }
        let most = uses.iter().copied().max().filter(|&most| most > 1)?;
        self.terms.iter().zip(&uses).find_map(|(term, &uses)| match term {
            Term::Thing(thing) if uses == most => Some(*thing),
            _ => None,
        })
    }

    /// The chance of the whole, if no thing is [`Reduced::repeated`].
    pub fn chance(&self, chances: &[Chance], limits: &Limits) -> Interval {
        let mut values: Vec<Interval> = Vec::with_capacity(self.terms.len());
        for term in &self.terms {
            let value = match term {
                Term::Works => Interval::exact(Chance::PERFECT),
                Term::Fails => Interval::exact(Chance::HOPELESS),
                Term::Thing(thing) => {
                    Interval::exact(chances.get(*thing as usize).copied().unwrap_or(Chance::HOPELESS))
                }
                Term::All(list) => gate(list, &values, Chance::and, Chance::PERFECT),
                Term::Any(list) => gate(list, &values, Chance::or, Chance::HOPELESS),
                Term::Network(network) => network.core(&values, limits),
            };
            values.push(value);
        }
        values.pop().unwrap_or(UNKNOWN)
    }
}

fn gate(list: &[u32], values: &[Interval], join: fn(Chance, Chance) -> Chance, none: Chance) -> Interval {
    let of = |m: u32| values[m as usize];
    Interval {
        low: list.iter().fold(none, |sum, &m| join(sum, of(m).low)),
        high: list.iter().fold(none, |sum, &m| join(sum, of(m).high)),
        error: list.iter().map(|&m| of(m).error + 4.0 * UNIT).sum(),
    }
}

impl Network {
    /// The chance of a [`Term::Network`] whose things stand at one stop each,
    /// by the frontier method; see [`Network::chance`].
    pub fn frontier(&self, chances: &[Chance], limits: &Limits) -> Interval {
        let exact = |&chance: &Chance| Interval { low: chance, high: chance, error: 0.0 };
        self.core(&chances.iter().map(exact).collect::<Vec<_>>(), limits)
    }

    /// By the frontier method, its things at one stop each.
    pub(super) fn core(&self, values: &[Interval], limits: &Limits) -> Interval {
        let exact = self.stops.iter().flatten().all(|&t| values[t as usize].value().is_some());
        let given: f64 = self.stops.iter().flatten().map(|&t| values[t as usize].error).sum();
        let side = |pick: fn(&Interval) -> Chance| {
            let chance = |t: u32| pick(&values[t as usize]);
            with_sweep(self, Value { chance, limits }).unwrap_or(UNKNOWN)
        };
        let low = side(|i| i.low);
        let high = if exact { low } else { side(|i| i.high) };
        Interval { low: low.low, high: high.high, error: given + low.error.max(high.error) }
    }
}
