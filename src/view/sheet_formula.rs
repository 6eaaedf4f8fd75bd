//! Formula trees as formulas of a spreadsheet, and what a spreadsheet makes of them.
//!
//! A spreadsheet has doubles of 16 digits and no second tail. Each formula is
//! therefore written from the tail that is small: a complement is never had by
//! taking a sum or a product from 1. Beside each formula goes the double that it
//! comes to; where that is not what tieback has, the step holds its value only.

use crate::number::Real;
use crate::steps::{Formula, Side};

/// The longest formula that spreadsheets take is 8192 characters.
const LONGEST: usize = 8000;
/// Up to so many terms a sum over counts is written out.
const WRITTEN_OUT: u32 = 40;
/// Up to so many factors 1 - a^n is written out.
const POWERS: u32 = 16;

/// A text and the double that it comes to.
#[derive(Clone, PartialEq, Debug)]
pub(super) struct Part {
    pub(super) text: String,
    pub(super) value: f64,
}

/// A formula's value, and 1 minus it where that is known better.
#[derive(Clone, PartialEq, Debug)]
pub(super) struct Tails {
    pub(super) value: Part,
    pub(super) complement: Option<Part>,
}

/// Where the formulas of a workbook point to.
pub(super) trait Cells {
    /// The cell of a datum: of the symbol and the value it has in a step.
    fn datum(&self, symbol: &str, value: Real) -> Option<Part>;
    /// The cells of both sides of an earlier step.
    fn step(&self, step: usize) -> Option<(Part, Part)>;
}

fn part(text: impl Into<String>, value: f64) -> Part {
    Part { text: text.into(), value }
}

/// The formula for the cells, or nothing where no formula can hold it.
pub(super) fn tails(formula: &Formula, cells: &dyn Cells) -> Option<Tails> {
    let made = written(formula, cells)?;
    let fits = |p: &Part| p.text.len() <= LONGEST;
    (fits(&made.value) && made.complement.as_ref().is_none_or(fits)).then_some(made)
}

fn written(formula: &Formula, cells: &dyn Cells) -> Option<Tails> {
    let one = |f: &Formula| written(f, cells);
    let alone = |text: String, value: f64| Some(Tails { value: part(text, value), complement: None });
    match formula {
        Formula::Datum { symbol, value, complement, .. } => {
            let cell = cells.datum(symbol, *value)?;
            let other = complement.map(|c| part(format!("ROUND(1-{},15)", cell.text), rounded(c)));
            Some(Tails { value: cell, complement: other })
        }
        Formula::Step(step, side) => {
            let (works, fails) = cells.step(*step)?;
            Some(match side {
                Side::Works => Tails { value: works, complement: Some(fails) },
                Side::Fails => Tails { value: fails, complement: Some(works) },
            })
        }
        Formula::Whole(n) => alone(n.to_string(), f64::from(*n)),
        Formula::Sum(terms) => {
            let parts = terms.iter().map(one).collect::<Option<Vec<_>>>()?;
            let text: Vec<&str> = parts.iter().map(|p| p.value.text.as_str()).collect();
            alone(format!("({})", text.join("+")), parts.iter().map(|p| p.value.value).sum())
        }
        Formula::Product(factors) => product(&factors.iter().map(one).collect::<Option<Vec<_>>>()?),
        Formula::Quotient(a, b) => {
            let (a, b) = (one(a)?.value, one(b)?.value);
            alone(format!("({}/({}))", a.text, b.text), a.value / b.value)
        }
        Formula::OneMinus(a) => {
            let Tails { value, complement } = one(a)?;
            let less = || part(format!("(1-{})", value.text), 1.0 - value.value);
            Some(Tails { value: complement.unwrap_or_else(less), complement: Some(value) })
        }
        Formula::ExpMinus(a) => Some(exp_minus(&one(a)?.value)),
        Formula::Power(a, b) => power(&one(a)?, b, cells),
        Formula::Choose(n, k) => alone(format!("COMBIN({n},{k})"), choose(*n, *k)),
        Formula::Negate(a) => {
            let a = one(a)?.value;
            alone(format!("(-{})", a.text), -a.value)
        }
        Formula::Function(name, args) => function(name, &args.iter().map(one).collect::<Option<Vec<_>>>()?),
        Formula::AtLeast(need, members, side) => at_least(*need, members, *side, cells),
        Formula::Network(..) => None,
    }
}

/// What a spreadsheet's `ROUND(…, 15)` leaves of a complement.
fn rounded(complement: Real) -> f64 {
    (complement.to_f64() * 1e15).round() / 1e15
}

/// 1 - abc = (1-a) + a((1-b) + b(1-c)), in halves so that it does not nest deep.
fn product(factors: &[Tails]) -> Option<Tails> {
    match factors {
        [] => Some(Tails { value: part("1", 1.0), complement: Some(part("0", 0.0)) }),
        [only] => Some(only.clone()),
        _ => {
            let (left, right) = factors.split_at(factors.len().div_ceil(2));
            let (a, b) = (product(left)?, product(right)?);
            let complement = match (&a.complement, &b.complement) {
                (Some(ca), Some(cb)) => Some(part(
                    format!("({}+{}*{})", ca.text, a.value.text, cb.text),
                    ca.value + a.value.value * cb.value,
                )),
                _ => None,
            };
            let text = format!("{}*{}", a.value.text, b.value.text);
            let long = text.len() > LONGEST || complement.as_ref().is_some_and(|c| c.text.len() > LONGEST);
            (!long).then(|| Tails { value: part(text, a.value.value * b.value.value), complement })
        }
    }
}

