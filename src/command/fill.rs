//! `tieback fill`: writes the answers into the notes.

use super::each::{Outcome, counted, each};
use super::input::{Input, expand};
use super::verdict::Verdict;
use super::{Cli, Voice, files};
use crate::note::{self, Rewrite};
use crate::source::{Code, Problem, Span};
use clap::error::ErrorKind;
use clap::{Args, CommandFactory};
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// Write the answers after their questions, in place
#[derive(Args, Debug)]
#[command(after_help = "Example:\n  tieback fill flood-gate.md 'notes/**/*.md'")]
pub(super) struct Fill {
    /// Notes, folders of notes, or patterns; `-` filters standard input to standard output
    #[arg(value_name = "FILE", required = true)]
    files: Vec<PathBuf>,

    /// Write the filled note here and leave FILE as it is; `-` for standard output
    #[arg(short, long, value_name = "OUT")]
    output: Option<PathBuf>,
}

impl Fill {
    pub(super) fn run(&self, voice: Voice) -> Result<Verdict, clap::Error> {
        let inputs = expand(&self.files);
        if self.output.is_some() && inputs.len() != 1 {
            let message = format!("-o takes one note, and {} are given", inputs.len());
            return Err(Cli::command().error(ErrorKind::ArgumentConflict, message));
        }
        Ok(each(&inputs, voice, |input| self.one(input)))
    }

    fn one(&self, input: &Input) -> Outcome {
        let target = match (&self.output, input) {
            (Some(path), _) if path.as_os_str() == "-" => Target::Output,
            (Some(path), _) => Target::Elsewhere(path),
            (None, Input::File { path, .. }) => Target::InPlace(path),
            (None, _) => Target::Output,
        };
        let text = match input.read() {
            Ok(text) => text,
            Err(unread) => {
                let mut outcome = Outcome::new(input, unread.filled);
                if matches!((&target, input), (Target::Output, Input::Stdin)) {
                    // An editor that filters its text through here must not lose it.
                    outcome.output = unread.bytes;
                }
                return outcome;
            }
        };
        let text: Arc<str> = text.into();
        let mut outcome = Outcome::new(input, note::fill_shared(&input.name(), text.clone()));
        let patched = match std::mem::replace(&mut outcome.filled.rewrite, Rewrite::Unchanged) {
            Rewrite::Patched(bytes) => Some(bytes),
            Rewrite::Unchanged => None,
        };
        let (path, bytes, read) = match target {
            Target::Output => {
                outcome.changed = patched.is_some();
                outcome.output = Some(patched.unwrap_or_else(|| text.as_bytes().to_vec()));
                return outcome;
            }
            Target::InPlace(path) => match patched {
                Some(bytes) => (path, bytes, Some(text.as_bytes())),
                None => return outcome, // a file that stays as it is is not opened for writing
            },
            Target::Elsewhere(path) => (path, patched.unwrap_or_else(|| text.as_bytes().to_vec()), None),
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

/// Where the filled note goes.
enum Target<'a> {
    Output,
    InPlace(&'a Path),
    Elsewhere(&'a Path),
}
