//! From a plan and its data to steps: each step's result is what its formula
//! evaluates to.

use super::formula::{Formula, Side};
use super::list::{Outcome, Rule, Step, StepList};
use crate::engine::diagram;
use crate::engine::plan::{Block, BlockId, Plan, Stands};
use crate::language::words::ClauseWord;
use crate::language::{Expr, ExprId, Suffix};
use crate::number::{Chance, Real};
use crate::source::Span;
use crate::system::{Base, Exposure, Item, Model, Node, NodeId, Pace, Part, Quantity, System};
use rustc_hash::{FxHashMap, FxHashSet};

/// Members of an unlike k of n whose states are written out one by one.
const WRITTEN_OUT: usize = 4;
/// Members of a like k of n whose binomial terms are written out.
const BINOMIAL: usize = 12;

/// The most characters of a name that is a piece of the note's text.
const NAME: usize = 48;

/// What a block comes to among the steps.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
enum Operand {
    Step(usize),
    Works,
    Fails,
}

/// Writes the steps of one system.
struct Writer<'w, 'a> {
    model: &'w Model<'a>,
    system: &'w System,
    plan: &'w Plan,
    exposure: &'w Exposure,
    list: StepList,
    results: Vec<Chance>,
    blocks: Vec<Option<Operand>>,
    /// The number of the exposure in the ledger.
    under: usize,
    /// Blocks of things that stand in several places: each has a step of its
    /// own, since the steps on its two states name it alone.
    own: FxHashSet<BlockId>,
    /// Nodes that a network was reduced to, below its topmost.
    inner: FxHashSet<NodeId>,
}

/// Adds the steps of a system to `list`; gives what each main block comes to.
pub fn write(
    model: &Model<'_>,
    system: &System,
    plan: &Plan,
    exposure: &Exposure,
    mut list: StepList,
) -> (StepList, Written) {
    let results = list.results();
    let exposures = &mut list.ledger.exposures;
    let under = exposures.iter().position(|e| alike(e, &exposure.parts)).unwrap_or_else(|| {
        exposures.push(exposure.parts.clone());
        exposures.len() - 1
    });
    list.ledger.systems += 1;
    // Figures among the steps have no names of their own.
    let steps = &list.steps;
    let named = list.ledger.names.len();
    list.ledger.names.extend(steps.iter().skip(named).map(|s| vec![s.thing.clone()]));
    let mut writer = Writer {
        model,
        system,
        plan,
        exposure,
        list,
        results,
        blocks: vec![None; plan.len()],
        under,
        own: plan.shared().into_iter().collect(),
        inner: inner_nodes(model, system),
    };
    for id in plan.blocks() {
        if !plan.is_case(id) {
            let operand = writer.main_block(id);
            writer.blocks[id.0 as usize] = Some(operand);
        }
    }
    writer.finish_names();
    (writer.list, Written { blocks: writer.blocks })
}

/// Whether two exposures are the same, wherever they are written.
fn alike(a: &[Part], b: &[Part]) -> bool {
    let what = |p: &Part| (p.name, p.base, p.amount.clone(), p.stress.clone());
    a.len() == b.len() && a.iter().zip(b).all(|(a, b)| what(a) == what(b))
}

/// What the blocks of a system came to among the steps.
#[derive(Clone, Debug)]
pub struct Written {
    blocks: Vec<Option<Operand>>,
}

impl Written {
    /// The last step of a main block, or whether it works for certain.
    pub fn of(&self, block: BlockId) -> Result<usize, bool> {
        match self.blocks.get(block.0 as usize).copied().flatten() {
            Some(Operand::Step(step)) => Ok(step),
            Some(Operand::Works) => Err(true),
            Some(Operand::Fails) | None => Err(false),
        }
    }
}

impl Writer<'_, '_> {
    fn operand(&self, id: BlockId) -> Operand {
        self.blocks[id.0 as usize].unwrap_or(Operand::Fails)
    }

