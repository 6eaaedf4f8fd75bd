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

    /// From a cumulative hazard `h`, zero or more: works with exp(-h), fails
    /// with 1 - exp(-h), both to full relative precision. Undefined below zero.
    pub fn from_hazard(hazard: Real) -> Chance {
        if hazard.is_negative() {
            return Chance { works: Real::from(f64::NAN), fails: Real::from(f64::NAN) };
        }
        // One elementary function gives both: the side below one half is
        // computed, and to take it from 1 costs the other no digit.
        if hazard.hi() < std::f64::consts::LN_2 {
            let fails = -(-hazard).exp_m1();
            Chance::new(Real::ONE - fails, fails)
        } else {
            let works = (-hazard).exp();
            Chance::new(works, Real::ONE - works)
        }
    }

    /// The cumulative hazard -ln(works), to full relative precision however
    /// close to 0 or 1 it works; infinite where it cannot work.
    pub fn hazard(self) -> Real {
        if self.fails < Real::from(0.5) { -(-self.fails).ln_1p() } else { -self.works.ln() }
    }

    /// works^n for an `n` of zero or more: n independent ones in series, or
    /// one whose exposure is stretched n times at a constant rate.
    ///
    /// "Fails" is to full relative precision; the relative error of "works" is
    /// that of any power, 2^-96 times 1 + the hazard.
    #[must_use]
    pub fn power(self, n: Real) -> Chance {
        // Apart, because infinity times zero is undefined.
        if n.is_zero() { Chance::PERFECT } else { Chance::from_hazard(self.hazard() * n) }
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::{Random, Wide, relative_error, wide};
    use super::*;

    #[test]
    fn hazards_keep_both_tails() {
        let mut random = Random(10);
        for _ in 0..1000 {
            let hazard = random.sized(-900, 9);
            let chance = Chance::from_hazard(hazard);
            let fails = -(-wide(hazard)).exp_m1();
            // One function each, to its documented 2^-96.
            let tolerance = 2f64.powi(-96);
            assert!(relative_error(chance.fails(), &fails) <= tolerance, "{hazard:?}");
            // The way back: the inverse's conditioning is at most 1 on the
            // smaller side, so that the two errors add up.
            let error = relative_error(chance.hazard(), &wide(hazard));
            assert!(error <= 2.0 * tolerance, "{hazard:?}: {error:e}");
        }
        assert_eq!(Chance::from_hazard(Real::ZERO), Chance::PERFECT);
        assert_eq!(Chance::from_hazard(Real::from(f64::INFINITY)), Chance::HOPELESS);
        assert_eq!(Chance::HOPELESS.hazard().hi(), f64::INFINITY);
        assert!(Chance::PERFECT.hazard().is_zero());
        assert!(Chance::from_hazard(Real::from(-1.0)).works().hi().is_nan());
    }

    #[test]
    fn powers_keep_both_tails() {
        let mut random = Random(11);
        for _ in 0..300 {
            let fails = random.sized(-300, -1);
            let n = 1 + random.bits() % 50;
            let chance = Chance::new(Real::ONE - fails, fails).power(Real::from_u64(n));
            let log = (-wide(fails)).ln_1p() * Wide::from(n);
            // The documented error, for hazards of 35 at most.
            let tolerance = 2f64.powi(-96) * 36.0;
            assert!(relative_error(chance.fails(), &-log.exp_m1()) <= tolerance, "{fails:?} {n}");
            assert!(relative_error(chance.works(), &log.exp()) <= tolerance, "{fails:?} {n}");
        }
        assert_eq!(Chance::HOPELESS.power(Real::ZERO), Chance::PERFECT);
        assert_eq!(Chance::HOPELESS.power(Real::ONE), Chance::HOPELESS);
        assert_eq!(Chance::PERFECT.power(Real::from(9.0)), Chance::PERFECT);
    }
}
