//! States of a two-way network with one end: which open stops are joined.

use super::course::{Act, Course, Op, Role};
use super::labels::Labels;
use super::sweep::{Next, Step, Sweep};

/// What is done to every state, with the slots open at that time.
#[derive(Clone, Copy, Debug)]
enum Done<S> {
    Open(u8, u8),
    Join(u8, u8, S),
    Close(u8, S),
}

#[derive(Clone, Debug)]
struct Layer<S> {
    thing: u32,
    act: Act,
    /// The slots open when it is decided; for [`Act::Hand`] those that are
    /// open without the closing one.
    open: S,
    after: Vec<Done<S>>,
}

/// The sweep over classes of joined stops.
#[derive(Clone, Debug)]
pub(super) struct Classes<L: Labels> {
    first: Vec<Done<L::Set>>,
    layers: Vec<Layer<L::Set>>,
}

impl<L: Labels> Classes<L> {
    /// Nothing if the labels have too few slots.
    pub(super) fn new(course: &Course) -> Option<Classes<L>> {
        // The label of a failed stop is also that of the last slot of some words.
        let slots = L::SLOTS.min(if course.stops_fail { L::MARKS.dead as usize } else { L::SLOTS });
        if course.slots > slots {
            return None;
        }
        let mut open: Vec<u8> = Vec::new();
        let first = course.first.iter().map(|&op| done::<L>(op, &mut open)).collect();
        let layers = course.layers.iter().map(|layer| {
            let before = match layer.act {
                Act::Hand(slot) => without(&open, slot),
                _ => open.clone(),
            };
            if let Act::Stop(slot, _) = layer.act {
                open.push(slot);
            }
            let set = L::set_of(&before);
            let after = layer.after.iter().map(|&op| done::<L>(op, &mut open)).collect();
            Layer { thing: layer.thing, act: layer.act, open: set, after }
        });
        let layers = layers.collect();
        Some(Classes { first, layers })
    }
}

fn without(open: &[u8], slot: u8) -> Vec<u8> {
    open.iter().copied().filter(|&s| s != slot).collect()
}

fn label<L: Labels>(slot: u8, role: Role) -> u8 {
    match role {
        Role::Plain => slot,
        Role::Start => L::MARKS.start,
        Role::End => L::MARKS.end,
    }
}

fn done<L: Labels>(op: Op, open: &mut Vec<u8>) -> Done<L::Set> {
    match op {
        Op::Open(slot, role) => {
            open.push(slot);
            Done::Open(slot, label::<L>(slot, role))
        }
        Op::Join(a, b) => Done::Join(a, b, L::set_of(open)),
        Op::Close(slot) => {
            open.retain(|&s| s != slot);
            Done::Close(slot, L::set_of(open))
        }
    }
}

/// Whether two labels name classes that a link would join.
#[inline]
fn apart<L: Labels>(a: u8, b: u8) -> bool {
    a != b && a != L::MARKS.dead && b != L::MARKS.dead
}

#[inline]
fn join<L: Labels>(state: L, a: u8, b: u8, open: &L::Set) -> Next<L> {
    let (low, high) = (a.min(b), a.max(b));
    if high < L::MARKS.start {
        Next::On(state.relabel(high, low, open))
    } else if low < L::MARKS.start {
        Next::On(state.relabel(low, high, open))
    } else {
        Next::Works
    }
}

/// Closes a slot; the class fails the network if it was the start's or the
/// end's and has no other open stop.
#[inline]
fn close<L: Labels>(state: L, slot: u8, rest: &L::Set) -> Next<L> {
    let label = state.get(slot);
    let state = state.closed(slot);
    if label == L::MARKS.dead {
        return Next::On(state);
    }
    if label == slot || label >= L::MARKS.start {
        return match state.first(label, rest) {
            Some(next) if label == slot => Next::On(state.relabel(label, next, rest)),
            None if label != slot => Next::Fails,
            _ => Next::On(state),
        };
    }
    Next::On(state)
}

#[inline]
fn run<L: Labels>(ops: &[Done<L::Set>], state: L) -> Next<L> {
    let mut state = state;
    for op in ops {
        let next = match op {
            Done::Open(slot, label) => Next::On(state.with(*slot, *label)),
            Done::Join(a, b, open) => {
                let (a, b) = (state.get(*a), state.get(*b));
                if apart::<L>(a, b) { join(state, a, b, open) } else { Next::On(state) }
            }
            Done::Close(slot, rest) => close(state, *slot, rest),
        };
        match next {
            Next::On(next) => state = next,
            end => return end,
        }
    }
    Next::On(state)
}

#[inline]
fn then<L: Labels>(next: Next<L>, after: &[Done<L::Set>]) -> Next<L> {
    match next {
        Next::On(state) => run(after, state),
        end => end,
    }
}

impl<L: Labels> Sweep for Classes<L> {
    type State = L;

    fn first(&self) -> Next<L> {
        run(&self.first, L::empty())
    }

    fn layers(&self) -> usize {
        self.layers.len()
    }

    fn thing(&self, layer: usize) -> Option<u32> {
        self.layers.get(layer).map(|l| l.thing)
    }

    #[inline]
    fn step(&self, layer: usize, state: L) -> Step<L> {
        let Layer { act, open, after, .. } = &self.layers[layer];
        match *act {
            Act::Stop(slot, role) => Step::Split(
                run(after, state.with(slot, label::<L>(slot, role))),
                // The end lies behind this stop; failed, it is out of reach.
                if role == Role::Plain { run(after, state.with(slot, L::MARKS.dead)) } else { Next::Fails },
            ),
            Act::Link(a, b) => {
                let (a, b) = (state.get(a), state.get(b));
                let otherwise = run(after, state);
                if apart::<L>(a, b) {
                    Step::Split(then(join(state, a, b, open), after), otherwise)
                } else {
                    Step::Same(otherwise)
                }
            }
            Act::Hand(slot) => {
                let fails = match close(state, slot, open) {
                    Next::On(left) => run(after, left.with(slot, slot)),
                    end => end,
                };
                Step::Split(run(after, state), fails)
            }
        }
    }
}
