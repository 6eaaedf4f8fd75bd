//! Questions that a number answers, and how that number is written.

use super::desk::{Desk, Prepared, Valued};
use super::display::{SMALLEST, beyond_reach};
use crate::engine::cuts::Minimal;
use crate::engine::minimal::Which;
use crate::language::{Expr, ExprId, List, words};
use crate::number::Chance;
use crate::source::{Code, Problem, Span};
use crate::steps::Side;
use crate::system::{Ctx, Dim, Fault, Model, Oracle, Out, Quantity, STEP};
use std::sync::Arc;

/// Diagram nodes allowed while minimal sets are made.
pub(super) const SET_NODES: usize = 4_000_000;
/// Questions inside questions.
const DEEPEST: u32 = 100;

/// A numeric answer before it is written.
#[derive(Clone, Debug)]
pub enum Number {
    /// A probability and which side of it was asked.
    Chance(Chance, Side, f64),
    /// A figure.
    Figure(Quantity),
    /// A whole number, all digits.
    Whole(String),
    /// No value, and why.
    None(String),
    /// Beyond all bounds.
    Infinite,
}

impl Number {
    /// As a figure for arithmetic.
    pub(super) fn quantity(self) -> Result<Quantity, String> {
        match self {
            Number::Chance(chance, side, bound) => {
                let (value, other) = match side {
                    Side::Works => (chance.works(), chance.fails()),
                    Side::Fails => (chance.fails(), chance.works()),
                };
                let error = if beyond_reach(chance) {
                    SMALLEST
                } else {
                    chance.smaller().to_f64() * bound + value.to_f64() * STEP
                };
                Ok(Quantity { value, complement: Some(other), dim: Dim::NONE, error })
            }
            Number::Figure(quantity) => Ok(quantity),
            Number::Whole(text) => match crate::number::Decimal::parse(&text) {
                Some(decimal) => Ok(Quantity::number(decimal.to_real())),
                None => Err("it has no value".to_string()),
            },
            Number::None(why) => Err(why),
            Number::Infinite => Err("it is infinite".to_string()),
        }
    }
}

impl Oracle for Desk {
    fn ask(&mut self, model: &mut Model<'_>, call: ExprId, _: Ctx) -> Out<Quantity> {
        let number = self.call(model, call)?;
        number.quantity().map_err(|why| {
            let text = model.text_of(call);
            let place = model.tree.span(call);
            model.fault(
                Problem::error(
                    Code::NoValue,
                    place,
                    format!("`{text}` is no figure to calculate with: {why}"),
                )
                .mend("ask it on a line of its own"),
            )
        })
    }
}

/// A question's thing, valued.
pub(super) struct Subject {
    pub(super) thing: ExprId,
    pub(super) given: Vec<ExprId>,
    pub(super) prepared: Arc<Prepared>,
    pub(super) valued: Arc<Valued>,
}

impl Desk {
    /// The number that an expression comes to.
    ///
    /// # Errors
    /// What prevents it.
    pub fn number(&mut self, model: &mut Model<'_>, expr: ExprId) -> Out<Number> {
        let inner = model.tree.inside_groups(expr);
        if let Expr::Call(word, _) = model.tree.expr(inner)
            && !words::FUNCTIONS.contains(&model.tree.names.text(word))
        {
            return self.call(model, inner);
        }
        // A name for a definition that asks is answered like the question itself.
        if let Expr::Name(sym) = model.tree.expr(inner)
            && let Some(def) = model.lookup(sym)
            && let Some(value) = model.def(def).value
            && let Expr::Call(word, _) = model.tree.expr(model.tree.inside_groups(value))
            && words::QUESTIONS.contains(&model.tree.names.text(word))
            && model.def(def).broken.is_none()
        {
            return self.call(model, model.tree.inside_groups(value));
        }
        model.figure_with(expr, Ctx::TOP, self).map(Number::Figure)
    }

    /// The number that a question comes to.
    ///
    /// # Errors
    /// What prevents it.
    pub fn call(&mut self, model: &mut Model<'_>, call: ExprId) -> Out<Number> {
        if self.depth >= DEEPEST {
            let place = model.tree.span(call);
            return Err(model.fault(
                Problem::error(Code::TooDeep, place, "questions stand inside questions too deep")
                    .mend("give the inner ones names on lines of their own"),
            ));
        }
        self.depth += 1;
        let out = self.call_inner(model, call);
        self.depth -= 1;
        out
    }

