//! The cells that a formula's text refers to.

use std::collections::BTreeMap;

use super::cells::{Block, LAST_COLUMN, LAST_ROW};
use super::depend::WHOLE;

/// What the names in formulas may mean; all of them in lower case.
#[derive(Default, Debug)]
pub(super) struct Scope {
    pub(super) sheets: Vec<String>,
    /// Defined names and the formulas that they stand for.
    pub(super) names: BTreeMap<String, Vec<String>>,
    pub(super) tables: BTreeMap<String, (usize, Block)>,
}

/// One end of a reference: row and column, each with whether it is fixed.
#[derive(Clone, Copy, Debug)]
struct End {
    row: Option<(u32, bool)>,
    column: Option<(u32, bool)>,
}

fn end(word: &str) -> Option<End> {
    let fixed_column = word.starts_with('$');
    let word = word.strip_prefix('$').unwrap_or(word);
    let letters = word.bytes().take_while(u8::is_ascii_alphabetic).count();
    let (column, rest) = word.split_at(letters);
    let (fixed_row, digits) = match rest.strip_prefix('$') {
        Some(digits) => (true, digits),
        None => (letters == 0 && fixed_column, rest),
    };
    if letters > 3 || digits.len() > 7 || !digits.bytes().all(|b| b.is_ascii_digit()) {
        return None;
    }
    let column = column.bytes().fold(0u32, |n, b| n * 26 + u32::from(b.to_ascii_uppercase() - b'A') + 1);
    let row = if digits.is_empty() { None } else { digits.parse::<u32>().ok()?.checked_sub(1) };
    let column = column.checked_sub(1);
    if digits.is_empty() == row.is_some() || row.is_none() && (column.is_none() || !digits.is_empty()) {
        return None;
    }
    if row.is_some_and(|r| r > LAST_ROW) || column.is_some_and(|c| c > LAST_COLUMN) {
        return None;
    }
    Some(End { row: row.map(|r| (r, fixed_row)), column: column.map(|c| (c, fixed_column)) })
}

fn block(a: End, b: End, shift: (i64, i64)) -> Block {
    let moved = |place: (u32, bool), by: i64, last: u32| {
        if place.1 {
            return place.0;
        }
        let size = i64::from(last) + 1;
        u32::try_from((i64::from(place.0) + by).rem_euclid(size)).unwrap_or(0)
    };
    let span = |a: Option<(u32, bool)>, b: Option<(u32, bool)>, by: i64, last: u32| match (a, b) {
        (Some(a), Some(b)) => {
            let (a, b) = (moved(a, by, last), moved(b, by, last));
            (a.min(b), a.max(b))
        }
        _ => (0, last),
    };
    let rows = span(a.row, b.row, shift.0, LAST_ROW);
    let columns = span(a.column, b.column, shift.1, LAST_COLUMN);
    Block { first: (rows.0, columns.0), last: (rows.1, columns.1) }
}

/// The blocks that `formula` refers to, seen from a cell of sheet `home`; its
/// relative references are moved by `shift` (rows, columns).
pub(super) fn refers(formula: &str, home: usize, shift: (i64, i64), scope: &Scope) -> Vec<(usize, Block)> {
    let mut out = Vec::new();
    collect(formula, home, shift, scope, 0, &mut out);
    out
}

