//! Exact references for the tests: a [`Real`] as a binary fraction of
//! unlimited precision, and seeded random arguments.

use super::Real;
use dashu_float::FBig;
use dashu_float::round::mode::HalfEven;

/// Reference numbers, with 320 bits.
pub(super) type Wide = FBig<HalfEven, 2>;

/// The precision of the references, far above the 106 bits under test.
const BITS: usize = 320;

/// The exact value of a double.
fn wide_f64(x: f64) -> Wide {
    Wide::try_from(x).expect("finite").with_precision(BITS).value()
}

/// The value of a [`Real`], to 320 bits.
pub(super) fn wide(x: Real) -> Wide {
    wide_f64(x.hi()) + wide_f64(x.lo())
}

/// |got - want| / |want|.
pub(super) fn relative_error(got: Real, want: &Wide) -> f64 {
    let gap = (wide(got) - want) / want;
    gap.to_f64().value().abs()
}

/// SplitMix64 (Steele, Lea, Flood 2014), seeded, so that a failure repeats.
pub(super) struct Random(pub(super) u64);

impl Random {
    pub(super) fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Uniform in 0 to 1, with a full low part.
    pub(super) fn unit(&mut self) -> Real {
        let part = |bits: u64| (bits >> 11) as f64 / (1u64 << 53) as f64;
        Real::from_parts(part(self.bits()), part(self.bits()) * 2f64.powi(-53))
    }

    /// Uniform between two bounds.
    pub(super) fn between(&mut self, low: f64, high: f64) -> Real {
        Real::from(low) + self.unit() * Real::from(high - low)
    }

    /// Of any size between 2^low and 2^high.
    pub(super) fn sized(&mut self, low: i32, high: i32) -> Real {
        let k = low + (self.bits() % (high - low) as u64) as i32;
        super::functions::scale(Real::ONE + self.unit(), k)
    }
}
