//! Answers turned into edits of the bytes that belong to them.
//!
//! All offsets in [`Line`], [`Pair`] and [`Row`] are in the common count;
//! `text` is the whole note and `base` the offset of its first byte. Edits
//! count from the start of `text`. Where the bytes would stay the same there
//! is no edit.

use super::escape::{Context, escape};
use super::markdown::{CLOSER, Fence, Line, OPENER, Pair, PairForm, Row};
use super::patch::Edit;
use crate::source::Span;
use std::ops::Range;

/// What is written at a question in a fence.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct FenceAnswer {
    /// What stands after the `?`, without the space between.
    pub inline: Option<String>,
    /// The lines below, each beginning with `? `.
    pub lines: Vec<String>,
}

/// The old answer lines below line `index` of a fence: those that follow
/// directly and begin with `?`.
pub fn old_answer_lines(text: &str, base: u32, fence: &Fence, index: usize) -> Range<usize> {
    let first = (index + 1).min(fence.lines.len());
    let count = fence.lines[first..]
        .iter()
        .take_while(|line| slice(text, base, line.text).trim_start().starts_with('?'))
        .count();
    first..first + count
}

/// The bytes of some lines of a fence, whole physical lines, for [`fence_edits`].
pub fn bytes_of_lines(fence: &Fence, lines: Range<usize>) -> Option<(u32, u32)> {
    let lines = fence.lines.get(lines)?;
    Some((lines.first()?.start, lines.last()?.next))
}

/// The edits that write an answer in a fence.
///
/// `line` holds the question's `?`, `after_mark` is the byte after it.
/// `old_end` is the end of the old answer on that line, without the blanks
/// behind it; equal to `after_mark` when there is none. `following` are the
/// bytes of the old answer lines ([`old_answer_lines`], [`bytes_of_lines`]).
pub fn fence_edits(
    text: &str,
    base: u32,
    line: &Line,
    after_mark: u32,
    old_end: u32,
    following: Option<(u32, u32)>,
    answer: &FenceAnswer,
) -> Vec<Edit> {
    let mut edits = Vec::new();
    let mark = local(base, after_mark);
    let inline = answer.inline.as_ref().map_or(String::new(), |a| format!(" {}", a.trim()));
    push(text, &mut edits, mark..local(base, old_end).max(mark), inline);

    let content = slice(text, base, line.text);
    let indent = content.len() - content.trim_start().len();
    let start = local(base, line.start);
    // The first line may follow a byte-order mark, which is no indent.
    let prefix = &text[start..local(base, line.text.start) + indent];
    let prefix = prefix.trim_start_matches('\u{feff}');
    let next = local(base, line.next);
    let ending = line_ending(text, next);
    let last_line = !text[..next].ends_with('\n');

    let mut lines = String::new();
    for (i, answer) in answer.lines.iter().enumerate() {
        if i > 0 || last_line {
            lines.push_str(ending);
        }
        lines.push_str(prefix);
        lines.push_str(answer);
    }
    let mut old = following.map_or(next..next, |(from, to)| local(base, from)..local(base, to));
    if !last_line {
        // A file without a newline at its end stays without.
        if old.is_empty() || text[..old.end].ends_with('\n') {
            if !answer.lines.is_empty() {
                lines.push_str(ending);
            }
        } else if answer.lines.is_empty() {
            old.start -= ending.len();
        }
    }
    push(text, &mut edits, old, lines);
    edits
}

/// The edit that writes a short answer at a comment pair of any form, escaped
/// for the place where it stands. A block pair gets it on its own line.
pub fn inline_edit(text: &str, base: u32, pair: &Pair, answer: &str) -> Option<Edit> {
    let context = match pair.form {
        PairForm::Inline { in_cell: true, .. } => Context::Cell,
        PairForm::Inline { in_html: true, .. } | PairForm::Block { .. } => Context::Html,
        PairForm::Inline { .. } => Context::Prose,
    };
    let mut new = escape(answer.trim(), context);
    let opener = local(base, pair.opener.end);
    let span = match (pair.answer, pair.form) {
        (None, _) => {
            new.push_str(CLOSER);
            opener..opener
        }
        (Some(_), PairForm::Block { blanks, on_line: false, .. }) => {
            // The closer comes up to the question's line; blanks that stood
            // at that line's end stay at its end.
            new.push_str(CLOSER);
            new.push_str(&text[opener..local(base, blanks)]);
            opener..local(base, pair.whole.end)
        }
        (Some(old), _) => local(base, old.start)..local(base, old.end),
    };
    edit(text, span, new)
}

