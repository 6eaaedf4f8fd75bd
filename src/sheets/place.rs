//! Replies to cells: each answer goes into the cell of its question, and what
//! the user wrote there stays.

use super::number::{CellNote, CellReply, cell_number};
use super::read::Read;
use super::rows::{Content, Opened};
use super::{Writing, export, trouble_in};
use crate::answer::{Answered, Asked, Outcome, Own, misfit};
use crate::document::patch::{Edit, Rewrite, apply};
use crate::document::workbook::{Answer, AnswerValue, Book, BookTrouble};
use crate::language::{CellAsk, Line, is_answer_cell};
use crate::source::{CellAt, CellMap, Code, Level, Problem, Sources, Span, cell_name};
use crate::system::{Model, Out};
use rayon::prelude::*;

/// Puts replies into the cells of their questions.
pub(super) struct Placing<'a> {
    opened: &'a Opened,
    read: &'a Read,
    asked: Vec<Asked>,
    answers: Vec<CellAnswer>,
    problems: Vec<Problem>,
    /// Errors that were found while reading, by where they are or point.
    errors: Vec<(u32, u32)>,
}

/// What goes into a cell.
#[derive(Clone, PartialEq, Debug)]
pub(super) struct CellAnswer {
    sheet: usize,
    row: u32,
    column: u32,
    reply: CellReply,
    /// Whether it differs from what stands there.
    stale: bool,
}

/// What came of placing.
pub(super) struct Placed {
    pub(super) asked: Vec<Asked>,
    pub(super) answers: Vec<CellAnswer>,
    pub(super) problems: Vec<Problem>,
}

