//! Names of things: owner first, copies numbered.

use super::{Label, LabelName, Leaf, NONE, System};
use crate::language::{ExprId, Sym};
use crate::source::{Code, Problem};
use crate::system::model::{Model, Out};
use crate::system::structure::NodeId;

impl Model<'_> {
    pub(super) fn next_label(&mut self, parent: u32, name: LabelName) -> u32 {
        let counter = self.built.counters.entry((parent, name)).or_insert(0);
        *counter += 1;
        let index = *counter;
        self.new_label(parent, name, index)
    }

    pub(super) fn new_label(&mut self, parent: u32, name: LabelName, index: u32) -> u32 {
        self.built.labels.push(Label { parent, name, index });
        self.built.labels.len() as u32 - 1
    }

    /// `feed.pump[1]` as a thing: the copy with that label.
    pub(super) fn copy_by_path(&mut self, expr: ExprId, sym: Sym) -> Out<NodeId> {
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
    pub(in crate::system) fn label_text(&self, label: u32) -> String {
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
}
