//! The questions of a note answered, before their answers have places.

use super::reply_to;
use crate::answer::{Desk, Reply, Verdict, require};
use crate::language::{Line, Mark};
use crate::source::{Code, Problem, Span};
use crate::system::{DefId, Fault, Model, Out};
use std::collections::BTreeMap;
use std::ops::Range;

/// From so many statements on, a note is answered in two halves at once.
pub(super) const MANY: usize = 2000;

/// A statement's reply, before it has a place in the note.
pub(super) struct Answered {
    pub(super) statement: usize,
    /// None for a requirement that does not ask.
    pub(super) mark: Option<Mark>,
    pub(super) reply: Out<Reply>,
    pub(super) unmet: bool,
    /// What its reader should know of it.
    pub(super) found: Vec<Problem>,
}

impl Answered {
    /// What its reader should know of it, in words.
    pub(super) fn remarks(&self) -> Vec<String> {
        let found = self.found.iter().filter(|p| p.code != Code::NotMet);
        found.map(|p| p.message.clone()).collect()
    }
}

/// Answers all that is asked or required, and builds what nobody asks for, so
/// that what is wrong with it is found as well.
pub(super) fn answer_all(model: &mut Model<'_>) -> (Vec<Answered>, Desk) {
    let count = model.tree.statements.len();
    if count >= MANY
        && let Some(answered) = in_halves(model, count)
    {
        return answered;
    }
    let mut desk = Desk::default();
    let answered = answer_some(model, &mut desk, 0..count);
    build_rest(model, 0..model.defs.len());
    (answered, desk)
}

/// Answers both halves at once, each with a model of its own. Nothing where
/// either finds something wrong: what is said of an error depends on all that
/// rests on it, so the note is then answered in one go.
fn in_halves(model: &mut Model<'_>, count: usize) -> Option<(Vec<Answered>, Desk)> {
    let before = model.problems.len();
    let (half, defs) = (count / 2, model.defs.len());
    let cut = model.defs.partition_point(|d| (d.statement as usize) < half);
    let work = |model: &mut Model<'_>, statements: Range<usize>, defs: Range<usize>| {
        let mut desk = Desk::default();
        let answered = answer_some(model, &mut desk, statements);
        build_rest(model, defs);
        (answered, desk)
    };
    let mut other = model.clone();
    let ((mut answered, desk), more) = rayon::join(
        || work(model, 0..half, 0..cut),
        || {
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

fn answer_some(model: &mut Model<'_>, desk: &mut Desk, statements: Range<usize>) -> Vec<Answered> {
    statements.filter_map(|index| statement(index, model, desk)).collect()
}

fn build_rest(model: &mut Model<'_>, defs: Range<usize>) {
    for def in defs {
        model.try_definition(DefId(def as u32));
    }
}

fn statement(index: usize, model: &mut Model<'_>, desk: &mut Desk) -> Option<Answered> {
    let statement = &model.tree.statements[index];
    let asks = statement.mark.is_some();
    let mut found = Vec::new();
    let (reply, unmet) = match &statement.line {
        Line::Ask { value, display } => (reply_to(*value, *display, model, desk), false),
        Line::Define { value, display, .. } if asks => (reply_to(*value, *display, model, desk), false),
        Line::Require { left, limit, right } => match require(desk, model, *left, *limit, *right) {
            Ok((verdict, text)) => {
                let unmet = verdict != Verdict::Met;
                if unmet {
                    let message = format!("requirement {text}");
                    found.push(Problem::remark(Code::NotMet, statement.span, message));
                }
                (Ok(Reply::Line(text)), unmet)
            }
            Err(fault) => (Err(fault), false),
        },
        Line::Broken(_) if asks => (Err(Fault(u32::MAX)), false),
        _ => return None,
    };
    remarks(statement.span, desk, &mut found);
    Some(Answered { statement: index, mark: statement.mark, reply, unmet, found })
}

/// What an answer rests on that its reader should know: one folded remark for
/// things in several places, one for probabilities that an asked exposure left
/// alone, one for a list cut short.
pub(super) fn remarks(place: Span, desk: &mut Desk, found: &mut Vec<Problem>) {
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
pub(super) fn told_once(answered: &[Answered]) -> Vec<Problem> {
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

#[cfg(test)]
mod tests {
    use super::super::syntax;
    use super::*;

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

    fn shown(answered: &[Answered]) -> String {
        let one =
            |a: &Answered| format!("{} {:?} {:?} {} {:?}\n", a.statement, a.mark, a.reply, a.unmet, a.found);
        answered.iter().map(one).collect()
    }

    #[test]
    fn halves_answer_as_the_whole() {
        let wrong = ["z = rate 2 /parsec\n", "R(u3, 2 h) ?\n", "q = rate 1 /h\n(q -> u1) ?\n"];
        for extra in ["", "x = 1 -> y\n", "R(u3, 2 start) ?\n"].into_iter().chain(wrong) {
            let (sources, tree, _) = syntax("note.md", &note(20, extra));
            let count = tree.statements.len();
            let mut whole = Model::new(&tree, &sources);
            let fresh = whole.problems.clone();
            let serial = answer_some(&mut whole, &mut Desk::default(), 0..count);
            let defs = whole.defs.len();
            build_rest(&mut whole, 0..defs);
            let mut model = Model::new(&tree, &sources);
            match in_halves(&mut model, count) {
                Some((halves, _)) => assert_eq!(shown(&halves), shown(&serial), "{extra}"),
                None => assert_eq!(model.problems, fresh, "{extra}"),
            }
            let clean = serial.iter().all(|a| a.reply.is_ok()) && whole.problems == fresh;
            assert_eq!(clean, !wrong.contains(&extra), "{extra}");
        }
    }
}
