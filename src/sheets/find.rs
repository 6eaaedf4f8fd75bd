//! Where the tables of a file stand, and what is set above them.

use super::rows::{Content, Opened, RowCell};
use crate::language::{CellKind, HeaderKind};
use rustc_hash::FxHashSet;

/// A header row, or the part of one that heads a table.
#[derive(Clone, Debug)]
pub(super) struct Header {
    pub(super) sheet: usize,
    pub(super) row: u32,
    /// The row at which it ends: that of the next header over the same columns.
    pub(super) end: u32,
    /// Columns and texts, from left to right.
    pub(super) cells: Vec<(u32, String)>,
}

impl Header {
    fn columns(&self) -> (u32, u32) {
        (self.cells.first().map_or(0, |c| c.0), self.cells.last().map_or(0, |c| c.0))
    }

    /// What each column is for.
    pub(super) fn kinds<'h>(
        &'h self,
        declared: &'h FxHashSet<String>,
    ) -> impl Iterator<Item = HeaderKind> + 'h {
        self.cells.iter().map(|(_, text)| HeaderKind::of(text, &|word| declared.contains(word)))
    }
}

/// A setting above a table.
#[derive(Clone, Debug)]
pub(super) struct Setting {
    pub(super) sheet: usize,
    pub(super) row: u32,
    /// The column of its value.
    pub(super) column: u32,
    /// The word that begins it: `mission`.
    pub(super) word: &'static str,
    /// Its value, with the unit of a cell beside it or of the word's parentheses.
    pub(super) value: String,
    pub(super) kind: CellKind,
}

/// What was found in a file.
#[derive(Clone, Debug, Default)]
pub(super) struct Found {
    pub(super) headers: Vec<Header>,
    pub(super) settings: Vec<Setting>,
    /// Rows that ask and have no column of names: sheet, row, column of the question, its header.
    pub(super) nameless: Vec<(usize, u32, u32, String)>,
    /// The attributes that are declared.
    pub(super) declared: FxHashSet<String>,
}

impl Found {
    /// Whether any table asks or requires something.
    pub(super) fn asks(&self) -> bool {
        let asks = |kind| matches!(kind, HeaderKind::Asks | HeaderKind::Requires);
        self.headers.iter().any(|h| h.kinds(&self.declared).any(asks))
    }
}

/// Words that begin a setting.
const WORDS: &[&str] = &["mission", "digits", "year", "exposure", "attribute", "require"];

/// Finds headers and settings in all sheets, or in the one of that name.
/// `declared` are the attributes that are known already.
pub(super) fn find(opened: &Opened, only: Option<&str>, declared: FxHashSet<String>) -> Found {
    let mut found = Found { declared, ..Found::default() };
    for (sheet, name) in opened.names().iter().enumerate() {
        if only.is_some_and(|only| only != name) {
            continue;
        }
        let mut rows = Vec::new();
        opened.each_row(sheet, |number, cells| {
            if cells.iter().any(|c| c.content.text().is_some_and(|t| t.eq_ignore_ascii_case("name"))) {
                found.headers.extend(split(sheet, number, cells));
            } else if rows.len() < 64 && asks_without_name(cells) {
                rows.push((number, cells.iter().filter_map(question_of).next()));
            }
            found.settings.extend(settings(sheet, number, cells));
        });
        let nameless =
            rows.into_iter().filter_map(|(row, cell)| cell.map(|(at, text)| (sheet, row, at, text)));
        found.nameless.extend(nameless);
    }
    let attributes = found.settings.iter().filter(|s| s.word == "attribute");
    let words: Vec<String> = attributes.flat_map(|s| declared_words(&s.value)).collect();
    found.declared.extend(words);
    let known = std::mem::take(&mut found.declared);
    found.headers.retain(|header| {
        let takes_part = |(_, text): &(u32, String)| HeaderKind::takes_part(text, &|w| known.contains(w));
        header.cells.iter().any(takes_part) && header.kinds(&known).any(|k| k == HeaderKind::Name)
    });
    found.declared = known;
    let headers = &found.headers;
    let first = |sheet| headers.iter().filter(|h| h.sheet == sheet).map(|h| h.row).min();
    found.settings.retain(|s| first(s.sheet).is_some_and(|row| s.row < row));
    close(&mut found.headers);
    found
}

