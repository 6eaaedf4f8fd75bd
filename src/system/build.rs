//! Expressions to structure: one node for one thing, fresh ones for copies.
//!
//! A *frame* is one act of copying: everything reached while a frame is open is
//! a thing of that frame, except what the frame shares. An *instance* is one
//! definition in one frame. A *context* is where a right side is read: which
//! instance owns it, in which frame, with which arguments.
//!
//! The walk keeps its own stack, so that neither long chains of definitions nor
//! deep nesting can overflow the program's.

use super::item::Item;
use super::model::{DefId, Fault, Model, Out};
use super::quantity::Quantity;
use super::scope::Bound;
use super::structure::{Node, NodeId, Structure};
use crate::language::{Expr, ExprId, List, Need, Suffix, Sym, words};
use crate::source::{Code, Problem, Span};
use rustc_hash::{FxHashMap, FxHashSet};

/// Where an expression is read; [`Ctx::TOP`] is outside all definitions.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub struct Ctx(pub(super) u32);

impl Ctx {
    /// Outside all definitions: no frame, no arguments.
    pub const TOP: Ctx = Ctx(0);
}

const NONE: u32 = u32::MAX;

/// The most things that one run makes.
const MOST_THINGS: usize = 4_000_000;
/// The most acts of copying in one run. Copies of copies double with each
/// line of a note, so that this is reached before there are many things.
const MOST_COPIES: usize = 2_000_000;

#[derive(Clone, Copy, Debug)]
struct CtxData {
    label: u32,
    instance: u32,
    frame: u32,
    bindings: u32,
}

/// One act of copying.
#[derive(Clone, Debug)]
struct Frame {
    parent: u32,
    /// The copy's place.
    site: ExprId,
    settles: u32,
    label: u32,
    template: u32,
    /// Instances made in it, the template's own apart.
    parts: Vec<u32>,
}

/// Arguments of a call.
#[derive(Clone, Debug)]
struct Bindings {
    def: DefId,
    args: List,
    ctx: Ctx,
    /// The frame that the body is read in.
    frame: u32,
}

/// A definition in a frame, or an asked expression.
#[derive(Clone, Debug)]
struct Instance {
    def: u32,
    frame: u32,
    label: u32,
    item: u32,
    out: Option<Out<NodeId>>,
    refs: Vec<u32>,
    frames: Vec<u32>,
}

#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
enum LabelName {
    Sym(Sym),
    Text(Span),
    /// A copy of something without a name: only its number shows.
    Bare,
}

#[derive(Clone, Copy, Debug)]
struct Label {
    parent: u32,
    name: LabelName,
    index: u32,
}

/// A thing that can fail.
#[derive(Clone, Copy, Debug)]
pub struct Leaf {
    /// Its data.
    pub item: u32,
    label: u32,
    /// Where it stands.
    pub span: Span,
    /// What it is a copy of, by the item's right side; equal for copies that are alike.
    pub template: ExprId,
}

/// Everything built so far.
#[derive(Debug)]
pub struct Built {
    structure: Structure,
    origin: Vec<ExprId>,
    leaves: Vec<Leaf>,
    ctxs: Vec<CtxData>,
    frames: Vec<Frame>,
    labels: Vec<Label>,
    bindings: Vec<Bindings>,
    instances: Vec<Instance>,
    in_root: FxHashMap<DefId, u32>,
    in_frame: FxHashMap<(DefId, u32), u32>,
    counters: FxHashMap<(u32, LabelName), u32>,
    names: FxHashMap<NodeId, u32>,
    arguments: FxHashMap<(u32, u32, u32), Out<NodeId>>,
    asked: FxHashMap<ExprId, u32>,
    used_settles: FxHashSet<(u32, Sym)>,
    has_parts: bool,
    /// By node, its number in the system being cut out; [`NONE`] between two.
    cut: Vec<u32>,
}

impl Default for Built {
    fn default() -> Built {
        Built {
            structure: Structure::default(),
            origin: Vec::new(),
            leaves: Vec::new(),
            ctxs: vec![CtxData { label: NONE, instance: NONE, frame: NONE, bindings: NONE }],
            frames: Vec::new(),
            labels: Vec::new(),
            bindings: Vec::new(),
            instances: Vec::new(),
            in_root: FxHashMap::default(),
            in_frame: FxHashMap::default(),
            counters: FxHashMap::default(),
            names: FxHashMap::default(),
            arguments: FxHashMap::default(),
            asked: FxHashMap::default(),
            used_settles: FxHashSet::default(),
            has_parts: false,
            cut: Vec::new(),
        }
    }
}

