//! Arithmetic: expressions to figures with dimensions and error bounds.
//!
//! Questions inside a formula are answered by whoever evaluates the model, an
//! [`Oracle`]: the layers below this one hold the methods.

use super::build::Ctx;
use super::model::{DefId, Fault, Model, Out};
use super::quantity::{Dim, Quantity, STEP};
use super::scope::Bound;
use crate::language::{ArithOp, Expr, ExprId, Literal, Suffix, Sym, words};
use crate::number::{Decimal, Real};
use crate::source::{Code, Label, Problem, Span};

/// Answers the questions in a formula.
pub trait Oracle {
    /// The figure that a call such as `R(feed, 1 yr)` stands for.
    ///
    /// # Errors
    /// What prevents it, as a noted fault.
    fn ask(&mut self, model: &mut Model<'_>, call: ExprId, ctx: Ctx) -> Out<Quantity>;
}

/// Answers nothing: for places where no question may stand.
struct NoOracle;

impl Oracle for NoOracle {
    fn ask(&mut self, model: &mut Model<'_>, call: ExprId, _: Ctx) -> Out<Quantity> {
        let place = model.tree.span(call);
        Err(model.fault(
            Problem::error(Code::WrongKind, place, "the answer to a question cannot be used as a datum")
                .mend("write the figure itself; a question stands on a line that asks"),
        ))
    }
}

enum Task {
    Visit(ExprId, Ctx),
    Negate,
    Arith(ExprId, ArithOp),
    Unit(ExprId, u32),
    Function(ExprId, Sym, usize),
    /// Keep the value of a definition's right side.
    Keep(ExprId),
}

impl Model<'_> {
    /// The value of an expression in which no question may stand.
    ///
    /// # Errors
    /// What prevents it, as a noted fault.
    pub fn figure(&mut self, expr: ExprId) -> Out<Quantity> {
        self.figure_with(expr, Ctx::TOP, &mut NoOracle)
    }

    /// The value of an expression; questions in it go to `oracle`.
    ///
    /// # Errors
    /// What prevents it, as a noted fault.
    pub fn figure_with(&mut self, expr: ExprId, ctx: Ctx, oracle: &mut dyn Oracle) -> Out<Quantity> {
        if let Expr::Literal(id) = self.tree.expr(expr) {
            return self.literal(self.tree.literals[id as usize]);
        }
        let mut tasks = vec![Task::Visit(expr, ctx)];
        let mut values: Vec<Quantity> = Vec::new();
        while let Some(task) = tasks.pop() {
            match task {
                Task::Visit(expr, ctx) => self.visit_figure(expr, ctx, oracle, &mut tasks, &mut values)?,
                Task::Negate => {
                    if let Some(v) = values.last_mut() {
                        v.value = -v.value;
                        v.complement = None;
                    }
                }
                Task::Arith(expr, op) => {
                    let (Some(b), Some(a)) = (values.pop(), values.pop()) else { continue };
                    let value = self.arith(op, &a, &b, self.tree.span(expr))?;
                    values.push(value);
                }
                Task::Unit(expr, unit) => {
                    if let Some(v) = values.pop() {
                        let unit = self.tree.units[unit as usize];
                        let value = self.with_unit(v, unit, self.tree.span(expr))?;
                        values.push(value);
                    }
                }
                Task::Function(expr, word, count) => {
                    let args = values.split_off(values.len().saturating_sub(count));
                    let value = self.function(word, &args, self.tree.span(expr))?;
                    values.push(value);
                }
                Task::Keep(expr) => {
                    if let Some(v) = values.last() {
                        self.figures.insert(expr, Ok(v.clone()));
                    }
                }
            }
        }
        Ok(values.pop().unwrap_or_else(|| Quantity::number(Real::ZERO)))
    }

    fn visit_figure(
        &mut self,
        expr: ExprId,
        ctx: Ctx,
        oracle: &mut dyn Oracle,
        tasks: &mut Vec<Task>,
        values: &mut Vec<Quantity>,
    ) -> Out<()> {
        if let Some(fault) = self.faulty(expr) {
            return Err(fault);
        }
        match self.tree.expr(expr) {
            Expr::Literal(id) => values.push(self.literal(self.tree.literals[id as usize])?),
            Expr::Name(sym) => self.named_figure(expr, sym, ctx, tasks, values)?,
            Expr::Group(x) => tasks.push(Task::Visit(x, ctx)),
            Expr::WithUnit(x, unit) => tasks.extend([Task::Unit(expr, unit), Task::Visit(x, ctx)]),
            Expr::Negate(x) => tasks.extend([Task::Negate, Task::Visit(x, ctx)]),
            Expr::Arith(op, a, b) => {
                tasks.extend([Task::Arith(expr, op), Task::Visit(b, ctx), Task::Visit(a, ctx)]);
            }
            Expr::Call(word, args) => {
                let text = self.tree.names.text(word);
                if words::FUNCTIONS.contains(&text) {
                    let args = self.tree.list(args);
                    tasks.push(Task::Function(expr, word, args.len()));
                    tasks.extend(args.iter().rev().map(|a| Task::Visit(*a, ctx)));
                } else {
                    values.push(oracle.ask(self, expr, ctx)?);
                }
            }
            _ => return Err(self.not_a_figure(expr)),
        }
        Ok(())
    }

