//! Elementary functions of a [`Real`].
//!
//! Nothing here calls the platform's `exp` or `ln`, whose last bits differ
//! between machines: the arguments are reduced exactly and the rest is a
//! series, so that the result has the same bits everywhere. The methods are
//! the usual ones (J.-M. Muller, "Elementary Functions", 3rd ed. 2016, ch. 11
//! for the reduction in two and three parts; Y. Hida, X. Li, D. Bailey,
//! "Library for double-double and quad-double arithmetic", 2007, for the
//! scaled Taylor series; cited from memory).
//!
//! The relative error is at most 2^-96, powers excepted (see
//! [`Real::powf`]). Results below about 1e-290 have a subnormal low part and
//! lose bits as [`Real`] itself does there.

use super::Real;
use super::constants::{INVERSE_FACTORIALS, INVERSE_ODDS, LN_2, LN_2_PARTS, LOG10_E, REAL_TENS};

const TWO: Real = Real::pair(2.0, 0.0);
const HALF: Real = Real::pair(0.5, 0.0);
const INFINITY: Real = Real::pair(f64::INFINITY, 0.0);
const UNDEFINED: Real = Real::pair(f64::NAN, 0.0);

/// Arguments below this are returned as they are by functions of the form
/// x + O(x^2), which are then right to 1e-35 < 2^-110. It also keeps
/// subnormal intermediates out of the series.
const TINY: f64 = 1e-35;

/// 2^k for a k in the range of normal doubles.
fn power_of_two(k: i32) -> f64 {
    f64::from_bits(((k + 1023) as u64) << 52)
}

/// The k with 2^k <= |x| < 2^(k+1), for a finite x that is not zero.
pub(super) fn binary_exponent(x: f64) -> i32 {
    let field = |x: f64| ((x.to_bits() >> 52) & 0x7ff) as i32;
    match field(x) {
        0 => field(x * power_of_two(64)) - 1023 - 64,
        k => k - 1023,
    }
}

/// `x * 2^k`, for |k| up to 2044.
pub(super) fn scale(x: Real, k: i32) -> Real {
    // Two factors, because 2^k itself can be out of range where x * 2^k is not.
    let (a, b) = (power_of_two(k / 2), power_of_two(k - k / 2));
    Real::from_parts(x.hi() * a * b, x.lo() * a * b)
}

/// exp(r) - 1 for |r| <= 0.35, to full relative precision.
fn exp_m1_reduced(r: Real) -> Real {
    if r.hi().abs() < TINY {
        return r;
    }
    // On |s| < 0.011 the first term left out, s^14/14!, is below 2^-115 of s.
    let s = scale(r, -5);
    let (last, rest) = (INVERSE_FACTORIALS[11], &INVERSE_FACTORIALS[..11]);
    let series = rest.iter().rev().fold(last, |sum, &c| sum * s + c);
    let mut e = s + s * s * series;
    // exp(2s) - 1 = e (e + 2): the small quantity stays the one that is held.
    for _ in 0..5 {
        e = e * (e + TWO);
    }
    e
}

/// The whole number k nearest to x / ln 2, and x - k ln 2.
fn reduce(x: Real) -> (i32, Real) {
    let k = (x.hi() * std::f64::consts::LOG2_E).round();
    let [a, b, c] = LN_2_PARTS;
    (k as i32, x - Real::from(k * a) - Real::from(k * b) - Real::from(k * c))
}

/// 2 atanh(s) for |s| < 0.1716, to full relative precision.
fn twice_atanh(s: Real) -> Real {
    // s^2 < 0.02945: the first term left out, s^44/45, is below 2^-117.
    let q = s * s;
    let (last, rest) = (INVERSE_ODDS[20], &INVERSE_ODDS[..20]);
    let series = rest.iter().rev().fold(last, |sum, &c| sum * q + c);
    let half = s + s * q * series;
    half + half
}

