//! What the columns of a table hold, told from their headers.

use super::expr::later;
use super::grid::{Grid, GridForm, span_of};
use super::read::Source;
use super::tree::{Line, Sym, Tree, Unit, UnitForm};
use super::words::{self, ClauseWord};
use crate::source::{Code, Problem, Span};
use rustc_hash::FxHashSet;

/// What a column holds.
#[derive(Clone, Debug)]
pub(super) enum Column {
    Name,
    Is,
    Qty,
    Need,
    In,
    Require,
    Clause { word: ClauseWord, name: Sym, span: Span, unit: Option<Unit> },
    Ask,
    Met,
    Foreign,
}

impl Column {
    /// Whether it makes a table of names one that takes part.
    pub(super) fn takes_part(&self) -> bool {
        matches!(self, Column::Is | Column::Clause { .. } | Column::Ask | Column::Met | Column::Require)
    }

    /// Whether a second column says what this one says.
    fn says_the_same(&self, other: &Column) -> bool {
        match (self, other) {
            (Column::Clause { name: a, .. }, Column::Clause { name: b, .. }) => a == b,
            (Column::Ask | Column::Foreign | Column::Clause { .. }, _) => false,
            (a, b) => std::mem::discriminant(a) == std::mem::discriminant(b),
        }
    }

    /// Whether it says what a name is.
    pub(super) fn defines(&self) -> bool {
        matches!(self, Column::Is | Column::Clause { .. } | Column::Qty | Column::Need | Column::In)
    }
}

/// What a header cell does for its table, as far as finding tables goes.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum HeaderKind {
    /// The column of names.
    Name,
    /// Data of the names.
    Data,
    /// Requirements on the names.
    Requires,
    /// Answers about the names.
    Asks,
    /// Nothing: the column is the user's.
    Foreign,
}

impl HeaderKind {
    /// The kind of a header; `declared` knows the attributes that lines declare.
    pub fn of(text: &str, declared: &dyn Fn(&str) -> bool) -> HeaderKind {
        match Head::of(text, declared) {
            Head::Plain(Column::Name) => HeaderKind::Name,
            Head::Plain(Column::Met) | Head::Ask | Head::Lines(_) => HeaderKind::Asks,
            Head::Plain(Column::Require) => HeaderKind::Requires,
            Head::Plain(Column::Qty | Column::Need | Column::In | Column::Is) | Head::Clause { .. } => {
                HeaderKind::Data
            }
            _ => HeaderKind::Foreign,
        }
    }

    /// Whether a table of names with this column takes part; `qty`, `need` and
    /// `in` alone say nothing of a part.
    pub fn takes_part(text: &str, declared: &dyn Fn(&str) -> bool) -> bool {
        match Head::of(text, declared) {
            Head::Plain(column) => column.takes_part(),
            Head::Clause { .. } | Head::Ask | Head::Lines(_) => true,
            _ => false,
        }
    }
}

/// A header as read, before its words have numbers.
enum Head {
    Plain(Column),
    Clause {
        word: String,
        meaning: ClauseWord,
        unit: Option<String>,
    },
    /// A clause of the design that is not computed yet.
    LaterClause(String),
    /// A question that a number answers.
    Ask,
    /// A question whose answer has many lines.
    Lines(String),
    LaterAsk(String),
    UnknownAsk(String),
    Foreign {
        word: String,
        unit: Option<String>,
    },
}

impl Head {
    fn of(text: &str, declared: &dyn Fn(&str) -> bool) -> Head {
        let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
        if let Some(question) = text.strip_suffix('?') {
            return Head::question(question.trim());
        }
        let plain = match text.to_lowercase().as_str() {
            "name" => Some(Column::Name),
            "is" => Some(Column::Is),
            "qty" => Some(Column::Qty),
            "need" => Some(Column::Need),
            "in" => Some(Column::In),
            "require" => Some(Column::Require),
            _ => None,
        };
        if let Some(column) = plain {
            return Head::Plain(column);
        }
        let (word, unit) = match text.split_once('(') {
            Some((word, unit)) => (word.trim(), unit.strip_suffix(')').map(str::to_string)),
            None => (text.as_str(), None),
        };
        let lower = word.to_lowercase();
        if words::LATER_CLAUSES.contains(&lower.as_str()) {
            return Head::LaterClause(lower);
        }
        if let Some(meaning) = words::clause(&lower) {
            return Head::Clause { word: lower, meaning, unit };
        }
        // A declared word keeps its letters: names are exact.
        let own = [word, lower.as_str()].into_iter().find(|w| declared(w)).map(str::to_string);
        match own {
            Some(word) => Head::Clause { word, meaning: ClauseWord::Attribute, unit },
            None => Head::Foreign { word: word.to_string(), unit },
        }
    }

