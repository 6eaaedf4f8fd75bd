//! A decimal number exactly as it is written.

use super::constants::{REAL_TENS, TENS};
use super::functions::scale;
use super::{Chance, Real};
use dashu_int::UBig;
use std::cmp::Ordering;

/// Digits that a `u128` surely holds.
const SMALL_DIGITS: usize = 38;

/// Exponents are held within this; numbers out there are zero or infinite as
/// far as a [`Real`] goes, and sums of such exponents stay in range.
const EXPONENT_LIMIT: i64 = 1 << 30;

/// An exact decimal number, zero or more, as a literal denotes it.
///
/// That 0.9999999999999 is 1e-13 from 1 is lost once it is a binary number;
/// here the complement is taken of the digits.
#[derive(Clone, Debug)]
pub struct Decimal(Kind);

/// The value is the digits, read as a whole number, times 10^exponent.
#[derive(Clone, Debug)]
enum Kind {
    Small {
        mantissa: u128,
        exponent: i32,
    },
    /// More than 38 digits, neither the first nor the last of them zero.
    Large {
        digits: Box<str>,
        exponent: i32,
    },
}

fn clamp(exponent: i64) -> i32 {
    exponent.clamp(-EXPONENT_LIMIT, EXPONENT_LIMIT) as i32
}

/// The number of leading bytes that are digits.
fn digit_count(text: &[u8]) -> usize {
    text.iter().take_while(|byte| byte.is_ascii_digit()).count()
}

/// The exponent after `e`, saturated.
fn parse_exponent(text: &[u8]) -> Option<i64> {
    let (negative, digits) = match text {
        [b'-', rest @ ..] => (true, rest),
        [b'+', rest @ ..] => (false, rest),
        _ => (false, text),
    };
    if digits.is_empty() || digit_count(digits) != digits.len() {
        return None;
    }
    let size = digits.iter().fold(0i64, |sum, &d| (sum * 10 + i64::from(d - b'0')).min(EXPONENT_LIMIT));
    Some(if negative { -size } else { size })
}

fn digit_value(digits: impl Iterator<Item = u8>) -> u128 {
    digits.fold(0, |sum, d| sum * 10 + u128::from(d - b'0'))
}

/// The number of decimal digits, 0 for 0.
fn length(mantissa: u128) -> usize {
    TENS.partition_point(|&ten| ten <= mantissa)
}

impl Decimal {
    /// 0.
    pub const ZERO: Decimal = Decimal(Kind::Small { mantissa: 0, exponent: 0 });
    /// 1.
    pub const ONE: Decimal = Decimal(Kind::Small { mantissa: 1, exponent: 0 });

    /// Reads `98`, `0.98`, `1.2e-6` or `5E3`: digits, on both sides of a point
    /// if there is one, and at most one exponent. No sign, no spaces.
    pub fn parse(text: &str) -> Option<Decimal> {
        let bytes = text.as_bytes();
        let whole = digit_count(bytes);
        let (integer, mut rest) = bytes.split_at(whole);
        let mut fraction: &[u8] = &[];
        if let [b'.', after @ ..] = rest {
            (fraction, rest) = after.split_at(digit_count(after));
            if fraction.is_empty() {
                return None;
            }
        }
        let power = match rest {
            [] => 0,
            [b'e' | b'E', exponent @ ..] => parse_exponent(exponent)?,
            _ => return None,
        };
        if integer.is_empty() {
            return None;
        }
        let exponent = power - fraction.len() as i64;
        let digits = integer.iter().chain(fraction).copied();
        if integer.len() + fraction.len() <= SMALL_DIGITS {
            return Some(Decimal(Kind::Small { mantissa: digit_value(digits), exponent: clamp(exponent) }));
        }
        Some(Decimal::from_digits(&digits.map(char::from).collect::<String>(), exponent))
    }

    /// A whole number.
    pub fn from_u64(value: u64) -> Decimal {
        Decimal(Kind::Small { mantissa: u128::from(value), exponent: 0 })
    }

