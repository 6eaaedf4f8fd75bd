//! The first sheet: caution, stamp, what was assumed, requirements, answers.

use super::gather::{Answer, Review};
use super::looks::{Looks, live, print_set_up, side_format, text};
use super::review_workbook::{FIRST, Stamp};
use super::sheet_formula::Part;
use crate::answer::End;
use crate::language::Limit;
use crate::number::Real;
use crate::source::Sources;
use crate::steps::{Outcome, Side};
use rust_xlsxwriter::{
    Color, ConditionalFormatText, ConditionalFormatTextRule, Format, Formula as SheetFormula, Worksheet,
    XlsxError,
};
use sha2::{Digest, Sha256};

const NO_ANSWER: &str = "no steps: see the document";
const CAUTION: &str = "tieback is an aid to calculation. It is no substitute for the codes and standards in force and the \
                       judgement of a licensed engineer. Whoever signs answers for the inputs, the model and their use.";

/// Writes it.
pub(super) fn front(
    sheet: &mut Worksheet,
    review: &Review,
    sources: &Sources,
    stamp: &Stamp,
    looks: &Looks,
) -> Result<(), XlsxError> {
    sheet.set_name("Review")?;
    print_set_up(sheet);
    for (column, width) in [44.0, 20.0, 16.0, 16.0, 44.0, 18.0].into_iter().enumerate() {
        sheet.set_column_width(column as u16, width)?;
    }
    text(sheet, (0, 0), &format!("Review of {}", stamp.name), &looks.title)?;
    sheet.merge_range(1, 0, 1, 5, CAUTION, &looks.note)?;
    sheet.set_row_height(1, 34)?;
    let date = stamp.date.as_deref().unwrap_or("not given (--date)");
    let mut row = 3;
    for (head, value) in [
        ("Program", format!("tieback {}", env!("CARGO_PKG_VERSION"))),
        ("Digest of the inputs (SHA-256)", digest(sources)),
        ("Date", date.to_string()),
    ] {
        text(sheet, (row, 0), head, &looks.text)?;
        text(sheet, (row, 1), &value, &Format::new())?;
        row += 1;
    }
    row = section(sheet, row + 1, &["Assumed where nothing else is said"], looks)?;
    let assumed = assumed(&review.steps.assumptions);
    if assumed.is_empty() {
        text(sheet, (row, 0), "nothing", &looks.text)?;
        row += 1;
    }
    for line in &assumed {
        sheet.merge_range(row, 0, row, 5, line, &looks.text)?;
        sheet.set_row_height(row, 15.0 * (1.0 + (line.chars().count() / 150) as f64))?;
        row += 1;
    }
    let required: Vec<&Answer> = review.answers.iter().filter(|a| a.limit.is_some()).collect();
    if !required.is_empty() {
        row = section(
            sheet,
            row + 1,
            &["Requirement", "Value now", "Limit", "Now", "tieback's verdict", "Place"],
            looks,
        )?;
        let first = row;
        for answer in required {
            requirement(sheet, row, answer, review, looks)?;
            row += 1;
        }
        let verdicts = |rule: ConditionalFormatTextRule, back: u32, ink: u32| {
            ConditionalFormatText::new().set_rule(rule).set_format(
                Format::new().set_background_color(Color::RGB(back)).set_font_color(Color::RGB(ink)),
            )
        };
        use ConditionalFormatTextRule::BeginsWith;
        sheet.add_conditional_format(
            first,
            3,
            row - 1,
            4,
            &verdicts(BeginsWith("met".into()), 0x00D9_EAD3, 0x0027_4E13),
        )?;
        sheet.add_conditional_format(
            first,
            3,
            row - 1,
            4,
            &verdicts(BeginsWith("NOT".into()), 0x00F4_CCCC, 0x0099_0000),
        )?;
        sheet.add_conditional_format(
            first,
            3,
            row - 1,
            4,
            &verdicts(BeginsWith("UNDECIDED".into()), 0x00FF_F2CC, 0x007F_6000),
        )?;
    }
    row = section(sheet, row + 1, &["Question", "Value now", "", "", "tieback's answer", "Place"], looks)?;
    for answer in review.answers.iter().filter(|a| a.limit.is_none()) {
        text(sheet, (row, 0), &answer.question, &looks.text)?;
        now(sheet, (row, 1), answer, review, looks)?;
        text(sheet, (row, 4), &answer.text, &looks.text)?;
        text(sheet, (row, 5), &answer.place, &looks.text)?;
        row += 1;
    }
    Ok(())
}

