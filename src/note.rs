//! A note, from its text to its answers.

use crate::source::{Code, Problem, Sources, Span};

/// What became of the bytes of a note.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Rewrite {
    /// Every byte stands as it was.
    Unchanged,
    /// The bytes with answers in place.
    Patched(Vec<u8>),
}

/// One question and what came of it.
#[derive(Clone, Debug)]
pub struct Asked {
    /// The question in the source.
    pub place: Span,
    /// The question as written.
    pub question: String,
    /// The answer that stood there.
    pub old: String,
    /// The answer now; several lines joined by `\n`.
    pub new: String,
    /// Whether the two differ.
    pub stale: bool,
    /// Whether the answer is an error, `! …`.
    pub error: bool,
    /// Whether it is a requirement that is not met or undecided.
    pub unmet: bool,
}

/// What filling one note gave.
#[derive(Clone, Debug)]
pub struct Filled {
    /// The texts that places point into.
    pub sources: Sources,
    /// What is to be said.
    pub problems: Vec<Problem>,
    /// Questions in the order of the source.
    pub asked: Vec<Asked>,
    /// Requirements, asked or not, that are not met or undecided.
    pub unmet: usize,
    /// The note with its answers.
    pub rewrite: Rewrite,
}

/// Answers the questions of a note.
pub fn fill(name: &str, text: &str) -> Filled {
    let mut sources = Sources::default();
    sources.add(name, text);
    let mut problems = Vec::new();
    if !text.contains("tieback") && !text.contains("<!--?") {
        problems.push(Problem::remark(
            Code::NothingToDo,
            Span::default(),
            "there is nothing for tieback here",
        ));
    }
    Filled { sources, problems, asked: Vec::new(), unmet: 0, rewrite: Rewrite::Unchanged }
}

/// Answers one question against the definitions of a note and further lines.
pub fn ask(name: &str, text: &str, _given: &[String], question: &str) -> Filled {
    let mut filled = fill(name, text);
    let answer = "! not computed";
    filled.problems.clear();
    filled.asked.push(Asked {
        place: Span::default(),
        question: question.to_string(),
        old: String::new(),
        new: answer.to_string(),
        stale: false,
        error: true,
        unmet: false,
    });
    filled
}

/// How steps are written.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum StepsForm {
    /// Plain text.
    Text,
    /// Markdown.
    Markdown,
    /// A JSON value.
    Json,
}

/// The steps of one question.
pub fn steps(name: &str, text: &str, given: &[String], question: &str, _form: StepsForm) -> Filled {
    ask(name, text, given, question)
}