impl<'a> Placing<'a> {
    pub(super) fn new(opened: &'a Opened, read: &'a Read) -> Placing<'a> {
        let mut errors = Vec::new();
        for (at, problem) in read.problems.iter().enumerate().filter(|(_, p)| p.level == Level::Error) {
            errors.push((problem.place.start, at as u32));
            if matches!(problem.code, Code::UnknownName | Code::UnknownUnit) {
                errors.extend(problem.labels.iter().map(|l| (l.place.start, at as u32)));
            }
        }
        errors.sort_unstable();
        Placing { opened, read, asked: Vec::new(), answers: Vec::new(), problems: Vec::new(), errors }
    }

    fn ask(&self, statement: usize) -> Option<CellAsk> {
        let at = self.read.asks.binary_search_by_key(&statement, |a| a.statement).ok()?;
        Some(self.read.asks[at])
    }

    /// Sheet, row and column of an entry.
    fn cell(&self, entry: usize) -> (usize, u32, u32) {
        self.read.map.cells.get(entry).map_or((0, 0, 0), |c| (c.sheet.into(), c.row, c.column.into()))
    }

    fn entry(&self, ask: CellAsk) -> usize {
        self.read.tables.get(ask.grid).and_then(|t| t.entry(ask.row, ask.column)).unwrap_or(0)
    }

    /// An outcome as its cell holds it, and what is to be known of it.
    pub(super) fn write(
        &self,
        model: &mut Model<'_>,
        found: Outcome,
        statement: usize,
        remarks: &mut Vec<Problem>,
    ) -> Out<CellReply> {
        let (number, display, asked) = match found {
            Outcome::Reply(reply) => return Ok(CellReply::of_reply(&reply)),
            Outcome::Number(number, display, asked) => (number, display, asked),
        };
        let ask = self.ask(statement);
        let percent = match (self.opened, ask) {
            (Opened::Book(book), Some(ask)) => {
                let (sheet, row, column) = self.cell(self.entry(ask));
                book.sheets().get(sheet).is_some_and(|s| s.at(row, column).percent)
            }
            _ => false,
        };
        let (reply, note) = cell_number(model, &number, display, percent)
            .map_err(|problem| misfit(model, *problem, asked))?;
        if let (Some(note), Some(ask)) = (note, ask) {
            remarks.push(self.note(&note, ask));
        }
        Ok(reply)
    }

    pub(super) fn place_all(&mut self, replies: Vec<Answered<CellReply>>, model: &Model<'_>) {
        let placed = |answered: Answered<CellReply>| {
            let ask = self.ask(answered.statement)?;
            Some(self.place(answered, ask, model))
        };
        let all: Vec<_> = replies.into_par_iter().with_min_len(1000).filter_map(placed).collect();
        self.asked.reserve(all.len());
        self.answers.reserve(all.len());
        for (asked, answer, problem) in all {
            self.asked.push(asked);
            self.answers.extend(answer);
            self.problems.extend(problem);
        }
    }

    /// One answer: what is reported, what goes into the cell, and why nothing does.
    fn place(
        &self,
        answered: Answered<CellReply>,
        ask: CellAsk,
        model: &Model<'_>,
    ) -> (Asked, Option<CellAnswer>, Option<Problem>) {
        let remarks = answered.remarks();
        let Answered { statement, reply, unmet, .. } = answered;
        let entry = self.entry(ask);
        let place = self.read.based().span(entry);
        let reply = match reply {
            Ok(reply) => reply,
            Err(fault) => CellReply::Error(self.message(fault, ask, model)),
        };
        let old = self.content(entry);
        let error = matches!(reply, CellReply::Error(_));
        let shown = self.text_of(&old);
        let kept = self.kept(entry, &old, &shown, place, model);
        let stale = kept.is_none() && !same(&reply, &old, self.opened);
        let (sheet, row, column) = self.cell(entry);
        let new = reply.text();
        let answer = kept.is_none().then_some(CellAnswer { sheet, row, column, reply, stale });
        let question = match &model.tree.statements[statement].line {
            Line::Ask { value, .. } => model.text_of(*value),
            Line::Require { .. } => "met".to_string(),
            _ => {
                let header = self.read.tables.get(ask.grid).map_or(0, |t| t.header_entry(ask.column));
                self.read.based().source(header).text.trim_end_matches('?').trim().to_string()
            }
        };
        (Asked { place, question, old: shown, new, stale, error, unmet, remarks }, answer, kept)
    }

    fn content(&self, entry: usize) -> Content<'a> {
        let (sheet, row, column) = self.cell(entry);
        match self.opened {
            Opened::Book(_) => self.opened.content(sheet, row, column),
            // As it stands: a comma is taken for a point only where shapes are told.
            Opened::Delimited(text, cut) => match cut.record_fields(row as usize).get(column as usize) {
                Some(field) => Content::Text(cut.as_written(text, field)),
                None => Content::Empty,
            },
        }
    }

    fn text_of(&self, content: &Content<'_>) -> String {
        match content {
            Content::Empty | Content::NoValue => String::new(),
            Content::Text(text) => text.trim().to_string(),
            Content::Number(number) => crate::document::workbook::number_text(*number),
            Content::Date(text) | Content::Failed(text) => text.to_string(),
            Content::Logical(it) => if *it { "TRUE" } else { "FALSE" }.to_string(),
        }
    }

    /// Why a cell is the user's and stays as it is, if it does.
    fn kept(
        &self,
        entry: usize,
        old: &Content<'_>,
        shown: &str,
        place: Span,
        model: &Model<'_>,
    ) -> Option<Problem> {
        let (sheet, row, column) = self.cell(entry);
        let cell = match self.opened {
            Opened::Book(book) => book.sheets().get(sheet).map(|s| s.at(row, column)),
            Opened::Delimited(..) => None,
        };
        let (message, mends): (String, &[&str]) = if cell.is_some_and(|c| c.formula) {
            (
                "a formula stands where an answer would go, and stays".to_string(),
                &["move it to a column of its own", "delete it to have the question answered here"],
            )
        } else if let Some(first) = cell.and_then(|c| c.merged_into) {
            (
                format!("this cell lies hidden under {}, and holds no answer", cell_name(first.0, first.1)),
                &["split the merged range"],
            )
        } else {
            let ours = match old {
                Content::Empty | Content::Number(_) => true,
                Content::Text(text) => {
                    let plain = match self.opened {
                        Opened::Delimited(_, cut) => cut.plain(text),
                        Opened::Book(_) => text.as_ref().into(),
                    };
                    is_answer_cell(&plain, &|word| model.units.is_unit(word, &model.tree.names))
                }
                _ => false,
            };
            if ours {
                return None;
            }
            let start: String = shown.lines().next().unwrap_or("").chars().take(40).collect();
            (
                format!("`{start}` is not shaped like an answer, and stays"),
                &[
                    "what stands under a question is tieback's: move your text to a column of its own",
                    "delete it to have the question answered here",
                ],
            )
        };
        let problem = Problem::error(Code::NotAnAnswer, place, message);
        Some(mends.iter().fold(problem, |problem, mend| problem.mend(*mend)))
    }

    /// What is to be known of an answer.
    fn note(&self, note: &CellNote, ask: CellAsk) -> Problem {
        match note {
            CellNote::Rounded => {
                let message = "the nines of this answer go beyond the 15 digits of a cell, and it is rounded towards failure";
                let place = self.read.based().span(self.entry(ask));
                Problem::remark(Code::CutShort, place, message).mend("ask `F ?` beside it: its digits fit")
            }
            CellNote::Unit(unit) => {
                let header = self.read.tables.get(ask.grid).map_or(0, |t| t.header_entry(ask.column));
                let message = format!("the numbers under this header are in {unit}");
                Problem::remark(Code::TableHeader, self.read.based().span(header), message)
                    .mend("write `in` and a unit before the `?` for another")
            }
        }
    }

    /// The message of an answer that is none.
    fn message(&self, fault: crate::system::Fault, ask: CellAsk, model: &Model<'_>) -> String {
        let based = self.read.based();
        let header = self.read.tables.get(ask.grid).map_or(0, |t| t.header_entry(ask.column));
        let header = based.span(header);
        let (first, end) = self.read.tables.get(ask.grid).map_or((0, 0), |t| t.row_entries(ask.row));
        let row = based.span(first).to(based.span(end.saturating_sub(1)));
        let inside = |span: Span, place: Span| span.start <= place.start && place.start <= span.end;
        let within = |place| inside(header, place) || inside(row, place);
        let problems = &self.read.problems;
        let of = |span: Span| {
            let from = self.errors.partition_point(|(at, _)| *at < span.start);
            self.errors[from..].iter().take_while(move |(at, _)| *at <= span.end).map(|(_, problem)| *problem)
        };
        let first = || of(row).chain(of(header)).min().and_then(|at| problems.get(at as usize));
        let elsewhere = |place| model.sources.words(place);
        Own { within: &within, in_cell: true, first: &first, elsewhere: &elsewhere }.message(fault, model)
    }

    pub(super) fn finish(mut self) -> Placed {
        self.asked.sort_by_key(|a| a.place.start);
        Placed { asked: self.asked, answers: self.answers, problems: self.problems }
    }
}