    fn call_inner(&mut self, model: &mut Model<'_>, call: ExprId) -> Out<Number> {
        let Expr::Call(word, args) = model.tree.expr(call) else {
            return Ok(Number::None("nothing is asked".to_string()));
        };
        let tree = model.tree;
        let text = tree.names.text(word);
        match text {
            "R" | "F" => {
                let side = if text == "R" { Side::Works } else { Side::Fails };
                let subject = self.subject(model, call, args, 1)?;
                Ok(Number::Chance(subject.valued.chance, side, subject.valued.bound))
            }
            "count" => self.count(model, call, args),
            "total" => self.total(model, call, args),
            "Birnbaum" | "criticality" | "FV" | "RAW" | "RRW" | "doubled" | "made perfect" => {
                self.importance(model, call, args, text)
            }
            "cuts" | "paths" | "single points" | "rank" | "steps" | "assumptions" | "inputs" => {
                let place = model.tree.span(call);
                Err(model.fault(
                    Problem::error(Code::WrongKind, place, format!("`{text}(…)` is a list and no figure"))
                        .mend(format!("ask it on a line of its own, or count it: `count({text}(…))`")),
                ))
            }
            _ => Err(model.unknown_call(call, word)),
        }
    }

    /// The arguments of a question: its thing, then `skip − 1` more, then an exposure.
    pub(super) fn subject(
        &mut self,
        model: &mut Model<'_>,
        call: ExprId,
        args: List,
        skip: usize,
    ) -> Out<Subject> {
        let place = model.tree.span(call);
        let tree = model.tree;
        let args = tree.list(args);
        let Some(&thing) = args.first() else { return Err(no_thing(model, call)) };
        self.no_figure(model, thing)?;
        let prepared = self.prepare(model, thing)?;
        let given = args[skip.min(args.len())..].to_vec();
        let valued = self.value(model, thing, &prepared, &given, place)?;
        Ok(Subject { thing, given, prepared, valued })
    }

    /// A question about a name that is only a figure.
    pub(super) fn no_figure(&mut self, model: &mut Model<'_>, thing: ExprId) -> Out<()> {
        let Expr::Name(sym) = model.tree.expr(model.tree.inside_groups(thing)) else { return Ok(()) };
        let Some(def) = model.lookup(sym) else { return Ok(()) };
        let Some(value) = model.def(def).value else { return Ok(()) };
        let (figure, why) = match model.tree.expr(model.tree.inside_groups(value)) {
            _ if asks_within(model, value) => (true, "the answer to a question".to_string()),
            Expr::Literal(_) | Expr::WithUnit(..) | Expr::Arith(..) | Expr::Negate(_) => {
                match model.figure_with(value, Ctx::TOP, self) {
                    Ok(quantity) if quantity.dim.is_none() => (false, String::new()),
                    Ok(quantity) => (true, model.units.describe(&quantity.dim, &model.tree.names)),
                    Err(fault) => return Err(fault),
                }
            }
            Expr::Call(word, _) => {
                let text = model.tree.names.text(word);
                let asks = words::QUESTIONS.contains(&text) || words::FUNCTIONS.contains(&text);
                (asks, "the answer to a question".to_string())
            }
            _ => (false, String::new()),
        };
        if !figure {
            return Ok(());
        }
        let (place, span, name) = (model.tree.span(thing), model.def(def).span, model.written(sym));
        Err(model.fault(
            Problem::error(Code::WrongKind, place, format!("`{name}` is only a figure: {why}"))
                .label(span, "defined here")
                .mend(format!(
                    "make an item of it, as in `item = rate {name}`, or ask for the figure itself: `{name} ?`"
                )),
        ))
    }

    fn count(&mut self, model: &mut Model<'_>, call: ExprId, args: List) -> Out<Number> {
        let place = model.tree.span(call);
        let wrong = Problem::error(Code::WrongArguments, place, "`count` takes a list that is asked for")
            .mend("write `count(cuts(x))`, `count(paths(x))` or `count(single points(x))`");
        let [list] = *model.tree.list(args) else { return Err(model.fault(wrong)) };
        let Expr::Call(word, inner) = model.tree.expr(model.tree.inside_groups(list)) else {
            return Err(model.fault(wrong));
        };
        let text = model.tree.names.text(word).to_string();
        let Some(&thing) = model.tree.list(inner).first() else { return Err(no_thing(model, list)) };
        self.no_figure(model, thing)?;
        let which = match text.as_str() {
            "cuts" => Which::Cuts,
            "paths" => Which::Paths,
            "single points" => {
                let prepared = self.prepare(model, thing)?;
                let points = crate::engine::cuts::single_points(&prepared.plan);
                return Ok(Number::Whole(points.len().to_string()));
            }
            _ => return Err(model.fault(wrong)),
        };
        if model.tree.list(inner).len() > 1 {
            let subject = self.subject(model, list, inner, usize::MAX)?;
            let limits = super::lists::limits(model, inner)?;
            return match Minimal::new(&subject.prepared.plan, which, SET_NODES) {
                Ok(minimal) => {
                    Ok(Number::Whole(minimal.list(&subject.valued.chances, limits).sets.len().to_string()))
                }
                Err(large) => Err(super::desk::too_large(model, thing, large.limit)),
            };
        }
        let prepared = self.prepare(model, thing)?;
        let counted = Minimal::new(&prepared.plan, which, SET_NODES).and_then(|minimal| minimal.count());
        match counted {
            Ok(count) => Ok(Number::Whole(count.to_string())),
            Err(large) => Err(super::desk::too_large(model, thing, large.limit)),
        }
    }

