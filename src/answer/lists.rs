//! Questions that a table or a list answers.

use super::desk::{Desk, node_name};
use super::display::{chance_text, figure_text};
use super::figure::{Number, SET_NODES, Subject, no_thing};
use super::importance::measure;
use super::reply::Reply;
use crate::engine::cuts::{Minimal, single_points};
use crate::engine::listing::{CutBy, Limits};
use crate::engine::minimal::Which;
use crate::language::{Clause, Expr, ExprId, List, words};
use crate::number::{Chance, Real, format_number};
use crate::source::{Code, Problem};
use crate::steps::{Side, folded, listed};
use crate::system::{Base, Exposure, Item, Model, Node, NodeId, Out, Pace, STEP};
use std::collections::hash_map::Entry;

/// Sets listed where the question does not say how many.
const FIRST: usize = 100;

/// Limits of `cuts(x, order 3)`, `cuts(x, first 20)`.
///
/// # Errors
/// Another choice, or one that is no whole number.
pub(super) fn limits(model: &mut Model<'_>, args: List) -> Out<Limits> {
    let mut limits = Limits { first: FIRST, ..Limits::default() };
    for arg in model.tree.list(args).to_vec().into_iter().skip(1) {
        let place = model.tree.span(arg);
        let Expr::Choice(word, value) = model.tree.expr(arg) else { return Err(bad_limit(model, place)) };
        let Some(value @ 1..) = model.figure(value)?.whole() else { return Err(bad_limit(model, place)) };
        match model.tree.names.text(word) {
            "order" => limits.order = Some(u64::from(value)),
            "first" => limits.first = value as usize,
            _ => return Err(bad_limit(model, place)),
        }
    }
    Ok(limits)
}

fn bad_limit(model: &mut Model<'_>, place: crate::source::Span) -> crate::system::Fault {
    model.fault(
        Problem::error(
            Code::WrongArguments,
            place,
            "a list of sets is limited by `order` or `first` and a whole number",
        )
        .mend("write `cuts(x, order 3)` or `cuts(x, first 20)`"),
    )
}

impl Desk {
    /// The answer to a question whose answer is a list; `None` where it is a number.
    ///
    /// # Errors
    /// What prevents it.
    pub fn list(&mut self, model: &mut Model<'_>, expr: ExprId) -> Out<Option<Reply>> {
        let call = model.tree.inside_groups(expr);
        let Expr::Call(word, args) = model.tree.expr(call) else { return Ok(None) };
        let tree = model.tree;
        let text = tree.names.text(word);
        if !matches!(text, "cuts" | "paths" | "single points" | "rank" | "steps" | "assumptions" | "inputs") {
            return Ok(None);
        }
        let Some(&thing) = model.tree.list(args).first() else { return Err(no_thing(model, call)) };
        if text == "steps" {
            let steps = self.steps(model, thing)?;
            return Ok(Some(self.steps_reply(model, &steps, false)));
        }
        self.no_figure(model, thing)?;
        match text {
            "cuts" => self.sets(model, call, args, Which::Cuts).map(Some),
            "paths" => self.sets(model, call, args, Which::Paths).map(Some),
            "single points" => self.single_points(model, call, args).map(Some),
            "rank" => self.rank_table(model, call, args).map(Some),
            "assumptions" => {
                let prepared = self.prepare(model, thing)?;
                let given: Vec<ExprId> = model.tree.list(args)[1..].to_vec();
                let exposure = self.exposure(model, &given, model.tree.span(call))?;
                let entries =
                    assumptions(model, &prepared.system, &exposure).into_iter().map(|l| vec![l]).collect();
                Ok(Some(Reply::List { entries, numbered: false, notes: Vec::new() }))
            }
            _ => self.inputs(model, thing).map(Some),
        }
    }

    fn sets(&mut self, model: &mut Model<'_>, call: ExprId, args: List, which: Which) -> Out<Reply> {
        let limits = limits(model, args)?;
        let thing = model.tree.list(args)[0];
        let subject = self.subject(model, call, args, usize::MAX)?;
        let minimal = match Minimal::new(&subject.prepared.plan, which, SET_NODES) {
            Ok(minimal) => minimal,
            Err(large) => return Err(super::desk::too_large(model, thing, large.limit)),
        };
        let sets = minimal.list(&subject.valued.chances, limits);
        if sets.sets.is_empty() && sets.cut_by.is_none() {
            return Ok(Reply::Line(match which {
                Which::Cuts => "none: it cannot fail".to_string(),
                Which::Paths => "none: it cannot fail, whatever else does".to_string(),
            }));
        }
        let foot = sets.cut_by.map(|cut| {
            let total = minimal.count().map_or_else(|_| "more".to_string(), |n| n.to_string());
            let by_the_question = model.tree.list(args).iter().any(|a| match model.tree.expr(*a) {
                Expr::Choice(word, _) => match cut {
                    CutBy::Order => model.tree.names.text(word) == "order",
                    CutBy::First => model.tree.names.text(word) == "first",
                    CutBy::Work { .. } => false,
                },
                _ => false,
            });
            if !by_the_question {
                let shown = sets.sets.len();
                self.cut_short.push(format!("{shown} sets are listed of {total} in all"));
            }
            match cut {
                CutBy::Order => format!("… {total} in all; those of higher order are left out"),
                CutBy::First => format!("… {total} in all; the first {} are shown", sets.sets.len()),
                CutBy::Work { complete } => {
                    format!("… {total} in all; complete up to order {complete}, the rest would take too long")
                }
            }
        });
        let (title, measure) = match which {
            Which::Cuts => ("cut set", "all have failed"),
            Which::Paths => ("path set", "all work"),
        };
        let rows = sets
            .sets
            .iter()
            .zip(&sets.chances)
            .map(|(set, chance)| {
                let names: Vec<String> = set
                    .iter()
                    .map(|l| model.leaf_name(&subject.prepared.system.leaves[*l as usize]))
                    .collect();
                vec![
                    set.len().to_string(),
                    probability_text(model, *chance, which, &subject, set),
                    names.join(", "),
                ]
            })
            .collect();
        let head = vec!["order".to_string(), measure.to_string(), title.to_string()];
        Ok(Reply::Table { head, rows, foot })
    }

