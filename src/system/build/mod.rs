//! Expressions to structure: one node for one thing, fresh ones for copies.
//!
//! A *frame* is one act of copying: everything reached while a frame is open is
//! a thing of that frame, except what the frame shares. An *instance* is one
//! definition in one frame. A *context* is where a right side is read: which
//! instance owns it, in which frame, with which arguments.
//!
//! The walk keeps its own stack, so that neither long chains of definitions nor
//! deep nesting can overflow the program's.

mod calls;
mod copies;
mod cut;
mod labels;
mod routes;

pub use cut::System;

use super::item::Item;
use super::model::{DefId, Fault, Model, Out};
use super::quantity::Quantity;
use super::scope::Bound;
use super::structure::{NodeId, Structure};
use crate::language::{Expr, ExprId, List, Need, Suffix, Sym};
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
#[derive(Clone, Debug)]
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
    /// Networks whose stops are being built, or are.
    ways: Vec<routes::Ways>,
    /// Networks whose idle stops have been named.
    judged: FxHashSet<ExprId>,
    has_parts: bool,
    /// By node, its number in the system being cut out; [`NONE`] between two.
    cut: Vec<u32>,
    room: cut::Room,
    /// Room that each walk takes over from the one before.
    tasks: Vec<Task>,
    values: Vec<Out<NodeId>>,
    members: Vec<NodeId>,
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
            ways: Vec::new(),
            judged: FxHashSet::default(),
            has_parts: false,
            cut: Vec::new(),
            room: cut::Room::default(),
            tasks: Vec::new(),
            values: Vec::new(),
            members: Vec::new(),
        }
    }
}

#[derive(Clone, Copy, Debug)]
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

#[derive(Clone, Copy, Debug)]
enum Task {
    Visit(Visit),
    Copy(Visit),
    Gate { expr: ExprId, need: u32, count: usize },
    Finish(u32),
    Argument((u32, u32, u32)),
    Path(ExprId, Sym),
    Routes(u32),
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
        let mut tasks = std::mem::take(&mut self.built.tasks);
        tasks.extend([
            Task::Finish(instance),
            Task::Visit(Visit { expr, ctx, whole: false, failing: false, settles: NONE }),
        ]);
        let out = self.run(tasks);
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
                let mut tasks = std::mem::take(&mut self.built.tasks);
                let mut values = Vec::new();
                self.push_instance(def, NONE, NONE, &mut tasks, &mut values);
                let _ = self.run(tasks);
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

    fn run(&mut self, mut tasks: Vec<Task>) -> Out<NodeId> {
        let mut values = std::mem::take(&mut self.built.values);
        while let Some(task) = tasks.pop() {
            match task {
                Task::Visit(visit) => self.visit(visit, &mut tasks, &mut values),
                Task::Copy(visit) => self.visit_copy(visit, &mut tasks, &mut values),
                Task::Gate { expr, need, count } => {
                    let from = values.len() - count;
                    let out = self.gate(expr, need, &values[from..]);
                    values.truncate(from);
                    values.push(out);
                }
                Task::Routes(number) => {
                    let out = self.network(number, &mut values);
                    values.push(out);
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
        let out = values.pop().unwrap_or(Err(Fault(0)));
        values.clear();
        self.built.tasks = tasks;
        self.built.values = values;
        out
    }

    fn gate(&mut self, expr: ExprId, need: u32, outs: &[Out<NodeId>]) -> Out<NodeId> {
        let built = &mut self.built;
        built.members.clear();
        for out in outs {
            built.members.push((*out)?);
        }
        let node = built.structure.at_least(need, &built.members);
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
            Expr::Routes(id) => self.push_routes(visit, id, tasks, values),
            Expr::Counted(..) | Expr::Choice(..) | Expr::Mixed(_) | Expr::Terminal(_) | Expr::Broken => {
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
}
