//! Tables to statements: a row defines a thing, a column says what of it.
//!
//! The same for tables in notes and for sheets: a grid is its cells' texts with
//! their places.

use super::expr::{Read, Reader, later};
use super::read::Source;
use super::token::{self, Token};
use super::tree::*;
use super::words::{self, ClauseWord};
use crate::source::{Code, Problem, Span};
use rustc_hash::{FxHashMap, FxHashSet};

/// The cells of one table; a row that takes no part has none.
#[derive(Clone, Debug)]
pub struct Grid<'a> {
    /// What makes it take part: messages about the whole point here.
    pub opener: Span,
    /// The header row.
    pub header: Vec<Source<'a>>,
    /// The rows under it.
    pub rows: Vec<Vec<Source<'a>>>,
    /// Rows that are in error as they stand, by number; they define nothing.
    pub broken: Vec<usize>,
}

/// What a column holds.
#[derive(Clone, Debug)]
enum Column {
    Name,
    Is,
    Qty,
    Need,
    In,
    Require,
    Clause { word: ClauseWord, name: Sym, span: Span, unit: Option<Unit> },
    Ask,
    Met,
    Foreign,
}

impl Column {
    fn takes_part(&self) -> bool {
        matches!(self, Column::Is | Column::Clause { .. } | Column::Ask | Column::Met | Column::Require)
    }
}

/// A question in a cell: its statement, row and column.
pub type CellAsk = (usize, usize, usize);

/// Defines what the rows of a grid define.
pub fn read_grid(grid: &Grid<'_>, block: u32, tree: &mut Tree, problems: &mut Vec<Problem>) {
    GridReader { grid, block, tree, problems }.define();
}

/// Adds the questions of a grid; every grid and every other line has been read
/// before, so that a row may ask about a name that is defined elsewhere.
pub fn ask_grid(grid: &Grid<'_>, block: u32, tree: &mut Tree, problems: &mut Vec<Problem>) -> Vec<CellAsk> {
    GridReader { grid, block, tree, problems }.ask()
}

struct GridReader<'g, 'a> {
    grid: &'g Grid<'a>,
    block: u32,
    tree: &'g mut Tree,
    problems: &'g mut Vec<Problem>,
}

/// One row's definition before it becomes a statement.
struct RowParts {
    name: (Sym, Span),
    value: Option<ExprId>,
    qty: Option<ExprId>,
    need: Option<ExprId>,
}