    fn single_points(&mut self, model: &mut Model<'_>, call: ExprId, args: List) -> Out<Reply> {
        let subject = self.subject(model, call, args, 1)?;
        let points = single_points(&subject.prepared.plan);
        if points.is_empty() {
            return Ok(Reply::Line("none: no thing alone can fail it".to_string()));
        }
        let mut rows: Vec<(Real, Vec<String>)> = points
            .iter()
            .map(|&number| {
                let chance = subject.valued.chances[number as usize];
                let name = model.leaf_name(&subject.prepared.system.leaves[number as usize]);
                let fails = chance_text(chance, Side::Fails, model.digits, subject.valued.bound);
                (chance.fails(), vec![name, fails])
            })
            .collect();
        rows.sort_by(|a, b| b.0.partial_cmp(&a.0).unwrap_or(std::cmp::Ordering::Equal));
        let rows = rows.into_iter().map(|(_, r)| r).collect();
        Ok(Reply::Table { head: vec!["single point".to_string(), "F".to_string()], rows, foot: None })
    }

    /// The things of a system by importance, as a table.
    ///
    /// # Errors
    /// What prevents it.
    pub(crate) fn rank_table(&mut self, model: &mut Model<'_>, call: ExprId, args: List) -> Out<Reply> {
        const COLUMNS: [&str; 7] = ["Birnbaum", "criticality", "FV", "RAW", "RRW", "doubled", "made perfect"];
        let subject = self.subject(model, call, args, 1)?;
        let ranked = self.rank(model, subject.thing, &subject.prepared, &subject.valued, &subject.given)?;
        let system = &subject.prepared.system;
        let mut lines: Vec<(f64, ExprId, Vec<String>, Vec<String>)> = Vec::new();
        for (number, leaf) in system.leaves.iter().enumerate() {
            let Some(block) = subject.prepared.plan.of_leaf(number as u32) else { continue };
            let Some(found) = ranked.get(block.0 as usize).copied().flatten() else { continue };
            let weight = (found.birnbaum * found.own.fails()).to_f64();
            let mut cells = vec![chance_text(found.own, Side::Fails, model.digits, subject.valued.bound)];
            for word in COLUMNS {
                cells.push(match measure(word, &found, subject.valued.chance, subject.valued.bound) {
                    Number::Figure(q) => figure_text(model, &q, None).unwrap_or_default(),
                    Number::Infinite => "infinite".to_string(),
                    _ => "none".to_string(),
                });
            }
            lines.push((weight, leaf.template, vec![model.leaf_name(leaf)], cells));
        }
        if lines.is_empty() {
            return Ok(Reply::Line("none: nothing in it can fail".to_string()));
        }
        // Highest first; like copies with like values become one row.
        lines.sort_by(|a, b| b.0.total_cmp(&a.0));
        let mut rows: Vec<(ExprId, Vec<String>, Vec<String>)> = Vec::new();
        let mut at: rustc_hash::FxHashMap<(ExprId, Vec<String>), usize> = rustc_hash::FxHashMap::default();
        for (_, template, name, cells) in lines {
            match at.get(&(template, cells.clone())) {
                Some(&row) => rows[row].1.extend(name),
                None => {
                    at.insert((template, cells.clone()), rows.len());
                    rows.push((template, name, cells));
                }
            }
        }
        let mut head = vec!["thing".to_string(), "F".to_string()];
        head.extend(COLUMNS.iter().map(|c| (*c).to_string()));
        let mut rows: Vec<Vec<String>> = rows
            .into_iter()
            .map(|(_, names, cells)| std::iter::once(folded(&names)).chain(cells).collect())
            .collect();
        // What each column is, since other definitions are in use too.
        const DEFINED: [&str; 9] = [
            "definition",
            "q",
            "B",
            "B·q/F",
            "P(a cut set with it)/F",
            "F(failed)/F",
            "F/F(perfect)",
            "B·q·(1 - q)",
            "B·q",
        ];
        rows.push(DEFINED.iter().map(|d| (*d).to_string()).collect());
        Ok(Reply::Table { head, rows, foot: None })
    }

