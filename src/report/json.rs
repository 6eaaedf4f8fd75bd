//! A run as data, for `--json`.
//!
//! One object is written to standard output, on lines of its own:
//!
//! ```json
//! {
//!   "files": [
//!     {
//!       "name": "flood-gate.md",
//!       "changed": true,
//!       "questions": [
//!         { "line": 7, "column": 1, "question": "R(gate)", "answer": "0.98570",
//!           "old": "", "stale": true, "error": false, "unmet": false }
//!       ],
//!       "problems": [
//!         { "code": "unknown-name", "level": "error", "message": "unknown name \"gat\"",
//!           "file": "flood-gate.md", "line": 9, "column": 3, "end_line": 9, "end_column": 6,
//!           "mark": "", "labels": [], "mends": ["did you mean `gate`?"] }
//!       ]
//!     }
//!   ],
//!   "exit": 2
//! }
//! ```
//!
//! - Files stand in the order they were given in, those of a folder by path;
//!   questions and problems in the order of their places.
//! - Lines and columns begin at 1; columns count characters. `end_line` and
//!   `end_column` name the first character after the place. A problem or label
//!   that is in no text has `null` for its file, lines and columns.
//! - In a workbook or a delimited file, a place is `"sheet": "Power", "cell": "C7"`, and lines and columns
//!   are `null`; a delimited file has no `sheet`. A question's cell is the one that its answer goes into.
//! - `changed` says whether the file was written (`fill`) or would be (`check`).
//! - `answer` is what tieback writes now, `old` what stood there; lines of a
//!   longer answer are joined by `\n`. `level` is `error` or `remark`.
//! - A label is `{"text", "file", "line", "column", "end_line", "end_column"}`.
//! - `text` stands in a file only where `fill -` would have written the filled
//!   text to standard output; `steps` stands in a question only for the command
//!   `steps`, and then instead of `answer`.
//! - `exit` is the exit code.
//!
//! Later versions may add keys; those that are here keep their meaning.

use super::lines::Lines;
use crate::answer::Filled;
use crate::source::{Level, Problem, Sources, Span};
use serde::Serialize;
use serde_json::value::RawValue;

/// A whole run.
#[derive(Serialize, Debug)]
pub struct Run {
    /// Every file that was taken.
    pub files: Vec<FileReport>,
    /// The exit code.
    pub exit: u8,
}

/// One file.
#[derive(Serialize, Debug)]
pub struct FileReport {
    /// Its name, relative as it was given.
    pub name: String,
    /// Whether it was, or would be, written.
    pub changed: bool,
    /// The filled text, for a filter only.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub text: Option<String>,
    /// What is asked.
    pub questions: Vec<QuestionReport>,
    /// What is to be said.
    pub problems: Vec<ProblemReport>,
}

/// One question and its answer.
#[derive(Serialize, Debug)]
pub struct QuestionReport {
    /// Line of the question.
    pub line: Option<usize>,
    /// Column of the question.
    pub column: Option<usize>,
    /// The sheet of the answer's cell, in a workbook.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub sheet: Option<String>,
    /// The cell that the answer goes into, in a workbook or a delimited file.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub cell: Option<String>,
    /// The question as written.
    pub question: String,
    /// The answer now.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub answer: Option<String>,
    /// The steps as data.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub steps: Option<Box<RawValue>>,
    /// The answer that stood there.
    pub old: String,
    /// Whether the two differ.
    pub stale: bool,
    /// Whether the answer is an error.
    pub error: bool,
    /// Whether it is a requirement that is not met or undecided.
    pub unmet: bool,
    /// What its reader should know: things that count once though they stand in several places, and the like.
    pub remarks: Vec<String>,
}

/// One problem.
#[derive(Serialize, Debug)]
pub struct ProblemReport {
    /// The code that `tieback explain` takes.
    pub code: &'static str,
    /// `error` or `remark`.
    pub level: &'static str,
    /// The cause.
    pub message: String,
    /// Where it is.
    #[serde(flatten)]
    pub place: PlaceReport,
    /// What stands under the mark.
    pub mark: String,
    /// Other places involved.
    pub labels: Vec<LabelReport>,
    /// What to do about it.
    pub mends: Vec<String>,
}

