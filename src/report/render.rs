//! Problems as text for a terminal.
//!
//! The frame is drawn by `annotate-snippets`; here it is decided what goes into
//! it. A line of source may be of any length and a span may be anything, so
//! the text that is handed over is always a short one cut from the source, and
//! every mark is moved into it.

use super::lines::{Lines, char_end, char_start};
use crate::source::{CellPlace, Code, Level, Problem, SourceFile, Sources, Span};
use annotate_snippets::{
    Annotation, AnnotationKind, Element, Level as Weight, Origin, Renderer, Snippet, normalize_untrusted_str,
};
use std::ops::Range;

/// Plain or with colours.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Paint {
    /// Text only.
    Plain,
    /// With the escape sequences of a terminal.
    Coloured,
}

/// The most bytes of one line of source that are shown.
const SHOWN: usize = 100;
/// How many of these stand before the mark where a line is cut.
const BEFORE: usize = 40;
/// Marks over more lines than this are shown by their first line.
const TALL: usize = 6;
/// Marked lines that are further apart than this are shown apart.
const APART: usize = 4;
/// Wider than any line that is handed over: the library must not cut again,
/// since what it prints would then depend on its own rules.
const WIDTH: usize = 4096;

/// All problems in the order of their places, an empty line after each.
pub fn problems(sources: &Sources, problems: &[Problem], paint: Paint) -> String {
    let lines = Lines::new(sources);
    let mut text = String::new();
    for problem in super::in_order(problems) {
        text.push_str(&one(&lines, problem, paint));
        text.push_str("\n\n");
    }
    text
}

/// One problem, without a line ending after it.
pub fn one(lines: &Lines<'_>, problem: &Problem, paint: Paint) -> String {
    let weight = match problem.level {
        Level::Error => Weight::ERROR,
        Level::Remark => Weight::NOTE.with_name("remark"),
    };
    let mut elements: Vec<Element<'_>> = Vec::new();
    let mut columns: Vec<Column> = Vec::new();
    // What a whole file is or has is not seen on any of its lines.
    if matches!(problem.code, Code::NothingToDo | Code::FileAccess) {
        if let Some((_, file, _)) = lines.range(problem.place) {
            elements.push(Origin::path(shown_name(file)).into());
        }
    } else {
        for view in views(lines, problem) {
            let (snippet, column) = view.snippet(lines);
            elements.push(snippet.into());
            columns.extend(column);
        }
    }
    for mend in &problem.mends {
        elements.push(Weight::HELP.message(normalize_untrusted_str(mend)).into());
    }
    let report = weight.primary_title(problem.message.as_str()).id(problem.code.id()).elements(elements);
    let renderer = match paint {
        Paint::Plain => Renderer::plain(),
        Paint::Coloured => Renderer::styled(),
    };
    let text = renderer.term_width(WIDTH).render(&[report]);
    columns.iter().fold(text, |text, column| column.correct(text))
}

/// A place to mark, with the words that go with it.
struct Mark<'a> {
    index: usize,
    file: &'a SourceFile,
    range: Range<usize>,
    first_line: usize,
    last_line: usize,
    words: &'a str,
    primary: bool,
}

impl<'a> Mark<'a> {
    fn new(lines: &Lines<'a>, place: Span, words: &'a str, primary: bool) -> Option<Mark<'a>> {
        let (index, file, mut range) = lines.range(place)?;
        // A line ending under the mark would only draw the mark on to the next line.
        while range.end > range.start && matches!(file.text.as_bytes()[range.end - 1], b'\n' | b'\r') {
            range.end -= 1;
        }
        let first_line = lines.line(index, file, range.start);
        let mut last_line = lines.line(index, file, range.end);
        if last_line - first_line >= TALL {
            range.end = lines.line_range(index, file, first_line).end.max(range.start);
            last_line = first_line;
        }
        Some(Mark { index, file, range, first_line, last_line, words, primary })
    }
}

/// Lines of one file that are shown together. The first mark gives the line
/// and column that stand above them: the primary one, else the first in the text.
struct View<'a> {
    marks: Vec<Mark<'a>>,
    first_line: usize,
    last_line: usize,
}

fn views<'a>(lines: &Lines<'a>, problem: &'a Problem) -> Vec<View<'a>> {
    let mut views: Vec<View<'a>> = Vec::new();
    let places = std::iter::once((problem.place, problem.mark.as_str(), true))
        .chain(problem.labels.iter().map(|l| (l.place, l.text.as_str(), false)));
    for (place, words, primary) in places {
        let Some(mark) = Mark::new(lines, place, words, primary) else { continue };
        let sheet = mark.file.cells.is_some();
        let near = views.iter_mut().find(|v| {
            v.marks[0].index == mark.index
                // Each cell has a place of its own above it.
                && (!sheet || mark.first_line == v.first_line)
                && mark.first_line <= v.last_line + APART
                && v.first_line <= mark.last_line + APART
        });
        match near {
            Some(view) => {
                view.first_line = view.first_line.min(mark.first_line);
                view.last_line = view.last_line.max(mark.last_line);
                view.marks.push(mark);
            }
            None => {
                views.push(View {
                    first_line: mark.first_line,
                    last_line: mark.last_line,
                    marks: vec![mark],
                });
            }
        }
    }
    for view in &mut views {
        view.marks.sort_by_key(|m| (!m.primary, m.range.start));
    }
    views
}

