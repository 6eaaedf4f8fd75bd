//! Correct decimal rounding: the digits of the exact value, and only as many
//! as its error bound decides.

use super::Real;
use super::constants::REAL_TENS;
use super::decimal;
use super::functions::binary_exponent;
use dashu_int::{IBig, UBig};

/// Where a value goes that lies between two decimals.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Rounding {
    /// To the nearest, ties away from zero.
    Nearest,
    /// Towards minus infinity: the lower end of an interval.
    Down,
    /// Towards plus infinity: the upper end of an interval.
    Up,
}

/// A decimal number, d1.d2d3… × 10^exponent.
///
/// The first digit is zero only for zero itself, whose exponent is that of its
/// last place.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Digits {
    negative: bool,
    digits: String,
    exponent: i32,
}

/// Up to this relative error bound, a value within the bound of a tie (or, for
/// Down and Up, of a decimal) is taken for it.
///
/// Decimal inputs make exact ties: 0.5 × 0.25 is 0.125. Computed to 2^-90 the
/// value lies on some side of it, and no bound can tell them apart. That a
/// value which is not a tie comes this close to one by chance has a
/// probability of at most 10^17 × 2^-80 ≈ 1e-7 for 17 digits, and 1e-20 for 4;
/// the printed value is off by half a unit of its last digit even then. With a
/// coarser bound the two ends must round alike.
const TIE_BOUND: f64 = 8.3e-25; // 2^-80

/// The doubles nearest to 10^-16 up to 10^16, where most answers lie.
#[rustfmt::skip]
const NEAR_TENS: [f64; 33] = [
    1e-16, 1e-15, 1e-14, 1e-13, 1e-12, 1e-11, 1e-10, 1e-9, 1e-8, 1e-7, 1e-6, 1e-5, 1e-4, 1e-3, 1e-2, 1e-1,
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16,
];

/// The largest k with 10^k <= value, for a finite value above zero.
fn decimal_exponent(value: Real) -> i32 {
    // Far out computed where it is needed: a table of all powers took more than
    // half of the instructions that a small note takes in all.
    let ten = |k: i32| match NEAR_TENS.get((k + 16) as usize) {
        Some(near) => *near,
        None => decimal::real(1, i64::from(k)).hi(),
    };
    // 1233 / 4096 is log10(2) to within 2e-6: low by one at most.
    let mut k = ((binary_exponent(value.hi()) * 1233) >> 12) - 1;
    while value.hi() > ten(k + 1) || (value.hi() == ten(k + 1) && value >= decimal::real(1, i64::from(k + 1)))
    {
        k += 1;
    }
    k
}

/// `value * 10^places` rounded to a whole number, for a finite value of zero
/// or more; `None` if the bound does not decide it.
fn round_scaled(value: Real, places: i32, bound: f64, rounding: Rounding) -> Option<Whole> {
    if !(0.0..1.0).contains(&bound) {
        return None;
    }
    match round_quickly(value, places, bound, rounding) {
        Quick::Decided(whole) => Some(Whole::Small(whole)),
        Quick::Undecided => None,
        Quick::Unclear => round_exactly(value, places, bound, rounding).map(Whole::Large),
    }
}

/// A whole number of the size that it needs.
#[derive(Clone, PartialEq, Eq, Debug)]
enum Whole {
    Small(u64),
    Large(UBig),
}

impl Whole {
    fn is_zero(&self) -> bool {
        match self {
            Whole::Small(whole) => *whole == 0,
            Whole::Large(whole) => *whole == UBig::ZERO,
        }
    }

    fn text(&self) -> String {
        match self {
            Whole::Small(whole) => whole.to_string(),
            Whole::Large(whole) => whole.to_string(),
        }
    }
}

enum Quick {
    Decided(u64),
    Undecided,
    Unclear,
}