/// Another place of a problem.
#[derive(Serialize, Debug)]
pub struct LabelReport {
    /// What is to be seen there.
    pub text: String,
    /// Where.
    #[serde(flatten)]
    pub place: PlaceReport,
}

/// A place, or nothing where it is in no text.
#[derive(Serialize, Debug, Default)]
pub struct PlaceReport {
    /// The file.
    pub file: Option<String>,
    /// First line.
    pub line: Option<usize>,
    /// First column.
    pub column: Option<usize>,
    /// Line of the character after it.
    pub end_line: Option<usize>,
    /// Column of the character after it.
    pub end_column: Option<usize>,
    /// The sheet, in a workbook.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub sheet: Option<String>,
    /// The cell, in a workbook or a delimited file.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub cell: Option<String>,
}

impl PlaceReport {
    fn new(lines: &Lines<'_>, span: Span) -> PlaceReport {
        let Some(place) = lines.place(span) else { return PlaceReport::default() };
        if let Some(cell) = place.cell {
            return PlaceReport {
                file: Some(place.file.to_string()),
                sheet: cell.sheet.map(str::to_string),
                cell: Some(cell.cell()),
                ..PlaceReport::default()
            };
        }
        PlaceReport {
            file: Some(place.file.to_string()),
            line: Some(place.line),
            column: Some(place.column),
            end_line: Some(place.end_line),
            end_column: Some(place.end_column),
            ..PlaceReport::default()
        }
    }
}

impl FileReport {
    /// What filling gave, under the name that the file was given by.
    pub fn new(name: &str, filled: &Filled, changed: bool) -> FileReport {
        let lines = Lines::new(&filled.sources);
        let questions = filled.asked.iter().map(|asked| {
            let place = lines.place(asked.place);
            QuestionReport {
                line: place.filter(|p| p.cell.is_none()).map(|p| p.line),
                column: place.filter(|p| p.cell.is_none()).map(|p| p.column),
                sheet: place.and_then(|p| p.cell?.sheet).map(str::to_string),
                cell: place.and_then(|p| p.cell).map(|cell| cell.cell()),
                question: asked.question.clone(),
                answer: Some(asked.new.clone()),
                steps: None,
                old: asked.old.clone(),
                stale: asked.stale,
                error: asked.error,
                unmet: asked.unmet,
                remarks: asked.remarks.clone(),
            }
        });
        FileReport {
            name: name.to_string(),
            changed,
            text: None,
            questions: questions.collect(),
            problems: problems(&filled.sources, &filled.problems),
        }
    }

    /// Moves answers that are JSON from `answer` to `steps`.
    #[must_use]
    pub fn with_steps(mut self) -> FileReport {
        for question in &mut self.questions {
            let parsed = question.answer.as_ref().and_then(|a| RawValue::from_string(a.clone()).ok());
            if let Some(steps) = parsed {
                question.steps = Some(steps);
                question.answer = None;
            }
        }
        self
    }
}

/// Problems in the order of their places.
pub fn problems(sources: &Sources, problems: &[Problem]) -> Vec<ProblemReport> {
    let lines = Lines::new(sources);
    let report = |problem: &&Problem| ProblemReport {
        code: problem.code.id(),
        level: match problem.level {
            Level::Error => "error",
            Level::Remark => "remark",
        },
        message: problem.message.clone(),
        place: PlaceReport::new(&lines, problem.place),
        mark: problem.mark.clone(),
        labels: problem
            .labels
            .iter()
            .map(|l| LabelReport { text: l.text.clone(), place: PlaceReport::new(&lines, l.place) })
            .collect(),
        mends: problem.mends.clone(),
    };
    super::in_order(problems).iter().map(report).collect()
}
