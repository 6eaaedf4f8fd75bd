//! Comment pairs: what opens, fills and closes them.

use super::html::{Comment, Piece, judge, next_comment};
use super::walk::{Awaits, Waiting, Walk};
use super::{CLOSER, OPENER, Pair, PairForm, Place, TABLE_WORD};
use crate::source::{Code, Problem, Span};
use std::ops::Range;

impl Walk<'_> {
    pub(super) fn unclosed(&mut self, at: usize) {
        let place = self.span(at..at + OPENER.len());
        self.found.problems.push(
            Problem::error(Code::UnclosedPair, place, "the comment of this question never ends")
                .mend("end it with `-->`, on the same line"),
        );
    }

    fn stray(&mut self, range: Range<usize>) {
        let place = self.span(range);
        self.found.problems.push(
            Problem::remark(Code::StrayCloser, place, "no question that this could close")
                .mend("take it out, or put the question before it in the same paragraph or cell"),
        );
    }

    fn malformed(&mut self, range: Range<usize>, what: &str, mend: &str) {
        let place = self.span(range);
        self.found.problems.push(Problem::error(Code::MisplacedPair, place, what).mend(mend));
    }

    /// Judges a comment; gives the question's range when it opens a pair.
    fn opener(&mut self, range: Range<usize>) -> Result<Range<usize>, Comment> {
        let judged = judge(&self.text[range.clone()]);
        match judged {
            Comment::Opener(from, to) => return Ok(range.start + from..range.start + to),
            Comment::Dashes => {
                self.malformed(range, "a question in a comment cannot hold `--`", "write it without `--`");
            }
            Comment::Lines => {
                self.malformed(range, "a question in a comment stands on one line", "join its lines");
            }
            Comment::Closer | Comment::Other => {}
        }
        Err(judged)
    }

    fn push_pair(&mut self, question: Range<usize>, opener: Range<usize>, form: PairForm) -> Option<usize> {
        let place = self.span(opener);
        if &self.text[question.clone()] == TABLE_WORD {
            self.found.problems.push(
                Problem::error(
                    Code::TableShape,
                    place,
                    "this stands among other text, where no table follows",
                )
                .mend("put it alone on the line before the table"),
            );
            return None;
        }
        let question = self.span(question);
        let pair = Pair { question, opener: place, answer: None, whole: place, form };
        self.found.places.push(Place::Pair(pair));
        Some(self.found.places.len() - 1)
    }

    /// Fills the pair at `index` with the closer at `range`.
    fn close(&mut self, index: usize, range: Range<usize>) {
        let closer = self.span(range);
        if let Some(Place::Pair(pair)) = self.found.places.get_mut(index) {
            let start = match pair.form {
                PairForm::Block { blanks, .. } => blanks,
                PairForm::Inline { .. } => pair.opener.end,
            };
            pair.answer = Some(Span { start, end: closer.start });
            pair.whole.end = closer.end;
        }
    }

    pub(super) fn inline_html(&mut self, range: Range<usize>) {
        match self.opener(range.clone()) {
            Ok(question) => {
                let form = PairForm::Inline { in_cell: self.cells > 0, in_html: false };
                self.open = self.push_pair(question, range, form);
            }
            Err(Comment::Closer) => match self.open.take() {
                Some(index) => self.close(index, range),
                None => self.stray(range),
            },
            Err(Comment::Other) => {}
            Err(_) => self.open = None,
        }
    }

    /// A block that Markdown takes as HTML: what begins with a comment, and real HTML.
    pub(super) fn html_block(&mut self, range: Range<usize>) {
        let block = &self.text[range.clone()];
        let first = next_comment(block, 0);
        let leads = matches!(first, Some(Piece::Comment(0, _)));
        if !block.starts_with(CLOSER) {
            self.sibling(false);
        }
        let mut open: Option<usize> = None;
        let mut leader = None;
        let mut piece = first;
        while let Some(Piece::Comment(from, to)) = piece {
            let here = range.start + from..range.start + to;
            match self.opener(here.clone()) {
                Ok(question) if from == 0 && block[to..].trim().is_empty() => {
                    self.block_opener(question, here);
                }
                Ok(question) => {
                    let form = PairForm::Inline { in_cell: false, in_html: true };
                    open = self.push_pair(question, here, form);
                    if from == 0 {
                        leader = open;
                    }
                }
                Err(Comment::Closer) => match open.take() {
                    Some(index) => {
                        self.close(index, here);
                        if leader == Some(index) && block[to..].trim().is_empty() {
                            self.lone_line(index, range.start);
                            leader = None;
                        }
                    }
                    None if from == 0 => self.block_closer(here),
                    None => self.stray(here),
                },
                Err(Comment::Other) => {}
                Err(_) => open = None,
            }
            piece = next_comment(block, to);
        }
        if let Some(Piece::Unclosed(at)) = piece
            && block[at..].starts_with(OPENER)
        {
            self.unclosed(range.start + at);
        }
        if leads && let Some(index) = leader {
            self.starts_line(index);
        }
    }

    fn starts_line(&mut self, index: usize) {
        let Some(Place::Pair(pair)) = self.found.places.get(index) else { return };
        self.found.problems.push(
            Problem::remark(
                Code::PairStartsLine,
                pair.opener,
                "a comment that begins a line makes Markdown show the whole line as HTML",
            )
            .mend("put a word before it if the line has emphasis, links or code"),
        );
    }

    /// What stands before `at` on its line.
    fn prefix(&self, at: usize) -> Range<usize> {
        // To Markdown, a carriage return alone ends a line too.
        let line = self.text[..at].rfind(['\n', '\r']).map_or(0, |n| n + 1);
        line.max(self.mark).min(at)..at
    }

    /// An opener alone on its line.
    fn block_opener(&mut self, question: Range<usize>, opener: Range<usize>) {
        let what = if &self.text[question.clone()] == TABLE_WORD {
            Awaits::Table(self.span(opener))
        } else {
            let blank = |b: &u8| matches!(b, b' ' | b'\t');
            let blanks =
                opener.end + self.text.as_bytes()[opener.end..].iter().take_while(|b| blank(b)).count();
            let prefix = self.span(self.prefix(opener.start));
            let form = PairForm::Block { prefix, blanks: (self.base + blanks) as u32, on_line: false };
            match self.push_pair(question, opener, form) {
                Some(index) => Awaits::Closer(index),
                None => return,
            }
        };
        self.waiting.push(Waiting { depth: self.depth, answered: false, what });
    }

    /// A closer that begins a line: it belongs to the block opener that still waits here.
    fn block_closer(&mut self, closer: Range<usize>) {
        let last = self.found.places.len();
        let depth = self.depth;
        // Another place in between would be lost when the answer is replaced.
        let mine = |w: &mut Waiting| {
            w.depth == depth && matches!(w.what, Awaits::Closer(index) if index + 1 == last)
        };
        if let Some(Waiting { what: Awaits::Closer(index), .. }) = self.waiting.pop_if(mine) {
            self.close(index, closer);
        } else {
            self.sibling(false);
            self.stray(closer);
        }
    }

    /// Opener, answer and closer are all there is on a line: lines may be written here too.
    fn lone_line(&mut self, index: usize, at: usize) {
        let prefix = self.span(self.prefix(at));
        if let Some(Place::Pair(pair)) = self.found.places.get_mut(index) {
            pair.form = PairForm::Block { prefix, blanks: pair.opener.end, on_line: true };
        }
    }
}
