//! Blocks of lines to statements: continuation, recovery, question marks.

use super::expr::Reader;
use super::line::{Begins, begins, names_before_equals};
use super::token::{self, Tok, Token};
use super::tree::*;
use crate::source::{Code, Problem, Span};

/// One line of a block: its text and where that stands.
#[derive(Clone, Copy, Debug)]
pub struct Source<'a> {
    /// The text, without its line ending and without what quotes or lists put before it.
    pub text: &'a str,
    /// Offset of its first byte in the common count of [`crate::source::Sources`].
    pub at: u32,
}

/// Reads the lines of one block into `tree`; `block` is kept in the statements.
pub fn read_block<'a>(
    lines: impl Iterator<Item = Source<'a>>,
    block: u32,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) {
    let mut open = Open::default();
    // Whether the line before asked, or was an answer line of one that did.
    let mut asked = false;
    for (number, line) in lines.enumerate() {
        if line.text.trim_start().starts_with('?') && open.tokens.is_empty() {
            if !asked {
                problems.push(stray_answer(line));
            }
            asked = true; // an old answer line, or told already
            continue;
        }
        let from = open.tokens.len();
        let found = problems.len();
        let end = token::line(line.text, line.at, number as u32, &mut tree.names, &mut open.tokens, problems);
        if from > 0 && begins(&open.tokens[from..], &tree.names) != Begins::Other {
            // A new definition closes what was open: the rest of the line before is missing.
            let rest = open.tokens.split_off(from);
            let late = problems.split_off(found);
            open.finish(None, block, tree, problems);
            problems.extend(late);
            open.tokens = rest;
        }
        open.count_parentheses();
        open.broken |= end.broken;
        open.asked |= end.mark.is_some();
        asked = end.mark.is_some();
        open.end = Span { start: line.at + line.text.len() as u32, end: line.at + line.text.len() as u32 };
        if end.mark.is_some() || !open.goes_on(&tree.names) {
            open.finish(end.mark, block, tree, problems);
        }
    }
    open.finish(None, block, tree, problems);
}

/// A line that begins with `?` below no question.
fn stray_answer(line: Source<'_>) -> Problem {
    let start = line.at + (line.text.len() - line.text.trim_start().len()) as u32;
    Problem::error(
        Code::MalformedQuestion,
        Span { start, end: start + 1 },
        "nothing is asked before this `?`",
    )
    .mend("write the question left of it, as in `R(pump) ?`")
    .mend("delete the line if it is an answer whose question is gone")
}

/// Reads one question that stands alone, as in a comment pair: the text left
/// of a `?`. Returns its statement, which is also added to the tree.
pub fn read_question(source: Source<'_>, block: u32, tree: &mut Tree, problems: &mut Vec<Problem>) -> usize {
    question(source, false, block, tree, problems)
}

/// The same for a pair in a cell of a Markdown table, where `|` is written `\|`.
pub fn read_cell_question(
    source: Source<'_>,
    block: u32,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) -> usize {
    question(source, true, block, tree, problems)
}

fn question(
    source: Source<'_>,
    in_cell: bool,
    block: u32,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) -> usize {
    let mut open = Open { asked: true, ..Open::default() };
    let mut at = source.at;
    for (number, line) in source.text.split('\n').enumerate() {
        let end = token::line(line, at, number as u32, &mut tree.names, &mut open.tokens, problems);
        open.broken |= end.broken;
        if let Some(mark) = end.mark {
            problems.push(
                Problem::error(
                    Code::MalformedQuestion,
                    Span { start: mark.at, end: mark.at + 1 },
                    "a question in a comment pair has its mark in the opener already",
                )
                .mend("take this `?` away"),
            );
            open.broken = true;
        }
        at += line.len() as u32 + 1;
    }
    let end = source.at + source.text.len() as u32;
    open.end = Span { start: end, end };
    if in_cell {
        undo_escapes(&mut open.tokens, &mut tree.names);
    }
    let mark = Mark { at: end, answer: Span { start: end, end }, line: 0 };
    let found = problems.len();
    open.finish_as(Some(mark), block, tree, problems, true);
    // `R(A --> B)`: the comment ended at what was to be an arrow.
    let cut = |p: &&mut Problem| matches!(p.code, Code::UnbalancedParenthesis | Code::UnfinishedLine);
    for problem in problems[found..].iter_mut().filter(cut) {
        problem.mends.push("a comment ends at its first `-->`: write series as `->` or `→`".to_string());
    }
    tree.statements.len() - 1
}

