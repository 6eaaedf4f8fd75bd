//! Calls: definitions with parameters, and what their arguments stand for.

use super::{Bindings, Ctx, CtxData, LabelName, NONE, Task, Visit, listed};
use crate::language::{ExprId, List, Sym, words};
use crate::source::{Code, Problem};
use crate::system::model::{DefId, Fault, Model, Out};
use crate::system::structure::NodeId;

impl Model<'_> {
    /// The expression that a parameter stands for in a context.
    pub(in crate::system) fn argument(&self, sym: Sym, ctx: Ctx) -> Option<(ExprId, Ctx)> {
        let (index, bindings) = self.argument_index(sym, ctx)?;
        let bindings = &self.built.bindings[bindings as usize];
        Some((self.tree.list(bindings.args)[index], bindings.ctx))
    }

    pub(super) fn argument_index(&self, sym: Sym, ctx: Ctx) -> Option<(usize, u32)> {
        let number = self.ctx(ctx).bindings;
        let bindings = self.built.bindings.get(number as usize)?;
        let index = self.params(bindings.def).iter().position(|(p, _)| *p == sym)?;
        Some((index, number))
    }

    pub(super) fn push_argument(
        &mut self,
        visit: Visit,
        index: usize,
        number: u32,
        tasks: &mut Vec<Task>,
        values: &mut Vec<Out<NodeId>>,
    ) {
        let bindings = &self.built.bindings[number as usize];
        let (arg, arg_ctx) = (self.tree.list(bindings.args)[index], bindings.ctx);
        let frame = self.ctx(visit.ctx).frame;
        // Inside a copy made within the body, the argument is copied with the rest.
        let copied = frame != bindings.frame;
        let key = (number, index as u32, if copied { frame } else { NONE });
        if let Some(known) = self.built.arguments.get(&key) {
            values.push(*known);
            return;
        }
        let ctx = if copied {
            let data = self.ctx(arg_ctx);
            self.new_ctx(CtxData { frame, label: self.ctx(visit.ctx).label, ..data })
        } else {
            arg_ctx
        };
        tasks.push(Task::Argument(key));
        tasks.push(Task::Visit(Visit { expr: arg, ctx, whole: false, failing: false, settles: NONE }));
    }

    pub(super) fn wrong_arguments(&mut self, expr: ExprId, def: DefId, given: usize) -> Fault {
        let params: Vec<String> = self.params(def).iter().map(|(p, _)| self.written(*p)).collect();
        let name = self.written(self.def(def).name);
        let (place, span) = (self.tree.span(expr), self.def(def).span);
        let count = params.len();
        self.fault(
            Problem::error(
                Code::WrongArguments,
                place,
                format!(
                    "`{name}` takes {count} argument{}, and {} given",
                    if count == 1 { "" } else { "s" },
                    match given {
                        0 => "none is".to_string(),
                        1 => "1 is".to_string(),
                        n => format!("{n} are"),
                    }
                ),
            )
            .label(span, "defined here")
            .mend(format!("write `{name}({})`", params.join(", "))),
        )
    }

    pub(super) fn visit_call(
        &mut self,
        visit: Visit,
        word: Sym,
        args: List,
        frame: u32,
        tasks: &mut Vec<Task>,
        values: &mut Vec<Out<NodeId>>,
    ) {
        let Visit { expr, ctx, whole, .. } = visit;
        let Some(def) = self.lookup(word).filter(|d| self.def(*d).has_params || self.def(*d).value.is_none())
        else {
            let fault = self.unknown_call(expr, word);
            values.push(Err(fault));
            return;
        };
        let value = match self.usable(def) {
            Ok(value) => value,
            Err(fault) => {
                values.push(Err(fault));
                return;
            }
        };
        if self.params(def).len() != args.len() {
            let fault = self.wrong_arguments(expr, def, args.len());
            values.push(Err(fault));
            return;
        }
        let outer = self.ctx(ctx);
        let (frame, label) = if frame == NONE {
            let label = if whole { outer.label } else { self.next_label(outer.label, LabelName::Sym(word)) };
            (outer.frame, label)
        } else {
            (frame, self.built.frames[frame as usize].label)
        };
        self.built.bindings.push(Bindings { def, args, ctx, frame });
        let bindings = self.built.bindings.len() as u32 - 1;
        let inner = self.new_ctx(CtxData { label, instance: outer.instance, frame, bindings });
        tasks.push(Task::Visit(Visit {
            expr: value,
            ctx: inner,
            whole: true,
            failing: false,
            settles: NONE,
        }));
    }

    pub(crate) fn unknown_call(&mut self, expr: ExprId, word: Sym) -> Fault {
        let text = self.tree.names.text(word);
        let place = self.tree.span(expr);
        let problem = if words::QUESTIONS.contains(&text) || words::FUNCTIONS.contains(&text) {
            Problem::error(Code::WrongKind, place, format!("`{text}(…)` is a figure and no thing"))
                .mend("write the thing itself here")
        } else if words::LATER_QUESTIONS.contains(&text) {
            Problem::error(Code::NotKnownYet, place, format!("the question `{text}(…)` is not known yet"))
                .mend("this version cannot answer it; see the README for what it does")
        } else if self.lookup(word).is_some() {
            Problem::error(Code::WrongArguments, place, format!("`{text}` takes no arguments"))
                .mend(format!("write `{text}` alone, or put an operator before the parenthesis"))
        } else {
            let problem = Problem::error(Code::UnknownName, place, format!("unknown name \"{text}\""));
            let known = self.defs.iter().filter(|d| d.has_params).map(|d| self.tree.names.text(d.name));
            match words::nearest(text, known.chain(words::QUESTIONS.iter().copied())) {
                Some(near) => problem.mend(format!("did you mean \"{near}\"?")),
                None => problem
                    .mend(format!("questions are {}", listed(words::QUESTIONS)))
                    .mend(format!("a structure with parameters is defined on a line: `{text}(s) = …`")),
            }
        };
        self.fault(problem)
    }
}
