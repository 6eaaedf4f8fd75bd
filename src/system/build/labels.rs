//! Names of things: owner first, copies numbered.

use super::{Label, LabelName, Leaf, NONE, System};
use crate::language::{ExprId, Sym};
use crate::source::{Code, Problem};
use crate::system::model::{DefId, Fault, Model, Out};
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
        let found = self.find_copy(expr, sym)?;
        self.built.instances[found as usize].out.unwrap_or(Err(Fault(0)))
    }

    /// The item that a copy is, if it is one.
    pub(in crate::system) fn item_of_copy(&mut self, expr: ExprId, name: &str) -> Out<Option<u32>> {
        let Some(sym) = self.tree.names.find(name) else {
            // The path itself stands nowhere: only its figure does.
            return self.find_labelled(expr, name).map(|i| self.item_of_instance(i));
        };
        self.find_copy(expr, sym).map(|i| self.item_of_instance(i))
    }

    fn item_of_instance(&self, instance: u32) -> Option<u32> {
        Some(self.built.instances[instance as usize].item).filter(|i| *i != NONE)
    }

    fn find_copy(&mut self, expr: ExprId, sym: Sym) -> Out<u32> {
        let text = self.tree.names.text(sym).to_string();
        self.find_labelled(expr, &text)
    }

    /// The copy with a label: in full, or in short where there is only one such.
    fn find_labelled(&mut self, expr: ExprId, text: &str) -> Out<u32> {
        // A name in full needs nothing but what it begins with, which has been
        // built. To build all else here would meet what is still being built.
        if let Some(index) = self.labelled_in_full(text) {
            return Ok(index);
        }
        // Whatever order the lines stand in, every copy has been made.
        for def in 0..self.defs.len() as u32 {
            self.try_definition(DefId(def));
        }
        let tail = format!(".{text}");
        let mut short: Vec<(String, u32)> = Vec::new();
        for index in 0..self.built.instances.len() {
            let instance = &self.built.instances[index];
            // Copies of a question have no owner and no lasting name.
            if instance.frame == NONE || instance.out.is_none() || !self.is_owned(instance.label) {
                continue;
            }
            let label = self.label_text(instance.label);
            if label == text {
                return Ok(index as u32);
            }
            if label.ends_with(&tail) || label.replace("[1]", "") == text {
                short.push((label, index as u32));
            }
        }
        if let [(_, only)] = short.as_slice() {
            return Ok(*only);
        }
        let place = self.tree.span(expr);
        let problem = if short.is_empty() {
            Problem::error(Code::UnknownName, place, format!("unknown name \"{text}\": no copy is called so"))
                .mend("copies are named owner first, with their number, as in `feed.pump[1]`")
        } else {
            let some: Vec<&str> = short.iter().take(3).map(|(n, _)| n.as_str()).collect();
            Problem::error(Code::AmbiguousName, place, format!("\"{text}\" may be {}", some.join(" or ")))
                .mend("write its name in full, owner first")
        };
        Err(self.fault(problem))
    }

    fn labelled_in_full(&self, text: &str) -> Option<u32> {
        let found = self.built.instances.iter().position(|instance| {
            instance.frame != NONE
                && instance.out.is_some()
                && self.is_owned(instance.label)
                && self.label_text(instance.label) == text
        });
        found.map(|index| index as u32)
    }

    /// Whether a label begins with the name of a definition.
    fn is_owned(&self, label: u32) -> bool {
        let mut at = label;
        while let Some(found) = self.built.labels.get(at as usize) {
            if found.parent == NONE {
                return found.index == 0;
            }
            at = found.parent;
        }
        false
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
