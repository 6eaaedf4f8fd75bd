//! Answers as cells hold them: a number alone, or text.

use crate::answer::{Number, Reply, written};
use crate::document::workbook::number_text;
use crate::language::Display;
use crate::number::{Digits, Real, Rounding, round_decimals, round_significant};
use crate::source::Problem;
use crate::steps::Side;
use crate::system::Model;

/// The most significant digits that a cell keeps.
const DIGITS: u8 = 15;

/// The most text that a cell of a workbook holds, in UTF-16 units.
const LONGEST: usize = 32_767;

/// What goes into a cell.
#[derive(Clone, PartialEq, Debug)]
pub(super) enum CellReply {
    /// A number, and the format that shows its decided digits.
    Number(f64, String),
    /// Text.
    Text(String),
    /// No answer: the message.
    Error(String),
}

/// What is to be known of an answer in its cell.
#[derive(Clone, PartialEq, Eq, Debug)]
pub(super) enum CellNote {
    /// Its nines go beyond what a cell can hold.
    Rounded,
    /// It is in this unit.
    Unit(String),
}

impl CellReply {
    /// The text that a delimited file holds and a report shows.
    pub(super) fn text(&self) -> String {
        match self {
            CellReply::Number(value, _) => number_text(*value),
            CellReply::Text(text) => text.clone(),
            CellReply::Error(message) => format!("! {message}"),
        }
    }

    /// A reply of words as it stands in a cell: each line of a list or a table
    /// is a line of the cell.
    pub(super) fn of_reply(reply: &Reply) -> CellReply {
        let text = match reply {
            Reply::Line(text) => text.clone(),
            Reply::Error(message) => return CellReply::Error(message.clone()),
            Reply::Table { head, rows, foot } => {
                let mut lines = vec![head.join(" | ")];
                lines.extend(rows.iter().map(|row| row.join(" | ")));
                lines.extend(foot.clone());
                lines.join("\n")
            }
            Reply::List { entries, numbered, notes } => {
                let mark = |at: usize| if *numbered { format!("{}. ", at + 1) } else { "• ".to_string() };
                let entry = |(at, lines): (usize, &Vec<String>)| mark(at) + &lines.join("\n    ");
                let mut lines: Vec<String> = entries.iter().enumerate().map(entry).collect();
                lines.extend(notes.iter().map(|note| format!("• {note}")));
                lines.join("\n")
            }
        };
        if text.encode_utf16().count() > LONGEST {
            let message = "this answer is longer than a cell can hold: ask it in a note";
            return CellReply::Error(message.to_string());
        }
        CellReply::Text(plain_start(text))
    }
}

/// A spreadsheet takes text for a formula that begins with one of four signs.
fn plain_start(text: String) -> String {
    if text.starts_with(['=', '+', '-', '@']) { format!("none: {text}") } else { text }
}

/// A number as it goes into a cell; `percent` says that the cell shows 0.25 as 25%.
///
/// Probabilities are rounded towards failure, other figures to the nearest.
///
/// # Errors
/// A display that does not fit the number.
pub(super) fn cell_number(
    model: &Model<'_>,
    number: &Number,
    display: Option<Display>,
    percent: bool,
) -> Result<(CellReply, Option<CellNote>), Box<Problem>> {
    let text = written(model, number, display)?;
    let in_words = text.starts_with('~')
        || matches!(display, Some(Display::Chances))
        || matches!(number, Number::None(_) | Number::Infinite);
    if in_words || text.starts_with('<') || text.ends_with("infinite") {
        return Ok((CellReply::Text(plain_start(text)), None));
    }
    let hundredfold = matches!(display, Some(Display::Percent)) && !percent;
    let places = if hundredfold { 2 } else { 0 };
    let found = match number {
        Number::Chance(chance, side, bound) => {
            let value = side.of(*chance);
            let smaller = chance.smaller();
            let rounding = if *side == Side::Works { Rounding::Down } else { Rounding::Up };
            let hidden = value != smaller && !smaller.is_zero() && {
                let shown = round_significant(smaller, model.digits, *bound, Rounding::Nearest);
                shown.is_none_or(|digits| digits.decimals() > i32::from(DIGITS))
            };
            let digits = if value == smaller {
                most_digits(value, *bound, rounding)
            } else {
                most_of_larger(smaller, *bound, *side)
            };
            digits.map(|d| (d.shift10(places), hidden.then_some(CellNote::Rounded)))
        }
        Number::Figure(quantity) => {
            let (factor, note) = match display {
                Some(Display::Unit(unit)) => (model.units.resolve(unit, &model.tree.names)?.1, None),
                Some(_) => (Real::ONE, None),
                None => {
                    let unit = model.units.symbol(&quantity.dim, &model.tree.names);
                    (Real::ONE, (!unit.is_empty()).then_some(CellNote::Unit(unit)))
                }
            };
            let bound = quantity.relative_error();
            let digits = most_digits(quantity.value / factor, bound, Rounding::Nearest);
            digits.map(|d| (d.shift10(places), note))
        }
        Number::Whole(whole) => {
            let value = whole.parse::<f64>().ok().map(Real::from);
            value.and_then(|v| most_digits(v, 0.0, Rounding::Nearest)).map(|d| (d, None))
        }
        Number::None(_) | Number::Infinite => None,
    };
    let value = found.and_then(|(digits, note)| Some((digits.scientific().parse::<f64>().ok()?, note)));
    Ok(match value.filter(|(value, _)| value.is_finite()) {
        Some((value, note)) => (CellReply::Number(value, format_of(&text)), note),
        None => (CellReply::Text(plain_start(text)), None),
    })
}

