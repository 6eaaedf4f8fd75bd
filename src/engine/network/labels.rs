//! Labels of open stops in one word: the smallest open slot of the stop's
//! class, so that equal states are equal words.

use super::sweep::{State, mixed};

/// Labels that are no slots, the highest first.
#[derive(Clone, Copy, Debug)]
pub(super) struct Marks {
    /// Joined to the end.
    pub(super) end: u8,
    /// Joined to the start.
    pub(super) start: u8,
    /// Has failed.
    pub(super) dead: u8,
}

/// One label for each slot.
pub(super) trait Labels: State {
    /// The labels that are no slots.
    const MARKS: Marks;
    /// How many slots there are room for if no stop can fail, so that the
    /// label of failed ones is free.
    const SLOTS: usize;
    /// A set of slots.
    type Set: Copy + std::fmt::Debug + Send + Sync;
    /// No stop is open.
    fn empty() -> Self;
    /// The set of these slots.
    fn set_of(slots: &[u8]) -> Self::Set;
    /// The label in a slot.
    fn get(self, slot: u8) -> u8;
    /// The same with another label in a slot. A closed slot holds 0 or what
    /// equals no label in use.
    fn with(self, slot: u8, label: u8) -> Self;
    /// The same with a slot closed.
    fn closed(self, slot: u8) -> Self;
    /// The same with one label put for another in the open slots.
    fn relabel(self, from: u8, to: u8, open: &Self::Set) -> Self;
    /// The first open slot with a label.
    fn first(self, label: u8, open: &Self::Set) -> Option<u8>;
}

const ONES: u64 = 0x1111_1111_1111_1111;

/// The lowest bit of each nibble that equals `label`.
#[inline]
fn equal(word: u64, label: u8) -> u64 {
    let x = word ^ (u64::from(label) * ONES);
    let any = x | (x >> 1) | (x >> 2) | (x >> 3);
    !any & ONES
}

impl State for u64 {
    const NONE: u64 = u64::MAX;

    #[inline]
    fn mix(&self) -> u64 {
        mixed(*self)
    }
}

/// A nibble for each of 14 slots.
impl Labels for u64 {
    const MARKS: Marks = Marks { end: 15, start: 14, dead: 13 };
    const SLOTS: usize = 14;
    type Set = u64;

    fn empty() -> u64 {
        0
    }

    fn set_of(slots: &[u8]) -> u64 {
        slots.iter().fold(0, |set, &s| set | 1 << (4 * s))
    }

    #[inline]
    fn get(self, slot: u8) -> u8 {
        (self >> (4 * slot)) as u8 & 15
    }

    #[inline]
    fn with(self, slot: u8, label: u8) -> u64 {
        self & !(15 << (4 * slot)) | u64::from(label) << (4 * slot)
    }

    #[inline]
    fn closed(self, slot: u8) -> u64 {
        self & !(15 << (4 * slot))
    }

    #[inline]
    fn relabel(self, from: u8, to: u8, open: &u64) -> u64 {
        self ^ ((equal(self, from) & open) * u64::from(from ^ to))
    }

    #[inline]
    fn first(self, label: u8, open: &u64) -> Option<u8> {
        let hits = equal(self, label) & open;
        (hits != 0).then(|| (hits.trailing_zeros() / 4) as u8)
    }
}

/// A byte for each slot.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub(super) struct Bytes<const W: usize>([u8; W]);

const SHUT: u8 = 252;

impl<const W: usize> State for Bytes<W> {
    const NONE: Bytes<W> = Bytes([255; W]);

    #[inline]
    fn mix(&self) -> u64 {
        mix_bytes(&self.0)
    }
}

/// A well mixed number of bytes.
#[inline]
pub(super) fn mix_bytes(bytes: &[u8]) -> u64 {
    bytes.chunks(8).fold(0, |h, chunk| {
        let word = chunk.iter().rev().fold(0u64, |w, &b| w << 8 | u64::from(b));
        mixed(h.rotate_left(23) ^ word)
    })
}

impl<const W: usize> Labels for Bytes<W> {
    const MARKS: Marks = Marks { end: 255, start: 254, dead: 253 };
    // One byte stays shut, so that no state equals the mark for none.
    const SLOTS: usize = W - 1;
    type Set = ();

    fn empty() -> Self {
        Bytes([SHUT; W])
    }

    fn set_of(_: &[u8]) {}

    #[inline]
    fn get(self, slot: u8) -> u8 {
        self.0[slot as usize % W]
    }

    #[inline]
    fn with(mut self, slot: u8, label: u8) -> Self {
        self.0[slot as usize % W] = label;
        self
    }

    #[inline]
    fn closed(self, slot: u8) -> Self {
        self.with(slot, SHUT)
    }

    #[inline]
    fn relabel(mut self, from: u8, to: u8, (): &()) -> Self {
        for b in &mut self.0 {
            *b = if *b == from { to } else { *b };
        }
        self
    }

    #[inline]
    fn first(self, label: u8, (): &()) -> Option<u8> {
        self.0.iter().position(|&b| b == label).map(|at| at as u8)
    }
}
