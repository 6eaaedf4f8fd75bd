//! CSV and TSV: fields with the bytes that they stand in, so that an answer
//! replaces a field and nothing else.
//!
//! Source: RFC 4180 for quoting; the rest (other delimiters, decimal commas,
//! missing quotes, mixed line endings) is as files are found.

use super::patch::Edit;
use std::borrow::Cow;
use std::ops::Range;

/// What sort of delimited file it is; found from its text.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Form {
    /// Comma, semicolon, tab or vertical bar.
    pub delimiter: u8,
    /// Whether numbers are written with a decimal comma.
    pub decimal_comma: bool,
}

/// One field.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Field {
    /// Its bytes, quotes included.
    pub span: Range<usize>,
    /// Whether it stands in quotes.
    pub quoted: bool,
}

/// A file cut into records.
#[derive(Clone, Debug)]
pub struct Delimited {
    /// How it is written.
    pub form: Form,
    fields: Vec<Field>,
    /// First field of each record, and one past the last of all.
    records: Vec<u32>,
}

/// Byte-order mark at the start of a text.
const MARK: &str = "\u{feff}";

impl Delimited {
    /// Cuts a text into records and fields. Every text has a reading: a quote
    /// that is never closed runs to the end.
    pub fn read(text: &str, tabs: bool) -> Delimited {
        let delimiter = if tabs { b'\t' } else { delimiter(text) };
        let mut done = Delimited {
            form: Form { delimiter, decimal_comma: false },
            fields: Vec::new(),
            records: vec![0],
        };
        let bytes = text.as_bytes();
        let mut at = if text.starts_with(MARK) { MARK.len() } else { 0 };
        while at < bytes.len() {
            at = done.record(bytes, at);
        }
        done.form.decimal_comma = delimiter != b',' && done.has_decimal_commas(text);
        done
    }

    /// One record from `at`; returns where the next begins.
    fn record(&mut self, bytes: &[u8], mut at: usize) -> usize {
        loop {
            let start = at;
            let quoted = bytes.get(at) == Some(&b'"');
            if quoted {
                at = after_quotes(bytes, at);
            }
            while let Some(&b) = bytes.get(at) {
                if b == self.form.delimiter || b == b'\n' || b == b'\r' {
                    break;
                }
                at += 1;
            }
            self.fields.push(Field { span: start..at, quoted });
            match bytes.get(at) {
                Some(&b) if b == self.form.delimiter => at += 1,
                Some(b'\r') if bytes.get(at + 1) == Some(&b'\n') => {
                    at += 2;
                    break;
                }
                Some(_) => {
                    at += 1;
                    break;
                }
                None => break,
            }
        }
        self.records.push(self.fields.len() as u32);
        at
    }

