//! What filling one document gave, whatever sort of document it is.

use crate::document::patch::Rewrite;
use crate::source::{Code, Problem, Sources, Span};

/// One question and what came of it.
#[derive(Clone, Debug)]
pub struct Asked {
    /// The question in the source.
    pub place: Span,
    /// The question as written.
    pub question: String,
    /// The answer that was found.
    pub old: String,
    /// The answer now; several lines are joined by line feeds.
    pub new: String,
    /// Whether the two differ.
    pub stale: bool,
    /// Whether it has no answer but a message.
    pub error: bool,
    /// Whether it is a requirement that is not met or undecided.
    pub unmet: bool,
    /// What the reader should know of the answer.
    pub remarks: Vec<String>,
}

/// What filling one document gave.
#[derive(Debug)]
pub struct Filled {
    /// The texts that spans point into.
    pub sources: Sources,
    /// Everything wrong or worth a remark, by place.
    pub problems: Vec<Problem>,
    /// The questions, in the order they stand.
    pub asked: Vec<Asked>,
    /// Requirements, asked or not, that are not met or undecided.
    pub unmet: usize,
    /// The document with its answers.
    pub rewrite: Rewrite,
}

impl Filled {
    /// A document that has no answers, and why.
    pub fn nothing(sources: Sources, problems: Vec<Problem>) -> Filled {
        Filled { sources, problems, asked: Vec::new(), unmet: 0, rewrite: Rewrite::Unchanged }
    }

    /// A document whose texts are more than one run can hold.
    pub fn too_much_text(sources: Sources) -> Filled {
        let problem =
            Problem::error(Code::TooLarge, Span::default(), "the texts of one run are larger than 4 GiB")
                .mend("run over fewer files at a time");
        Filled::nothing(sources, vec![problem])
    }
}