/// What was assumed of each question, with the things of all of them in one line.
fn assumed(lines: &[String]) -> Vec<String> {
    let mut found: Vec<(String, Vec<String>)> = Vec::new();
    for line in lines {
        let (head, names) = line.split_once(": ").unwrap_or((line, ""));
        let at = found.iter().position(|(h, _)| h == head).unwrap_or_else(|| {
            found.push((head.to_string(), Vec::new()));
            found.len() - 1
        });
        for name in names.split(", ").filter(|n| !n.is_empty()) {
            if !found[at].1.iter().any(|n| n == name) {
                found[at].1.push(name.to_string());
            }
        }
    }
    let told = |(head, names): (String, Vec<String>)| match names.is_empty() {
        true => head,
        false => format!("{head}: {}", names.join(", ")),
    };
    found.into_iter().map(told).collect()
}

fn section(sheet: &mut Worksheet, row: u32, names: &[&str], looks: &Looks) -> Result<u32, XlsxError> {
    for column in 0..6 {
        let name = names.get(column).copied().unwrap_or("");
        sheet.write_with_format(row, column as u16, name, &looks.head)?;
    }
    Ok(row + 1)
}

fn requirement(
    sheet: &mut Worksheet,
    row: u32,
    answer: &Answer,
    review: &Review,
    looks: &Looks,
) -> Result<(), XlsxError> {
    text(sheet, (row, 0), &answer.question, &looks.text)?;
    now(sheet, (row, 1), answer, review, looks)?;
    text(sheet, (row, 4), &answer.text, &looks.text)?;
    text(sheet, (row, 5), &answer.place, &looks.text)?;
    let Some((limit, bar, met)) = &answer.limit else { return Ok(()) };
    sheet.write_number_with_format(row, 2, bar.value.to_f64(), &looks.input)?;
    let here = row + 1;
    // Compared on the small side, as far as doubles go.
    let holds = match (limit, answer.end) {
        (_, None | Some(End::Certain(_))) => {
            return text(sheet, (row, 3), if *met { "met" } else { "NOT met" }, &looks.text);
        }
        (Limit::AtLeast, Some(End::Chance(step, side))) if bar.value > Real::from(0.5) => {
            format!("{}<=ROUND(1-C{here},15)*(1+1E-12)", cell(step, other(side)))
        }
        (Limit::AtLeast, _) => format!("B{here}>=C{here}*(1-1E-12)"),
        (Limit::AtMost, _) => format!("B{here}<=C{here}*(1+1E-12)"),
    };
    let word = if *met { "met" } else { "NOT met" };
    let formula = SheetFormula::new(format!("=IF({holds},\"met\",\"NOT met\")")).set_result(word);
    sheet.write_formula_with_format(row, 3, formula, &looks.text)?;
    Ok(())
}

fn other(side: Side) -> Side {
    match side {
        Side::Works => Side::Fails,
        Side::Fails => Side::Works,
    }
}

/// A cell of the steps, from another sheet.
fn cell(step: usize, side: Side) -> String {
    let column = if side == Side::Works { 'H' } else { 'I' };
    format!("Steps!{column}{}", FIRST + step as u32 + 1)
}

/// What the steps of an answer come to now.
fn now(
    sheet: &mut Worksheet,
    at: (u32, u16),
    answer: &Answer,
    review: &Review,
    looks: &Looks,
) -> Result<(), XlsxError> {
    let outcome = |step: usize| review.steps.steps.get(step).map(|s| &s.outcome);
    match answer.end {
        Some(End::Chance(step, side)) => {
            let Some(Outcome::Chance(chance)) = outcome(step) else { return Ok(()) };
            let value = side.of(*chance).to_f64();
            let format = side_format(side, *chance, looks);
            live(sheet, at, &Part { text: cell(step, side), value }, &format)
        }
        Some(End::Figure(step)) => {
            let Some(Outcome::Figure(value, _)) = outcome(step) else { return Ok(()) };
            live(sheet, at, &Part { text: cell(step, Side::Works), value: value.to_f64() }, &looks.text)
        }
        Some(End::Certain(happens)) => {
            sheet.write_number_with_format(at.0, at.1, f64::from(u8::from(happens)), &looks.text).map(|_| ())
        }
        None => text(sheet, at, NO_ANSWER, &looks.note),
    }
}

/// One number for all texts that the review rests on.
fn digest(sources: &Sources) -> String {
    let mut hasher = Sha256::new();
    for file in sources.files() {
        hasher.update(file.text.as_bytes());
        hasher.update([0]);
    }
    hasher.finalize().iter().map(|byte| format!("{byte:02x}")).collect()
}