    /// Any digits times 10^exponent.
    fn from_digits(digits: &str, exponent: i64) -> Decimal {
        let digits = digits.trim_start_matches('0');
        let kept = digits.trim_end_matches('0');
        let exponent = clamp(exponent + (digits.len() - kept.len()) as i64);
        Decimal(if kept.len() <= SMALL_DIGITS {
            Kind::Small { mantissa: digit_value(kept.bytes()), exponent }
        } else {
            Kind::Large { digits: kept.into(), exponent }
        })
    }

    /// Times 10^places, exactly: a percentage is its number shifted by -2.
    #[must_use]
    pub fn shift10(&self, places: i32) -> Decimal {
        let mut shifted = self.clone();
        let (Kind::Small { exponent, .. } | Kind::Large { exponent, .. }) = &mut shifted.0;
        *exponent = clamp(i64::from(*exponent) + i64::from(places));
        shifted
    }

    /// Whether it is exactly 0.
    pub fn is_zero(&self) -> bool {
        matches!(self.0, Kind::Small { mantissa: 0, .. })
    }

    /// Whether it is exactly 1.
    pub fn is_one(&self) -> bool {
        self.cmp_one() == Ordering::Equal
    }

    /// How it compares with 1, exactly.
    pub fn cmp_one(&self) -> Ordering {
        match &self.0 {
            Kind::Small { mantissa: 0, .. } => Ordering::Less,
            Kind::Small { exponent: 1.., .. } => Ordering::Greater,
            &Kind::Small { mantissa, exponent } => match TENS.get(exponent.unsigned_abs() as usize) {
                Some(one) => mantissa.cmp(one),
                None => Ordering::Less,
            },
            // The last digit is not zero, so it is not a power of ten.
            Kind::Large { digits, exponent } if digits.len() as i64 + i64::from(*exponent) > 0 => {
                Ordering::Greater
            }
            Kind::Large { .. } => Ordering::Less,
        }
    }

    /// The nearest [`Real`], to a relative error of 2^-100; infinite beyond
    /// the range of doubles and 0 below it.
    pub fn to_real(&self) -> Real {
        match &self.0 {
            &Kind::Small { mantissa, exponent } => real(mantissa, i64::from(exponent)),
            // What the first 38 digits leave is below 1e-37 = 2^-122 of them.
            Kind::Large { digits, exponent } => real(
                digit_value(digits.bytes().take(SMALL_DIGITS)),
                i64::from(*exponent) + (digits.len() - SMALL_DIGITS) as i64,
            ),
        }
    }

    /// 1 minus it, taken of the digits and rounded once; `None` above 1.
    pub fn complement_to_real(&self) -> Option<Real> {
        if self.cmp_one() == Ordering::Greater {
            return None;
        }
        let (Kind::Small { exponent, .. } | Kind::Large { exponent, .. }) = self.0;
        let places = exponent.unsigned_abs() as usize;
        Some(match &self.0 {
            Kind::Small { mantissa, .. } => match TENS.get(places) {
                _ if exponent > 0 || *mantissa == 0 => Real::ONE,
                Some(one) => real(one - mantissa, i64::from(exponent)),
                // More than 38 places.
                None => complement_by_digits(&mantissa.to_string(), places),
            },
            Kind::Large { digits, .. } => complement_by_digits(digits, places),
        })
    }

    /// The chance that works with this probability; `None` above 1.
    pub fn to_chance_works(&self) -> Option<Chance> {
        Some(Chance::new(self.to_real(), self.complement_to_real()?))
    }

    /// The chance that fails with this probability; `None` above 1.
    pub fn to_chance_fails(&self) -> Option<Chance> {
        Some(self.to_chance_works()?.flip())
    }
}