    fn question(question: &str) -> Head {
        if question.eq_ignore_ascii_case("met") {
            return Head::Plain(Column::Met);
        }
        let word = question.split(['(']).next().unwrap_or("").split(" in ").next().unwrap_or("").trim();
        if matches!(word, "cuts" | "paths" | "single points" | "rank" | "steps" | "assumptions" | "inputs") {
            Head::Lines(word.to_string())
        } else if words::QUESTIONS.contains(&word) {
            Head::Ask
        } else if words::LATER_QUESTIONS.contains(&word) {
            Head::LaterAsk(word.to_string())
        } else {
            Head::UnknownAsk(word.to_string())
        }
    }
}

/// The attributes that lines declare.
pub fn declared(tree: &Tree) -> FxHashSet<String> {
    let words = tree.statements.iter().filter_map(|s| match &s.line {
        Line::Attribute(found) => Some(found),
        _ => None,
    });
    words.flatten().map(|(word, ..)| tree.names.text(*word).to_string()).collect()
}

/// The columns of a grid; `problems` takes what is to be said about headers.
pub(super) fn columns(
    grid: &Grid<'_>,
    declared: &FxHashSet<String>,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) -> Vec<Column> {
    let mut found: Vec<Column> = Vec::with_capacity(grid.header.len());
    for cell in &grid.header {
        let column = column(*cell, grid.form, declared, tree, problems);
        // Two columns of data would both count, or one of them would not.
        match found.iter().position(|before| before.says_the_same(&column)) {
            Some(first) => {
                let (place, first) = (span_of(*cell), span_of(grid.header[first]));
                problems.push(
                    Problem::error(Code::TableHeader, place, "two columns of this table say the same")
                        .label(first, "the first of them")
                        .mend("give one of the two another header: a column that is yours has any other"),
                );
                found.push(Column::Foreign);
            }
            None => found.push(column),
        }
    }
    let requires = found.iter().any(|c| matches!(c, Column::Require));
    for (column, cell) in found.iter().zip(&grid.header) {
        if matches!(column, Column::Met) && !requires {
            let message = "`met` asks about requirements, and this table has no `require` column";
            problems.push(
                Problem::remark(Code::TableHeader, span_of(*cell), message)
                    .mend("head a column `require`, with cells such as `R >= 0.999`"),
            );
        }
    }
    found
}

fn column(
    cell: Source<'_>,
    form: GridForm,
    declared: &FxHashSet<String>,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) -> Column {
    let span = span_of(cell);
    match Head::of(cell.text, &|word| declared.contains(word)) {
        Head::Plain(column) => return column,
        Head::Ask => return Column::Ask,
        Head::Lines(_) if form != GridForm::Markdown => return Column::Ask,
        Head::Clause { word, meaning, unit } => {
            let name = tree.names.intern(&word);
            // A currency is a note to the reader: costs are plain numbers.
            let unit = unit.filter(|_| word != "cost").and_then(|u| header_unit(&u, span, tree));
            return Column::Clause { word: meaning, name, span, unit };
        }
        Head::LaterClause(word) => problems.push(later(span, &format!("the clause `{word}`"))),
        Head::LaterAsk(word) => problems.push(later(span, &format!("the question `{word}`"))),
        Head::Lines(word) => problems.push(
            Problem::remark(
                Code::TableHeader,
                span,
                format!("`{word}` has an answer of many lines, which fits no cell"),
            )
            .mend("ask it in a block of its own, or for the count of its entries"),
        ),
        Head::UnknownAsk(word) => {
            let problem = Problem::remark(
                Code::TableHeader,
                span,
                "this header is no question that is known, and its column is yours",
            );
            let near = words::nearest(&word, words::QUESTIONS.iter().copied().chain(["met"]));
            problems.push(match near {
                Some(near) => problem.mend(format!("did you mean \"{near} ?\"?")),
                None => problem
                    .mend("questions are `R ?`, `F in chances ?`, `R(500 h) ?`, `Birnbaum(gate) ?`, `met ?`"),
            });
        }
        Head::Foreign { word, unit } => problems.extend(near_header(&word, unit.as_deref(), span)),
    }
    Column::Foreign
}

