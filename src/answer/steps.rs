//! The steps of questions: of one number, of a measure, of a formula of them.

use super::desk::Desk;
use super::figure::{Number, Subject};
use super::find::Found;
use super::lists::assumptions;
use super::reply::Reply;
use crate::engine::plan::{Block, Plan, Stands};
use crate::language::{Expr, ExprId, List, Sym, words};
use crate::number::Real;
use crate::source::{Code, Problem};
use crate::steps::{Formula, Outcome, Rule, Side, Step, StepList, Written, shown, write};
use crate::system::{Model, Out};

/// The most steps that are written.
const MOST_STEPS: usize = 10_000;
/// The measures of importance.
pub(super) const MEASURES: [&str; 7] =
    ["Birnbaum", "criticality", "FV", "RAW", "RRW", "doubled", "made perfect"];

/// What the steps of a question end in.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum End {
    /// One side of a step, by its place in the list.
    Chance(usize, Side),
    /// A step that is a figure.
    Figure(usize),
    /// A probability of 1 or of 0.
    Certain(bool),
}

impl Desk {
    /// The steps of `R(x)`, `F(x)` or a formula of them.
    ///
    /// # Errors
    /// What prevents the answer itself, or that there are too many steps.
    pub fn steps(&mut self, model: &mut Model<'_>, asked: ExprId) -> Out<StepList> {
        let mut list = StepList::default();
        self.add_steps(model, asked, &mut list)?;
        Ok(list)
    }

    /// Adds the steps of one question to those of others; what is common is
    /// stated once.
    ///
    /// # Errors
    /// As for [`Desk::steps`].
    pub fn add_steps(&mut self, model: &mut Model<'_>, asked: ExprId, list: &mut StepList) -> Out<End> {
        let inner = model.tree.inside_groups(asked);
        if let Expr::Call(word, args) = model.tree.expr(inner)
            && let word @ ("R" | "F") = model.tree.names.text(word)
        {
            let side = if word == "R" { Side::Works } else { Side::Fails };
            return Ok(match self.steps_of(model, inner, args, list)? {
                Ok(step) => End::Chance(step, side),
                Err(works) => End::Certain(works == (side == Side::Works)),
            });
        }
        if let Expr::Call(word, args) = model.tree.expr(inner)
            && MEASURES.contains(&model.tree.names.text(word))
            && self.steps_of_measure(model, inner, word, args, list)?
        {
            return Ok(End::Figure(list.steps.len() - 1));
        }
        let number = self.number(model, asked)?;
        let Number::Figure(quantity) = number else {
            let place = model.tree.span(asked);
            return Err(model.fault(
                Problem::error(Code::WrongKind, place, "steps are written for R, F and formulas of them")
                    .mend("write `steps(R(feed))`"),
            ));
        };
        let formula = self.formula(model, inner, list)?;
        let unit = model.units.symbol(&quantity.dim, &model.tree.names);
        let works = formula.clone();
        let fails = formula.one_minus();
        let place = Some(model.tree.span(asked));
        list.steps.push(Step {
            thing: model.text_of(asked),
            symbol: model.text_of(asked),
            place,
            rule: Rule::Arithmetic,
            works,
            fails,
            shown: Side::Works,
            outcome: Outcome::Figure(quantity.value, unit),
        });
        Ok(End::Figure(list.steps.len() - 1))
    }

    /// Adds the steps of one `R(…)` or `F(…)`; its last step, or what it is for certain.
    fn steps_of(
        &mut self,
        model: &mut Model<'_>,
        call: ExprId,
        args: List,
        list: &mut StepList,
    ) -> Out<Result<usize, bool>> {
        let subject = self.subject(model, call, args, 1)?;
        let written = self.write_system(model, call, &subject, list)?;
        Ok(written.of(subject.prepared.plan.root()))
    }