    fn main_block(&mut self, id: BlockId) -> Operand {
        match self.plan.block(id) {
            Block::Works => Operand::Works,
            Block::Fails => Operand::Fails,
            Block::Leaf(leaf) => Operand::Step(self.leaf(leaf, self.own.contains(&id))),
            Block::Independent { need, .. } => {
                let members: Vec<Operand> = self.plan.members(id).iter().map(|m| self.operand(*m)).collect();
                let (name, place) = self.about(id);
                let case = if self.own.contains(&id) { format!("own {name} ") } else { String::new() };
                self.vote(need as usize, &members, name, place, &case)
            }
            Block::Conditioned { .. } => {
                let (name, place) = self.about(id);
                self.case(id, &name, place, &mut Vec::new())
            }
            Block::Diagram => self.diagram(id),
            Block::Network => self.network(id),
        }
    }

    /// The name and the place of what a block stands for.
    fn about(&self, id: BlockId) -> (String, Option<Span>) {
        match self.plan.stands(id) {
            Stands::Node(node) | Stands::Given(node) => (self.node_name(node), self.node_place(node)),
            Stands::Part(node) => {
                let members = self.plan.group(id).map_or(&[][..], |g| &g.members);
                let names: Vec<String> = members.iter().map(|m| self.node_name(*m)).collect();
                (format!("in {}: {}", self.node_name(node), names.join(", ")), self.node_place(node))
            }
        }
    }

    /// The name of a node; where a part of it is taken for granted, with that.
    fn node_name(&self, node: NodeId) -> String {
        let name = self.own_name(node);
        match self.system.given(node) {
            Some(given) => format!("{name}, given {given}"),
            None => name,
        }
    }

    fn own_name(&self, node: NodeId) -> String {
        if let Some(name) = self.model.node_name(self.system, node) {
            return name;
        }
        if let Node::Leaf(leaf) = self.system.structure.node(node) {
            return self.model.leaf_name(&self.system.leaves[leaf as usize]);
        }
        if self.inner.contains(&node) {
            return self.spelled(node);
        }
        let text = match self.system.places.get(node.0 as usize).copied().flatten() {
            Some(expr) => self.model.start_of_text(expr, 4 * NAME),
            None => "the whole".to_string(),
        };
        shortened(&text)
    }

    /// A name from the members of a node that a network was reduced to.
    fn spelled(&self, node: NodeId) -> String {
        let members = self.system.structure.members(node);
        let named = members.iter().map(|m| {
            let nested = self.inner.contains(m) && self.system.structure.members(*m).len() > 1;
            (self.node_name(*m), nested)
        });
        match self.system.structure.node(node) {
            Node::AtLeast { need, .. } => joined(need as usize, members.len(), named),
            _ => shortened(&format!("network of {}", row(named.map(|(name, _)| name), ", "))),
        }
    }

    /// The same for a block of a network under conditions; recursion is as
    /// deep as the cases and the text allow.
    fn spelled_block(&self, id: BlockId) -> String {
        let members = self.plan.members(id);
        let named = members.iter().map(|&m| match self.plan.block(m) {
            Block::Independent { .. } if self.plan.is_case(m) => (self.spelled_block(m), true),
            _ => (self.about(m).0, false),
        });
        match self.plan.block(id) {
            Block::Independent { need, .. } => joined(need as usize, members.len(), named),
            _ => self.about(id).0,
        }
    }

    fn node_place(&self, node: NodeId) -> Option<Span> {
        let expr = self.system.places.get(node.0 as usize).copied().flatten()?;
        Some(self.model.tree.span(expr))
    }

    /// Adds a step, or finds the one that computes the same for a like thing.
    fn add(
        &mut self,
        key: String,
        name: String,
        place: Option<Span>,
        rule: Rule,
        tails: (Formula, Formula),
        shown: Side,
    ) -> usize {
        let ledger = &mut self.list.ledger;
        if let Some(&step) = ledger.known.get(&key) {
            if ledger.named.insert((step, name.clone())) {
                ledger.names[step].push(name);
            }
            return step;
        }
        let (works, fails) = tails;
        let chance = Chance::new(works.evaluate(&self.results).0, fails.evaluate(&self.results).0);
        self.results.push(chance);
        let step = self.list.steps.len();
        let ledger = &mut self.list.ledger;
        ledger.names.push(vec![name.clone()]);
        ledger.named.insert((step, name.clone()));
        ledger.known.insert(key, step);
        self.list.steps.push(Step {
            symbol: name.clone(),
            thing: name,
            place,
            rule,
            works,
            fails,
            shown,
            outcome: Outcome::Chance(chance),
        });
        step
    }

