//! Chains: members joined by one operator, or by several that have no
//! precedence between them, with the readings that such a line may have.

use super::expr::Reader;
use super::tree::*;

/// An operator between the members of a level.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Chain {
    Series,
    Parallel,
    And,
    Or,
}

impl Chain {
    fn text(self) -> &'static str {
        match self {
            Chain::Series => "->",
            Chain::Parallel => "//",
            Chain::And => "and",
            Chain::Or => "or",
        }
    }
}

impl Reader<'_> {
    pub(super) fn chain(&mut self, items: &[ExprId], chain: &[Chain]) -> ExprId {
        let Some(&first) = chain.first() else { return items.first().copied().unwrap_or(ExprId(0)) };
        let bare = items.iter().any(|i| self.is_bare_of(*i));
        if !bare && chain.iter().all(|c| *c == first) {
            return self.join(first, items);
        }
        self.mixed(items, chain)
    }

    /// `2 of …` without parentheses around it.
    fn is_bare_of(&self, item: ExprId) -> bool {
        match self.tree.expr(item) {
            Expr::AtLeast(..) => true,
            Expr::Settled(of, _) => self.is_bare_of(of),
            _ => false,
        }
    }

    pub(super) fn join(&mut self, chain: Chain, items: &[ExprId]) -> ExprId {
        if let [only] = items {
            return *only;
        }
        let span = self.tree.span(items[0]).to(self.tree.span(items[items.len() - 1]));
        let list = self.tree.add_list(items);
        let expr = match chain {
            Chain::Series => Expr::Series(list),
            Chain::Parallel => Expr::Parallel(list),
            Chain::And => Expr::And(list),
            Chain::Or => Expr::Or(list),
        };
        self.tree.add(expr, span)
    }

    fn group(&mut self, expr: ExprId) -> ExprId {
        match self.tree.expr(expr) {
            Expr::Name(_) | Expr::Literal(_) | Expr::Group(_) | Expr::Call(..) => expr,
            _ => {
                let span = self.tree.span(expr);
                self.tree.add(Expr::Group(expr), span)
            }
        }
    }

    fn mixed(&mut self, items: &[ExprId], chain: &[Chain]) -> ExprId {
        let mut kinds: Vec<Chain> = Vec::new();
        for c in chain {
            if !kinds.contains(c) {
                kinds.push(*c);
            }
        }
        let bare: Vec<usize> = (0..items.len()).filter(|i| self.is_bare_of(items[*i])).collect();
        let mut operators: Vec<&'static str> = kinds.iter().map(|c| c.text()).collect();
        if !bare.is_empty() {
            operators.push("of");
        }
        let mut readings = Vec::new();
        match (kinds.as_slice(), bare.as_slice()) {
            (&[a, b], []) => {
                readings.push(self.binding_tighter(items, chain, a, b));
                readings.push(self.binding_tighter(items, chain, b, a));
            }
            (&[only], _) => {
                let grouped: Vec<ExprId> = items.iter().map(|i| self.group(*i)).collect();
                readings.push(self.join(only, &grouped));
                if let &[at] = bare.as_slice()
                    && let Some(wide) = self.reaching_on(only, items, at)
                {
                    readings.push(wide);
                }
            }
            _ => {}
        }
        let span = self.tree.span(items[0]).to(self.tree.span(items[items.len() - 1]));
        self.tree.mixed.push(Mixed { readings, operators });
        let id = self.tree.mixed.len() as u32 - 1;
        self.tree.add(Expr::Mixed(id), span)
    }

    fn binding_tighter(&mut self, items: &[ExprId], chain: &[Chain], tight: Chain, loose: Chain) -> ExprId {
        let mut outer = Vec::new();
        let mut inner = vec![items[0]];
        for (i, c) in chain.iter().enumerate() {
            if *c == loose {
                let joined = self.join(tight, &inner);
                outer.push(if inner.len() > 1 { self.group(joined) } else { joined });
                inner.clear();
            }
            inner.push(items[i + 1]);
        }
        let joined = self.join(tight, &inner);
        outer.push(if inner.len() > 1 { self.group(joined) } else { joined });
        self.join(loose, &outer)
    }

    /// `2 of 3 A -> B` read as `2 of 3 (A -> B)`.
    fn reaching_on(&mut self, chain: Chain, items: &[ExprId], at: usize) -> Option<ExprId> {
        let Expr::AtLeast(need, members) = self.tree.expr(items[at]) else { return None };
        let &[counted] = self.tree.list(members) else { return None };
        let Expr::Counted(count, of) = self.tree.expr(counted) else { return None };
        if at + 1 == items.len() {
            return None;
        }
        let mut inner = vec![of];
        inner.extend_from_slice(&items[at + 1..]);
        let joined = self.join(chain, &inner);
        let group = self.group(joined);
        let span = self.tree.span(items[at]).to(self.tree.span(group));
        let counted = self.tree.add(Expr::Counted(count, group), span);
        let members = self.tree.add_list(&[counted]);
        let wide = self.tree.add(Expr::AtLeast(need, members), span);
        if at == 0 {
            return Some(wide);
        }
        let mut outer = items[..at].to_vec();
        outer.push(self.group(wide));
        Some(self.join(chain, &outer))
    }
}