/// In quoted names and texts of a cell, `\|` is a `|`.
fn undo_escapes(tokens: &mut [Token], names: &mut Names) {
    for token in tokens {
        if let Tok::Name { sym, quoted: true } = token.tok
            && names.text(sym).contains("\\|")
        {
            let plain = names.text(sym).replace("\\|", "|");
            token.tok = Tok::Name { sym: names.intern(&plain), quoted: true };
        }
    }
}

/// Reads a right side or an argument that stands alone, as in a table's cell;
/// `in_cell` for one of a Markdown table, where `|` is written `\|`.
///
/// # Errors
/// The first problem in it.
pub fn read_expression(source: Source<'_>, in_cell: bool, tree: &mut Tree) -> Result<ExprId, Box<Problem>> {
    let mut problems = Vec::new();
    let mut tokens = Vec::new();
    let end = token::line(source.text, source.at, 0, &mut tree.names, &mut tokens, &mut problems);
    if let Some(problem) = problems.into_iter().next() {
        return Err(Box::new(problem));
    }
    if in_cell {
        undo_escapes(&mut tokens, &mut tree.names);
    }
    let stop = source.at + source.text.len() as u32;
    if let Some(mark) = end.mark {
        let place = Span { start: mark.at, end: mark.at + 1 };
        return Err(Box::new(Problem::error(Code::MalformedQuestion, place, "nothing can be asked here")));
    }
    let mut reader = Reader { tree, tokens: &tokens, at: 0, end: Span { start: stop, end: stop } };
    let value = reader.right_side()?;
    match reader.peek() {
        None => Ok(value),
        Some(_) => Err(Box::new(with_a_mend(*reader.missing_operator("an operator or the end of the cell")))),
    }
}

/// Whatever stands in the wrong place can at least be taken away.
fn with_a_mend(problem: Problem) -> Problem {
    match problem.mends.is_empty() {
        true => problem.mend("write what is missing before it, or take it away"),
        false => problem,
    }
}

/// A statement whose lines are still coming.
#[derive(Default)]
struct Open {
    tokens: Vec<Token>,
    broken: bool,
    asked: bool,
    end: Span,
    /// Parentheses open after the first `counted` tokens.
    depth: i64,
    counted: usize,
}

impl Open {
    /// Keeps count as tokens come, so that a statement of many lines stays linear.
    fn count_parentheses(&mut self) {
        for token in &self.tokens[self.counted..] {
            match token.tok {
                Tok::Open => self.depth += 1,
                Tok::Close => self.depth -= 1,
                _ => {}
            }
        }
        self.counted = self.tokens.len();
    }

    fn goes_on(&self, names: &Names) -> bool {
        let Some(last) = self.tokens.last() else { return false };
        let word = match last.tok {
            Tok::Name { sym, quoted: false } => names.text(sym),
            _ => "",
        };
        if last.tok.goes_on() || matches!(word, "else" | "and" | "or" | "of" | "with") {
            return true;
        }
        self.depth > 0
    }

    fn finish(&mut self, mark: Option<Mark>, block: u32, tree: &mut Tree, problems: &mut Vec<Problem>) {
        let asked = self.asked && mark.is_some();
        self.finish_as(mark, block, tree, problems, asked);
    }

    fn finish_as(
        &mut self,
        mark: Option<Mark>,
        block: u32,
        tree: &mut Tree,
        problems: &mut Vec<Problem>,
        asks: bool,
    ) {
        let mut open = std::mem::take(self);
        if open.tokens.is_empty() && mark.is_none() && !open.broken {
            return;
        }
        let place = mark.map_or(open.end, |m| Span { start: m.at, end: m.at + 1 });
        let span = match (open.tokens.first(), open.tokens.last()) {
            (Some(first), Some(last)) => first.span.to(last.span),
            _ => place,
        };
        let line = if open.broken {
            Err(None)
        } else {
            let mut reader = Reader { tree, tokens: &open.tokens, at: 0, end: place };
            reader.line(asks).map_err(Some)
        };
        let line = line.unwrap_or_else(|problem| {
            problems.extend(problem.map(|p| with_a_mend(*p)));
            Line::Broken(names_before_equals(&open.tokens))
        });
        tree.statements.push(Statement { line, span, mark, block });
        // The next statement takes the room of this one's tokens.
        open.tokens.clear();
        self.tokens = open.tokens;
    }
}
