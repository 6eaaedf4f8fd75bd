//! One workbook or delimited file from end to end: tables, language, model,
//! answers, cells.
//!
//! A table takes part when its header row has a `name` column and one that says
//! or asks something of the names. What its cells say is read by the language
//! as in a note; answers go into the cells under its questions, and no other
//! cell changes.

mod export;
mod find;
mod number;
mod place;
mod read;
mod rows;
mod text;

use crate::answer::{Filled, Inquiry, StepsForm, answer_all, show_readings, told_once};
use crate::document::workbook::{BookTrouble, Limits};
use crate::language::Tree;
use crate::source::{CellAt, CellMap, Code, Level, Problem, Sources, Span};
use crate::system::Model;
use place::Placing;
use read::{Read, open, read};
use std::collections::BTreeMap;
use std::sync::atomic::{AtomicUsize, Ordering};

/// What sort of file it is; a workbook's own kind is told from its bytes.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum SheetForm {
    /// xlsx, xlsm, ods, xls or xlsb.
    Workbook,
    /// Fields between commas, semicolons or vertical bars.
    Csv,
    /// Fields between tabs.
    Tsv,
}

impl SheetForm {
    /// The form that the ending of a file's name stands for.
    pub fn of_ending(ending: &str) -> Option<SheetForm> {
        Some(match ending.to_ascii_lowercase().as_str() {
            "xlsx" | "xlsm" | "ods" | "xls" | "xlsb" => SheetForm::Workbook,
            "csv" => SheetForm::Csv,
            "tsv" | "tab" => SheetForm::Tsv,
            _ => return None,
        })
    }
}

/// What becomes of the answers.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Writing {
    /// They are compared with those that stand there, and nothing is written.
    Compare,
    /// They go into the file.
    InPlace,
    /// They go into the file; one of a kind that is only read becomes a new xlsx.
    NewFile,
}

/// How a file is to be taken.
#[derive(Clone)]
pub struct Options<'a> {
    /// How much a workbook may ask for.
    pub limits: Limits,
    /// Whether it was named itself. One that was only found on the way takes
    /// part if it asks something.
    pub named: bool,
    /// What becomes of the answers.
    pub writing: Writing,
    /// Told of the work as it goes on.
    pub progress: Option<&'a (dyn Fn(Stage) + Sync)>,
}

impl Default for Options<'_> {
    fn default() -> Self {
        Options { limits: Limits::default(), named: true, writing: Writing::InPlace, progress: None }
    }
}

impl Options<'_> {
    fn tell(&self, stage: Stage) {
        if let Some(progress) = self.progress {
            progress(stage);
        }
    }
}

/// How far the work on a file is.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Stage {
    /// The file is read.
    Reading,
    /// So many of so many lines are answered.
    Answering(usize, usize),
    /// The answers are written.
    Writing,
}

/// Fills a file: finds its tables and answers their questions.
pub fn fill(name: &str, form: SheetForm, bytes: Vec<u8>, options: &Options<'_>) -> Filled {
    options.tell(Stage::Reading);
    let opened = match open(name, form, bytes, &options.limits) {
        Ok(opened) => opened,
        Err(trouble) => return troubled(name, &trouble),
    };
    let mut sources = Sources::default();
    let read = match read(name, &opened, options.named, &mut sources) {
        Ok(read) => read,
        Err(filled) => return *filled,
    };
    let total = read.tree.statements.len();
    let mut model = Model::new(&read.tree, &sources);
    let mut placing = Placing::new(&opened, &read);
    let done = AtomicUsize::new(0);
    let (replies, mut desk) = answer_all(&mut model, &|model, found, statement, remarks| {
        let done = done.fetch_add(1, Ordering::Relaxed);
        if done.is_multiple_of(1024) {
            options.tell(Stage::Answering(done, total));
        }
        placing.write(model, found, statement, remarks)
    });
    let unmet = replies.iter().filter(|a| a.unmet).count();
    let mut told = told_once(&replies);
    placing.place_all(replies, &model);
    let mut problems = read.problems.clone();
    show_readings(&mut model, &mut desk);
    problems.append(&mut model.take_problems());
    problems.append(&mut told);
    let place::Placed { asked, answers, problems: mut placed } = placing.finish();
    problems.append(&mut placed);
    options.tell(Stage::Writing);
    // A large model takes a while to be given back: the answers are written meanwhile.
    let ((), (rewrite, late)) =
        rayon::join(|| drop((model, desk)), || place::rewrite(&opened, &answers, read.base, options.writing));
    drop(read);
    problems.extend(late.told(name, &mut sources));
    problems.sort_by_key(|p| (p.place.start, p.place.end));
    problems.dedup();
    let problems = folded(problems);
    Filled { sources, problems, asked, unmet, rewrite }
}

