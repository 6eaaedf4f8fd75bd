//! Copies: frames, what they share, and parts that the writer must settle.

use super::{CtxData, Frame, LabelName, MOST_COPIES, NONE, Task, Visit};
use crate::language::{Expr, ExprId, Sym, words};
use crate::source::{Code, Problem};
use crate::system::model::{DefId, Fault, Model, Out};
use crate::system::structure::NodeId;
use rustc_hash::FxHashSet;

impl Model<'_> {
    /// A thing of its own with the data of `visit.expr`, or all that is under it.
    pub(super) fn visit_copy(&mut self, visit: Visit, tasks: &mut Vec<Task>, values: &mut Vec<Out<NodeId>>) {
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

    /// The frame in which a name under `frame` has its thing: up past every frame that shares it.
    pub(super) fn frame_for(&mut self, name: Sym, frame: u32) -> u32 {
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

    /// Instances under a root, in the order they are met.
    pub(super) fn under(&self, root: u32, without: Option<u32>) -> Vec<u32> {
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
    pub(super) fn settled(&mut self, root: u32) -> Out<()> {
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

    pub(super) fn settled_frame(&mut self, root: u32, frame: u32, inside: &FxHashSet<u32>) -> Out<()> {
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

    pub(super) fn instance_in(&self, def: DefId, frame: u32) -> Option<u32> {
        if frame == NONE {
            self.built.in_root.get(&def).copied()
        } else {
            self.built.in_frame.get(&(def, frame)).copied()
        }
    }

    pub(super) fn settles_separate(&mut self, frame: u32, name: Sym) -> bool {
        let settles = self.built.frames[frame as usize].settles;
        let found = self.tree.settles.get(settles as usize);
        found.is_some_and(|s| s.separate.iter().any(|(n, _)| *n == name))
    }

    pub(super) fn unsettled(&mut self, open: &[(Sym, u32, u32)]) -> Fault {
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
    pub(super) fn check_settles(&mut self, frame: u32) -> Out<()> {
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
}
