//! `tieback fill`: writes the answers into the notes.

use super::document::{Document, Room};
use super::each::{Outcome, counted, each};
use super::input::{Input, expand};
use super::progress::Watch;
use super::verdict::Verdict;
use super::{Cli, Voice, files};
use crate::answer::Filled;
use crate::document::patch::Rewrite;
use crate::sheets::Writing;
use crate::source::{Code, Problem, Sources, Span};
use clap::error::ErrorKind;
use clap::{Args, CommandFactory};
use std::path::{Path, PathBuf};

/// Write the answers after their questions, in place
#[derive(Args, Debug)]
#[command(after_help = "Example:\n  tieback fill flood-gate.md 'notes/**/*.md' parts.xlsx")]
pub(super) struct Fill {
    /// Notes, parts lists, folders of them, or patterns; `-` filters standard input to standard output
    #[arg(value_name = "FILE", required = true)]
    files: Vec<PathBuf>,

    /// Write the filled file here and leave FILE as it is; `-` for standard output
    #[arg(short, long, value_name = "OUT")]
    output: Option<PathBuf>,

    #[command(flatten)]
    room: Room,
}

impl Fill {
    pub(super) fn run(&self, voice: Voice) -> Result<Verdict, clap::Error> {
        let inputs = expand(&self.files);
        if self.output.is_some() && inputs.len() != 1 {
            let message = format!("-o takes one note, and {} are given", inputs.len());
            return Err(Cli::command().error(ErrorKind::ArgumentConflict, message));
        }
        Ok(each(&inputs, voice, |input, watch| self.one(input, watch)))
    }

    fn one(&self, input: &Input, watch: &Watch) -> Outcome {
        let target = match (&self.output, input) {
            (Some(path), _) if path.as_os_str() == "-" => Target::Output,
            (Some(path), _) => Target::Elsewhere(path),
            (None, Input::File { path, .. }) => Target::InPlace(path),
            (None, _) => Target::Output,
        };
        let document = match Document::read(input) {
            Ok(document) => document,
            Err(unread) => {
                let mut outcome = Outcome::new(input, unread.filled);
                if matches!((&target, input), (Target::Output, Input::Stdin)) {
                    // An editor that filters its text through here must not lose it.
                    outcome.output = unread.bytes;
                }
                return outcome;
            }
        };
        if let (Some(problem), true) = (ending_differs(input, &target), document.is_sheets()) {
            return Outcome::new(input, Filled::nothing(Sources::default(), vec![problem]));
        }
        let writing = match target {
            Target::InPlace(_) => Writing::InPlace,
            _ => Writing::NewFile,
        };
        let mut outcome = Outcome::new(input, document.fill(input, writing, &self.room, watch));
        let unread = document.is_sheets() && outcome.verdict.access;
        let patched = match std::mem::replace(&mut outcome.filled.rewrite, Rewrite::Unchanged) {
            Rewrite::Patched(bytes) => Some(bytes),
            Rewrite::Unchanged => None,
        };
        let (path, bytes, read) = match target {
            Target::Output => {
                outcome.changed = patched.is_some();
                outcome.output = Some(patched.unwrap_or_else(|| document.bytes().to_vec()));
                return outcome;
            }
            Target::InPlace(path) => match patched {
                Some(bytes) => (path, bytes, Some(document.bytes())),
                None => return outcome, // a file that stays as it is is not opened for writing
            },
            // A workbook that could not be read or written is not passed on as if it had been filled.
            Target::Elsewhere(_) if unread => return outcome,
            Target::Elsewhere(path) => (path, patched.unwrap_or_else(|| document.bytes().to_vec()), None),
        };
        match files::save(path, read, &bytes) {
            Ok(()) => {
                let changed = outcome.filled.asked.iter().filter(|a| a.stale).count();
                let written = counted(outcome.filled.asked.len(), "answer");
                outcome.summary = format!("{written} written, {changed} changed");
                outcome.changed = true;
            }
            Err(error) => {
                let message = format!("cannot write \"{}\": {}", path.to_string_lossy(), error.cause);
                let problem = Problem::error(Code::FileAccess, Span::default(), message)
                    .mend(error.mend)
                    .mend("the file is as it was; `-o OUT` writes elsewhere");
                outcome.filled.problems.push(problem);
                outcome.verdict.access = true;
            }
        }
        outcome
    }
}

/// What is wrong with `-o` where it names another kind of file than the one that is filled.
fn ending_differs(input: &Input, target: &Target<'_>) -> Option<Problem> {
    let Target::Elsewhere(to) = target else { return None };
    let ending = |path: &Path| path.extension().map(|e| e.to_string_lossy().to_ascii_lowercase());
    let from = ending(input.path()?)?;
    let (wanted, why) = match from.as_str() {
        "xls" | "xlsb" => ("xlsx", "the answers of a workbook that is only read go into a new one"),
        same => (same, "answers are filled into a copy of the file, which stays of its kind"),
    };
    (ending(to).as_deref() != Some(wanted)).then(|| {
        let message = format!("cannot write \"{}\": {why}", to.to_string_lossy());
        Problem::error(Code::FileAccess, Span::default(), message)
            .mend(format!("give `-o` a name that ends in .{wanted}"))
    })
}

/// Where the filled document goes.
enum Target<'a> {
    Output,
    InPlace(&'a Path),
    Elsewhere(&'a Path),
}