    fn finish_names(&mut self) {
        for (step, names) in self.list.steps.iter_mut().zip(&self.list.ledger.names) {
            if let Outcome::Chance(_) = step.outcome {
                (step.thing, step.symbol) = super::names::head_and_symbol(names);
            }
        }
    }

    fn leaf(&mut self, number: u32, own: bool) -> usize {
        let leaf = self.system.leaves[number as usize];
        let item = self.model.item(leaf.item);
        let name = self.model.leaf_name(&leaf);
        let place = self.model.tree.span(leaf.template);
        let (rule, tails, shown) = self.item_formula(item);
        // Copies of one template have the same data; so do items on one right side.
        let under = self.under;
        // What has a step of its own from another system of the list is not stated twice.
        let alone = format!("{under} thing {name}");
        let own = own || self.list.ledger.known.contains_key(&alone);
        let key = if own { alone } else { format!("{under} item {}", leaf.item) };
        self.add(key, name, Some(place), rule, tails, shown)
    }

    fn item_formula(&self, item: &Item) -> (Rule, (Formula, Formula), Side) {
        let mut factors = Vec::new();
        let mut shown = Side::Works;
        if let Some((chance, clause)) = item.fixed {
            let fails = clause.is_some_and(|c| c.word == ClauseWord::Fails);
            let (symbol, value, complement) = if fails {
                ("q", chance.fails(), chance.works())
            } else {
                ("p", chance.works(), chance.fails())
            };
            let literal = clause.and_then(|c| self.literal(c.value?));
            let datum = Formula::Datum {
                symbol: symbol.to_string(),
                value,
                complement: Some(complement),
                text: literal.clone().unwrap_or_else(|| plain(value)),
                written: match literal {
                    Some(_) => None,
                    None => clause.and_then(|c| self.as_written(c.value?, &plain(value))),
                },
            };
            if item.ageing.is_empty() {
                let other = datum.clone().one_minus();
                let tails = if fails { (other, datum) } else { (datum, other) };
                return (Rule::Given, tails, if fails { Side::Fails } else { Side::Works });
            }
            factors.push(if fails { datum.one_minus() } else { datum });
        }
        let mut hazards = Vec::new();
        for ageing in &item.ageing {
            let amount = self.amount(item, ageing.base);
            match &ageing.pace {
                Pace::Rate(rate) => {
                    let mut product = vec![self.datum("λ", rate, ageing.clause.value)];
                    product.extend(amount);
                    hazards.push(Formula::product(product));
                }
                Pace::Mean(mean) => hazards.push(Formula::Quotient(
                    Box::new(Formula::product(amount)),
                    Box::new(self.datum("θ", mean, ageing.clause.value)),
                )),
                Pace::Each(each) => {
                    let q = Formula::Datum {
                        symbol: "q".to_string(),
                        value: each.fails(),
                        complement: Some(each.works()),
                        text: plain(each.fails()),
                        written: ageing.clause.value.and_then(|v| self.as_written(v, &plain(each.fails()))),
                    };
                    factors.push(Formula::Power(Box::new(q.one_minus()), Box::new(Formula::product(amount))));
                }
                Pace::Over(each, over) => {
                    let p = Formula::Datum {
                        symbol: "p".to_string(),
                        value: each.works(),
                        complement: Some(each.fails()),
                        text: plain(each.works()),
                        written: match ageing.clause.word {
                            // Written from the failing side, it is no other spelling of p.
                            ClauseWord::Fails => None,
                            _ => ageing.clause.value.and_then(|v| self.as_written(v, &plain(each.works()))),
                        },
                    };
                    let ratio = Formula::Quotient(
                        Box::new(Formula::product(amount)),
                        Box::new(self.datum("T", over, ageing.clause.over)),
                    );
                    factors.push(Formula::Power(Box::new(p), Box::new(ratio)));
                }
            }
        }
        if !hazards.is_empty() {
            factors.push(Formula::ExpMinus(Box::new(Formula::sum(hazards))));
            shown = if item.fixed.is_none() && factors.len() == 1 { Side::Fails } else { Side::Works };
        }
        let rule = match item.ageing.as_slice() {
            [only] if item.fixed.is_none() => {
                if matches!(only.pace, Pace::Each(_)) {
                    Rule::Occurrences
                } else {
                    Rule::Exposure
                }
            }
            _ => Rule::Ways,
        };
        let works = Formula::product(factors);
        let fails = works.clone().one_minus();
        (rule, (works, fails), shown)
    }

