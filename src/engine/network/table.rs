//! Masses by state, in a table that is walked in the order of its slots.
//!
//! Open addressing with linear probing (D. E. Knuth, "The Art of Computer
//! Programming", vol. 3, section 6.4). The order depends on the states only,
//! so that sums come out the same on every machine.

use super::sweep::State;
use crate::number::Real;

/// A state and its mass.
#[derive(Clone, Copy, Debug)]
pub(super) struct Entry<S> {
    pub(super) state: S,
    pub(super) mass: Real,
}

/// States with the sums of their masses.
#[derive(Debug)]
pub(super) struct Table<S> {
    entries: Vec<Entry<S>>,
    len: usize,
}

impl<S: State> Table<S> {
    /// With room for about `len` states.
    pub(super) fn with_room(len: usize) -> Table<S> {
        let size = (len + len / 7 + 16).next_power_of_two();
        Table { entries: vec![Entry { state: S::NONE, mass: Real::ZERO }; size], len: 0 }
    }

    /// How many states it holds.
    pub(super) fn len(&self) -> usize {
        self.len
    }

    /// Adds to the mass of a state.
    #[inline]
    pub(super) fn add(&mut self, state: S, mass: Real) {
        let mask = self.entries.len() - 1;
        let mut at = state.mix() as usize & mask;
        loop {
            let entry = &mut self.entries[at];
            if entry.state == state {
                entry.mass += mass;
                return;
            }
            if entry.state == S::NONE {
                *entry = Entry { state, mass };
                break;
            }
            at = (at + 1) & mask;
        }
        self.len += 1;
        if self.len > self.entries.len() / 8 * 7 {
            self.grow();
        }
    }

    #[cold]
    fn grow(&mut self) {
        let size = self.entries.len() * 2;
        let empty = Entry { state: S::NONE, mass: Real::ZERO };
        let old = std::mem::replace(&mut self.entries, vec![empty; size]);
        for entry in old.into_iter().filter(|e| e.state != S::NONE) {
            let mut at = entry.state.mix() as usize & (size - 1);
            while self.entries[at].state != S::NONE {
                at = (at + 1) & (size - 1);
            }
            self.entries[at] = entry;
        }
    }

    /// All states, in the order of the table.
    pub(super) fn iter(&self) -> impl Iterator<Item = &Entry<S>> {
        self.entries.iter().filter(|e| e.state != S::NONE)
    }
}
