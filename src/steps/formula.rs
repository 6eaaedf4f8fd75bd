//! Formula trees: what a step computes, as data.
//!
//! One tree is evaluated, shown in symbols, shown with numbers, and computed
//! again by whoever doubts it. Evaluation keeps both tails wherever a formula
//! has them, so that `1 - x` never loses digits of a probability.

use crate::engine::at_least;
use crate::engine::network::Limits;
use crate::number::{Chance, Real};
use crate::system::network::Network;
use std::sync::Arc;

/// Which tail of a step's result a formula uses.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub enum Side {
    /// Probability that it works.
    Works,
    /// Probability that it fails.
    Fails,
}

impl Side {
    /// `R` or `F`.
    pub fn letter(self) -> char {
        match self {
            Side::Works => 'R',
            Side::Fails => 'F',
        }
    }

    /// The side of a chance.
    pub fn of(self, chance: Chance) -> Real {
        match self {
            Side::Works => chance.works(),
            Side::Fails => chance.fails(),
        }
    }
}

/// A formula.
#[derive(Clone, PartialEq, Debug)]
pub enum Formula {
    /// A datum, as a symbol with its value: `t`, 4000, `4000 h`.
    Datum {
        /// How it stands in the formula in symbols.
        symbol: String,
        /// Its value in base units.
        value: Real,
        /// 1 − value, where the datum says it exactly.
        complement: Option<Real>,
        /// How it stands in the formula with numbers.
        text: String,
        /// How the note has it, where that is something else: `18 /Mh`.
        written: Option<String>,
    },
    /// The result of an earlier step, one side of it.
    Step(usize, Side),
    /// A whole number.
    Whole(u32),
    /// a + b + …
    Sum(Vec<Formula>),
    /// a · b · …
    Product(Vec<Formula>),
    /// a / b
    Quotient(Box<Formula>, Box<Formula>),
    /// 1 − a
    OneMinus(Box<Formula>),
    /// exp(−a)
    ExpMinus(Box<Formula>),
    /// a^b
    Power(Box<Formula>, Box<Formula>),
    /// Binomial coefficient.
    Choose(u32, u32),
    /// −a
    Negate(Box<Formula>),
    /// `exp`, `ln`, `log10`, `sqrt`, `min`, `max` of figures.
    Function(&'static str, Vec<Formula>),
    /// P(at least k of these independent things work), `Works`; its complement, `Fails`.
    AtLeast(u32, Vec<usize>, Side),
    /// P(enough ends of a network are reached), `Works`; its complement, `Fails`.
    /// The number at a stop is a place in this list of steps.
    Network(Arc<Network>, Vec<usize>, Side),
}

/// Both tails of a formula's value; the second is known where the formula has it.
pub type Tails = (Real, Option<Real>);

impl Formula {
    /// A product, or its only factor.
    pub fn product(mut factors: Vec<Formula>) -> Formula {
        if factors.len() == 1 { factors.remove(0) } else { Formula::Product(factors) }
    }

    /// A sum, or its only term.
    pub fn sum(mut terms: Vec<Formula>) -> Formula {
        if terms.len() == 1 { terms.remove(0) } else { Formula::Sum(terms) }
    }

    /// `base^power`, or the base where the power is 1.
    pub fn power(base: Formula, power: u32) -> Formula {
        if power == 1 { base } else { Formula::Power(Box::new(base), Box::new(Formula::Whole(power))) }
    }

    /// 1 − this.
    pub fn one_minus(self) -> Formula {
        Formula::OneMinus(Box::new(self))
    }

    /// The value, from the results of earlier steps.
    ///
    /// Recursion is as deep as the formula, which a step keeps small.
    pub fn evaluate(&self, results: &[Chance]) -> Tails {
        match self {
            Formula::Datum { value, complement, .. } => (*value, *complement),
            Formula::Step(step, side) => {
                let chance = results[*step];
                let (a, b) = (chance.works(), chance.fails());
                if *side == Side::Works { (a, Some(b)) } else { (b, Some(a)) }
            }
            Formula::Whole(n) => (Real::from(*n), None),
            Formula::Sum(terms) => {
                (terms.iter().fold(Real::ZERO, |sum, t| sum + t.evaluate(results).0), None)
            }
            Formula::Product(factors) => product(factors.iter().map(|f| f.evaluate(results))),
            Formula::Quotient(a, b) => (a.evaluate(results).0 / b.evaluate(results).0, None),
            Formula::OneMinus(a) => match a.evaluate(results) {
                (value, Some(complement)) => (complement, Some(value)),
                (value, None) => (Real::ONE - value, Some(value)),
            },
            Formula::ExpMinus(a) => {
                let chance = Chance::from_hazard(a.evaluate(results).0);
                (chance.works(), Some(chance.fails()))
            }
            Formula::Power(a, b) => power(a.evaluate(results), b.evaluate(results).0),
            Formula::Choose(n, k) => (choose(*n, *k), None),
            Formula::Negate(a) => (-a.evaluate(results).0, None),
            Formula::Function(name, args) => {
                let values: Vec<Real> = args.iter().map(|a| a.evaluate(results).0).collect();
                (function(name, &values), None)
            }
            Formula::AtLeast(need, members, side) => {
                let chances: Vec<Chance> = members.iter().map(|m| results[*m]).collect();
                tails(at_least::at_least(*need as usize, &chances), *side)
            }
            Formula::Network(network, members, side) => {
                let chances: Vec<Chance> = members.iter().map(|m| results[*m]).collect();
                tails(network.frontier(&chances, &Limits::default()).middle(), *side)
            }
        }
    }

