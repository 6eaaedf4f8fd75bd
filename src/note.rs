//! One note from end to end: places, language, model, answers, edits.

use crate::answer::{Desk, Number, Reply, Verdict, require, written};
use crate::document::answer_place::{
    FenceAnswer, block_edit, bytes_of_lines, fence_edits, inline_edit, old_answer_lines, row_edits,
};
use crate::document::escape::{Context, escape, same_answer, same_block, unescape};
use crate::document::markdown::{Fence, Found, Pair, PairForm, Place, Table, find};
pub use crate::document::patch::Rewrite;
use crate::document::patch::{Edit, apply};
use crate::language::{self, Line, Mark, Source, Tree, is_answer, is_answer_block, is_answer_line};
use crate::source::{Code, Level, Problem, Sources, Span};
use crate::steps::json as steps_json;
use crate::system::{Fault, Model, Out};
use std::collections::BTreeMap;
use std::sync::Arc;

/// One question and what came of it.
#[derive(Clone, Debug)]
pub struct Asked {
    /// The question in the source.
    pub place: Span,
    /// The question as written.
    pub question: String,
    /// The answer that was found.
    pub old: String,
    /// The answer now; several lines are joined by line feeds.
    pub new: String,
    /// Whether the two differ.
    pub stale: bool,
    /// Whether it has no answer but a message.
    pub error: bool,
    /// Whether it is a requirement that is not met or undecided.
    pub unmet: bool,
    /// What the reader should know of the answer.
    pub remarks: Vec<String>,
}

/// What filling one note gave.
#[derive(Debug)]
pub struct Filled {
    /// The texts that spans point into.
    pub sources: Sources,
    /// Everything wrong or worth a remark, by place.
    pub problems: Vec<Problem>,
    /// The questions, in the order they stand.
    pub asked: Vec<Asked>,
    /// Requirements, asked or not, that are not met or undecided.
    pub unmet: usize,
    /// The note with its answers.
    pub rewrite: Rewrite,
}

/// How steps are written.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum StepsForm {
    /// Lines for a terminal.
    Text,
    /// A Markdown list.
    Markdown,
    /// JSON.
    Json,
}

/// Fills a note: finds its questions and answers them.
pub fn fill(name: &str, text: &str) -> Filled {
    fill_shared(name, Arc::from(text))
}

/// The same for a text that the caller goes on using: a large note is held once.
pub fn fill_shared(name: &str, text: Arc<str>) -> Filled {
    let mut sources = Sources::default();
    let Some(base) = sources.add(name, text.clone()) else { return too_much_text(sources) };
    let text: &str = &text;
    let found = find(text, base);
    if found.places.is_empty() {
        let mut problems = found.problems;
        if problems.is_empty() {
            let place = Span { start: base, end: base };
            problems.push(
                Problem::remark(Code::NothingToDo, place, "this note holds nothing for tieback").mend(
                    "write a fenced block whose first word is `tieback`, or a comment pair such as `<!--? R(feed) -->`",
                ),
            );
        }
        return Filled { sources, problems, asked: Vec::new(), unmet: 0, rewrite: Rewrite::Unchanged };
    }
    let read = read(text, base, found);
    let (problems, asked, unmet, rewrite) = answer_note(&read, &sources, text, base);
    Filled { sources, problems, asked, unmet, rewrite }
}

fn too_much_text(sources: Sources) -> Filled {
    let problem =
        Problem::error(Code::TooLarge, Span::default(), "the texts of one run are larger than 4 GiB")
            .mend("run over fewer files at a time");
    Filled { sources, problems: vec![problem], asked: Vec::new(), unmet: 0, rewrite: Rewrite::Unchanged }
}

/// The syntax of a note: everything in its blocks, pairs and tables.
pub fn syntax(name: &str, text: &str) -> (Sources, Tree, Vec<Problem>) {
    let mut sources = Sources::default();
    let Some(base) = sources.add(name, text) else { return (sources, Tree::default(), Vec::new()) };
    let read = read(text, base, find(text, base));
    (sources, read.tree, read.problems)
}

/// A note as read: its places, its syntax, and what asks where.
struct Read {
    found: Found,
    tree: Tree,
    problems: Vec<Problem>,
    /// Cells that ask: statement, place, row, column.
    cells: Vec<(usize, usize, usize, usize)>,
}

