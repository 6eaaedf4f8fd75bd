//! `tieback review`: what a reviewer signs from.

use super::Voice;
use super::document::{Document, Room};
use super::each::{Outcome, each};
use super::files;
use super::input::Input;
use super::verdict::Verdict;
use crate::source::{Code, Level, Problem, Span};
use crate::view::{Stamp, gather, write};
use clap::Args;
use std::path::{Path, PathBuf};

/// Write what a reviewer signs from: a workbook whose steps are live formulas
#[derive(Args, Debug)]
#[command(after_help = "Example:\n  tieback review flood-gate.md -o review.xlsx --date 2026-12-01\n\n\
                        The workbook is an aid to the review. It is no substitute for the codes and standards\n\
                        in force and the judgement of a licensed engineer.")]
pub(super) struct Review {
    /// The note or parts list; `-` for a note on standard input
    #[arg(value_name = "FILE")]
    file: String,

    /// The workbook to write, `.xlsx`
    #[arg(short, long, value_name = "OUT")]
    output: PathBuf,

    /// The date to stamp it with, as you write dates
    #[arg(long, value_name = "DATE")]
    date: Option<String>,

    #[command(flatten)]
    room: Room,
}

impl Review {
    pub(super) fn run(&self, voice: Voice) -> Verdict {
        let input = Input::one(&self.file);
        each(std::slice::from_ref(&input), voice, |input, _| self.one(input))
    }

    fn one(&self, input: &Input) -> Outcome {
        let ending = self.output.extension().and_then(|e| e.to_str()).unwrap_or("").to_ascii_lowercase();
        if ending != "xlsx" {
            let (code, cause) = match ending.as_str() {
                "html" | "htm" => (Code::NotKnownYet, "a review as a page is not known yet"),
                _ => (Code::FileAccess, "a review is a workbook whose name ends in .xlsx"),
            };
            return refused(
                input,
                Problem::error(code, Span::default(), cause).mend("write `-o review.xlsx`"),
            );
        }
        let document = match Document::read(input) {
            Ok(document) => document,
            Err(unread) => return Outcome::new(input, unread.filled),
        };
        let (sources, tree, mut problems) = document.syntax(&input.name(), &self.room);
        let review = gather(&tree, &sources);
        let stamp = Stamp { name: input.name(), date: self.date.clone() };
        problems.extend(review.problems.iter().cloned());
        problems.retain(|p| p.level == Level::Error);
        problems.sort_by_key(|p| (p.place.start, p.place.end));
        problems.dedup();
        let (count, unmet) = (review.answers.len(), review.unmet);
        let written = write(&review, &sources, &stamp);
        let mut filled = crate::answer::Filled::nothing(sources, problems);
        filled.unmet = unmet;
        let mut outcome = Outcome::new(input, filled);
        let saved = match written {
            Ok(bytes) => files::save(&self.output, None, &bytes).map_err(|t| (t.cause, t.mend)),
            Err(error) => Err((error.to_string(), "ask about fewer things in one document".to_string())),
        };
        match saved {
            Ok(()) => {
                let to = shown(&self.output);
                outcome.summary = format!("{count} answers with their steps in {to}");
                outcome.changed = true;
            }
            Err((cause, mend)) => {
                let message = format!("cannot write \"{}\": {cause}", shown(&self.output));
                let problem = Problem::error(Code::FileAccess, Span::default(), message).mend(mend);
                outcome.filled.problems.push(problem);
                outcome.verdict.access = true;
            }
        }
        outcome
    }
}

fn refused(input: &Input, problem: Problem) -> Outcome {
    Outcome::new(input, crate::answer::Filled::nothing(crate::source::Sources::default(), vec![problem]))
}

fn shown(path: &Path) -> String {
    path.to_string_lossy().into_owned()
}