    /// Adds the steps of a system under its exposure.
    fn write_system(
        &mut self,
        model: &mut Model<'_>,
        call: ExprId,
        subject: &Subject,
        list: &mut StepList,
    ) -> Out<Written> {
        let Subject { prepared, given, thing, .. } = subject;
        let thing = *thing;
        // Like things share a step, so that their number alone does not decide.
        let blocks = prepared.plan.blocks();
        let steps = blocks.filter(|b| !matches!(prepared.plan.block(*b), Block::Leaf(_))).count();
        if steps > MOST_STEPS {
            return Err(too_many_steps(model, thing, call));
        }
        let exposure = self.exposure(model, given, model.tree.span(call))?;
        let known = std::mem::take(list);
        let (mut done, written) = write(model, &prepared.system, &prepared.plan, &exposure, known);
        for line in assumptions(model, &prepared.system, &exposure) {
            if !done.assumptions.contains(&line) {
                done.assumptions.push(line);
            }
        }
        if let Err(works) = written.of(prepared.plan.root()) {
            done.remarks.push(format!(
                "{} {} for certain",
                model.text_of(thing),
                if works { "works" } else { "fails" }
            ));
        }
        if done.steps.len() > MOST_STEPS {
            return Err(too_many_steps(model, thing, call));
        }
        *list = done;
        Ok(written)
    }

    /// Adds the steps of a measure of importance: the whole, the whole with the
    /// thing failed and working, the thing, and what the measure makes of them.
    /// Whether it could: a thing that cannot fail, or a value that there is not,
    /// has no formula.
    fn steps_of_measure(
        &mut self,
        model: &mut Model<'_>,
        call: ExprId,
        word: Sym,
        args: List,
        list: &mut StepList,
    ) -> Out<bool> {
        let (Number::Figure(quantity), &[_, name, ..]) = (self.call(model, call)?, model.tree.list(args))
        else {
            return Ok(false);
        };
        let subject = self.subject(model, call, args, 2)?;
        let Found::Block(block) = self.find(model, &subject, name)? else { return Ok(false) };
        let prepared = subject.prepared.clone();
        let Stands::Node(node) = prepared.plan.stands(block) else { return Ok(false) };
        let written = self.write_system(model, call, &subject, list)?;
        let own = certain_or_step(written.of(block));
        let whole = certain_or_step(written.of(prepared.plan.root()));
        let exposure = self.exposure(model, &subject.given, model.tree.span(call))?;
        let thing = model.text_of(name);
        let mut knowing = |works: bool| -> Option<(Formula, Formula)> {
            let words = format!("{thing} {}", if works { "works" } else { "has failed" });
            let left = match prepared.system.knowing(node, works, words) {
                Ok(left) => left,
                Err(works) => return Some(certain_or_step(Err(works))),
            };
            let plan = Plan::new(&left.structure, left.root).ok()?;
            let (done, written) = write(model, &left, &plan, &exposure, std::mem::take(list));
            *list = done;
            Some(certain_or_step(written.of(plan.root())))
        };
        let word = model.tree.names.text(word).to_string();
        let unasked = || Some((Formula::Whole(0), Formula::Whole(0)));
        let failed = if matches!(word.as_str(), "FV" | "RRW") { unasked() } else { knowing(false) };
        let works = if matches!(word.as_str(), "FV" | "RAW") { unasked() } else { knowing(true) };
        let (Some(failed), Some(works)) = (failed, works) else { return Ok(false) };
        if list.steps.len() > MOST_STEPS {
            return Err(too_many_steps(model, subject.thing, call));
        }
        let cut = self.rank(model, subject.thing, &prepared, &subject.valued, &subject.given)?;
        let cut = cut.get(block.0 as usize).copied().flatten().and_then(|found| found.cut_failed);
        let parts = Parts { own, whole, failed, works, cut };
        let Some(formula) = parts.measure(&word, &thing) else { return Ok(false) };
        list.steps.push(Step {
            thing: model.text_of(call),
            symbol: model.text_of(call),
            place: Some(model.tree.span(call)),
            rule: Rule::Importance,
            works: formula.clone(),
            fails: formula.one_minus(),
            shown: Side::Works,
            outcome: Outcome::Figure(quantity.value, String::new()),
        });
        Ok(true)
    }

