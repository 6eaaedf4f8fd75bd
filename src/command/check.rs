//! `tieback check`: says whether the notes are as tieback would leave them.

use super::Voice;
use super::document::{Document, Room};
use super::each::{Outcome, counted, each};
use super::input::{Input, expand};
use super::progress::Watch;
use super::verdict::Verdict;
use crate::answer::{Asked, Filled};
use crate::document::patch::Rewrite;
use crate::sheets::Writing;
use crate::source::{Code, Problem};
use clap::Args;
use std::path::PathBuf;

/// Find stale answers, unmet requirements and errors, and change nothing
#[derive(Args, Debug)]
#[command(after_help = "Example:\n  tieback check notes/")]
pub(super) struct Check {
    /// Notes, parts lists, folders of them, or patterns; `-` for standard input
    #[arg(value_name = "FILE", required = true)]
    files: Vec<PathBuf>,

    #[command(flatten)]
    room: Room,
}

impl Check {
    pub(super) fn run(&self, voice: Voice) -> Verdict {
        each(&expand(&self.files), voice, |input, watch| one(input, &self.room, watch))
    }
}

fn one(input: &Input, room: &Room, watch: &Watch) -> Outcome {
    match Document::read(input) {
        Ok(document) => judge(input, document.fill(input, Writing::Compare, room, watch)),
        Err(unread) => Outcome::new(input, unread.filled),
    }
}

/// Adds what is stale to what filling gave.
fn judge(input: &Input, filled: Filled) -> Outcome {
    let mut outcome = Outcome::new(input, filled);
    let filled = &mut outcome.filled;
    let stale: Vec<Problem> = filled.asked.iter().filter(|a| a.stale).map(stale).collect();
    if !stale.is_empty() {
        outcome.summary = format!(
            "{} of {} stale; `tieback fill` writes them",
            stale.len(),
            counted(filled.asked.len(), "answer")
        );
    } else if !filled.asked.is_empty() {
        outcome.summary = format!("{} as tieback would write them", counted(filled.asked.len(), "answer"));
    }
    outcome.changed = matches!(filled.rewrite, Rewrite::Patched(_));
    outcome.verdict.stale = !stale.is_empty() || outcome.changed;
    filled.problems.extend(stale);
    outcome
}

fn stale(asked: &Asked) -> Problem {
    let message = if asked.old.is_empty() {
        "this question is not answered yet".to_string()
    } else {
        "this answer is not what follows from the note now".to_string()
    };
    // Of answers in many lines, the first that differs.
    let old: Vec<&str> = asked.old.lines().collect();
    let new: Vec<&str> = asked.new.lines().collect();
    let at = (0..old.len().max(new.len())).find(|i| old.get(*i) != new.get(*i)).unwrap_or(0);
    let line = |lines: &[&str]| match lines.get(at) {
        Some(line) if lines.len() > 1 => format!("{} …", line.trim()),
        Some(line) => (*line).to_string(),
        None => "nothing".to_string(),
    };
    let mark = if asked.old.is_empty() {
        format!("now {}", line(&new))
    } else {
        format!("was {}, now {}", line(&old), line(&new))
    };
    Problem::error(Code::Stale, asked.place, message).mark(mark)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::source::{Sources, Span};

    fn asked(old: &str, new: &str) -> Asked {
        Asked {
            place: Span::new(0, 4),
            question: "R(g)".to_string(),
            old: old.to_string(),
            new: new.to_string(),
            stale: old != new,
            error: false,
            unmet: new.starts_with("NOT met"),
            remarks: Vec::new(),
        }
    }

    fn judged(asked: Vec<Asked>) -> (u8, String, Vec<(Code, String)>) {
        let mut sources = Sources::default();
        sources.add("gate.md", "R(g) ?");
        let filled = Filled { sources, problems: Vec::new(), asked, unmet: 0, rewrite: Rewrite::Unchanged };
        let outcome = judge(&Input::Stdin, filled);
        let problems = outcome.filled.problems.into_iter().map(|p| (p.code, p.mark));
        (outcome.verdict.code(), outcome.summary, problems.collect())
    }

    #[test]
    fn answers_that_stand_are_only_counted() {
        let summary = "1 answer as tieback would write them".to_string();
        assert_eq!(judged(vec![asked("0.98", "0.98")]), (0, summary, Vec::new()));
    }

    #[test]
    fn a_stale_answer_shows_what_was_and_what_is() {
        let (code, summary, problems) =
            judged(vec![asked("0.97", "0.98"), asked("", "1\n2"), asked("1", "1")]);
        assert_eq!(code, 1);
        assert_eq!(summary, "2 of 3 answers stale; `tieback fill` writes them");
        let marks: Vec<&str> = problems.iter().map(|(_, mark)| mark.as_str()).collect();
        assert_eq!(marks, ["was 0.97, now 0.98", "now 1 …"]);
    }

    #[test]
    fn an_unmet_requirement_weighs_more_than_a_stale_answer() {
        let (code, _, problems) = judged(vec![asked("0.97", "NOT met: 0.98")]);
        assert_eq!(code, 4);
        assert_eq!(problems.iter().map(|p| p.0).collect::<Vec<_>>(), [Code::NotMet, Code::Stale]);
    }
}
