//! How numbers are written: digits, percent, chances, units.

use super::figure::Number;
use crate::language::Display;
use crate::number::{Chance, Real, Rounding, format_fails, format_number, format_works, round_significant};
use crate::source::{Code, Problem, Span};
use crate::steps::Side;
use crate::system::{Model, Quantity, STEP};

/// Below this no value is told from another.
pub(super) const SMALLEST: f64 = 1e-300;

/// Whether the smaller side is not zero and yet below what is written.
pub(super) fn beyond_reach(chance: Chance) -> bool {
    !chance.smaller().is_zero() && chance.smaller() < Real::from(SMALLEST)
}

/// A number as it is answered.
///
/// # Errors
/// A display that does not fit the number.
pub fn written(model: &Model<'_>, number: &Number, display: Option<Display>) -> Result<String, Box<Problem>> {
    let digits = model.digits;
    Ok(match (number, display) {
        (Number::None(why), _) => format!("none: {why}"),
        (Number::Infinite, _) => "infinite".to_string(),
        (Number::Whole(text), None) => text.clone(),
        (Number::Whole(_), Some(display)) => return Err(Box::new(no_display(display))),
        (Number::Chance(chance, side, _), Some(Display::Percent)) if beyond_reach(*chance) => {
            if side.of(*chance) == chance.smaller() { "< 1e-298%" } else { "> 100 - 1e-298%" }.to_string()
        }
        (Number::Chance(chance, side, bound), None) => chance_text(*chance, *side, digits, *bound),
        (Number::Chance(chance, side, bound), Some(Display::Percent)) => {
            percent(*chance, *side, digits, *bound)
        }
        (Number::Chance(chance, side, bound), Some(Display::Chances)) => {
            let value = side.of(*chance);
            if value.is_zero() {
                "none: it never happens".to_string()
            } else {
                chances(value, digits, *bound)
            }
        }
        (Number::Chance(..), Some(display)) => return Err(Box::new(no_display(display))),
        (Number::Figure(quantity), display) => figure_text(model, quantity, display)?,
    })
}

fn no_display(display: Display) -> Problem {
    let (span, what) = match display {
        Display::Unit(unit) => (unit.span, "this unit does not fit what is asked"),
        _ => (Span::default(), "only a probability is shown in chances or in %"),
    };
    Problem::error(Code::WrongUnit, span, what).mend("take the `in …` away, or choose one that fits")
}

/// Digits as many as are decided, up to `digits`; `~` where none is.
pub(super) fn chance_text(chance: Chance, side: Side, digits: u8, bound: f64) -> String {
    let text = match side {
        Side::Works => format_works(chance, digits, bound),
        Side::Fails => format_fails(chance, digits, bound),
    };
    text.unwrap_or_else(|| format!("~{:e}", side.of(chance).to_f64()))
}

fn chances(value: Real, digits: u8, bound: f64) -> String {
    let among = value.recip();
    if value < Real::from(SMALLEST) {
        return "none: rarer than 1 in 1e300".to_string();
    }
    format!(
        "1 in {}",
        format_number(among, digits, bound + STEP).unwrap_or_else(|| format!("{:e}", among.to_f64()))
    )
}

/// A probability in percent, digits counted on its smaller side.
fn percent(chance: Chance, side: Side, digits: u8, bound: f64) -> String {
    let smaller_is_asked = side.of(chance) == chance.smaller();
    let smaller = chance.smaller();
    if smaller.is_zero() {
        return if smaller_is_asked { "0%".to_string() } else { "100%".to_string() };
    }
    let Some(rounded) = round_significant(smaller, digits, bound, Rounding::Nearest) else {
        return format!("{}%", side.of(chance).to_f64() * 100.0);
    };
    if smaller_is_asked {
        let shifted = rounded.shift10(2);
        let tiny = shifted.exponent() < -4;
        return format!("{}%", if tiny { shifted.scientific() } else { shifted.plain() });
    }
    if smaller.to_f64() < 1e-15 {
        return format!("100 - {}%", rounded.shift10(2).scientific());
    }
    format!("{}%", rounded.complement().shift10(2).plain())
}

pub(super) fn figure_text(
    model: &Model<'_>,
    quantity: &Quantity,
    display: Option<Display>,
) -> Result<String, Box<Problem>> {
    let bound = quantity.relative_error();
    let tiny = |value: Real| !value.is_zero() && value.abs() < Real::from(SMALLEST);
    let number = |value: Real| match format_number(value, model.digits, bound) {
        _ if tiny(value) && quantity.error <= SMALLEST => {
            if value.is_negative() { "> -1e-300" } else { "< 1e-300" }.to_string()
        }
        Some(text) => text,
        None if value.is_zero() || bound >= 1.0 => format!("~0 (within {:.0e})", quantity.error),
        None => format!("~{:.0e}", value.to_f64()),
    };
    match display {
        None => {
            let unit = model.units.symbol(&quantity.dim, &model.tree.names);
            let text = number(quantity.value);
            Ok(if unit.is_empty() { text } else { format!("{text} {unit}") })
        }
        Some(Display::Percent) if quantity.dim.is_none() => {
            Ok(format!("{}%", number(quantity.value * Real::from(100.0))))
        }
        Some(Display::Chances)
            if quantity.dim.is_none() && quantity.value > Real::ZERO && quantity.value <= Real::ONE =>
        {
            Ok(chances(quantity.value, model.digits, bound))
        }
        Some(Display::Unit(unit)) => {
            let (dim, factor) = model.units.resolve(unit, &model.tree.names)?;
            if dim != quantity.dim {
                let have = model.units.describe(&quantity.dim, &model.tree.names);
                return Err(Box::new(
                    Problem::error(Code::WrongUnit, unit.span, format!("this unit does not fit {have}"))
                        .mend("choose a unit of the same kind, or take the `in …` away"),
                ));
            }
            let word = crate::system::unit_word(model.tree.names.text(unit.word));
            let shown = match unit.form {
                crate::language::UnitForm::Plain => word,
                crate::language::UnitForm::Per => format!("/{word}"),
                crate::language::UnitForm::PercentPer => format!("%/{word}"),
            };
            Ok(format!("{} {shown}", number(quantity.value / factor)))
        }
        Some(display) => Err(Box::new(no_display(display))),
    }
}