    /// A formula of questions and figures as a tree; the steps of its questions go to `list`.
    fn formula(&mut self, model: &mut Model<'_>, expr: ExprId, list: &mut StepList) -> Out<Formula> {
        let place = model.tree.span(expr);
        self.depth += 1;
        let out = if self.depth > 100 {
            Err(model.fault(
                Problem::error(Code::TooDeep, place, "this formula is nested too deep for its steps")
                    .mend("give parts of it names on lines of their own"),
            ))
        } else {
            self.formula_inner(model, expr, list)
        };
        self.depth -= 1;
        out
    }

    fn formula_inner(&mut self, model: &mut Model<'_>, expr: ExprId, list: &mut StepList) -> Out<Formula> {
        use crate::language::ArithOp;
        Ok(match model.tree.expr(expr) {
            Expr::Group(inner) => self.formula(model, inner, list)?,
            Expr::Negate(inner) => Formula::Negate(Box::new(self.formula(model, inner, list)?)),
            Expr::Arith(op, a, b) => {
                let (a, b) = (self.formula(model, a, list)?, self.formula(model, b, list)?);
                match op {
                    ArithOp::Add => Formula::Sum(vec![a, b]),
                    ArithOp::Sub if a == Formula::Whole(1) => b.one_minus(),
                    ArithOp::Sub => Formula::Sum(vec![a, Formula::Negate(Box::new(b))]),
                    ArithOp::Mul => Formula::Product(vec![a, b]),
                    ArithOp::Div => Formula::Quotient(Box::new(a), Box::new(b)),
                    ArithOp::Pow => Formula::Power(Box::new(a), Box::new(b)),
                }
            }
            Expr::Call(word, args) => {
                let text = model.tree.names.text(word);
                if let Some(name) = words::FUNCTIONS.iter().find(|f| **f == text) {
                    let args = model.tree.list(args).to_vec();
                    let args =
                        args.into_iter().map(|a| self.formula(model, a, list)).collect::<Out<Vec<_>>>()?;
                    return Ok(Formula::Function(name, args));
                }
                if matches!(text, "R" | "F") {
                    let side = if text == "R" { Side::Works } else { Side::Fails };
                    return Ok(match self.steps_of(model, expr, args, list)? {
                        Ok(step) => Formula::Step(step, side),
                        Err(works) => Formula::Whole(u32::from(works == (side == Side::Works))),
                    });
                }
                self.datum(model, expr)?
            }
            Expr::Name(sym) => match model.lookup(sym).and_then(|d| model.def(d).value) {
                Some(value)
                    if matches!(
                        model.tree.expr(model.tree.inside_groups(value)),
                        Expr::Arith(..) | Expr::Call(..)
                    ) =>
                {
                    self.formula(model, value, list)?
                }
                _ => self.datum(model, expr)?,
            },
            Expr::Literal(_) => {
                let quantity = model.figure(expr)?;
                if quantity.whole() == Some(1) { Formula::Whole(1) } else { self.datum(model, expr)? }
            }
            _ => self.datum(model, expr)?,
        })
    }

    fn datum(&mut self, model: &mut Model<'_>, expr: ExprId) -> Out<Formula> {
        let quantity = model.figure_with(expr, crate::system::Ctx::TOP, self)?;
        let unit = model.units.symbol(&quantity.dim, &model.tree.names);
        let number = super::plain(quantity.value);
        let text = if unit.is_empty() { number } else { format!("{number} {unit}") };
        Ok(Formula::Datum {
            symbol: model.text_of(expr),
            value: quantity.value,
            complement: quantity.complement,
            written: self.written_as(model, expr, &text),
            text,
        })
    }

    /// How the note has a figure, where the formula shows another spelling.
    fn written_as(&self, model: &Model<'_>, expr: ExprId, shown: &str) -> Option<String> {
        let from = match model.tree.expr(expr) {
            Expr::Name(sym) => model.lookup(sym).and_then(|d| model.def(d).value)?,
            _ => expr,
        };
        Some(model.text_of(from)).filter(|text| text != shown)
    }

