//! Networks: ways to stops, each once, and what their reduction leaves.
//!
//! Stops of one name are one stop, also under another name for the same thing;
//! so are calls, and structures of names, that are written alike. Numbers, and
//! structures with numbers or counts in them, are stops of their own wherever
//! they stand, since each makes things of its own.

use super::{Ctx, NONE, Task, Visit};
use crate::language::{Expr, ExprId, Link, List, Need, Sym};
use crate::source::{Code, Problem};
use crate::system::model::{Fault, Model, Out};
use crate::system::network::{Network, Term};
use crate::system::structure::NodeId;
use rustc_hash::{FxHashMap, FxHashSet};

/// A network before its stops are built. The first two stops are `in` and `out`.
#[derive(Clone, Debug)]
pub(super) struct Ways {
    expr: ExprId,
    /// By stop, from the third on, where it was first written.
    stops: Vec<ExprId>,
    links: Vec<(u32, u32)>,
    ends: Vec<u32>,
    need: u32,
}

const IN: u32 = 0;
const OUT: u32 = 1;

#[derive(PartialEq, Eq, Hash)]
enum Key {
    Name(Sym),
    Text(String),
}

impl Model<'_> {
    /// Pushes the tasks that build a network, or the fault that prevents it.
    pub(super) fn push_routes(
        &mut self,
        visit: Visit,
        id: u32,
        tasks: &mut Vec<Task>,
        values: &mut Vec<Out<NodeId>>,
    ) {
        let ways = match self.ways(visit.expr, id, visit.ctx) {
            Ok(ways) => ways,
            Err(fault) => {
                values.push(Err(fault));
                return;
            }
        };
        let stops = ways.stops.clone();
        self.built.ways.push(ways);
        tasks.push(Task::Routes(self.built.ways.len() as u32 - 1));
        let ctx = visit.ctx;
        tasks.extend(
            stops
                .into_iter()
                .rev()
                .map(|expr| Task::Visit(Visit { expr, ctx, whole: false, failing: false, settles: NONE })),
        );
    }

    fn wrong_routes(&mut self, at: ExprId, message: String, mend: &str) -> Fault {
        let place = self.tree.span(at);
        self.fault(Problem::error(Code::WrongRoutes, place, message).mend(mend))
    }

    fn ways(&mut self, expr: ExprId, id: u32, ctx: Ctx) -> Out<Ways> {
        let tree = self.tree;
        let routes = &tree.routes[id as usize];
        let mut ways = Ways { expr, stops: Vec::new(), links: Vec::new(), ends: Vec::new(), need: 1 };
        let mut known: FxHashMap<Key, u32> = FxHashMap::default();
        let mut met = (false, false);
        let mut before: Option<(u32, Link)> = None;
        for (&stop, &link) in tree.list(routes.stops).iter().zip(&routes.links) {
            let at = match tree.expr(stop) {
                Expr::Terminal(true) => IN,
                Expr::Terminal(false) => OUT,
                _ => {
                    let next = ways.stops.len() as u32 + 2;
                    let at = match self.key(stop, ctx) {
                        Some(key) => *known.entry(key).or_insert(next),
                        None => next,
                    };
                    if at == next {
                        ways.stops.push(stop);
                    }
                    at
                }
            };
            met = (met.0 || at == IN, met.1 || at == OUT);
            match before {
                Some((from, kind)) => self.lead(&mut ways, (from, at), kind, stop)?,
                None if link == Link::End => {
                    let text = self.text_of(stop);
                    let message = format!("`{text}` alone is no way");
                    return Err(self.wrong_routes(stop, message, "write where it leads: `A -> B`"));
                }
                None => {}
            }
            before = (link != Link::End).then_some((at, link));
        }
        if !met.0 {
            let message = "no way begins at `in`".to_string();
            return Err(self.wrong_routes(expr, message, "begin at least one way with `in ->`"));
        }
        self.route_ends(&mut ways, routes.ends, (&known, met.1), ctx)?;
        Ok(ways)
    }

    /// What makes two stops one.
    fn key(&self, stop: ExprId, ctx: Ctx) -> Option<Key> {
        match self.tree.expr(stop) {
            Expr::Name(sym) if self.argument_index(sym, ctx).is_some() => Some(Key::Name(sym)),
            Expr::Name(sym) => Some(Key::Name(self.first_name(sym))),
            Expr::Call(..) | Expr::Group(_) if self.names_only(stop) => {
                let digits = |span| self.sources.text(span).to_string();
                Some(Key::Text(crate::language::print(self.tree, stop, &digits)))
            }
            _ => None,
        }
    }

    /// Whether an expression is made of names, and of what joins them.
    fn names_only(&self, expr: ExprId) -> bool {
        let mut stack = vec![expr];
        while let Some(at) = stack.pop() {
            match self.tree.expr(at) {
                Expr::Name(_) => {}
                Expr::Group(x) | Expr::FailsWhen(x) => stack.push(x),
                Expr::Series(l)
                | Expr::Parallel(l)
                | Expr::And(l)
                | Expr::Or(l)
                | Expr::AtLeast(_, l)
                | Expr::Call(_, l) => stack.extend(self.tree.list(l)),
                _ => return false,
            }
        }
        true
    }

    /// The name that other names of the same thing lead back to.
    fn first_name(&self, mut sym: Sym) -> Sym {
        // Circles have been reported; a chain longer than this is its own end.
        for _ in 0..1000 {
            let Some(value) = self.lookup(sym).and_then(|def| self.def(def).value) else { return sym };
            match self.tree.expr(self.tree.inside_groups(value)) {
                Expr::Name(other) => sym = other,
                _ => return sym,
            }
        }
        sym
    }

    fn lead(&mut self, ways: &mut Ways, (from, to): (u32, u32), kind: Link, at: ExprId) -> Out<()> {
        if from == to {
            let text = self.text_of(at);
            return Err(self.wrong_routes(
                at,
                format!("`{text}` leads to itself"),
                "name the stop that it leads to",
            ));
        }
        if kind == Link::Forth && to == IN {
            let message = "a way leads into `in`".to_string();
            return Err(self.wrong_routes(at, message, "every way begins at `in`: turn it round"));
        }
        if kind == Link::Forth && from == OUT {
            let message = "a way leads on from `out`".to_string();
            return Err(self.wrong_routes(at, message, "every way ends at `out`: turn it round"));
        }
        ways.links.push((from, to));
        if kind == Link::Both {
            ways.links.push((to, from));
        }
        Ok(())
    }

    fn route_ends(
        &mut self,
        ways: &mut Ways,
        ends: Option<(Need, List)>,
        (known, out): (&FxHashMap<Key, u32>, bool),
        ctx: Ctx,
    ) -> Out<()> {
        let Some((need, list)) = ends else {
            if out {
                ways.ends.push(OUT);
                return Ok(());
            }
            let mend = "end at least one way with `-> out`, or say which ends: `with ends all of (L1, L2)`";
            return Err(self.wrong_routes(ways.expr, "no way ends at `out`".to_string(), mend));
        };
        for &end in self.tree.list(list) {
            let at = match self.tree.expr(end) {
                Expr::Terminal(false) if out => Some(OUT),
                Expr::Terminal(_) => None,
                _ => self.key(end, ctx).and_then(|key| known.get(&key).copied()),
            };
            let text = self.text_of(end);
            match at {
                None => {
                    let message = format!("`{text}` is no stop that can be an end here");
                    return Err(self.wrong_routes(end, message, "name a stop that stands in the ways"));
                }
                Some(at) if ways.ends.contains(&at) => {
                    let message = format!("the end `{text}` is listed twice");
                    return Err(self.wrong_routes(end, message, "list each end once"));
                }
                Some(at) => ways.ends.push(at),
            }
        }
        if out && !ways.ends.contains(&OUT) {
            let message = "`out` stands in the ways and is not among the ends".to_string();
            return Err(self.wrong_routes(
                ways.expr,
                message,
                "list it with the other ends, or leave it out",
            ));
        }
        let n = ways.ends.len() as u32;
        ways.need = match need {
            Need::All => n,
            Need::Any => 1,
            Need::Count(k) => {
                let count = self.count(k, ctx)?;
                if count > n {
                    let place = self.tree.span(k);
                    let problem =
                        Problem::error(Code::ImpossibleCount, place, format!("{count} of {n} cannot be"));
                    return Err(self.fault(problem.mend(format!("need at most {n}, or list more"))));
                }
                count
            }
        };
        Ok(())
    }

    /// The node of a network whose stops are built; they are taken off `values`.
    pub(super) fn network(&mut self, number: u32, values: &mut Vec<Out<NodeId>>) -> Out<NodeId> {
        let ways = &self.built.ways[number as usize].clone();
        let members = values.split_off(values.len().saturating_sub(ways.stops.len()));
        let members = members.into_iter().collect::<Out<Vec<NodeId>>>()?;
        let stops = [None, None].into_iter().chain(members.iter().map(|m| Some(m.0)));
        let mut network = Network {
            stops: stops.collect(),
            links: ways.links.clone(),
            start: IN,
            ends: ways.ends.clone(),
            need: ways.need,
        };
        let Some(node) = self.built.structure.network(&network) else {
            // What was made on the way belongs to nothing.
            self.note_origin(ways.expr);
            return Err(self.no_way(ways));
        };
        self.note_origin(ways.expr);
        if self.built.judged.insert(ways.expr) {
            network.stops = (0..network.stops.len() as u32).map(|s| (s > OUT).then_some(s)).collect();
            self.remark_on_stops(ways, &network);
        }
        Ok(node)
    }

    fn no_way(&mut self, ways: &Ways) -> Fault {
        let message = match ways.ends[..] {
            [OUT] => "no way leads from `in` to `out`".to_string(),
            _ => format!("no ways lead from `in` to {} of its {} ends", ways.need, ways.ends.len()),
        };
        self.wrong_routes(
            ways.expr,
            message,
            "add the way that is missing; `->` leads one way, `<->` both ways",
        )
    }

    /// Names the stops that lie on no way, or on none that is needed.
    fn remark_on_stops(&mut self, ways: &Ways, network: &Network) {
        const NAMED: usize = 8;
        let used: FxHashSet<u32> = (network.reduce().terms.iter())
            .filter_map(|term| if let Term::Thing(stop) = term { Some(*stop) } else { None })
            .collect();
        let reached = walk(network.stops.len(), &network.links, &[IN]);
        let back: Vec<(u32, u32)> = network.links.iter().map(|&(a, b)| (b, a)).collect();
        let reaching = walk(network.stops.len(), &back, &network.ends);
        let (mut off, mut idle) = (Vec::new(), Vec::new());
        for (stop, &expr) in (2u32..).zip(&ways.stops).filter(|(stop, _)| !used.contains(stop)) {
            let on = reached[stop as usize] && reaching[stop as usize];
            if on { &mut idle } else { &mut off }.push(expr);
        }
        let all = [(off, "on no way from `in` to an end"), (idle, "on no way that is needed")];
        for (list, what) in all.iter().filter(|(list, _)| !list.is_empty()) {
            let names: Vec<String> =
                list.iter().take(NAMED).map(|&e| format!("`{}`", self.text_of(e))).collect();
            let more = match list.len().saturating_sub(NAMED) {
                0 => String::new(),
                more => format!(" and {more} more"),
            };
            let verb = if list.len() == 1 { "lies" } else { "lie" };
            let message = format!("{}{more} {verb} {what}", names.join(", "));
            let place = self.tree.span(list[0]);
            let mend = "see whether a link is missing or leads the wrong way";
            self.problems.push(Problem::remark(Code::WrongRoutes, place, message).mend(mend));
        }
    }
}

fn walk(stops: usize, links: &[(u32, u32)], from: &[u32]) -> Vec<bool> {
    let mut out: Vec<Vec<u32>> = vec![Vec::new(); stops];
    for &(a, b) in links {
        out[a as usize].push(b);
    }
    let mut seen = vec![false; stops];
    let mut stack = from.to_vec();
    while let Some(at) = stack.pop() {
        if !std::mem::replace(&mut seen[at as usize], true) {
            stack.extend(&out[at as usize]);
        }
    }
    seen
}
