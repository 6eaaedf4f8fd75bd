//! Numbers as answers show them.
//!
//! Every digit is decided by the error bound of the value: where fewer than
//! the wanted digits are, fewer are written, and where none is, the result is
//! `None` and the caller must show an interval.

use super::digits::{Digits, Rounding, round_decided, round_decimals};
use super::{Chance, Real};

/// From this power of ten on, numbers take an exponent.
const LARGE: i32 = 7;
/// Below this power of ten they do, too.
const SMALL: i32 = -4;
/// Below this power of ten the larger side of a chance is written as 1 minus
/// the smaller one, which otherwise is a row of nines.
const NINES: i32 = -15;
/// Below this power of ten a number is not told from zero.
const LEAST: i32 = -300;

fn significant(value: Real, digits: u8, bound: f64) -> Option<Digits> {
    round_decided(value, bound, digits)
}

/// The rounded number in the notation of its size, after rounding.
fn notation(rounded: &Digits) -> String {
    if rounded.is_zero() {
        "0".into()
    } else if rounded.exponent() < LEAST && !rounded.is_negative() {
        "< 1e-300".into()
    } else if (SMALL..LARGE).contains(&rounded.exponent()) && rounded.decimals() >= 0 {
        rounded.plain()
    } else {
        rounded.scientific()
    }
}

/// A number to `digits` significant digits (1 to 17), fewer where `bound`, the
/// relative error bound of the value, decides fewer.
///
/// Plain decimals from 1e-4 to below 1e7, judged after rounding, and an
/// exponent beyond. A plain number is always written down to its units, since
/// zeros in their stead would be digits that are not right: to 4 digits,
/// 123456.7 is `123457`; if its bound does not decide that much, it takes an
/// exponent. Infinity is `infinite`; a number above zero that rounds to less
/// than 1e-300 is `< 1e-300`. `None` if not one digit is decided.
pub fn format_number(value: Real, digits: u8, bound: f64) -> Option<String> {
    if value.hi().is_infinite() {
        return Some(if value.is_negative() { "-infinite" } else { "infinite" }.into());
    }
    let mut rounded = significant(value, digits, bound)?;
    if rounded.exponent() < LARGE && rounded.decimals() < 0 {
        let to_units = round_decimals(value, 0, bound, Rounding::Nearest);
        rounded = to_units.unwrap_or(rounded);
    }
    Some(notation(&rounded))
}

/// A number in plain decimals, with so many of them; `None` if the relative
/// error bound of the value does not decide the last, or it is not finite.
pub fn format_to_decimals(value: Real, decimals: u16, bound: f64) -> Option<String> {
    Some(round_decimals(value, decimals, bound, Rounding::Nearest)?.plain())
}

/// The probability that it works: see [`format_fails`].
pub fn format_works(chance: Chance, digits: u8, bound: f64) -> Option<String> {
    format_side(chance.works(), chance.fails(), digits, bound)
}

/// The probability that it fails.
///
/// The significant digits are counted on the smaller side of the chance, and
/// `bound` is the relative error bound of that side. The larger side is
/// exactly 1 minus the smaller one as it is written, with as many decimals, so
/// that the two of an answer add up: F = 4.000e-5 beside R = 0.99996000. Where
/// the smaller side, after rounding, is below 1e-15, the larger one is written
/// `1 - 6.403e-93`; where it is below 1e-300 they are `< 1e-300` and
/// `> 1 - 1e-300`. Sides that are exactly 0 and 1 are `0` and `1`: only those,
/// so that a `1` is never a large number of nines.
pub fn format_fails(chance: Chance, digits: u8, bound: f64) -> Option<String> {
    format_side(chance.fails(), chance.works(), digits, bound)
}

fn format_side(side: Real, other: Real, digits: u8, bound: f64) -> Option<String> {
    if side <= other {
        return format_number(side, digits, bound);
    }
    if other.is_zero() {
        return Some("1".into());
    }
    let rounded = significant(other, digits, bound)?;
    Some(if rounded.is_zero() || rounded.exponent() < LEAST {
        "> 1 - 1e-300".into()
    } else if rounded.exponent() < NINES {
        format!("1 - {}", rounded.scientific())
    } else {
        rounded.complement().plain()
    })
}

#[cfg(test)]
mod tests {
    use super::super::Decimal;
    use super::*;

