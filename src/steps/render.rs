//! Steps as text: formulas in symbols and with numbers.

use super::formula::{Formula, Side};
use super::list::{Outcome, Rule, Step, StepList};
use crate::number::{Chance, format_fails, format_number, format_works};
use crate::source::Sources;
use crate::system::network::Network;

/// Relative error that a step's printed digits allow for; the engine's is far smaller.
const BOUND: f64 = 1e-25;

/// A step's parts as text.
#[derive(Clone, PartialEq, Debug)]
pub struct Shown {
    /// The thing.
    pub thing: String,
    /// `line 12`, `Power!C7`, or empty.
    pub place: String,
    /// Rule and source.
    pub rule: &'static str,
    /// Published source of the rule.
    pub source: &'static str,
    /// `R(feed)`, the left side.
    pub left: String,
    /// The formula in symbols.
    pub symbols: String,
    /// The same with numbers.
    pub numbers: String,
    /// Data that the note writes in another way: `λ = 18 /Mh = 1.8e-5 /h`.
    pub data: Vec<String>,
    /// The result of the printed side, or the figure.
    pub result: String,
    /// The other side, with its letter: `F = 0.01430`; empty for a figure.
    pub other: String,
    /// Steps that it rests on, counted from 1.
    pub rests_on: Vec<usize>,
}

/// One side of a chance in `digits` digits of the smaller side.
pub fn side_text(side: Side, chance: Chance, digits: u8) -> String {
    let text = match side {
        Side::Works => format_works(chance, digits, BOUND),
        Side::Fails => format_fails(chance, digits, BOUND),
    };
    text.unwrap_or_else(|| "~".to_string())
}

/// The parts of every step.
pub fn shown(list: &StepList, sources: &Sources, digits: u8) -> Vec<Shown> {
    list.steps.iter().map(|step| show(list, step, sources, digits)).collect()
}

fn show(list: &StepList, step: &Step, sources: &Sources, digits: u8) -> Shown {
    let formula = step.formula();
    let render = |numbers: bool| Renderer { list, numbers, digits }.text(formula, 0);
    let (left, result, other) = match &step.outcome {
        Outcome::Chance(chance) => {
            let other = if step.shown == Side::Works { Side::Fails } else { Side::Works };
            // A datum stands as it is given, without zeros that say nothing.
            let side = |side| match step.rule {
                Rule::Given => given_text(side, *chance, digits),
                _ => side_text(side, *chance, digits),
            };
            (
                format!("{}({})", step.shown.letter(), step.symbol),
                side(step.shown),
                format!("{} = {}", other.letter(), side(other)),
            )
        }
        Outcome::Figure(value, unit) => {
            let number = format_number(*value, digits, BOUND).unwrap_or_else(|| "~".to_string());
            let result = if unit.is_empty() { number } else { format!("{number} {unit}") };
            (step.thing.clone(), result, String::new())
        }
    };
    let place = step.place.filter(|p| sources.find(*p).is_some()).map_or(String::new(), |p| sources.words(p));
    Shown {
        thing: step.thing.clone(),
        place,
        rule: step.rule.name(),
        source: step.rule.source(),
        left,
        symbols: render(false),
        numbers: render(true),
        data: formula.data(),
        result,
        other,
        rests_on: formula.uses().into_iter().map(|s| s + 1).collect(),
    }
}

struct Renderer<'a> {
    list: &'a StepList,
    numbers: bool,
    digits: u8,
}

/// A probability as given: in as few digits as say all of it, else as any other.
fn given_text(side: Side, chance: Chance, digits: u8) -> String {
    let whole = super::build::trimmed(&side_text(side, chance, 15));
    let usual = side_text(side, chance, digits);
    if whole.len() <= usual.len() { whole } else { usual }
}

/// The most factors and terms that are written in full, and how many stand
/// before the gap in a longer row.
const FACTORS: usize = 12;
const TERMS: usize = 16;
const ENDS: usize = 3;

/// Binding strength of what stands around: a sum inside a product needs parentheses.
const SUM: u8 = 1;
const PRODUCT: u8 = 2;
const POWER: u8 = 3;

