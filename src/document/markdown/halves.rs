//! A large note looked through in halves of halves at once.
//!
//! A heading at the left margin below a blank line ends whatever stands open
//! above it, but for a fenced block or a block of HTML that only its own end
//! ends. Where the half above ends in neither, the blocks on both sides are the
//! same as in the whole. Source: CommonMark 0.31, sections 3 to 5. Reference
//! definitions of the other half are missed, which changes only what becomes a
//! link, and never what is a fence, a comment or a cell.

use super::Found;
use super::walk::walk;
use std::ops::Range;

/// So many headings behind the middle are looked at.
const TRIES: usize = 64;
/// Halves are halved again so often: what else is done at the same time must
/// not leave one thread with a whole half at the end.
const TIMES: u32 = 2;

/// The places of all parts; nothing where the note cannot be divided safely.
pub(super) fn find(text: &str, base: u32, mark: usize, first: usize) -> Option<Found> {
    // A note that cannot be divided is not walked over twice.
    divide(text, first..text.len())?;
    let (found, _) = parts(text, base, mark, first..text.len(), TIMES)?;
    Some(found)
}

/// The places of a part of the note, and whether it may end in an open block.
fn parts(text: &str, base: u32, mark: usize, part: Range<usize>, times: u32) -> Option<(Found, bool)> {
    let middle = if times == 0 { None } else { divide(text, part.clone()) };
    let Some(middle) = middle else { return Some(walk(text, base, mark, part)) };
    let (first, second) = rayon::join(
        || parts(text, base, mark, part.start..middle, times - 1),
        || parts(text, base, mark, middle..part.end, times - 1),
    );
    let ((mut found, false), (rest, open)) = (first?, second?) else { return None };
    found.places.extend(rest.places);
    found.problems.extend(rest.problems);
    Some((found, open))
}

/// A heading behind the middle of a part with plain text above it: the chance
/// is good that nothing stands open there.
fn divide(text: &str, part: Range<usize>) -> Option<usize> {
    let bytes = &text.as_bytes()[..part.end];
    let mut at = part.start + part.len() / 2;
    for _ in 0..TRIES {
        at += memchr::memmem::find(&bytes[at..], b"\n\n#")? + 2;
        let marks = bytes[at..].iter().take_while(|b| **b == b'#').count();
        let heading = marks <= 6 && matches!(bytes.get(at + marks), Some(b' ' | b'\n'));
        let above = memchr::memrchr(b'\n', &bytes[..at - 2]).map_or(0, |n| n + 1);
        if heading && above >= part.start && bytes[above].is_ascii_alphanumeric() {
            return Some(at);
        }
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sorted(mut found: Found) -> Found {
        found.problems.sort_by_key(|p| (p.place.start, p.place.end));
        found
    }

    /// Notes that are divided, and that must not be.
    #[test]
    fn halves_find_what_the_whole_finds() {
        let block = "```tieback\na = 0.9\n```\n";
        let pair = "text <!--? R(a) -->\n";
        let parts = [
            block.to_string(),
            pair.to_string(),
            format!("- x\n\n  {}\n", block.replace('\n', "\n  ")),
            "````text\n```tieback\n".to_string(),
            "````\n".to_string(),
            "<!--\n".to_string(),
            "-->\n".to_string(),
            "<!--? table -->\n".to_string(),
            "| name | R ? |\n| --- | --- |\n| a | |\n".to_string(),
            "- list\n  - inner\n\n    ~~~\n    open\n".to_string(),
            "> quoted\n".to_string(),
            "<div>\n".to_string(),
            "[x]: <y>\n".to_string(),
        ];
        let filler = "plain text\n\n".repeat(30);
        let (mut divided, mut refused) = (0, 0);
        for a in &parts {
            for b in &parts {
                for c in &parts {
                    let text = format!(
                        "{filler}{a}\nplain\n\n{b}\nplain\n\n# Heading\n\n{c}\nplain\n\n# And\n\n{block}{pair}"
                    );
                    let whole = walk(&text, 5, 0, 0..text.len()).0;
                    match find(&text, 5, 0, 0) {
                        Some(found) => {
                            divided += 1;
                            assert_eq!(sorted(found), sorted(whole), "{text}");
                        }
                        None => refused += 1,
                    }
                }
            }
        }
        assert!(divided > 500 && refused > 300, "{divided} {refused}");
    }
}