    /// Steps as a numbered list. `places` says on which line of the source each
    /// thing stands; a note itself shows none, since its answers move its lines.
    pub fn steps_reply(&self, model: &Model<'_>, list: &StepList, places: bool) -> Reply {
        let digits = (model.digits + 3).min(15);
        let mut entries: Vec<Vec<String>> = Vec::new();
        for step in shown(list, model.sources, digits) {
            let mut about = vec![step.thing.clone()];
            about.extend((places && !step.place.is_empty()).then(|| step.place.clone()));
            about.push(step.rule.to_string());
            if !step.rests_on.is_empty() {
                let on: Vec<String> = step.rests_on.iter().map(ToString::to_string).collect();
                about.push(format!("from {}", on.join(", ")));
            }
            let mut formula = format!("{} = {}", step.left, step.symbols);
            if step.numbers != step.symbols {
                formula.push_str(&format!(" = {}", step.numbers));
            }
            if step.result != step.numbers {
                formula.push_str(&format!(" = {}", step.result));
            }
            if !step.other.is_empty() {
                formula.push_str(&format!("; {}", step.other));
            }
            let mut entry = vec![about.join(", "), formula];
            if !step.data.is_empty() {
                entry.push(format!("with {}", step.data.join(", ")));
            }
            entries.push(entry);
        }
        let mut notes = list.remarks.clone();
        notes.extend(list.assumptions.iter().map(|line| format!("assumed: {line}")));
        Reply::List { entries, numbered: true, notes }
    }
}

/// R and F of a step, or of what is certain.
fn certain_or_step(step: Result<usize, bool>) -> (Formula, Formula) {
    match step {
        Ok(step) => (Formula::Step(step, Side::Works), Formula::Step(step, Side::Fails)),
        Err(works) => (Formula::Whole(u32::from(works)), Formula::Whole(u32::from(!works))),
    }
}

/// What the measures are made of: R and F of the thing, of the whole, and of the
/// whole with the thing failed and working.
struct Parts {
    own: (Formula, Formula),
    whole: (Formula, Formula),
    failed: (Formula, Formula),
    works: (Formula, Formula),
    /// Probability that some minimal cut set with the thing in it has failed.
    cut: Option<Real>,
}

impl Parts {
    /// The definitions of section 6 of the design, printed with `rank` as well.
    fn measure(&self, word: &str, thing: &str) -> Option<Formula> {
        let birnbaum = || {
            let less = Formula::Negate(Box::new(self.works.1.clone()));
            match (&self.failed.1, &self.works.1) {
                (failed, Formula::Whole(0)) => failed.clone(),
                (Formula::Whole(1), _) => self.works.0.clone(),
                (failed, _) => Formula::Sum(vec![failed.clone(), less]),
            }
        };
        let times = |factors: Vec<Formula>| {
            Formula::product(factors.into_iter().filter(|f| *f != Formula::Whole(1)).collect())
        };
        let over = |a: Formula, b: &Formula| Formula::Quotient(Box::new(a), Box::new(b.clone()));
        Some(match word {
            "Birnbaum" => birnbaum(),
            "made perfect" => times(vec![birnbaum(), self.own.1.clone()]),
            "doubled" => times(vec![birnbaum(), self.own.1.clone(), self.own.0.clone()]),
            "criticality" => over(times(vec![birnbaum(), self.own.1.clone()]), &self.whole.1),
            "RAW" => over(self.failed.1.clone(), &self.whole.1),
            "RRW" => over(self.whole.1.clone(), &self.works.1),
            "FV" => {
                let value = self.cut?;
                let cut = Formula::Datum {
                    symbol: format!("P(a minimal cut set with {thing} has failed)"),
                    value,
                    complement: None,
                    text: super::plain(value),
                    written: None,
                };
                over(cut, &self.whole.1)
            }
            _ => return None,
        })
    }
}

fn too_many_steps(model: &mut Model<'_>, thing: ExprId, call: ExprId) -> crate::system::Fault {
    let text = model.text_of(thing);
    let place = model.tree.span(call);
    model.fault(
        Problem::error(
            Code::TooLarge,
            place,
            format!("the steps of `{text}` would be more than {MOST_STEPS}"),
        )
        .mend("ask for the steps of its parts"),
    )
}