    fn datum(&self, symbol: &str, figure: &Quantity, from: Option<ExprId>) -> Formula {
        let unit = self.model.units.symbol(&figure.dim, &self.model.tree.names);
        let number = plain(figure.value);
        let text = if unit.is_empty() { number } else { format!("{number} {unit}") };
        let written = from.and_then(|from| self.as_written(from, &text));
        Formula::Datum { symbol: symbol.to_string(), value: figure.value, complement: None, text, written }
    }

    /// How the note has a value, where that differs from how the formula shows it.
    fn as_written(&self, from: ExprId, shown: &str) -> Option<String> {
        let text = shortened(&self.model.start_of_text(from, 4 * NAME));
        let same = text == shown || text.strip_suffix(')').and_then(|t| t.strip_prefix('(')) == Some(shown);
        (!same).then_some(text)
    }

    /// A number without a unit as the note has it, in the notation of formulas.
    fn literal(&self, from: ExprId) -> Option<String> {
        let Expr::Literal(number) = self.model.tree.expr(self.model.tree.inside_groups(from)) else {
            return None;
        };
        let literal = self.model.tree.literals[number as usize];
        let text = self.model.sources.text(literal.number);
        match literal.suffix {
            Suffix::None => Some(text.to_string()),
            Suffix::Percent => Some(format!("{text}%")),
            Suffix::In(among) => Some(format!("{text}/{}", self.model.sources.text(among))),
            Suffix::Unit(_) => None,
        }
    }

    /// The exposure that an item bears, as factors.
    fn amount(&self, item: &Item, base: Base) -> Vec<Formula> {
        let mut factors = Vec::new();
        if let Some(duty) = &item.duty {
            factors.push(self.datum("duty", duty, self.clause_value(item, ClauseWord::Duty)));
        }
        if let Some(stress) = &item.stress {
            factors.push(self.datum("stress", stress, self.clause_value(item, ClauseWord::Stress)));
        }
        let parts: Vec<Formula> = self.exposure.of(base).map(|part| self.phase(part, base)).collect();
        factors.push(Formula::sum(parts));
        factors
    }

    fn clause_value(&self, item: &Item, word: ClauseWord) -> Option<ExprId> {
        item.clauses.iter().find(|c| c.word == word).and_then(|c| c.value)
    }

    fn phase(&self, part: &Part, base: Base) -> Formula {
        let names = &self.model.tree.names;
        let symbol = match (part.name, base) {
            (Some(name), _) => format!("t({})", names.text(name)),
            (None, Base::Word(word)) => format!("n({})", names.text(word)),
            (None, _) => "t".to_string(),
        };
        let amount = self.datum(&symbol, &part.amount, Some(part.written));
        match &part.stress {
            Some(stress) => {
                let name = part.name.map_or("stress".to_string(), |n| format!("stress({})", names.text(n)));
                Formula::Product(vec![self.datum(&name, stress, None), amount])
            }
            None => amount,
        }
    }

    /// At least `need` of members that share nothing.
    fn vote(
        &mut self,
        need: usize,
        members: &[Operand],
        name: String,
        place: Option<Span>,
        case: &str,
    ) -> Operand {
        let fixed = members.iter().filter(|m| **m == Operand::Works).count();
        let steps: Vec<usize> = members
            .iter()
            .filter_map(|m| match m {
                Operand::Step(step) => Some(*step),
                _ => None,
            })
            .collect();
        let need = need.saturating_sub(fixed);
        if need == 0 {
            return Operand::Works;
        }
        if need > steps.len() {
            return Operand::Fails;
        }
        if let [only] = steps.as_slice() {
            return Operand::Step(*only);
        }
        let mut sorted = steps.clone();
        sorted.sort_unstable();
        let key = format!("{case}{need} of {sorted:?}");
        let (rule, tails, shown) = vote_formula(need, &steps);
        Operand::Step(self.add(key, name, place, rule, tails, shown))
    }

