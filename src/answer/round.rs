//! One round through the questions of a document: each statement that asks or
//! requires is answered, and what its reader should know is gathered.
//!
//! Notes and sheets share all of this. Where an answer goes, and what an answer
//! looks like there, is for them to say.

use super::desk::Desk;
use super::display::written;
use super::figure::Number;
use super::filled::{Asked, Filled};
use super::reply::Reply;
use super::require::{Verdict, require};
use crate::document::patch::Rewrite;
use crate::language::{self, Display, ExprId, Line, Mark, Source, Tree};
use crate::source::{Code, Level, Problem, Sources, Span};
use crate::steps::json as steps_json;
use crate::system::{DefId, Fault, Model, Out};
use std::collections::BTreeMap;
use std::ops::Range;

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

/// What a question came to, before it is written.
#[derive(Debug)]
pub(crate) enum Outcome {
    /// A number, how it is to be shown, and the question.
    Number(Number, Option<Display>, ExprId),
    /// A list, or the verdict on a requirement.
    Reply(Reply),
}

impl Outcome {
    /// The answer as text.
    ///
    /// # Errors
    /// A display that does not fit the number.
    pub(crate) fn reply(self, model: &mut Model<'_>) -> Out<Reply> {
        match self {
            Outcome::Reply(reply) => Ok(reply),
            Outcome::Number(number, display, asked) => match written(model, &number, display) {
                Ok(text) => Ok(Reply::Line(text)),
                Err(problem) => Err(misfit(model, *problem, asked)),
            },
        }
    }
}

/// A display that does not fit, as a fault at its question.
pub(crate) fn misfit(model: &mut Model<'_>, mut problem: Problem, asked: ExprId) -> Fault {
    if problem.place == Span::default() {
        problem.place = model.tree.span(asked);
    }
    model.fault(problem)
}

