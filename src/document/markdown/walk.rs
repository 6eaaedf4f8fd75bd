//! One walk over the events of a note.

use super::halves;
use super::rows::Rows;
use super::{CLOSER, Fence, Found, INFO_WORD, Line, OPENER, Place, Row, Table};
use crate::source::{Code, Problem, Span};
use pulldown_cmark::{CodeBlockKind, Event, Options, Parser, Tag, TagEnd};
use std::ops::Range;

/// Finds the fences, comment pairs and tables of a note.
///
/// `base` is the offset of the note's first byte in the common count; every
/// span returned counts from there.
pub fn find(text: &str, base: u32) -> Found {
    if !text.contains(INFO_WORD) && !text.contains(OPENER) && !text.contains(CLOSER) {
        return Found::default();
    }
    // A byte-order mark would hide what begins the first line.
    let mark = if text.starts_with('\u{feff}') { '\u{feff}'.len_utf8() } else { 0 };
    let first = mark + front_matter(&text[mark..]);
    if text.len() >= LARGE
        && let Some(found) = halves::find(text, base, mark, first)
    {
        return found;
    }
    walk(text, base, mark, first..text.len()).0
}

/// From so many bytes on a note is looked through in two halves at once.
const LARGE: usize = 1 << 20;

/// Finds the places in a part of a note; and whether the last of its blocks may
/// be one that goes on until its own end comes.
pub(super) fn walk(text: &str, base: u32, mark: usize, part: Range<usize>) -> (Found, bool) {
    let mut walk = Walk {
        text,
        base: base as usize,
        mark,
        found: Found::default(),
        depth: 0,
        cells: 0,
        code: false,
        implicit: false,
        fence: None,
        open: None,
        waiting: Vec::new(),
        rows: None,
        raw: false,
    };
    let options = Options::ENABLE_TABLES
        | Options::ENABLE_FOOTNOTES
        | Options::ENABLE_STRIKETHROUGH
        | Options::ENABLE_TASKLISTS;
    let first = part.start;
    for (event, range) in Parser::new_ext(&text[part], options).into_offset_iter() {
        walk.event(event, range.start + first..range.end + first);
    }
    walk.forget(0, true);
    (walk.found, walk.raw)
}

/// Whether a word is tieback's but for case, a sign behind it, or one letter
/// left out, put in, or another.
fn nearly_ours(word: &str) -> bool {
    let word = word.trim_matches(|c: char| !c.is_alphanumeric()).to_lowercase();
    let (a, b) = (word.as_bytes(), INFO_WORD.as_bytes());
    let before = a.iter().zip(b).take_while(|(x, y)| x == y).count();
    let behind = a.iter().rev().zip(b.iter().rev()).take_while(|(x, y)| x == y).count();
    let swapped = || {
        let (x, y) = (a.get(before..before + 2), b.get(before..before + 2));
        a.len() == b.len()
            && before + 2 + behind >= b.len()
            && matches!((x, y), (Some([p, q]), Some([r, s])) if p == s && q == r)
    };
    a.len().abs_diff(b.len()) <= 1 && (before + behind + 1 >= a.len().max(b.len()) || swapped())
}

/// Length of the YAML or TOML block that a note may begin with.
///
/// Done by hand because it is one only at the very start: pulldown-cmark
/// would take the text between any two rules for one.
fn front_matter(text: &str) -> usize {
    let mut lines = text.split_inclusive('\n');
    let Some(opening) = lines.next() else { return 0 };
    let closings: &[&str] = match opening.trim_end() {
        "---" => &["---", "..."],
        "+++" => &["+++"],
        _ => return 0,
    };
    let mut at = opening.len();
    for (i, line) in lines.enumerate() {
        at += line.len();
        let line = line.trim_end();
        if closings.contains(&line) {
            return at;
        }
        if i == 0 && line.is_empty() {
            return 0;
        }
    }
    0
}

/// A block opener that may still meet its closer, or a `<!--? table -->` line its table.
pub(super) struct Waiting {
    /// Depth at which its siblings begin.
    pub(super) depth: usize,
    /// One thing that an answer may be has been seen since.
    pub(super) answered: bool,
    pub(super) what: Awaits,
}

pub(super) enum Awaits {
    /// The pair at this index of the places.
    Closer(usize),
    /// The table for this comment.
    Table(Span),
}

/// A fence under way.
struct Lines {
    range: Range<usize>,
    /// Everything before this byte belongs to lines already seen.
    seen: usize,
    lines: Vec<Line>,
}

pub(super) struct Walk<'a> {
    pub(super) text: &'a str,
    pub(super) base: usize,
    /// Length of the byte-order mark.
    pub(super) mark: usize,
    pub(super) found: Found,
    /// How many blocks enclose the current one.
    pub(super) depth: usize,
    /// Inside a cell when not zero.
    pub(super) cells: usize,
    /// Inside a code block.
    pub(super) code: bool,
    /// Inside the paragraph of a tight list item, for which there are no events.
    implicit: bool,
    fence: Option<Lines>,
    /// The pair that a closer in this paragraph, heading or cell would close.
    pub(super) open: Option<usize>,
    pub(super) waiting: Vec<Waiting>,
    /// The table under way, if it takes part.
    rows: Option<(Table, Rows<'a>)>,
    /// The last block at the top is of code or of HTML.
    raw: bool,
}