/// Sets where each table ends.
fn close(headers: &mut [Header]) {
    for at in 0..headers.len() {
        let (sheet, row, (left, right)) = (headers[at].sheet, headers[at].row, headers[at].columns());
        let next = headers[at + 1..].iter().take_while(|h| h.sheet == sheet).find(|h| {
            let (a, b) = h.columns();
            h.row > row && a <= right && left <= b
        });
        headers[at].end = next.map_or(u32::MAX, |h| h.row);
    }
}

/// The attributes that a line declares: `power W, area`.
fn declared_words(value: &str) -> Vec<String> {
    let word = |part: &str| part.split_whitespace().next().map(|w| w.trim_matches('"').to_string());
    value.split(',').filter_map(word).collect()
}

/// A row of headers as tables. Tables stand side by side with a blank between
/// them, or each begins with its names; what has no names of its own belongs to
/// the table on its left, since a header may be merged over several columns.
fn split(sheet: usize, row: u32, cells: &[RowCell<'_>]) -> Vec<Header> {
    let mut runs: Vec<Vec<(u32, String)>> = Vec::new();
    let mut last = None;
    for cell in cells.iter().filter(|c| !c.content.is_blank()) {
        let text = cell.content.text().unwrap_or("").to_string();
        let is_name = |text: &str| text.eq_ignore_ascii_case("name");
        let apart = last.is_none_or(|last| cell.column != last + 1);
        let again = is_name(&text) && runs.last().is_some_and(|run| run.iter().any(|(_, t)| is_name(t)));
        if apart || again {
            runs.push(Vec::new());
        }
        last = Some(cell.column);
        if let Some(run) = runs.last_mut() {
            run.push((cell.column, text));
        }
    }
    let mut tables: Vec<Vec<(u32, String)>> = Vec::new();
    for run in runs {
        let named = |run: &[(u32, String)]| run.iter().any(|(_, t)| t.eq_ignore_ascii_case("name"));
        match tables.last_mut() {
            // What stands left of the first names joins them as well.
            Some(table) if !named(&run) || !named(table) => table.extend(run),
            _ => tables.push(run),
        }
    }
    tables.into_iter().map(|cells| Header { sheet, row, end: u32::MAX, cells }).collect()
}

/// The column and text of a cell that is a question of tieback's.
fn question_of(cell: &RowCell<'_>) -> Option<(u32, String)> {
    let text = cell.content.text().filter(|t| t.ends_with('?'))?;
    let asks = HeaderKind::of(text, &|_| false) == HeaderKind::Asks;
    asks.then(|| (cell.column, text.to_string()))
}

/// Whether a row looks like a header whose names have another heading.
fn asks_without_name(cells: &[RowCell<'_>]) -> bool {
    cells.len() > 1 && cells.iter().any(|c| question_of(c).is_some())
}

/// The settings that stand in a row.
fn settings(sheet: usize, row: u32, cells: &[RowCell<'_>]) -> Vec<Setting> {
    let mut found = Vec::new();
    for (at, cell) in cells.iter().enumerate() {
        let Some((word, unit)) = cell.content.text().and_then(setting_word) else { continue };
        let mut rest = cells[at + 1..].iter().filter(|c| !c.content.is_blank());
        let Some(value) = rest.next() else { continue };
        let mut text = match &value.content {
            Content::Text(text) => text.trim().to_string(),
            Content::Number(number) => crate::document::workbook::number_text(*number),
            Content::Date(iso) => iso.to_string(),
            Content::Logical(it) => it.to_string(),
            Content::Failed(text) => text.to_string(),
            Content::Empty | Content::NoValue => String::new(),
        };
        let bare = text.parse::<f64>().is_ok();
        let beside = rest.next().filter(|c| c.column == value.column + 1).and_then(|c| c.content.text());
        if let (true, Some(unit)) = (bare, unit.as_deref().or(beside)) {
            text.push(' ');
            text.push_str(unit);
        }
        let kind = value.content.kind();
        found.push(Setting { sheet, row, column: value.column, word, value: text, kind });
    }
    found
}

/// `mission`, `Mission:`, `mission (h)`: the word and its unit.
fn setting_word(text: &str) -> Option<(&'static str, Option<String>)> {
    if text.len() > 32 {
        return None;
    }
    let text = text.trim_end_matches(':').trim_end();
    let (word, unit) = match text.split_once('(') {
        Some((word, unit)) => (word.trim_end(), Some(unit.strip_suffix(')')?.trim().to_string())),
        None => (text, None),
    };
    let known = WORDS.iter().find(|w| w.eq_ignore_ascii_case(word))?;
    Some((known, unit))
}