/// How an outcome looks in its document: see [`answer_all`].
type Write<'w, T> = &'w (dyn Fn(&mut Model<'_>, Outcome, usize, &mut Vec<Problem>) -> Out<T> + Sync);

/// From so many statements on, a note is answered in two halves at once.
pub(crate) const MANY: usize = 2000;

/// A statement's reply, before it has a place in its document.
pub(crate) struct Answered<T> {
    pub(crate) statement: usize,
    /// None for a requirement that does not ask.
    pub(crate) mark: Option<Mark>,
    pub(crate) reply: Out<T>,
    pub(crate) unmet: bool,
    /// What its reader should know of it.
    pub(crate) found: Vec<Problem>,
}

impl<T> Answered<T> {
    /// What its reader should know of it, in words.
    pub(crate) fn remarks(&self) -> Vec<String> {
        let found = self.found.iter().filter(|p| p.code != Code::NotMet);
        found.map(|p| p.message.clone()).collect()
    }
}

/// Answers all that is asked or required, and builds what nobody asks for, so
/// that what is wrong with it is found as well.
///
/// `write` says how an outcome looks in the document; it is given the number of
/// the statement, and may add remarks.
pub(crate) fn answer_all<T: Send>(model: &mut Model<'_>, write: Write<'_, T>) -> (Vec<Answered<T>>, Desk) {
    let count = model.tree.statements.len();
    if count >= MANY
        && let Some(answered) = in_halves(model, count, write)
    {
        return answered;
    }
    let mut desk = Desk::default();
    let answered = answer_some(model, &mut desk, write, 0..count);
    build_rest(model, 0..model.defs.len());
    (answered, desk)
}

/// Answers both halves at once, each with a model of its own. Nothing where
/// either finds something wrong: what is said of an error depends on all that
/// rests on it, so the note is then answered in one go.
fn in_halves<T: Send>(
    model: &mut Model<'_>,
    count: usize,
    write: Write<'_, T>,
) -> Option<(Vec<Answered<T>>, Desk)> {
    let before = model.problems.len();
    let (half, defs) = (count / 2, model.defs.len());
    let cut = model.defs.partition_point(|d| (d.statement as usize) < half);
    let work = |model: &mut Model<'_>, statements: Range<usize>, defs: Range<usize>| {
        let mut desk = Desk::default();
        let answered = answer_some(model, &mut desk, write, statements);
        build_rest(model, defs);
        (answered, desk)
    };
    let other = model.clone();
    let ((mut answered, desk), more) = rayon::join(
        || work(model, 0..half, 0..cut),
        move || {
            // Given back here, where the other half is still being answered.
            let mut other = other;
            let (more, _) = work(&mut other, half..count, cut..defs);
            let clean = other.problems.len() == before && more.iter().all(|a| a.reply.is_ok());
            clean.then_some(more)
        },
    );
    let clean = model.problems.len() == before && answered.iter().all(|a| a.reply.is_ok());
    match more {
        Some(more) if clean => answered.extend(more),
        _ => {
            *model = Model::new(model.tree, model.sources);
            return None;
        }
    }
    Some((answered, desk))
}

fn answer_some<T>(
    model: &mut Model<'_>,
    desk: &mut Desk,
    write: Write<'_, T>,
    statements: Range<usize>,
) -> Vec<Answered<T>> {
    statements.filter_map(|index| statement(index, model, desk, write)).collect()
}

fn build_rest(model: &mut Model<'_>, defs: Range<usize>) {
    for def in defs {
        model.try_definition(DefId(def as u32));
    }
}

fn statement<T>(
    index: usize,
    model: &mut Model<'_>,
    desk: &mut Desk,
    write: Write<'_, T>,
) -> Option<Answered<T>> {
    let statement = &model.tree.statements[index];
    let asks = statement.mark.is_some();
    let mut found = Vec::new();
    let (outcome, unmet) = match &statement.line {
        Line::Ask { value, display } => (outcome_of(*value, *display, model, desk), false),
        Line::Define { value, display, .. } if asks => (defined(*value, *display, model, desk), false),
        Line::Require { left, limit, right } => match require(desk, model, *left, *limit, *right) {
            Ok((verdict, text)) => {
                let unmet = verdict != Verdict::Met;
                if unmet {
                    let message = format!("requirement {text}");
                    found.push(Problem::remark(Code::NotMet, statement.span, message));
                }
                (Ok(Outcome::Reply(Reply::Line(text))), unmet)
            }
            Err(fault) => (Err(fault), false),
        },
        Line::Broken(_) if asks => (Err(Fault(u32::MAX)), false),
        _ => return None,
    };
    remarks(statement.span, desk, &mut found);
    let reply = outcome.and_then(|outcome| write(model, outcome, index, &mut found));
    Some(Answered { statement: index, mark: statement.mark, reply, unmet, found })
}

/// What an answer rests on that its reader should know: one folded remark for
/// things in several places, one for probabilities that an asked exposure left
/// alone, one for a list cut short.
fn remarks(place: Span, desk: &mut Desk, found: &mut Vec<Problem>) {
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
        let mend =
            "ask for a number of your own, `first 200`, for low orders, `order 3`, or for their `count(…)`";
        found.push(Problem::remark(Code::CutShort, place, text).mend(mend));
    }
    let unscaled = desk.take_unscaled();
    if !unscaled.is_empty() {
        let list = crate::steps::listed(&unscaled);
        let message = format!("the exposure asked for does not change the fixed probability of {list}");
        let mend = "give a rate, or the exposure that the probability is for: `0.98 over 1000 h`";
        found.push(Problem::remark(Code::FixedProbability, place, message).mend(mend));
    }
}

/// The remarks of all answers, each once, at the first answer it belongs to,
/// with how many more it belongs to.
pub(crate) fn told_once<T>(answered: &[Answered<T>]) -> Vec<Problem> {
    let mut problems: Vec<Problem> = Vec::new();
    let mut told: BTreeMap<(Code, &str), (usize, usize)> = BTreeMap::new();
    for problem in answered.iter().flat_map(|a| &a.found) {
        if problem.code == Code::NotMet {
            problems.push(problem.clone());
            continue;
        }
        told.entry((problem.code, problem.message.as_str()))
            .and_modify(|(_, more)| *more += 1)
            .or_insert_with(|| {
                problems.push(problem.clone());
                (problems.len() - 1, 0)
            });
    }
    for (at, more) in told.into_values() {
        if more > 0 {
            let answers = if more == 1 { "answer" } else { "answers" };
            problems[at].mark = format!("and {more} more {answers}");
        }
    }
    problems
}

/// What a line that defines and asks comes to: a name can stand for a number only.
fn defined(value: ExprId, display: Option<Display>, model: &mut Model<'_>, desk: &mut Desk) -> Out<Outcome> {
    match outcome_of(value, display, model, desk)? {
        Outcome::Reply(_) => {
            let place = model.tree.span(value);
            Err(model.fault(
                Problem::error(Code::WrongKind, place, "a list is no figure, and no name can stand for it")
                    .mend("ask for it without a name before it")
                    .mend("or give a name to how many there are: `n = count(cuts(feed)) ?`"),
            ))
        }
        found => Ok(found),
    }
}

