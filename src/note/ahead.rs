//! Reading the blocks of a large note while the walk over it still looks for
//! them: where a line at the left margin opens a block, one most probably is.
//!
//! What was read counts only where the walk finds the same lines; an opener
//! that turns out to stand in another block, say, has been read for nothing.

use crate::document::markdown::{Fence, INFO_WORD, Line};
use crate::language::{self, Source, Tree};
use crate::source::{Problem, Span};

/// From so many bytes on it saves more than a second thread costs.
pub(super) const LARGE: usize = 1 << 18;

/// Blocks read ahead; the statements carry the number of theirs.
#[derive(Default)]
pub(super) struct Ahead {
    pub(super) tree: Tree,
    /// The lines of each block, in the order of the note.
    blocks: Vec<Vec<Line>>,
    /// The problems of each block.
    problems: Vec<Vec<Problem>>,
}

impl Ahead {
    /// Reads what looks like blocks of tieback's.
    pub(super) fn read(text: &str, base: u32) -> Ahead {
        let mut ahead = Ahead::default();
        let mut at = 0;
        while let Some((lines, next)) = block(text, base, at) {
            let sources = lines.iter().map(|l| Source { text: slice(text, base, l.text), at: l.text.start });
            let mut problems = Vec::new();
            language::read_block(sources, ahead.blocks.len() as u32, &mut ahead.tree, &mut problems);
            ahead.blocks.push(lines);
            ahead.problems.push(problems);
            at = next;
        }
        ahead
    }

    /// Whether nothing has been read.
    pub(super) fn is_empty(&self) -> bool {
        self.blocks.is_empty()
    }

    /// Of the statements in `tree`, keeps those of the blocks that are among `fences`, given with their numbers in the
    /// order of the note: their statements take these numbers, their problems
    /// are returned. Whether each of the fences has been read is told by `read`.
    pub(super) fn keep<'f>(
        &mut self,
        tree: &mut Tree,
        fences: impl Iterator<Item = (u32, &'f Fence)>,
        mut unread: impl FnMut(u32, &'f Fence),
    ) -> Vec<Problem> {
        let mut numbers: Vec<Option<u32>> = vec![None; self.blocks.len()];
        let mut next = 0;
        for (number, fence) in fences {
            let start = fence.lines.first().map_or(u32::MAX, |l| l.start);
            while self.blocks.get(next).is_some_and(|b| b[0].start < start) {
                next += 1;
            }
            match self.blocks.get(next) {
                Some(block) if *block == fence.lines => numbers[next] = Some(number),
                _ => unread(number, fence),
            }
        }
        if self.is_empty() {
            return Vec::new();
        }
        tree.statements.retain_mut(|statement| match numbers[statement.block as usize] {
            Some(number) => {
                statement.block = number;
                true
            }
            None => false,
        });
        let kept = self.problems.drain(..).zip(&numbers).filter(|(_, number)| number.is_some());
        kept.flat_map(|(problems, _)| problems).collect()
    }
}

/// The next lines from `at` on that stand between an opener of tieback's and
/// its closer, both at the left margin, with the place behind. Blocks without
/// lines have nothing to read.
fn block(text: &str, base: u32, mut at: usize) -> Option<(Vec<Line>, usize)> {
    loop {
        at += memchr::memmem::find(text.as_bytes().get(at..)?, INFO_WORD.as_bytes())?;
        let start = text[..at].rfind('\n').map_or(0, |n| n + 1);
        let marks = text[start..at].trim_end_matches([' ', '\t']);
        let mark = marks.chars().next().unwrap_or(' ');
        at += INFO_WORD.len();
        if marks.len() < 3 || !matches!(mark, '`' | '~') || marks.contains(|c| c != mark) {
            continue;
        }
        let mut lines = Vec::new();
        let mut next = at + text[at..].find('\n')? + 1;
        while next < text.len() {
            let start = next;
            next = text[start..].find('\n').map_or(text.len(), |n| start + n + 1);
            let line = &text[start..next];
            let line = line.strip_suffix('\n').unwrap_or(line);
            let line = line.strip_suffix('\r').unwrap_or(line);
            let closer = line.trim();
            if closer.len() >= marks.len() && !closer.contains(|c| c != mark) {
                break;
            }
            let of = |at: usize| base + at as u32;
            lines.push(Line {
                text: Span { start: of(start), end: of(start + line.len()) },
                start: of(start),
                next: of(next),
            });
        }
        at = next;
        if !lines.is_empty() {
            return Some((lines, next));
        }
    }
}

fn slice(text: &str, base: u32, span: Span) -> &str {
    text.get((span.start - base) as usize..(span.end - base) as usize).unwrap_or("")
}

#[cfg(test)]
mod tests {
    use super::super::read::read;
    use super::super::uses::NoShelf;
    use super::*;
    use crate::document::markdown::find;

    /// What stands where, and what is wrong, read ahead or not.
    fn both_ways(text: &str) -> [String; 2] {
        [Ahead::read(text, 7), Ahead::default()].map(|ahead| {
            let read = read(text, 7, find(text, 7), ahead, "note.md", &NoShelf, &mut Default::default());
            let names = &read.tree.names;
            let statements = read.tree.statements.iter().map(|s| {
                let line = match &s.line {
                    language::Line::Define { names: n, .. } => names.text(n[0].0).to_string(),
                    other => format!("{:?}", std::mem::discriminant(other)),
                };
                format!("{} {:?} {:?} {line}\n", s.block, s.span, s.mark)
            });
            let mut problems: Vec<String> = read.problems.iter().map(|p| format!("{p:?}\n")).collect();
            problems.sort();
            statements.chain(problems).collect()
        })
    }

    #[test]
    fn it_changes_nothing() {
        let plain = "# Note\n\n```tieback\na = 0.9\nR(a) ?\n```\n\ntext <!--? F(a) --> and\n\n``` tieback x\nb = \nc = 1 -> 2\n```\n";
        let (quoted, listed) =
            ("> ```tieback\n> d = 0.9\n> ```\n", "- x\n\n  ```tieback\n  e = 0.9\n  ```\n");
        let inside = "````text\n```tieback\nf = 0.9\n```\n````\n";
        let comment = "<!--\n```tieback\ng = 0.9\n```\n-->\n";
        let others = "~~~tieback\nh = 0.9\n```\n~~~\n```tiebacks\ni = 0.9\n```\n```tieback\n```\n";
        let unclosed = "```tieback\na = 0.8\n?? x\nR(a ?";
        let parts = [plain, quoted, listed, inside, comment, others];
        for first in parts {
            for second in parts {
                for last in ["", unclosed] {
                    let text = format!("{first}{second}{last}");
                    for text in [text.replace('\n', "\r\n"), text.replace("\n```\n", "\n```\r\n"), text] {
                        let [ahead, plainly] = both_ways(&text);
                        assert_eq!(ahead, plainly, "{text}");
                    }
                }
            }
        }
    }
}
