//! A file to syntax: settings, then tables.

use super::SheetForm;
use super::find::{Found, Setting, find};
use super::rows::Opened;
use super::text::{Based, SheetText, Table};
use crate::answer::Filled;
use crate::document::delimited::Delimited;
use crate::document::workbook::{self, BookTrouble, Limits};
use crate::language::{self, CellAsk, CellKind, Grid, Line, Source, Tree};
use crate::source::{CellMap, Code, Problem, Sources, Span};
use rustc_hash::FxHashSet;
use std::sync::Arc;

/// Opens a file.
pub(super) fn open(
    name: &str,
    form: SheetForm,
    bytes: Vec<u8>,
    limits: &Limits,
) -> Result<Opened, BookTrouble> {
    if form == SheetForm::Workbook {
        return workbook::open(name, bytes, limits).map(Opened::Book);
    }
    let text = String::from_utf8(bytes).map_err(|error| {
        let at = error.utf8_error().valid_up_to();
        BookTrouble {
            sheet: None,
            cell: None,
            at: None,
            cause: format!("byte {} of it is not UTF-8 text", at + 1),
            mend: "save it as \"CSV UTF-8\"; it has been left as it is".to_string(),
        }
    })?;
    let text: Arc<str> = text.into();
    let cut = Delimited::read(&text, form == SheetForm::Tsv);
    Ok(Opened::Delimited(text, cut))
}

/// A file as read: its cells, its syntax, and what asks where.
pub(super) struct Read {
    /// Where its text begins among the sources.
    pub(super) base: u32,
    pub(super) text: Arc<str>,
    pub(super) map: Arc<CellMap>,
    pub(super) kinds: Vec<(CellKind, bool)>,
    pub(super) tables: Vec<Table>,
    /// Whether the file tells which cells formulas compute.
    formulas: bool,
    pub(super) tree: Tree,
    pub(super) problems: Vec<Problem>,
    /// Cells that ask, in the order of their statements.
    pub(super) asks: Vec<CellAsk>,
}

impl Read {
    pub(super) fn based(&self) -> Based<'_> {
        Based { text: &self.text, base: self.base, map: &self.map, kinds: &self.kinds }
    }
}

/// Reads everything in a file's tables and settings. `Err` where it has
/// nothing for tieback, or too much.
pub(super) fn read(
    name: &str,
    opened: &Opened,
    named: bool,
    sources: &mut Sources,
) -> Result<Read, Box<Filled>> {
    let found = find(opened, None, FxHashSet::default());
    if found.headers.is_empty() || !(named || found.asks()) {
        let problem = nothing(name, &found, sources);
        return Err(Box::new(Filled::nothing(std::mem::take(sources), vec![problem])));
    }
    let Some(mut read) = put_together(name, opened, &found, sources) else {
        return Err(Box::new(Filled::too_much_text(std::mem::take(sources))));
    };
    let (mut tree, mut problems) = (Tree::default(), Vec::new());
    for (entry, setting) in &read.1 {
        let source = read.0.based().source(*entry as usize);
        self::setting(source, setting, 0, &mut tree, &mut problems);
    }
    problems.extend(found.nameless.iter().take(20).filter_map(|at| nameless(name, at, sources)));
    let grids = grids(&read.0, 0);
    language::read_grids(&grids, &mut tree, &mut problems);
    let asks = language::ask_grids(&grids, &mut tree, &mut problems);
    drop(grids);
    read.0.tree = tree;
    read.0.problems = problems;
    read.0.asks = asks;
    Ok(read.0)
}

/// See [`super::definitions`].
pub(super) fn definitions(
    name: &str,
    opened: &Opened,
    only: Option<&str>,
    block: u32,
    sources: &mut Sources,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) -> bool {
    let found = find(opened, only, language::declared_attributes(tree));
    if let Some(sheet) = only.filter(|sheet| !opened.names().iter().any(|name| name == sheet)) {
        let names = opened.names().join("\", \"");
        let message = format!("\"{name}\" has no sheet \"{sheet}\"");
        let problem = Problem::error(Code::NothingToDo, Span::default(), message);
        problems.push(problem.mend(format!("its sheets are \"{names}\"")));
        return false;
    }
    if found.headers.is_empty() {
        let problem = nothing(name, &found, sources);
        problems.push(problem);
        return false;
    }
    let Some((read, settings)) = put_together(name, opened, &found, sources) else {
        let message = "the texts of one run are larger than 4 GiB";
        problems.push(
            Problem::error(Code::TooLarge, Span::default(), message).mend("run over fewer files at a time"),
        );
        return false;
    };
    for (entry, setting) in &settings {
        if setting.word == "year" {
            let source = read.based().source(*entry as usize);
            if !same_year(source.text, tree, sources) {
                let end = source.at + source.text.len() as u32;
                let place = Span { start: source.at, end };
                let message =
                    "this sets the length of a year, and the note that uses the list does not set it alike";
                let problem = Problem::error(Code::BadSetting, place, message);
                problems.push(problem.mend("set the same year in both, or give its data in hours"));
            }
        }
        if matches!(setting.word, "exposure" | "attribute") {
            self::setting(read.based().source(*entry as usize), setting, block, tree, problems);
            drop_declared(tree);
        }
    }
    language::read_grids(&grids(&read, block), tree, problems);
    true
}

/// Whether the note sets the year in the same words.
fn same_year(theirs: &str, tree: &Tree, sources: &Sources) -> bool {
    let words = |text: &str| text.split_whitespace().collect::<String>();
    let theirs = words(theirs.trim_start_matches("year"));
    tree.statements.iter().any(|s| match s.line {
        Line::Year(value) => words(sources.text(tree.span(value))) == theirs,
        _ => false,
    })
}