    fn not_a_figure(&mut self, expr: ExprId) -> Fault {
        let text = self.text_of(expr);
        let place = self.tree.span(expr);
        let problem = Problem::error(
            Code::WrongKind,
            place,
            format!("`{text}` is a structure or an item and no figure"),
        );
        // `k + 1 of (A, B)` reads as `k + (1 of (A, B))`.
        let problem = match self.tree.expr(expr) {
            Expr::AtLeast(..) => problem.mend("put a calculation before `of` in parentheses: `(k + 1) of …`"),
            _ => problem,
        };
        self.fault(problem.mend(format!("ask a figure of it, as in `R({text})`")))
    }

    fn named_figure(
        &mut self,
        expr: ExprId,
        sym: Sym,
        ctx: Ctx,
        tasks: &mut Vec<Task>,
        values: &mut Vec<Quantity>,
    ) -> Out<()> {
        if let Some((arg, arg_ctx)) = self.argument(sym, ctx) {
            tasks.push(Task::Visit(arg, arg_ctx));
            return Ok(());
        }
        match self.name_or_prefix(sym, &[]) {
            Some(Bound::Def(def)) => {
                let value = self.usable(def)?;
                if let Some(known) = self.figures.get(&value) {
                    values.push(known.clone()?);
                    return Ok(());
                }
                if self.is_thing_only(value) {
                    return Err(self.thing_as_figure(expr, sym));
                }
                if let Expr::Literal(id) = self.tree.expr(value) {
                    values.push(self.literal(self.tree.literals[id as usize])?);
                    return Ok(());
                }
                tasks.extend([Task::Keep(value), Task::Visit(value, Ctx::TOP)]);
                Ok(())
            }
            Some(Bound::Path(def)) => {
                let figure = self.clause_figure(expr, sym, def)?;
                values.push(figure);
                Ok(())
            }
            _ => Err(self.faulty(expr).unwrap_or_else(|| {
                let text = self.tree.names.text(sym);
                let place = self.tree.span(expr);
                let problem = Problem::error(Code::UnknownName, place, format!("unknown name \"{text}\""));
                let problem = self.with_nearest(problem, text);
                self.fault(problem)
            })),
        }
    }

    /// Whether a right side can only be a thing.
    pub(super) fn is_thing_only(&self, value: ExprId) -> bool {
        !matches!(
            self.tree.expr(self.tree.inside_groups(value)),
            Expr::Literal(_)
                | Expr::Name(_)
                | Expr::WithUnit(..)
                | Expr::Negate(_)
                | Expr::Arith(..)
                | Expr::Call(..)
        )
    }

    fn thing_as_figure(&mut self, expr: ExprId, sym: Sym) -> Fault {
        let text = self.written(sym);
        let place = self.tree.span(expr);
        self.fault(
            Problem::error(Code::WrongKind, place, format!("`{text}` is a thing and no figure"))
                .mend(format!("take a figure of it: `{text}.rate` for a clause, `R({text})` for a question")),
        )
    }