fn read(text: &str, base: u32, found: Found) -> Read {
    let mut tree = Tree::default();
    let mut problems = Vec::new();
    let mut cells = Vec::new();
    let slice = |span: Span| text.get((span.start - base) as usize..(span.end - base) as usize).unwrap_or("");
    for (block, place) in found.places.iter().enumerate() {
        match place {
            Place::Fence(fence) => {
                let lines = fence.lines.iter().map(|l| Source { text: slice(l.text), at: l.text.start });
                language::read_block(lines, block as u32, &mut tree, &mut problems);
            }
            Place::Pair(pair) => {
                let source = Source { text: slice(pair.question), at: pair.question.start };
                language::read_question(source, block as u32, &mut tree, &mut problems);
            }
            Place::Table(_) => {}
        }
    }
    // Tables come last: their headers may name attributes that a later block declares,
    // and their rows may ask about things that stand elsewhere.
    let grids: Vec<(usize, language::Grid<'_>)> = found
        .places
        .iter()
        .enumerate()
        .filter_map(|(block, place)| match place {
            Place::Table(table) => Some((block, grid_of(table, &slice))),
            _ => None,
        })
        .collect();
    for (block, grid) in &grids {
        language::read_grid(grid, *block as u32, &mut tree, &mut problems);
    }
    for (block, grid) in &grids {
        let asks = language::ask_grid(grid, *block as u32, &mut tree, &mut problems);
        cells.extend(asks.into_iter().map(|(s, row, column)| (s, *block, row, column)));
    }
    Read { found, tree, problems, cells }
}

fn grid_of<'a>(table: &Table, slice: &dyn Fn(Span) -> &'a str) -> language::Grid<'a> {
    let row = |row: &crate::document::markdown::Row| {
        row.cells.iter().map(|c| Source { text: slice(c.text), at: c.text.start }).collect::<Vec<_>>()
    };
    let broken = table.rows.iter().enumerate().filter(|(_, r)| r.too_many).map(|(i, _)| i).collect();
    language::Grid {
        opener: table.opener,
        header: row(&table.header),
        rows: table.rows.iter().map(row).collect(),
        broken,
    }
}

type Outcome = (Vec<Problem>, Vec<Asked>, usize, Rewrite);

/// A statement's reply, before it has a place in the note.
struct Answered {
    statement: usize,
    mark: Mark,
    reply: Out<Reply>,
    unmet: bool,
    remarks: Vec<String>,
}

fn answer_note(read: &Read, sources: &Sources, text: &str, base: u32) -> Outcome {
    let mut model = Model::new(&read.tree, sources);
    let mut desk = Desk::default();
    let mut work = Work {
        read,
        text,
        base,
        edits: Vec::new(),
        asked: Vec::new(),
        unmet: 0,
        problems: Vec::new(),
        cells: Vec::new(),
        shifts: Vec::new(),
        told: BTreeMap::new(),
    };
    let replies: Vec<Answered> = (0..read.tree.statements.len())
        .filter_map(|index| work.statement(index, &mut model, &mut desk))
        .collect();
    work.finish_remarks();
    work.place_all(&replies, &model);
    for def in 0..model.defs.len() as u32 {
        model.try_definition(crate::system::DefId(def));
    }
    let mut problems = read.found.problems.clone();
    problems.extend(read.problems.iter().cloned());
    show_readings(&mut model, &mut desk);
    problems.append(&mut model.take_problems());
    problems.append(&mut work.problems);
    problems.sort_by_key(|p| (p.place.start, p.place.end));
    problems.dedup();
    let edits = std::mem::take(&mut work.edits);
    let rewrite = match apply(text.as_bytes(), &edits) {
        Ok(rewrite) => rewrite,
        Err(overlap) => {
            let place = Span::new(overlap.second.start, overlap.second.end);
            problems.push(
                Problem::error(
                    Code::MisplacedPair,
                    place,
                    "two answers would stand in one place; nothing was written",
                )
                .mend("take one of the two questions away"),
            );
            Rewrite::Unchanged
        }
    };
    work.asked.sort_by_key(|a| a.place.start);
    (problems, work.asked, work.unmet, rewrite)
}

