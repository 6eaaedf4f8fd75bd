//! Questions of a table: each row asks what its header asks, and what it requires.

use super::expr::{Read, Reader};
use super::grid::{Grid, GridForm, GridReader, defined, span_of};
use super::header::{Column, columns, declared};
use super::read::Source;
use super::token::{self, Token};
use super::tree::*;
use super::words;
use crate::source::{Code, Level, Problem, Span};
use rustc_hash::FxHashSet;

/// A question in a cell.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct CellAsk {
    /// Its statement.
    pub statement: usize,
    /// The grid, by number.
    pub grid: usize,
    /// The row under the header.
    pub row: usize,
    /// The column.
    pub column: usize,
}

/// Questions that a row asks about a system around it.
const WITHIN: &[&str] = &["Birnbaum", "criticality", "FV", "RAW", "RRW", "doubled", "made perfect"];

/// So many rows of names that nothing defines are told one by one.
const TOLD: usize = 20;

/// Adds the questions and the requirements of grids; every grid and every other
/// line has been read before, so that a row may ask about a name that is
/// defined elsewhere. They come in the order of their statements.
pub fn ask_grids(grids: &[Grid<'_>], tree: &mut Tree, problems: &mut Vec<Problem>) -> Vec<CellAsk> {
    let (known, declared) = (defined(tree), declared(tree));
    let mut asks = Vec::new();
    for (number, grid) in grids.iter().enumerate() {
        // What there is to be said about the headers has been said.
        let columns = columns(grid, &declared, tree, &mut Vec::new());
        if columns.iter().any(|c| matches!(c, Column::Name)) {
            GridReader { grid, columns: &columns, tree, problems }.ask(number, &known, &mut asks);
        }
    }
    asks
}

/// The question of a header, ready to be asked of each row.
#[derive(Clone, Debug)]
struct Question {
    word: Sym,
    span: Span,
    args: Vec<ExprId>,
    /// Where the row stands among the arguments.
    at: usize,
    display: Option<Display>,
}

/// A column's question, `None` where its header is in error, and whether it
/// asks of the row within another system.
struct Asking(Option<Question>, bool);

impl Asking {
    fn within(&self) -> bool {
        self.1
    }
}

impl<'a> GridReader<'_, 'a> {
    fn ask(&mut self, grid: usize, known: &FxHashSet<Sym>, asks: &mut Vec<CellAsk>) {
        // A header in error is told once; its cells are answered with the message.
        let mut questions: Vec<Option<Asking>> = Vec::new();
        for (at, column) in self.columns.iter().enumerate() {
            let asked = matches!(column, Column::Ask).then(|| self.question(self.grid.header[at]));
            let asked = asked.map(|asked| asked.map_err(|problem| self.problems.push(*problem)).ok());
            questions.push(asked.map(|question| {
                let within = |q: &Question| WITHIN.contains(&self.tree.names.text(q.word));
                Asking(question.clone(), question.as_ref().is_some_and(within))
            }));
        }
        let requires = self.columns.iter().position(|c| matches!(c, Column::Require));
        let met = self.columns.iter().position(|c| matches!(c, Column::Met));
        let only_asks = !self.columns.iter().any(Column::defines);
        let mut unknown = 0;
        for row in 0..self.grid.cells.rows() {
            let Some(name) = self.row_name(row) else { continue };
            if !known.contains(&name.0) {
                if only_asks {
                    unknown += 1;
                    self.unknown_row(name, known, unknown);
                }
                continue;
            }
            if let Some(at) = requires.filter(|at| !self.blank(row, *at)) {
                let cell = self.cell(row, at);
                let line = match self.no_value(row, at) {
                    Some(problem) => Err(Box::new(problem)),
                    None => self.requirement(cell, name),
                };
                let mark = met.and_then(|met| self.grid.cells.text(row, met)).map(mark_of);
                let statement = self.push_line(line, span_of(cell), mark);
                if let (Some(column), Some(_)) = (met, mark) {
                    asks.push(CellAsk { statement, grid, row, column });
                }
            }
            for (column, question) in questions.iter().enumerate() {
                if let Some(question) = question.as_ref().filter(|question| !question.within()) {
                    self.ask_of_row(question, (grid, row, column), name, asks);
                }
            }
        }
        // All rows ask these of one system, which is worked out once if they stand together.
        for (column, question) in questions.iter().enumerate() {
            let Some(question) = question.as_ref().filter(|question| question.within()) else { continue };
            for row in 0..self.grid.cells.rows() {
                if let Some(name) = self.row_name(row).filter(|name| known.contains(&name.0)) {
                    self.ask_of_row(question, (grid, row, column), name, asks);
                }
            }
        }
    }

    fn ask_of_row(
        &mut self,
        question: &Asking,
        (grid, row, column): (usize, usize, usize),
        name: (Sym, Span),
        asks: &mut Vec<CellAsk>,
    ) {
        let Some(cell) = self.grid.cells.text(row, column) else { return };
        let line = match &question.0 {
            Some(question) => self.of_row(question, name),
            None => Line::Broken(Vec::new()),
        };
        // In a note a table's cell has no text of its own to point at before it is answered.
        let span = match self.grid.form {
            GridForm::Markdown => span_of(self.grid.header[column]),
            GridForm::Sheet { .. } => span_of(cell),
        };
        let statement = self.push_line(Ok(line), span, Some(mark_of(cell)));
        asks.push(CellAsk { statement, grid, row, column });
    }

    /// In a table that only asks, a name that nothing defines is a slip.
    fn unknown_row(&mut self, name: (Sym, Span), known: &FxHashSet<Sym>, count: usize) {
        if count > TOLD || self.grid.form == GridForm::Markdown {
            return;
        }
        let text = self.tree.names.text(name.0);
        let message = format!("nothing defines \"{text}\", and its row takes no part");
        let problem = Problem::remark(Code::UnknownName, name.1, message);
        let near = words::nearest(text, known.iter().map(|sym| self.tree.names.text(*sym)));
        self.problems.push(match near {
            // Near to a name it is meant as one, and its answer is missing.
            Some(near) => {
                Problem { level: Level::Error, ..problem }.mend(format!("did you mean \"{near}\"?"))
            }
            None => problem.mend("define it in this file, or leave the row as it is if it is a heading"),
        });
    }

    fn push_line(&mut self, line: Read<Line>, span: Span, mark: Option<Mark>) -> usize {
        let line = line.unwrap_or_else(|problem| {
            self.problems.push(*problem);
            Line::Broken(Vec::new())
        });
        self.tree.statements.push(Statement { line, span, mark, block: self.grid.block });
        self.tree.statements.len() - 1
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
        let question = self.asked(left, None)?;
        let Line::Ask { value: left, .. } = self.of_row(&question, name) else { return Ok(line) };
        Ok(Line::Require { left, limit, right })
    }

    /// `R(500 h) in chances` of a header.
    fn question(&mut self, header: Source<'a>) -> Read<Question> {
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
        self.asked(value, display)
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

    /// A question as it stands, with a gap for its row; importance asks of the
    /// row within its argument, and steps are steps to the row's reliability.
    fn asked(&mut self, question: ExprId, display: Option<Display>) -> Read<Question> {
        let inner = self.tree.inside_groups(question);
        let span = self.tree.span(inner);
        let (word, args) = match self.tree.expr(inner) {
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
        let at = if WITHIN.contains(&self.tree.names.text(word)) { args.len().min(1) } else { 0 };
        Ok(Question { word, span, args, at, display })
    }

    /// The question with the row as its thing.
    fn of_row(&mut self, question: &Question, name: (Sym, Span)) -> Line {
        let row = self.tree.add(Expr::Name(name.0), name.1);
        let mut args = question.args.clone();
        match self.tree.names.text(question.word) {
            // `steps` and `steps(R)` are `steps(R(row))`, `steps(F(500 h))` is `steps(F(row, 500 h))`.
            "steps" => args = vec![self.inner_call(question, row, "R")],
            // `count(cuts)` is `count(cuts(row))`.
            "count" => args = vec![self.inner_call(question, row, "cuts")],
            _ => args.insert(question.at, row),
        }
        let list = self.tree.add_list(&args);
        let value = self.tree.add(Expr::Call(question.word, list), question.span);
        Line::Ask { value, display: question.display }
    }

    /// The question inside another one, with the row as its thing.
    fn inner_call(&mut self, question: &Question, row: ExprId, usual: &str) -> ExprId {
        let inner = question.args.first().map(|arg| self.tree.expr(self.tree.inside_groups(*arg)));
        let (word, mut args) = match inner {
            Some(Expr::Name(word)) => (word, Vec::new()),
            Some(Expr::Call(word, args)) => (word, self.tree.list(args).to_vec()),
            _ => (self.tree.names.intern(usual), Vec::new()),
        };
        args.insert(0, row);
        let list = self.tree.add_list(&args);
        self.tree.add(Expr::Call(word, list), question.span)
    }
}

fn mark_of(cell: Source<'_>) -> Mark {
    Mark { at: cell.at, answer: span_of(cell), line: 0 }
}