    /// `pump.rate`: the figure of a clause of an item.
    fn clause_figure(&mut self, expr: ExprId, sym: Sym, def: DefId) -> Out<Quantity> {
        let text = self.tree.names.text(sym).to_string();
        let owner = self.tree.names.text(self.def(def).name).to_string();
        let word = text[owner.len()..].trim_start_matches('.').to_string();
        let place = self.tree.span(expr);
        // `feed.pump[1].rate`: the path of a copy, then the clause.
        let path = text.rsplit_once('.').filter(|(path, _)| path.len() > owner.len());
        let (owner, word, item) = match path {
            Some((path, word)) => (path.to_string(), word.to_string(), self.item_of_copy(expr, path)?),
            None => (owner, word, self.item_of_def(def)?),
        };
        let Some(item) = item else {
            return Err(self.fault(
                Problem::error(
                    Code::WrongKind,
                    place,
                    format!("`{owner}` is no item and has no clause `{word}`"),
                )
                .mend("take the figure of one of its parts, or ask a question of it"),
            ));
        };
        match self.item_list[item as usize].figure(&word, &self.tree.names) {
            Some(figure) => Ok(figure),
            None => {
                let problem =
                    Problem::error(Code::UnknownName, place, format!("`{owner}` has no clause `{word}`"));
                let have = self.item_list[item as usize].figure_words(&self.tree.names);
                let problem = match words::nearest(&word, have.iter().map(String::as_str)) {
                    Some(near) => problem.mend(format!("did you mean `{owner}.{near}`?")),
                    None if have.is_empty() => problem.mend("it has no clause with a figure"),
                    None => problem.mend(format!("it has {}", have.join(", "))),
                };
                Err(self.fault(problem))
            }
        }
    }

    /// The value of a literal, exact from its decimal text.
    ///
    /// # Errors
    /// An unknown unit, or `1 in 0`.
    pub fn literal(&mut self, literal: Literal) -> Out<Quantity> {
        let Some(decimal) = Decimal::parse(self.sources.text(literal.number)) else {
            return Err(self.bad_literal(literal.number));
        };
        if !decimal.to_real().is_finite() {
            return Err(self.fault(
                Problem::error(
                    Code::OutsideRange,
                    literal.number,
                    "this number is beyond what can be calculated with",
                )
                .mend("numbers reach to 1e308; look at the exponent"),
            ));
        }
        match literal.suffix {
            Suffix::None => Ok(decimal_quantity(&decimal)),
            Suffix::Percent => Ok(decimal_quantity(&decimal.shift10(-2))),
            Suffix::Unit(unit) => {
                let quantity = Quantity { complement: None, ..decimal_quantity(&decimal) };
                self.with_unit(quantity, unit, literal.number)
            }
            Suffix::In(second) => {
                let Some(among) = Decimal::parse(self.sources.text(second)) else {
                    return Err(self.bad_literal(second));
                };
                if among.is_zero() {
                    return Err(self.fault(
                        Problem::error(Code::OutsideRange, second, "one in zero is no probability")
                            .mend("write how many trials one failure is expected in"),
                    ));
                }
                let (n, m) = (decimal.to_real(), among.to_real());
                let mut quantity = Quantity::number(n / m);
                quantity.complement = Some((m - n) / m);
                Ok(quantity)
            }
        }
    }

    fn bad_literal(&mut self, place: Span) -> Fault {
        self.fault(
            Problem::error(Code::MalformedNumber, place, "this is no decimal number")
                .mend("write digits with at most one point and one exponent"),
        )
    }

    fn with_unit(
        &mut self,
        mut quantity: Quantity,
        unit: crate::language::Unit,
        place: Span,
    ) -> Out<Quantity> {
        if let Some(fault) = self.twice("year")
            && super::units::is_year(self.tree.names.text(unit.word))
        {
            return Err(fault);
        }
        let (dim, factor) = match self.units.resolve(unit, &self.tree.names) {
            Ok(found) => found,
            Err(problem) => {
                if let Some(fault) = self.unknown_units.get(&unit.word).copied() {
                    let label = Label { place: unit.span, text: "and here".to_string() };
                    let known = &mut self.problems[fault.0 as usize];
                    if known.place != unit.span && !known.labels.contains(&label) && known.labels.len() < 8 {
                        known.labels.push(label);
                    }
                    return Err(fault);
                }
                // `10LAC10` reads as a number and its unit.
                let word = self.tree.names.text(unit.word);
                let mut problem = *problem;
                if place.end == unit.span.start && word.contains(|c: char| c.is_ascii_digit()) {
                    let number = self.sources.text(place);
                    problem
                        .mends
                        .insert(0, format!("a name that begins with a digit is quoted: \"{number}{word}\""));
                }
                let fault = self.fault(problem);
                self.unknown_units.insert(unit.word, fault);
                return Err(fault);
            }
        };
        if !quantity.dim.is_none() {
            return Err(self.fault(
                Problem::error(Code::WrongUnit, place.to(unit.span), "this has a unit already")
                    .mend("take one of the two away"),
            ));
        }
        quantity.value *= factor;
        quantity.error = quantity.error * factor.to_f64() + quantity.value.to_f64().abs() * STEP;
        quantity.complement = None;
        quantity.dim = dim;
        Ok(quantity)
    }