/// A column that the library counts in a line that was cut, and the true one.
struct Column {
    counted: String,
    real: String,
}

impl Column {
    fn correct(&self, mut text: String) -> String {
        let whole = |at: &usize| !text[at + self.counted.len()..].starts_with(|c: char| c.is_ascii_digit());
        let found = text.match_indices(&self.counted).map(|(at, _)| at).find(whole);
        if let Some(at) = found {
            text.replace_range(at..at + self.counted.len(), &self.real);
        }
        text
    }
}

impl<'a> View<'a> {
    fn snippet(&self, lines: &Lines<'a>) -> (Snippet<'a, Annotation<'a>>, Option<Column>) {
        let first = &self.marks[0];
        let mut text = String::new();
        let mut cuts = Vec::new();
        for line in self.first_line..=self.last_line {
            if line > self.first_line {
                text.push('\n');
            }
            let whole = lines.line_range(first.index, first.file, line);
            // The mark that the line is shown for: the first that touches it.
            let wanted = self.marks.iter().find(|m| m.first_line <= line && line <= m.last_line);
            let at = wanted.map_or(whole.start, |m| m.range.start.clamp(whole.start, whole.end));
            cuts.push(Cut::new(&first.file.text, whole, at, &mut text));
        }
        if text.is_empty() || text.ends_with('\n') {
            text.push(' '); // something for a mark at the very end to stand under
        }
        let cell = lines.cell(first.file, first.range.start);
        let column = match &cell {
            Some(cell) => self.cell_in_place_of_line(cell, &text, &cuts),
            None => self.column(lines, &text, &cuts),
        };
        // Beside a cell stands the number of its row.
        let line = cell.map_or(self.first_line, |cell| cell.row as usize) + 1;
        let snippet = Snippet::source(text).line_start(line).path(shown_name(first.file));
        let snippet = snippet.annotations(self.marks.iter().map(|mark| {
            let kind = if mark.primary { AnnotationKind::Primary } else { AnnotationKind::Context };
            let start = shown_offset(&cuts, mark.range.start);
            let end = shown_offset(&cuts, mark.range.end).max(start);
            let annotation = kind.span(start..end);
            if mark.words.is_empty() {
                annotation
            } else {
                annotation.label(normalize_untrusted_str(mark.words))
            }
        }));
        (snippet, column)
    }

    /// A sheet's file is named with the cell, where a text's is with line and column.
    fn cell_in_place_of_line(&self, cell: &CellPlace<'_>, text: &str, cuts: &[Cut]) -> Option<Column> {
        let mark = &self.marks[0];
        let at = shown_offset(cuts, mark.range.start);
        let name = shown_name(mark.file);
        let counted = format!("{name}:{}:{}", cell.row + 1, 1 + text[..at].chars().count());
        Some(Column { counted, real: normalize_untrusted_str(&format!("{}, {cell}", mark.file.name)) })
    }

    /// How the first mark's column differs from what the library will count.
    fn column(&self, lines: &Lines<'a>, text: &str, cuts: &[Cut]) -> Option<Column> {
        let mark = &self.marks[0];
        let at = shown_offset(cuts, mark.range.start);
        let line = text[..at].rfind('\n').map_or(0, |n| n + 1);
        let counted = 1 + text[line..at].chars().count();
        let start = mark.file.base as usize + mark.range.start;
        let place = lines.place(Span::new(start, start))?;
        let written = |column| format!("{}:{}:{column}", shown_name(mark.file), place.line);
        (counted != place.column).then(|| Column { counted: written(counted), real: written(place.column) })
    }
}

/// Which part of a line is shown, and where in the shown text it stands.
struct Cut {
    /// Where the line begins in the source.
    line: usize,
    kept: Range<usize>,
    shown: usize,
}

impl Cut {
    /// Adds the part of the line around `at` to `text`.
    fn new(source: &str, whole: Range<usize>, at: usize, text: &mut String) -> Cut {
        let mut kept = whole.clone();
        if whole.len() > SHOWN {
            let from = at.saturating_sub(BEFORE).clamp(whole.start, whole.end - SHOWN);
            kept = char_start(source, from)..char_end(source, (from + SHOWN).min(whole.end));
        }
        if kept.start > whole.start {
            text.push('…');
        }
        let shown = text.len();
        text.push_str(source.get(kept.clone()).unwrap_or(""));
        if kept.end < whole.end {
            text.push('…');
        }
        Cut { line: whole.start, kept, shown }
    }
}