    /// A block of a group under conditions; recursion is as deep as there are
    /// cases, which the planner bounds.
    fn case(&mut self, id: BlockId, base: &str, place: Option<Span>, given: &mut Vec<String>) -> Operand {
        if self.plan.is_case(id) || given.is_empty() {
            match self.plan.block(id) {
                Block::Conditioned { on, works, failed } => {
                    return self.conditioned(id, on, works, failed, base, place, given);
                }
                Block::Independent { need, .. } => {
                    let members: Vec<BlockId> = self.plan.members(id).to_vec();
                    let operands: Vec<Operand> =
                        members.into_iter().map(|m| self.case(m, base, place, given)).collect();
                    let (mut own, own_place) = self.about(id);
                    if let Stands::Given(node) = self.plan.stands(id)
                        && matches!(self.system.structure.node(node), Node::Network { .. })
                    {
                        own = self.spelled_block(id);
                    }
                    let condition = given.join(", ");
                    let name = format!("{own}, given {condition}");
                    return self.vote(
                        need as usize,
                        &operands,
                        name,
                        own_place,
                        &format!("case {condition} "),
                    );
                }
                Block::Works => return Operand::Works,
                Block::Fails => return Operand::Fails,
                Block::Leaf(_) | Block::Diagram | Block::Network => {}
            }
        }
        self.operand(id)
    }

    #[expect(clippy::too_many_arguments, reason = "one call site; the parts of one conditioned block")]
    fn conditioned(
        &mut self,
        id: BlockId,
        on: BlockId,
        works: BlockId,
        failed: BlockId,
        base: &str,
        place: Option<Span>,
        given: &mut Vec<String>,
    ) -> Operand {
        let (on_name, on_place) = self.about(on);
        // What is conditioned on may itself rest on an earlier condition: then it is a
        // block of this case, with a step of its own under the conditions so far.
        let condition =
            if self.plan.is_case(on) { self.case(on, &on_name, on_place, given) } else { self.operand(on) };
        given.push(format!("{on_name} works"));
        let up = self.case(works, base, place, given);
        given.pop();
        given.push(format!("{on_name} has failed"));
        let down = self.case(failed, base, place, given);
        given.pop();
        let Operand::Step(condition) = condition else {
            return if condition == Operand::Works { up } else { down };
        };
        if up == down {
            return up;
        }
        let tails = (total(condition, up, down, Side::Works), total(condition, up, down, Side::Fails));
        let shown = if self.smaller_is_failure(&tails) { Side::Fails } else { Side::Works };
        let own = if given.is_empty() {
            base.to_string()
        } else {
            format!("{}, given {}", self.about(id).0, given.join(", "))
        };
        Operand::Step(self.add(
            format!("on {condition}: {up:?} {down:?}"),
            own,
            place,
            Rule::TotalProbability,
            tails,
            shown,
        ))
    }

    fn smaller_is_failure(&self, tails: &(Formula, Formula)) -> bool {
        tails.1.evaluate(&self.results).0 < tails.0.evaluate(&self.results).0
    }

    /// One step for a network whose states are too many to be shown.
    fn network(&mut self, id: BlockId) -> Operand {
        let (name, place) = self.about(id);
        let Some(group) = self.plan.group(id) else { return Operand::Fails };
        let Some(network) = group.network.clone() else { return Operand::Fails };
        let mut members = Vec::with_capacity(group.frontier.len());
        for part in &group.frontier {
            // What cannot fail, or cannot work, stands at no stop of a network.
            let Operand::Step(step) = self.operand(*part) else { return Operand::Fails };
            members.push(step);
        }
        self.list.remarks.push(format!(
            "{name} has too many states to be written out: the frontier method sums them in one step"
        ));
        let of = |side| Formula::Network(network.clone(), members.clone(), side);
        let tails = (of(Side::Works), of(Side::Fails));
        let shown = if self.smaller_is_failure(&tails) { Side::Fails } else { Side::Works };
        Operand::Step(self.add(
            format!("{} network {}", self.list.ledger.systems, id.0),
            name,
            place,
            Rule::Network,
            tails,
            shown,
        ))
    }

