//! Tables to statements: a row defines a thing, a column says what of it.
//!
//! The same for tables in notes and for sheets: a grid is its cells' texts with
//! their places. All grids of a document are read together, since an assembly
//! may have its rows in several of them.

use super::assembly::{Assemblies, left_out};
use super::expr::Read;
use super::header::{Column, columns, declared};
use super::read::Source;
use super::tree::*;
use super::words::ClauseWord;
use crate::source::{Code, Problem, Span};
use rustc_hash::FxHashSet;

/// What stands in a cell, as far as the language cares.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Default)]
pub enum CellKind {
    /// Text, or nothing.
    #[default]
    Text,
    /// A number.
    Number,
    /// A date or a time: the spreadsheet has turned something into one.
    Date,
    /// True or false.
    Logical,
    /// A formula's error, such as a division by zero.
    Failed,
    /// A formula that the file holds no value for.
    NoValue,
}

/// The rows of a table.
pub trait Cells<'a> {
    /// How many rows there are under the header.
    fn rows(&self) -> usize;

    /// The text of a cell; `None` where its row does not reach so far.
    fn text(&self, row: usize, column: usize) -> Option<Source<'a>>;

    /// What stands in a cell.
    fn kind(&self, _row: usize, _column: usize) -> CellKind {
        CellKind::Text
    }

    /// Whether a formula computes a cell.
    fn formula(&self, _row: usize, _column: usize) -> bool {
        false
    }
}

impl<'a> Cells<'a> for Vec<Vec<Source<'a>>> {
    fn rows(&self) -> usize {
        self.len()
    }

    fn text(&self, row: usize, column: usize) -> Option<Source<'a>> {
        self.get(row)?.get(column).copied()
    }
}

/// Where a table stands: its cells are written differently.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum GridForm {
    /// In a note: names may stand in backticks, `|` is `\|`.
    Markdown,
    /// In a sheet: a cell is its text, and may hold many lines.
    Sheet {
        /// Whether the file tells which cells formulas compute.
        formulas: bool,
    },
}

/// The cells of one table.
pub struct Grid<'a> {
    /// What makes it take part: messages about the whole point here.
    pub opener: Span,
    /// The header row.
    pub header: Vec<Source<'a>>,
    /// The rows under it.
    pub cells: Box<dyn Cells<'a> + 'a>,
    /// Rows that are in error as they stand, by number in order; they define nothing.
    pub broken: Vec<usize>,
    /// Where it stands.
    pub form: GridForm,
    /// The block that its statements are of.
    pub block: u32,
}