    /// How many records there are.
    pub fn len(&self) -> usize {
        self.records.len() - 1
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The fields of a record.
    pub fn record_fields(&self, record: usize) -> &[Field] {
        match (self.records.get(record), self.records.get(record + 1)) {
            (Some(&a), Some(&b)) => &self.fields[a as usize..b as usize],
            _ => &[],
        }
    }

    /// What a field says: without its quotes, and a decimal comma as a point.
    pub fn value<'t>(&self, text: &'t str, field: &Field) -> Cow<'t, str> {
        let plain = self.as_written(text, field);
        if !self.form.decimal_comma || !is_comma_value(plain.trim()) {
            return plain;
        }
        Cow::Owned(plain.trim().replace(',', "."))
    }

    /// What a field says, its decimal comma as it stands.
    pub fn as_written<'t>(&self, text: &'t str, field: &Field) -> Cow<'t, str> {
        let raw = text.get(field.span.clone()).unwrap_or("");
        if !field.quoted {
            return Cow::Borrowed(raw.trim());
        }
        let inner = raw.strip_prefix('"').unwrap_or(raw);
        let inner = inner.trim_end().strip_suffix('"').unwrap_or(inner);
        if inner.contains('"') { Cow::Owned(inner.replace("\"\"", "\"")) } else { Cow::Borrowed(inner) }
    }

    fn has_decimal_commas(&self, text: &str) -> bool {
        let numbers = |f: &&Field| is_comma_number(text[f.span.clone()].trim().trim_matches('"'));
        let points = |f: &&Field| {
            let t = text[f.span.clone()].trim().trim_matches('"');
            t.contains('.') && t.parse::<f64>().is_ok()
        };
        let commas = self.fields.iter().filter(numbers).count();
        commas > 0 && commas >= self.fields.iter().filter(points).count()
    }

    /// The edits that put answers into a record, each a column and a text, in
    /// the order of their columns. A record that is too short gets the fields
    /// that it lacks; an answer is quoted if it must be, or if the field was.
    pub fn edits(&self, record: usize, answers: &[(usize, &str)]) -> Vec<Edit> {
        let fields = self.record_fields(record);
        let Some(last) = fields.last() else { return Vec::new() };
        let mut edits = Vec::new();
        let mut added = String::new();
        let mut reached = fields.len();
        for &(column, answer) in answers {
            match fields.get(column) {
                Some(field) => {
                    edits.push(Edit { span: field.span.clone(), text: self.quoted(answer, field.quoted) });
                }
                None => {
                    added.extend((reached..=column).map(|_| char::from(self.form.delimiter)));
                    added.push_str(&self.quoted(answer, false));
                    reached = column + 1;
                }
            }
        }
        if !added.is_empty() {
            // An edit of the last field and what follows it are one place.
            match edits.last_mut().filter(|edit| edit.span == last.span) {
                Some(edit) => edit.text.push_str(&added),
                None => edits.push(Edit { span: last.span.end..last.span.end, text: added }),
            }
        }
        edits
    }

    /// An answer as this file writes numbers: with its decimal comma, if it has one.
    pub fn written<'t>(&self, answer: &'t str) -> Cow<'t, str> {
        if self.form.decimal_comma { swapped(answer, '.', ',') } else { Cow::Borrowed(answer) }
    }

    /// The opposite of [`Delimited::written`].
    pub fn plain<'t>(&self, answer: &'t str) -> Cow<'t, str> {
        if self.form.decimal_comma { swapped(answer, ',', '.') } else { Cow::Borrowed(answer) }
    }

    fn quoted(&self, answer: &str, was_quoted: bool) -> String {
        let must = answer.bytes().any(|b| b == self.form.delimiter || matches!(b, b'"' | b'\n' | b'\r'));
        if must || was_quoted { format!("\"{}\"", answer.replace('"', "\"\"")) } else { answer.to_string() }
    }
}

/// A text with one sign between digits put in place of another.
fn swapped(text: &str, from: char, to: char) -> Cow<'_, str> {
    let bytes = text.as_bytes();
    let digit = |at: Option<usize>| at.and_then(|at| bytes.get(at)).is_some_and(u8::is_ascii_digit);
    let between = |at: usize| digit(at.checked_sub(1)) && digit(Some(at + 1));
    if !text.match_indices(from).any(|(at, _)| between(at)) {
        return Cow::Borrowed(text);
    }
    Cow::Owned(text.char_indices().map(|(at, c)| if c == from && between(at) { to } else { c }).collect())
}

/// One past the closing quote of the field that opens at `at`.
fn after_quotes(bytes: &[u8], mut at: usize) -> usize {
    at += 1;
    while let Some(&b) = bytes.get(at) {
        at += 1;
        if b == b'"' {
            if bytes.get(at) == Some(&b'"') {
                at += 1;
            } else {
                return at;
            }
        }
    }
    at
}

/// A decimal comma between digits at the start of a value: `0,98`, `12,5%`, `1,2e-6 /h`.
fn is_comma_value(text: &str) -> bool {
    let number = text.trim_end_matches(|c: char| !c.is_ascii_digit());
    let rest = &text[number.len()..];
    is_comma_number(number) && (rest.is_empty() || rest.trim_start().starts_with('%'))
        || text.split_once([' ', '/']).is_some_and(|(number, unit)| {
            is_comma_number(number) && !unit.contains([',', ' ']) && !unit.trim().is_empty()
        })
}

/// `0,98`, `-12,5`, `1,2e-6`
fn is_comma_number(text: &str) -> bool {
    text.matches(',').count() == 1
        && !text.contains('.')
        && text.replace(',', ".").parse::<f64>().is_ok()
        && text.starts_with(|c: char| c.is_ascii_digit() || c == '-')
        && !text.ends_with(',')
}

/// The delimiter that cuts the first lines into the most equal and most numerous fields.
fn delimiter(text: &str) -> u8 {
    const LINES: usize = 64;
    let mut best = (0_usize, b',');
    for candidate in [b';', b'\t', b',', b'|'] {
        let counts: Vec<usize> = text
            .lines()
            .filter(|l| !l.trim().is_empty())
            .take(LINES)
            .map(|l| outside_quotes(l, candidate))
            .collect();
        let most = counts.iter().copied().max().unwrap_or(0);
        let agreeing = counts.iter().filter(|c| **c == most).count();
        let score = if most == 0 { 0 } else { agreeing * 4 + counts.iter().filter(|c| **c > 0).count() };
        if score > best.0 {
            best = (score, candidate);
        }
    }
    best.1
}