impl<'a> Walk<'a> {
    pub(super) fn span(&self, range: Range<usize>) -> Span {
        Span::new(self.base + range.start, self.base + range.end)
    }

    fn event(&mut self, event: Event<'_>, range: Range<usize>) {
        match event {
            Event::Start(tag) => self.start(&tag, range),
            Event::End(tag) => self.end(tag),
            Event::Text(_) if self.fence.is_some() => self.fence_text(range),
            Event::Text(_) | Event::Html(_) if self.code => {}
            Event::Text(_) => {
                // An opener that is no comment comes as `<` and the rest.
                if self.text[range.clone()].starts_with(&OPENER[1..])
                    && self.text[..range.start].ends_with('<')
                {
                    self.unclosed(range.start - 1);
                }
                self.inline(range.start);
            }
            Event::InlineHtml(_) => {
                self.inline(range.start);
                self.inline_html(range);
            }
            Event::Html(_) => {}
            Event::Rule => {
                self.boundary();
                self.sibling(false);
            }
            _ => self.inline(range.start),
        }
    }

    /// A paragraph, heading or cell begins or ends: closers reach no further.
    fn boundary(&mut self) {
        self.open = None;
        self.implicit = false;
    }

    fn start(&mut self, tag: &Tag<'_>, range: Range<usize>) {
        if is_inline(tag) {
            self.inline(range.start);
            return;
        }
        self.boundary();
        if self.depth == 0 {
            self.raw = matches!(tag, Tag::HtmlBlock | Tag::CodeBlock(_));
        }
        match tag {
            Tag::HtmlBlock => {
                self.code = true;
                self.html_block(range);
            }
            Tag::CodeBlock(kind) => {
                self.sibling(false);
                self.code = true;
                if matches!(kind, CodeBlockKind::Fenced(_)) && self.is_ours(range.start) {
                    let seen = self.next_line(range.start);
                    self.fence = Some(Lines { range, seen, lines: Vec::new() });
                } else if let CodeBlockKind::Fenced(info) = kind
                    && let Some(word) = info.split_whitespace().next().filter(|w| nearly_ours(w))
                {
                    self.nearly(range.start, word);
                }
            }
            Tag::Table(_) => self.table(),
            Tag::TableHead | Tag::TableRow => {
                if let Some((_, rows)) = &mut self.rows {
                    rows.begin(range);
                }
            }
            Tag::TableCell => {
                self.cells += 1;
                if let Some((_, rows)) = &mut self.rows {
                    rows.cell(range);
                }
            }
            Tag::List(_) => self.sibling(true),
            Tag::Paragraph => self.sibling(self.may_answer(range.start)),
            _ => self.sibling(false),
        }
        self.depth += 1;
    }

    fn end(&mut self, tag: TagEnd) {
        if matches!(
            tag,
            TagEnd::Emphasis
                | TagEnd::Strong
                | TagEnd::Strikethrough
                | TagEnd::Superscript
                | TagEnd::Subscript
                | TagEnd::Link
                | TagEnd::Image
        ) {
            return;
        }
        self.boundary();
        self.depth = self.depth.saturating_sub(1);
        self.forget(self.depth + 1, false);
        match tag {
            TagEnd::HtmlBlock => self.code = false,
            TagEnd::CodeBlock => {
                self.code = false;
                self.fence_end();
            }
            TagEnd::TableCell => self.cells = self.cells.saturating_sub(1),
            TagEnd::TableHead | TagEnd::TableRow => self.row_end(tag == TagEnd::TableHead),
            TagEnd::Table => self.found.places.extend(self.rows.take().map(|(t, _)| Place::Table(t))),
            _ => {}
        }
    }

    /// Something inline: in a tight list item it may begin a paragraph.
    fn inline(&mut self, at: usize) {
        if !self.implicit && self.waiting.last().is_some_and(|w| w.depth == self.depth) {
            self.implicit = true;
            self.sibling(self.may_answer(at));
        }
    }

    /// Whether a paragraph can be an answer of a block pair: an error or a
    /// picture. Behind a tab in a quote pulldown-cmark misses tables and gives
    /// paragraphs, which begin with `|`.
    fn may_answer(&self, at: usize) -> bool {
        let rest = &self.text[at..];
        rest.starts_with(['!', '|']) || rest.starts_with("[![")
    }

    // --- blocks that wait for a closer or a table ---