/// Where a byte of the source stands in the shown text; the nearest place
/// where it is cut away.
fn shown_offset(cuts: &[Cut], at: usize) -> usize {
    let after = cuts.partition_point(|c| c.line <= at);
    match cuts.get(after.saturating_sub(1)) {
        Some(cut) => cut.shown + (at.clamp(cut.kept.start, cut.kept.end) - cut.kept.start),
        None => 0,
    }
}

fn shown_name(file: &SourceFile) -> String {
    normalize_untrusted_str(&file.name)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::source::Span;

    fn shown(text: &str, problem: &Problem) -> String {
        let mut sources = Sources::default();
        sources.add("gate.md", text);
        one(&Lines::new(&sources), problem, Paint::Plain)
    }

    fn at(start: usize, end: usize) -> Problem {
        Problem::error(Code::UnknownName, Span::new(start, end), "unknown name \"gat\"")
    }

    #[test]
    fn a_problem_shows_its_place_cause_and_mend() {
        let problem =
            at(15, 18).mark("not defined").label(Span::new(0, 4), "this one is").mend("did you mean `gate`?");
        let expected = "\
error[unknown-name]: unknown name \"gat\"
 --> gate.md:2:3
  |
1 | gate = 0.98
  | ---- this one is
2 | R(gat) ?
  |   ^^^ not defined
  |
  = help: did you mean `gate`?";
        assert_eq!(shown("gate = 0.98\r\nR(gat) ?\r\n", &problem), expected);
    }

    #[test]
    fn places_far_apart_are_shown_apart_and_remarks_are_named_so() {
        let text = format!("gate = 0.98\n{}gat = 0.9\n", "\n".repeat(40));
        let mut problem = Problem::remark(Code::LookAlikeNames, Span::new(52, 55), "two names look alike");
        problem = problem.label(Span::new(0, 4), "the other");
        let expected = "\
remark[look-alike-names]: two names look alike
  --> gate.md:42:1
   |
42 | gat = 0.9
   | ^^^
   |
  ::: gate.md:1:1
   |
 1 | gate = 0.98
   | ---- the other";
        assert_eq!(shown(&text, &problem), expected);
    }

    #[test]
    fn a_problem_that_is_nowhere_has_its_cause_and_mends() {
        let problem = at(0, 0).mend("look for it");
        let text = one(&Lines::new(&Sources::default()), &problem, Paint::Plain);
        assert_eq!(text, "error[unknown-name]: unknown name \"gat\"\n |\n = help: look for it");
    }

    #[test]
    fn a_huge_line_is_cut_around_the_mark() {
        let text = format!("{}R(gat) ?{}", "ö".repeat(1_000_000), "ü".repeat(1_000_000));
        let mut sources = Sources::default();
        sources.add("gate.md", text.as_str());
        let coloured = one(&Lines::new(&sources), &at(2_000_002, 2_000_005), Paint::Coloured);
        assert!(coloured.contains("gate.md:1:1000003"), "{coloured}");
        let shown = shown(&text, &at(2_000_002, 2_000_005));
        assert!(shown.len() < 600, "{}", shown.len());
        assert!(shown.contains("gate.md:1:1000003"), "{shown}");
        assert!(shown.contains("öööR(gat) ?üüü"), "{shown}");
        let marked = shown.lines().find(|l| l.contains('^')).unwrap();
        let line = shown.lines().find(|l| l.contains("R(gat)")).unwrap();
        let column = |l: &str, c: char| l.chars().position(|x| x == c).unwrap();
        assert_eq!(column(marked, '^'), column(line, 'g'));
    }

    #[test]
    fn no_place_in_any_text_makes_it_panic() {
        let texts = [
            "",
            "\n",
            "a",
            "a\r\nb\r\n",
            "größe = 1\t2\n\n\u{1F6B0}\u{301}x\n",
            "\r\r\n\u{1b}[31m\n漢字\u{202e}",
        ];
        let long = format!("{}\n{}", "漢".repeat(90), "\t".repeat(300));
        for text in texts.into_iter().chain([long.as_str()]) {
            let step = if text.len() > 100 { 7 } else { 1 };
            for start in (0..text.len() + 3).step_by(step) {
                for end in (start..text.len() + 3).step_by(step) {
                    let problem = at(start, end).label(Span::new(end, end), "here").mark("m");
                    let other = at(start, start).label(Span::new(0, text.len()), "all");
                    for problem in [problem, other] {
                        assert!(shown(text, &problem).contains("gate.md:"), "{text:?} {start}..{end}");
                    }
                }
            }
        }
    }

    #[test]
    fn colours_only_add_escapes() {
        let mut sources = Sources::default();
        sources.add("gate.md", "R(gat) ?");
        let coloured = problems(&sources, &[at(2, 5)], Paint::Coloured);
        assert!(coloured.contains("\u{1b}["));
        assert!(!problems(&sources, &[at(2, 5)], Paint::Plain).contains('\u{1b}'));
    }
}