/// 1 - digits * 10^-places, for a value below 1.
fn complement_by_digits(digits: &str, places: usize) -> Real {
    let zeros = places.saturating_sub(digits.len());
    if zeros > SMALL_DIGITS {
        // The value is below 1e-38, so that nothing cancels.
        let head = digit_value(digits.bytes().take(SMALL_DIGITS));
        let cut = digits.len().saturating_sub(SMALL_DIGITS);
        return Real::ONE - real(head, cut as i64 - places as i64);
    }
    // Ten's complement: nine minus each digit, and one more in the last place,
    // whose carry ends at the latest where the last digit above zero stood.
    let mut out: Vec<u8> =
        std::iter::repeat_n(b'9', zeros).chain(digits.bytes().map(|d| b'0' + (b'9' - d))).collect();
    for d in out.iter_mut().rev() {
        if *d < b'9' {
            *d += 1;
            break;
        }
        *d = b'0';
    }
    let text: String = out.into_iter().map(char::from).collect();
    Decimal::from_digits(&text, -(places as i64)).to_real()
}

/// mantissa * 10^exponent.
pub(super) fn real(mantissa: u128, exponent: i64) -> Real {
    // The mantissa has at most 39 digits.
    match exponent {
        _ if mantissa == 0 => Real::ZERO,
        // One rounding of the mantissa if it is long, and one operation with
        // an exact power of ten.
        0..=38 => Real::from_u128(mantissa) * REAL_TENS[exponent as usize],
        -38..=-1 => Real::from_u128(mantissa) / REAL_TENS[-exponent as usize],
        _ => {
            let first = exponent + length(mantissa) as i64;
            if first > 400 {
                Real::from(f64::INFINITY)
            } else if first < -400 {
                Real::ZERO
            } else {
                let power = UBig::from(10u8).pow(exponent.unsigned_abs() as usize);
                if exponent > 0 {
                    quotient(UBig::from(mantissa) * power, UBig::ONE)
                } else {
                    quotient(UBig::from(mantissa), power)
                }
            }
        }
    }
}