fn collect(
    formula: &str,
    home: usize,
    shift: (i64, i64),
    scope: &Scope,
    depth: u32,
    out: &mut Vec<(usize, Block)>,
) {
    let mut rest = formula;
    // The sheets that a name and `!` before a reference chose; none for those of other books.
    let mut sheets: Option<Vec<usize>> = None;
    let mut external = false;
    while let Some(c) = rest.chars().next() {
        match c {
            '"' => rest = after_quoted(rest, '"').1,
            '\'' => {
                let (name, after) = after_quoted(rest, '\'');
                rest = after;
                if let Some(after) = rest.strip_prefix('!') {
                    sheets = Some(chosen(&name, scope));
                    rest = after;
                }
            }
            '[' => {
                // `[1]Sheet!A1` is another book; brackets after a table's name choose of its columns.
                let inner = after_brackets(rest);
                external = true;
                rest = inner;
            }
            c if c.is_alphanumeric() || matches!(c, '_' | '$' | '\\') => {
                let length = rest.find(|c: char| !(c.is_alphanumeric() || "_$.\\?".contains(c)));
                let (word, after) = rest.split_at(length.unwrap_or(rest.len()));
                rest = after;
                let whole_to_sheet = after.strip_prefix(':').and_then(|next| {
                    let length = next.find(|c: char| !(c.is_alphanumeric() || "_.$".contains(c)))?;
                    next[length..].starts_with('!').then(|| (&next[..length], &next[length + 1..]))
                });
                if let Some(after) = after.strip_prefix('!') {
                    sheets = Some(if external { Vec::new() } else { chosen(word, scope) });
                    (rest, external) = (after, false);
                    continue;
                }
                if let Some((last, after)) =
                    whole_to_sheet.filter(|(last, _)| end(last).is_none() || end(word).is_none())
                {
                    sheets = Some(chosen(&format!("{word}:{last}"), scope));
                    rest = after;
                    continue;
                }
                let at = sheets.take().unwrap_or_else(|| vec![home]);
                external = false;
                if after.starts_with('(') {
                    continue;
                }
                let second = after.strip_prefix(':').and_then(|next| {
                    let length =
                        next.find(|c: char| !(c.is_alphanumeric() || c == '$')).unwrap_or(next.len());
                    end(&next[..length]).map(|e| (e, &next[length..]))
                });
                match (end(word), second) {
                    (Some(a), Some((b, after))) => {
                        rest = after;
                        out.extend(at.iter().map(|sheet| (*sheet, block(a, b, shift))));
                    }
                    (Some(a), None) if a.row.is_some() && a.column.is_some() => {
                        out.extend(at.iter().map(|sheet| (*sheet, block(a, a, shift))));
                    }
                    _ => {
                        let name = word.to_lowercase();
                        out.extend(scope.tables.get(&name));
                        if after.starts_with('[') {
                            rest = after_brackets(after);
                        }
                        for meaning in scope.names.get(&name).into_iter().flatten().filter(|_| depth < 4) {
                            collect(meaning, home, (0, 0), scope, depth + 1, out);
                        }
                    }
                }
            }
            c => {
                if c != '!' {
                    (sheets, external) = (None, false);
                }
                rest = &rest[c.len_utf8()..];
            }
        }
        // A formula of many thousand references is as good as one that refers to everything.
        if out.len() > 10_000 {
            out.clear();
            out.extend((0..scope.sheets.len()).map(|sheet| (sheet, WHOLE)));
            return;
        }
    }
}

/// The sheets that `Name` or `First:Last` chooses.
fn chosen(name: &str, scope: &Scope) -> Vec<usize> {
    if name.contains('[') {
        return Vec::new();
    }
    let find =
        |name: &str| scope.sheets.iter().position(|s| *s == name.trim_start_matches('$').to_lowercase());
    if let Some(one) = find(name) {
        return vec![one];
    }
    match name.split_once(':').map(|(a, b)| (find(a), find(b))) {
        Some((Some(a), Some(b))) => (a.min(b)..=a.max(b)).collect(),
        _ => Vec::new(),
    }
}

/// What stands in quotes at the start of `text`, doubled ones once, and what follows.
fn after_quoted(text: &str, quote: char) -> (String, &str) {
    let mut inner = String::new();
    let mut chars = text.char_indices().skip(1).peekable();
    while let Some((at, c)) = chars.next() {
        if c == quote {
            if chars.peek().is_some_and(|(_, next)| *next == quote) {
                chars.next();
            } else {
                return (inner, &text[at + c.len_utf8()..]);
            }
        }
        inner.push(c);
    }
    (inner, "")
}

/// What follows the brackets at the start of `text`.
fn after_brackets(text: &str) -> &str {
    let mut depth = 0;
    for (at, c) in text.char_indices() {
        match c {
            '[' => depth += 1,
            ']' => depth -= 1,
            _ => {}
        }
        if depth == 0 {
            return &text[at + c.len_utf8()..];
        }
    }
    ""
}

