//! Comments, and where they may stand inside HTML that Markdown passes through.

use super::{CLOSER, OPENER};

/// A comment, judged by its own bytes. Offsets are relative to the comment.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Comment {
    /// A question: start and end of its trimmed text.
    Opener(usize, usize),
    /// Meant as a question, but it holds `--`.
    Dashes,
    /// Meant as a question, but it runs over several lines.
    Lines,
    /// The end of an answer.
    Closer,
    /// Somebody else's.
    Other,
}

/// Judges one whole comment `<!--…-->`.
pub(super) fn judge(comment: &str) -> Comment {
    if comment == CLOSER {
        return Comment::Closer;
    }
    let Some(inner) = comment.strip_prefix(OPENER).and_then(|c| c.strip_suffix("-->")) else {
        return Comment::Other;
    };
    if inner.contains("--") {
        return Comment::Dashes;
    }
    if inner.trim().contains(['\n', '\r']) {
        return Comment::Lines;
    }
    let start = OPENER.len() + (inner.len() - inner.trim_start().len());
    Comment::Opener(start, start + inner.trim().len())
}

/// What [`next_comment`] came upon.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Piece {
    /// A comment from start to end.
    Comment(usize, usize),
    /// A comment that the block does not close.
    Unclosed(usize),
}

/// The next comment of an HTML block at or after `from`, outside tags and
/// outside elements whose content is raw text.
pub(super) fn next_comment(block: &str, from: usize) -> Option<Piece> {
    let bytes = block.as_bytes();
    let mut at = from;
    loop {
        at += block.get(at..)?.find('<')?;
        let rest = &block[at..];
        if rest.starts_with("<!--") {
            // `<!-->` and `<!--->` are whole comments in CommonMark.
            let least = if rest.starts_with("<!-->") {
                2
            } else if rest.starts_with("<!--->") {
                3
            } else {
                4
            };
            return Some(match rest[least..].find("-->") {
                Some(end) => Piece::Comment(at, at + least + end + 3),
                None => Piece::Unclosed(at),
            });
        }
        let skipped = if rest.starts_with("<![CDATA[") {
            rest.find("]]>").map(|n| n + 3)
        } else if rest.starts_with("<?") {
            rest.find("?>").map(|n| n + 2)
        } else if rest.starts_with("<!") {
            rest.find('>').map(|n| n + 1)
        } else if bytes.get(at + 1).is_some_and(|b| b.is_ascii_alphabetic() || *b == b'/') {
            Some(element(rest))
        } else {
            Some(1)
        };
        // Something that never ends holds the rest of the block.
        at += skipped?;
    }
}

/// Length of the tag that `rest` starts with, and of its raw text where it has such.
fn element(rest: &str) -> usize {
    let mut quote = None;
    let mut end = rest.len();
    for (i, b) in rest.bytes().enumerate() {
        match (quote, b) {
            (None, b'"' | b'\'') => quote = Some(b),
            (Some(q), b) if q == b => quote = None,
            (None, b'>') => {
                end = i + 1;
                break;
            }
            _ => {}
        }
    }
    for name in ["script", "style", "textarea", "pre"] {
        let starts = |text: &str, lead: usize| {
            text.as_bytes()
                .get(lead..lead + name.len())
                .is_some_and(|word| word.eq_ignore_ascii_case(name.as_bytes()))
                && !text.as_bytes().get(lead + name.len()).is_some_and(u8::is_ascii_alphanumeric)
        };
        if starts(rest, 1) {
            let mut at = end;
            while let Some(n) = rest.get(at..).and_then(|r| r.find("</")) {
                at += n;
                if starts(&rest[at..], 2) {
                    return at;
                }
                at += 2;
            }
            return rest.len();
        }
    }
    end
}
