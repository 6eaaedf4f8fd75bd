//! `tieback check`: says whether the notes are as tieback would leave them.

use super::Voice;
use super::each::{Outcome, counted, each};
use super::input::{Input, expand};
use super::verdict::Verdict;
use crate::note::{self, Asked, Filled, Rewrite};
use crate::source::{Code, Problem};
use clap::Args;
use std::path::PathBuf;

/// Find stale answers, unmet requirements and errors, and change nothing
#[derive(Args, Debug)]
#[command(after_help = "Example:\n  tieback check notes/")]
pub(super) struct Check {
    /// Notes, folders of notes, or patterns; `-` for standard input
    #[arg(value_name = "FILE", required = true)]
    files: Vec<PathBuf>,
}

impl Check {
    pub(super) fn run(&self, voice: Voice) -> Verdict {
        each(&expand(&self.files), voice, one)
    }
}

fn one(input: &Input) -> Outcome {
    let text = match input.read() {
        Ok(text) => text,
        Err(unread) => return Outcome::new(input, unread.filled),
    };
    let mut outcome = Outcome::new(input, note::fill(&input.name(), &text));
    let filled = &mut outcome.filled;
    let stale: Vec<Problem> = filled.asked.iter().filter(|a| a.stale).map(stale).collect();
    let unmet: Vec<Problem> = filled.asked.iter().filter_map(|a| unmet(a, filled)).collect();
    if !stale.is_empty() {
        outcome.summary = format!(
            "{} of {} stale; `tieback fill` writes them",
            stale.len(),
            counted(filled.asked.len(), "answer")
        );
    }
    outcome.changed = matches!(filled.rewrite, Rewrite::Patched(_));
    outcome.verdict.stale = !stale.is_empty() || outcome.changed;
    filled.problems.extend(stale);
    filled.problems.extend(unmet);
    outcome
}

fn stale(asked: &Asked) -> Problem {
    let message = if asked.old.is_empty() {
        "this question is not answered yet".to_string()
    } else {
        "this answer is not what follows from the note now".to_string()
    };
    let first = |answer: &str| match answer.split_once('\n') {
        Some((line, _)) => format!("{line} …"),
        None => answer.to_string(),
    };
    let mark = if asked.old.is_empty() {
        format!("now {}", first(&asked.new))
    } else {
        format!("was {}, now {}", first(&asked.old), first(&asked.new))
    };
    Problem::error(Code::Stale, asked.place, message).mark(mark)
}

/// The error for a requirement that is not met, unless it has been made already.
fn unmet(asked: &Asked, filled: &Filled) -> Option<Problem> {
    let overlaps = |p: &Problem| p.place.start <= asked.place.end && asked.place.start <= p.place.end;
    let said = filled.problems.iter().any(|p| p.code == Code::NotMet && overlaps(p));
    (asked.unmet && !said)
        .then(|| Problem::error(Code::NotMet, asked.place, "a requirement is not met").mark(&asked.new))
}