/// Adds what each reading of a mixed line would give.
fn show_readings(model: &mut Model<'_>, desk: &mut Desk) {
    for index in 0..model.problems.len() {
        if model.problems[index].code != Code::MixedOperators {
            continue;
        }
        let place = model.problems[index].place;
        let tree = model.tree;
        let Some(mixed) = tree.mixed_at(place) else { continue };
        let mut mends = Vec::new();
        for reading in &mixed.readings {
            let text = model.text_of(*reading);
            let count = model.problems.len();
            let value =
                desk.prepare(model, *reading).and_then(|p| desk.value(model, *reading, &p, &[], place));
            // A reading that has no value says nothing more: its own problems are the line's.
            model.problems.truncate(count);
            mends.push(match value {
                Ok(valued) => {
                    let number = Number::Chance(valued.chance, crate::steps::Side::Works, valued.bound);
                    let shown = written(model, &number, None).unwrap_or_default();
                    format!("write `{text}` (R = {shown})")
                }
                Err(_) => format!("write `{text}`"),
            });
        }
        model.problems[index].mends.extend(mends);
    }
}

struct Work<'a> {
    read: &'a Read,
    text: &'a str,
    base: u32,
    edits: Vec<Edit>,
    asked: Vec<Asked>,
    unmet: usize,
    problems: Vec<Problem>,
    /// Answers of table cells: place, row, column, text.
    cells: Vec<(usize, usize, usize, String)>,
    /// Where answers add or take lines, and how many: by place, summed up.
    shifts: Vec<(usize, i64)>,
    /// Remarks made so far: where among the problems, and how many more answers they belong to.
    told: BTreeMap<(Code, String), (usize, usize)>,
}

