//! A real number as the unevaluated sum of two doubles.
//!
//! Source: T. J. Dekker, "A floating-point technique for extending the
//! available precision", Numer. Math. 18 (1971); error bounds after
//! M. Joldes, J.-M. Muller, V. Popescu, "Tight and rigorous error bounds for
//! basic building blocks of double-word arithmetic", ACM TOMS 44 (2017).
//! One operation here has a relative error of at most 2^-100 (the paper's
//! bounds are 3 u^2 to 10 u^2 with u = 2^-53), as long as no part underflows;
//! near 1e-300 the low part is subnormal and about 80 bits remain.

use std::cmp::Ordering;
use std::ops::{Add, AddAssign, Div, Mul, MulAssign, Neg, Sub};

/// A number with a relative precision of about 2^-100.
///
/// Invariant: `hi` is the double nearest to `hi + lo`.
#[derive(Clone, Copy, PartialEq, Debug, Default)]
pub struct Real {
    hi: f64,
    lo: f64,
}

/// `a + b` exactly, as a rounded sum and its error, for |a| >= |b|.
#[inline]
fn quick_two_sum(a: f64, b: f64) -> (f64, f64) {
    let s = a + b;
    (s, b - (s - a))
}

/// `a + b` exactly, as a rounded sum and its error.
#[inline]
fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let s = a + b;
    let bb = s - a;
    (s, (a - (s - bb)) + (b - bb))
}

/// `a * b` exactly, as a rounded product and its error.
#[inline]
fn two_prod(a: f64, b: f64) -> (f64, f64) {
    let p = a * b;
    (p, a.mul_add(b, -p))
}

impl Real {
    /// 0.
    pub const ZERO: Real = Real { hi: 0.0, lo: 0.0 };
    /// 1.
    pub const ONE: Real = Real { hi: 1.0, lo: 0.0 };

    /// `hi + lo` as they stand, for constants that are in normal form already.
    pub(super) const fn pair(hi: f64, lo: f64) -> Real {
        Real { hi, lo }
    }

    /// `hi + lo`, brought into normal form.
    pub fn from_parts(hi: f64, lo: f64) -> Real {
        let (hi, lo) = two_sum(hi, lo);
        if hi.is_finite() { Real { hi, lo } } else { Real { hi, lo: 0.0 } }
    }

    /// The leading double: the number rounded to 53 bits.
    pub fn hi(self) -> f64 {
        self.hi
    }

    /// What [`Real::hi`] leaves.
    pub fn lo(self) -> f64 {
        self.lo
    }

    /// The nearest double.
    pub fn to_f64(self) -> f64 {
        self.hi
    }

    /// Whether it is exactly zero.
    pub fn is_zero(self) -> bool {
        self.hi == 0.0
    }

    /// Whether it is below zero.
    pub fn is_negative(self) -> bool {
        self.hi < 0.0
    }

    /// Whether it is neither infinite nor undefined.
    pub fn is_finite(self) -> bool {
        self.hi.is_finite()
    }

    /// The value without its sign.
    pub fn abs(self) -> Real {
        if self.is_negative() { -self } else { self }
    }

    /// The smaller of two.
    pub fn min(self, other: Real) -> Real {
        if other < self { other } else { self }
    }

    /// The larger of two.
    pub fn max(self, other: Real) -> Real {
        if other > self { other } else { self }
    }
}

impl From<f64> for Real {
    fn from(value: f64) -> Real {
        Real { hi: value, lo: 0.0 }
    }
}

impl From<u32> for Real {
    fn from(value: u32) -> Real {
        Real::from(f64::from(value))
    }
}

impl PartialOrd for Real {
    #[inline]
    fn partial_cmp(&self, other: &Real) -> Option<Ordering> {
        match self.hi.partial_cmp(&other.hi) {
            Some(Ordering::Equal) => self.lo.partial_cmp(&other.lo),
            unequal => unequal,
        }
    }
}

impl Neg for Real {
    type Output = Real;
    #[inline]
    fn neg(self) -> Real {
        Real { hi: -self.hi, lo: -self.lo }
    }
}

impl Add for Real {
    type Output = Real;
    #[inline]
    fn add(self, other: Real) -> Real {
        let (sh, sl) = two_sum(self.hi, other.hi);
        if !sh.is_finite() {
            return Real::from(sh);
        }
        let (th, tl) = two_sum(self.lo, other.lo);
        let (vh, vl) = quick_two_sum(sh, sl + th);
        let (hi, lo) = quick_two_sum(vh, tl + vl);
        Real { hi, lo }
    }
}

impl Sub for Real {
    type Output = Real;
    #[inline]
    fn sub(self, other: Real) -> Real {
        self + -other
    }
}

impl Mul for Real {
    type Output = Real;
    #[inline]
    fn mul(self, other: Real) -> Real {
        let (ph, pl) = two_prod(self.hi, other.hi);
        if !ph.is_finite() || ph == 0.0 {
            return Real::from(ph);
        }
        let cross = self.hi.mul_add(other.lo, self.lo * other.hi);
        let (hi, lo) = quick_two_sum(ph, pl + cross);
        Real { hi, lo }
    }
}

impl Div for Real {
    type Output = Real;
    fn div(self, other: Real) -> Real {
        let q1 = self.hi / other.hi;
        if !q1.is_finite() || q1 == 0.0 {
            return Real::from(q1);
        }
        let r = self - other * Real::from(q1);
        let q2 = r.hi / other.hi;
        let r = r - other * Real::from(q2);
        let q3 = r.hi / other.hi;
        let (hi, lo) = quick_two_sum(q1, q2);
        Real { hi, lo } + Real::from(q3)
    }
}

impl AddAssign for Real {
    #[inline]
    fn add_assign(&mut self, other: Real) {
        *self = *self + other;
    }
}

impl MulAssign for Real {
    #[inline]
    fn mul_assign(&mut self, other: Real) {
        *self = *self * other;
    }
}
