//! Importance of one thing in a system: Birnbaum and the measures that rest on it.

use super::desk::{Desk, Named};
use super::figure::{Number, Subject};
use crate::engine::importance::Importance;
use crate::engine::plan::BlockId;
use crate::language::{Expr, ExprId, List, Sym, words};
use crate::number::{Chance, Real};
use crate::source::{Code, Problem};
use crate::system::{Dim, Fault, Model, Out, Quantity, STEP};

/// Where a named thing stands in a system.
enum Place {
    Block(BlockId),
    Perfect,
    /// Not in it: no mistake of a table's row, which asks as every other row does.
    Elsewhere,
}

impl Place {
    fn of(block: Option<BlockId>) -> Place {
        block.map_or(Place::Perfect, Place::Block)
    }
}

/// Whether a table's row is the thing of a question: its name stands outside the question.
fn asked_by_a_row(model: &Model<'_>, call: ExprId, thing: ExprId) -> bool {
    let (call, thing) = (model.tree.span(call), model.tree.span(thing));
    thing.start < call.start || call.end < thing.end
}

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
        let by_row = asked_by_a_row(model, call, list[1]);
        let block = match self.find_block(model, &subject, list[1], by_row)? {
            Place::Block(block) => block,
            // It stands in no cut, and nothing changes with it.
            Place::Perfect => return Ok(measure_of_perfect(word, subject.valued.chance)),
            Place::Elsewhere => return Ok(Number::None(format!("not in {}", model.text_of(subject.thing)))),
        };
        let ranked = self.rank(model, subject.thing, &subject.prepared, &subject.valued, &subject.given);
        let Some(found) = ranked.get(block.0 as usize).copied().flatten() else {
            return Ok(Number::None("it has no importance of its own here".to_string()));
        };
        Ok(measure(word, &found, subject.valued.chance, subject.valued.bound))
    }

    /// The block of a named thing within a system.
    fn find_block(
        &mut self,
        model: &mut Model<'_>,
        subject: &Subject,
        name: ExprId,
        by_row: bool,
    ) -> Out<Place> {
        if let Some(fault) = model.faulty(name) {
            return Err(fault);
        }
        let wanted = match model.tree.expr(model.tree.inside_groups(name)) {
            Expr::Name(sym) => model.tree.names.text(sym).to_string(),
            _ => model.text_of(name),
        };
        let index = subject.prepared.names(model);
        let known = index.get(wanted.as_str());
        match known.and_then(|known| known.exact) {
            Some(Named::Thing(block)) => return Ok(Place::of(block)),
            Some(Named::Structure(Some(block))) => return Ok(Place::Block(block)),
            Some(Named::Structure(None)) => return Err(self.shares_with_the_rest(model, &wanted, name)),
            None => {}
        }
        let mut ends: Vec<(String, Option<BlockId>)> = known.map_or_else(Vec::new, |k| k.ends.clone());
        ends.sort();
        ends.dedup();
        if let [(_, block)] = ends.as_slice() {
            return Ok(Place::of(*block));
        }
        if let Expr::Name(sym) = model.tree.expr(model.tree.inside_groups(name))
            && ends.is_empty()
        {
            // Another name for a thing, or a perfect one, is found by building it.
            return self.find_by_building(model, subject, name, sym, by_row);
        }
        Err(self.not_in_system(model, subject, name, &wanted, &ends))
    }

    fn find_by_building(
        &mut self,
        model: &mut Model<'_>,
        subject: &Subject,
        name: ExprId,
        sym: Sym,
        by_row: bool,
    ) -> Out<Place> {
        if model.lookup(sym).is_some() {
            let asked = model.build(name)?;
            if let [(own, item)] = model.things_under(asked).as_slice()
                && subject.prepared.things(model).contains(own)
            {
                if model.item(*item).perfect {
                    return Ok(Place::Perfect);
                }
                if let Some(Named::Thing(block)) =
                    subject.prepared.names(model).get(own).and_then(|known| known.exact)
                {
                    return Ok(Place::of(block));
                }
            }
            if by_row {
                return Ok(Place::Elsewhere);
            }
        }
        let wanted = model.tree.names.text(sym).to_string();
        Err(self.not_in_system(model, subject, name, &wanted, &[]))
    }

    fn shares_with_the_rest(&mut self, model: &mut Model<'_>, wanted: &str, name: ExprId) -> Fault {
        let place = model.tree.span(name);
        model.fault(
            Problem::error(
                Code::NoValue,
                place,
                format!(
                    "`{wanted}` shares parts with the rest of the system and has no importance as a whole"
                ),
            )
            .mend("ask for its parts one by one"),
        )
    }

    fn not_in_system(
        &mut self,
        model: &mut Model<'_>,
        subject: &Subject,
        name: ExprId,
        wanted: &str,
        ends: &[(String, Option<BlockId>)],
    ) -> Fault {
        let place = model.tree.span(name);
        let system = model.text_of(subject.thing);
        let known: Vec<String> = subject.prepared.system.leaves.iter().map(|l| model.leaf_name(l)).collect();
        let problem = if ends.len() > 1 {
            let some: Vec<&str> = ends.iter().take(3).map(|(n, _)| n.as_str()).collect();
            Problem::error(Code::AmbiguousName, place, format!("\"{wanted}\" may be {}", some.join(" or ")))
                .mend("write its name in full, owner first")
        } else {
            let problem =
                Problem::error(Code::UnknownName, place, format!("\"{wanted}\" is no thing in {system}"));
            match words::nearest(wanted, known.iter().map(String::as_str)) {
                Some(near) => problem.mend(format!("did you mean \"{near}\"?")),
                None => {
                    let some: Vec<&str> = known.iter().take(5).map(String::as_str).collect();
                    problem.mend(format!("its things are {}", some.join(", ")))
                }
            }
        };
        model.fault(problem)
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
