//! What a review shows, gathered from a document: its questions and
//! requirements with their steps, and what ranks highest.

use crate::answer::{Desk, End, Reply, answer_all, require_parts};
use crate::language::{Expr, ExprId, Limit, Line, Tree};
use crate::source::{Problem, Sources, Span};
use crate::steps::StepList;
use crate::system::{Model, Quantity};

/// The most systems that are ranked.
const RANKED: usize = 8;

/// One question or requirement.
#[derive(Clone, Debug)]
pub struct Answer {
    /// The question as it stands.
    pub question: String,
    /// Where it stands: `line 12`, `Power!C7`.
    pub place: String,
    /// The answer in words.
    pub text: String,
    /// What its steps end in; none for what has no steps.
    pub end: Option<End>,
    /// For a requirement: at least or at most, the limit, and whether it is met.
    pub limit: Option<(Limit, Quantity, bool)>,
}

/// What a review shows.
#[derive(Debug, Default)]
pub struct Review {
    /// Questions and requirements in the order they stand.
    pub answers: Vec<Answer>,
    /// The steps of all of them.
    pub steps: StepList,
    /// For each asked system, its name and the table of its things: head, then rows.
    pub rankings: Vec<(String, Vec<Vec<String>>)>,
    /// Where the data of a thing stand, and the source that is given for them.
    pub sources: Vec<(Span, String)>,
    /// Problems that were met on the way.
    pub problems: Vec<Problem>,
    /// Requirements that are not met or undecided.
    pub unmet: usize,
    /// Significant digits of answers.
    pub digits: u8,
}

/// Gathers what a review of a document shows.
pub fn gather(tree: &Tree, sources: &Sources) -> Review {
    let mut model = Model::new(tree, sources);
    let (answered, mut desk) = answer_all(&mut model, &|model, found, _, _| found.reply(model));
    let mut review = Review { digits: model.digits, ..Review::default() };
    let mut seen: Vec<String> = Vec::new();
    for reply in &answered {
        let statement = &tree.statements[reply.statement];
        review.unmet += usize::from(reply.unmet);
        let (value, limit) = match &statement.line {
            Line::Ask { value, .. } | Line::Define { value, .. } => (*value, None),
            Line::Require { left, limit, right } => {
                let Ok((value, limit, bar)) = require_parts(&mut desk, &mut model, *left, *limit, *right)
                else {
                    continue;
                };
                (value, Some((limit, bar, !reply.unmet)))
            }
            _ => continue,
        };
        let text = match &reply.reply {
            Ok(Reply::Line(text)) => text.clone(),
            Ok(_) => continue, // lists are in the document
            Err(_) => "no answer: see what is in error".to_string(),
        };
        let known = model.problems.len();
        let end =
            reply.reply.is_ok().then(|| desk.add_steps(&mut model, value, &mut review.steps).ok()).flatten();
        // What has no steps is shown with its value; that says nothing of the document.
        model.problems.truncate(known);
        let written = sources.text(statement.span).split_whitespace().collect::<Vec<_>>().join(" ");
        // A header says what is asked of its rows; what was asked of this one is the whole.
        let question = if written.contains('(') || limit.is_some() { written } else { model.text_of(value) };
        let place = sources.words(statement.span);
        review.answers.push(Answer { question, place, text, end, limit });
        rank(&mut review, &mut seen, value, &mut model, &mut desk);
    }
    review.problems = model.take_problems();
    review
}

/// Ranks the system of a question, if it has not been.
fn rank(review: &mut Review, seen: &mut Vec<String>, value: ExprId, model: &mut Model<'_>, desk: &mut Desk) {
    let tree = model.tree;
    let call = tree.inside_groups(value);
    let Expr::Call(word, args) = tree.expr(call) else { return };
    if !matches!(tree.names.text(word), "R" | "F") || review.rankings.len() >= RANKED {
        return;
    }
    let Some(&thing) = tree.list(args).first() else { return };
    let name = model.text_of(thing);
    if seen.contains(&name) {
        return;
    }
    seen.push(name.clone());
    if let Ok(prepared) = desk.prepare(model, thing) {
        for leaf in &prepared.system.leaves {
            if let Some(source) = model.item(leaf.item).source {
                review.sources.push((tree.span(leaf.template), tree.names.text(source).to_string()));
            }
        }
    }
    let known = model.problems.len();
    if let Ok(Reply::Table { head, rows, .. }) = desk.rank_table(model, call, args) {
        // The row of definitions stands below; one thing alone needs no ranking.
        if rows.len() > 2 {
            review.rankings.push((name, std::iter::once(head).chain(rows).collect()));
        }
    }
    model.problems.truncate(known);
}