    /// A block begins at this depth; an opener before it waits on only for one `answer`.
    pub(super) fn sibling(&mut self, answer: bool) {
        let Some(top) = self.waiting.last_mut().filter(|w| w.depth == self.depth) else { return };
        match top.what {
            Awaits::Closer(_) if answer && !top.answered => top.answered = true,
            _ => self.forget(self.depth, false),
        }
    }

    /// Gives up waiting at `depth` and deeper, or wholly.
    fn forget(&mut self, depth: usize, all: bool) {
        while let Some(top) = self.waiting.pop_if(|w| all || w.depth >= depth) {
            if let Awaits::Table(opener) = top.what {
                self.found.problems.push(
                    Problem::error(Code::TableShape, opener, "no table follows this line")
                        .mend("put a table, with its header and its line of dashes, below it")
                        .mend("if there is one, look for a line between, or a missing line of dashes"),
                );
            }
        }
    }

    // --- fences ---

    /// Whether the info word of the fence that begins at `at` is exactly tieback's.
    fn is_ours(&self, at: usize) -> bool {
        self.text[at..]
            .trim_start_matches(['`', '~'])
            .trim_start_matches([' ', '\t'])
            .strip_prefix(INFO_WORD)
            .is_some_and(|rest| rest.chars().next().is_none_or(char::is_whitespace))
    }

    /// A block whose info word was most probably meant to be tieback's.
    fn nearly(&mut self, at: usize, word: &str) {
        let line = self.text[at..].lines().next().unwrap_or("");
        // With a backslash in it the word stands otherwise in the text than it reads.
        let (from, length) = line.find(word).map_or((0, line.len()), |from| (from, word.len()));
        let start = at + from;
        let message = format!("a block with the info word `{word}` is not read");
        self.found.problems.push(
            Problem::remark(Code::NearlyABlock, self.span(start..start + length), message)
                .mend("write `tieback`, in small letters and alone, for a block that is"),
        );
    }

    fn next_line(&self, at: usize) -> usize {
        self.text[at..].find('\n').map_or(self.text.len(), |n| at + n + 1)
    }

    /// Text of a fence: one line in a quote, many at the top level; of a
    /// CRLF line the `\n` comes apart.
    fn fence_text(&mut self, range: Range<usize>) {
        let Some(mut fence) = self.fence.take() else { return };
        let mut at = range.start.max(fence.seen);
        while at < range.end {
            let start = fence.seen + self.text[fence.seen..at].rfind('\n').map_or(0, |n| n + 1);
            let next = self.next_line(at);
            let line = &self.text[start..next];
            let line = line.strip_suffix('\n').unwrap_or(line);
            let line = line.strip_suffix('\r').unwrap_or(line);
            let end = start + line.len();
            fence.lines.push(Line {
                text: self.span(at.min(end)..end),
                start: (self.base + start) as u32,
                next: (self.base + next) as u32,
            });
            fence.seen = next;
            at = next;
        }
        self.fence = Some(fence);
    }

    fn fence_end(&mut self) {
        let Some(fence) = self.fence.take() else { return };
        let range = fence.range;
        let closing = self.text.get(fence.seen..range.end).unwrap_or("");
        let whole = self.span(range.clone());
        if !closing.ends_with(['`', '~']) {
            let line = self.text[range].trim_end_matches('\n').lines().next().map_or(0, str::len);
            let place = Span { start: whole.start, end: whole.start + line as u32 };
            self.found.problems.push(
                Problem::remark(Code::UnclosedFence, place, "this block is never closed")
                    .mend("close it with a line of the same marks")
                    .mark("all that follows counts as tieback's language"),
            );
        }
        self.found.places.push(Place::Fence(Fence { whole, lines: fence.lines }));
    }

    // --- tables ---

    fn table(&mut self) {
        let depth = self.depth;
        let ours = self.waiting.pop_if(|w| w.depth == depth && matches!(w.what, Awaits::Table(_)));
        if let Some(Waiting { what: Awaits::Table(opener), .. }) = ours {
            let table = Table { opener, header: Row::default(), rows: Vec::new() };
            self.rows = Some((table, Rows::new(self.text, self.base as u32)));
        } else {
            self.sibling(true);
        }
    }

    fn row_end(&mut self, head: bool) {
        let Some((table, rows)) = &mut self.rows else { return };
        let row = rows.end();
        if head {
            table.header = row;
            return;
        }
        if row.too_many {
            let columns = table.header.cells.len();
            self.found.problems.push(
                Problem::error(
                    Code::TableShape,
                    rows.span(),
                    format!("this row has more cells than the header, which has {columns}"),
                )
                .mend("take the surplus cells out, or add columns to the header")
                .mend("write a `|` that belongs to a cell as `\\|`"),
            );
        }
        table.rows.push(row);
    }
}

fn is_inline(tag: &Tag<'_>) -> bool {
    matches!(
        tag,
        Tag::Emphasis
            | Tag::Strong
            | Tag::Strikethrough
            | Tag::Superscript
            | Tag::Subscript
            | Tag::Link { .. }
            | Tag::Image { .. }
    )
}