/// In double-double arithmetic, where that settles it.
fn round_quickly(value: Real, places: i32, bound: f64, rounding: Rounding) -> Quick {
    // Away from the ends of the range nothing over- or underflows.
    if !(1e-250..1e250).contains(&value.hi()) || places.abs() > 300 {
        return Quick::Unclear;
    }
    let mut y = value;
    let mut left = places.unsigned_abs() as usize;
    while left > 0 {
        let step = left.min(38);
        y = if places > 0 { y * REAL_TENS[step] } else { y / REAL_TENS[step] };
        left -= step;
    }
    if y.hi() >= 1e17 {
        return Quick::Unclear;
    }
    let whole = y.hi().floor();
    let fraction = (y.hi() - whole) + y.lo();
    let carry = fraction.floor();
    let fraction = fraction - carry;
    let whole = (whole as i64 + carry as i64) as u64;
    // At most eight operations of 2^-100 each, and the rounding of `fraction`.
    let own = y.hi() * 2f64.powi(-96) + 2f64.powi(-48);
    let reach = y.hi() * bound;
    let to_boundary = match rounding {
        Rounding::Nearest => (fraction - 0.5).abs(),
        Rounding::Down | Rounding::Up => fraction.min(1.0 - fraction),
    };
    // The margin covers the roundings of this comparison.
    if to_boundary > reach * 1.0001 + own {
        let up = match rounding {
            Rounding::Nearest => fraction > 0.5,
            Rounding::Down => false,
            Rounding::Up => true,
        };
        return Quick::Decided(whole + u64::from(up));
    }
    if to_boundary + own < reach * 0.9999 {
        if bound > TIE_BOUND {
            return Quick::Undecided;
        }
        // With this bound the reach is far below one: there is one boundary.
        let up = rounding == Rounding::Nearest || fraction > 0.5;
        return Quick::Decided(whole + u64::from(up));
    }
    Quick::Unclear
}

/// A double as a whole number times a power of two.
fn binary_fraction(x: f64) -> (IBig, i32) {
    let bits = x.to_bits();
    let field = ((bits >> 52) & 0x7ff) as i32;
    let fraction = bits & ((1 << 52) - 1);
    let size = IBig::from(if field == 0 { fraction } else { fraction | (1 << 52) });
    (if x < 0.0 { -size } else { size }, field.max(1) - 1075)
}

/// In whole numbers: value and bound are exact binary fractions.
fn round_exactly(value: Real, places: i32, bound: f64, rounding: Rounding) -> Option<UBig> {
    let ((hi, hi_power), (lo, lo_power)) = (binary_fraction(value.hi()), binary_fraction(value.lo()));
    let power = if lo == IBig::ZERO { hi_power } else { hi_power.min(lo_power) };
    let mut top = hi << (hi_power - power) as usize;
    if lo != IBig::ZERO {
        top += lo << (lo_power - power) as usize;
    }
    let mut bottom = IBig::ONE;
    let ten = IBig::from(10u8).pow(places.unsigned_abs() as usize);
    if places >= 0 {
        top *= ten
    } else {
        bottom *= ten
    }
    if power >= 0 {
        top <<= power as usize
    } else {
        bottom <<= power.unsigned_abs() as usize
    }
    // One more factor of two on both sides, so that half of `bottom` is whole.
    top <<= 1;
    bottom <<= 1;
    // The value is top / bottom; in x = value + 1/2 for Nearest, and x = value
    // otherwise, the boundaries are the whole numbers.
    let shift = if rounding == Rounding::Nearest { &bottom >> 1 } else { IBig::ZERO };
    let (low, high, scaled_bottom) = {
        let (b, b_power) = binary_fraction(bound);
        if b == IBig::ZERO {
            (&top + &shift, &top + &shift, bottom.clone())
        } else {
            // A bound below 1 has a negative power.
            let k = b_power.unsigned_abs() as usize;
            let reach = &top * b;
            let middle = (&top + &shift) << k;
            (&middle - &reach, middle + reach, &bottom << k)
        }
    };
    let first = -floor_quotient(&-low, &scaled_bottom);
    let last = floor_quotient(&high, &scaled_bottom);
    let whole = if first > last {
        // No boundary within reach.
        match rounding {
            Rounding::Up => last + IBig::ONE,
            Rounding::Nearest | Rounding::Down => last,
        }
    } else if first == last && bound <= TIE_BOUND {
        first
    } else {
        return None;
    };
    UBig::try_from(whole).ok()
}

