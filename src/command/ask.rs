//! `tieback ask`: answers one question.

use super::Voice;
use super::document::{Document, Room};
use super::each::{Outcome, each};
use super::input::Input;
use super::verdict::Verdict;
use crate::answer::Filled;
use clap::Args;

/// Answer one question from the definitions of a note, or from given lines
#[derive(Args, Debug)]
#[command(
    override_usage = "tieback ask [OPTIONS] [FILE] <QUESTION>",
    after_help = "Examples:\n  tieback ask flood-gate.md 'R(gate, 1 yr)'\n  \
                  tieback ask 'R(1 of 2 gate)' --given 'gate = 0.98'"
)]
pub(super) struct Ask {
    /// The note or parts list (`-` for standard input), if there is one, and the question
    #[arg(value_name = "FILE> <QUESTION", required = true, num_args = 1..=2)]
    words: Vec<String>,

    /// A further line, as it would stand in a note; may be repeated
    #[arg(long, value_name = "LINE")]
    given: Vec<String>,

    #[command(flatten)]
    room: Room,
}

impl Ask {
    pub(super) fn run(&self, voice: Voice) -> Verdict {
        let (input, question) = match self.words.as_slice() {
            [file, question] => (Some(Input::one(file)), question),
            [question] => (None, question),
            _ => return Verdict { error: true, ..Verdict::default() }, // clap lets none and three not pass
        };
        let question = bare(question);
        answer(input, voice, false, |name, document| document.ask(name, &self.given, question, &self.room))
    }
}

/// The question without the `?` that it would have in a note.
pub(super) fn bare(question: &str) -> &str {
    let question = question.trim();
    question.strip_suffix('?').unwrap_or(question).trim_end()
}

/// Gives the answer of one question on standard output.
pub(super) fn answer(
    input: Option<Input>,
    voice: Voice,
    as_data: bool,
    ask: impl Fn(&str, &Document) -> Filled + Sync,
) -> Verdict {
    let none = input.is_none();
    // Without a file all lines are given, and a name is only needed for messages.
    let input = input.unwrap_or(Input::Stdin);
    each(std::slice::from_ref(&input), voice, |input, _| {
        let (name, document) = match none {
            true => ("given".to_string(), Document::Note("".into())),
            false => match Document::read(input) {
                Ok(document) => (input.name(), document),
                Err(unread) => return Outcome::new(input, unread.filled),
            },
        };
        let mut filled = ask(&name, &document);
        // Requirements elsewhere in the note are not what was asked.
        filled.unmet = 0;
        let mut outcome = Outcome::new(input, filled);
        outcome.name = name;
        outcome.steps = as_data;
        for asked in &outcome.filled.asked {
            if asked.error {
                // The problems say it at more length; where none does, the answer has to.
                if outcome.filled.problems.is_empty() {
                    outcome.summary.clone_from(&asked.new);
                }
            } else {
                let output = outcome.output.get_or_insert_default();
                output.extend_from_slice(asked.new.as_bytes());
                output.push(b'\n');
            }
        }
        if voice.json {
            outcome.output = None;
        }
        outcome
    })
}