fn outcome_of(
    value: ExprId,
    display: Option<Display>,
    model: &mut Model<'_>,
    desk: &mut Desk,
) -> Out<Outcome> {
    match desk.list(model, value)? {
        Some(_) if display.is_some() => {
            let place = model.tree.span(value);
            Err(model.fault(
                Problem::error(Code::WrongUnit, place, "a list has no display of its own")
                    .mend("take the `in …` away"),
            ))
        }
        Some(list) => Ok(Outcome::Reply(list)),
        None => Ok(Outcome::Number(desk.number(model, value)?, display, value)),
    }
}

/// Adds what each reading of a mixed line would give.
pub(crate) fn show_readings(model: &mut Model<'_>, desk: &mut Desk) {
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

/// What belongs to a question, so that its message can say what is wrong with
/// it, or that the fault is elsewhere.
pub(crate) struct Own<'a> {
    /// Whether a place lies in the question itself.
    pub(crate) within: &'a dyn Fn(Span) -> bool,
    /// Whether the question is a cell, so that its row is a part of it.
    pub(crate) in_cell: bool,
    /// The first error that was found in it while it was read.
    pub(crate) first: &'a dyn Fn() -> Option<&'a Problem>,
    /// A place elsewhere in words: `line 12`.
    pub(crate) elsewhere: &'a dyn Fn(Span) -> String,
}

impl Own<'_> {
    /// Whether a problem is the question's own.
    pub(crate) fn holds(&self, problem: &Problem) -> bool {
        (self.within)(problem.place)
            || (matches!(problem.code, Code::UnknownName | Code::UnknownUnit)
                && problem.labels.iter().any(|l| (self.within)(l.place)))
    }

    /// The message of an answer that is none.
    pub(crate) fn message(&self, fault: Fault, model: &Model<'_>) -> String {
        let below = fault.0 != u32::MAX && model.rests_below(fault);
        let own_line = below && self.in_cell && (self.within)(model.problem(fault).place);
        let problem =
            if fault.0 == u32::MAX || own_line { (self.first)() } else { Some(model.problem(fault)) };
        let text = match problem {
            Some(problem) if self.holds(problem) && (own_line || !below) => {
                let hint = problem.mends.iter().find(|m| m.starts_with("did you mean"));
                match hint {
                    Some(hint) => format!("{}: {hint}", problem.message),
                    None => problem.message.clone(),
                }
            }
            Some(problem) => {
                format!("rests on {}, which is in error", (self.elsewhere)(problem.place))
            }
            None => "this line is in error".to_string(),
        };
        without_number_signs(&text)
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

/// A document that has been read, and the lines and the question that are put to it.
pub(crate) struct Inquiry<'a> {
    pub(crate) sources: Sources,
    pub(crate) tree: Tree,
    pub(crate) problems: Vec<Problem>,
    pub(crate) given: &'a [String],
    pub(crate) question: &'a str,
}