    fn arith(&mut self, op: ArithOp, a: &Quantity, b: &Quantity, place: Span) -> Out<Quantity> {
        match op {
            ArithOp::Add | ArithOp::Sub => self.sum(op, a, b, place),
            ArithOp::Mul | ArithOp::Div => self.product(op, a, b, place),
            ArithOp::Pow => self.power(a, b, place),
        }
    }

    fn sum(&mut self, op: ArithOp, a: &Quantity, b: &Quantity, place: Span) -> Out<Quantity> {
        if a.dim != b.dim {
            let (left, right) = (
                self.units.describe(&a.dim, &self.tree.names),
                self.units.describe(&b.dim, &self.tree.names),
            );
            return Err(self.fault(
                Problem::error(
                    Code::WrongUnit,
                    place,
                    format!("{left} and {right} cannot be added or subtracted"),
                )
                .mend("give both the same kind of unit"),
            ));
        }
        // 1 - p where the other tail of p is known: no digit is lost.
        if op == ArithOp::Sub
            && a.value == Real::ONE
            && a.error <= STEP
            && let Some(complement) = b.complement
        {
            let mut done = Quantity::number(complement);
            done.complement = Some(b.value);
            done.error += b.relative_error().min(1.0) * complement.to_f64().abs();
            return Ok(done);
        }
        let value = if op == ArithOp::Add { a.value + b.value } else { a.value - b.value };
        let error = a.error + b.error + value.to_f64().abs() * STEP;
        self.finite(Quantity { value, complement: None, dim: a.dim.clone(), error }, place)
    }

    fn product(&mut self, op: ArithOp, a: &Quantity, b: &Quantity, place: Span) -> Out<Quantity> {
        let (value, sign) = match op {
            ArithOp::Mul => (a.value * b.value, 1),
            _ if b.value.is_zero() => {
                return Err(self.fault(
                    Problem::error(Code::NoValue, place, "this divides by zero")
                        .mend("make sure that the divisor is not zero"),
                ));
            }
            _ => (a.value / b.value, -1),
        };
        let Some(dim) = a.dim.times(&b.dim, sign) else { return Err(self.no_value(place)) };
        let size = value.to_f64().abs();
        if size == 0.0 && !a.value.is_zero() && !b.value.is_zero() {
            return Ok(too_small(a.value.is_negative() != b.value.is_negative(), dim));
        }
        let relative = a.relative_error() + b.relative_error();
        let error = match op {
            ArithOp::Mul if size == 0.0 => {
                a.value.to_f64().abs() * b.error + b.value.to_f64().abs() * a.error + a.error * b.error
            }
            _ if size == 0.0 => a.error / b.value.to_f64().abs(),
            ArithOp::Mul => size * (relative + a.relative_error() * b.relative_error() + STEP),
            _ if b.relative_error() >= 1.0 => f64::INFINITY,
            _ => size * (relative / (1.0 - b.relative_error()) + STEP),
        };
        self.finite(Quantity { value, complement: None, dim, error }, place)
    }

    fn power(&mut self, a: &Quantity, b: &Quantity, place: Span) -> Out<Quantity> {
        if !b.dim.is_none() {
            return Err(self.fault(
                Problem::error(Code::WrongUnit, place, "an exponent has no unit")
                    .mend("write a bare number after `^`"),
            ));
        }
        let exponent = b.value.to_f64();
        let whole = exponent == exponent.trunc()
            && (b.value - Real::from(exponent)).is_zero()
            && exponent.abs() < 1e15;
        let has_power = a.dim.is_none() || (whole && exponent.abs() <= 100.0);
        if !has_power {
            return Err(self.fault(
                Problem::error(Code::WrongUnit, place, "a figure with a unit takes only a whole power")
                    .mend("divide it by one of its unit first"),
            ));
        }
        if a.value.is_zero() && exponent <= 0.0 || a.value.is_negative() && !whole {
            return Err(self.no_value(place));
        }
        let value = if whole { a.value.powi(exponent as i64) } else { a.value.powf(b.value) };
        let Some(dim) = Dim::NONE.times(&a.dim, if a.dim.is_none() { 0 } else { exponent as i16 }) else {
            return Err(self.no_value(place));
        };
        if value.is_zero() && !a.value.is_zero() {
            return Ok(too_small(a.value.is_negative() && exponent % 2.0 != 0.0, dim));
        }
        let log = a.value.abs().ln().to_f64().abs();
        let relative = exponent.abs() * a.relative_error() + log * b.error + (1.0 + exponent.abs()) * STEP;
        let error =
            if a.value.is_zero() { a.error } else { value.to_f64().abs() * relative * (1.0 + relative) };
        self.finite(Quantity { value, complement: None, dim, error }, place)
    }