/// The largest whole number not above a / b, for b > 0.
fn floor_quotient(a: &IBig, b: &IBig) -> IBig {
    use dashu_int::ops::DivRemEuclid;
    a.div_rem_euclid(b).0
}

/// Down and Up for the value without its sign.
fn for_size(rounding: Rounding, negative: bool) -> Rounding {
    match (rounding, negative) {
        (Rounding::Down, true) => Rounding::Up,
        (Rounding::Up, true) => Rounding::Down,
        (rounding, _) => rounding,
    }
}

/// The value to `digits` significant digits (1 to 17; others are brought into
/// that range), or `None` if it is not finite or the relative error bound
/// leaves the last digit open.
///
/// It is decided when everything within `value * (1 ± bound)` rounds alike; a
/// tie within a bound of at most 2^-80 counts as a tie, and for Down and Up a
/// decimal within it as that decimal. With a bound of 0 the value is taken as
/// exact, and always decided. Zero has one digit.
pub fn round_significant(value: Real, digits: u8, bound: f64, rounding: Rounding) -> Option<Digits> {
    if !value.is_finite() {
        return None;
    }
    if value.is_zero() {
        return Some(Digits::from_whole(false, &Whole::Small(0), 0));
    }
    let count = i32::from(digits.clamp(1, 17));
    let negative = value.is_negative();
    let size = value.abs();
    let places = count - 1 - decimal_exponent(size);
    let whole = round_scaled(size, places, bound, for_size(rounding, negative))?;
    let mut rounded = Digits::from_whole(negative, &whole, -places);
    // 9.9996 becomes 10.00: one place more than asked, and it is a zero.
    if rounded.digits.len() as i32 > count {
        rounded.digits.pop();
    }
    Some(rounded)
}

/// The value to this many decimals, or `None` as for [`round_significant`].
pub fn round_decimals(value: Real, decimals: u16, bound: f64, rounding: Rounding) -> Option<Digits> {
    if !value.is_finite() {
        return None;
    }
    let places = i32::from(decimals);
    let negative = value.is_negative();
    let whole = if value.is_zero() {
        Whole::Small(0)
    } else {
        round_scaled(value.abs(), places, bound, for_size(rounding, negative))?
    };
    Some(Digits::from_whole(negative && !whole.is_zero(), &whole, -places))
}

/// How many significant digits, `wanted` at most, the bound decides when
/// rounding to the nearest; 0 if not even one, or if the value is not finite.
pub fn decided_digits(value: Real, bound: f64, wanted: u8) -> u8 {
    (1..=wanted.clamp(1, 17))
        .rev()
        .find(|&count| round_significant(value, count, bound, Rounding::Nearest).is_some())
        .unwrap_or(0)
}

/// The value to as many significant digits, `wanted` at most, as the bound
/// decides when rounding to the nearest; `None` if not even one.
pub(super) fn round_decided(value: Real, bound: f64, wanted: u8) -> Option<Digits> {
    (1..=wanted.clamp(1, 17))
        .rev()
        .find_map(|count| round_significant(value, count, bound, Rounding::Nearest))
}

impl Digits {
    /// A whole number times 10^last.
    fn from_whole(negative: bool, whole: &Whole, last: i32) -> Digits {
        let digits = whole.text();
        let exponent = last + digits.len() as i32 - 1;
        Digits { negative, digits, exponent }
    }

    /// Whether it is below zero.
    pub fn is_negative(&self) -> bool {
        self.negative
    }