fn outside_quotes(line: &str, delimiter: u8) -> usize {
    let mut inside = false;
    let mut count = 0;
    for b in line.bytes() {
        match b {
            b'"' => inside = !inside,
            b if b == delimiter && !inside => count += 1,
            _ => {}
        }
    }
    count
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::document::patch::{Rewrite, apply};

    fn values(text: &str) -> Vec<Vec<String>> {
        let file = Delimited::read(text, false);
        let record = |r| file.record_fields(r).iter().map(|f| file.value(text, f).into_owned()).collect();
        (0..file.len()).map(record).collect()
    }

    fn filled(text: &str, record: usize, column: usize, answer: &str) -> String {
        let file = Delimited::read(text, false);
        patched(text, &file.edits(record, &[(column, &file.written(answer))]))
    }

    fn patched(text: &str, edits: &[Edit]) -> String {
        match apply(text.as_bytes(), edits).expect("edits that fit") {
            Rewrite::Patched(bytes) => String::from_utf8(bytes).expect("text"),
            Rewrite::Unchanged => text.to_string(),
        }
    }

    #[test]
    fn quotes_and_line_feeds_inside_fields() {
        let text = "\u{feff}name,is\r\n\"a \"\"b\"\"\",\"2 of (x,\ny)\"\r\n\r\nlast,z";
        assert_eq!(
            values(text),
            [vec!["name", "is"], vec!["a \"b\"", "2 of (x,\ny)"], vec![""], vec!["last", "z"]]
        );
    }

    #[test]
    fn decimal_commas_belong_to_semicolons() {
        let text = "name;fails;R ?\nP1;0,02;\nP2;0,5;\n";
        assert_eq!(values(text)[1], ["P1", "0.02", ""]);
        assert_eq!(filled(text, 1, 2, "0.98"), "name;fails;R ?\nP1;0,02;0,98\nP2;0,5;\n");
    }

    #[test]
    fn everything_but_the_field_stays() {
        let text = "\u{feff}\"name\",\"R ?\", note\r\n\"P1\",\"0.5\", mine \r\nP2\nP3,,x";
        assert_eq!(filled(text, 1, 1, "0.9"), text.replace("0.5", "0.9"));
        assert_eq!(filled(text, 2, 1, "0.9"), text.replace("P2\n", "P2,0.9\n"));
        assert_eq!(filled(text, 3, 1, "a,b"), text.replace("P3,,x", "P3,\"a,b\",x"));
    }

    #[test]
    fn commas_may_stand_before_a_unit() {
        for yes in ["0,98", "12,5%", "12,5 %", "-1,2e-6", "18,5 /Mh", "2,5/h", "3,5 kg"] {
            assert!(is_comma_value(yes), "{yes}");
        }
        for no in
            ["0.98", "1,2,3", "2 of (A, B)", "fails 0,1", "A,B", "1,5 of 2 A", "0,1, cost 3", "12,5 x y"]
        {
            assert!(!is_comma_value(no), "{no}");
        }
    }

    #[test]
    fn several_answers_of_a_short_record_stand_in_their_columns() {
        let text = "name,R ?,x,F ?\nP2\nP3,\n";
        let file = Delimited::read(text, false);
        let answers = [(1, "0.9"), (3, "0.1")];
        let edits = [file.edits(1, &answers), file.edits(2, &answers)].concat();
        assert_eq!(patched(text, &edits), "name,R ?,x,F ?\nP2,0.9,,0.1\nP3,0.9,,0.1\n");
    }

    #[test]
    fn answers_of_many_numbers_take_the_comma() {
        let file = Delimited::read("name;fails;R ?\nP1;0,02;\n", false);
        assert_eq!(file.written("1 in 69.93"), "1 in 69,93");
        assert_eq!(file.plain("1 in 69,93"), "1 in 69.93");
        assert_eq!(file.written("met: 0.98570, uses 71.5%"), "met: 0,98570, uses 71,5%");
        assert_eq!(file.plain("met: 0,98570, uses 71,5%"), "met: 0.98570, uses 71.5%");
    }

    #[test]
    fn delimiters_are_found() {
        assert_eq!(Delimited::read("a\tb\tc\n1\t2\t3\n", false).form.delimiter, b'\t');
        assert_eq!(Delimited::read("a;b\n\"x;y\";2\n", false).form.delimiter, b';');
        assert_eq!(Delimited::read("name,is\nf,\"2 of (a; b)\"\n", false).form.delimiter, b',');
        assert_eq!(Delimited::read("", false).len(), 0);
        assert_eq!(Delimited::read("\"open", false).len(), 1);
    }
}
