//! Where questions are worked on: systems cut out, planned and valued, each once.

use super::find::Index;
use crate::engine::evaluate::{Assessed, assess, evaluate};
use crate::engine::importance::{Importance, importance};
use crate::engine::network::Interval;
use crate::engine::plan::Plan;
use crate::language::{Expr, ExprId, Phase};
use crate::number::{Chance, Real};
use crate::source::{Code, Problem, Span};
use crate::system::{Base, Exposure, Fault, Model, NodeId, Out, System};
use rustc_hash::FxHashMap;
use std::sync::Arc;

/// The most diagram nodes spent on Fussell–Vesely within one group.
const CUT_NODES: usize = 200_000;

/// So many systems are kept. Questions about one thing mostly stand together,
/// and what was kept for 10,000 blocks took half of the memory.
const KEPT: usize = 256;

/// A system, ready to be valued.
#[derive(Debug)]
pub struct Prepared {
    /// The asked thing, as the model counts them.
    pub asked: u32,
    /// The system under it.
    pub system: System,
    /// How it is computed.
    pub plan: Plan,
    /// Names of things that stand in several places.
    pub repeated: Vec<String>,
}

/// A system's chances under one exposure.
#[derive(Debug)]
pub struct Valued {
    /// By leaf number.
    pub chances: Vec<Chance>,
    /// By block of the plan.
    pub values: Vec<Chance>,
    /// Of the whole.
    pub chance: Chance,
    /// Bound on the relative error of the smaller side.
    pub bound: f64,
}

/// The importance of each block, by number.
type Ranked = Arc<Vec<Option<Importance>>>;

/// Keeps what has been worked out for one set of notes.
#[derive(Default)]
pub struct Desk {
    prepared: FxHashMap<ExprKey, Out<Arc<Prepared>>>,
    valued: FxHashMap<(ExprKey, Vec<ExprId>), Out<Arc<Valued>>>,
    ranked: FxHashMap<(ExprKey, Vec<ExprId>), Ranked>,
    /// The names in the system that was asked last by name.
    pub(super) index: Option<(Arc<Prepared>, Arc<Index>)>,
    /// Questions within questions.
    pub(super) depth: u32,
    /// What the answer at hand rests on; each becomes one folded remark.
    pub(super) leant_on: Vec<Arc<Prepared>>,
    /// Fixed probabilities that an asked exposure left as they are.
    pub(super) unscaled: Vec<String>,
    /// Lists that a limit cut short which no question set.
    pub(super) cut_short: Vec<String>,
}

/// Two expressions that name one definition ask of one system.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
enum ExprKey {
    Def(crate::system::DefId),
    Expr(ExprId),
}

impl Desk {
    /// The systems that the answer at hand rests on; the list starts anew.
    pub fn take_leant_on(&mut self) -> Vec<Arc<Prepared>> {
        std::mem::take(&mut self.leant_on)
    }

    /// Fixed probabilities that an asked exposure left as they are; the list starts anew.
    pub fn take_unscaled(&mut self) -> Vec<String> {
        std::mem::take(&mut self.unscaled)
    }

    /// What was said of lists that were cut short; the list starts anew.
    pub fn take_cut_short(&mut self) -> Vec<String> {
        std::mem::take(&mut self.cut_short)
    }

    fn key(model: &Model<'_>, thing: ExprId) -> ExprKey {
        match model.tree.expr(model.tree.inside_groups(thing)) {
            Expr::Name(sym) => model.lookup(sym).map_or(ExprKey::Expr(thing), ExprKey::Def),
            _ => ExprKey::Expr(thing),
        }
    }

    /// The system of an asked thing.
    ///
    /// # Errors
    /// What is wrong with it, or that it is too large.
    pub fn prepare(&mut self, model: &mut Model<'_>, thing: ExprId) -> Out<Arc<Prepared>> {
        let key = Self::key(model, thing);
        let known = self.prepared.get(&key).cloned();
        let out = match known {
            Some(known) => known,
            None => {
                if self.prepared.len() >= KEPT {
                    self.prepared.clear();
                    self.valued.clear();
                    self.ranked.clear();
                }
                let out = Self::prepare_new(model, thing);
                self.prepared.insert(key, out.clone());
                out
            }
        };
        if let Ok(prepared) = &out {
            self.leant_on.push(prepared.clone());
        }
        out
    }

    fn prepare_new(model: &mut Model<'_>, thing: ExprId) -> Out<Arc<Prepared>> {
        let asked = model.build(thing)?;
        let system = model.system(asked)?;
        let plan = match Plan::new(&system.structure, system.root) {
            Ok(plan) => plan,
            Err(large) => return Err(too_large(model, thing, large.limit)),
        };
        let repeated = repeated_names(model, &system);
        Ok(Arc::new(Prepared { asked, system, plan, repeated }))
    }