/// As many digits as the bound decides and a cell keeps.
fn most_digits(value: Real, bound: f64, rounding: Rounding) -> Option<Digits> {
    let all = |rounding| (1..=DIGITS).rev().find_map(|n| round_significant(value, n, bound, rounding));
    // A bound that straddles a short decimal decides no digit of either side of it.
    let found = all(rounding);
    let nearest = all(Rounding::Nearest);
    match (found, nearest) {
        (Some(found), Some(nearest)) if found.digits().len() + 4 < nearest.digits().len() => Some(nearest),
        (found, nearest) => found.or(nearest),
    }
}

/// The larger side of a chance, to as many decimals as the bound of the smaller
/// one decides and a cell keeps. It is 1 minus the rounded smaller side: 1 itself
/// is never the rounding of many nines.
fn most_of_larger(smaller: Real, bound: f64, larger: Side) -> Option<Digits> {
    let rounding = if larger == Side::Works { Rounding::Up } else { Rounding::Down };
    let decimals = |rounding| {
        (1..=u16::from(DIGITS)).rev().find_map(|n| Some((n, round_decimals(smaller, n, bound, rounding)?)))
    };
    let (found, nearest) = (decimals(rounding), decimals(Rounding::Nearest));
    let kept = match (found, nearest) {
        (Some((n, _)), Some((m, nearest))) if n + 4 < m => Some(nearest),
        (found, nearest) => found.or(nearest).map(|(_, digits)| digits),
    };
    kept.map(|digits| digits.complement())
}

/// The number format that shows as many digits as the answer has in a note.
fn format_of(text: &str) -> String {
    let decimals = |count: usize| match count {
        0 => "0".to_string(),
        count => format!("0.{}", "0".repeat(count.min(30))),
    };
    if text.starts_with("1 - ") || text.starts_with("> 1") {
        return decimals(usize::from(DIGITS));
    }
    if text.starts_with("100 - ") || text.starts_with("> 100") {
        return decimals(usize::from(DIGITS) - 2);
    }
    let number = text.split([' ', '%', '/']).next().unwrap_or("");
    let (mantissa, exponent) = match number.split_once('e') {
        Some((mantissa, _)) => (mantissa, "E+00"),
        None => (number, ""),
    };
    let count = mantissa.split_once('.').map_or(0, |(_, part)| part.len());
    format!("{}{exponent}", decimals(count))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn formats_show_the_digits_of_the_answer() {
        for (text, want) in [
            ("0.98570", "0.00000"),
            ("0.99996000", "0.00000000"),
            ("4.000e-5", "0.000E+00"),
            ("1 - 6.403e-93", "0.000000000000000"),
            ("98.57%", "0.00"),
            ("100 - 1.0e-18%", "0.0000000000000"),
            ("12.50 h", "0.00"),
            ("3.000 /yr", "0.000"),
            ("12", "0"),
            ("1", "0"),
        ] {
            assert_eq!(format_of(text), want, "{text}");
        }
    }

    #[test]
    fn probabilities_are_rounded_towards_failure() {
        let third = Real::ONE / Real::from(3.0);
        let text = |value, rounding| most_digits(value, 1e-28, rounding).unwrap().plain();
        assert_eq!(text(third, Rounding::Down), "0.333333333333333");
        assert_eq!(text(third, Rounding::Up), "0.333333333333334");
        let larger = |smaller, side| most_of_larger(Real::from(smaller), 1e-28, side).unwrap().plain();
        assert_eq!(larger(1e-20, Side::Works), "0.999999999999999");
        assert_eq!(larger(1e-300, Side::Works), "0.999999999999999");
        assert_eq!(larger(0.25, Side::Works), "0.750000000000000");
        assert_eq!(larger(1e-20, Side::Fails), "1.000000000000000");
        assert_eq!(text(Real::from(0.5), Rounding::Down), "0.500000000000000");
    }

    #[test]
    fn lists_are_lines_of_a_cell() {
        let table = Reply::Table {
            head: vec!["order".into(), "cut set".into()],
            rows: vec![vec!["1".into(), "gate".into()]],
            foot: None,
        };
        assert_eq!(CellReply::of_reply(&table), CellReply::Text("order | cut set\n1 | gate".into()));
        let list = |numbered| Reply::List {
            entries: vec![vec!["a".into(), "b".into()]],
            numbered,
            notes: vec!["c".into()],
        };
        assert_eq!(CellReply::of_reply(&list(true)), CellReply::Text("1. a\n    b\n• c".into()));
        assert_eq!(CellReply::of_reply(&list(false)), CellReply::Text("• a\n    b\n• c".into()));
        let long = CellReply::of_reply(&Reply::Line("x".repeat(LONGEST + 1)));
        assert!(matches!(long, CellReply::Error(_)));
        assert_eq!(
            CellReply::of_reply(&Reply::Line("-infinite".into())),
            CellReply::Text("none: -infinite".into())
        );
    }
}