    /// The numbers of the steps that it uses, each once, rising.
    pub fn uses(&self) -> Vec<usize> {
        let mut found = Vec::new();
        self.collect(&mut found);
        found.sort_unstable();
        found.dedup();
        found
    }

    /// Data that the note writes in another way than the formula with numbers
    /// does: `λ = 18 /Mh = 1.8e-5 /h`, each once.
    pub fn data(&self) -> Vec<String> {
        let mut found = Vec::new();
        self.collect_data(&mut found);
        found
    }

    fn collect_data(&self, found: &mut Vec<String>) {
        match self {
            Formula::Datum { symbol, text, written: Some(written), .. } => {
                let line = if symbol == written {
                    format!("{symbol} = {text}")
                } else {
                    format!("{symbol} = {written} = {text}")
                };
                if !found.contains(&line) {
                    found.push(line);
                }
            }
            Formula::Datum { .. }
            | Formula::Whole(_)
            | Formula::Choose(..)
            | Formula::Step(..)
            | Formula::AtLeast(..)
            | Formula::Network(..) => {}
            Formula::Sum(list) | Formula::Product(list) | Formula::Function(_, list) => {
                list.iter().for_each(|f| f.collect_data(found));
            }
            Formula::Quotient(a, b) | Formula::Power(a, b) => {
                a.collect_data(found);
                b.collect_data(found);
            }
            Formula::OneMinus(a) | Formula::ExpMinus(a) | Formula::Negate(a) => a.collect_data(found),
        }
    }

    fn collect(&self, found: &mut Vec<usize>) {
        match self {
            Formula::Datum { .. } | Formula::Whole(_) | Formula::Choose(..) => {}
            Formula::Step(step, _) => found.push(*step),
            Formula::Sum(list) | Formula::Product(list) => list.iter().for_each(|f| f.collect(found)),
            Formula::Quotient(a, b) | Formula::Power(a, b) => {
                a.collect(found);
                b.collect(found);
            }
            Formula::OneMinus(a) | Formula::ExpMinus(a) | Formula::Negate(a) => a.collect(found),
            Formula::Function(_, args) => args.iter().for_each(|f| f.collect(found)),
            Formula::AtLeast(_, members, _) | Formula::Network(_, members, _) => found.extend(members),
        }
    }
}

fn tails(chance: Chance, side: Side) -> Tails {
    match side {
        Side::Works => (chance.works(), Some(chance.fails())),
        Side::Fails => (chance.fails(), Some(chance.works())),
    }
}

/// A product with both tails where every factor has them: 1 − ab = (1−a) + a(1−b).
fn product(factors: impl Iterator<Item = Tails>) -> Tails {
    let mut done: Tails = (Real::ONE, Some(Real::ZERO));
    for (value, complement) in factors {
        let other = match (done.1, complement) {
            (Some(a), Some(b)) => Some(a + done.0 * b),
            _ => None,
        };
        done = (done.0 * value, other);
    }
    done
}

fn power((base, complement): Tails, exponent: Real) -> Tails {
    match complement {
        Some(complement) if base <= Real::ONE && !base.is_negative() => {
            let chance = Chance::new(base, complement).power(exponent);
            (chance.works(), Some(chance.fails()))
        }
        _ => (base.powf(exponent), None),
    }
}

fn function(name: &str, values: &[Real]) -> Real {
    let first = values.first().copied().unwrap_or(Real::ZERO);
    match name {
        "exp" => first.exp(),
        "ln" => first.ln(),
        "log10" => first.log10(),
        "sqrt" => first.sqrt(),
        "min" => values.iter().copied().fold(first, Real::min),
        _ => values.iter().copied().fold(first, Real::max),
    }
}

/// n over k by its product, exact while it fits 106 bits.
fn choose(n: u32, k: u32) -> Real {
    let k = k.min(n - k);
    let mut value = Real::ONE;
    for i in 0..k {
        value = value * Real::from(n - i) / Real::from(i + 1);
    }
    value
}