    /// Whether it is zero.
    pub fn is_zero(&self) -> bool {
        self.digits == "0"
    }

    /// The significant digits, trailing zeros among them.
    pub fn digits(&self) -> &str {
        &self.digits
    }

    /// The power of ten of the first digit.
    pub fn exponent(&self) -> i32 {
        self.exponent
    }

    /// The number of decimals: how many places the last digit stands behind
    /// the point; negative if it stands before the units.
    pub fn decimals(&self) -> i32 {
        self.digits.len() as i32 - 1 - self.exponent
    }

    /// Times 10^places.
    #[must_use]
    pub fn shift10(mut self, places: i32) -> Digits {
        self.exponent += places;
        self
    }

    /// 1 minus it, exactly, with as many decimals; for a value in 0 to 1.
    #[must_use]
    pub fn complement(&self) -> Digits {
        let decimals = self.decimals().max(0);
        let small = || {
            let one = 10_u64.checked_pow(decimals.unsigned_abs()).filter(|_| decimals == self.decimals())?;
            let whole: u64 = self.digits.parse().ok()?;
            Some(Whole::Small(if self.negative { 0 } else { one.saturating_sub(whole) }))
        };
        if let Some(left) = small() {
            return Digits::from_whole(false, &left, -decimals);
        }
        let one = UBig::from(10u8).pow(decimals as usize);
        let zeros = "0".repeat((decimals - self.decimals()) as usize);
        let whole = format!("{}{zeros}", self.digits).parse().unwrap_or(UBig::ZERO);
        let left = if self.negative || whole > one { UBig::ZERO } else { one - whole };
        Digits::from_whole(false, &Whole::Large(left), -decimals)
    }

    /// In plain decimals, such as `0.01430`. Places before the point that have
    /// no digit are filled with zeros.
    pub fn plain(&self) -> String {
        let sign = if self.negative { "-" } else { "" };
        let digits = &self.digits;
        let point = self.exponent + 1;
        if point <= 0 {
            format!("{sign}0.{}{digits}", "0".repeat(point.unsigned_abs() as usize))
        } else if point as usize >= digits.len() {
            format!("{sign}{digits}{}", "0".repeat(point as usize - digits.len()))
        } else {
            let (whole, fraction) = digits.split_at(point as usize);
            format!("{sign}{whole}.{fraction}")
        }
    }

