//! Questions that a number answers, and how that number is written.

use super::desk::{Desk, Prepared, Valued};
use crate::engine::cuts::Minimal;
use crate::engine::evaluate::evaluate;
use crate::engine::importance::Importance;
use crate::engine::minimal::Which;
use crate::engine::plan::BlockId;
use crate::language::{Display, Expr, ExprId, List, Sym, words};
use crate::number::{Chance, Real, Rounding, format_fails, format_number, format_works, round_significant};
use crate::source::{Code, Problem, Span};
use crate::steps::Side;
use crate::system::{Ctx, Dim, Fault, Model, NodeId, Oracle, Out, Quantity, STEP};
use std::rc::Rc;

/// Diagram nodes allowed while minimal sets are made.
pub(super) const SET_NODES: usize = 4_000_000;
/// Below this no value is told from another.
const SMALLEST: f64 = 1e-300;
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
                let error = match bound.is_finite() {
                    true => chance.smaller().to_f64() * bound + value.to_f64() * STEP,
                    false => SMALLEST,
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
    pub(super) prepared: Rc<Prepared>,
    pub(super) valued: Rc<Valued>,
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
        let text = model.tree.names.text(word).to_string();
        match text.as_str() {
            "R" | "F" => {
                let side = if text == "R" { Side::Works } else { Side::Fails };
                let subject = self.subject(model, call, args, 1)?;
                let bound = match underflowed(&subject) {
                    true => f64::INFINITY,
                    false => subject.valued.bound,
                };
                Ok(Number::Chance(subject.valued.chance, side, bound))
            }
            "count" => self.count(model, call, args),
            "total" => self.total(model, call, args),
            "Birnbaum" | "criticality" | "FV" | "RAW" | "RRW" | "doubled" | "made perfect" => {
                self.importance(model, call, args, &text)
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
        let args = model.tree.list(args).to_vec();
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

    fn importance(&mut self, model: &mut Model<'_>, call: ExprId, args: List, word: &str) -> Out<Number> {
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
        let block = self.find_block(model, &subject, list[1])?;
        let Some(block) = block else {
            // Perfect: it stands in no cut, and nothing changes with it.
            return Ok(measure_of_perfect(word, subject.valued.chance));
        };
        let ranked = self.rank(model, subject.thing, &subject.prepared, &subject.valued, &subject.given);
        let Some(found) = ranked.get(block.0 as usize).copied().flatten() else {
            return Ok(Number::None("it has no importance of its own here".to_string()));
        };
        Ok(measure(word, &found, subject.valued.chance, subject.valued.bound))
    }

    /// The block of a named thing within a system; `None` for a perfect one.
    fn find_block(&mut self, model: &mut Model<'_>, subject: &Subject, name: ExprId) -> Out<Option<BlockId>> {
        if let Some(fault) = model.faulty(name) {
            return Err(fault);
        }
        let wanted = match model.tree.expr(model.tree.inside_groups(name)) {
            Expr::Name(sym) => model.tree.names.text(sym).to_string(),
            _ => model.text_of(name),
        };
        let system = &subject.prepared.system;
        let plan = &subject.prepared.plan;
        let mut ends: Vec<(String, Option<BlockId>)> = Vec::new();
        for (number, leaf) in system.leaves.iter().enumerate() {
            let own = model.leaf_name(leaf);
            let block = plan.of_leaf(number as u32);
            if own == wanted {
                return Ok(block);
            }
            if own.ends_with(&format!(".{wanted}")) {
                ends.push((own, block));
            }
        }
        for node in (0..system.structure.len() as u32).map(NodeId) {
            let Some(own) = model.node_name(system, node) else { continue };
            if own == wanted {
                return match plan.of_node(node) {
                    Some(block) => Ok(Some(block)),
                    None => Err(self.shares_with_the_rest(model, &wanted, name)),
                };
            }
            if own.ends_with(&format!(".{wanted}")) && system.structure.members(node).len() > 1 {
                ends.push((own, plan.of_node(node)));
            }
        }
        ends.sort();
        ends.dedup();
        if let [(_, block)] = ends.as_slice() {
            return Ok(*block);
        }
        if let Expr::Name(sym) = model.tree.expr(model.tree.inside_groups(name))
            && ends.is_empty()
        {
            // Another name for a thing, or a perfect one, is found by building it.
            return self.find_by_building(model, subject, name, sym);
        }
        Err(self.not_in_system(model, subject, name, &wanted, &ends))
    }

    fn find_by_building(
        &mut self,
        model: &mut Model<'_>,
        subject: &Subject,
        name: ExprId,
        sym: Sym,
    ) -> Out<Option<BlockId>> {
        if model.lookup(sym).is_some() {
            let asked = model.build(name)?;
            if let Some((own, item)) = model.things_under(asked).first().cloned()
                && model.things_under(asked).len() == 1
                && model.things_under(subject.prepared.asked).iter().any(|(n, _)| *n == own)
            {
                if model.item(item).perfect {
                    return Ok(None);
                }
                let found = subject.prepared.system.leaves.iter().position(|l| model.leaf_name(l) == own);
                if let Some(number) = found {
                    return Ok(subject.prepared.plan.of_leaf(number as u32));
                }
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

/// Whether a chance of zero is only smaller than the numbers reach: what can fail at
/// all, failing together, would fail the whole; or likewise for working.
fn underflowed(subject: &Subject) -> bool {
    let chance = subject.valued.chance;
    if !chance.smaller().is_zero() {
        return false;
    }
    let fails = chance.fails().is_zero();
    let (up, down) = (Chance::PERFECT, Chance::new(Real::ZERO, Real::ONE));
    let at_worst: Vec<Chance> = subject
        .valued
        .chances
        .iter()
        .map(|c| match fails {
            true if !c.fails().is_zero() => down,
            true => up,
            false if !c.works().is_zero() => up,
            false => down,
        })
        .collect();
    let values = evaluate(&subject.prepared.plan, &at_worst);
    let whole = values.get(subject.prepared.plan.root().0 as usize).copied().unwrap_or(Chance::PERFECT);
    if fails { whole.works().is_zero() } else { whole.fails().is_zero() }
}

/// Whether a formula has a question in it.
fn asks_within(model: &Model<'_>, value: ExprId) -> bool {
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
        (
            Number::Chance(chance, side, bound),
            display @ (None | Some(Display::Percent | Display::Chances)),
        ) if bound.is_infinite() => {
            let tiny = side.of(*chance).is_zero();
            match display {
                Some(Display::Chances) if tiny => "none: rarer than 1 in 1e300".to_string(),
                Some(Display::Percent) if tiny => "< 1e-298%".to_string(),
                Some(Display::Percent) => "> 100 - 1e-298%".to_string(),
                Some(_) => "1 in 1.000".to_string(),
                None if tiny => format!("< {SMALLEST:e}"),
                None => format!("> 1 - {SMALLEST:e}"),
            }
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
    if !among.is_finite() {
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
    let number = |value: Real| match format_number(value, model.digits, bound) {
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
