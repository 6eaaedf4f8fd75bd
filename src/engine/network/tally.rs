//! States of a two-way network with several ends: which open stops are joined,
//! and how many ends each class holds.

use super::course::{Act, Course, Op, Role};
use super::labels::mix_bytes;
use super::sweep::{Next, State, Step, Sweep};

const SHUT: u8 = 252;
const DEAD: u8 = 253;
const START: u8 = 254;

/// The smallest slot of each stop's class, and by slot the ends of the class
/// that it leads. The last place counts those joined to the start.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub(super) struct Tally<const W: usize> {
    label: [u8; W],
    ends: [u8; W],
}

impl<const W: usize> State for Tally<W> {
    const NONE: Tally<W> = Tally { label: [255; W], ends: [255; W] };

    #[inline]
    fn mix(&self) -> u64 {
        mix_bytes(&self.label) ^ mix_bytes(&self.ends).rotate_left(17)
    }
}

impl<const W: usize> Tally<W> {
    /// Where the ends of a class are counted.
    fn place(label: u8) -> usize {
        if label == START { W - 1 } else { label as usize % W }
    }

    fn open(mut self, slot: u8, role: Role) -> Tally<W> {
        let label = if role == Role::Start { START } else { slot };
        self.label[slot as usize % W] = label;
        if role == Role::End {
            self.ends[Self::place(label)] += 1;
        }
        self
    }

    fn dead(mut self, slot: u8) -> Tally<W> {
        self.label[slot as usize % W] = DEAD;
        self
    }

    fn of(&self, slot: u8) -> u8 {
        self.label[slot as usize % W]
    }

    fn apart(&self, a: u8, b: u8) -> bool {
        let (a, b) = (self.of(a), self.of(b));
        a != b && a != DEAD && b != DEAD
    }

    fn relabel(&mut self, from: u8, to: u8) {
        for l in self.label.iter_mut().filter(|l| **l == from) {
            *l = to;
        }
        let moved = std::mem::take(&mut self.ends[Self::place(from)]);
        self.ends[Self::place(to)] += moved;
    }

    fn join(mut self, a: u8, b: u8) -> Tally<W> {
        let (a, b) = (self.of(a), self.of(b));
        let (low, high) = (a.min(b), a.max(b));
        if high == START {
            self.relabel(low, high)
        } else {
            self.relabel(high, low)
        }
        self
    }

    /// Closes a slot; false if the start's class is cut off.
    fn close(&mut self, slot: u8) -> bool {
        let label = self.of(slot);
        self.label[slot as usize % W] = SHUT;
        if label == DEAD {
            return true;
        }
        match self.label.iter().position(|&l| l == label) {
            Some(next) if label == slot => self.relabel(label, next as u8),
            None if label == START => return false,
            // What the class held can no longer be reached.
            None => self.ends[Self::place(label)] = 0,
            _ => {}
        }
        true
    }
}

/// The sweep that counts ends.
#[derive(Clone, Debug)]
pub(super) struct Tallies<const W: usize> {
    course: Course,
    need: usize,
    /// For each layer, how many ends are decided after it.
    later: Vec<usize>,
}

impl<const W: usize> Tallies<W> {
    /// Nothing if there are too few slots or too many ends.
    pub(super) fn new(course: &Course, ends: usize, need: usize) -> Option<Tallies<W>> {
        if course.slots > W - 1 || ends > 250 {
            return None;
        }
        let opens = |ops: &[Op]| ops.iter().filter(|op| matches!(op, Op::Open(_, Role::End))).count();
        let mut left = ends - opens(&course.first).min(ends);
        let later = course.layers.iter().map(|layer| {
            let own = usize::from(matches!(layer.act, Act::Stop(_, Role::End)));
            left = left.saturating_sub(own + opens(&layer.after));
            left
        });
        let later = later.collect();
        Some(Tallies { course: course.clone(), need, later })
    }

    fn run(&self, ops: &[Op], mut state: Tally<W>, later: usize) -> Next<Tally<W>> {
        for &op in ops {
            match op {
                Op::Open(slot, role) => state = state.open(slot, role),
                Op::Join(a, b) if state.apart(a, b) => state = state.join(a, b),
                Op::Join(..) => {}
                Op::Close(slot) => {
                    if !state.close(slot) {
                        return self.settled(&state).unwrap_or(Next::Fails);
                    }
                }
            }
            if let Some(end) = self.settled(&state) {
                return end;
            }
        }
        let held: usize = state.ends.iter().map(|&e| e as usize).sum();
        if held + later < self.need { Next::Fails } else { Next::On(state) }
    }

    fn settled(&self, state: &Tally<W>) -> Option<Next<Tally<W>>> {
        (state.ends[W - 1] as usize >= self.need).then_some(Next::Works)
    }
}

impl<const W: usize> Sweep for Tallies<W> {
    type State = Tally<W>;

    fn first(&self) -> Next<Tally<W>> {
        let state = Tally { label: [SHUT; W], ends: [0; W] };
        self.run(&self.course.first, state, usize::MAX / 2)
    }

    fn layers(&self) -> usize {
        self.course.layers.len()
    }

    fn thing(&self, layer: usize) -> Option<u32> {
        self.course.layers.get(layer).map(|l| l.thing)
    }

    fn step(&self, layer: usize, state: Tally<W>) -> Step<Tally<W>> {
        let (found, later) = (&self.course.layers[layer], self.later[layer]);
        let run = |state| self.run(&found.after, state, later);
        let joined = |state: Tally<W>| self.settled(&state).unwrap_or_else(|| run(state));
        match found.act {
            Act::Stop(slot, Role::Start) => Step::Split(run(state.open(slot, Role::Start)), Next::Fails),
            Act::Stop(slot, role) => Step::Split(run(state.open(slot, role)), run(state.dead(slot))),
            Act::Link(a, b) if state.apart(a, b) => Step::Split(joined(state.join(a, b)), run(state)),
            Act::Link(..) => Step::Same(run(state)),
            Act::Hand(slot) => {
                let mut left = state;
                let fails = if left.close(slot) { run(left.open(slot, Role::Plain)) } else { Next::Fails };
                Step::Split(run(state), fails)
            }
        }
    }
}