/// The edit that writes an answer of Markdown lines (one table, list,
/// picture, or a paragraph that begins with `!`) at a block pair. The lines
/// are written as they are. `None` also when the pair is no block.
pub fn block_edit(text: &str, base: u32, pair: &Pair, lines: &[String]) -> Option<Edit> {
    let PairForm::Block { prefix, blanks, .. } = pair.form else { return None };
    let prefix = repeated(slice(text, base, prefix));
    let at = local(base, blanks);
    let ending = line_ending(text, text[at..].find('\n').map_or(text.len(), |n| at + n + 1));
    let mut new = String::from(ending);
    for line in lines {
        let line = line.trim_end();
        new.push_str(if line.is_empty() { prefix.trim_end() } else { &prefix });
        new.push_str(line);
        new.push_str(ending);
    }
    new.push_str(&prefix);
    let span = match pair.answer {
        None => {
            new.push_str(CLOSER);
            at..at
        }
        Some(old) => local(base, old.start)..local(base, old.end),
    };
    edit(text, span, new)
}

/// The edits that write answers into cells of one row: pairs of a column
/// and its answer. Cells that the row lacks are added as far as they are
/// needed. A row with too many cells gets none, nor does a cell that holds a
/// comment pair.
pub fn row_edits(text: &str, base: u32, row: &Row, answers: &[(usize, &str)]) -> Vec<Edit> {
    let mut edits = Vec::new();
    if row.too_many {
        return edits;
    }
    for (column, answer) in answers {
        let Some(cell) = row.cells.get(*column).filter(|c| !c.missing) else { continue };
        // A cell that asks for itself is the writer's.
        if slice(text, base, cell.text).contains(OPENER) {
            continue;
        }
        let mut new = escape(answer.trim(), Context::Cell);
        if !new.is_empty() {
            if cell.space_before {
                new.insert(0, ' ');
            }
            if cell.space_after {
                new.push(' ');
            }
        }
        push(text, &mut edits, local(base, cell.text.start)..local(base, cell.text.end), new);
    }
    let present = row.cells.iter().take_while(|c| !c.missing).count();
    let answer = |column| answers.iter().find(|(c, a)| *c == column && !a.trim().is_empty());
    let needed = (present..row.cells.len()).rev().find(|c| answer(*c).is_some());
    if let Some(last) = needed {
        let mut new = String::new();
        for column in present..=last {
            let cell = answer(column).map_or(String::new(), |(_, a)| escape(a.trim(), Context::Cell));
            new.push_str(if row.open { " | " } else { " " });
            new.push_str(&cell);
            if !row.open {
                new.push_str(" |");
            }
        }
        let at = local(base, row.end);
        push(text, &mut edits, at..at, new);
    }
    edits
}

/// What stands before a question on its line, as it is repeated before the
/// lines of its answer: list marks begin their item only once, so blanks
/// take their place.
fn repeated(prefix: &str) -> String {
    let mut out = String::with_capacity(prefix.len());
    let mut rest = prefix;
    while let Some(c) = rest.chars().next() {
        if rest.starts_with("[^") {
            // A footnote goes on with four blanks, however long its label.
            out.push_str("    ");
            rest = rest.split_once("]:").map_or("", |(_, after)| after.trim_start_matches([' ', '\t']));
            continue;
        }
        out.push(if matches!(c, '>' | ' ' | '\t') { c } else { ' ' });
        rest = &rest[c.len_utf8()..];
    }
    out
}

/// The ending of the line that ends at `next`; the file's own where that line has none.
fn line_ending(text: &str, next: usize) -> &'static str {
    let of = |line: &str| {
        if line.ends_with("\r\n") {
            Some("\r\n")
        } else if line.ends_with('\n') {
            Some("\n")
        } else {
            None
        }
    };
    of(&text[..next]).or_else(|| of(&text[..=text.find('\n')?])).unwrap_or("\n")
}

fn local(base: u32, at: u32) -> usize {
    at.saturating_sub(base) as usize
}

fn slice(text: &str, base: u32, span: Span) -> &str {
    text.get(local(base, span.start)..local(base, span.end)).unwrap_or("")
}

fn edit(text: &str, span: Range<usize>, new: String) -> Option<Edit> {
    (text.get(span.clone()) != Some(new.as_str())).then_some(Edit { span, text: new })
}

fn push(text: &str, edits: &mut Vec<Edit>, span: Range<usize>, new: String) {
    edits.extend(edit(text, span, new));
}

#[cfg(test)]
mod tests;
