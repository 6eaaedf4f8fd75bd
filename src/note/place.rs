//! Replies to edits: each answer goes to the place of its question, and what
//! the user wrote there stays.

use super::{Asked, Work};
use crate::answer::{Answered, MANY, Own, Reply};
use crate::document::answer_place::{
    FenceAnswer, block_edit, bytes_of_lines, fence_edits, inline_edit, old_answer_lines, row_edits,
};
use crate::document::escape::{Context, escape, same_answer, same_block, unescape};
use crate::document::markdown::{Fence, Pair, PairForm, Place, Table};
use crate::language::{Line, Mark, is_answer, is_answer_block, is_answer_line};
use crate::source::{Code, Level, Problem, Span};
use crate::system::{Fault, Model};

impl Work<'_> {
    /// Places all replies. An answer that names a line names it as it will be
    /// numbered once all answers stand: where answers above it come to have
    /// more lines or fewer, the placing is done again with those counted.
    pub(super) fn place_all(&mut self, replies: &[Answered<Reply>], model: &Model<'_>) {
        let problems = self.problems.len();
        self.place_once(replies, model);
        self.shifts = self.line_shifts();
        let names_lines = replies.iter().any(|r| r.mark.is_some() && r.reply.is_err());
        if names_lines && !self.shifts.is_empty() {
            self.problems.truncate(problems);
            self.edits.clear();
            self.asked.clear();
            self.place_once(replies, model);
        }
    }

    /// Places all replies; of many, both halves at once.
    fn place_once(&mut self, replies: &[Answered<Reply>], model: &Model<'_>) {
        // The cells of one row are written together.
        let block = |a: &Answered<Reply>| self.read.tree.statements[a.statement].block;
        let mut half = if replies.len() < MANY { replies.len() } else { replies.len() / 2 };
        while half > 0 && half < replies.len() && block(&replies[half]) == block(&replies[half - 1]) {
            half += 1;
        }
        let (first, second) = replies.split_at(half);
        if second.is_empty() {
            return self.place_some(first, model);
        }
        let mut other = Work::new(self.read, self.text, self.base);
        other.shifts.clone_from(&self.shifts);
        rayon::join(|| self.place_some(first, model), || other.place_some(second, model));
        self.edits.append(&mut other.edits);
        self.edits.sort_by_key(|e| (e.span.start, e.span.end));
        self.asked.append(&mut other.asked);
        self.problems.append(&mut other.problems);
    }

    fn place_some(&mut self, replies: &[Answered<Reply>], model: &Model<'_>) {
        for answered in replies {
            self.place(answered, model);
        }
        self.finish_tables();
    }

    fn line_shifts(&self) -> Vec<(usize, i64)> {
        let count = |text: &str| text.bytes().filter(|b| *b == b'\n').count() as i64;
        let mut total = 0;
        let mut shifts = Vec::new();
        for edit in &self.edits {
            let change = count(&edit.text) - count(self.text.get(edit.span.clone()).unwrap_or(""));
            if change != 0 {
                total += change;
                shifts.push((edit.span.start, total));
            }
        }
        shifts
    }

    /// The line of a place as it will be numbered in the filled note.
    fn line_once_filled(&self, place: Span, model: &Model<'_>) -> i64 {
        let line = model.sources.line(place).map_or(0, |l| l.1 as i64);
        let at = (place.start.saturating_sub(self.base)) as usize;
        let after = self.shifts.partition_point(|(start, _)| *start < at);
        line + after.checked_sub(1).map_or(0, |i| self.shifts[i].1)
    }

    fn place(&mut self, answered: &Answered<Reply>, model: &Model<'_>) {
        let Answered { statement: index, mark: Some(mark), unmet, .. } = *answered else { return };
        let read = self.read;
        let statement = &read.tree.statements[index];
        let message;
        let reply = match &answered.reply {
            Ok(reply) => reply,
            Err(fault) => {
                let in_cell =
                    matches!(read.found.places.get(statement.block as usize), Some(Place::Table(_)));
                message = Reply::Error(self.message(*fault, statement.span, mark, in_cell, model));
                &message
            }
        };
        let error = matches!(reply, Reply::Error(_));
        let broken = matches!(statement.line, Line::Broken(_));
        let (old, stale) = match &read.found.places[statement.block as usize] {
            Place::Fence(fence) => self.in_fence(fence, mark, reply, broken, model),
            Place::Pair(pair) => self.in_pair(pair, reply, broken, model),
            Place::Table(table) => {
                let Ok(at) = read.cells.binary_search_by_key(&index, |(s, ..)| *s) else { return };
                let (_, block, row, column) = read.cells[at];
                self.in_table(table, (block, row, column), reply, model)
            }
        };
        let question = self.slice(statement.span).to_string();
        self.asked.push(Asked {
            place: statement.span,
            question,
            old,
            new: reply.text(),
            stale,
            error,
            unmet,
            remarks: answered.remarks(),
        });
    }

    fn slice(&self, span: Span) -> &str {
        self.text.get((span.start - self.base) as usize..(span.end - self.base) as usize).unwrap_or("")
    }

    /// The message of an answer that is none.
    fn message(&self, fault: Fault, span: Span, mark: Mark, in_cell: bool, model: &Model<'_>) -> String {
        let whole = Span { start: span.start, end: span.end.max(mark.at + 1) };
        // A question in a cell is its header and its row.
        let row = model.sources.line(Span { start: mark.at, end: mark.at }).map(|l| l.1);
        let within = |place: Span| match in_cell {
            true => {
                (span.start <= place.start && place.start <= span.end)
                    || model.sources.line(place).map(|l| l.1) == row
            }
            false => whole.start <= place.start && place.start <= whole.end,
        };
        let elsewhere = |place| match model.sources.find(place) {
            // Of a file that the note uses, whose lines stay as they are.
            Some((file, _)) if file.base != self.base => {
                let own = model.sources.files().first().map_or("", |f| f.name.as_str());
                format!("{} {}", from_folder_of(own, &file.name), model.sources.words(place))
            }
            _ => format!("line {}", self.line_once_filled(place, model)),
        };
        let own = Own { within: &within, in_cell, first: &|| None, elsewhere: &elsewhere };
        let first = || self.read.problems.iter().find(|p| p.level == Level::Error && own.holds(p));
        Own { first: &first, ..own }.message(fault, model)
    }

    fn not_an_answer(&mut self, place: Span) {
        let text = self.slice(place);
        let shown: String = text.trim().lines().next().unwrap_or("").chars().take(40).collect();
        self.problems.push(
            Problem::error(Code::NotAnAnswer, place, format!("`{shown}` is not shaped like an answer, and stays"))
                .mend("what stands right of a `?` is tieback's: move your text before the question, or behind a number sign as a comment")
                .mend("delete it to have the question answered here"),
        );
    }

    fn in_fence(
        &mut self,
        fence: &Fence,
        mark: Mark,
        reply: &Reply,
        broken: bool,
        model: &Model<'_>,
    ) -> (String, bool) {
        let line = &fence.lines[mark.line as usize];
        let old_lines = old_answer_lines(self.text, self.base, fence, mark.line as usize);
        let mut old = self.slice(mark.answer).to_string();
        for number in old_lines.clone() {
            if !old.is_empty() {
                old.push('\n');
            }
            old.push_str(self.slice(fence.lines[number].text).trim_start().trim_start_matches("? "));
        }
        if !answer_shaped(self.slice(mark.answer), model) {
            // A line in error may have its mark too early: `R(A ? ) ?` is one mistake.
            if !broken {
                self.not_an_answer(mark.answer);
            }
            return (old, false);
        }
        // An answer stands on the question's line or on the lines below it, never on both;
        // and the lines of a table or a list begin in ways of their own.
        if let Some(first) = old_lines.clone().next()
            && (!self.slice(mark.answer).is_empty() || !is_answer_line(self.slice(fence.lines[first].text)))
        {
            if !broken {
                self.not_an_answer(fence.lines[first].text);
            }
            return (old, false);
        }
        let answer = FenceAnswer { inline: reply.line(), lines: reply.fence_lines() };
        let following = bytes_of_lines(fence, old_lines);
        let edits = fence_edits(
            self.text,
            self.base,
            line,
            mark.at + 1,
            mark.answer.end.max(mark.at + 1),
            following,
            &answer,
        );
        let stale = !edits.is_empty();
        self.edits.extend(edits);
        (old, stale)
    }

    fn in_pair(&mut self, pair: &Pair, reply: &Reply, broken: bool, model: &Model<'_>) -> (String, bool) {
        let old = pair.answer.map_or("", |a| self.slice(a)).to_string();
        let in_lines = matches!(pair.form, PairForm::Block { on_line: false, .. });
        if let Some(answer) = pair.answer.filter(|_| in_lines && !is_answer_block(&old)) {
            self.not_an_answer(answer);
            return (old, false);
        }
        let line = reply.line();
        let edit = match (&line, pair.form) {
            (Some(line), form) => {
                let context = match form {
                    PairForm::Inline { in_cell: true, .. } => Context::Cell,
                    PairForm::Inline { in_html: false, .. } => Context::Prose,
                    _ => Context::Html,
                };
                let single = !matches!(form, PairForm::Block { on_line: false, .. }) || pair.answer.is_none();
                if let (Some(answer), true) = (pair.answer, single)
                    // A formatter may have wrapped the line that it stands on.
                    && !answer_shaped(&unescape(&old), model)
                {
                    if !broken {
                        self.not_an_answer(answer);
                    }
                    return (old, false);
                }
                if pair.answer.is_some() && same_answer(&old, &escape(line, context)) {
                    return (unescape(old.trim()), false);
                }
                inline_edit(self.text, self.base, pair, line)
            }
            (None, PairForm::Block { on_line, .. }) => {
                let lines = reply.markdown();
                if pair.answer.is_some() && !on_line && same_block(&old, &lines) {
                    return (old.trim().to_string(), false);
                }
                block_edit(self.text, self.base, pair, &lines)
            }
            (None, PairForm::Inline { .. }) => {
                self.problems.push(
                    Problem::error(
                        Code::MisplacedPair,
                        pair.opener,
                        "this answer has many lines and does not fit into a line of text",
                    )
                    .mend("put the opener alone on a line of its own, with blank lines around it")
                    .mend("or ask for one figure: `count(…)`"),
                );
                return (old, false);
            }
        };
        let stale = edit.is_some();
        self.edits.extend(edit);
        (unescape(old.trim()), stale)
    }

    fn in_table(
        &mut self,
        table: &Table,
        (block, row, column): (usize, usize, usize),
        reply: &Reply,
        model: &Model<'_>,
    ) -> (String, bool) {
        let Some(cell) = table.rows.get(row).and_then(|r| r.cells.get(column)) else {
            return (String::new(), false);
        };
        let old = self.slice(cell.text).to_string();
        if !answer_shaped(&unescape(&old), model) {
            self.not_an_answer(cell.text);
            return (old, false);
        }
        let Some(line) = reply.line() else {
            self.problems.push(
                Problem::error(
                    Code::MisplacedPair,
                    cell.text,
                    "this answer has many lines and does not fit into a cell",
                )
                .mend("ask it in a block of its own"),
            );
            return (old, false);
        };
        if !old.is_empty() && same_answer(&old, &escape(&line, Context::Cell)) {
            return (unescape(&old), false);
        }
        self.cells.push((block, row, column, line));
        (unescape(&old), true)
    }

    /// Edits of tables, row by row, since missing cells of a row are added together.
    fn finish_tables(&mut self) {
        let cells = std::mem::take(&mut self.cells);
        let mut at = 0;
        while at < cells.len() {
            let (block, row, ..) = cells[at];
            let end =
                cells[at..].iter().position(|c| (c.0, c.1) != (block, row)).map_or(cells.len(), |n| at + n);
            let answers: Vec<(usize, &str)> = cells[at..end].iter().map(|c| (c.2, c.3.as_str())).collect();
            if let Place::Table(table) = &self.read.found.places[block] {
                self.edits.extend(row_edits(self.text, self.base, &table.rows[row], &answers));
            }
            at = end;
        }
        self.edits.sort_by_key(|e| (e.span.start, e.span.end));
    }
}

/// A path as it reads from the folder of a note: an answer must not depend on
/// the folder that the program was started in.
fn from_folder_of<'p>(note: &str, path: &'p str) -> &'p str {
    let folder = note.rfind(['/', '\\']).map_or("", |end| &note[..=end]);
    path.strip_prefix(folder).unwrap_or(path)
}

/// Whether a text is one that tieback writes, whatever blanks stand between its words.
fn answer_shaped(text: &str, model: &Model<'_>) -> bool {
    let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
    is_answer(&text, &|word| model.units.is_unit(word, &model.tree.names))
}