/// exp(-x), and 1 - exp(-x) by its series where x is small.
fn exp_minus(x: &Part) -> Tails {
    let t = &x.text;
    let small = format!("{t}*(1-{t}/2*(1-{t}/3*(1-{t}/4*(1-{t}/5))))");
    Tails {
        value: part(format!("EXP(-{t})"), (-x.value).exp()),
        complement: Some(part(format!("IF({t}<0.001,{small},1-EXP(-{t}))"), -(-x.value).exp_m1())),
    }
}

fn power(base: &Tails, exponent: &Formula, cells: &dyn Cells) -> Option<Tails> {
    let a = &base.value;
    match (&base.complement, exponent) {
        (Some(q), Formula::Whole(n @ 1..=POWERS)) => {
            // 1 - a^n = q (1 + a (1 + a …))
            let inner = (1..*n).fold("1".to_string(), |sum, _| format!("(1+{}*{sum})", a.text));
            let sum = (1..*n).fold(1.0, |sum, _| 1.0 + a.value * sum);
            Some(Tails {
                value: part(format!("({}^{n})", a.text), a.value.powi(*n as i32)),
                complement: Some(part(format!("({}*{inner})", q.text), q.value * sum)),
            })
        }
        (Some(q), _) => {
            // Through the hazard, -ln(1 - q), by its series where q is small.
            let n = written(exponent, cells)?.value;
            let t = &q.text;
            let small = format!("{t}*(1+{t}/2*(1+{t}*2/3*(1+{t}*3/4*(1+{t}*4/5))))");
            let hazard = format!("({}*IF({t}<0.001,{small},-LN({})))", n.text, a.text);
            Some(exp_minus(&part(hazard, -n.value * (-q.value).ln_1p())))
        }
        (None, _) => {
            let n = written(exponent, cells)?.value;
            let value = part(format!("(({})^({}))", a.text, n.text), a.value.powf(n.value));
            Some(Tails { value, complement: None })
        }
    }
}

fn function(name: &str, args: &[Tails]) -> Option<Tails> {
    let values: Vec<f64> = args.iter().map(|a| a.value.value).collect();
    let first = *values.first()?;
    let (word, value) = match name {
        "exp" => ("EXP", first.exp()),
        "ln" => ("LN", first.ln()),
        "log10" => ("LOG10", first.log10()),
        "sqrt" => ("SQRT", first.sqrt()),
        "min" => ("MIN", values.iter().copied().fold(first, f64::min)),
        "max" => ("MAX", values.iter().copied().fold(first, f64::max)),
        _ => return None,
    };
    let text: Vec<&str> = args.iter().map(|a| a.value.text.as_str()).collect();
    Some(Tails { value: part(format!("{word}({})", text.join(",")), value), complement: None })
}

/// k of n like members: the few terms of the tail, or the distribution function.
fn at_least(need: u32, members: &[usize], side: Side, cells: &dyn Cells) -> Option<Tails> {
    let (first, n) = (*members.first()?, members.len() as u32);
    if members.iter().any(|m| *m != first) {
        return None;
    }
    let (p, q) = cells.step(first)?;
    // At least so many have failed when it fails; at most so many when it works.
    let fall = n.checked_sub(need)? + 1;
    let over = |range: std::ops::RangeInclusive<u32>, failures: u32| -> Option<Part> {
        if range.clone().count() as u32 > WRITTEN_OUT {
            // The count of failures up to the last that it bears.
            let text = format!("BINOM.DIST({failures},{n},{},TRUE)", q.text);
            let value = (0..=failures).map(|j| term(n, j, p.value, q.value)).sum();
            return (*range.start() == 0).then(|| part(text, value));
        }
        let terms: Vec<String> =
            range.clone().map(|j| format!("COMBIN({n},{j})*{}^{j}*{}^{}", q.text, p.text, n - j)).collect();
        let value = range.map(|j| term(n, j, p.value, q.value)).sum();
        Some(part(format!("({})", terms.join("+")), value))
    };
    let works = over(0..=fall - 1, fall - 1)?;
    let fails = over(fall..=n, 0)?;
    Some(match side {
        Side::Works => Tails { value: works, complement: Some(fails) },
        Side::Fails => Tails { value: fails, complement: Some(works) },
    })
}

/// The probability of `j` failures among `n`.
fn term(n: u32, j: u32, p: f64, q: f64) -> f64 {
    choose(n, j) * q.powi(j as i32) * p.powi((n - j) as i32)
}

fn choose(n: u32, k: u32) -> f64 {
    (0..k.min(n - k)).fold(1.0, |c, i| c * f64::from(n - i) / f64::from(i + 1))
}
