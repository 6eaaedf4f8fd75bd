//! One note from end to end: places, language, model, answers, edits.

mod ahead;
mod place;
mod read;
mod uses;

pub use crate::answer::{Asked, Filled, StepsForm};
use crate::answer::{Inquiry, answer_all, show_readings, told_once};
pub use crate::document::patch::Rewrite;
use crate::document::patch::{Edit, apply};
use crate::language::Tree;
use crate::source::{Code, Problem, Sources, Span};
use crate::system::Model;
use ahead::LARGE;
use read::{Read, find_and_read};
use std::sync::Arc;
pub use uses::{Fetched, NoShelf, NotFetched, Shelf};

/// Fills a note: finds its questions and answers them.
pub fn fill(name: &str, text: &str) -> Filled {
    fill_from(name, Arc::from(text), &NoShelf)
}

/// The same for a note that may use other files. The text is shared: a large
/// note is held once.
pub fn fill_from(name: &str, text: Arc<str>, shelf: &dyn Shelf) -> Filled {
    let mut sources = Sources::default();
    let Some(base) = sources.add(name, text.clone()) else { return Filled::too_much_text(sources) };
    let text: &str = &text;
    let read = find_and_read(text, base, name, shelf, &mut sources);
    if read.found.places.is_empty() {
        let mut problems = read.found.problems;
        if problems.is_empty() {
            let place = Span { start: base, end: base };
            problems.push(
                Problem::remark(Code::NothingToDo, place, "this note holds nothing for tieback").mend(
                    "write a fenced block whose first word is `tieback`, or a comment pair such as `<!--? R(feed) -->`",
                ),
            );
        }
        return Filled::nothing(sources, problems);
    }
    let (problems, asked, unmet, rewrite) = answer_note(&read, &sources, text, base);
    Filled { sources, problems, asked, unmet, rewrite }
}

/// The syntax of a note: everything in its blocks, pairs and tables.
pub fn syntax(name: &str, text: &str) -> (Sources, Tree, Vec<Problem>) {
    syntax_from(name, text, &NoShelf)
}

/// The same for a note that may use other files.
pub fn syntax_from(name: &str, text: &str, shelf: &dyn Shelf) -> (Sources, Tree, Vec<Problem>) {
    let mut sources = Sources::default();
    let Some(base) = sources.add(name, text) else { return (sources, Tree::default(), Vec::new()) };
    let read = find_and_read(text, base, name, shelf, &mut sources);
    (sources, read.tree, read.problems)
}

type Outcome = (Vec<Problem>, Vec<Asked>, usize, Rewrite);

fn answer_note(read: &Read, sources: &Sources, text: &str, base: u32) -> Outcome {
    let mut model = Model::new(&read.tree, sources);
    let (answered, mut desk) = answer_all(&mut model, &|model, found, _, _| found.reply(model));
    let unmet = answered.iter().filter(|a| a.unmet).count();
    let mut work = Work::new(read, text, base);
    work.problems = told_once(&answered);
    work.place_all(&answered, &model);
    let mut problems = read.found.problems.clone();
    problems.extend(read.problems.iter().cloned());
    show_readings(&mut model, &mut desk);
    problems.append(&mut model.take_problems());
    problems.append(&mut work.problems);
    problems.sort_by_key(|p| (p.place.start, p.place.end));
    problems.dedup();
    let edits = std::mem::take(&mut work.edits);
    let patched = if text.len() < LARGE {
        apply(text.as_bytes(), &edits)
    } else {
        // A large model takes a while to be given back: the answers are put in meanwhile.
        rayon::join(|| drop((model, desk, answered)), || apply(text.as_bytes(), &edits)).1
    };
    let rewrite = match patched {
        Ok(rewrite) => rewrite,
        Err(overlap) => {
            let place = Span::new(overlap.second.start, overlap.second.end);
            problems.push(
                Problem::error(
                    Code::MisplacedPair,
                    place,
                    "two answers would stand in one place; nothing was written",
                )
                .mend("take one of the two questions away"),
            );
            Rewrite::Unchanged
        }
    };
    work.asked.sort_by_key(|a| a.place.start);
    (problems, work.asked, unmet, rewrite)
}

struct Work<'a> {
    read: &'a Read,
    text: &'a str,
    base: u32,
    edits: Vec<Edit>,
    asked: Vec<Asked>,
    problems: Vec<Problem>,
    /// Answers of table cells: place, row, column, text.
    cells: Vec<(usize, usize, usize, String)>,
    /// Where answers add or take lines, and how many: by place, summed up.
    shifts: Vec<(usize, i64)>,
}

impl<'a> Work<'a> {
    fn new(read: &'a Read, text: &'a str, base: u32) -> Work<'a> {
        Work {
            read,
            text,
            base,
            edits: Vec::new(),
            asked: Vec::new(),
            problems: Vec::new(),
            cells: Vec::new(),
            shifts: Vec::new(),
        }
    }
}

/// One question against the definitions of a note and further lines.
pub fn ask(name: &str, text: &str, shelf: &dyn Shelf, given: &[String], question: &str) -> Filled {
    match inquiry(name, text, shelf, given, question) {
        Ok(inquiry) => inquiry.ask(),
        Err(filled) => *filled,
    }
}

/// The steps of a question, in one of their forms; `question` is `R(feed)` or a formula.
pub fn steps(
    name: &str,
    text: &str,
    shelf: &dyn Shelf,
    given: &[String],
    question: &str,
    form: StepsForm,
) -> Filled {
    match inquiry(name, text, shelf, given, question) {
        Ok(inquiry) => inquiry.steps(form),
        Err(filled) => *filled,
    }
}

fn inquiry<'a>(
    name: &str,
    text: &str,
    shelf: &dyn Shelf,
    given: &'a [String],
    question: &'a str,
) -> Result<Inquiry<'a>, Box<Filled>> {
    let mut sources = Sources::default();
    let Some(base) = sources.add(name, text) else { return Err(Box::new(Filled::too_much_text(sources))) };
    let Read { found, tree, problems: read, .. } = find_and_read(text, base, name, shelf, &mut sources);
    let mut problems = found.problems;
    problems.extend(read);
    Ok(Inquiry { sources, tree, problems, given, question })
}
