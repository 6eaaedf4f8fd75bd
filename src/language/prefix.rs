//! `use "p.xlsx" as P`: the names of another file, with a word before them.

use super::tree::*;
use super::words::ClauseWord;
use rustc_hash::{FxHashMap, FxHashSet};

impl Tree {
    /// Puts `prefix` and a point before each name that the statements from
    /// `first` on define, there and where they use it: within a file, names are
    /// its own first.
    pub fn prefix_names(&mut self, first: usize, prefix: Sym) {
        let prefix = self.names.text(prefix).to_string();
        let mut own: FxHashMap<Sym, Sym> = FxHashMap::default();
        for at in first..self.statements.len() {
            let defined: Vec<Sym> = match &self.statements[at].line {
                Line::Define { names, .. } => names.iter().map(|(name, _)| *name).collect(),
                Line::Broken(names) => names.iter().map(|(name, _)| *name).collect(),
                _ => Vec::new(),
            };
            for name in defined {
                let long = format!("{prefix}.{}", self.names.text(name));
                own.insert(name, self.names.intern(&long));
            }
        }
        for at in first..self.statements.len() {
            let mut line = self.statements[at].line.clone();
            match &mut line {
                Line::Define { names, params, value, .. } => {
                    let hidden: Vec<Sym> = params.iter().flatten().map(|(name, _)| *name).collect();
                    names.iter_mut().for_each(|(name, _)| *name = own[name]);
                    self.rename_under(*value, &own, &hidden, &prefix);
                }
                Line::Broken(names) => names.iter_mut().for_each(|(name, _)| *name = own[name]),
                _ => {}
            }
            self.statements[at].line = line;
        }
    }

    fn rename_under(&mut self, root: ExprId, own: &FxHashMap<Sym, Sym>, hidden: &[Sym], prefix: &str) {
        let mut stack = vec![root];
        // The readings of a line that mixes operators have nodes in common.
        let mut seen: FxHashSet<ExprId> = FxHashSet::default();
        while let Some(id) = stack.pop() {
            if !seen.insert(id) {
                continue;
            }
            let expr = self.expr(id);
            match expr {
                Expr::Name(sym) => {
                    if let Some(long) = self.renamed(sym, own, hidden, prefix) {
                        self.set_expr(id, Expr::Name(long));
                    }
                }
                Expr::Call(word, args) => {
                    if let Some(long) = own.get(&word).filter(|_| !hidden.contains(&word)) {
                        self.set_expr(id, Expr::Call(*long, args));
                    }
                }
                Expr::Settled(_, settles) => {
                    let found = &mut self.settles[settles as usize];
                    for (name, _) in found.sharing.iter_mut().chain(&mut found.separate) {
                        *name = own.get(name).filter(|_| !hidden.contains(name)).copied().unwrap_or(*name);
                    }
                }
                _ => {}
            }
            self.push_children(expr, &mut stack);
        }
    }

    /// The long form of a name, or of a path that begins with one: `pump.rate`.
    fn renamed(&mut self, sym: Sym, own: &FxHashMap<Sym, Sym>, hidden: &[Sym], prefix: &str) -> Option<Sym> {
        if hidden.contains(&sym) {
            return None;
        }
        if let Some(long) = own.get(&sym) {
            return Some(*long);
        }
        let text = self.names.text(sym).to_string();
        let begins = text.rmatch_indices(['.', '[']).find_map(|(at, _)| {
            self.names.find(&text[..at]).filter(|s| own.contains_key(s) || hidden.contains(s))
        })?;
        if hidden.contains(&begins) {
            return None;
        }
        Some(self.names.intern(&format!("{prefix}.{text}")))
    }

    /// The nodes directly under a node; the text of a source is none.
    fn push_children(&self, expr: Expr, stack: &mut Vec<ExprId>) {
        match expr {
            Expr::Literal(_) | Expr::Name(_) | Expr::Terminal(_) | Expr::Broken => {}
            Expr::WithUnit(x, _)
            | Expr::Group(x)
            | Expr::Negate(x)
            | Expr::Copy(x)
            | Expr::Settled(x, _)
            | Expr::FailsWhen(x)
            | Expr::Choice(_, x) => stack.push(x),
            Expr::Arith(_, a, b) | Expr::Counted(a, b) => stack.extend([a, b]),
            Expr::Series(list)
            | Expr::Parallel(list)
            | Expr::And(list)
            | Expr::Or(list)
            | Expr::Call(_, list) => {
                stack.extend(self.list(list));
            }
            Expr::AtLeast(need, list) => {
                stack.extend(self.list(list));
                stack.extend(counted(need));
            }
            Expr::Routes(id) => {
                let routes = &self.routes[id as usize];
                stack.extend(self.list(routes.stops));
                if let Some((need, ends)) = routes.ends {
                    stack.extend(self.list(ends));
                    stack.extend(counted(need));
                }
            }
            Expr::Item(clauses) => self.push_values(clauses, stack),
            Expr::Changed(copy, clauses) => {
                stack.push(copy);
                self.push_values(clauses, stack);
            }
            Expr::Mixed(id) => stack.extend(&self.mixed[id as usize].readings),
        }
    }

    fn push_values(&self, clauses: List, stack: &mut Vec<ExprId>) {
        for clause in self.clauses(clauses).iter().filter(|c| c.word != ClauseWord::Source) {
            stack.extend(clause.value);
            stack.extend(clause.over);
        }
    }
}

fn counted(need: Need) -> Option<ExprId> {
    match need {
        Need::Count(count) => Some(count),
        Need::All | Need::Any => None,
    }
}