impl Work<'_> {
    /// Places all replies. An answer that names a line names it as it will be
    /// numbered once all answers stand: where answers above it come to have
    /// more lines or fewer, the placing is done again with those counted.
    fn place_all(&mut self, replies: &[Answered], model: &Model<'_>) {
        let problems = self.problems.len();
        self.place_once(replies, model);
        self.shifts = self.line_shifts();
        let names_lines = replies.iter().any(|r| r.reply.is_err());
        if names_lines && !self.shifts.is_empty() {
            self.problems.truncate(problems);
            self.edits.clear();
            self.asked.clear();
            self.place_once(replies, model);
        }
    }

    fn place_once(&mut self, replies: &[Answered], model: &Model<'_>) {
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

    fn statement(&mut self, index: usize, model: &mut Model<'_>, desk: &mut Desk) -> Option<Answered> {
        let statement = &self.read.tree.statements[index];
        let asks = statement.mark.is_some();
        let value = match &statement.line {
            Line::Ask { value, display } => Some((*value, *display)),
            Line::Define { value, display, .. } if asks => Some((*value, *display)),
            Line::Require { left, limit, right } => {
                let out = require(desk, model, *left, *limit, *right);
                let (reply, unmet) = match out {
                    Ok((verdict, text)) => (Ok(Reply::Line(text)), verdict != Verdict::Met),
                    Err(fault) => (Err(fault), false),
                };
                if unmet {
                    self.unmet += 1;
                    if let Ok(Reply::Line(text)) = &reply {
                        self.problems.push(Problem::remark(
                            Code::NotMet,
                            statement.span,
                            format!("requirement {text}"),
                        ));
                    }
                }
                let remarks = self.remarks(statement.span, desk);
                let mark = statement.mark?;
                return Some(Answered { statement: index, mark, reply, unmet, remarks });
            }
            Line::Broken(_) if asks => None,
            _ => return None,
        };
        let mark = statement.mark?;
        let reply = match value {
            None => Err(Fault(u32::MAX)),
            Some((value, display)) => reply_to(value, display, model, desk),
        };
        let remarks = self.remarks(statement.span, desk);
        Some(Answered { statement: index, mark, reply, unmet: false, remarks })
    }

    /// What an answer rests on that its reader should know: one folded remark for
    /// things in several places, one for probabilities that an asked exposure left
    /// alone, one for a list cut short. Returned for the answer; as a problem each
    /// stands once, at the first answer it belongs to.
    fn remarks(&mut self, place: Span, desk: &mut Desk) -> Vec<String> {
        let mut found: Vec<Problem> = Vec::new();
        let mut names: Vec<String> = Vec::new();
        for prepared in desk.take_leant_on() {
            for name in &prepared.repeated {
                if !names.contains(name) {
                    names.push(name.clone());
                }
            }
        }
        if !names.is_empty() {
            let (verb, count) = if names.len() == 1 {
                ("stands", "counts as one thing")
            } else {
                ("stand", "count as one thing each")
            };
            let list = crate::steps::listed(&names);
            let message = format!("{list} {verb} in several places and {count}");
            found.push(Problem::remark(Code::UsedTwice, place, message));
        }
        for text in desk.take_cut_short() {
            let mend = "ask for a number of your own, `first 200`, for low orders, `order 3`, or for their `count(…)`";
            found.push(Problem::remark(Code::CutShort, place, text).mend(mend));
        }
        let unscaled = desk.take_unscaled();
        if !unscaled.is_empty() {
            let list = crate::steps::listed(&unscaled);
            let message = format!("the exposure asked for does not change the fixed probability of {list}");
            let mend = "give a rate, or the exposure that the probability is for: `0.98 over 1000 h`";
            found.push(Problem::remark(Code::FixedProbability, place, message).mend(mend));
        }
        let texts = found.iter().map(|p| p.message.clone()).collect();
        for problem in found {
            match self.told.get_mut(&(problem.code, problem.message.clone())) {
                Some((_, more)) => *more += 1,
                None => {
                    self.told.insert((problem.code, problem.message.clone()), (self.problems.len(), 0));
                    self.problems.push(problem);
                }
            }
        }
        texts
    }

    /// Says of each remark how many more answers it belongs to.
    fn finish_remarks(&mut self) {
        for (at, more) in self.told.values() {
            if *more > 0 {
                let answers = if *more == 1 { "answer" } else { "answers" };
                self.problems[*at].mark = format!("and {more} more {answers}");
            }
        }
    }

    fn place(&mut self, answered: &Answered, model: &Model<'_>) {
        let Answered { statement: index, mark, unmet, .. } = *answered;
        let reply = answered.reply.clone();
        let read = self.read;
        let statement = &read.tree.statements[index];
        let reply = reply.unwrap_or_else(|fault| {
            let in_cell = matches!(read.found.places.get(statement.block as usize), Some(Place::Table(_)));
            Reply::Error(self.message(fault, statement.span, mark, in_cell, model))
        });
        let error = matches!(reply, Reply::Error(_));
        let broken = matches!(statement.line, Line::Broken(_));
        let (old, stale) = match &read.found.places[statement.block as usize] {
            Place::Fence(fence) => self.in_fence(fence, mark, &reply, broken, model),
            Place::Pair(pair) => self.in_pair(pair, &reply, broken, model),
            Place::Table(table) => {
                let Some(&(_, block, row, column)) = read.cells.iter().find(|(s, ..)| *s == index) else {
                    return;
                };
                self.in_table(table, (block, row, column), &reply, model)
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
            remarks: answered.remarks.clone(),
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
        let own = |p: &Problem| {
            within(p.place)
                || (matches!(p.code, Code::UnknownName | Code::UnknownUnit)
                    && p.labels.iter().any(|l| within(l.place)))
        };
        let below = fault.0 != u32::MAX && model.rests_below(fault);
        let own_line = below && in_cell && within(model.problem(fault).place);
        let problem = if fault.0 == u32::MAX || own_line {
            self.read.problems.iter().find(|p| p.level == Level::Error && own(p))
        } else {
            Some(model.problem(fault))
        };
        let text = match problem {
            Some(problem) if own(problem) && (own_line || !below) => {
                let hint = problem.mends.iter().find(|m| m.starts_with("did you mean"));
                match hint {
                    Some(hint) => format!("{}: {hint}", problem.message),
                    None => problem.message.clone(),
                }
            }
            Some(problem) => {
                let line = self.line_once_filled(problem.place, model);
                format!("rests on line {line}, which is in error")
            }
            None => "this line is in error".to_string(),
        };
        without_number_signs(&text)
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

/// Whether a text is one that tieback writes, whatever blanks stand between its words.
fn answer_shaped(text: &str, model: &Model<'_>) -> bool {
    let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
    is_answer(&text, &|word| model.units.is_unit(word, &model.tree.names))
}

fn reply_to(
    value: language::ExprId,
    display: Option<language::Display>,
    model: &mut Model<'_>,
    desk: &mut Desk,
) -> Out<Reply> {
    if let Some(list) = desk.list(model, value)? {
        return Ok(list);
    }
    let number = desk.number(model, value)?;
    match written(model, &number, display) {
        Ok(text) => Ok(Reply::Line(text)),
        Err(mut problem) => {
            if problem.place == Span::default() {
                problem.place = model.tree.span(value);
            }
            Err(model.fault(*problem))
        }
    }
}

/// An answer holds no `#` outside quotes: it would begin a comment.
fn without_number_signs(text: &str) -> String {
    let mut inside = false;
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '"' => {
                inside = !inside;
                out.push(c);
            }
            '#' if !inside => out.push_str("number sign"),
            '\n' | '\r' => out.push(' '),
            c => out.push(c),
        }
    }
    out
}

/// One question against the definitions of a note and further lines.
pub fn ask(name: &str, text: &str, given: &[String], question: &str) -> Filled {
    one_question(name, text, given, question, |value, display, model, desk| {
        reply_to(value, display, model, desk).map(|r| r.text())
    })
}

/// The steps of a question, in one of their forms; `question` is `R(feed)` or a formula.
pub fn steps(name: &str, text: &str, given: &[String], question: &str, form: StepsForm) -> Filled {
    one_question(name, text, given, question, |value, _, model, desk| {
        let list = desk.steps(model, value)?;
        Ok(match form {
            StepsForm::Json => steps_json(&list, model.sources, (model.digits + 3).min(15)),
            StepsForm::Text => desk.steps_reply(model, &list, true).text(),
            StepsForm::Markdown => desk.steps_reply(model, &list, true).markdown().join("\n"),
        })
    })
}

fn one_question(
    name: &str,
    text: &str,
    given: &[String],
    question: &str,
    answer: impl Fn(language::ExprId, Option<language::Display>, &mut Model<'_>, &mut Desk) -> Out<String>,
) -> Filled {
    let mut sources = Sources::default();
    let Some(base) = sources.add(name, text) else { return too_much_text(sources) };
    let mut read = read(text, base, find(text, base));
    let wanted = read.tree.statements.len();
    let lines = given.iter().map(|g| ("--given", g.as_str()));
    let question_line = question.trim().trim_end_matches('?');
    for (label, line) in lines.chain([("question", question_line)]) {
        let Some(at) = sources.add(label, line) else { return too_much_text(sources) };
        let source = Source { text: line, at };
        if label == "question" {
            language::read_question(source, u32::MAX, &mut read.tree, &mut read.problems);
        } else {
            language::read_block(std::iter::once(source), u32::MAX, &mut read.tree, &mut read.problems);
        }
    }
    let mut model = Model::new(&read.tree, &sources);
    let mut desk = Desk::default();
    let index = read.tree.statements.len() - 1;
    let statement = &read.tree.statements[index.max(wanted)];
    let mut unmet = 0;
    let out = match &statement.line {
        Line::Ask { value, display } | Line::Define { value, display, .. } => {
            answer(*value, *display, &mut model, &mut desk)
        }
        Line::Require { left, limit, right } => {
            require(&mut desk, &mut model, *left, *limit, *right).map(|(verdict, text)| {
                unmet = usize::from(verdict != Verdict::Met);
                text
            })
        }
        _ => Err(Fault(u32::MAX)),
    };
    let mut work = Work {
        read: &read,
        text,
        base,
        edits: Vec::new(),
        asked: Vec::new(),
        unmet,
        problems: Vec::new(),
        cells: Vec::new(),
        shifts: Vec::new(),
        told: BTreeMap::new(),
    };
    let remarks = work.remarks(statement.span, &mut desk);
    show_readings(&mut model, &mut desk);
    let mark = statement.mark.unwrap_or(Mark { at: statement.span.end, answer: statement.span, line: 0 });
    let (new, error) = match out {
        Ok(text) => (text, false),
        Err(fault) => (format!("! {}", work.message(fault, statement.span, mark, false, &model)), true),
    };
    let asked = Asked {
        place: statement.span,
        question: question_line.trim().to_string(),
        old: String::new(),
        new,
        stale: false,
        error,
        unmet: unmet > 0,
        remarks,
    };
    let mut problems: Vec<Problem> = read.found.problems.clone();
    problems.extend(read.problems.iter().cloned());
    problems.append(&mut model.take_problems());
    problems.append(&mut work.problems);
    problems.sort_by_key(|p| (p.place.start, p.place.end));
    problems.dedup();
    Filled { asked: vec![asked], problems, unmet, rewrite: Rewrite::Unchanged, sources: sources.clone() }
}