    fn inputs(&mut self, model: &mut Model<'_>, thing: ExprId) -> Out<Reply> {
        let prepared = self.prepare(model, thing)?;
        let mut rows: Vec<(u32, Vec<String>)> = Vec::new();
        let mut at: rustc_hash::FxHashMap<u32, usize> = rustc_hash::FxHashMap::default();
        for (name, item) in model.things_under(prepared.asked) {
            match at.get(&item) {
                Some(&row) => rows[row].1.push(name),
                None => {
                    at.insert(item, rows.len());
                    rows.push((item, vec![name]));
                }
            }
        }
        for leaf in &prepared.system.leaves {
            if let Entry::Vacant(free) = at.entry(leaf.item) {
                free.insert(rows.len());
                rows.push((leaf.item, vec![model.leaf_name(leaf)]));
            }
        }
        let rows = rows
            .into_iter()
            .map(|(item, names)| {
                let item = model.item(item);
                let data = if item.clauses.is_empty() {
                    item.fixed.map_or(String::new(), |(c, _)| super::plain(c.works()))
                } else {
                    let own = item.clauses.iter().filter(|c| c.word != words::ClauseWord::Source);
                    own.map(|c| clause_text(model, c)).collect::<Vec<_>>().join(", ")
                };
                let source = item
                    .source
                    .map_or("no source given".to_string(), |s| model.tree.names.text(s).to_string());
                vec![folded(&names), data, source]
            })
            .collect();
        let head = ["thing", "data", "source"].map(str::to_string).to_vec();
        Ok(Reply::Table { head, rows, foot: None })
    }
}

fn probability_text(model: &Model<'_>, value: Real, which: Which, subject: &Subject, set: &[u32]) -> String {
    let bound = subject.valued.bound + set.len() as f64 * STEP;
    // A path set's chance is near 1 and counts its digits on the other side.
    let side = if which == Which::Cuts { Side::Fails } else { Side::Works };
    let chance = match which {
        Which::Paths => set.iter().fold(Chance::PERFECT, |c, l| c.and(subject.valued.chances[*l as usize])),
        Which::Cuts => Chance::new(Real::ONE - value, value),
    };
    if value.is_zero() {
        return format_number(value, model.digits, bound).unwrap_or_else(|| "0".to_string());
    }
    chance_text(chance, side, model.digits, bound)
}

fn clause_text(model: &Model<'_>, clause: &Clause) -> String {
    model.sources.text(clause.span).split_whitespace().collect::<Vec<_>>().join(" ")
}

/// The defaults that act on a system under an exposure.
pub fn assumptions(model: &Model<'_>, system: &crate::system::System, exposure: &Exposure) -> Vec<String> {
    let mut lines = Vec::new();
    let mut groups: Vec<String> = Vec::new();
    for number in 0..system.structure.len() as u32 {
        let node = NodeId(number);
        if let Node::AtLeast { need, .. } = system.structure.node(node)
            && (need as usize) < system.structure.members(node).len()
        {
            let name = node_name(model, system, node).unwrap_or_else(|| {
                system
                    .places
                    .get(number as usize)
                    .copied()
                    .flatten()
                    .map_or(String::new(), |e| model.text_of(e))
            });
            if !groups.contains(&name) {
                groups.push(name);
            }
        }
    }
    if !groups.is_empty() {
        lines.push(format!("no common cause in the redundant groups: {}", listed(&groups)));
    }
    lines.push("things fail independently of each other".to_string());
    let names_where = |wanted: &dyn Fn(&crate::system::Item) -> bool| {
        // In the order of the structure, which does not depend on where a definition stands.
        let leaves = system.leaves.iter().filter(|leaf| wanted(model.item(leaf.item)));
        listed(&leaves.map(|leaf| model.leaf_name(leaf)).collect::<Vec<_>>())
    };
    let mut say = |names: String, what: &str| {
        if !names.is_empty() {
            lines.push(format!("{what}: {names}"));
        }
    };
    let each = |item: &Item| item.ageing.iter().any(|a| matches!(a.pace, Pace::Each(_)));
    let rates = |item: &Item| item.ageing.iter().any(|a| !matches!(a.pace, Pace::Each(_)));
    say(names_where(&rates), "constant failure rates, all new at the start, nothing repaired meanwhile");
    say(names_where(&each), "the same chance at each occurrence, whatever went before");
    let how = if exposure.asked { "whatever the exposure asked" } else { "for one mission" };
    say(names_where(&|item| item.fixed.is_some()), &format!("probabilities taken as given, {how}"));
    let runs = |item: &Item| {
        let timed = |a: &crate::system::Ageing| a.base == Base::Time && !matches!(a.pace, Pace::Each(_));
        item.duty.is_none() && item.ageing.iter().any(timed)
    };
    say(names_where(&runs), "running all of the time (duty 100%)");
    lines
}
