//! One note from end to end: places, language, model, answers, edits.

mod ahead;
mod answers;
mod place;
mod read;

use crate::answer::{Desk, Number, Reply, Verdict, require, written};
pub use crate::document::patch::Rewrite;
use crate::document::patch::{Edit, apply};
use crate::language::{self, Line, Mark, Source, Tree};
use crate::source::{Code, Problem, Sources, Span};
use crate::steps::json as steps_json;
use crate::system::{Fault, Model, Out};
use answers::{answer_all, remarks, told_once};
use read::{Read, find_and_read};
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
    let read = find_and_read(text, base);
    if read.found.places.is_empty() {
        let mut problems = read.found.problems;
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
    let read = find_and_read(text, base);
    (sources, read.tree, read.problems)
}

type Outcome = (Vec<Problem>, Vec<Asked>, usize, Rewrite);

fn answer_note(read: &Read, sources: &Sources, text: &str, base: u32) -> Outcome {
    let mut model = Model::new(&read.tree, sources);
    let (answered, mut desk) = answer_all(&mut model);
    let unmet = answered.iter().filter(|a| a.unmet).count();
    let mut work = Work::new(read, text, base);
    work.problems = told_once(&answered);
    work.place_all(&answered, &model);
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
    (problems, work.asked, unmet, rewrite)
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
    problems: Vec<Problem>,
    /// Answers of table cells: place, row, column, text.
    cells: Vec<(usize, usize, usize, String)>,
    /// Where answers add or take lines, and how many: by place, summed up.
    shifts: Vec<(usize, i64)>,
}

impl<'a> Work<'a> {
    fn new(read: &'a Read, text: &'a str, base: u32) -> Work<'a> {
        Work {
            read,
            text,
            base,
            edits: Vec::new(),
            asked: Vec::new(),
            problems: Vec::new(),
            cells: Vec::new(),
            shifts: Vec::new(),
        }
    }
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
    let mut read = find_and_read(text, base);
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
    let mut work = Work::new(&read, text, base);
    remarks(statement.span, &mut desk, &mut work.problems);
    let told = work.problems.iter().map(|p| p.message.clone()).collect();
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
        remarks: told,
    };
    let mut problems: Vec<Problem> = read.found.problems.clone();
    problems.extend(read.problems.iter().cloned());
    problems.append(&mut model.take_problems());
    problems.append(&mut work.problems);
    problems.sort_by_key(|p| (p.place.start, p.place.end));
    problems.dedup();
    Filled { asked: vec![asked], problems, unmet, rewrite: Rewrite::Unchanged, sources: sources.clone() }
}