/// So many problems of one sort are told one by one: a column in error may have
/// a hundred thousand cells.
const TOLD: usize = 100;

/// The first problems of each sort; the last of them says how many more there are.
fn folded(problems: Vec<Problem>) -> Vec<Problem> {
    let mut counts: BTreeMap<(Code, Level), (usize, usize)> = BTreeMap::new();
    let mut kept: Vec<Problem> = Vec::new();
    for problem in problems {
        let (count, last) = counts.entry((problem.code, problem.level)).or_default();
        *count += 1;
        if *count <= TOLD {
            *last = kept.len();
            kept.push(problem);
        }
    }
    for (count, last) in counts.into_values().filter(|(count, _)| *count > TOLD) {
        kept[last].mends.push(format!("{} more of this sort are not shown", count - TOLD));
    }
    kept
}

/// One question against the definitions of a file and further lines.
pub fn ask(
    name: &str,
    form: SheetForm,
    bytes: Vec<u8>,
    limits: &Limits,
    given: &[String],
    question: &str,
) -> Filled {
    match inquiry(name, form, bytes, limits, given, question) {
        Ok(inquiry) => inquiry.ask(),
        Err(filled) => *filled,
    }
}

/// The steps of a question, in one of their forms.
pub fn steps(
    name: &str,
    form: SheetForm,
    bytes: Vec<u8>,
    limits: &Limits,
    given: &[String],
    question: &str,
    steps: StepsForm,
) -> Filled {
    match inquiry(name, form, bytes, limits, given, question) {
        Ok(inquiry) => inquiry.steps(steps),
        Err(filled) => *filled,
    }
}

fn inquiry<'a>(
    name: &str,
    form: SheetForm,
    bytes: Vec<u8>,
    limits: &Limits,
    given: &'a [String],
    question: &'a str,
) -> Result<Inquiry<'a>, Box<Filled>> {
    let opened = open(name, form, bytes, limits).map_err(|trouble| Box::new(troubled(name, &trouble)))?;
    let mut sources = Sources::default();
    let Read { tree, problems, .. } = read(name, &opened, true, &mut sources)?;
    Ok(Inquiry { sources, tree, problems, given, question })
}

/// The syntax of a file: everything in its tables and settings.
pub fn syntax(name: &str, form: SheetForm, bytes: Vec<u8>, limits: &Limits) -> (Sources, Tree, Vec<Problem>) {
    match inquiry(name, form, bytes, limits, &[], "") {
        Ok(inquiry) => (inquiry.sources, inquiry.tree, inquiry.problems),
        Err(filled) => (filled.sources, Tree::default(), filled.problems),
    }
}

/// What a note that uses the file takes from it: the definitions of its tables
/// and the exposures and attributes that they need, and neither mission,
/// digits, year, requirements nor questions. Problems come with their cells.
///
/// `only` is the one sheet that is wanted; `block` is kept in the statements.
/// Whether anything was found.
#[allow(clippy::too_many_arguments)]
pub fn definitions(
    name: &str,
    form: SheetForm,
    bytes: Vec<u8>,
    limits: &Limits,
    only: Option<&str>,
    block: u32,
    sources: &mut Sources,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) -> bool {
    match open(name, form, bytes, limits) {
        Ok(opened) => read::definitions(name, &opened, only, block, sources, tree, problems),
        Err(trouble) => {
            let problem = trouble_in(name, &trouble, sources);
            problems.push(problem);
            false
        }
    }
}

/// A file that could not be read.
fn troubled(name: &str, trouble: &BookTrouble) -> Filled {
    let mut sources = Sources::default();
    let problem = trouble_in(name, trouble, &mut sources);
    Filled::nothing(sources, vec![problem])
}

/// A trouble of a file with its cell, where it has one.
fn trouble_in(name: &str, trouble: &BookTrouble, sources: &mut Sources) -> Problem {
    let mut place = Span::default();
    if let Some(sheet) = &trouble.sheet {
        let (row, column) = trouble.at.unwrap_or((0, 0));
        let column = u16::try_from(column).unwrap_or(u16::MAX);
        let cell = CellAt { start: 0, row, sheet: 0, column };
        let map = CellMap { sheets: vec![sheet.clone()], cells: vec![cell] };
        if let Some(base) = trouble.at.and_then(|_| sources.add_cells(name, " ", map)) {
            place = Span { start: base, end: base };
        }
    }
    let sheet = match (&trouble.sheet, trouble.at) {
        (Some(sheet), None) => format!(", sheet \"{sheet}\""),
        _ => String::new(),
    };
    let message = format!("cannot take \"{name}\"{sheet}: {}", trouble.cause);
    Problem::error(Code::FileAccess, place, message).mend(trouble.mend.clone())
}