    /// With an exponent, such as `1.430e-2`.
    pub fn scientific(&self) -> String {
        let sign = if self.negative { "-" } else { "" };
        let (first, rest) = self.digits.split_at(1);
        let point = if rest.is_empty() { "" } else { "." };
        format!("{sign}{first}{point}{rest}e{}", self.exponent)
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::{Random, wide};
    use super::*;
    use dashu_float::round::mode;

    fn real(text: &str) -> Real {
        super::super::Decimal::parse(text).expect("a decimal").to_real()
    }

    fn show(value: Real, digits: u8, bound: f64, rounding: Rounding) -> String {
        round_significant(value, digits, bound, rounding).map_or("none".into(), |d| d.scientific())
    }

    fn nearest(value: Real, digits: u8, bound: f64) -> String {
        show(value, digits, bound, Rounding::Nearest)
    }

    /// What one operation on exact input leaves.
    const FINE: f64 = 7.9e-31; // 2^-100

    #[test]
    fn rounds_to_the_nearest() {
        for (text, digits, want) in [
            ("0.99996", 4, "1.000e0"),
            ("0.999949", 4, "9.999e-1"),
            ("0.014299999", 4, "1.430e-2"),
            ("1234567", 3, "1.23e6"),
            ("9.995", 3, "1.00e1"),
            ("2", 17, "2.0000000000000000e0"),
            ("1e-300", 2, "1.0e-300"),
            ("1.7976931348623157e308", 5, "1.7977e308"),
            ("9.99999999999999999e22", 17, "1.0000000000000000e23"),
            ("1e23", 17, "1.0000000000000000e23"),
            ("0.3", 17, "3.0000000000000000e-1"),
            ("4.9e-324", 1, "5e-324"),
        ] {
            assert_eq!(nearest(real(text), digits, FINE), want, "{text}");
            assert_eq!(nearest(-real(text), digits, FINE), format!("-{want}"), "{text}");
        }
    }

    #[test]
    fn ties_go_away_from_zero_within_the_bound() {
        // Exact in binary.
        assert_eq!(nearest(Real::from(0.125), 2, 0.0), "1.3e-1");
        assert_eq!(nearest(Real::from(2.5), 1, 0.0), "3e0");
        assert_eq!(nearest(Real::from(-2.5), 1, 0.0), "-3e0");
        assert_eq!(nearest(Real::from(8.5), 1, FINE), "9e0");
        // Ties in decimal only: the double-double lies on some side of them.
        for text in ["1.00005", "1.00015", "0.000123450000000000000", "9.9995", "0.35", "3.5e100", "1.5e-200"]
        {
            let digits =
                text.split('e').next().map_or(0, |m| m.replace('.', "").trim_matches('0').len()) as u8 - 1;
            let up = nearest(real(text), digits, FINE);
            for nudge in [-FINE, FINE] {
                let value = real(text) * (Real::ONE + Real::from(nudge / 2.0));
                assert_eq!(nearest(value, digits, FINE), up, "{text}");
            }
            let beyond = real(text) * (Real::ONE - Real::from(1e-22));
            assert_ne!(nearest(beyond, digits, FINE), up, "{text}");
        }
        assert_eq!(nearest(real("1.00005"), 5, FINE), "1.0001e0");
    }

    #[test]
    fn coarse_bounds_leave_digits_open() {
        let value = real("1.23449");
        assert_eq!(nearest(value, 4, 1e-6), "1.234e0");
        assert_eq!(nearest(value, 4, 1e-4), "none");
        assert_eq!(nearest(value, 3, 1e-4), "1.23e0");
        assert_eq!(decided_digits(value, 1e-4, 4), 3);
        assert_eq!(decided_digits(value, 1e-4, 17), 3);
        assert_eq!(decided_digits(value, 0.0, 17), 17);
        assert_eq!(decided_digits(value, 0.9, 4), 0);
        assert_eq!(decided_digits(value, 1.0, 4), 0);
        assert_eq!(decided_digits(value, f64::NAN, 4), 0);
        assert_eq!(decided_digits(Real::from(f64::NAN), 0.0, 4), 0);
        assert_eq!(decided_digits(Real::from(f64::INFINITY), 0.0, 4), 0);
        assert_eq!(decided_digits(Real::ZERO, 0.1, 4), 4);
        // A tie with a bound that no decimal input explains is open.
        assert_eq!(nearest(real("1.2345"), 4, 1e-12), "none");
    }

    #[test]
    fn down_and_up_enclose() {
        for (text, down, up) in [
            ("1.2341", "1.234e0", "1.235e0"),
            ("9.9991", "9.999e0", "1.000e1"),
            ("0.3", "3.000e-1", "3.000e-1"),
            ("1e-7", "1.000e-7", "1.000e-7"),
            ("123456", "1.234e5", "1.235e5"),
        ] {
            assert_eq!(show(real(text), 4, FINE, Rounding::Down), down);
            assert_eq!(show(real(text), 4, FINE, Rounding::Up), up);
            assert_eq!(show(-real(text), 4, FINE, Rounding::Down), format!("-{up}"));
            assert_eq!(show(-real(text), 4, FINE, Rounding::Up), format!("-{down}"));
        }
        let below = real("0.3") * (Real::ONE - Real::from(1e-20));
        assert_eq!(show(below, 4, FINE, Rounding::Down), "2.999e-1");
        assert_eq!(show(below, 4, 1e-19, Rounding::Down), "none");
        // 1 - 1e-50 as a pair is below 1 still.
        let below = Real::from_parts(1.0, -1e-50);
        assert_eq!(show(below, 17, 0.0, Rounding::Down), "9.9999999999999999e-1");
        assert_eq!(show(below, 17, 0.0, Rounding::Up), "1.0000000000000000e0");
    }

    #[test]
    fn decimals_are_counted_from_the_point() {
        let plain = |text: &str, decimals| {
            round_decimals(real(text), decimals, FINE, Rounding::Nearest).map_or("none".into(), |d| d.plain())
        };
        assert_eq!(plain("2.345", 2), "2.35");
        assert_eq!(plain("0.004", 2), "0.00");
        assert_eq!(plain("0.005", 2), "0.01");
        assert_eq!(plain("999.995", 2), "1000.00");
        assert_eq!(plain("1e20", 1), "100000000000000000000.0");
        assert_eq!(plain("0", 3), "0.000");
        assert_eq!(plain("1e-200", 0), "0");
        let negative = round_decimals(-real("0.004"), 2, FINE, Rounding::Nearest);
        assert_eq!(negative.map(|d| d.plain()).as_deref(), Some("0.00"));
        let exact = round_decimals(Real::from(0.1), 55, 0.0, Rounding::Nearest);
        let want = "0.1000000000000000055511151231257827021181583404541015625";
        assert_eq!(exact.map(|d| d.plain()).as_deref(), Some(want));
    }

    /// The quick way against the exact one, and the exact one against another
    /// library, over the whole range.
    #[test]
    fn ways_agree() {
        let mut random = Random(2);
        for i in 0..4000 {
            let value = random.sized(-1022, 1022);
            let count = 1 + (random.bits() % 17) as u8;
            let places = i32::from(count) - 1 - decimal_exponent(value);
            for rounding in [Rounding::Nearest, Rounding::Down, Rounding::Up] {
                for bound in [0.0, FINE, 1e-16, 1e-5] {
                    let exact = round_exactly(value, places, bound, rounding);
                    assert_eq!(
                        round_scaled(value, places, bound, rounding).map(|whole| whole.text()),
                        exact.map(|whole| whole.to_string()),
                        "{value:?} {count} {bound}"
                    );
                }
            }
            if i % 8 == 0 {
                let decimal = wide(value)
                    .with_rounding::<mode::HalfAway>()
                    .with_base_and_precision::<10>(60)
                    .value()
                    .with_precision(count.into())
                    .value();
                let (digits, exponent) = decimal.into_repr().into_parts();
                let mine = round_significant(value, count, 0.0, Rounding::Nearest).expect("exact");
                let trimmed = mine.digits().trim_end_matches('0');
                assert_eq!(trimmed, digits.to_string().trim_end_matches('0'), "{value:?} {count}");
                let last = mine.exponent() + 1 - trimmed.len() as i32;
                assert_eq!(last as isize, exponent);
            }
        }
    }

    #[test]
    fn every_power_of_ten_is_found() {
        for k in -307..=308 {
            let ten = decimal::real(1, k.into());
            assert_eq!(nearest(ten, 17, FINE), format!("1.0000000000000000e{k}"));
            // Closer to the bottom the low part has no room for this.
            if k > -290 {
                let below = ten * (Real::ONE - Real::from(1e-18));
                assert_eq!(decimal_exponent(below), k - 1);
            }
        }
    }

    #[test]
    fn complements_are_exact() {
        let complement = |text: &str, digits| {
            round_significant(real(text), digits, FINE, Rounding::Nearest).map(|d| d.complement().plain())
        };
        assert_eq!(complement("4e-5", 4).as_deref(), Some("0.99996000"));
        assert_eq!(complement("0.5", 1).as_deref(), Some("0.5"));
        assert_eq!(complement("0.95", 2).as_deref(), Some("0.05"));
        assert_eq!(complement("1", 3).as_deref(), Some("0.00"));
        assert_eq!(complement("0", 3).as_deref(), Some("1"));
    }
}