/// Whether a cell holds an answer already.
fn same(reply: &CellReply, old: &Content<'_>, opened: &Opened) -> bool {
    match (reply, old) {
        (CellReply::Number(value, _), Content::Number(old)) => value == old,
        // A delimited file keeps numbers as text, and another program may have written it anew.
        (CellReply::Number(value, _), Content::Text(text)) => match opened {
            Opened::Delimited(_, cut) => cut.plain(text).trim().parse::<f64>().is_ok_and(|old| old == *value),
            Opened::Book(_) => false,
        },
        (reply, Content::Text(text)) => match opened {
            Opened::Delimited(_, cut) => *text == written(reply, cut),
            Opened::Book(_) => *text == reply.text(),
        },
        _ => false,
    }
}

/// A reply as a delimited file writes it: values take its decimal comma, messages stay.
fn written(reply: &CellReply, cut: &crate::document::delimited::Delimited) -> String {
    let text = reply.text();
    let value = |t: &str| {
        t.starts_with(|c: char| c.is_ascii_digit() || matches!(c, '-' | '<' | '>' | '~'))
            || ["met: ", "NOT met: ", "UNDECIDED: "].iter().any(|head| t.starts_with(head))
    };
    match reply {
        CellReply::Error(_) => text,
        _ if text.contains('\n') || !value(&text) => text,
        _ => cut.written(&text).into_owned(),
    }
}

/// What is to be said of the writing; the place of a cell that is in no text
/// yet comes with it.
#[derive(Default)]
pub(super) struct Late {
    pub(super) problems: Vec<Problem>,
    /// A trouble with the file itself.
    pub(super) trouble: Option<BookTrouble>,
    /// A remark on a cell.
    pub(super) of_cell: Option<(Problem, CellMap)>,
}

impl Late {
    /// Everything as problems, with places among the sources.
    pub(super) fn told(self, name: &str, sources: &mut Sources) -> Vec<Problem> {
        let mut problems = self.problems;
        if let Some(trouble) = self.trouble {
            problems.push(trouble_in(name, &trouble, sources).mend("nothing was written"));
        }
        if let Some((mut problem, map)) = self.of_cell {
            if let Some(at) = sources.add_cells(name, "=", map) {
                problem.place = Span { start: at, end: at + 1 };
            }
            problems.push(problem);
        }
        problems
    }
}

/// Writes the answers, as far as they are to be written.
pub(super) fn rewrite(
    opened: &Opened,
    answers: &[CellAnswer],
    base: u32,
    writing: Writing,
) -> (Rewrite, Late) {
    let mut late = Late::default();
    let done = match opened {
        Opened::Delimited(text, cut) => {
            let any = answers.iter().any(|a| a.stale) && writing != Writing::Compare;
            if any { delimited(text, cut, answers) } else { Ok(Rewrite::Unchanged) }
        }
        Opened::Book(book) => book_with(book, answers, base, writing, &mut late),
    };
    let rewrite = done.unwrap_or_else(|trouble| {
        late.trouble = Some(trouble);
        Rewrite::Unchanged
    });
    (rewrite, late)
}

