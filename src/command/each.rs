//! Working through notes: many at once, reported one after the other.

use super::Voice;
use super::input::Input;
use super::progress::{Progress, Watch};
use super::verdict::Verdict;
use crate::answer::{Asked, Filled};
use crate::report::json::{FileReport, Run};
use crate::report::render;
use crate::source::{Code, Problem};
use rayon::prelude::*;
use serde::Serialize;
use std::sync::Arc;

/// What came of one note, ready to be reported.
#[derive(Debug)]
pub(super) struct Outcome {
    /// The name that the report shows.
    pub(super) name: String,
    /// Answers and problems.
    pub(super) filled: Filled,
    /// What it came to.
    pub(super) verdict: Verdict,
    /// Whether the file was, or would be, written.
    pub(super) changed: bool,
    /// What goes to standard output.
    pub(super) output: Option<Vec<u8>>,
    /// One line that says what was done; empty when there is nothing to say.
    pub(super) summary: String,
    /// Whether the answers are steps in JSON.
    pub(super) steps: bool,
}

impl Outcome {
    /// The outcome of a note from what filling gave.
    pub(super) fn new(input: &Input, mut filled: Filled) -> Outcome {
        let unmet: Vec<Problem> = filled.asked.iter().filter_map(|a| unmet(a, &filled)).collect();
        filled.problems.extend(unmet);
        Outcome {
            name: input.name(),
            verdict: Verdict::of(&filled),
            filled,
            changed: false,
            output: None,
            summary: String::new(),
            steps: false,
        }
    }

    /// Keeps quiet about files that were only found on the way and hold nothing.
    fn quieten(&mut self, input: &Input) {
        if !input.named() {
            self.filled.problems.retain(|p| p.code != Code::NothingToDo);
        }
    }
}

/// The error for a requirement that is not met, unless it has been made already.
fn unmet(asked: &Asked, filled: &Filled) -> Option<Problem> {
    if !asked.unmet {
        return None;
    }
    let overlaps = |p: &Problem| p.place.start <= asked.place.end && asked.place.start <= p.place.end;
    // In a sheet the requirement and its answer are cells of one row.
    let is_it = |p: &Problem| p.message.strip_prefix("requirement ") == Some(asked.new.as_str());
    let said = filled.problems.iter().any(|p| p.code == Code::NotMet && (overlaps(p) || is_it(p)));
    let message = if asked.new.starts_with("UNDECIDED") {
        "a requirement is undecided"
    } else {
        "a requirement is not met"
    };
    (!said).then(|| Problem::error(Code::NotMet, asked.place, message).mark(&asked.new))
}

/// So many notes are held in memory at once.
const AT_ONCE: usize = 256;

/// Works on each input and reports in their order.
pub(super) fn each(
    inputs: &[Input],
    voice: Voice,
    work: impl Fn(&Input, &Watch) -> Outcome + Sync,
) -> Verdict {
    let watch = Arc::new(Watch::default());
    let mut verdict = Verdict::default();
    let mut reports = Vec::new();
    let done = |input: &Input| {
        let mut outcome = work(input, &watch);
        outcome.quieten(input);
        watch.file_done();
        outcome
    };
    for some in inputs.chunks(AT_ONCE) {
        let progress = Progress::start(&watch, some.len(), voice);
        // Threads take longer to start than one note takes to fill.
        let outcomes: Vec<Outcome> = match some {
            [one] => vec![done(one)],
            _ => some.par_iter().map(done).collect(),
        };
        drop(progress);
        for outcome in outcomes {
            verdict = verdict.and(outcome.verdict);
            if voice.json {
                reports.push(report(outcome));
            } else {
                verdict = verdict.and(tell(&outcome, voice));
            }
        }
    }
    if voice.json && !give_json(&Run { files: reports, exit: verdict.code() }, voice) {
        verdict.access = true;
    }
    verdict
}

fn report(outcome: Outcome) -> FileReport {
    let report = FileReport::new(&outcome.name, &outcome.filled, outcome.changed);
    if outcome.steps {
        return report.with_steps();
    }
    let text = outcome.output.and_then(|bytes| String::from_utf8(bytes).ok());
    FileReport { text, ..report }
}

fn tell(outcome: &Outcome, voice: Voice) -> Verdict {
    let filled = &outcome.filled;
    if !filled.problems.is_empty() {
        voice.terminal.say(&render::problems(&filled.sources, &filled.problems, voice.terminal.paint()));
    }
    if !outcome.summary.is_empty() {
        voice.terminal.say(&format!("{}: {}\n", outcome.name, outcome.summary));
    }
    let given = outcome.output.as_ref().is_none_or(|bytes| voice.terminal.give(bytes));
    Verdict { access: !given, ..Verdict::default() }
}

/// Gives data on standard output; `false` when it could not be written.
pub(super) fn give_json(data: &impl Serialize, voice: Voice) -> bool {
    match serde_json::to_vec_pretty(data) {
        Ok(mut bytes) => {
            bytes.push(b'\n');
            voice.terminal.give(&bytes)
        }
        Err(error) => {
            voice.terminal.say(&format!("error: cannot write JSON: {error}\n"));
            false
        }
    }
}

/// A number with its noun.
pub(super) fn counted(n: usize, noun: &str) -> String {
    if n == 1 { format!("1 {noun}") } else { format!("{n} {noun}s") }
}