    /// The exposure of a question: its own, or the mission.
    ///
    /// # Errors
    /// What is wrong with it.
    pub fn exposure(&mut self, model: &mut Model<'_>, given: &[ExprId], place: Span) -> Out<Exposure> {
        if given.is_empty() {
            return match &model.mission {
                Some(mission) => mission.clone(),
                None => Ok(Exposure { parts: Vec::new(), asked: false, span: place }),
            };
        }
        let phases: Vec<Phase> = given
            .iter()
            .map(|arg| match model.tree.expr(*arg) {
                Expr::Choice(word, amount) => Phase { name: Some(word), amount, stress: None },
                _ => Phase { name: None, amount: *arg, stress: None },
            })
            .collect();
        model.exposure(&phases, true, place)
    }

    /// The chances of a system under an exposure.
    ///
    /// # Errors
    /// An exposure that a part ages by and that is not given.
    pub fn value(
        &mut self,
        model: &mut Model<'_>,
        thing: ExprId,
        prepared: &Prepared,
        given: &[ExprId],
        place: Span,
    ) -> Out<Arc<Valued>> {
        let key = (Self::key(model, thing), given.to_vec());
        if let Some(known) = self.valued.get(&key).cloned() {
            // The fault of an exposure that is not given points at the question that missed it.
            if known.is_ok() {
                self.note_unscaled(model, prepared, given);
                return known;
            }
        }
        // Where nothing ages, no mission is needed, and one in error takes nothing down.
        let ages = |leaf: &crate::system::Leaf| !model.item(leaf.item).ageing.is_empty();
        let exposure = if given.is_empty() && !prepared.system.leaves.iter().any(ages) {
            match &model.mission {
                Some(Ok(mission)) => Ok(mission.clone()),
                _ => Ok(Exposure { parts: Vec::new(), asked: false, span: place }),
            }
        } else {
            self.exposure(model, given, place)
        };
        let out = exposure.and_then(|exposure| {
            let chances = leaf_chances(model, &prepared.system, &exposure, place)?;
            let assessed = assess(&prepared.plan, &chances);
            let (chance, bound) = whole(&prepared.plan, &assessed);
            let chance = told_from_zero(&prepared.plan, &chances, chance);
            // Two operations more than the plan counts, for each datum.
            let bound = bound + crate::system::STEP * 16.0;
            let values = assessed.values;
            Ok(Arc::new(Valued { chances, values, chance, bound }))
        });
        if out.is_ok() {
            self.note_unscaled(model, prepared, given);
        }
        self.valued.insert(key, out.clone());
        out
    }

    fn note_unscaled(&mut self, model: &Model<'_>, prepared: &Prepared, given: &[ExprId]) {
        if given.is_empty() {
            return;
        }
        for leaf in &prepared.system.leaves {
            let item = model.item(leaf.item);
            if item.fixed.is_some() {
                let name = model.leaf_name(leaf);
                if !self.unscaled.contains(&name) && self.unscaled.len() < 64 {
                    self.unscaled.push(name);
                }
            }
        }
    }

    /// The importance of every block of a system under an exposure.
    ///
    /// # Errors
    /// A network of too many states: its value can be had without keeping
    /// them, importance cannot.
    pub fn rank(
        &mut self,
        model: &mut Model<'_>,
        thing: ExprId,
        prepared: &Prepared,
        valued: &Valued,
        given: &[ExprId],
    ) -> Out<Ranked> {
        if let Err(large) = prepared.plan.diagrams() {
            return Err(too_large(model, thing, large.limit));
        }
        let key = (Self::key(model, thing), given.to_vec());
        let entry = self.ranked.entry(key);
        let made = || Arc::new(importance(&prepared.plan, &valued.values, CUT_NODES));
        Ok(entry.or_insert_with(made).clone())
    }
}

/// The chance of the whole and the bound on its error; where a limit was
/// reached, the middle of what is possible and how far off it may be.
fn whole(plan: &Plan, assessed: &Assessed) -> (Chance, f64) {
    let root = plan.root().0 as usize;
    let low = assessed.values.get(root).copied().unwrap_or(Chance::PERFECT);
    let Some(high) = assessed.high.as_ref().and_then(|high| high.get(root)) else {
        return (low, assessed.bound);
    };
    let interval = Interval { low, high: *high, error: assessed.bound };
    (interval.middle(), interval.off())
}