/// Takes from the last line what a line before it declares alike: a note and
/// the parts list that it uses may both say `exposure start`.
fn drop_declared(tree: &mut Tree) {
    let Some(mut last) = tree.statements.pop() else { return };
    match &mut last.line {
        Line::Exposure(words) => words.retain(|(word, _)| {
            !tree.statements.iter().any(|s| match &s.line {
                Line::Exposure(known) => known.iter().any(|(k, _)| k == word),
                _ => false,
            })
        }),
        Line::Attribute(words) => words.retain(|(word, _, unit)| {
            !tree.statements.iter().any(|s| match &s.line {
                Line::Attribute(known) => {
                    let unit = unit.map(|u| (u.form, u.word));
                    known.iter().any(|(k, _, u)| k == word && u.map(|u| (u.form, u.word)) == unit)
                }
                _ => false,
            })
        }),
        _ => {}
    }
    tree.statements.push(last);
}

type Settings = Vec<(u32, Setting)>;

/// The cells of a file as a text among the sources.
fn put_together(
    name: &str,
    opened: &Opened,
    found: &Found,
    sources: &mut Sources,
) -> Option<(Read, Settings)> {
    let mut sheet = SheetText::new(opened, found).ok()?;
    let map = Arc::new(std::mem::take(&mut sheet.map));
    let text: Arc<str> = std::mem::take(&mut sheet.text).into();
    let base = sources.add_cells(name, text.clone(), map.clone())?;
    let read = Read {
        base,
        text,
        map,
        kinds: sheet.kinds(),
        tables: sheet.tables,
        formulas: matches!(opened, Opened::Book(_)),
        tree: Tree::default(),
        problems: Vec::new(),
        asks: Vec::new(),
    };
    Some((read, sheet.settings))
}

fn grids(read: &Read, block: u32) -> Vec<Grid<'_>> {
    read.tables.iter().map(|table| read.based().grid(table, read.formulas, block)).collect()
}

/// A setting's line, unless its cell holds what no line can.
fn setting(source: Source<'_>, setting: &Setting, block: u32, tree: &mut Tree, problems: &mut Vec<Problem>) {
    let span = Span { start: source.at, end: source.at + source.text.len() as u32 };
    let cause = match setting.kind {
        CellKind::Text | CellKind::Number => None,
        CellKind::Date => Some("a date or a time stands".to_string()),
        CellKind::Logical => Some("true or false stands".to_string()),
        CellKind::Failed => Some("a formula that fails stands".to_string()),
        CellKind::NoValue => Some("a formula without a stored value stands".to_string()),
    };
    if let Some(cause) = cause {
        let message = format!("{cause} where the value of `{}` should be", setting.word);
        let mend =
            format!("write it as text, as in `{}`, or rename the cell before it", example(setting.word));
        problems.push(Problem::error(Code::TableCell, span, message).mend(mend));
        return;
    }
    let bare = setting.value.parse::<f64>();
    if setting.word == "year" && bare.is_ok_and(|year| (1900.0..=2100.0).contains(&year)) {
        let message = "this is taken for a year of the calendar, and sets nothing";
        let mend = "the hours of a year are set by `year` with its unit: `8766 h`";
        problems.push(Problem::remark(Code::BadSetting, span, message).mend(mend));
        return;
    }
    language::read_block(std::iter::once(source), block, tree, problems);
    // A setting asks nothing: its cell has no place for an answer.
    if let Some(last) = tree.statements.last_mut()
        && last.mark.take().is_some()
    {
        let message = "a setting has no place for an answer";
        problems.push(Problem::error(Code::MalformedQuestion, span, message).mend("take the `?` away"));
        last.line = Line::Broken(Vec::new());
    }
}

fn example(word: &str) -> &'static str {
    match word {
        "mission" => "4000 h",
        "digits" => "4",
        "year" => "8766 h",
        "exposure" => "start, km",
        "attribute" => "power W",
        _ => "R(gate) >= 0.999",
    }
}

/// The remark on a file that has nothing for tieback.
fn nothing(name: &str, found: &Found, sources: &mut Sources) -> Problem {
    let place = sources.add(name, "").map_or(Span::default(), |at| Span { start: at, end: at });
    let problem = Problem::remark(Code::NothingToDo, place, "this file holds no table for tieback");
    match found.nameless.first() {
        Some((_, row, column, header)) => {
            let cell = crate::source::cell_name(*row, *column);
            problem.mend(format!("the row of `{header}` in {cell} heads no column `name`: name one so"))
        }
        None => problem.mend(
            "head one column `name`, and others `is`, a clause such as `rate (FIT)`, or a question such as `R ?`",
        ),
    }
}

/// The remark on a row that asks and has no names, in a file that has other tables.
fn nameless(
    name: &str,
    (sheet, row, column, header): &(usize, u32, u32, String),
    sources: &mut Sources,
) -> Option<Problem> {
    let sheets = sources.files().last()?.cells.as_ref()?.sheets.clone();
    let cell = crate::source::CellAt {
        start: 0,
        row: *row,
        sheet: u16::try_from(*sheet).ok()?,
        column: u16::try_from(*column).ok()?,
    };
    let map = CellMap { sheets, cells: vec![cell] };
    let base = sources.add_cells(name, header.as_str(), map)?;
    let place = Span { start: base, end: base + header.len() as u32 };
    let message = "this row asks, and heads no table: it has no column `name`";
    Some(Problem::remark(Code::TableShape, place, message).mend("head the column of names `name`"))
}