    fn no_value(&mut self, place: Span) -> Fault {
        self.fault(
            Problem::error(Code::NoValue, place, "this calculation has no finite value").mend(
                "look for a division by zero, a root or logarithm of a negative figure, or an overflow",
            ),
        )
    }

    fn finite(&mut self, quantity: Quantity, place: Span) -> Out<Quantity> {
        if quantity.value.is_finite() { Ok(quantity) } else { Err(self.no_value(place)) }
    }

    fn function(&mut self, word: Sym, args: &[Quantity], place: Span) -> Out<Quantity> {
        let name = self.tree.names.text(word);
        let many = matches!(name, "min" | "max");
        if args.is_empty() || (!many && args.len() != 1) {
            let wanted = if many { "at least one argument" } else { "one argument" };
            return Err(self.fault(
                Problem::error(Code::WrongArguments, place, format!("`{name}` takes {wanted}"))
                    .mend(format!("write `{name}(x)`")),
            ));
        }
        if many {
            return self.extreme(name == "max", args, place);
        }
        let x = &args[0];
        if name == "sqrt" {
            return self.root(x, place);
        }
        if !x.dim.is_none() {
            let what = self.units.describe(&x.dim, &self.tree.names);
            return Err(self.fault(
                Problem::error(
                    Code::WrongUnit,
                    place,
                    format!("`{name}` takes a bare number, and this is {what}"),
                )
                .mend("divide it by one of its unit first"),
            ));
        }
        if matches!(name, "ln" | "log10") && x.value <= Real::ZERO {
            let problem = Problem::error(Code::NoValue, place, "a logarithm is of a figure above zero");
            return Err(self.fault(problem.mend("look at the figure in its parentheses")));
        }
        let (value, slope) = match name {
            "exp" if x.value.exp().is_zero() => return Ok(too_small(false, Dim::NONE)),
            "exp" => (x.value.exp(), x.value.exp().to_f64()),
            "ln" => (x.value.ln(), 1.0 / x.value.to_f64()),
            _ => (x.value.log10(), 1.0 / x.value.to_f64() / std::f64::consts::LN_10),
        };
        // First order with room for the second: the inputs' errors are tiny beside 1.
        let error = 2.0 * x.error * slope.abs() + value.to_f64().abs() * STEP;
        self.finite(Quantity { value, complement: None, dim: Dim::NONE, error }, place)
    }

    fn root(&mut self, x: &Quantity, place: Span) -> Out<Quantity> {
        if x.value.is_negative() {
            let problem =
                Problem::error(Code::NoValue, place, "a root is of a figure that is not below zero");
            return Err(self.fault(problem.mend("look at the figure in its parentheses")));
        }
        let Some(dim) = x.dim.sqrt() else {
            return Err(self.fault(
                Problem::error(Code::WrongUnit, place, "the root of this unit is no unit")
                    .mend("divide by one of its unit first"),
            ));
        };
        let value = x.value.sqrt();
        let error = value.to_f64() * (x.relative_error().min(1.0) + STEP);
        Ok(Quantity { value, complement: None, dim, error })
    }

    fn extreme(&mut self, largest: bool, args: &[Quantity], place: Span) -> Out<Quantity> {
        let mut best = args[0].clone();
        for arg in &args[1..] {
            if arg.dim != best.dim {
                return Err(self.fault(
                    Problem::error(Code::WrongUnit, place, "these figures have different units")
                        .mend("give all of them the same kind of unit"),
                ));
            }
            if (arg.value > best.value) == largest && arg.value != best.value {
                best = arg.clone();
            }
        }
        Ok(best)
    }
}

/// A figure that is not zero and yet below all numbers that there are: the least
/// of them, known only to be smaller than what is ever written.
fn too_small(negative: bool, dim: Dim) -> Quantity {
    let least = Real::from(f64::from_bits(1));
    Quantity { value: if negative { -least } else { least }, complement: None, dim, error: 1e-300 }
}

/// A decimal's value and complement, each rounded once.
fn decimal_quantity(decimal: &Decimal) -> Quantity {
    // A number too small for the range is carried as the least one there is, and never as zero.
    let least = Real::from(f64::from_bits(1));
    let value = decimal.to_real();
    let value = if value.is_zero() && !decimal.is_zero() { least } else { value };
    let mut quantity = Quantity::number(value);
    quantity.complement = decimal.complement_to_real();
    quantity
}