/// Defines what the rows of all grids of a document define.
pub fn read_grids(grids: &[Grid<'_>], tree: &mut Tree, problems: &mut Vec<Problem>) {
    let declared = declared(tree);
    let mut heads: Vec<Option<Vec<Column>>> = Vec::new();
    let mut all = Assemblies::default();
    for grid in grids {
        let columns = columns(grid, &declared, tree, problems);
        let takes_part =
            columns.iter().any(|c| matches!(c, Column::Name)) && columns.iter().any(Column::takes_part);
        if takes_part {
            let mut reader = GridReader { grid, columns: &columns, tree, problems };
            reader.note_assemblies(&mut all);
        } else {
            problems.push(
                Problem::error(Code::TableShape, grid.opener, "this table takes no part: it has no `name` column with something to say of the names")
                    .mend("head one column `name`, and others `is`, a clause such as `rate (FIT)`, or a question such as `R ?`"),
            );
        }
        heads.push(takes_part.then_some(columns));
    }
    let mut rows: Vec<Vec<RowParts>> = Vec::new();
    for (grid, columns) in grids.iter().zip(&heads) {
        let mut found = Vec::new();
        if let Some(columns) = columns {
            GridReader { grid, columns, tree, problems }.rows(&mut all, &mut found);
        }
        rows.push(found);
    }
    for ((grid, columns), rows) in grids.iter().zip(&heads).zip(rows) {
        let Some(columns) = columns else { continue };
        let mut reader = GridReader { grid, columns, tree, problems };
        for row in rows {
            if row.value.is_some() && all.members.contains_key(&row.name.0) {
                all.structured.push(row.name.0);
            }
            reader.row_statement(row, &all);
        }
    }
    left_out(&all, tree, problems);
    let known = defined(tree);
    for (sym, span, block) in all.order {
        if !known.contains(&sym)
            && let Some(members) = all.members.get(&sym)
        {
            let list = tree.add_list(members);
            let value = tree.add(Expr::AtLeast(Need::All, list), span);
            push_definition(tree, (sym, span), value, block);
        }
    }
}

/// Every name that a line defines, also a line in error.
pub(super) fn defined(tree: &Tree) -> FxHashSet<Sym> {
    let names = tree.statements.iter().flat_map(|s| match &s.line {
        Line::Define { names, .. } => names.as_slice(),
        Line::Broken(names) => names.as_slice(),
        _ => &[],
    });
    names.map(|(s, _)| *s).collect()
}

fn push_definition(tree: &mut Tree, name: (Sym, Span), value: ExprId, block: u32) {
    let line = Line::Define { names: smallvec::smallvec![name], params: None, value, display: None };
    tree.statements.push(Statement { line, span: name.1, mark: None, block });
}

/// Reads one grid.
pub(super) struct GridReader<'g, 'a> {
    pub(super) grid: &'g Grid<'a>,
    pub(super) columns: &'g [Column],
    pub(super) tree: &'g mut Tree,
    pub(super) problems: &'g mut Vec<Problem>,
}

/// One row's definition before it becomes a statement.
struct RowParts {
    name: (Sym, Span),
    value: Option<ExprId>,
    qty: Option<ExprId>,
    need: Option<ExprId>,
    /// Whether `need` is the number 1.
    one: bool,
}

impl<'a> GridReader<'_, 'a> {
    /// The cell of a column in a row; the empty one where there is none.
    pub(super) fn cell(&self, row: usize, column: usize) -> Source<'a> {
        self.grid.cells.text(row, column).unwrap_or(Source { text: "", at: self.grid.opener.start })
    }

    /// Whether nothing stands in a cell.
    pub(super) fn blank(&self, row: usize, column: usize) -> bool {
        self.cell(row, column).text.is_empty() && self.grid.cells.kind(row, column) == CellKind::Text
    }

    pub(super) fn position(&self, wanted: impl Fn(&Column) -> bool) -> Option<usize> {
        self.columns.iter().position(wanted)
    }

    /// The text of a cell that holds a name.
    fn name_in(&mut self, cell: Source<'a>) -> (Sym, Span) {
        let span = span_of(cell);
        if self.grid.form != GridForm::Markdown {
            return (self.tree.names.intern(cell.text), span);
        }
        let text = cell.text.replace("\\|", "|");
        (self.tree.names.intern(text.trim_matches('`')), span)
    }

    /// The name of a row, if it has one.
    pub(super) fn row_name(&mut self, row: usize) -> Option<(Sym, Span)> {
        let at = self.position(|c| matches!(c, Column::Name))?;
        let cell = self.cell(row, at);
        (!cell.text.is_empty()).then(|| self.name_in(cell))
    }

    /// The assembly that a row says it belongs to.
    fn assembly_of(&mut self, row: usize) -> Option<(Sym, Span)> {
        let at = self.position(|c| matches!(c, Column::In))?;
        let cell = self.cell(row, at);
        (!cell.text.is_empty()).then(|| self.name_in(cell))
    }

    fn note_assemblies(&mut self, all: &mut Assemblies) {
        if self.position(|c| matches!(c, Column::In)).is_none() {
            return;
        }
        for row in 0..self.grid.cells.rows() {
            if let Some((sym, _)) = self.assembly_of(row) {
                all.mentioned.insert(sym);
            }
        }
    }

    fn rows(&mut self, all: &mut Assemblies, found: &mut Vec<RowParts>) {
        for number in 0..self.grid.cells.rows() {
            let Some(name) = self.row_name(number) else {
                self.nameless(number);
                continue;
            };
            let row = if self.grid.broken.binary_search(&number).is_ok() {
                Err(None)
            } else {
                self.row(number, name, all).map_err(Some)
            };
            let block = self.grid.block;
            match row {
                Ok(None) => {}
                Ok(Some((parts, assembly))) => {
                    if let Some(assembly) = assembly {
                        let member = self.tree.add(Expr::Name(name.0), name.1);
                        all.join(assembly, block, member);
                    }
                    found.push(parts);
                }
                Err(problem) => {
                    self.problems.extend(problem.map(|p| *p));
                    let line = Line::Broken(vec![name]);
                    self.tree.statements.push(Statement { line, span: name.1, mark: None, block });
                    // The assembly keeps its broken part, and so has no answer: a
                    // forgotten rate must not improve it.
                    if let Some(assembly) = self.assembly_of(number) {
                        let member = self.tree.add(Expr::Name(name.0), name.1);
                        all.join(assembly, block, member);
                    }
                }
            }
        }
    }

    /// A row without a name takes no part. Where it has data that no formula
    /// sums up, its name may have been forgotten.
    fn nameless(&mut self, row: usize) {
        if self.grid.form == GridForm::Markdown {
            return;
        }
        let lost = (0..self.columns.len()).find(|at| {
            let told = match &self.columns[*at] {
                Column::In | Column::Is => true,
                Column::Clause { word, .. } => {
                    !matches!(word, ClauseWord::Attribute | ClauseWord::Source | ClauseWord::Perfect)
                }
                _ => false,
            };
            told && !self.blank(row, *at) && !self.grid.cells.formula(row, *at)
        });
        let belongs = self.position(|c| matches!(c, Column::In)).filter(|at| !self.blank(row, *at));
        let Some(at) = belongs.or(lost) else { return };
        let place = span_of(self.cell(row, at));
        if matches!(self.columns[at], Column::In) {
            let message = "this row belongs to an assembly, and has no name";
            self.problems.push(
                Problem::error(Code::TableCell, place, message)
                    .mend("give the part a name of its own: each row is one thing")
                    .mend("or clear this cell, if the row takes no part"),
            );
        } else {
            let message = "this row has data, and takes no part: it has no name";
            self.problems.push(
                Problem::remark(Code::TableCell, place, message)
                    .mend("give it a name, if it is a part; a merged cell names its first row only"),
            );
        }
    }

    /// What a row says; `None` if it takes no part.
    #[allow(clippy::type_complexity)]
    fn row(
        &mut self,
        row: usize,
        name: (Sym, Span),
        all: &Assemblies,
    ) -> Read<Option<(RowParts, Option<(Sym, Span)>)>> {
        if self.sums_up(row, name.0) || !self.name_kept(row)? {
            return Ok(None);
        }
        let mut parts = RowParts { name, value: None, qty: None, need: None, one: false };
        let mut assembly = None;
        let mut clauses: Vec<Clause> = Vec::new();
        for (at, column) in self.columns.iter().enumerate() {
            if self.blank(row, at) {
                continue;
            }
            let cell = self.cell(row, at);
            match column {
                Column::Is => parts.value = Some(self.value(row, at)?),
                Column::Qty => parts.qty = Some(self.value(row, at)?),
                Column::Need => {
                    parts.need = Some(self.value(row, at)?);
                    parts.one = cell.text == "1";
                }
                Column::In => {
                    self.name_of_text(row, at)?;
                    assembly = Some(self.name_in(cell));
                }
                Column::Clause { word: ClauseWord::Perfect, name, span, .. } => {
                    let says_so = self.yes(cell)?;
                    if says_so {
                        clauses.push(clause(ClauseWord::Perfect, *name, *span, cell, None));
                    }
                }
                Column::Clause { word: ClauseWord::Source, name, span, .. } => {
                    let text = self.tree.names.intern(cell.text);
                    let value = self.tree.add(Expr::Name(text), span_of(cell));
                    clauses.push(clause(ClauseWord::Source, *name, *span, cell, Some(value)));
                }
                Column::Clause { word, name, span, unit } => {
                    let value = self.clause_value(row, at, *unit)?;
                    clauses.push(clause(*word, *name, *span, cell, Some(value)));
                }
                _ => {}
            }
        }
        // A row of sums, or of a thing that only costs or weighs, takes no part.
        let only_counted =
            clauses.iter().all(|c| matches!(c.word, ClauseWord::Attribute | ClauseWord::Source));
        let alone =
            parts.value.is_none() && parts.qty.is_none() && parts.need.is_none() && assembly.is_none();
        let takes_part = !only_counted || !alone;
        if all.mentioned.contains(&name.0) {
            self.beside_members(row, name, parts.value, &mut clauses)?;
        }
        if takes_part && !clauses.is_empty() {
            parts.value = Some(self.with_clauses(parts.value, clauses, name.1)?);
        }
        if assembly.is_some() && parts.value.is_none() && parts.qty.is_none() && parts.need.is_none() {
            // A row within an assembly may itself be an assembly of other rows.
            if !all.mentioned.contains(&name.0) {
                return Err(Box::new(self.no_data(name)));
            }
        }
        Ok(Some((parts, assembly)))
    }

    fn no_data(&self, name: (Sym, Span)) -> Problem {
        let text = self.tree.names.text(name.0);
        Problem::error(Code::MissingData, name.1, format!("the row \"{text}\" has no data of failure"))
            .mend("fill its `is` cell or a clause column; a part that cannot fail is `perfect`")
    }

    fn row_statement(&mut self, row: RowParts, all: &Assemblies) {
        let (sym, span) = row.name;
        let broken = |reader: &mut Self, problem: Problem| {
            reader.problems.push(problem);
            let (line, block) = (Line::Broken(vec![row.name]), reader.grid.block);
            reader.tree.statements.push(Statement { line, span, mark: None, block });
        };
        let value = match (row.value, all.members.get(&sym)) {
            (Some(_), _) if row.qty.is_none() && row.need.is_some() && !row.one => {
                let place = row.need.map_or(span, |need| self.tree.span(need));
                let message = "`need` says how many of `qty` are needed, and this row has no `qty`";
                let problem = Problem::error(Code::TableCell, place, message);
                return broken(self, problem.mend("say how many there are, or clear this cell"));
            }
            (Some(value), _) => self.counted(value, row.qty, row.need, span),
            (None, Some(members)) => {
                let list = self.tree.add_list(members);
                // Without a count of its own, `need` is how many of its rows are needed.
                let need = row.need.filter(|_| row.qty.is_none()).map_or(Need::All, Need::Count);
                let value = self.tree.add(Expr::AtLeast(need, list), span);
                self.counted(value, row.qty, row.need, span)
            }
            (None, None) => {
                if row.qty.is_some() || row.need.is_some() {
                    let problem = self.no_data(row.name);
                    broken(self, problem);
                }
                return;
            }
        };
        push_definition(self.tree, row.name, value, self.grid.block);
    }

    /// `qty` copies of which `need` are needed: all, if left out.
    fn counted(&mut self, value: ExprId, qty: Option<ExprId>, need: Option<ExprId>, span: Span) -> ExprId {
        let Some(qty) = qty else { return value };
        let group = self.tree.add(Expr::Group(value), span);
        let counted = self.tree.add(Expr::Counted(qty, group), span);
        let list = self.tree.add_list(&[counted]);
        self.tree.add(Expr::AtLeast(need.map_or(Need::All, Need::Count), list), span)
    }

    /// Clause columns join the clauses of the `is` cell.
    fn with_clauses(&mut self, is: Option<ExprId>, mut clauses: Vec<Clause>, place: Span) -> Read<ExprId> {
        let Some(value) = is else { return Ok(self.item(clauses, place)) };
        let inner = self.tree.inside_groups(value);
        match self.tree.expr(inner) {
            Expr::Item(own) => {
                let mut all = self.tree.clauses(own).to_vec();
                all.append(&mut clauses);
                Ok(self.item(all, place))
            }
            Expr::Literal(_) => {
                let span = self.tree.span(inner);
                let name = self.tree.names.intern("");
                let own = Clause {
                    word: ClauseWord::Works,
                    name,
                    word_span: span,
                    span,
                    value: Some(inner),
                    over: None,
                };
                clauses.insert(0, own);
                Ok(self.item(clauses, place))
            }
            Expr::Copy(_) | Expr::Settled(..) => {
                let list = self.clause_list(clauses);
                Ok(self.tree.add(Expr::Changed(inner, list), place))
            }
            Expr::Changed(copy, own) => {
                let mut all = self.tree.clauses(own).to_vec();
                all.append(&mut clauses);
                let list = self.clause_list(all);
                Ok(self.tree.add(Expr::Changed(copy, list), place))
            }
            _ => {
                let word = self.tree.names.text(clauses[0].name).to_string();
                Err(Box::new(
                    Problem::error(
                        Code::TableCell,
                        clauses[0].span,
                        format!("a structure takes no `{word}`"),
                    )
                    .mend("leave this cell empty, or give the clause to a part"),
                ))
            }
        }
    }

    fn clause_list(&mut self, clauses: Vec<Clause>) -> List {
        let start = self.tree.clauses.len() as u32;
        self.tree.clauses.extend(clauses);
        List { start, end: self.tree.clauses.len() as u32 }
    }

    fn item(&mut self, clauses: Vec<Clause>, place: Span) -> ExprId {
        let list = self.clause_list(clauses);
        self.tree.add(Expr::Item(list), place)
    }
}

fn clause(word: ClauseWord, name: Sym, head: Span, cell: Source<'_>, value: Option<ExprId>) -> Clause {
    Clause { word, name, word_span: head, span: span_of(cell), value, over: None }
}

pub(super) fn span_of(cell: Source<'_>) -> Span {
    Span { start: cell.at, end: cell.at + cell.text.len() as u32 }
}
