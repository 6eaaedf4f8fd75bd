//! What was read, and what can be done with it: a note or a file of sheets.

use super::input::{Input, Unread};
use super::progress::Watch;
use super::shelf::Disk;
use crate::answer::{Filled, StepsForm};
use crate::document::workbook::{Limits, lock_file};
use crate::language::Tree;
use crate::note;
use crate::sheets::{self, Options, SheetForm, Writing};
use crate::source::{Code, Level, Problem, Sources, Span};
use clap::Args;
use std::path::PathBuf;
use std::sync::Arc;

/// How far a file may reach, and what a workbook may ask for.
#[derive(Args, Clone, Debug)]
pub(super) struct Room {
    /// A folder of which notes may use files, beside those at or below their own; may be repeated
    #[arg(long, value_name = "FOLDER")]
    use_from: Vec<PathBuf>,

    /// How many GiB a workbook may take when it is unzipped
    #[arg(long, value_name = "GIB", default_value_t = 1, value_parser = clap::value_parser!(u16).range(1..=1024))]
    unzip_limit: u16,
}

impl Room {
    fn shelf(&self) -> Disk {
        Disk::new(&self.use_from, self.limits())
    }

    fn limits(&self) -> Limits {
        let times = u64::from(self.unzip_limit);
        let usual = Limits::default();
        Limits::with_unzipped(usual.unzipped.saturating_mul(times))
            .with_cells(usual.cells.saturating_mul(times))
    }
}

/// A text or a file of sheets.
#[derive(Clone, Debug)]
pub(super) enum Document {
    Note(Arc<str>),
    Sheets(SheetForm, Vec<u8>),
}

impl Document {
    /// Reads what an argument stands for.
    pub(super) fn read(input: &Input) -> Result<Document, Box<Unread>> {
        match input.sheet_form() {
            Some(form) => input.bytes().map(|bytes| Document::Sheets(form, bytes)),
            None => input.read().map(|text| Document::Note(text.into())),
        }
    }

    /// The bytes as they were read.
    pub(super) fn bytes(&self) -> &[u8] {
        match self {
            Document::Note(text) => text.as_bytes(),
            Document::Sheets(_, bytes) => bytes,
        }
    }

    /// Whether it is a file of sheets.
    pub(super) fn is_sheets(&self) -> bool {
        matches!(self, Document::Sheets(..))
    }

    /// The document with its answers.
    pub(super) fn fill(&self, input: &Input, writing: Writing, room: &Room, watch: &Watch) -> Filled {
        let name = input.name();
        match self {
            Document::Note(text) => note::fill_from(&name, text.clone(), &room.shelf()),
            Document::Sheets(form, bytes) => {
                let tell = |stage| watch.tell(stage);
                let options =
                    Options { limits: room.limits(), named: input.named(), writing, progress: Some(&tell) };
                let mut filled = sheets::fill(&name, *form, bytes.clone(), &options);
                if let Some(lock) = input.path().filter(|_| writing == Writing::InPlace).and_then(lock_file) {
                    let lock = lock.file_name().unwrap_or_default().to_string_lossy().into_owned();
                    let message = format!(
                        "\"{name}\" seems to be open in a spreadsheet program: \"{lock}\" lies beside it"
                    );
                    filled.problems.push(
                        Problem::remark(Code::OpenElsewhere, Span::default(), message)
                            .mend("close it there, or open it anew: what is saved from the open window replaces the answers"),
                    );
                }
                told_of_limit(&mut filled);
                if !input.named() {
                    pass_over(&mut filled);
                }
                filled
            }
        }
    }

    /// Its syntax, with that of what it uses.
    pub(super) fn syntax(&self, name: &str, room: &Room) -> (Sources, Tree, Vec<Problem>) {
        match self {
            Document::Note(text) => note::syntax_from(name, text, &room.shelf()),
            Document::Sheets(form, bytes) => sheets::syntax(name, *form, bytes.clone(), &room.limits()),
        }
    }

    /// The answer to one question.
    pub(super) fn ask(&self, name: &str, given: &[String], question: &str, room: &Room) -> Filled {
        match self {
            Document::Note(text) => note::ask(name, text, &room.shelf(), given, question),
            Document::Sheets(form, bytes) => {
                let mut filled = sheets::ask(name, *form, bytes.clone(), &room.limits(), given, question);
                told_of_limit(&mut filled);
                filled
            }
        }
    }

    /// The steps to it.
    pub(super) fn steps(
        &self,
        name: &str,
        given: &[String],
        question: &str,
        form: StepsForm,
        room: &Room,
    ) -> Filled {
        match self {
            Document::Note(text) => note::steps(name, text, &room.shelf(), given, question, form),
            Document::Sheets(sort, bytes) => {
                let mut filled =
                    sheets::steps(name, *sort, bytes.clone(), &room.limits(), given, question, form);
                told_of_limit(&mut filled);
                filled
            }
        }
    }
}

/// Says by which option a limit is raised.
fn told_of_limit(filled: &mut Filled) {
    for problem in &mut filled.problems {
        if problem.code == Code::FileAccess && problem.mends.iter().any(|m| m.starts_with("raise the limit"))
        {
            problem.mends.push("`--unzip-limit 4` allows 4 GiB".to_string());
        }
    }
}

/// A file that was only found on the way and cannot be read is passed over: it
/// may have nothing to do with tieback.
fn pass_over(filled: &mut Filled) {
    let unread = filled.asked.is_empty();
    for problem in filled.problems.iter_mut().filter(|p| unread && p.code == Code::FileAccess) {
        problem.level = Level::Remark;
        problem.message.push_str("; it was found on the way and is passed over");
    }
}