/// ln(1 + f) for 1 + f between sqrt(1/2) and sqrt(2).
fn ln_1p_reduced(f: Real) -> Real {
    if f.hi().abs() < TINY { f } else { twice_atanh(f / (TWO + f)) }
}

impl Real {
    /// A whole number, exactly.
    pub const fn from_u64(value: u64) -> Real {
        Real::from_u128(value as u128)
    }

    /// A whole number: exact below 2^106, and otherwise rounded to a relative
    /// error of 2^-107.
    pub const fn from_u128(value: u128) -> Real {
        let hi = value as f64;
        // 2^128 itself does not come back as a u128; the cast saturates. What
        // is left is then 2^128 - value, which is the wrapped negative.
        let lo = if hi == 340282366920938463463374607431768211456.0 {
            -(value.wrapping_neg() as f64)
        } else if value >= hi as u128 {
            (value - hi as u128) as f64
        } else {
            -((hi as u128 - value) as f64)
        };
        Real::pair(hi, lo)
    }

    /// 1 / self.
    #[must_use]
    pub fn recip(self) -> Real {
        Real::ONE / self
    }

    /// The largest whole number that is not above it.
    #[must_use]
    pub fn floor(self) -> Real {
        let hi = self.hi().floor();
        if hi == self.hi() && hi.is_finite() {
            Real::from_parts(hi, self.lo().floor())
        } else {
            // With a fractional part in `hi` the low part cannot reach the
            // whole number below, only an exact one would be passed.
            Real::from(hi)
        }
    }

    /// Whether it is a whole number (infinity is none).
    pub fn is_integer(self) -> bool {
        self.is_finite() && self.hi().fract() == 0.0 && self.lo().fract() == 0.0
    }

    /// As an `i64`, if it is a whole number of that range.
    fn to_i64(self) -> Option<i64> {
        const LIMIT: f64 = 9.0e18;
        (self.is_integer() && self.hi().abs() < LIMIT).then(|| self.hi() as i64 + self.lo() as i64)
    }

    /// Square root; undefined below zero.
    #[must_use]
    pub fn sqrt(self) -> Real {
        if self.is_zero() || self.hi() == f64::INFINITY {
            return self;
        }
        if self.hi() < 1e-250 {
            // The square of the estimate must keep its low part.
            return if self.is_negative() { UNDEFINED } else { scale(scale(self, 512).sqrt(), -256) };
        }
        // IEEE 754 demands a correctly rounded f64::sqrt, so this seed is
        // portable. One Newton step takes it to twice its bits.
        let seed = Real::from(self.hi().sqrt());
        seed + (self - seed * seed) / (seed + seed)
    }

    /// e to the power of it.
    #[must_use]
    pub fn exp(self) -> Real {
        match self.hi() {
            x if x.is_nan() => self,
            x if x > 710.0 => INFINITY,
            x if x < -746.0 => Real::ZERO,
            _ => {
                let (k, r) = reduce(self);
                scale(Real::ONE + exp_m1_reduced(r), k)
            }
        }
    }

    /// exp(self) - 1, to full relative precision also for tiny arguments.
    #[must_use]
    pub fn exp_m1(self) -> Real {
        if self.hi().abs() < 0.34 { exp_m1_reduced(self) } else { self.exp() - Real::ONE }
    }

    /// Natural logarithm: minus infinity at zero, undefined below.
    #[must_use]
    pub fn ln(self) -> Real {
        match self.hi() {
            x if x.is_nan() || x < 0.0 => UNDEFINED,
            0.0 => -INFINITY,
            f64::INFINITY => INFINITY,
            x => {
                let mut k = binary_exponent(x);
                let mut m = scale(self, -k);
                if m.hi() > std::f64::consts::SQRT_2 {
                    k += 1;
                    m = scale(m, -1);
                }
                // With m between 0.707 and 1.414, a k other than 0 leaves at
                // least half of k ln 2: the sum loses one bit at most. With
                // k = 0, m - 1 is exact and its logarithm relatively precise.
                let small = ln_1p_reduced(m - Real::ONE);
                if k == 0 { small } else { LN_2 * Real::from(f64::from(k)) + small }
            }
        }
    }

