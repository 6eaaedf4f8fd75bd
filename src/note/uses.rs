//! `use "other.md"`, `use "parts.xlsx" sheet "Power" as P`: definitions of other
//! files brought into a note.
//!
//! They come with the exposures and attributes that their file declares, and
//! without its mission, digits, requirements and questions. Where a file comes
//! from is for a [`Shelf`] to say: nothing here touches a disk.

use super::ahead::Ahead;
use super::read::read_own;
use crate::document::markdown::find;
use crate::document::workbook::Limits;
use crate::language::{Line, Suffix, Tree, Use};
use crate::sheets::{self, SheetForm};
use crate::source::{Code, Problem, Sources, Span};

/// Where the files come from that a note uses.
pub trait Shelf: Sync {
    /// The file at `path`, as it is written in the file whose name is `from`.
    ///
    /// # Errors
    /// Why it cannot be had, and what the writer can do.
    fn fetch(&self, from: &str, path: &str) -> Result<Fetched, NotFetched>;

    /// What the file with this name is, whatever path leads to it.
    fn key(&self, name: &str) -> String {
        name.to_string()
    }

    /// How much a workbook may ask for.
    fn limits(&self) -> Limits {
        Limits::default()
    }
}

/// A file that a note uses.
#[derive(Clone, Debug)]
pub struct Fetched {
    /// The name that messages show.
    pub name: String,
    /// What the file is, whatever path leads to it.
    pub key: String,
    /// Its bytes.
    pub bytes: Vec<u8>,
}

/// Why a file cannot be used.
#[derive(Clone, Debug)]
pub struct NotFetched {
    /// The cause.
    pub cause: String,
    /// What the writer can do.
    pub mend: String,
}

/// No file is within reach.
#[derive(Clone, Copy, Debug)]
pub struct NoShelf;

impl Shelf for NoShelf {
    fn fetch(&self, _: &str, _: &str) -> Result<Fetched, NotFetched> {
        Err(NotFetched {
            cause: "no other file is within reach here".to_string(),
            mend: "give the definitions in the note itself".to_string(),
        })
    }
}

/// Statements that stand in no place of the note have this block.
pub(super) const ELSEWHERE: u32 = u32::MAX;

/// A file that is being brought in: its name, and the line that uses it.
struct Open {
    name: String,
    key: String,
    place: Span,
    /// The lines of it that use others, the first last.
    waiting: Vec<Use>,
    /// Where its statements begin, and what comes before its names.
    first: usize,
    prefix: Option<crate::language::Sym>,
}

/// Brings in what the lines of a tree use. The tree holds the note's own lines,
/// but for those of its tables.
pub(super) fn bring_in(
    name: &str,
    shelf: &dyn Shelf,
    sources: &mut Sources,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) {
    let waiting = uses(tree, 0);
    if waiting.is_empty() {
        return;
    }
    let own = tree.statements.len();
    let mut bringing = Bringing { shelf, sources, tree, problems, done: Vec::new(), own };
    // Files that use files that use files: the way down is kept here.
    let mut open = vec![Open {
        name: name.to_string(),
        key: shelf.key(name),
        place: Span::default(),
        waiting,
        first: 0,
        prefix: None,
    }];
    while let Some(top) = open.last_mut() {
        match top.waiting.pop() {
            Some(used) => {
                let from = top.name.clone();
                if let Some(next) = bringing.one(&from, used, &open) {
                    open.push(next);
                }
            }
            None => {
                if let Some(prefix) = top.prefix {
                    bringing.tree.prefix_names(top.first, prefix);
                }
                open.pop();
            }
        }
    }
}

/// The lines that use other files, from a statement on, the first last.
fn uses(tree: &Tree, from: usize) -> Vec<Use> {
    let lines = tree.statements[from..].iter().rev();
    lines.filter_map(|s| if let Line::Use(used) = &s.line { Some(*used) } else { None }).collect()
}

struct Bringing<'a> {
    shelf: &'a dyn Shelf,
    sources: &'a mut Sources,
    tree: &'a mut Tree,
    problems: &'a mut Vec<Problem>,
    /// Files that have been brought in: what they are, the sheet of each, what
    /// stands before its names, and where.
    done: Vec<(String, Option<String>, Option<String>, Span)>,
    /// How many statements are the note's own.
    own: usize,
}

