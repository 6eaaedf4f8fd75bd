//! Things found by name within a system.

use super::desk::{Desk, Prepared};
use super::figure::Subject;
use crate::engine::plan::BlockId;
use crate::language::{Expr, ExprId, words};
use crate::source::{Code, Problem};
use crate::system::{Fault, Model, NodeId, Out};
use rustc_hash::{FxHashMap, FxHashSet};
use std::sync::Arc;

/// What a name is within a system.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Found {
    /// A block of its plan.
    Block(BlockId),
    /// A thing in it that cannot fail, or that changes nothing.
    Perfect,
    /// A thing that the system does not hold: a row of a parts list, say, that
    /// belongs to another assembly.
    Elsewhere,
}

/// The names in a system: a parts list may ask about each of its rows.
#[derive(Debug, Default)]
pub(super) struct Index {
    /// By the whole name; `None` for what shares parts with the rest.
    whole: FxHashMap<String, Option<BlockId>>,
    /// By what the name ends in after a point, with the whole names.
    ends: FxHashMap<String, Vec<(String, Option<BlockId>)>>,
    /// All things, perfect ones too.
    things: FxHashSet<String>,
}

impl Index {
    fn new(model: &Model<'_>, prepared: &Prepared) -> Index {
        let Prepared { system, plan, .. } = prepared;
        let mut index = Index::default();
        for (number, leaf) in system.leaves.iter().enumerate() {
            index.add(model.leaf_name(leaf), plan.of_leaf(number as u32), true);
        }
        for node in (0..system.structure.len() as u32).map(NodeId) {
            if let Some(name) = model.node_name(system, node) {
                index.add(name, plan.of_node(node), system.structure.members(node).len() > 1);
            }
        }
        index.things = model.things_under(prepared.asked).into_iter().map(|(name, _)| name).collect();
        index
    }

    /// Whether a thing stands under the asked one and yet nothing rests on it: a
    /// stop of a network that lies on no way, which changes as little as a perfect one.
    fn lies_on_no_way(&self, wanted: &str) -> bool {
        let tail = format!(".{wanted}");
        self.things.contains(wanted) || self.things.iter().filter(|name| name.ends_with(&tail)).count() == 1
    }

    fn add(&mut self, name: String, block: Option<BlockId>, by_end: bool) {
        for (point, _) in name.match_indices('.').filter(|_| by_end) {
            let ends = self.ends.entry(name[point + 1..].to_string()).or_default();
            if !ends.contains(&(name.clone(), block)) {
                ends.push((name.clone(), block));
            }
        }
        self.whole.entry(name).or_insert(block);
    }
}

impl Desk {
    fn index(&mut self, model: &Model<'_>, prepared: &Arc<Prepared>) -> Arc<Index> {
        if let Some((of, index)) = &self.index
            && Arc::ptr_eq(of, prepared)
        {
            return index.clone();
        }
        let index = Arc::new(Index::new(model, prepared));
        self.index = Some((prepared.clone(), index.clone()));
        index
    }

    /// What a name is within a system.
    ///
    /// # Errors
    /// A name that nothing has, that several things have, or of a structure that
    /// shares parts with the rest.
    pub(super) fn find(&mut self, model: &mut Model<'_>, subject: &Subject, name: ExprId) -> Out<Found> {
        if let Some(fault) = model.faulty(name) {
            return Err(fault);
        }
        let inner = model.tree.inside_groups(name);
        let wanted = match model.tree.expr(inner) {
            Expr::Name(sym) => model.tree.names.text(sym).to_string(),
            _ => model.text_of(name),
        };
        let index = self.index(model, &subject.prepared);
        match index.whole.get(&wanted) {
            Some(Some(block)) => return Ok(Found::Block(*block)),
            Some(None) => return Err(shares_with_the_rest(model, &wanted, name)),
            None => {}
        }
        let ends = index.ends.get(&wanted).map_or(&[][..], Vec::as_slice);
        if let [(_, block)] = ends {
            return Ok(block.map_or(Found::Perfect, Found::Block));
        }
        if ends.is_empty() && index.lies_on_no_way(&wanted) {
            return Ok(Found::Perfect);
        }
        if let (Expr::Name(sym), []) = (model.tree.expr(inner), ends)
            && model.lookup(sym).is_some()
        {
            return find_by_building(model, subject, &index, name, &wanted);
        }
        Err(not_in_system(model, subject, name, &wanted, ends))
    }
}

/// Another name for a thing, or a perfect one, is found by building it.
fn find_by_building(
    model: &mut Model<'_>,
    subject: &Subject,
    index: &Index,
    name: ExprId,
    wanted: &str,
) -> Out<Found> {
    let asked = model.build(name)?;
    let under = model.things_under(asked);
    if !under.iter().any(|(own, _)| index.things.contains(own)) {
        return Ok(Found::Elsewhere);
    }
    let [(own, item)] = under.as_slice() else {
        return Err(not_in_system(model, subject, name, wanted, &[]));
    };
    if model.item(*item).perfect {
        return Ok(Found::Perfect);
    }
    match index.whole.get(own) {
        Some(Some(block)) => Ok(Found::Block(*block)),
        // What lies on no way of a network is none of the leaves.
        _ => Ok(Found::Perfect),
    }
}

fn shares_with_the_rest(model: &mut Model<'_>, wanted: &str, name: ExprId) -> Fault {
    let place = model.tree.span(name);
    model.fault(
        Problem::error(
            Code::NoValue,
            place,
            format!("`{wanted}` shares parts with the rest of the system and has no importance as a whole"),
        )
        .mend("ask for its parts one by one"),
    )
}

fn not_in_system(
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