    /// One step for each node of a diagram, from the ends up.
    fn diagram(&mut self, id: BlockId) -> Operand {
        let (name, place) = self.about(id);
        let Some(group) = self.plan.group(id) else { return Operand::Fails };
        let frontier: Vec<Operand> = group.frontier.iter().map(|b| self.operand(*b)).collect();
        let variables: Vec<String> = group.frontier.iter().map(|b| self.about(*b).0).collect();
        let Ok(found) = group.diagram() else { return Operand::Fails };
        let branches: Vec<diagram::Branch> = found.nodes().to_vec();
        let root = found.root() as usize;
        let mut done: Vec<Operand> = Vec::with_capacity(branches.len());
        let count = branches.len().saturating_sub(2);
        let (rule, remark) = if group.network.is_some() {
            let what = format!(
                "needs more than a few cases: its steps are the {count} states of the frontier method"
            );
            (Rule::NetworkState, what)
        } else {
            let what = "shares too much to be written in a few cases";
            (Rule::DiagramNode, format!("{what}: its steps are the {count} nodes of a decision diagram"))
        };
        self.list.remarks.push(format!("{name} {remark}"));
        for (at, branch) in branches.iter().enumerate() {
            let operand = match at as u32 {
                diagram::FAILS => Operand::Fails,
                diagram::WORKS => Operand::Works,
                _ => {
                    let (up, down) = (done[branch.works as usize], done[branch.fails as usize]);
                    match frontier[branch.variable as usize] {
                        Operand::Works => up,
                        Operand::Fails => down,
                        Operand::Step(on) => {
                            let tails = (total(on, up, down, Side::Works), total(on, up, down, Side::Fails));
                            let own = if at == root {
                                name.clone()
                            } else {
                                format!("{name}, node {} on {}", at - 1, variables[branch.variable as usize])
                            };
                            let shown =
                                if self.smaller_is_failure(&tails) { Side::Fails } else { Side::Works };
                            let key = format!("{} node {} {at}", self.list.ledger.systems, id.0);
                            Operand::Step(self.add(key, own, place, rule, tails, shown))
                        }
                    }
                }
            };
            done.push(operand);
        }
        done.get(root).copied().unwrap_or(Operand::Fails)
    }
}

/// Names joined by how many of them must work.
fn joined(need: usize, count: usize, named: impl Iterator<Item = (String, bool)>) -> String {
    let named = named.map(|(name, nested)| if nested { format!("({name})") } else { name });
    if need == count {
        shortened(&row(named, " -> "))
    } else if need == 1 {
        shortened(&row(named, " // "))
    } else {
        shortened(&format!("{need} of ({})", row(named, ", ")))
    }
}

/// As many of the names as a name has room for.
fn row(names: impl Iterator<Item = String>, between: &str) -> String {
    let mut text = String::new();
    for name in names {
        if !text.is_empty() {
            text.push_str(between);
        }
        text.push_str(&name);
        if text.len() > 4 * NAME {
            break;
        }
    }
    text
}

/// Nodes that a network was reduced to and that stand below another such.
fn inner_nodes(model: &Model<'_>, system: &System) -> FxHashSet<NodeId> {
    let place = |node: NodeId| system.places.get(node.0 as usize).copied().flatten();
    let mut inner = FxHashSet::default();
    for node in (0..system.structure.len() as u32).map(NodeId) {
        let Some(expr) = place(node).filter(|expr| matches!(model.tree.expr(*expr), Expr::Routes(_))) else {
            continue;
        };
        inner.extend(system.structure.members(node).iter().copied().filter(|m| place(*m) == Some(expr)));
    }
    inner
}

/// R(x) · side(up) + F(x) · side(down), without the terms that are 0.
fn total(on: usize, up: Operand, down: Operand, side: Side) -> Formula {
    let certain = if side == Side::Works { Operand::Works } else { Operand::Fails };
    let mut terms = Vec::new();
    for (weight, case) in [(Side::Works, up), (Side::Fails, down)] {
        let weight = Formula::Step(on, weight);
        match case {
            Operand::Step(step) => terms.push(Formula::Product(vec![weight, Formula::Step(step, side)])),
            case if case == certain => terms.push(weight),
            _ => {}
        }
    }
    if terms.is_empty() { Formula::Whole(0) } else { Formula::sum(terms) }
}