    /// ln(1 + self), to full relative precision also for tiny arguments:
    /// minus infinity at -1, undefined below.
    #[must_use]
    pub fn ln_1p(self) -> Real {
        if self.hi() > -0.29 && self.hi() < 0.41 { ln_1p_reduced(self) } else { (Real::ONE + self).ln() }
    }

    /// Decimal logarithm; whole for the powers of ten that are exact, 10^0 to
    /// 10^38.
    #[must_use]
    pub fn log10(self) -> Real {
        let log = self.ln() * LOG10_E;
        let near = log.hi().round();
        if (0.0..=38.0).contains(&near) && self == REAL_TENS[near as usize] { Real::from(near) } else { log }
    }

    /// A whole power. 0^0 is 1, as in every product of no factors.
    ///
    /// The relative error is at most 2^-96 for exponents up to 128, and as for
    /// [`Real::powf`] beyond.
    #[must_use]
    pub fn powi(self, exponent: i64) -> Real {
        if exponent == 0 {
            return Real::ONE;
        }
        let odd = exponent % 2 != 0;
        if self.is_zero() || !self.is_finite() {
            let size = if (exponent > 0) == self.is_zero() { Real::ZERO } else { INFINITY };
            return match self.hi() {
                x if x.is_nan() => self,
                x if x < 0.0 && odd => -size,
                _ => size,
            };
        }
        // The power of the fraction and that of 2^k apart, so that neither a
        // step nor a reciprocal leaves the range where the result does not.
        let k = i64::from(binary_exponent(self.hi()));
        let mut base = scale(self.abs(), -(k as i32));
        let size = if exponent.unsigned_abs() <= 128 {
            let mut left = exponent.unsigned_abs();
            let mut product = Real::ONE;
            while left > 0 {
                if left % 2 == 1 {
                    product *= base;
                }
                base *= base;
                left /= 2;
            }
            let product = if exponent < 0 { product.recip() } else { product };
            shift(product, k * exponent)
        } else {
            (self.abs().ln() * from_i64(exponent)).exp()
        };
        if self.is_negative() && odd { -size } else { size }
    }

    /// A power: of a base above zero, or of any base if the exponent is whole.
    ///
    /// The result is exp(y ln x), so that its relative error grows with the
    /// size of its own logarithm: at most 2^-97 (1 + |y ln x|), which is
    /// 2^-94 for a result between 1e-3 and 1e3 and 2^-87 at the ends of the
    /// range of doubles. An error of 2^-100 in x or y moves it as much.
    #[must_use]
    pub fn powf(self, exponent: Real) -> Real {
        if let Some(whole) = exponent.to_i64() {
            return self.powi(whole);
        }
        if exponent == HALF {
            return self.sqrt();
        }
        if self == Real::ONE {
            return Real::ONE;
        }
        (self.ln() * exponent).exp()
    }
}

/// A signed whole number, exactly.
fn from_i64(value: i64) -> Real {
    let size = Real::from_u64(value.unsigned_abs());
    if value < 0 { -size } else { size }
}