impl Bringing<'_> {
    /// Reads one file; what it uses in turn is still to come.
    fn one(&mut self, from: &str, used: Use, open: &[Open]) -> Option<Open> {
        let text = |part: Option<(crate::language::Sym, Span)>, tree: &Tree| {
            part.map(|(sym, _)| tree.names.text(sym).to_string())
        };
        let place = used.path.1;
        let path = self.tree.names.text(used.path.0).to_string();
        let (sheet, prefix) = (text(used.sheet, self.tree), text(used.prefix, self.tree));
        let fetched = match self.shelf.fetch(from, &path) {
            Ok(fetched) => fetched,
            Err(NotFetched { cause, mend }) => {
                let message = format!("cannot use \"{path}\": {cause}");
                self.problems.push(Problem::error(Code::UnusableFile, place, message).mend(mend));
                return None;
            }
        };
        let name = fetched.name.clone();
        let key = fetched.key.clone();
        if let Some(at) = open.iter().position(|o| o.key == key) {
            self.circle(&open[at..], &name, place);
            return None;
        }
        // A prefix inside a file that has one itself goes before its names as well.
        let outer: Vec<String> =
            open.iter().filter_map(|o| text(o.prefix.map(|p| (p, place)), self.tree)).collect();
        let whole = outer.into_iter().chain(prefix).reduce(|a, b| format!("{a}.{b}"));
        let before =
            self.done.iter().find(|d| d.0 == key && (d.1 == sheet || d.1.is_none() || sheet.is_none()));
        if let Some((_, before_sheet, before_whole, first)) = before {
            if *before_sheet != sheet || *before_whole != whole {
                self.two_names(&path, place, *first);
            }
            return None;
        }
        self.done.push((key.clone(), sheet.clone(), whole, place));
        let first = self.tree.statements.len();
        let first_literal = self.tree.literals.len();
        let form = name.rsplit_once('.').and_then(|(_, ending)| SheetForm::of_ending(ending));
        match form {
            Some(form) => self.sheets(&fetched, form, sheet.as_deref(), place),
            None if sheet.is_some() => {
                let at = used.sheet.map_or(place, |s| s.1);
                let message = format!("\"{path}\" has no sheets");
                let problem = Problem::error(Code::UnusableFile, at, message);
                self.problems.push(problem.mend("take `sheet …` away: a note is used as a whole"));
                return None;
            }
            None => self.note(fetched, place),
        }
        self.years_of_its_own(first, first_literal, place, &name);
        self.keep_definitions(first, place, &name);
        let waiting = uses(self.tree, first);
        Some(Open { name, key, place, waiting, first, prefix: used.prefix.map(|p| p.0) })
    }

    fn sheets(&mut self, fetched: &Fetched, form: SheetForm, sheet: Option<&str>, place: Span) {
        let before = self.problems.len();
        let limits = self.shelf.limits();
        let bytes = fetched.bytes.clone();
        sheets::definitions(
            &fetched.name,
            form,
            bytes,
            &limits,
            sheet,
            ELSEWHERE,
            self.sources,
            self.tree,
            self.problems,
        );
        // What is wrong with the file as a whole is wrong with the line that uses it.
        for problem in &mut self.problems[before..] {
            if problem.place == Span::default() || problem.code == Code::NothingToDo {
                problem.place = place;
                problem.code = Code::UnusableFile;
                problem.level = crate::source::Level::Error;
            }
        }
    }

    fn note(&mut self, fetched: Fetched, place: Span) {
        let Ok(text) = String::from_utf8(fetched.bytes) else {
            let message = format!("cannot use \"{}\": it is not UTF-8 text", fetched.name);
            self.problems.push(Problem::error(Code::UnusableFile, place, message).mend("save it as UTF-8"));
            return;
        };
        let Some(base) = self.sources.add(fetched.name.clone(), text.as_str()) else {
            let message = "the texts of one run are larger than 4 GiB";
            self.problems
                .push(Problem::error(Code::TooLarge, place, message).mend("use fewer or smaller files"));
            return;
        };
        let found = find(&text, base);
        let first = self.tree.statements.len();
        let mut read = read_own(&text, base, &found, Ahead::default(), std::mem::take(self.tree));
        super::read::read_tables(&text, base, &found, &mut read.tree, &mut read.problems);
        *self.tree = read.tree;
        if self.tree.statements.len() == first {
            let message = format!("\"{}\" defines nothing for tieback", fetched.name);
            self.problems.push(
                Problem::remark(Code::UnusableFile, place, message)
                    .mend("write its definitions into a fenced block whose first word is `tieback`"),
            );
        }
        // Its questions and requirements are its own concern, and so is what is wrong with them.
        let asked: Vec<Span> = self.tree.statements[first..]
            .iter()
            .filter(|s| matches!(s.line, Line::Ask { .. } | Line::Require { .. }) || s.mark.is_some())
            .map(|s| s.span)
            .collect();
        let of_question =
            |p: &Problem| asked.iter().any(|s| s.start <= p.place.start && p.place.start <= s.end);
        self.problems.extend(read.problems.into_iter().filter(|p| !of_question(p)));
    }

    /// Of the statements from `first` on, keeps what a file that uses this one takes.
    fn keep_definitions(&mut self, first: usize, place: Span, name: &str) {
        let mut new = self.tree.statements.split_off(first);
        for statement in &new {
            if let Line::Year(value) = statement.line {
                self.other_year(value, place, name);
            }
        }
        let known = |word: crate::language::Sym, tree: &Tree| {
            tree.statements.iter().any(|s| match &s.line {
                Line::Exposure(words) => words.iter().any(|(w, _)| *w == word),
                _ => false,
            })
        };
        let alike = |(word, _, unit): &(crate::language::Sym, Span, Option<crate::language::Unit>),
                     tree: &Tree| {
            let of = |u: &Option<crate::language::Unit>| u.map(|u| (u.form, u.word));
            tree.statements.iter().any(|s| match &s.line {
                Line::Attribute(words) => words.iter().any(|(w, _, u)| w == word && of(u) == of(unit)),
                _ => false,
            })
        };
        new.retain_mut(|statement| {
            statement.mark = None;
            statement.block = ELSEWHERE;
            match &mut statement.line {
                Line::Define { display, .. } => {
                    *display = None;
                    true
                }
                // Both may say that there are starts.
                Line::Exposure(words) => {
                    words.retain(|(word, _)| !known(*word, self.tree));
                    !words.is_empty()
                }
                Line::Attribute(words) => {
                    words.retain(|word| !alike(word, self.tree));
                    !words.is_empty()
                }
                Line::Broken(names) => !names.is_empty(),
                Line::Use(_) => true,
                _ => false,
            }
        });
        self.tree.statements.append(&mut new);
    }

    /// A file that says nothing of the year means the usual one by it: in a note
    /// that sets another its data would change.
    fn years_of_its_own(&mut self, first: usize, first_literal: usize, place: Span, name: &str) {
        let own = self.tree.statements[..self.own].iter().find_map(|s| match s.line {
            Line::Year(value) => Some(value),
            _ => None,
        });
        let Some(ours) = own else { return };
        // The settings of a parts list are cells of its text and become no lines.
        let in_cells = |text: &str| {
            text.lines()
                .any(|cell| cell.split_whitespace().next().is_some_and(|w| w.eq_ignore_ascii_case("year")))
        };
        let says = self.tree.statements[first..].iter().any(|s| matches!(s.line, Line::Year(_)))
            || self.sources.files().last().is_some_and(|f| f.cells.is_some() && in_cells(&f.text));
        let in_years = self.tree.literals[first_literal..].iter().any(|l| match l.suffix {
            Suffix::Unit(unit) => matches!(self.tree.names.text(unit.word), "yr" | "year" | "years"),
            _ => false,
        });
        if !says && in_years {
            let message = format!(
                "this note sets the length of a year, and \"{name}\" has data in years without saying so"
            );
            self.problems.push(
                Problem::error(Code::BadSetting, place, message)
                    .label(self.tree.span(ours), "set here")
                    .mend("set the same year in both, or give its data in hours"),
            );
        }
    }

    /// A year of another length in the used file would change what its data mean.
    fn other_year(&mut self, value: crate::language::ExprId, place: Span, name: &str) {
        let words = |value: crate::language::ExprId, this: &Self| {
            let text = this.sources.text(this.tree.span(value));
            text.split_whitespace().collect::<String>()
        };
        let theirs = words(value, self);
        let same = self.tree.statements[..self.own].iter().any(|s| match s.line {
            Line::Year(ours) => words(ours, self) == theirs,
            _ => false,
        });
        if !same {
            let message =
                format!("\"{name}\" sets the length of a year, and this note does not set it alike");
            self.problems.push(
                Problem::error(Code::BadSetting, place, message)
                    .label(self.tree.span(value), "set here")
                    .mend("set the same year in both, or give its data in hours"),
            );
        }
    }

    /// A file whose things would get two names: one physical thing would count as two.
    fn two_names(&mut self, path: &str, place: Span, first: Span) {
        let message = format!("\"{path}\" is used already under other names: its things would count twice");
        self.problems.push(
            Problem::error(Code::SeveralNames, place, message)
                .label(first, "used here")
                .mend("use it in the same way everywhere: with the same prefix, or with none"),
        );
    }

    fn circle(&mut self, way: &[Open], name: &str, place: Span) {
        let names: Vec<&str> = way.iter().map(|o| o.name.as_str()).chain([name]).collect();
        let message = format!("files use each other in a circle: {}", names.join(" -> "));
        let mut problem = Problem::error(Code::Circle, place, message);
        for step in way.iter().skip(1) {
            problem = problem.label(step.place, "on the way round");
        }
        self.problems.push(problem.mend("move what both need into a file that uses neither"));
    }
}