/// A tail that underflowed, set to the least number there is, so that it is
/// answered as less than 1e-300 and not as impossible.
///
/// No system is hurt by a part that works: it can fail if and only if it fails
/// when all fail that can, and it can work in the same way.
fn told_from_zero(plan: &Plan, chances: &[Chance], chance: Chance) -> Chance {
    if !chance.smaller().is_zero() {
        return chance;
    }
    let least = Real::from(f64::from_bits(1));
    let failing = chance.fails().is_zero();
    let extreme: Vec<Chance> = chances
        .iter()
        .map(|c| {
            let certain = if failing { c.fails().is_zero() } else { !c.works().is_zero() };
            if certain { Chance::PERFECT } else { Chance::HOPELESS }
        })
        .collect();
    let root = evaluate(plan, &extreme).get(plan.root().0 as usize).copied().unwrap_or(chance);
    match (failing, root.works().is_zero()) {
        (true, true) => Chance::new(Real::ONE, least),
        (false, false) => Chance::new(least, Real::ONE),
        _ => chance,
    }
}

/// The error for a system whose diagram passes its limit.
pub(super) fn too_large(model: &mut Model<'_>, thing: ExprId, limit: usize) -> Fault {
    let text = model.text_of(thing);
    let place = model.tree.span(thing);
    model.fault(
        Problem::error(
            Code::TooLarge,
            place,
            format!("`{text}` is tangled too widely: its decision diagram would pass {limit} nodes"),
        )
        .mend("model a part of it as one item, or ask of its parts one by one"),
    )
}

/// Up to so many things a table of their items takes longer than it saves.
const FEW: usize = 8;

fn leaf_chances(
    model: &mut Model<'_>,
    system: &System,
    exposure: &Exposure,
    place: Span,
) -> Out<Vec<Chance>> {
    // Copies share their item, and copies of one thing mostly stand side by side:
    // its chance is computed once.
    let mut known: FxHashMap<u32, Chance> = FxHashMap::default();
    let mut last = None;
    let mut chances: Vec<Chance> = Vec::with_capacity(system.leaves.len());
    for leaf in &system.leaves {
        let same = if last == Some(leaf.item) { chances.last() } else { known.get(&leaf.item) };
        last = Some(leaf.item);
        if let Some(chance) = same {
            chances.push(*chance);
            continue;
        }
        let item = model.item(leaf.item);
        if let Some(ageing) = item.missing(exposure) {
            let (base, clause) = (ageing.base, ageing.clause.span);
            let name = model.leaf_name(leaf);
            return Err(not_given(model, &name, base, clause, exposure, place));
        }
        let chance = item.chance(exposure);
        if system.leaves.len() > FEW {
            known.insert(leaf.item, chance);
        }
        chances.push(chance);
    }
    Ok(chances)
}

fn not_given(
    model: &mut Model<'_>,
    name: &str,
    base: Base,
    clause: Span,
    exposure: &Exposure,
    place: Span,
) -> Fault {
    let (what, example) = match base {
        Base::Word(word) => {
            let word = model.tree.names.text(word);
            (format!("`{word}`"), format!("4 {word}"))
        }
        _ => ("time".to_string(), "4000 h".to_string()),
    };
    let problem = Problem::error(
        Code::ExposureNotGiven,
        place,
        format!("\"{name}\" ages by {what}, and no {what} is given"),
    )
    .label(clause, "this rate");
    let problem = if exposure.asked {
        problem.mend(format!("a question's exposure replaces the mission whole: add {example} to it"))
    } else if exposure.parts.is_empty() {
        problem.mend(format!(
            "set it on a line of its own, `mission {example}`, or in the question, as in `R(x, {example})`"
        ))
    } else {
        problem.mend(format!("add it to the mission: `…, {example}`"))
    };
    model.fault(problem)
}

/// Names of things that stand in several places; of a named structure its name alone.
fn repeated_names(model: &Model<'_>, system: &System) -> Vec<String> {
    let mut names: Vec<String> = Vec::new();
    for &node in &system.repeated {
        if let Some(name) = node_name(model, system, node)
            && !names.contains(&name)
        {
            names.push(name);
        }
        if names.len() > 64 {
            break;
        }
    }
    names
}

/// The name of a node that has one.
pub(super) fn node_name(model: &Model<'_>, system: &System, node: NodeId) -> Option<String> {
    if let Some(name) = model.node_name(system, node) {
        return Some(name);
    }
    match system.structure.node(node) {
        crate::system::Node::Leaf(leaf) => Some(model.leaf_name(&system.leaves[leaf as usize])),
        _ => None,
    }
}