/// A system cut out for the engine: the part of the structure under one root.
#[derive(Clone, Debug)]
pub struct System {
    /// Nodes under the root, leaves numbered from 0.
    pub structure: Structure,
    /// The root.
    pub root: NodeId,
    /// The things, by leaf number.
    pub leaves: Vec<Leaf>,
    /// The label of each node, or [`NONE`]; few are ever written.
    labels: Vec<u32>,
    /// Where each node was written.
    pub places: Vec<Option<ExprId>>,
    /// Nodes that stand in several places.
    pub repeated: Vec<NodeId>,
}

#[derive(Clone, Copy)]
struct Visit {
    expr: ExprId,
    ctx: Ctx,
    /// The whole right side of a definition, or what it is wrapped in.
    whole: bool,
    failing: bool,
    settles: u32,
}

/// Words in code marks, for messages.
fn listed(words: &[&str]) -> String {
    words.iter().map(|w| format!("`{w}`")).collect::<Vec<_>>().join(", ")
}

enum Task {
    Visit(Visit),
    Copy(Visit),
    Gate { expr: ExprId, need: u32, count: usize },
    Finish(u32),
    Argument((u32, u32, u32)),
    Path(ExprId, Sym),
}

impl Model<'_> {
    /// The structure of an asked thing; its name if it has one.
    ///
    /// # Errors
    /// What prevents it, as a noted fault.
    pub fn build(&mut self, expr: ExprId) -> Out<u32> {
        if let Some(known) = self.built.asked.get(&expr) {
            let instance = *known;
            return self.built.instances[instance as usize].out.unwrap_or(Err(Fault(0))).map(|_| instance);
        }
        let instance = self.new_instance(NONE, NONE, NONE);
        let ctx = self.new_ctx(CtxData { label: NONE, instance, frame: NONE, bindings: NONE });
        let out = self.run(vec![
            Task::Finish(instance),
            Task::Visit(Visit { expr, ctx, whole: false, failing: false, settles: NONE }),
        ]);
        let out = out.and_then(|node| self.settled(instance).map(|()| node));
        self.built.instances[instance as usize].out = Some(out);
        self.built.asked.insert(expr, instance);
        out.map(|_| instance)
    }

    /// Builds a definition, so that what is wrong with it is found although nobody asks.
    pub fn try_definition(&mut self, def: DefId) {
        if self.def(def).has_params || self.built.in_root.contains_key(&def) {
            return;
        }
        let Ok(value) = self.usable(def) else { return };
        match self.tree.expr(self.tree.inside_groups(value)) {
            Expr::Item(_) | Expr::Changed(..) => {
                let _ = self.item_at(self.tree.inside_groups(value));
            }
            // `1 in 0` or an unknown unit is wrong wherever it will be used.
            Expr::Literal(_) => {
                let _ = self.figure(self.tree.inside_groups(value));
            }
            Expr::Arith(..) | Expr::Negate(_) | Expr::WithUnit(..) | Expr::Name(_) => {}
            Expr::Call(word, _) if self.lookup(word).is_none() => {}
            // What is wrong with the template is found at the template, and a chain
            // of copies would take the square of its length.
            Expr::Copy(of) if self.is_definition(of) => {}
            _ => {
                let mut tasks = Vec::new();
                let mut values = Vec::new();
                self.push_instance(def, NONE, NONE, &mut tasks, &mut values);
                if values.is_empty() {
                    let _ = self.run(tasks);
                }
            }
        }
    }

    /// Whether an expression is the name of a definition without parameters.
    fn is_definition(&self, expr: ExprId) -> bool {
        match self.tree.expr(self.tree.inside_groups(expr)) {
            Expr::Name(sym) => self.lookup(sym).is_some_and(|d| !self.def(d).has_params),
            _ => false,
        }
    }

    fn new_instance(&mut self, def: u32, frame: u32, label: u32) -> u32 {
        self.built.instances.push(Instance {
            def,
            frame,
            label,
            item: NONE,
            out: None,
            refs: Vec::new(),
            frames: Vec::new(),
        });
        self.built.instances.len() as u32 - 1
    }

    fn new_ctx(&mut self, data: CtxData) -> Ctx {
        self.built.ctxs.push(data);
        Ctx(self.built.ctxs.len() as u32 - 1)
    }

    fn ctx(&self, ctx: Ctx) -> CtxData {
        self.built.ctxs[ctx.0 as usize]
    }

    /// The expression that a parameter stands for in a context.
    pub(super) fn argument(&self, sym: Sym, ctx: Ctx) -> Option<(ExprId, Ctx)> {
        let (index, bindings) = self.argument_index(sym, ctx)?;
        let bindings = &self.built.bindings[bindings as usize];
        Some((self.tree.list(bindings.args)[index], bindings.ctx))
    }

    fn argument_index(&self, sym: Sym, ctx: Ctx) -> Option<(usize, u32)> {
        let number = self.ctx(ctx).bindings;
        let bindings = self.built.bindings.get(number as usize)?;
        let index = self.params(bindings.def).iter().position(|(p, _)| *p == sym)?;
        Some((index, number))
    }

    fn run(&mut self, mut tasks: Vec<Task>) -> Out<NodeId> {
        let mut values: Vec<Out<NodeId>> = Vec::new();
        while let Some(task) = tasks.pop() {
            match task {
                Task::Visit(visit) => self.visit(visit, &mut tasks, &mut values),
                Task::Copy(visit) => self.visit_copy(visit, &mut tasks, &mut values),
                Task::Gate { expr, need, count } => {
                    let members = values.split_off(values.len() - count);
                    values.push(self.gate(expr, need, members));
                }
                Task::Finish(instance) => self.finish(instance, values.last().copied()),
                Task::Argument(key) => {
                    if let Some(out) = values.last() {
                        self.built.arguments.insert(key, *out);
                    }
                }
                Task::Path(expr, sym) => {
                    values.pop();
                    let out = self.copy_by_path(expr, sym);
                    values.push(out);
                }
            }
        }
        values.pop().unwrap_or(Err(Fault(0)))
    }

    fn gate(&mut self, expr: ExprId, need: u32, members: Vec<Out<NodeId>>) -> Out<NodeId> {
        let members = members.into_iter().collect::<Out<Vec<NodeId>>>()?;
        let node = self.built.structure.at_least(need, &members);
        self.note_origin(expr);
        Ok(node)
    }

    fn note_origin(&mut self, expr: ExprId) {
        self.built.origin.resize(self.built.structure.len(), expr);
    }

    fn finish(&mut self, instance: u32, out: Option<Out<NodeId>>) {
        let Some(out) = out else { return };
        let found = &mut self.built.instances[instance as usize];
        found.out = Some(out);
        let label = found.label;
        if let (Ok(node), true) = (out, label != NONE) {
            self.built.names.entry(node).or_insert(label);
        }
    }

    fn visit(&mut self, visit: Visit, tasks: &mut Vec<Task>, values: &mut Vec<Out<NodeId>>) {
        let Visit { expr, ctx, whole, failing, settles } = visit;
        if let Some(fault) = self.faulty(expr) {
            values.push(Err(fault));
            return;
        }
        match self.tree.expr(expr) {
            Expr::Group(x) => tasks.push(Task::Visit(Visit { expr: x, ..visit })),
            Expr::Literal(_) | Expr::WithUnit(..) | Expr::Negate(_) | Expr::Arith(..) => {
                let out = self.number_leaf(expr, ctx, whole);
                values.push(out);
            }
            Expr::Item(_) | Expr::Changed(..) => {
                let out = self.item_at(expr).and_then(|item| self.leaf(item, expr, ctx, true));
                values.push(out);
            }
            Expr::Name(sym) => self.visit_name(visit, sym, tasks, values),
            Expr::Series(list) => self.push_gate(expr, list, ctx, false, false, tasks),
            Expr::Parallel(list) => self.push_gate(expr, list, ctx, false, true, tasks),
            Expr::And(list) => self.push_gate(expr, list, ctx, true, true, tasks),
            Expr::Or(list) => self.push_gate(expr, list, ctx, true, false, tasks),
            Expr::FailsWhen(x) => tasks.push(Task::Visit(Visit { expr: x, failing: true, ..visit })),
            Expr::AtLeast(need, list) => {
                if let Err(fault) = self.push_at_least(visit, need, list, tasks) {
                    values.push(Err(fault));
                }
            }
            Expr::Copy(of) => tasks.push(Task::Copy(Visit { expr: of, ..visit })),
            Expr::Settled(of, id) => tasks.push(Task::Visit(Visit { expr: of, settles: id, ..visit })),
            Expr::Call(word, args) => self.visit_call(visit, word, args, NONE, tasks, values),
            Expr::Counted(..) | Expr::Choice(..) | Expr::Mixed(_) | Expr::Broken => {
                let fault = self.no_thing(expr);
                values.push(Err(fault));
            }
        }
        let _ = (failing, settles);
    }

    fn no_thing(&mut self, expr: ExprId) -> Fault {
        let text = self.text_of(expr);
        let place = self.tree.span(expr);
        self.fault(
            Problem::error(Code::WrongKind, place, format!("`{text}` is no thing that works or fails"))
                .mend("write a name, a structure, or a probability"),
        )
    }

    fn push_gate(
        &mut self,
        expr: ExprId,
        list: List,
        ctx: Ctx,
        failing: bool,
        any: bool,
        tasks: &mut Vec<Task>,
    ) {
        let members = self.tree.list(list);
        let need = if any { 1 } else { members.len() as u32 };
        tasks.push(Task::Gate { expr, need, count: members.len() });
        let visits = members.iter().rev();
        tasks.extend(
            visits.map(|m| Task::Visit(Visit { expr: *m, ctx, whole: false, failing, settles: NONE })),
        );
    }

    fn push_at_least(&mut self, visit: Visit, need: Need, list: List, tasks: &mut Vec<Task>) -> Out<()> {
        let Visit { expr, ctx, failing, settles, .. } = visit;
        let mut members: Vec<Task> = Vec::new();
        for &entry in self.tree.list(list) {
            if let Expr::Counted(count, of) = self.tree.expr(entry) {
                let copies = self.count(count, ctx)?;
                if members.len() + copies as usize + self.built.leaves.len() > MOST_THINGS {
                    return Err(self.too_many(entry));
                }
                let copy = Visit { expr: of, ctx, whole: false, failing, settles };
                members.extend((0..copies).map(|_| Task::Copy(copy)));
            } else {
                members.push(Task::Visit(Visit { expr: entry, ctx, whole: false, failing, settles: NONE }));
            }
        }
        let n = members.len() as u32;
        let k = match need {
            Need::All => n,
            Need::Any => 1,
            Need::Count(k) => self.count(k, ctx)?,
        };
        if k < 1 || k > n {
            let place = match need {
                Need::Count(k) => self.tree.span(k),
                _ => self.tree.span(expr),
            };
            let mend =
                if k > n { format!("need at most {n}, or list more") } else { "need at least 1".to_string() };
            return Err(self.fault(
                Problem::error(Code::ImpossibleCount, place, format!("{k} of {n} cannot be")).mend(mend),
            ));
        }
        // k failures fell it: it works while n - k + 1 work.
        let need = if failing { n - k + 1 } else { k };
        tasks.push(Task::Gate { expr, need, count: n as usize });
        members.reverse();
        tasks.append(&mut members);
        Ok(())
    }

    fn too_many(&mut self, entry: ExprId) -> Fault {
        let place = self.tree.span(entry);
        self.fault(
            Problem::error(Code::TooLarge, place, format!("this makes more than {MOST_THINGS} things"))
                .mend("split the system, or model a group of them as one item"),
        )
    }

    fn count(&mut self, expr: ExprId, ctx: Ctx) -> Out<u32> {
        let figure = self.figure_in(expr, ctx)?;
        match figure.whole() {
            Some(count @ 1..) => Ok(count),
            _ => {
                let place = self.tree.span(expr);
                Err(self.fault(
                    Problem::error(Code::ImpossibleCount, place, "a count is a whole number of at least 1")
                        .mend("write `2 of 3 pump`"),
                ))
            }
        }
    }

    fn figure_in(&mut self, expr: ExprId, ctx: Ctx) -> Out<Quantity> {
        struct None_;
        impl super::figure::Oracle for None_ {
            fn ask(&mut self, model: &mut Model<'_>, call: ExprId, _: Ctx) -> Out<Quantity> {
                Err(model.no_thing(call))
            }
        }
        self.figure_with(expr, ctx, &mut None_)
    }

    fn visit_name(&mut self, visit: Visit, sym: Sym, tasks: &mut Vec<Task>, values: &mut Vec<Out<NodeId>>) {
        let Visit { expr, ctx, .. } = visit;
        if let Some((index, bindings)) = self.argument_index(sym, ctx) {
            self.push_argument(visit, index, bindings, tasks, values);
            return;
        }
        match self.name_or_prefix(sym, &[]) {
            Some(Bound::Def(def)) => {
                if self.def(def).has_params {
                    let fault = self.wrong_arguments(expr, def, 0);
                    values.push(Err(fault));
                    return;
                }
                if let Some(fault) = self.figure_as_thing(expr, def) {
                    values.push(Err(fault));
                    return;
                }
                let frame = self.frame_for(self.def(def).name, self.ctx(ctx).frame);
                let instance = self.push_instance(def, frame, NONE, tasks, values);
                self.refer(ctx, instance);
            }
            Some(Bound::Path(def)) => {
                tasks.push(Task::Path(expr, sym));
                self.push_instance(def, NONE, NONE, tasks, values);
            }
            _ => {
                let text = self.tree.names.text(sym);
                let problem = Problem::error(
                    Code::UnknownName,
                    self.tree.span(expr),
                    format!("unknown name \"{text}\""),
                );
                let problem = self.with_nearest(problem, text);
                let fault = self.fault(problem);
                values.push(Err(fault));
            }
        }
    }

    /// A name of a figure with a unit, used as a thing: the use is what is wrong.
    fn figure_as_thing(&mut self, expr: ExprId, def: DefId) -> Option<Fault> {
        let value = self.def(def).value.filter(|_| self.def(def).broken.is_none())?;
        let inner = self.tree.inside_groups(value);
        let dim = match self.tree.expr(inner) {
            Expr::Literal(id) if matches!(self.tree.literals[id as usize].suffix, Suffix::Unit(_)) => {
                self.figure(inner).ok()?.dim
            }
            Expr::WithUnit(..) => self.figure(inner).ok()?.dim,
            _ => return None,
        };
        let (name, span, place) =
            (self.written(self.def(def).name), self.def(def).span, self.tree.span(expr));
        let what = self.units.describe(&dim, &self.tree.names);
        Some(
            self.fault(
                Problem::error(Code::WrongKind, place, format!("`{name}` is {what} and no thing"))
                    .label(span, "defined here")
                    .mend(format!("make an item of it on a line of its own, as in `item = rate {name}`")),
            ),
        )
    }

    fn refer(&mut self, ctx: Ctx, instance: u32) {
        let owner = self.ctx(ctx).instance;
        if owner != NONE && instance != NONE {
            self.built.instances[owner as usize].refs.push(instance);
        }
    }

    fn push_argument(
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

    fn wrong_arguments(&mut self, expr: ExprId, def: DefId, given: usize) -> Fault {
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

    fn visit_call(
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

    /// A thing of its own with the data of `visit.expr`, or all that is under it.
    fn visit_copy(&mut self, visit: Visit, tasks: &mut Vec<Task>, values: &mut Vec<Out<NodeId>>) {
        let mut of = self.tree.inside_groups(visit.expr);
        let mut ctx = visit.ctx;
        let outer = self.ctx(ctx);
        // A count on a parameter copies its argument.
        while let Expr::Name(sym) = self.tree.expr(of)
            && let Some((arg, arg_ctx)) = self.argument(sym, ctx)
        {
            of = self.tree.inside_groups(arg);
            ctx = arg_ctx;
        }
        if let Some(fault) = self.faulty(of) {
            values.push(Err(fault));
            return;
        }
        if self.built.frames.len() >= MOST_COPIES {
            let fault = self.too_many(visit.expr);
            values.push(Err(fault));
            return;
        }
        let (name, template) = match self.tree.expr(of) {
            Expr::Name(sym) => (LabelName::Sym(sym), self.lookup(sym).map_or(NONE, |d| d.0)),
            Expr::Call(word, _) => (LabelName::Sym(word), NONE),
            Expr::Literal(_) => (LabelName::Text(self.tree.span(of)), NONE),
            _ => (LabelName::Bare, NONE),
        };
        let label = if visit.whole { outer.label } else { self.next_label(outer.label, name) };
        let parent = self.ctx(ctx).frame;
        self.built.frames.push(Frame {
            parent,
            site: visit.expr,
            settles: visit.settles,
            label,
            template,
            parts: Vec::new(),
        });
        let frame = self.built.frames.len() as u32 - 1;
        if outer.instance != NONE {
            self.built.instances[outer.instance as usize].frames.push(frame);
        }
        match self.tree.expr(of) {
            Expr::Name(sym) => match self.lookup(sym) {
                Some(def) if self.def(def).has_params => {
                    let fault = self.wrong_arguments(of, def, 0);
                    values.push(Err(fault));
                }
                Some(def) => {
                    let instance = self.push_instance(def, frame, label, tasks, values);
                    self.refer(visit.ctx, instance);
                }
                None => tasks.push(Task::Visit(Visit { expr: of, ctx, ..visit })),
            },
            Expr::Call(word, args) => {
                let inner = Visit { expr: of, ctx, ..visit };
                self.visit_call(inner, word, args, frame, tasks, values);
            }
            _ => {
                let inner = self.new_ctx(CtxData { label, frame, ..self.ctx(ctx) });
                tasks.push(Task::Visit(Visit {
                    expr: of,
                    ctx: inner,
                    whole: true,
                    failing: false,
                    settles: NONE,
                }));
            }
        }
    }

    fn next_label(&mut self, parent: u32, name: LabelName) -> u32 {
        let counter = self.built.counters.entry((parent, name)).or_insert(0);
        *counter += 1;
        let index = *counter;
        self.new_label(parent, name, index)
    }

    fn new_label(&mut self, parent: u32, name: LabelName, index: u32) -> u32 {
        self.built.labels.push(Label { parent, name, index });
        self.built.labels.len() as u32 - 1
    }

    /// The frame in which a name under `frame` has its thing: up past every frame that shares it.
    fn frame_for(&mut self, name: Sym, frame: u32) -> u32 {
        let (mut found, mut at) = (frame, frame);
        while at != NONE {
            let (parent, settles) =
                (self.built.frames[at as usize].parent, self.built.frames[at as usize].settles);
            if let Some(settled) = self.tree.settles.get(settles as usize) {
                if settled.separate.iter().any(|(s, _)| *s == name) {
                    self.built.used_settles.insert((settles, name));
                    break;
                }
                if settled.sharing.iter().any(|(s, _)| *s == name) {
                    self.built.used_settles.insert((settles, name));
                    found = parent;
                }
            }
            at = parent;
        }
        found
    }

    /// The instance of a definition in a frame; its tasks or its value are pushed.
    fn push_instance(
        &mut self,
        def: DefId,
        frame: u32,
        label: u32,
        tasks: &mut Vec<Task>,
        values: &mut Vec<Out<NodeId>>,
    ) -> u32 {
        let known = if frame == NONE {
            self.built.in_root.get(&def).copied()
        } else {
            self.built.in_frame.get(&(def, frame)).copied()
        };
        if let Some(instance) = known {
            let out = self.built.instances[instance as usize].out;
            values.push(out.unwrap_or_else(|| Err(self.in_a_circle(def))));
            return instance;
        }
        let value = match self.usable(def) {
            Ok(value) => value,
            Err(fault) => {
                values.push(Err(fault));
                return NONE;
            }
        };
        let name = LabelName::Sym(self.def(def).name);
        let label = match (label, frame) {
            (NONE, NONE) => self.new_label(NONE, name, 0),
            (NONE, _) => self.new_label(self.built.frames[frame as usize].label, name, 0),
            (label, _) => label,
        };
        let instance = self.new_instance(def.0, frame, label);
        if frame == NONE {
            self.built.in_root.insert(def, instance);
        } else {
            self.built.in_frame.insert((def, frame), instance);
            if self.built.frames[frame as usize].template != def.0 {
                self.built.frames[frame as usize].parts.push(instance);
                self.built.has_parts = true;
            }
        }
        let ctx = self.new_ctx(CtxData { label, instance, frame, bindings: NONE });
        tasks.push(Task::Finish(instance));
        tasks.push(Task::Visit(Visit { expr: value, ctx, whole: true, failing: false, settles: NONE }));
        instance
    }

    /// Only reached when a circle runs through arguments; others are found before anything is built.
    fn in_a_circle(&mut self, def: DefId) -> Fault {
        let (name, span) = (self.written(self.def(def).name), self.def(def).span);
        self.fault(
            Problem::error(Code::Circle, span, format!("`{name}` rests on itself"))
                .mend("define it without itself"),
        )
    }

    fn number_leaf(&mut self, expr: ExprId, ctx: Ctx, whole: bool) -> Out<NodeId> {
        let item = if self.ctx(ctx).bindings == NONE {
            self.number_item(expr)?
        } else {
            let figure = self.figure_in(expr, ctx)?;
            let place = self.tree.span(expr);
            let chance = self.probability(&figure, place, true)?;
            self.item_list.push(Item { span: place, fixed: Some((chance, None)), ..Item::default() });
            self.item_list.len() as u32 - 1
        };
        self.leaf(item, expr, ctx, whole)
    }

    fn leaf(&mut self, item: u32, expr: ExprId, ctx: Ctx, whole: bool) -> Out<NodeId> {
        let data = self.ctx(ctx);
        if !self.item(item).has_failure_data() {
            let place = self.item(item).span;
            let name = self.label_text(data.label);
            return Err(self.fault(
                Problem::error(Code::MissingData, place, format!("`{name}` has no data of failure"))
                    .mend("add a probability, `fails …`, `rate …`, `mttf …`, or `perfect` if it cannot fail"),
            ));
        }
        if self.built.leaves.len() >= MOST_THINGS {
            return Err(self.too_many(expr));
        }
        if whole && data.instance != NONE {
            self.built.instances[data.instance as usize].item = item;
        }
        let node = if self.item(item).perfect {
            self.built.structure.works()
        } else {
            let span = self.tree.span(expr);
            let label = if whole && data.label != NONE {
                data.label
            } else {
                self.new_label(data.label, LabelName::Text(span), 0)
            };
            let number = self.built.leaves.len() as u32;
            self.built.leaves.push(Leaf { item, label, span, template: expr });
            self.built.structure.leaf(number)
        };
        self.note_origin(expr);
        Ok(node)
    }

    /// `feed.pump[1]` as a thing: the copy with that label.
    fn copy_by_path(&mut self, expr: ExprId, sym: Sym) -> Out<NodeId> {
        let text = self.tree.names.text(sym).to_string();
        for index in 0..self.built.instances.len() {
            let instance = &self.built.instances[index];
            if instance.frame == NONE || instance.label == NONE {
                continue;
            }
            if let (Some(out), true) = (instance.out, self.label_text(instance.label) == text) {
                return out;
            }
        }
        let place = self.tree.span(expr);
        Err(self.fault(
            Problem::error(
                Code::UnknownName,
                place,
                format!("unknown name \"{text}\": no copy is called so"),
            )
            .mend("copies are named owner first, with their number, as in `feed.pump[1]`"),
        ))
    }

    /// The label as text: owner first, copies numbered.
    pub(super) fn label_text(&self, label: u32) -> String {
        let mut parts = Vec::new();
        let mut at = label;
        while let Some(found) = self.built.labels.get(at as usize) {
            parts.push(*found);
            at = found.parent;
        }
        let mut out = String::new();
        for part in parts.iter().rev() {
            if !out.is_empty() && part.name != LabelName::Bare {
                out.push('.');
            }
            match part.name {
                LabelName::Bare => {}
                LabelName::Sym(sym) => out.push_str(self.tree.names.text(sym)),
                LabelName::Text(span) => out.push_str(self.sources.text(span)),
            }
            if part.index > 0 {
                out.push_str(&format!("[{}]", part.index));
            }
        }
        out
    }

    /// The name of a thing.
    pub fn leaf_name(&self, leaf: &Leaf) -> String {
        self.label_text(leaf.label)
    }

    /// The name of a node of a system, if it has one.
    pub fn node_name(&self, system: &System, node: NodeId) -> Option<String> {
        let label = *system.labels.get(node.0 as usize)?;
        (label != NONE).then(|| self.label_text(label))
    }

    /// Instances under a root, in the order they are met.
    fn under(&self, root: u32, without: Option<u32>) -> Vec<u32> {
        let mut seen = FxHashSet::default();
        let mut order = Vec::new();
        let mut stack = vec![root];
        while let Some(at) = stack.pop() {
            if Some(at) == without || !seen.insert(at) {
                continue;
            }
            order.push(at);
            stack.extend(self.built.instances[at as usize].refs.iter().rev());
        }
        order
    }

    /// The items of all things under an asked thing, perfect ones too, each once, with their names.
    pub fn things_under(&self, asked: u32) -> Vec<(String, u32)> {
        self.under(asked, None)
            .into_iter()
            .map(|i| &self.built.instances[i as usize])
            .filter(|i| i.item != NONE)
            .map(|i| (self.label_text(i.label), i.item))
            .collect()
    }

    /// Whether every part of a copy that is also used outside it has been settled,
    /// and every settled part is one.
    fn settled(&mut self, root: u32) -> Out<()> {
        if !self.built.has_parts && self.tree.settles.is_empty() {
            return Ok(());
        }
        let visited = self.under(root, None);
        let inside: FxHashSet<u32> = visited.iter().copied().collect();
        let mut sites: FxHashSet<ExprId> = FxHashSet::default();
        for at in visited {
            for frame in self.built.instances[at as usize].frames.clone() {
                if sites.insert(self.built.frames[frame as usize].site) {
                    self.settled_frame(root, frame, &inside)?;
                }
            }
        }
        Ok(())
    }

    fn settled_frame(&mut self, root: u32, frame: u32, inside: &FxHashSet<u32>) -> Out<()> {
        self.check_settles(frame)?;
        // Outermost copy first met outside: for each part, every frame around this one and the ground.
        let mut open: Vec<(Sym, u32, u32)> = Vec::new();
        for part in self.built.frames[frame as usize].parts.clone() {
            let def = DefId(self.built.instances[part as usize].def);
            let name = self.def(def).name;
            let mut below = frame;
            loop {
                if self.settles_separate(below, name) {
                    break;
                }
                let parent = self.built.frames[below as usize].parent;
                if let Some(outside) = self.instance_in(def, parent).filter(|i| inside.contains(i)) {
                    let template = self.built.frames[below as usize].template;
                    let original =
                        (template != NONE).then(|| self.instance_in(DefId(template), parent)).flatten();
                    if self.under(root, original.or(Some(NONE))).contains(&outside) {
                        open.push((name, outside, below));
                    }
                    break;
                }
                if parent == NONE {
                    break;
                }
                below = parent;
            }
        }
        if open.is_empty() { Ok(()) } else { Err(self.unsettled(&open)) }
    }

    fn instance_in(&self, def: DefId, frame: u32) -> Option<u32> {
        if frame == NONE {
            self.built.in_root.get(&def).copied()
        } else {
            self.built.in_frame.get(&(def, frame)).copied()
        }
    }

    fn settles_separate(&mut self, frame: u32, name: Sym) -> bool {
        let settles = self.built.frames[frame as usize].settles;
        let found = self.tree.settles.get(settles as usize);
        found.is_some_and(|s| s.separate.iter().any(|(n, _)| *n == name))
    }

    fn unsettled(&mut self, open: &[(Sym, u32, u32)]) -> Fault {
        let mut names: Vec<String> = Vec::new();
        for (name, _, _) in open {
            let text = self.written(*name);
            if !names.contains(&text) {
                names.push(text);
            }
        }
        let site = self.built.frames[open[0].2 as usize].site;
        let template = self.text_of(site);
        let list = names.join(", ");
        let message = format!(
            "`{template}` is copied, and its part{} {list} {} also used outside it",
            if names.len() == 1 { "" } else { "s" },
            if names.len() == 1 { "is" } else { "are" },
        );
        let mut problem = Problem::error(Code::UnsettledCopy, self.tree.span(site), message);
        let def = self.built.instances[open[0].1 as usize].def;
        problem = problem.label(self.def(DefId(def)).span, "this part");
        self.fault(
            problem
                .mend(format!("add `sharing ({list})` after the copy if all copies use the same one"))
                .mend(format!("add `separate ({list})` if each copy has its own")),
        )
    }

    /// A name after `sharing` or `separate` must be a part of what is copied.
    fn check_settles(&mut self, frame: u32) -> Out<()> {
        let settles = self.built.frames[frame as usize].settles;
        let Some(settled) = self.tree.settles.get(settles as usize) else { return Ok(()) };
        for (name, span) in settled.sharing.iter().chain(&settled.separate) {
            if self.built.used_settles.contains(&(settles, *name)) {
                continue;
            }
            let text = self.written(*name);
            let mut parts: Vec<String> = Vec::new();
            for part in &self.built.frames[frame as usize].parts {
                let name = self.written(self.def(DefId(self.built.instances[*part as usize].def)).name);
                if !parts.contains(&name) && parts.len() < 8 {
                    parts.push(name);
                }
            }
            let problem = Problem::error(
                Code::SettlesNothing,
                *span,
                format!("`{text}` is no part of what is copied here"),
            );
            let problem = match words::nearest(&text, parts.iter().map(String::as_str)) {
                Some(near) => problem.mend(format!("did you mean \"{near}\"?")),
                None if parts.is_empty() => problem.mend("take it away: nothing copied here has a name"),
                None => problem.mend(format!("its parts are {}", parts.join(", "))),
            };
            return Err(self.fault(problem));
        }
        Ok(())
    }

    /// Cuts out the part of the structure under an asked thing.
    ///
    /// # Errors
    /// The fault that it was built with.
    pub fn system(&mut self, asked: u32) -> Out<System> {
        let built = &mut self.built;
        let root = built.instances[asked as usize].out.unwrap_or(Err(Fault(0)))?;
        // A table that all systems use in turn: hash tables for each took a
        // fifth of the time that a small system needs in all.
        built.cut.resize(built.structure.len(), NONE);
        // Depth first in the order written, so that the numbers do not depend on
        // what else was asked before.
        const OPEN: u32 = NONE - 1;
        let mut order: Vec<NodeId> = Vec::new();
        let mut stack = vec![(root, 0_usize)];
        built.cut[root.0 as usize] = OPEN;
        while let Some((node, next)) = stack.last_mut() {
            if let Some(&member) = built.structure.members(*node).get(*next) {
                *next += 1;
                let cut = &mut built.cut[member.0 as usize];
                if *cut == NONE {
                    *cut = OPEN;
                    stack.push((member, 0));
                }
            } else {
                built.cut[node.0 as usize] = order.len() as u32;
                order.push(*node);
                stack.pop();
            }
        }
        let mut system = System {
            structure: Structure::default(),
            root: NodeId(built.cut[root.0 as usize]),
            leaves: Vec::new(),
            labels: Vec::with_capacity(order.len()),
            places: Vec::with_capacity(order.len()),
            repeated: Vec::new(),
        };
        let mut places = vec![0_u32; order.len()];
        let mut members: Vec<NodeId> = Vec::new();
        for old in &order {
            match built.structure.node(*old) {
                Node::Works => system.structure.works(),
                Node::Leaf(leaf) => {
                    system.leaves.push(built.leaves[leaf as usize]);
                    system.structure.leaf(system.leaves.len() as u32 - 1)
                }
                Node::AtLeast { need, .. } => {
                    members.clear();
                    let olds = built.structure.members(*old).iter();
                    members.extend(olds.map(|m| NodeId(built.cut[m.0 as usize])));
                    for member in &members {
                        places[member.0 as usize] += 1;
                    }
                    system.structure.at_least(need, &members)
                }
            };
            system.places.push(built.origin.get(old.0 as usize).copied());
            system.labels.push(built.names.get(old).copied().unwrap_or(NONE));
        }
        for old in &order {
            built.cut[old.0 as usize] = NONE;
        }
        system.repeated = (0..places.len()).filter(|i| places[*i] > 1).map(|i| NodeId(i as u32)).collect();
        Ok(system)
    }
}