type Done = Result<Rewrite, BookTrouble>;

fn delimited(text: &str, cut: &crate::document::delimited::Delimited, answers: &[CellAnswer]) -> Done {
    let mut order: Vec<&CellAnswer> = answers.iter().filter(|a| a.stale).collect();
    order.sort_by_key(|a| (a.row, a.column));
    let mut edits: Vec<Edit> = Vec::with_capacity(order.len());
    for row in order.chunk_by(|a, b| a.row == b.row) {
        let texts: Vec<String> = row.iter().map(|a| written(&a.reply, cut)).collect();
        let fields: Vec<(usize, &str)> =
            row.iter().zip(&texts).map(|(a, text)| (a.column as usize, text.as_str())).collect();
        edits.extend(cut.edits(row[0].row as usize, &fields));
    }
    // Fields do not overlap, and each is answered once.
    Ok(apply(text.as_bytes(), &edits).unwrap_or(Rewrite::Unchanged))
}

fn book_with(book: &Book, answers: &[CellAnswer], base: u32, writing: Writing, late: &mut Late) -> Done {
    let place = Span { start: base, end: base };
    if let Some(why) = book.read_only_because().filter(|_| writing == Writing::InPlace) {
        let message = format!("the answers are not written: {why}");
        late.problems.push(
            Problem::error(Code::FileAccess, place, message)
                .mend("write them to a new workbook: `-o answers.xlsx`")
                .mend("or save this one as xlsx in a spreadsheet program, and fill that"),
        );
        return Ok(Rewrite::Unchanged);
    }
    if writing == Writing::Compare {
        return Ok(Rewrite::Unchanged);
    }
    let given: Vec<Answer> = answers
        .iter()
        .map(|a| Answer {
            sheet: a.sheet,
            row: a.row,
            column: a.column,
            value: match &a.reply {
                CellReply::Number(value, format) => {
                    AnswerValue::Number { value: *value, format: Some(format.clone()) }
                }
                reply => AnswerValue::Text(reply.text()),
            },
        })
        .collect();
    if book.read_only_because().is_some() {
        late.problems.push(Problem::remark(
            Code::FileAccess,
            place,
            "the new workbook holds values and answers only: formulas, styles, widths, charts, pictures, comments and \
             macros are not carried over",
        ));
        return export::new_workbook(book, &given).map(Rewrite::Patched);
    }
    let changed: Vec<(usize, u32, u32)> =
        answers.iter().filter(|a| a.stale).map(|a| (a.sheet, a.row, a.column)).collect();
    let bytes = book.write(&given)?;
    late.of_cell = resting(book, &changed);
    Ok(if bytes == book.bytes() { Rewrite::Unchanged } else { Rewrite::Patched(bytes) })
}

/// The remark on formulas whose stored values no longer hold, at the first of them.
fn resting(book: &Book, changed: &[(usize, u32, u32)]) -> Option<(Problem, CellMap)> {
    const SHOWN: usize = 5;
    let formulas = book.formulas_depending_on(changed);
    let &(sheet, row, column) = formulas.first()?;
    let sheets = book.sheets().iter().map(|s| s.name.clone()).collect();
    let at = |(sheet, row, column): (usize, u32, u32)| CellAt {
        start: 0,
        row,
        sheet: u16::try_from(sheet).unwrap_or(u16::MAX),
        column: u16::try_from(column).unwrap_or(u16::MAX),
    };
    let mut map = CellMap { sheets, cells: vec![at((sheet, row, column))] };
    let mut names: Vec<String> = Vec::new();
    for formula in formulas.iter().take(SHOWN) {
        map.cells[0] = at(*formula);
        names.extend(map.place(0).map(|place| place.short()));
    }
    map.cells[0] = at((sheet, row, column));
    let list = match formulas.len().checked_sub(SHOWN).filter(|more| *more > 0) {
        Some(more) => format!("{} and {more} more", names.join(", ")),
        None => names.join(", "),
    };
    let (rest, they) = if formulas.len() == 1 { ("rests", "shows its") } else { ("rest", "show their") };
    let message = format!(
        "{list} {rest} on answers that have changed, and {they} old value until the workbook is opened"
    );
    let mend = "open it in a spreadsheet program, which computes it anew, and save it";
    Some((Problem::remark(Code::OutOfDateFormula, Span::default(), message).mend(mend), map))
}