impl<'a> GridReader<'_, 'a> {
    fn define(&mut self) {
        let columns = self.columns(true);
        if !columns.iter().any(|c| matches!(c, Column::Name)) || !columns.iter().any(Column::takes_part) {
            self.problems.push(
                Problem::error(Code::TableShape, self.grid.opener, "this table takes no part: it has no `name` column with something to say of the names")
                    .mend("head one column `name`, and others `is`, a clause such as `rate (FIT)`, or a question such as `R ?`"),
            );
            return;
        }
        let mut rows: Vec<RowParts> = Vec::new();
        let mut assemblies: Vec<(Sym, Span)> = Vec::new();
        let mut members: FxHashMap<Sym, Vec<ExprId>> = FxHashMap::default();
        for (number, cells) in self.grid.rows.iter().enumerate() {
            let Some(name) = self.row_name(&columns, cells) else { continue };
            let row = if self.grid.broken.contains(&number) {
                Err(None)
            } else {
                self.row(&columns, cells, name).map_err(Some)
            };
            match row {
                Ok((parts, assembly)) => {
                    if let Some((sym, span)) = assembly {
                        let list = members.entry(sym).or_insert_with(|| {
                            assemblies.push((sym, span));
                            Vec::new()
                        });
                        list.push(self.tree.add(Expr::Name(name.0), name.1));
                    }
                    rows.push(parts);
                }
                Err(problem) => {
                    self.problems.extend(problem.map(|p| *p));
                    self.statement(Line::Broken(vec![name]), name.1);
                    // The assembly keeps its broken part, and so has no answer: a
                    // forgotten rate must not improve it.
                    if let Some((sym, span)) = self.assembly_of(&columns, cells) {
                        let member = self.tree.add(Expr::Name(name.0), name.1);
                        let list = members.entry(sym).or_insert_with(|| {
                            assemblies.push((sym, span));
                            Vec::new()
                        });
                        list.push(member);
                    }
                }
            }
        }
        for row in rows {
            self.row_statement(row, &members);
        }
        let known: FxHashSet<Sym> = self.defined();
        for (sym, span) in assemblies {
            if !known.contains(&sym) {
                let value = self.all_of(&members[&sym], span, None);
                self.define_statement((sym, span), value);
            }
        }
    }

    /// The assembly that a row says it belongs to.
    fn assembly_of(&mut self, columns: &[Column], cells: &[Source<'a>]) -> Option<(Sym, Span)> {
        let at = columns.iter().position(|c| matches!(c, Column::In))?;
        let cell = cells.get(at).filter(|c| !c.text.is_empty())?;
        let text = cell.text.replace("\\|", "|");
        Some((self.tree.names.intern(text.trim_matches('`')), span_of(*cell)))
    }

    fn defined(&self) -> FxHashSet<Sym> {
        let names = self.tree.statements.iter().flat_map(|s| match &s.line {
            Line::Define { names, .. } => names.as_slice(),
            Line::Broken(names) => names.as_slice(),
            _ => &[],
        });
        names.map(|(s, _)| *s).collect()
    }

    fn row_statement(&mut self, row: RowParts, members: &FxHashMap<Sym, Vec<ExprId>>) {
        let (sym, span) = row.name;
        let value = match (row.value, members.get(&sym)) {
            (Some(value), _) => self.counted(value, row.qty, row.need, span),
            (None, Some(list)) => self.all_of(&list.clone(), span, row.need),
            (None, None) => {
                if row.qty.is_some() || row.need.is_some() {
                    let text = self.tree.names.text(sym);
                    self.problems.push(
                        Problem::error(
                            Code::MissingData,
                            span,
                            format!("the row \"{text}\" has no data of failure"),
                        )
                        .mend("fill its `is` cell or a clause column; a part that cannot fail is `perfect`"),
                    );
                    self.statement(Line::Broken(vec![row.name]), span);
                }
                return;
            }
        };
        self.define_statement(row.name, value);
    }

    /// `qty` copies of which `need` are needed: all, if left out.
    fn counted(&mut self, value: ExprId, qty: Option<ExprId>, need: Option<ExprId>, span: Span) -> ExprId {
        let Some(qty) = qty else { return value };
        let group = self.tree.add(Expr::Group(value), span);
        let counted = self.tree.add(Expr::Counted(qty, group), span);
        let list = self.tree.add_list(&[counted]);
        self.tree.add(Expr::AtLeast(need.map_or(Need::All, Need::Count), list), span)
    }

    fn all_of(&mut self, members: &[ExprId], span: Span, need: Option<ExprId>) -> ExprId {
        let list = self.tree.add_list(members);
        self.tree.add(Expr::AtLeast(need.map_or(Need::All, Need::Count), list), span)
    }

    fn statement(&mut self, line: Line, span: Span) {
        self.tree.statements.push(Statement { line, span, mark: None, block: self.block });
    }

    fn define_statement(&mut self, name: (Sym, Span), value: ExprId) {
        self.statement(
            Line::Define { names: smallvec::smallvec![name], params: None, value, display: None },
            name.1,
        );
    }

    fn row_name(&mut self, columns: &[Column], cells: &[Source<'a>]) -> Option<(Sym, Span)> {
        let at = columns.iter().position(|c| matches!(c, Column::Name))?;
        let cell = cells.get(at).filter(|c| !c.text.is_empty())?;
        let text = cell.text.replace("\\|", "|");
        let text = text.trim_matches('`');
        Some((self.tree.names.intern(text), span_of(*cell)))
    }

    fn row(
        &mut self,
        columns: &[Column],
        cells: &[Source<'a>],
        name: (Sym, Span),
    ) -> Read<(RowParts, Option<(Sym, Span)>)> {
        let mut parts = RowParts { name, value: None, qty: None, need: None };
        let mut assembly = None;
        let mut clauses: Vec<Clause> = Vec::new();
        for (column, cell) in columns.iter().zip(cells) {
            if cell.text.is_empty() {
                continue;
            }
            match column {
                Column::Is => parts.value = Some(super::read::read_expression(*cell, self.tree)?),
                Column::Qty => parts.qty = Some(super::read::read_expression(*cell, self.tree)?),
                Column::Need => parts.need = Some(super::read::read_expression(*cell, self.tree)?),
                Column::In => {
                    let text = cell.text.replace("\\|", "|");
                    assembly = Some((self.tree.names.intern(text.trim_matches('`')), span_of(*cell)));
                }
                Column::Clause { word, name, span, unit } => {
                    clauses.push(self.clause_cell(*word, *name, *span, *unit, *cell)?);
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
        if takes_part && !clauses.is_empty() {
            parts.value = Some(self.with_clauses(parts.value, clauses, name.1)?);
        }
        if assembly.is_some() && parts.value.is_none() && parts.qty.is_none() && parts.need.is_none() {
            let text = self.tree.names.text(name.0);
            // A row within an assembly may itself be an assembly of other rows.
            if !self.mentioned(columns, name.0) {
                return Err(Box::new(
                    Problem::error(
                        Code::MissingData,
                        name.1,
                        format!("the row \"{text}\" has no data of failure"),
                    )
                    .mend("fill its `is` cell or a clause column; a part that cannot fail is `perfect`"),
                ));
            }
        }
        Ok((parts, assembly))
    }

    fn mentioned(&self, columns: &[Column], name: Sym) -> bool {
        let Some(at) = columns.iter().position(|c| matches!(c, Column::In)) else { return false };
        let text = self.tree.names.text(name).to_string();
        self.grid.rows.iter().any(|r| r.get(at).is_some_and(|c| c.text.trim_matches('`') == text))
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

    fn clause_cell(
        &mut self,
        word: ClauseWord,
        name: Sym,
        head: Span,
        unit: Option<Unit>,
        cell: Source<'a>,
    ) -> Read<Clause> {
        let span = span_of(cell);
        let mut clause = Clause { word, name, word_span: head, span, value: None, over: None };
        match word {
            ClauseWord::Perfect => return Ok(clause),
            ClauseWord::Source => {
                let sym = self.tree.names.intern(cell.text);
                clause.value = Some(self.tree.add(Expr::Name(sym), span));
                return Ok(clause);
            }
            _ => {}
        }
        let value = super::read::read_expression(cell, self.tree)?;
        if let Expr::Item(_) | Expr::Changed(..) = self.tree.expr(value) {
            return Err(Box::new(
                Problem::error(Code::TableCell, span, "this cell holds more than a value")
                    .mend("its clause stands in the header: write the value alone"),
            ));
        }
        clause.value = Some(match unit {
            Some(unit) => self.with_unit(value, unit, span)?,
            None => value,
        });
        Ok(clause)
    }

    /// The header's unit, unless the cell brings its own.
    fn with_unit(&mut self, value: ExprId, unit: Unit, span: Span) -> Read<ExprId> {
        if let Expr::Literal(id) = self.tree.expr(value) {
            let literal = &mut self.tree.literals[id as usize];
            if literal.suffix == Suffix::None {
                literal.suffix = Suffix::Unit(unit);
                return Ok(value);
            }
            return Err(Box::new(
                Problem::error(
                    Code::TableCell,
                    span,
                    "the header gives the unit, and this cell has one of its own",
                )
                .label(unit.span, "the header's unit")
                .mend("write the number alone"),
            ));
        }
        self.tree.units.push(unit);
        let id = self.tree.units.len() as u32 - 1;
        Ok(self.tree.add(Expr::WithUnit(value, id), span))
    }

    fn columns(&mut self, complain: bool) -> Vec<Column> {
        let header = self.grid.header.clone();
        let mut columns = Vec::with_capacity(header.len());
        for cell in header {
            let column = self.column(cell, complain);
            columns.push(column);
        }
        columns
    }

    fn column(&mut self, cell: Source<'a>, complain: bool) -> Column {
        let text = cell.text.split_whitespace().collect::<Vec<_>>().join(" ");
        if let Some(question) = text.strip_suffix('?') {
            return self.question_column(cell, question.trim(), complain);
        }
        let lower = text.to_lowercase();
        match lower.as_str() {
            "name" => return Column::Name,
            "is" => return Column::Is,
            "qty" => return Column::Qty,
            "need" => return Column::Need,
            "in" => return Column::In,
            "require" => return Column::Require,
            _ => {}
        }
        let (word, unit) = match lower.find('(') {
            Some(open) => (lower[..open].trim(), text[open + 1..].strip_suffix(')')),
            None => (lower.as_str(), None),
        };
        if words::LATER_CLAUSES.contains(&word) {
            if complain {
                self.problems.push(later(span_of(cell), &format!("the clause `{word}`")));
            }
            return Column::Foreign;
        }
        let meaning = words::clause(word).or_else(|| self.declared(word).then_some(ClauseWord::Attribute));
        let Some(meaning) = meaning else {
            if complain {
                self.near_header(word, unit.is_some(), cell);
            }
            return Column::Foreign;
        };
        let name = self.tree.names.intern(word);
        let unit = unit.and_then(|u| self.header_unit(u, cell));
        Column::Clause { word: meaning, name, span: span_of(cell), unit }
    }

    fn declared(&self, word: &str) -> bool {
        self.tree.statements.iter().any(|s| match &s.line {
            Line::Attribute(found) => found.iter().any(|(w, ..)| self.tree.names.text(*w) == word),
            _ => false,
        })
    }

    fn near_header(&mut self, word: &str, with_unit: bool, cell: Source<'a>) {
        let known = ["name", "require", "need"].into_iter().chain(words::CLAUSES.iter().map(|(w, _)| *w));
        if let Some(near) = words::nearest(word, known).filter(|_| with_unit || word.chars().count() > 3) {
            self.problems.push(
                Problem::remark(
                    Code::TableHeader,
                    span_of(cell),
                    format!("the header `{word}` is yours and takes no part"),
                )
                .mend(format!("did you mean \"{near}\"?")),
            );
        }
    }

    /// `FIT`, `/Mh`, `%/kh` in a header's parentheses.
    fn header_unit(&mut self, text: &str, cell: Source<'a>) -> Option<Unit> {
        let text = text.trim();
        let (form, word) = if let Some(word) = text.strip_prefix("%/") {
            (UnitForm::PercentPer, word)
        } else if let Some(word) = text.strip_prefix('/') {
            (UnitForm::Per, word)
        } else {
            (UnitForm::Plain, text)
        };
        (!word.is_empty()).then(|| Unit {
            form,
            word: self.tree.names.intern(word.trim()),
            span: span_of(cell),
        })
    }

    fn question_column(&mut self, cell: Source<'a>, question: &str, complain: bool) -> Column {
        if question.eq_ignore_ascii_case("met") {
            return Column::Met;
        }
        let word = question.split(['(']).next().unwrap_or("").split(" in ").next().unwrap_or("").trim();
        if matches!(word, "cuts" | "paths" | "single points" | "rank" | "steps" | "assumptions" | "inputs") {
            if complain {
                self.problems.push(
                    Problem::remark(
                        Code::TableHeader,
                        span_of(cell),
                        format!("`{word}` has an answer of many lines, which fits no cell"),
                    )
                    .mend("ask it in a block of its own, or for the count of its entries"),
                );
            }
            return Column::Foreign;
        }
        if words::QUESTIONS.contains(&word) {
            return Column::Ask;
        }
        if complain {
            let span = span_of(cell);
            if words::LATER_QUESTIONS.contains(&word) {
                self.problems.push(later(span, &format!("the question `{word}`")));
            } else {
                let problem = Problem::remark(
                    Code::TableHeader,
                    span,
                    "this header is no question that is known, and its column is yours",
                );
                let near = words::nearest(word, words::QUESTIONS.iter().copied().chain(["met"]));
                self.problems.push(match near {
                    Some(near) => problem.mend(format!("did you mean \"{near} ?\"?")),
                    None => problem.mend(
                        "questions are `R ?`, `F in chances ?`, `R(500 h) ?`, `Birnbaum(gate) ?`, `met ?`",
                    ),
                });
            }
        }
        Column::Foreign
    }

    fn ask(&mut self) -> Vec<CellAsk> {
        let columns = self.columns(false);
        let mut asks = Vec::new();
        if !columns.iter().any(|c| matches!(c, Column::Name)) {
            return asks;
        }
        let known = self.defined();
        for (number, cells) in self.grid.rows.iter().enumerate() {
            let Some(name) = self.row_name(&columns, cells).filter(|n| known.contains(&n.0)) else {
                continue;
            };
            let required = columns
                .iter()
                .zip(cells)
                .find(|(c, cell)| matches!(c, Column::Require) && !cell.text.is_empty());
            let met = columns.iter().position(|c| matches!(c, Column::Met));
            if let Some((_, cell)) = required {
                let line = self.requirement(*cell, name);
                let mark = met.and_then(|at| cells.get(at)).map(|c| mark_of(*c));
                self.push_line(line, *cell, mark);
                if let (Some(at), Some(_)) = (met, mark) {
                    asks.push((self.tree.statements.len() - 1, number, at));
                }
            }
            for (at, column) in columns.iter().enumerate() {
                if let (Column::Ask, Some(cell)) = (column, cells.get(at)) {
                    let header = self.grid.header[at];
                    let line = self.question(header, name);
                    self.push_line(line, *cell, Some(mark_of(*cell)));
                    let last = self.tree.statements.len() - 1;
                    self.tree.statements[last].span = span_of(header);
                    asks.push((last, number, at));
                }
            }
        }
        asks
    }

    fn push_line(&mut self, line: Read<Line>, cell: Source<'a>, mark: Option<Mark>) {
        let line = line.unwrap_or_else(|problem| {
            if !self.problems.contains(&problem) {
                self.problems.push(*problem);
            }
            Line::Broken(Vec::new())
        });
        self.tree.statements.push(Statement { line, span: span_of(cell), mark, block: self.block });
    }

    /// `R >= 0.999` of a row.
    fn requirement(&mut self, cell: Source<'a>, name: (Sym, Span)) -> Read<Line> {
        let (tokens, end) = self.tokens(cell.text, cell.at)?;
        let mut reader = Reader { tree: self.tree, tokens: &tokens, at: 0, end };
        let line = reader.requirement()?;
        if reader.peek().is_some() {
            return Err(reader.unexpected("the end of the cell"));
        }
        let Line::Require { left, limit, right } = line else { return Ok(line) };
        let left = self.of_row(left, name)?;
        Ok(Line::Require { left, limit, right })
    }

    /// `R(500 h) in chances` of a row.
    fn question(&mut self, header: Source<'a>, name: (Sym, Span)) -> Read<Line> {
        let text = header.text.trim_end().trim_end_matches('?');
        let (tokens, end) = self.tokens(text, header.at)?;
        let mut reader = Reader { tree: self.tree, tokens: &tokens, at: 0, end };
        let two = tokens.len() >= 2
            && words::TWO_WORD_CALLS
                .iter()
                .any(|(a, b)| reader.word(0) == Some(a) && reader.word(1) == Some(b));
        let value = if two && !text.contains('(') {
            let span = tokens[0].span.to(tokens[1].span);
            reader.at = 2;
            let both = text.split_whitespace().take(2).collect::<Vec<_>>().join(" ");
            let sym = reader.tree.names.intern(&both);
            reader.tree.add(Expr::Name(sym), span)
        } else {
            reader.expression()?
        };
        let display = reader.display()?;
        if reader.peek().is_some() {
            return Err(reader.unexpected("`?`"));
        }
        let value = self.of_row(value, name)?;
        Ok(Line::Ask { value, display })
    }

    fn tokens(&mut self, text: &str, at: u32) -> Read<(Vec<Token>, Span)> {
        let mut tokens = Vec::new();
        let mut problems = Vec::new();
        token::line(text, at, 0, &mut self.tree.names, &mut tokens, &mut problems);
        let stop = at + text.len() as u32;
        match problems.into_iter().next() {
            Some(problem) => Err(Box::new(problem)),
            None => Ok((tokens, Span { start: stop, end: stop })),
        }
    }

    /// The question with the row as its thing; importance asks of the row within its argument.
    fn of_row(&mut self, question: ExprId, name: (Sym, Span)) -> Read<ExprId> {
        const WITHIN: &[&str] = &["Birnbaum", "criticality", "FV", "RAW", "RRW", "doubled", "made perfect"];
        let inner = self.tree.inside_groups(question);
        let span = self.tree.span(inner);
        let row = self.tree.add(Expr::Name(name.0), name.1);
        let (word, mut args) = match self.tree.expr(inner) {
            Expr::Name(word) => (word, Vec::new()),
            Expr::Call(word, args) => (word, self.tree.list(args).to_vec()),
            _ => {
                return Err(Box::new(
                    Problem::error(
                        Code::TableCell,
                        span,
                        "a question of a row is one question, without arithmetic",
                    )
                    .mend("write `R`, `F(500 h)` or `Birnbaum(gate)`"),
                ));
            }
        };
        if WITHIN.contains(&self.tree.names.text(word)) {
            let at = args.len().min(1);
            args.insert(at, row);
        } else {
            args.insert(0, row);
        }
        let list = self.tree.add_list(&args);
        Ok(self.tree.add(Expr::Call(word, list), span))
    }
}

fn span_of(cell: Source<'_>) -> Span {
    Span { start: cell.at, end: cell.at + cell.text.len() as u32 }
}

fn mark_of(cell: Source<'_>) -> Mark {
    Mark { at: cell.at, answer: span_of(cell), line: 0 }
}