    /// `total(x, mass)`: an attribute summed over the things under x, each once.
    fn total(&mut self, model: &mut Model<'_>, call: ExprId, args: List) -> Out<Number> {
        let place = model.tree.span(call);
        let args = model.tree.list(args).to_vec();
        let (thing, word) = match args.as_slice() {
            &[thing, word] => match model.tree.expr(word) {
                Expr::Name(sym) => (thing, sym),
                _ => return Err(wrong_total(model, place)),
            },
            _ => return Err(wrong_total(model, place)),
        };
        let text = model.tree.names.text(word).to_string();
        self.no_figure(model, thing)?;
        // The things first: an item that has the word undeclared says so itself.
        let prepared = self.prepare(model, thing)?;
        if !matches!(text.as_str(), "cost" | "mass") && !model.units.attributes.contains_key(&word) {
            let names = &model.tree.names;
            let declared = model.units.attributes.keys().map(|s| names.text(*s)).chain(["cost", "mass"]);
            let near = words::nearest(&text, declared).map(|near| format!("did you mean `{near}`?"));
            let problem = Problem::error(
                Code::Undeclared,
                model.tree.span(args[1]),
                format!("no line declares the attribute `{text}`"),
            );
            let mend = near.unwrap_or_else(|| format!("declare it on a line of its own: `attribute {text}`"));
            return Err(model.fault(problem.mend(mend)));
        }
        let mut sum: Option<Quantity> = None;
        let mut lacking: Vec<String> = Vec::new();
        for (name, item) in model.things_under(prepared.asked) {
            match model.item(item).attributes.iter().find(|(w, _)| *w == word) {
                None => lacking.push(name),
                Some((_, value)) => {
                    sum = Some(match sum {
                        None => value.clone(),
                        Some(sum) => Quantity {
                            error: sum.error + value.error + (sum.value + value.value).to_f64().abs() * STEP,
                            value: sum.value + value.value,
                            complement: None,
                            dim: sum.dim,
                        },
                    });
                }
            }
        }
        if !lacking.is_empty() {
            let names = crate::steps::folded(&lacking);
            return Err(model.fault(
                Problem::error(Code::MissingAttribute, place, format!("no {text} is given for {names}"))
                    .mend(format!("give each its `{text}`; one that has none gets `{text} 0`")),
            ));
        }
        Ok(match sum {
            Some(sum) => Number::Figure(sum),
            None => Number::None("nothing under it is an item".to_string()),
        })
    }
}

/// Whether a formula has a question in it.
pub(super) fn asks_within(model: &Model<'_>, value: ExprId) -> bool {
    let mut stack = vec![value];
    while let Some(at) = stack.pop() {
        match model.tree.expr(at) {
            Expr::Group(x) | Expr::Negate(x) | Expr::WithUnit(x, _) => stack.push(x),
            Expr::Arith(_, a, b) => stack.extend([a, b]),
            Expr::Call(word, args) => {
                let text = model.tree.names.text(word);
                if words::QUESTIONS.contains(&text) {
                    return true;
                }
                if words::FUNCTIONS.contains(&text) {
                    stack.extend(model.tree.list(args));
                }
            }
            _ => {}
        }
    }
    false
}

fn wrong_total(model: &mut Model<'_>, place: Span) -> Fault {
    model.fault(
        Problem::error(Code::WrongArguments, place, "`total` takes a thing and an attribute")
            .mend("write `total(feed, mass)`"),
    )
}

/// The error for a question without its thing.
pub(super) fn no_thing(model: &mut Model<'_>, call: ExprId) -> Fault {
    let text = model.text_of(call);
    let place = model.tree.span(call);
    model.fault(
        Problem::error(Code::WrongArguments, place, format!("`{text}` asks about nothing"))
            .mend("put the thing in the parentheses, as in `R(feed)`"),
    )
}