/// A formula of an ods in the manner of xlsx: `of:=[.A1]+[$Pumps.B2:.B3]` as
/// `A1+'Pumps'!B2:B3`.
pub(super) fn plain(formula: &str) -> String {
    let mut out = String::new();
    let mut rest = formula.split_once('=').map_or(formula, |(_, f)| f);
    while let Some(at) = rest.find(['[', '"']) {
        out.push_str(&rest[..at]);
        rest = &rest[at..];
        if rest.starts_with('"') {
            rest = after_quoted(rest, '"').1;
            continue;
        }
        let Some(close) = rest.find(']') else { break };
        out.push_str(&address(&rest[1..close]));
        rest = &rest[close + 1..];
    }
    out.push_str(rest);
    out
}

/// An address of an ods (`.A1`, `$'My sheet'.A1:.B2`) in the manner of xlsx.
pub(super) fn address(text: &str) -> String {
    let text = text.strip_prefix('$').unwrap_or(text);
    let (sheet, cells) = match text.strip_prefix('\'') {
        Some(_) => {
            let (name, after) = after_quoted(text, '\'');
            (name, after.strip_prefix('.').unwrap_or(after))
        }
        None => text.split_once('.').map_or((String::new(), text), |(s, cells)| (s.to_string(), cells)),
    };
    // The second end may name its sheet again.
    let cells = match cells.split_once(':') {
        Some((a, b)) => format!("{a}:{}", b.rsplit_once('.').map_or(b, |(_, b)| b)),
        None => cells.to_string(),
    };
    if sheet.is_empty() { cells } else { format!("'{}'!{cells}", sheet.replace('\'', "''")) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::document::workbook::a1;

    fn shown(formula: &str, shift: (i64, i64)) -> String {
        let mut scope =
            Scope { sheets: vec!["gates".into(), "my pumps".into(), "z".into()], ..Scope::default() };
        scope.names.insert("worst".into(), vec!["'My pumps'!$E$5:$E$10".into()]);
        scope.tables.insert("list".into(), (2, Block::parse("A1:C3").unwrap()));
        let found = refers(formula, 0, shift, &scope);
        let text = |b: &Block| format!("{}:{}", a1(b.first.0, b.first.1), a1(b.last.0, b.last.1));
        found.iter().map(|(s, b)| format!("{s}!{}", text(b))).collect::<Vec<_>>().join(" ")
    }

    #[test]
    fn references_are_found() {
        assert_eq!(shown("A1*2+$B$3", (0, 0)), "0!A1:A1 0!B3:B3");
        assert_eq!(shown("A1*2+$B$3+C$4", (2, 1)), "0!B3:B3 0!B3:B3 0!D4:D4");
        assert_eq!(shown("SUM('My pumps'!B2:C3,z!D4)&\"A9\"", (0, 0)), "1!B2:C3 2!D4:D4");
        assert_eq!(shown("SUM(B:B)+SUM(2:3)", (0, 0)), "0!B1:B1048576 0!A2:XFD3");
        assert_eq!(shown("MIN(worst)-LOG10(E2)", (0, 0)), "1!E5:E10 0!E2:E2");
        assert_eq!(shown("SUM(List[R ?])+[1]Gates!A1+'[2]z'!B1", (0, 0)), "2!A1:C3");
        assert_eq!(shown("SUM(gates:z!A1)", (0, 0)), "0!A1:A1 1!A1:A1 2!A1:A1");
        assert_eq!(shown("TRUE+1.5E3+0.5*A2", (0, 0)), "0!A2:A2");
    }

    #[test]
    fn ods_formulas_are_read() {
        assert_eq!(plain("of:=SUM([.A1:.B2])*[$Pumps.C3]&\"[.D4]\""), "SUM(A1:B2)*'Pumps'!C3&");
        assert_eq!(address("$'Gate drives'.$E$5:$'Gate drives'.$E$10"), "'Gate drives'!$E$5:$E$10");
    }
}