    const FINE: f64 = 7.9e-31; // 2^-100

    fn decimal(text: &str) -> Decimal {
        Decimal::parse(text).expect("a decimal")
    }

    fn number(text: &str, digits: u8, bound: f64) -> String {
        format_number(decimal(text).to_real(), digits, bound).unwrap_or("none".into())
    }

    /// R and F of a chance that fails with this probability.
    fn sides(fails: &str, bound: f64) -> (String, String) {
        let chance = decimal(fails).to_chance_fails().expect("a probability");
        let or_none = |text: Option<String>| text.unwrap_or("none".into());
        (or_none(format_works(chance, 4, bound)), or_none(format_fails(chance, 4, bound)))
    }

    #[test]
    fn numbers_take_the_notation_of_their_size() {
        for (text, want) in [
            ("4e-5", "4.000e-5"),
            ("0.0001", "0.0001000"),
            ("0.000099996", "0.0001000"),
            ("0.00009999499", "9.999e-5"),
            ("0.0143", "0.01430"),
            ("2", "2.000"),
            ("1234.4", "1234"),
            ("999.96", "1000"),
            ("123456.7", "123457"),
            ("9999499", "9999499"),
            ("9999500", "1.000e7"),
            ("10000000", "1.000e7"),
            ("0", "0"),
            ("1e-300", "1.000e-300"),
            ("9.9e-301", "< 1e-300"),
            ("9.99999e-301", "1.000e-300"),
            ("1e308", "1.000e308"),
            ("1e400", "infinite"),
        ] {
            assert_eq!(number(text, 4, FINE), want, "{text}");
        }
        assert_eq!(format_number(-decimal("0.5").to_real(), 2, FINE).as_deref(), Some("-0.50"));
        assert_eq!(format_number(Real::from(f64::NAN), 4, FINE), None);
    }

    #[test]
    fn only_decided_digits_are_written() {
        assert_eq!(number("0.0123456", 7, 1e-4), "0.0123");
        assert_eq!(number("0.0123456", 7, 1e-5), "0.01235");
        // Five digits are decided, which is short of the units.
        assert_eq!(number("123456.7", 7, 1e-5), "1.2346e5");
        assert_eq!(number("123456.7", 4, 1e-5), "1.235e5");
        assert_eq!(number("123456.7", 4, 1e-7), "123457");
        assert_eq!(number("9.5", 4, 0.1), "none");
        assert_eq!(sides("0.0123456", 1e-4), ("0.9877".into(), "0.0123".into()));
    }

    #[test]
    fn chances_count_on_the_smaller_side() {
        for (fails, r, f) in [
            ("4e-5", "0.99996000", "4.000e-5"),
            ("0.0143", "0.98570", "0.01430"),
            ("0.006198", "0.993802", "0.006198"),
            ("0.00999996", "0.99000", "0.01000"),
            ("0.5", "0.5000", "0.5000"),
            ("0.98570", "0.01430", "0.98570"),
            ("0.99996", "4.000e-5", "0.99996000"),
            ("0", "1", "0"),
            ("1", "0", "1"),
            ("1e-15", "0.999999999999999000", "1.000e-15"),
            ("9.99999e-16", "0.999999999999999000", "1.000e-15"),
            ("9.9991e-16", "1 - 9.999e-16", "9.999e-16"),
            ("6.403e-93", "1 - 6.403e-93", "6.403e-93"),
            ("1e-305", "> 1 - 1e-300", "< 1e-300"),
            ("0.99999999999999999999", "1.000e-20", "1 - 1.000e-20"),
            // A tie: away from zero on the smaller side, and the larger follows.
            ("0.123450", "0.8765", "0.1235"),
            ("0.49999999", "0.5000", "0.5000"),
        ] {
            assert_eq!(sides(fails, FINE), (r.into(), f.into()), "{fails}");
        }
    }

    #[test]
    fn decimals_are_fixed_where_asked() {
        let two = |text: &str, bound| format_to_decimals(decimal(text).to_real(), 2, bound);
        assert_eq!(two("1234567890.125", FINE).as_deref(), Some("1234567890.13"));
        assert_eq!(two("0.001", FINE).as_deref(), Some("0.00"));
        assert_eq!(two("1234.5678", 1e-5), None);
    }
}
