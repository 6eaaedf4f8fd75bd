//! Assemblies: what rows say of the rows around them.

use super::expr::Read;
use super::grid::{GridForm, GridReader, span_of};
use super::header::Column;
use super::tree::*;
use super::words::ClauseWord;
use crate::source::{Code, Problem, Span};
use rustc_hash::{FxHashMap, FxHashSet};

/// Who belongs to which assembly, over all grids.
#[derive(Default)]
pub(super) struct Assemblies {
    /// Every name that an `in` cell holds.
    pub(super) mentioned: FxHashSet<Sym>,
    /// The assemblies in the order they are first met, with the place and its block.
    pub(super) order: Vec<(Sym, Span, u32)>,
    pub(super) members: FxHashMap<Sym, Vec<ExprId>>,
    /// Assemblies whose own row says how they work.
    pub(super) structured: Vec<Sym>,
}

impl Assemblies {
    pub(super) fn join(&mut self, assembly: (Sym, Span), block: u32, member: ExprId) {
        let list = self.members.entry(assembly.0).or_insert_with(|| {
            self.order.push((assembly.0, assembly.1, block));
            Vec::new()
        });
        list.push(member);
    }
}

/// Remarks on rows that say they are in an assembly whose own row has a
/// structure, where no structure names them: they would count for nothing.
pub(super) fn left_out(all: &Assemblies, tree: &Tree, problems: &mut Vec<Problem>) {
    if all.structured.is_empty() {
        return;
    }
    let own: FxHashSet<ExprId> = all.members.values().flatten().copied().collect();
    let used: FxHashSet<Sym> = (0..tree.count())
        .map(ExprId)
        .filter(|id| !own.contains(id))
        .filter_map(|id| match tree.expr(id) {
            Expr::Name(sym) => Some(sym),
            _ => None,
        })
        .collect();
    for assembly in &all.structured {
        for &member in all.members.get(assembly).into_iter().flatten() {
            if let Expr::Name(sym) = tree.expr(member)
                && !used.contains(&sym)
            {
                let (name, of) = (tree.names.text(sym), tree.names.text(*assembly));
                let message = format!("\"{name}\" says it is in \"{of}\", whose own row does not name it");
                problems.push(
                    Problem::remark(Code::TableCell, tree.span(member), message)
                        .mend(format!("add it to the structure of \"{of}\", or clear its `in`")),
                );
            }
        }
    }
}

impl GridReader<'_, '_> {
    /// Data of a row that other rows belong to. What a formula sums up for it is
    /// left aside; data of failure that were typed contradict its members.
    pub(super) fn beside_members(
        &mut self,
        row: usize,
        name: (Sym, Span),
        is: Option<ExprId>,
        clauses: &mut Vec<Clause>,
    ) -> Read<()> {
        let structure = is.map(|value| self.tree.expr(self.tree.inside_groups(value)));
        let item = matches!(structure, Some(Expr::Item(_) | Expr::Literal(_)));
        if structure.is_some() && !item {
            return Ok(());
        }
        let text = self.tree.names.text(name.0).to_string();
        let typed: Vec<usize> = (0..self.columns.len())
            .filter(|at| matches!(self.columns[*at], Column::Clause { .. }))
            .filter(|at| !self.blank(row, *at) && !self.grid.cells.formula(row, *at))
            .collect();
        let of_failure = |at: &usize| match &self.columns[*at] {
            Column::Clause { word, .. } => !matches!(word, ClauseWord::Attribute | ClauseWord::Source),
            _ => false,
        };
        let is_cell = self.position(|c| matches!(c, Column::Is)).filter(|_| item);
        if let Some(at) = is_cell.or_else(|| typed.iter().copied().find(of_failure)) {
            let place = span_of(self.cell(row, at));
            let message = format!("\"{text}\" has data of failure here, and other rows say they are in it");
            return Err(Box::new(
                Problem::error(Code::ContradictoryData, place, message)
                    .mend("clear this cell: an assembly is the series of its rows")
                    .mend("or clear `in` of those rows, if the data here stand for all of them"),
            ));
        }
        for at in typed {
            let Column::Clause { word: ClauseWord::Attribute, name, .. } = &self.columns[at] else {
                continue;
            };
            let word = self.tree.names.text(*name);
            let message =
                format!("the {word} of an assembly is that of its rows, and this one is not counted");
            let place = span_of(self.cell(row, at));
            self.problems.push(
                Problem::remark(Code::TableCell, place, message)
                    .mend("give it to a row of its own that is `perfect`, if it comes on top"),
            );
        }
        clauses.clear();
        Ok(())
    }

    /// Whether a row is a sum of others: it is called so, and nothing was typed
    /// into it but a name.
    pub(super) fn sums_up(&self, row: usize, name: Sym) -> bool {
        const CALLED: &[&str] = &["total", "subtotal", "sub-total", "grand total", "sum"];
        let GridForm::Sheet { formulas } = self.grid.form else { return false };
        let text = self.tree.names.text(name).trim_end_matches(':').to_lowercase();
        let called = |word: &&str| {
            text.strip_prefix(*word).is_some_and(|rest| rest.is_empty() || rest.starts_with(' '))
        };
        let typed = |at: usize| match &self.columns[at] {
            Column::Is | Column::In | Column::Require => !self.blank(row, at),
            column if column.defines() => {
                formulas && !self.blank(row, at) && !self.grid.cells.formula(row, at)
            }
            _ => false,
        };
        CALLED.iter().any(called) && !(0..self.columns.len()).any(typed)
    }
}