fn vote_formula(need: usize, steps: &[usize]) -> (Rule, (Formula, Formula), Side) {
    let n = steps.len();
    if need == n {
        let works = powers(steps, Side::Works);
        let fails = works.clone().one_minus();
        return (Rule::Series, (works, fails), Side::Works);
    }
    if need == 1 {
        let fails = powers(steps, Side::Fails);
        let works = fails.clone().one_minus();
        return (Rule::Parallel, (works, fails), Side::Fails);
    }
    let alike = steps.iter().all(|s| *s == steps[0]);
    let shown = if n - need < need { Side::Works } else { Side::Fails };
    if alike && n <= BINOMIAL {
        let term = |j: usize| binomial_term(steps[0], n as u32, j as u32);
        let works = Formula::sum((need..=n).map(term).collect());
        let fails = Formula::sum((0..need).map(term).collect());
        return (Rule::LikeVote, (works, fails), shown);
    }
    if n <= WRITTEN_OUT {
        let states = |wanted: bool| {
            let terms = (0..1_u32 << n).rev().filter(|s| (s.count_ones() as usize >= need) == wanted);
            Formula::sum(terms.map(|s| state(steps, s)).collect())
        };
        return (Rule::UnlikeVote, (states(true), states(false)), shown);
    }
    let rule = if alike { Rule::LikeVote } else { Rule::UnlikeVote };
    let of = |side| Formula::AtLeast(need as u32, steps.to_vec(), side);
    (rule, (of(Side::Works), of(Side::Fails)), shown)
}

/// The probability of exactly this set of working members.
fn state(steps: &[usize], working: u32) -> Formula {
    let side = |i: usize| if working >> i & 1 == 1 { Side::Works } else { Side::Fails };
    Formula::product(steps.iter().enumerate().map(|(i, s)| Formula::Step(*s, side(i))).collect())
}

fn binomial_term(step: usize, n: u32, working: u32) -> Formula {
    let mut factors = Vec::new();
    if working > 0 && working < n {
        factors.push(Formula::Choose(n, working));
    }
    if working > 0 {
        factors.push(Formula::power(Formula::Step(step, Side::Works), working));
    }
    if working < n {
        factors.push(Formula::power(Formula::Step(step, Side::Fails), n - working));
    }
    Formula::product(factors)
}

/// The product of one side of all, equal ones as a power.
fn powers(steps: &[usize], side: Side) -> Formula {
    let mut counted: Vec<(usize, u32)> = Vec::new();
    let mut at: FxHashMap<usize, usize> = FxHashMap::default();
    for &step in steps {
        match at.get(&step) {
            Some(&i) => counted[i].1 += 1,
            None => {
                at.insert(step, counted.len());
                counted.push((step, 1));
            }
        }
    }
    Formula::product(counted.into_iter().map(|(s, n)| Formula::power(Formula::Step(s, side), n)).collect())
}

/// A value in as few digits as say it, at most 15.
pub(crate) fn plain(value: Real) -> String {
    const SLACK: f64 = 1e-28;
    let Some(digits) = crate::number::round_significant(value, 15, SLACK, crate::number::Rounding::Nearest)
    else {
        return "0".to_string();
    };
    let size = value.to_f64().abs();
    let text = if value.is_zero() {
        "0".to_string()
    } else if (1e-4..1e7).contains(&size) {
        digits.plain()
    } else {
        digits.scientific()
    };
    trimmed(&text)
}

/// Without zeros at the end of the decimals.
pub(super) fn trimmed(text: &str) -> String {
    let (mantissa, exponent) = text.split_once('e').map_or((text, None), |(m, e)| (m, Some(e)));
    let short =
        if mantissa.contains('.') { mantissa.trim_end_matches('0').trim_end_matches('.') } else { mantissa };
    match exponent {
        Some(e) => format!("{short}e{e}"),
        None => short.to_string(),
    }
}

fn shortened(text: &str) -> String {
    if text.chars().count() <= NAME {
        return text.to_string();
    }
    let start: String = text.chars().take(NAME - 1).collect();
    format!("{start}…")
}
