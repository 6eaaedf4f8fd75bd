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
use crate::system::{Fault, Model, Out};
use std::collections::BTreeMap;

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

/// A statement's reply, before it has a place in its document.
pub(crate) struct Answered<T> {
    pub(crate) statement: usize,
    pub(crate) mark: Mark,
    pub(crate) reply: Out<T>,
    pub(crate) unmet: bool,
    pub(crate) remarks: Vec<String>,
}

/// What is gathered on the way.
#[derive(Default)]
pub(crate) struct Round {
    /// Requirements that are not met or undecided.
    pub(crate) unmet: usize,
    /// Remarks on answers, and requirements that are not met.
    pub(crate) problems: Vec<Problem>,
    /// Remarks made so far: where among the problems, and how many more answers they belong to.
    told: BTreeMap<(Code, String), (usize, usize)>,
}

impl Round {
    /// Answers every statement that asks; `write` says how an outcome looks in the document.
    pub(crate) fn answer_all<T>(
        &mut self,
        model: &mut Model<'_>,
        desk: &mut Desk,
        write: &mut dyn FnMut(&mut Model<'_>, Outcome, usize) -> Out<T>,
    ) -> Vec<Answered<T>> {
        let count = model.tree.statements.len();
        let replies =
            (0..count).filter_map(|index| self.statement(index, model, desk, write)).collect::<Vec<_>>();
        self.finish_remarks();
        for def in 0..model.defs.len() as u32 {
            model.try_definition(crate::system::DefId(def));
        }
        replies
    }

    fn statement<T>(
        &mut self,
        index: usize,
        model: &mut Model<'_>,
        desk: &mut Desk,
        write: &mut dyn FnMut(&mut Model<'_>, Outcome, usize) -> Out<T>,
    ) -> Option<Answered<T>> {
        let tree = model.tree;
        let statement = &tree.statements[index];
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
                let reply = reply.and_then(|reply| write(model, Outcome::Reply(reply), index));
                return Some(Answered { statement: index, mark, reply, unmet, remarks });
            }
            Line::Broken(_) if asks => None,
            _ => return None,
        };
        let mark = statement.mark?;
        let reply = match value {
            None => Err(Fault(u32::MAX)),
            Some((value, display)) => {
                outcome_of(value, display, model, desk).and_then(|found| write(model, found, index))
            }
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
        found.into_iter().for_each(|problem| self.remark(problem));
        texts
    }

    /// Adds a remark, or counts it where the same has been made.
    pub(crate) fn remark(&mut self, problem: Problem) {
        match self.told.get_mut(&(problem.code, problem.message.clone())) {
            Some((_, more)) => *more += 1,
            None => {
                self.told.insert((problem.code, problem.message.clone()), (self.problems.len(), 0));
                self.problems.push(problem);
            }
        }
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
}

fn outcome_of(
    value: ExprId,
    display: Option<Display>,
    model: &mut Model<'_>,
    desk: &mut Desk,
) -> Out<Outcome> {
    match desk.list(model, value)? {
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
        let mut round = Round::default();
        let remarks = round.remarks(statement.span, &mut desk);
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
            remarks,
        };
        let mut problems = read;
        problems.append(&mut model.take_problems());
        problems.append(&mut round.problems);
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