impl Inquiry<'_> {
    /// The answer to the question.
    pub(crate) fn ask(self) -> Filled {
        self.one_question(|value, display, model, desk| {
            outcome_of(value, display, model, desk)?.reply(model).map(|r| r.text())
        })
    }

    /// The steps to it; the question is `R(feed)` or a formula.
    pub(crate) fn steps(self, form: StepsForm) -> Filled {
        self.one_question(|value, _, model, desk| {
            let list = desk.steps(model, value)?;
            Ok(match form {
                StepsForm::Json => steps_json(&list, model.sources, (model.digits + 3).min(15)),
                StepsForm::Text => desk.steps_reply(model, &list, true).text(),
                StepsForm::Markdown => desk.steps_reply(model, &list, true).markdown().join("\n"),
            })
        })
    }

    fn one_question(
        self,
        answer: impl Fn(ExprId, Option<Display>, &mut Model<'_>, &mut Desk) -> Out<String>,
    ) -> Filled {
        let Inquiry { mut sources, mut tree, problems: mut read, given, question } = self;
        let wanted = tree.statements.len();
        let lines = given.iter().map(|g| ("--given", g.as_str()));
        let question_line = question.trim().trim_end_matches('?');
        for (label, line) in lines.chain([("question", question_line)]) {
            let Some(at) = sources.add(label, line) else { return Filled::too_much_text(sources) };
            let source = Source { text: line, at };
            if label == "question" {
                language::read_question(source, u32::MAX, &mut tree, &mut read);
            } else {
                language::read_block(std::iter::once(source), u32::MAX, &mut tree, &mut read);
            }
        }
        let mut model = Model::new(&tree, &sources);
        let mut desk = Desk::default();
        let index = tree.statements.len() - 1;
        let statement = &tree.statements[index.max(wanted)];
        let mut unmet = 0;
        let out = match &statement.line {
            Line::Ask { value, display } | Line::Define { value, display, .. } => {
                answer(*value, *display, &mut model, &mut desk)
            }
            Line::Require { left, limit, right } => require(&mut desk, &mut model, *left, *limit, *right)
                .map(|(verdict, text)| {
                    unmet = usize::from(verdict != Verdict::Met);
                    text
                }),
            _ => Err(Fault(u32::MAX)),
        };
        let mut found = Vec::new();
        remarks(statement.span, &mut desk, &mut found);
        let told = found.iter().map(|p| p.message.clone()).collect();
        show_readings(&mut model, &mut desk);
        let (new, error) = match out {
            Ok(text) => (text, false),
            Err(fault) => (format!("! {}", message_of_one(fault, statement.span, &read, &model)), true),
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
        let mut problems = read;
        problems.append(&mut model.take_problems());
        problems.append(&mut found);
        problems.sort_by_key(|p| (p.place.start, p.place.end));
        problems.dedup();
        Filled { asked: vec![asked], problems, unmet, rewrite: Rewrite::Unchanged, sources: sources.clone() }
    }
}

fn message_of_one(fault: Fault, span: Span, read: &[Problem], model: &Model<'_>) -> String {
    let whole = Span { start: span.start, end: span.end.saturating_add(1) };
    let within = |place: Span| whole.start <= place.start && place.start <= whole.end;
    let own = |p: &Problem| {
        within(p.place)
            || (matches!(p.code, Code::UnknownName | Code::UnknownUnit)
                && p.labels.iter().any(|l| within(l.place)))
    };
    Own {
        within: &within,
        in_cell: false,
        first: &|| read.iter().find(|p| p.level == Level::Error && own(p)),
        elsewhere: &|place| model.sources.words(place),
    }
    .message(fault, model)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::note::syntax;

    /// So many blocks, with a thing that all of them share.
    fn note(blocks: usize, extra: &str) -> String {
        let mut text = "```tieback\nexposure start\nmission 3 start\nbus = 0.9999\n".to_string();
        for i in 0..blocks {
            text += &format!(
                "p{i} = fails 0.00{i} /start\nb{i} = a bus\nu{i} = (p{i} -> bus) // (p{i} -> b{i})\n"
            );
            text += &format!("R(u{i}) ?\nrequire F(u{i}) <= 0.0001 ?\ncuts(u{i}, first 1) ?\n");
        }
        format!("{text}{extra}```\n")
    }

    fn shown(answered: &[Answered<Reply>]) -> String {
        let one = |a: &Answered<Reply>| {
            format!("{} {:?} {:?} {} {:?}\n", a.statement, a.mark, a.reply, a.unmet, a.found)
        };
        answered.iter().map(one).collect()
    }

    fn write(model: &mut Model<'_>, outcome: Outcome, _: usize, _: &mut Vec<Problem>) -> Out<Reply> {
        outcome.reply(model)
    }

    #[test]
    fn halves_answer_as_the_whole() {
        let wrong = ["z = rate 2 /parsec\n", "R(u3, 2 h) ?\n", "q = rate 1 /h\n(q -> u1) ?\n"];
        for extra in ["", "x = 1 -> y\n", "R(u3, 2 start) ?\n"].into_iter().chain(wrong) {
            let (sources, tree, _) = syntax("note.md", &note(20, extra));
            let count = tree.statements.len();
            let mut whole = Model::new(&tree, &sources);
            let fresh = whole.problems.clone();
            let serial = answer_some(&mut whole, &mut Desk::default(), &write, 0..count);
            let defs = whole.defs.len();
            build_rest(&mut whole, 0..defs);
            let mut model = Model::new(&tree, &sources);
            match in_halves(&mut model, count, &write) {
                Some((halves, _)) => assert_eq!(shown(&halves), shown(&serial), "{extra}"),
                None => assert_eq!(model.problems, fresh, "{extra}"),
            }
            let clean = serial.iter().all(|a| a.reply.is_ok()) && whole.problems == fresh;
            assert_eq!(clean, !wrong.contains(&extra), "{extra}");
        }
    }
}