/// `x * 2^k` for any k and an x between 2^-200 and 2^200.
fn shift(x: Real, k: i64) -> Real {
    match k {
        1300.. => INFINITY,
        -1300..1300 => scale(x, k as i32),
        _ => Real::ZERO,
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::{Random, Wide, relative_error, wide};
    use super::*;

    /// The documented bound, for every function but long powers.
    const TOLERANCE: f64 = 1.262e-29; // 2^-96

    fn check(name: &str, argument: Real, got: Real, want: &Wide) {
        let error = relative_error(got, want);
        assert!(error <= TOLERANCE, "{name}({argument:?}) = {got:?} is off by {error:e}");
    }

    /// Small and near-one arguments beside the random ones.
    fn arguments(random: &mut Random) -> Vec<Real> {
        let mut all: Vec<Real> = (0..500).map(|_| random.sized(-900, 1020)).collect();
        all.extend((0..500).map(|_| random.between(0.5, 2.0)));
        for k in 1..100 {
            let step = scale(Real::ONE + random.unit(), -k);
            all.extend([Real::ONE + step, Real::ONE - step]);
        }
        all.extend([std::f64::consts::SQRT_2, 1.0, f64::MAX, 1e-280].map(Real::from));
        all
    }

    #[test]
    fn exponentials_are_precise() {
        let mut random = Random(4);
        let mut all: Vec<Real> = (0..1000).map(|_| random.between(-660.0, 709.0)).collect();
        all.extend((0..500).map(|_| random.between(-1.0, 1.0)));
        for k in [-0.35, -0.34, 0.34, 0.35, 1.0, -1.0, 709.78, -667.0, 500.0 * std::f64::consts::LN_2] {
            all.push(Real::from(k));
        }
        for k in 1..900 {
            let small = scale(Real::ONE + random.unit(), -k);
            all.extend([small, -small]);
        }
        for x in all {
            check("exp", x, x.exp(), &wide(x).exp());
            check("exp_m1", x, x.exp_m1(), &wide(x).exp_m1());
        }
    }

    #[test]
    fn exponentials_end_well() {
        let exp = |x: f64| Real::from(x).exp().hi();
        assert_eq!(exp(0.0), 1.0);
        assert!(exp(709.782712893383).is_finite());
        assert_eq!(exp(709.7827128933841), f64::INFINITY);
        assert_eq!(exp(f64::INFINITY), f64::INFINITY);
        assert_eq!(exp(1e300), f64::INFINITY);
        assert_eq!(exp(-745.1), 5e-324);
        assert_eq!(exp(-746.0), 0.0);
        assert_eq!(exp(f64::NEG_INFINITY), 0.0);
        assert!(exp(f64::NAN).is_nan());
        assert_eq!(Real::from(f64::NEG_INFINITY).exp_m1().hi(), -1.0);
        assert_eq!(Real::from(f64::INFINITY).exp_m1().hi(), f64::INFINITY);
        assert_eq!(Real::from(1e-310).exp_m1().hi(), 1e-310);
        // Subnormal results are those of a double.
        assert!((exp(-720.0) / 2.03e-313 - 1.0).abs() < 0.01);
    }

    #[test]
    fn logarithms_are_precise() {
        let mut random = Random(5);
        for x in arguments(&mut random) {
            if x == Real::ONE {
                continue;
            }
            check("ln", x, x.ln(), &wide(x).ln());
            check("ln_1p", x, x.ln_1p(), &wide(x).ln_1p());
            let ten = wide(Real::from(10.0)).ln();
            check("log10", x, x.log10(), &(wide(x).ln() / ten));
        }
        for k in 1..300 {
            let x = scale(Real::ONE + random.unit(), -k) * Real::from(0.999);
            check("ln_1p", x, x.ln_1p(), &wide(x).ln_1p());
            check("ln_1p", -x, (-x).ln_1p(), &(-wide(x)).ln_1p());
        }
    }

    #[test]
    fn logarithms_end_well() {
        let ln = |x: f64| Real::from(x).ln().hi();
        assert_eq!(ln(0.0), f64::NEG_INFINITY);
        assert_eq!(ln(f64::INFINITY), f64::INFINITY);
        assert!(ln(-1.0).is_nan() && ln(f64::NAN).is_nan());
        assert_eq!(ln(5e-324), -744.4400719213812);
        assert_eq!(Real::ONE.ln(), Real::ZERO);
        assert_eq!(Real::from(-1.0).ln_1p().hi(), f64::NEG_INFINITY);
        assert!(Real::from(-1.5).ln_1p().hi().is_nan());
        assert_eq!(Real::from(1e-310).ln_1p().hi(), 1e-310);
        for (k, &ten) in REAL_TENS.iter().enumerate() {
            assert_eq!(ten.log10(), Real::from(k as f64));
        }
    }

    #[test]
    fn roots_are_precise() {
        let mut random = Random(6);
        for x in arguments(&mut random) {
            let root = x.sqrt();
            // sqrt through its square: the relative error of that is twice.
            let error = relative_error(root, &(wide(x) / wide(root)));
            assert!(error <= 2.0 * TOLERANCE, "{x:?}: {error:e}");
        }
        assert_eq!(Real::from(1.44e4).sqrt(), Real::from(120.0));
        assert!(Real::from(-1.0).sqrt().hi().is_nan() && Real::from(-1e-300).sqrt().hi().is_nan());
        assert_eq!(Real::from(f64::INFINITY).sqrt().hi(), f64::INFINITY);
        assert_eq!(Real::ZERO.sqrt(), Real::ZERO);
        assert_eq!(Real::from(5e-324).sqrt().hi(), 2.2227587494850775e-162);
    }

    #[test]
    fn powers_are_precise() {
        let mut random = Random(7);
        for _ in 0..500 {
            let n = (random.bits() % 257) as i64 - 128;
            let x = random.between(0.01, 100.0);
            let want = wide(x).powi(n.into());
            check("powi", x, x.powi(n), &want);
            let sign = if n % 2 == 0 { Real::ONE } else { -Real::ONE };
            assert_eq!((-x).powi(n), sign * x.powi(n));
            check("powf", x, x.powf(Real::from(n as f64)), &want);
        }
        for _ in 0..500 {
            // Long and fractional powers: 2^-97 (1 + |ln result|).
            let log = random.between(-650.0, 700.0);
            let x = Real::ONE + random.sized(-40, 3);
            let y = log / x.ln();
            let got = x.powf(y);
            let error = relative_error(got, &(wide(x).ln() * wide(y)).exp());
            assert!(error <= TOLERANCE / 2.0 * (1.0 + log.hi().abs()), "{x:?} {y:?}: {error:e}");
            let n = y.hi() as i64;
            let error = relative_error(x.powi(n), &(wide(x).ln() * Wide::from(n)).exp());
            assert!(error <= TOLERANCE * (1.0 + log.hi().abs()), "{x:?} {n}: {error:e}");
        }
    }

    #[test]
    fn powers_end_well() {
        let (two, ten) = (Real::from(2.0), Real::from(10.0));
        assert_eq!(two.powi(1023).hi(), 2f64.powi(1023));
        assert_eq!(two.powi(1024).hi(), f64::INFINITY);
        assert_eq!(two.powi(-1074).hi(), 5e-324);
        assert_eq!(two.powi(-1080), Real::ZERO);
        assert_eq!(Real::from(1e300).powi(100).hi(), f64::INFINITY);
        assert_eq!(Real::from(1e300).powi(-100), Real::ZERO);
        assert_eq!(ten.powi(22), Real::from(1e22));
        assert_eq!(two.powi(i64::MAX).hi(), f64::INFINITY);
        assert_eq!(two.powi(i64::MIN), Real::ZERO);
        assert_eq!(Real::ONE.powi(i64::MIN), Real::ONE);
        assert_eq!(Real::ZERO.powi(0), Real::ONE);
        assert_eq!(Real::ZERO.powi(3), Real::ZERO);
        assert_eq!(Real::ZERO.powi(-3).hi(), f64::INFINITY);
        assert_eq!(Real::from(f64::NEG_INFINITY).powi(3).hi(), f64::NEG_INFINITY);
        assert_eq!(Real::from(-2.0).powi(3), Real::from(-8.0));
        assert_eq!(Real::ZERO.powf(HALF), Real::ZERO);
        assert_eq!(Real::ZERO.powf(Real::from(1.5)), Real::ZERO);
        assert_eq!(Real::ZERO.powf(Real::from(-1.5)).hi(), f64::INFINITY);
        assert!(Real::from(-2.0).powf(Real::from(1.5)).hi().is_nan());
        assert_eq!(Real::from(9.0).powf(HALF), Real::from(3.0));
        assert_eq!(two.powf(Real::from(1e300)).hi(), f64::INFINITY);
        assert_eq!(Real::ONE.powf(Real::from(f64::INFINITY)), Real::ONE);
    }

    #[test]
    fn whole_numbers_are_exact() {
        let mut random = Random(8);
        for _ in 0..1000 {
            let n = random.bits() >> (random.bits() % 64);
            assert_eq!(wide(Real::from_u64(n)), Wide::from(n));
            assert!(Real::from_u64(n).is_integer());
            assert_eq!(
                Real::from_u64(n).to_i64(),
                i64::try_from(n).ok().filter(|&n| n < 9_000_000_000_000_000_000)
            );
            let n = (u128::from(random.bits()) << 64 | u128::from(random.bits())) >> 22;
            assert_eq!(wide(Real::from_u128(n)), Wide::from(n));
        }
        // One rounding: 2^-106.
        for n in [u128::MAX, u128::MAX - (1 << 75), u128::MAX / 3, u128::MAX >> 1] {
            assert!(relative_error(Real::from_u128(n), &Wide::from(n)) <= 2f64.powi(-106));
        }
        assert!(!Real::from(0.5).is_integer() && !Real::from(f64::INFINITY).is_integer());
        assert!(!Real::from_parts(1e20, 0.5).is_integer());
        assert_eq!(Real::from_parts(1e20, -0.5).floor(), Real::from_parts(1e20, -1.0));
        assert_eq!(Real::from_parts(3.0, -1e-30).floor(), Real::from(2.0));
        assert_eq!(Real::from_parts(3.0, 1e-30).floor(), Real::from(3.0));
        assert_eq!(Real::from(-2.5).floor(), Real::from(-3.0));
        assert_eq!(Real::from(4.0).recip(), Real::from(0.25));
    }

    #[test]
    fn constants_are_right() {
        let one = wide(Real::ONE);
        let ln_2 = wide(Real::from(2.0)).ln();
        assert!(relative_error(LN_2, &ln_2) < 2f64.powi(-106));
        assert!(relative_error(LOG10_E, &(&one / wide(Real::from(10.0)).ln())) < 2f64.powi(-106));
        let parts = LN_2_PARTS.map(|part| wide(Real::from(part)));
        let [a, b, c] = parts;
        // The last part has 53 bits behind the first 84.
        let gap = (a + b + c - &ln_2).to_f64().value();
        assert!(gap.abs() < 2f64.powi(-137), "{gap:e}");
        assert_eq!(LN_2_PARTS[0].to_bits() << (64 - 11), 0);
        assert_eq!(LN_2_PARTS[1].to_bits() << (64 - 11), 0);
        let mut factorial = one.clone();
        for (k, &got) in (2u32..).zip(&INVERSE_FACTORIALS) {
            factorial *= Wide::from(k);
            assert!(relative_error(got, &(&one / &factorial)) < 2f64.powi(-106));
        }
        for (k, &got) in (1u32..).zip(&INVERSE_ODDS) {
            assert!(relative_error(got, &(&one / Wide::from(2 * k + 1))) < 2f64.powi(-106));
        }
    }

    /// A change of the last bit anywhere must be deliberate: these are the
    /// bits that every machine has to give.
    #[test]
    fn bits_are_the_same_everywhere() {
        let x = Real::from_parts(1.2345678901234567, 3.3e-17);
        let mut hash = 0u64;
        for y in [x.exp(), x.exp_m1(), x.ln(), x.ln_1p(), x.log10(), x.sqrt(), x.powi(100), x.powf(x)] {
            for part in [y.hi(), y.lo()] {
                hash = hash.rotate_left(5) ^ part.to_bits();
            }
        }
        assert_eq!(hash, 1872545609190417556);
    }
}
