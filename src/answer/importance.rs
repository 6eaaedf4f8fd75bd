//! Importance of one thing in a system: Birnbaum and the measures that rest on it.

use super::desk::Desk;
use super::figure::Number;
use super::find::Found;
use crate::engine::importance::Importance;
use crate::language::{ExprId, List};
use crate::number::{Chance, Real};
use crate::source::{Code, Problem};
use crate::system::{Dim, Model, Out, Quantity, STEP};

impl Desk {
    pub(super) fn importance(
        &mut self,
        model: &mut Model<'_>,
        call: ExprId,
        args: List,
        word: &str,
    ) -> Out<Number> {
        let place = model.tree.span(call);
        let list = model.tree.list(args).to_vec();
        if list.len() < 2 {
            return Err(model.fault(
                Problem::error(
                    Code::WrongArguments,
                    place,
                    format!("`{word}` takes a system and a thing in it"),
                )
                .mend(format!("write `{word}(feed, pump)`")),
            ));
        }
        let subject = self.subject(model, call, args, 2)?;
        let block = match self.find(model, &subject, list[1])? {
            Found::Block(block) => block,
            // It stands in no cut, and nothing changes with it.
            Found::Perfect => return Ok(measure_of_perfect(word, subject.valued.chance)),
            Found::Elsewhere => {
                return Ok(Number::None(format!("not in {}", model.text_of(subject.thing))));
            }
        };
        let ranked = self.rank(model, subject.thing, &subject.prepared, &subject.valued, &subject.given)?;
        let Some(found) = ranked.get(block.0 as usize).copied().flatten() else {
            return Ok(Number::None("it has no importance of its own here".to_string()));
        };
        Ok(measure(word, &found, subject.valued.chance, subject.valued.bound))
    }
}

/// One measure of importance. Definitions: criticality B·q/F, Fussell–Vesely
/// P(some minimal cut set with the thing in it has failed)/F, RAW F(failed)/F, RRW F/F(perfect).
pub(super) fn measure(word: &str, found: &Importance, system: Chance, bound: f64) -> Number {
    let fails = system.fails();
    // A ratio of two values with the engine's bound each, and the sweep's own work.
    let bound = 8.0 * bound + 64.0 * STEP;
    let figure = |value: Real| {
        Number::Figure(Quantity {
            value,
            complement: None,
            dim: Dim::NONE,
            error: value.to_f64().abs() * bound,
        })
    };
    let never_fails = || Number::None("the whole cannot fail".to_string());
    if fails.to_f64() > 0.0
        && fails.to_f64() < 1e-290
        && !matches!(word, "Birnbaum" | "doubled" | "made perfect")
    {
        return Number::None("the whole fails too rarely to divide by".to_string());
    }
    match word {
        "Birnbaum" => figure(found.birnbaum),
        "doubled" => figure(found.gain_doubled()),
        "made perfect" => figure(found.gain_perfect()),
        _ if fails.is_zero() => never_fails(),
        "criticality" => figure(found.birnbaum * found.own.fails() / fails),
        "RAW" => figure(found.if_failed.fails() / fails),
        "RRW" if found.if_works.fails().is_zero() => Number::Infinite,
        "RRW" => figure(fails / found.if_works.fails()),
        _ => match found.fussell_vesely(fails) {
            Some(value) => figure(value),
            None => Number::None("its minimal cut sets are too many".to_string()),
        },
    }
}

fn measure_of_perfect(word: &str, system: Chance) -> Number {
    let value = match word {
        "RAW" | "RRW" if !system.fails().is_zero() => Real::ONE,
        "RAW" | "RRW" | "criticality" | "FV" if system.fails().is_zero() => {
            return Number::None("the whole cannot fail".to_string());
        }
        _ => Real::ZERO,
    };
    Number::Figure(Quantity::number(value))
}
