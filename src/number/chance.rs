//! A probability with both tails.

use super::Real;

/// The probability that a thing works and that it fails, each to full
/// relative precision.
///
/// Invariant: both lie in 0 to 1, and the larger is 1 minus the smaller. The
/// operations compute the smaller side from positive terms and reset the
/// larger one after each step; without that reset a long product of values
/// near 1 loses three to four digits to rounding bias.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Chance {
    works: Real,
    fails: Real,
}

impl Chance {
    /// Cannot fail.
    pub const PERFECT: Chance = Chance { works: Real::ONE, fails: Real::ZERO };
    /// Cannot work.
    pub const HOPELESS: Chance = Chance { works: Real::ZERO, fails: Real::ONE };

    /// From both tails, each as precise as it can be had; the larger is then
    /// taken as 1 minus the smaller.
    pub fn new(works: Real, fails: Real) -> Chance {
        if fails <= works {
            Chance { works: Real::ONE - fails, fails }
        } else {
            Chance { works, fails: Real::ONE - works }
        }
    }

    /// Probability that it works.
    pub fn works(self) -> Real {
        self.works
    }

    /// Probability that it fails.
    pub fn fails(self) -> Real {
        self.fails
    }

    /// The smaller of the two tails.
    pub fn smaller(self) -> Real {
        self.works.min(self.fails)
    }

    /// The same with works and fails exchanged.
    #[must_use]
    pub fn flip(self) -> Chance {
        Chance { works: self.fails, fails: self.works }
    }

    /// Both work (independent, in series).
    #[must_use]
    pub fn and(self, other: Chance) -> Chance {
        Chance::new(self.works * other.works, self.fails + self.works * other.fails)
    }

    /// At least one works (independent, in parallel).
    #[must_use]
    pub fn or(self, other: Chance) -> Chance {
        self.flip().and(other.flip()).flip()
    }

    /// Total probability: `then` where this works, `otherwise` where it fails.
    #[must_use]
    pub fn choose(self, then: Chance, otherwise: Chance) -> Chance {
        Chance::new(
            self.works * then.works + self.fails * otherwise.works,
            self.works * then.fails + self.fails * otherwise.fails,
        )
    }
}