/// The quotient of two whole numbers above zero, to 2^-106.
fn quotient(numerator: UBig, denominator: UBig) -> Real {
    // Brings the quotient to 126 to 128 bits, for a truncation below 2^-125.
    let bits = |x: &UBig| dashu_int::ops::BitTest::bit_len(x) as i32;
    let by = 127 - (bits(&numerator) - bits(&denominator));
    let (n, d) = match by {
        0.. => (numerator << by as usize, denominator),
        _ => (numerator, denominator << by.unsigned_abs() as usize),
    };
    match u128::try_from(n / d) {
        Ok(whole) => scale(Real::from_u128(whole), -by),
        Err(_) => unreachable!("the shift leaves at most 128 bits"),
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::{Random, Wide, relative_error};
    use super::*;
    use dashu_float::DBig;

    /// The documented error of `to_real` with a margin: one division is at
    /// most 2^-102.
    const TOLERANCE: f64 = 7.9e-31; // 2^-100

    fn parse(text: &str) -> Decimal {
        Decimal::parse(text).unwrap_or_else(|| panic!("{text} was refused"))
    }

    fn reference(text: &str) -> Wide {
        let exact: DBig = text.parse().expect("a decimal");
        exact.with_rounding().with_base_and_precision::<2>(320).value()
    }

    fn assert_close(got: Real, text: &str) {
        let error = relative_error(got, &reference(text));
        assert!(error <= TOLERANCE, "{text}: {got:?} is off by {error:e}");
    }

    #[test]
    fn literals_read_to_full_precision() {
        for text in [
            "0.98",
            "98",
            "1.2e-6",
            "5E3",
            "1e+2",
            "007.50",
            "0.1",
            "1e-285",
            "1.7976931348623157e308",
            "1e300",
            "123456789012345678901234567890123456789012345678901234567890e-20",
            "0.00000000000000000000000000000000000000000000000000000000000000123",
            "340282366920938463463374607431768211455",
            "99999999999999999999999999999999999999",
        ] {
            assert_close(parse(text).to_real(), text);
        }
    }

    #[test]
    fn random_literals_read_to_full_precision() {
        let mut random = Random(1);
        for _ in 0..3000 {
            let len = 1 + random.bits() % 60;
            let mut text: String = (0..len).map(|_| char::from(b'0' + (random.bits() % 10) as u8)).collect();
            text.push('7');
            let point = random.bits() as usize % text.len();
            if point > 0 {
                text.insert(point, '.');
            }
            // A full low part needs 1e-290 at least.
            text += &format!("e{}", (random.bits() % 560) as i64 - 280 + if point > 0 { 0 } else { -60 });
            let value = parse(&text).to_real();
            if value.is_finite() && value.hi() > 1e-290 {
                assert_close(value, &text);
            }
        }
    }

    #[test]
    fn malformed_literals_are_refused() {
        for text in [
            "", ".", ".5", "5.", "1.e3", "e3", "1e", "1e+", "1e3e3", "1.2.3", "-1", "+1", " 1", "1 ", "1_0",
            "1,5", "١",
        ] {
            assert!(Decimal::parse(text).is_none(), "{text} was read");
        }
    }

    #[test]
    fn huge_exponents_saturate() {
        assert_eq!(parse("1e999999999").to_real().hi(), f64::INFINITY);
        assert_eq!(parse("1e99999999999999999999999").to_real().hi(), f64::INFINITY);
        assert_eq!(parse("1e309").to_real().hi(), f64::INFINITY);
        assert!(parse("1e-99999999999999999999").to_real().is_zero());
        assert!(!parse("1e-99999999999999999999").is_zero());
        assert_eq!(parse("1e-99999999999").complement_to_real(), Some(Real::ONE));
        assert!(parse("0e99999999999").to_real().is_zero());
        assert_eq!(parse("1e999999999").shift10(i32::MAX).cmp_one(), Ordering::Greater);
        assert_eq!(parse("5e-324").to_real().hi(), 5e-324);
    }

    #[test]
    fn complements_come_from_the_digits() {
        let nines = |n: usize| format!("0.{}", "9".repeat(n));
        for n in [1, 13, 30, 37, 38, 39, 50, 76, 200] {
            let fails = parse(&nines(n)).complement_to_real().expect("below 1");
            assert_close(fails, &format!("1e-{n}"));
        }
        assert!(parse(&nines(5000)).complement_to_real().expect("below 1").is_zero());
        for (text, complement) in [
            ("0.98", "0.02"),
            ("0.5", "0.5"),
            ("1e-3", "0.999"),
            (
                "0.50000000000000000000000000000000000000000000001",
                "0.49999999999999999999999999999999999999999999999",
            ),
            (
                "0.00000000000000000000000000000000000000000012",
                "0.99999999999999999999999999999999999999999988",
            ),
            ("0.90000000000000000000000000000000000000000000", "0.1"),
        ] {
            assert_close(parse(text).complement_to_real().expect("below 1"), complement);
        }
        // The percent sign shifts exactly, 99.99999999999% is 1e-13 from 1.
        assert_close(parse("99.99999999999").shift10(-2).complement_to_real().expect("below 1"), "1e-13");
        assert_eq!(parse("0").complement_to_real(), Some(Real::ONE));
        assert_eq!(parse("1e-60").complement_to_real().map(|r| r.lo()), Some(-1e-60));
    }

    #[test]
    fn one_is_told_from_its_neighbours() {
        for one in ["1", "1.000", "10e-1", "0.001e3", "1.00000000000000000000000000000000000000000000000000"]
        {
            assert!(parse(one).is_one(), "{one}");
            assert_eq!(parse(one).complement_to_real(), Some(Real::ZERO));
        }
        let above = parse("1.00000000000000000000000000000000000000000000000001");
        assert_eq!(above.cmp_one(), Ordering::Greater);
        assert!(above.to_chance_works().is_none() && above.to_chance_fails().is_none());
        assert_eq!(parse(&format!("0.{}", "9".repeat(60))).cmp_one(), Ordering::Less);
        assert_eq!(parse("2").cmp_one(), Ordering::Greater);
        assert!(parse("0.000").is_zero() && parse(&format!("0.{}", "0".repeat(60))).is_zero());
    }

    #[test]
    fn chances_hold_both_tails() {
        let chance = parse("0.98").to_chance_works().expect("a probability");
        assert_close(chance.works(), "0.98");
        assert_close(chance.fails(), "0.02");
        let chance = parse("1e-50").to_chance_fails().expect("a probability");
        assert_close(chance.fails(), "1e-50");
        assert!(size_of::<Decimal>() <= 32);
    }
}
