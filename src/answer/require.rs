//! Requirements: met, not met, or undecided, compared unrounded.

use super::desk::Desk;
use super::display::{figure_text, written};
use super::figure::{Number, asks_within};
use crate::language::{ExprId, Limit};
use crate::number::{Real, format_number};
use crate::source::{Code, Problem};
use crate::steps::Side;
use crate::system::{Ctx, Model, Out, Quantity, STEP};

/// How a requirement came out.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Verdict {
    /// It holds.
    Met,
    /// It does not hold.
    NotMet,
    /// The error bound straddles the limit.
    Undecided,
}

/// Bounds finer than this come from rounding alone: a value that close to its
/// limit is the limit, and limits are inclusive.
const ROUNDING: f64 = 1e-24;

/// The verdict on a requirement, and its answer.
///
/// # Errors
/// What prevents a comparison.
pub fn require(
    desk: &mut Desk,
    model: &mut Model<'_>,
    left: ExprId,
    limit: Limit,
    right: ExprId,
) -> Out<(Verdict, String)> {
    let (left, limit, right) = turned(model, left, limit, right);
    let number = desk.number(model, left)?;
    let bar = model.figure_with(right, Ctx::TOP, desk)?;
    let value = match quantity(&number) {
        Ok(value) => value,
        Err(why) => {
            let place = model.tree.span(left);
            return Err(model.fault(
                Problem::error(Code::NoValue, place, format!("there is nothing to compare: {why}"))
                    .mend("require something that has a figure"),
            ));
        }
    };
    if value.dim != bar.dim {
        let (have, want) = (
            model.units.describe(&value.dim, &model.tree.names),
            model.units.describe(&bar.dim, &model.tree.names),
        );
        let place = model.tree.span(right);
        return Err(model.fault(
            Problem::error(Code::WrongUnit, place, format!("{have} cannot be compared with {want}"))
                .mend("give the limit the unit of what is required"),
        ));
    }
    let verdict = compare(&value, limit, &bar);
    let shown = match written(model, &number, None) {
        Ok(text) => text,
        Err(_) => figure_text(model, &value, None).unwrap_or_default(),
    };
    let word = match verdict {
        Verdict::Met => "met",
        Verdict::NotMet => "NOT met",
        Verdict::Undecided => "UNDECIDED",
    };
    let used = match &number {
        Number::Chance(chance, side, _) => used(*side, chance.fails(), limit, &bar),
        _ => None,
    };
    Ok((verdict, format!("{word}: {shown}{}", used.unwrap_or_default())))
}

/// `0.98 <= R(feed)` says the same as `R(feed) >= 0.98`, and what is asked is shown.
fn turned(model: &Model<'_>, left: ExprId, limit: Limit, right: ExprId) -> (ExprId, Limit, ExprId) {
    let turned = asks_within(model, right) && !asks_within(model, left);
    match (turned, limit) {
        (false, limit) => (left, limit, right),
        (true, Limit::AtLeast) => (right, Limit::AtMost, left),
        (true, Limit::AtMost) => (right, Limit::AtLeast, left),
    }
}

/// A requirement as what is asked, at least or at most, and the limit.
///
/// # Errors
/// What is wrong with the limit.
pub(crate) fn require_parts(
    desk: &mut Desk,
    model: &mut Model<'_>,
    left: ExprId,
    limit: Limit,
    right: ExprId,
) -> Out<(ExprId, Limit, Quantity)> {
    let (left, limit, right) = turned(model, left, limit, right);
    Ok((left, limit, model.figure_with(right, Ctx::TOP, desk)?))
}

fn quantity(number: &Number) -> Result<Quantity, String> {
    match number {
        Number::Infinite => Err("it is infinite".to_string()),
        Number::None(why) => Err(why.clone()),
        number => number.clone().quantity(),
    }
}

/// Compares on the smaller side where both sides of both are known, so that
/// nines never hide a difference.
fn compare(value: &Quantity, limit: Limit, bar: &Quantity) -> Verdict {
    let half = Real::from(0.5);
    let (a, b, flipped) = match (value.complement, bar.complement) {
        (Some(ca), Some(cb)) if value.value > half => (ca, cb, true),
        _ => (value.value, bar.value, false),
    };
    let scale =
        if flipped { complement_error(value) + complement_error(bar) } else { value.error + bar.error };
    let slack = scale.max((a.to_f64().abs() + b.to_f64().abs()) * 1e-28);
    let difference = (a - b).to_f64();
    let relative = slack / (a.to_f64().abs() + b.to_f64().abs()).max(f64::MIN_POSITIVE);
    if difference.abs() <= slack {
        return if relative <= ROUNDING || difference == 0.0 { Verdict::Met } else { Verdict::Undecided };
    }
    let above = (difference > 0.0) != flipped;
    if above == (limit == Limit::AtLeast) { Verdict::Met } else { Verdict::NotMet }
}

/// The error of what 1 minus a figure is. That of the figure is this and the
/// rounding of the figure itself, which may be far larger.
fn complement_error(figure: &Quantity) -> f64 {
    let complement = figure.complement.map_or(0.0, |c| c.to_f64().abs());
    let rounding = 1.001 * figure.value.to_f64().abs() * STEP;
    (figure.error - rounding).max(16.0 * complement * STEP)
}

/// `, uses 71.5% of the allowed 0.02`
fn used(side: Side, fails: Real, limit: Limit, bar: &Quantity) -> Option<String> {
    let allowed = match (side, limit) {
        (Side::Works, Limit::AtLeast) => bar.complement.unwrap_or(Real::ONE - bar.value),
        (Side::Fails, Limit::AtMost) => bar.value,
        _ => return None,
    };
    if allowed <= Real::ZERO {
        return None;
    }
    let share = fails / allowed * Real::from(100.0);
    // Three digits, also where the share is large.
    let text = match crate::number::round_significant(share, 3, ROUNDING, crate::number::Rounding::Nearest) {
        Some(digits) if digits.exponent() > 2 => digits.scientific(),
        _ => format_number(share, 3, ROUNDING)?,
    };
    Some(format!(", uses {text}% of the allowed {}", super::plain(allowed)))
}
