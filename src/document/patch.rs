//! Edits to a source, and nothing but edits.

use std::fmt;
use std::ops::Range;

/// New text for a range of bytes of one file (counted from that file's start).
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Edit {
    /// The bytes that are replaced; empty where text is put in.
    pub span: Range<usize>,
    /// What stands there afterwards.
    pub text: String,
}

/// A source after its edits.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Rewrite {
    /// Every byte is as it was.
    Unchanged,
    /// The new bytes.
    Patched(Vec<u8>),
}

/// Two edits that cannot both be made, or one that lies outside the source.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Overlap {
    /// The earlier range.
    pub first: Range<usize>,
    /// The later range; equal to `first` when that one lies outside the source.
    pub second: Range<usize>,
}

impl fmt::Display for Overlap {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Overlap { first, second } = self;
        if first == second {
            write!(f, "the edit of bytes {}..{} does not fit the file", first.start, first.end)
        } else {
            write!(
                f,
                "the edits of bytes {}..{} and {}..{} overlap",
                first.start, first.end, second.start, second.end
            )
        }
    }
}

impl std::error::Error for Overlap {}

/// Makes all edits at once. They count the original bytes and may come in any
/// order; every byte outside them is kept. Texts put in at one point stand in
/// the order in which they are given.
pub fn apply(source: &[u8], edits: &[Edit]) -> Result<Rewrite, Overlap> {
    let mut order: Vec<&Edit> = edits.iter().collect();
    order.sort_by_key(|e| (e.span.start, e.span.end));
    for edit in &order {
        if edit.span.start > edit.span.end || edit.span.end > source.len() {
            return Err(Overlap { first: edit.span.clone(), second: edit.span.clone() });
        }
    }
    for pair in order.windows(2) {
        let (a, b) = (&pair[0].span, &pair[1].span);
        if b.start < a.end {
            return Err(Overlap { first: a.clone(), second: b.clone() });
        }
    }
    if order.iter().all(|e| &source[e.span.clone()] == e.text.as_bytes()) {
        return Ok(Rewrite::Unchanged);
    }
    let added: usize = order.iter().map(|e| e.text.len()).sum();
    let mut out = Vec::with_capacity(source.len() + added);
    let mut at = 0;
    for edit in order {
        out.extend_from_slice(&source[at..edit.span.start]);
        out.extend_from_slice(edit.text.as_bytes());
        at = edit.span.end;
    }
    out.extend_from_slice(&source[at..]);
    Ok(Rewrite::Patched(out))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn edit(span: Range<usize>, text: &str) -> Edit {
        Edit { span, text: text.into() }
    }

    #[test]
    fn replaces_inserts_and_deletes() {
        let edits = [edit(6..6, "!"), edit(0..1, "J"), edit(2..4, "")];
        assert_eq!(apply(b"hello\n", &edits), Ok(Rewrite::Patched(b"Jeo\n!".to_vec())));
    }

    #[test]
    fn no_difference_is_unchanged() {
        assert_eq!(apply(b"abc", &[]), Ok(Rewrite::Unchanged));
        assert_eq!(apply(b"abc", &[edit(1..2, "b"), edit(3..3, "")]), Ok(Rewrite::Unchanged));
    }

    #[test]
    fn refuses_what_does_not_fit() {
        assert!(apply(b"abc", &[edit(0..2, ""), edit(1..3, "")]).is_err());
        assert_eq!(apply(b"ab", &[edit(1..1, "x"), edit(1..1, "y")]), Ok(Rewrite::Patched(b"axyb".to_vec())));
        assert!(apply(b"abc", &[edit(2..4, "")]).is_err());
        assert!(apply(b"abc", &[edit(0..1, "x"), edit(1..1, "y"), edit(1..2, "z")]).is_ok());
    }

    proptest! {
        #[test]
        fn bytes_outside_stay(source: Vec<u8>, cuts in prop::collection::vec(0usize..200, 0..12)) {
            let mut cuts: Vec<usize> = cuts.into_iter().map(|c| c % (source.len() + 1)).collect();
            cuts.sort_unstable();
            cuts.dedup();
            let edits: Vec<Edit> =
                cuts.chunks_exact(2).map(|c| edit(c[0]..c[1], "<new>")).collect();
            let out = match apply(&source, &edits).unwrap() {
                Rewrite::Unchanged => source.clone(),
                Rewrite::Patched(out) => out,
            };
            let mut expected = Vec::new();
            let mut at = 0;
            for e in &edits {
                expected.extend_from_slice(&source[at..e.span.start]);
                expected.extend_from_slice(b"<new>");
                at = e.span.end;
            }
            expected.extend_from_slice(&source[at..]);
            prop_assert_eq!(out, expected);
        }
    }
}