impl Renderer<'_> {
    fn text(&self, formula: &Formula, around: u8) -> String {
        let (text, own) = match formula {
            Formula::Datum { symbol, text, .. } => {
                let shown = if self.numbers { text } else { symbol };
                (shown.clone(), if self.numbers && text.contains(' ') { PRODUCT } else { POWER + 1 })
            }
            Formula::Step(step, side) => (self.step(*step, *side), self.step_binding(*step, *side)),
            Formula::Whole(n) => (n.to_string(), POWER + 1),
            Formula::Sum(terms) => match terms.as_slice() {
                [a, Formula::Negate(b)] => {
                    (format!("{} - {}", self.text(a, SUM), self.text(b, PRODUCT)), SUM)
                }
                _ => (self.joined(terms, " + ", SUM, TERMS), SUM),
            },
            Formula::Product(factors) => (self.joined(factors, " · ", PRODUCT, FACTORS), PRODUCT),
            Formula::Quotient(a, b) => {
                (format!("{} / {}", self.text(a, PRODUCT), self.text(b, POWER)), PRODUCT)
            }
            Formula::OneMinus(a) => (format!("1 - {}", self.text(a, PRODUCT)), SUM),
            Formula::Negate(a) => (format!("-{}", self.text(a, PRODUCT)), SUM),
            Formula::ExpMinus(a) => (format!("exp(-{})", self.text(a, PRODUCT)), POWER + 1),
            Formula::Power(a, b) => {
                (format!("{}^{}", self.text(a, POWER + 1), self.text(b, POWER + 1)), POWER)
            }
            Formula::Choose(n, k) => (format!("C({n}, {k})"), POWER + 1),
            Formula::Function(name, args) => {
                (format!("{name}({})", self.joined(args, ", ", 0, usize::MAX)), POWER + 1)
            }
            Formula::AtLeast(need, members, side) => (self.at_least(*need, members, *side), POWER + 1),
            Formula::Network(network, members, side) => (self.network(network, members, *side), POWER + 1),
        };
        let less = matches!(formula, Formula::OneMinus(_)) || text.starts_with("1 - ");
        if own < around || (own == around && own == SUM && less) { format!("({text})") } else { text }
    }

    /// The parts, those in the middle of more than `most` left out and counted.
    fn joined(&self, parts: &[Formula], between: &str, around: u8, most: usize) -> String {
        let text = |p: &Formula| self.text(p, around);
        if parts.len() <= most {
            return parts.iter().map(text).collect::<Vec<_>>().join(between);
        }
        let mut shown: Vec<String> = parts[..ENDS].iter().map(text).collect();
        shown.push(format!("… ({} more)", parts.len() - ENDS - 1));
        shown.extend(parts.last().map(text));
        shown.join(between)
    }

    fn step(&self, step: usize, side: Side) -> String {
        let found = &self.list.steps[step];
        match (&found.outcome, self.numbers) {
            // The formula with numbers must show what it was computed with.
            (Outcome::Chance(chance), true) if found.rule == Rule::Given => {
                given_text(side, *chance, self.digits)
            }
            (Outcome::Chance(chance), true) => side_text(side, *chance, self.digits),
            _ => format!("{}({})", side.letter(), found.symbol),
        }
    }

    /// `1 - 6.4e-93` among factors needs parentheses.
    fn step_binding(&self, step: usize, side: Side) -> u8 {
        if self.step(step, side).contains(" - ") && self.numbers { SUM } else { POWER + 1 }
    }

    fn network(&self, network: &Network, members: &[usize], side: Side) -> String {
        let names: Vec<String> = members.iter().map(|m| self.step(*m, Side::Works)).collect();
        let n = names.len();
        let of = if n <= FACTORS {
            names.join(", ")
        } else {
            format!("{}, … ({} more), {}", names[..ENDS].join(", "), n - ENDS - 1, names[n - 1])
        };
        let what = match (network.ends.len(), network.need) {
            (1, _) => "a way leads".to_string(),
            (ends, need) if ends == need as usize => "ways lead to all ends".to_string(),
            (ends, need) => format!("ways lead to {need} of {ends} ends"),
        };
        match side {
            Side::Works => format!("P({what} through {of})"),
            Side::Fails => format!("P(not: {what} through {of})"),
        }
    }

    fn at_least(&self, need: u32, members: &[usize], side: Side) -> String {
        let n = members.len();
        let names: Vec<String> = members.iter().map(|m| self.step(*m, Side::Works)).collect();
        let alike = members.iter().all(|m| *m == members[0]);
        let of = if alike {
            format!("{n} × {}", names[0])
        } else if n <= FACTORS {
            names.join(", ")
        } else {
            format!("{}, … ({} more), {}", names[..ENDS].join(", "), n - ENDS - 1, names[n - 1])
        };
        match side {
            Side::Works => format!("P(at least {need} of {n} work: {of})"),
            Side::Fails => format!("P(fewer than {need} of {n} work: {of})"),
        }
    }
}