/// A remark on a header that looks like a known one and is not.
fn near_header(word: &str, unit: Option<&str>, span: Span) -> Option<Problem> {
    let known = ["name", "require", "need"].into_iter().chain(words::CLAUSES.iter().map(|(w, _)| *w));
    let lower = word.to_lowercase();
    let near = words::nearest(&lower, known).filter(|_| unit.is_some() || word.chars().count() > 3);
    let meant = match near {
        Some(near) => near.to_string(),
        None => with_stray_unit(word, unit)?,
    };
    let message = format!("the header `{word}` is yours and takes no part");
    Some(Problem::remark(Code::TableHeader, span, message).mend(format!("did you mean \"{meant}\"?")))
}

/// `rate FIT`, `rate [FIT]` and `failure rate (FIT)` are nearly `rate (FIT)`.
fn with_stray_unit(word: &str, unit: Option<&str>) -> Option<String> {
    let clause = |w: &str| {
        let meaning = words::clause(&w.to_lowercase());
        meaning.is_some_and(|c| !matches!(c, ClauseWord::Source | ClauseWord::Perfect))
    };
    let parts: Vec<&str> = word.split_whitespace().collect();
    if let Some(unit) = unit {
        return parts.iter().find(|w| clause(w)).map(|w| format!("{w} ({unit})"));
    }
    let [first, stray] = parts.as_slice() else { return None };
    let bare = stray.trim_matches(['[', ']', ',', '/']);
    let short = !bare.is_empty() && bare.chars().count() <= 4 && bare.chars().all(|c| c.is_alphabetic());
    let stray = stray.trim_matches(['[', ']', ',']);
    (clause(first.trim_end_matches(',')) && short)
        .then(|| format!("{} ({stray})", first.trim_end_matches(',')))
}

/// `FIT`, `/Mh`, `%/kh` in a header's parentheses.
fn header_unit(text: &str, span: Span, tree: &mut Tree) -> Option<Unit> {
    let text = text.trim();
    let (form, word) = if let Some(word) = text.strip_prefix("%/") {
        (UnitForm::PercentPer, word)
    } else if let Some(word) = text.strip_prefix('/') {
        (UnitForm::Per, word)
    } else {
        (UnitForm::Plain, text)
    };
    (!word.is_empty()).then(|| Unit { form, word: tree.names.intern(word.trim()), span })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn headers_are_told_apart() {
        let kind = |text| HeaderKind::of(text, &|word| word == "power");
        for (text, want) in [
            (" Name ", HeaderKind::Name),
            ("RATE  (FIT)", HeaderKind::Data),
            ("power (W)", HeaderKind::Data),
            ("Qty", HeaderKind::Data),
            ("R ?", HeaderKind::Asks),
            ("F in chances?", HeaderKind::Asks),
            ("made perfect(gate) ?", HeaderKind::Asks),
            ("steps ?", HeaderKind::Asks),
            ("Met ?", HeaderKind::Asks),
            ("require", HeaderKind::Requires),
            ("r ?", HeaderKind::Foreign),
            ("enough ?", HeaderKind::Foreign),
            ("İ(", HeaderKind::Foreign),
            ("remark", HeaderKind::Foreign),
            ("", HeaderKind::Foreign),
        ] {
            assert_eq!(kind(text), want, "{text}");
        }
        assert!(!HeaderKind::takes_part("qty", &|_| false));
        assert!(HeaderKind::takes_part("cost", &|_| false));
    }

    #[test]
    fn near_headers_get_their_mend() {
        let meant = |word, unit| near_header(word, unit, Span::default()).map(|p| p.mends[0].clone());
        let did = |text: &str| Some(format!("did you mean \"{text}\"?"));
        assert_eq!(meant("Rate FIT", None), did("Rate (FIT)"));
        assert_eq!(meant("mttf [kh]", None), did("mttf (kh)"));
        assert_eq!(meant("rate /mh", None), did("rate (/mh)"));
        assert_eq!(meant("failure rate", Some("FIT")), did("rate (FIT)"));
        assert_eq!(meant("rte", Some("FIT")), did("rate"));
        for yours in ["cost centre", "source document", "position", "unit"] {
            assert_eq!(meant(yours, None), None, "{yours}");
        }
    }
}
