//! `tieback steps`: shows how an answer comes about.

use super::Voice;
use super::ask::{answer, bare};
use super::document::Room;
use super::input::Input;
use super::verdict::Verdict;
use crate::answer::StepsForm;
use clap::{Args, ValueEnum};

/// Show the numbered steps to an answer, so that each can be recomputed
#[derive(Args, Debug)]
#[command(after_help = "Example:\n  tieback steps flood-gate.md 'R(gate)' --form markdown")]
pub(super) struct Steps {
    /// The note or parts list; `-` for standard input
    #[arg(value_name = "FILE")]
    file: String,

    /// The question, as it would stand in the note
    #[arg(value_name = "QUESTION")]
    question: String,

    /// A further line, as it would stand in the note; may be repeated
    #[arg(long, value_name = "LINE")]
    given: Vec<String>,

    /// How the steps are written; with --json they are data
    #[arg(long, value_enum, default_value = "text")]
    form: Form,

    #[command(flatten)]
    room: Room,
}

#[derive(Clone, Copy, ValueEnum, Debug)]
enum Form {
    /// Lines for a terminal
    Text,
    /// A list that can be pasted into a note
    Markdown,
}

impl Steps {
    pub(super) fn run(&self, voice: Voice) -> Verdict {
        let form = match (voice.json, self.form) {
            (true, _) => StepsForm::Json,
            (false, Form::Text) => StepsForm::Text,
            (false, Form::Markdown) => StepsForm::Markdown,
        };
        answer(Some(Input::one(&self.file)), voice, form == StepsForm::Json, |name, document| {
            document.steps(name, &self.given, bare(&self.question), form, &self.room)
        })
    }
}
