//! The steps: a row each, with live formulas beside tieback's values.

use super::gather::Review;
use super::inputs::{Input, is_shared};
use super::looks::{Looks, heads, live, place_of, side_format, tall, text};
use super::review_workbook::FIRST;
use super::sheet_formula::{Cells, Part, Tails, tails};
use crate::number::Real;
use crate::source::Sources;
use crate::steps::{Formula, Outcome, Side, Step, shown};
use rust_xlsxwriter::{Format, Formula as SheetFormula, Worksheet, XlsxError};

/// Relative difference up to which a spreadsheet's value and tieback's agree.
const AGREES: f64 = 1e-9;
/// The columns of the live values, counted from 0.
const WORKS: u16 = 7;
const FAILS: u16 = 8;

/// A step as it goes into the sheet.
pub(super) struct Row {
    works: Option<Part>,
    fails: Option<Part>,
}

/// Where the formulas of one step point to.
struct Pointing<'a> {
    inputs: &'a [Input],
    steps: &'a [Step],
    step: usize,
}

impl Cells for Pointing<'_> {
    fn datum(&self, symbol: &str, value: Real) -> Option<Part> {
        let owner = (!is_shared(symbol)).then_some(self.step);
        let input = self.inputs.iter().find(|i| i.symbol == symbol && i.value == value && i.step == owner)?;
        Some(Part { text: input.name.clone(), value: value.to_f64() })
    }

    fn step(&self, step: usize) -> Option<(Part, Part)> {
        let Outcome::Chance(chance) = self.steps.get(step)?.outcome else { return None };
        let row = FIRST + step as u32 + 1;
        let cell = |column: char, value: Real| Part { text: format!("{column}{row}"), value: value.to_f64() };
        Some((cell('H', chance.works()), cell('I', chance.fails())))
    }
}

/// The formulas of all steps; none where no formula of doubles comes to the value.
pub(super) fn rows(review: &Review, inputs: &[Input]) -> Vec<Row> {
    let steps = &review.steps.steps;
    let mut rows = Vec::with_capacity(steps.len());
    for (at, step) in steps.iter().enumerate() {
        let cells = Pointing { inputs, steps, step: at };
        let near = |part: &Part, value: Real| {
            let value = value.to_f64();
            (part.value - value).abs() <= AGREES * value.abs().max(f64::MIN_POSITIVE)
        };
        let made = |formula: &Formula| -> Option<Tails> { tails(formula, &cells) };
        rows.push(match &step.outcome {
            Outcome::Chance(chance) => {
                let works = made(&step.works).map(|t| t.value).filter(|p| near(p, chance.works()));
                let fails = made(&step.fails).map(|t| t.value).filter(|p| near(p, chance.fails()));
                match (works, fails) {
                    (Some(works), Some(fails)) => Row { works: Some(works), fails: Some(fails) },
                    _ => Row { works: None, fails: None },
                }
            }
            Outcome::Figure(value, _) => {
                Row { works: made(&step.works).map(|t| t.value).filter(|p| near(p, *value)), fails: None }
            }
        });
    }
    rows
}

/// Writes the sheet.
pub(super) fn step_sheet(
    sheet: &mut Worksheet,
    review: &Review,
    sources: &Sources,
    rows: &[Row],
    looks: &Looks,
) -> Result<(), XlsxError> {
    sheet.set_name("Steps")?;
    text(sheet, (0, 0), "Steps: each is a formula on the inputs and on the steps before it", &looks.title)?;
    let note = "R works, F fails. \"agrees\": the live formula comes to tieback's value within 1 part in 10^9; after a change of an \
                input it says \"changed\". \"value only\": no formula of a spreadsheet holds this step; it does not follow a change.";
    text(sheet, (1, 0), note, &Format::new().set_italic())?;
    let columns = [
        ("No.", 6.0),
        ("Thing", 30.0),
        ("Place", 14.0),
        ("Rule", 20.0),
        ("Source of the rule", 30.0),
        ("Formula", 46.0),
        ("With numbers", 46.0),
        ("R, or the figure: live", 20.0),
        ("F: live", 15.0),
        ("R: tieback", 20.0),
        ("F: tieback", 15.0),
        ("Agreement", 12.0),
    ];
    heads(sheet, FIRST - 1, &columns, looks)?;
    sheet.set_paper_size(8); // twelve columns are too many for A4
    let digits = (review.digits + 3).min(15);
    for (at, (step, words)) in
        review.steps.steps.iter().zip(shown(&review.steps, sources, digits)).enumerate()
    {
        let row = FIRST + at as u32;
        sheet.write_number_with_format(row, 0, (at + 1) as f64, &looks.text)?;
        let place = step.place.map_or(String::new(), |p| place_of(sources, p));
        let formula = format!("{} = {}", words.left, words.symbols);
        let texts = [
            (1, words.thing.as_str()),
            (2, &place),
            (3, words.rule),
            (4, words.source),
            (5, &formula),
            (6, &words.numbers),
        ];
        for (column, words) in texts {
            text(sheet, (row, column), words, &looks.text)?;
        }
        sheet.set_row_height(row, tall(&texts, &columns))?;
        step_values(sheet, row, step, &rows[at], looks)?;
    }
    Ok(())
}

fn step_values(
    sheet: &mut Worksheet,
    row: u32,
    step: &Step,
    made: &Row,
    looks: &Looks,
) -> Result<(), XlsxError> {
    let here = row + 1;
    let (works, fails) = match &step.outcome {
        Outcome::Chance(chance) => (
            (chance.works(), side_format(Side::Works, *chance, looks)),
            Some((chance.fails(), side_format(Side::Fails, *chance, looks))),
        ),
        Outcome::Figure(value, _) => ((*value, looks.text.clone()), None),
    };
    let sides = [(WORKS, Some(&works), &made.works), (FAILS, fails.as_ref(), &made.fails)];
    for (column, side, part) in sides {
        let Some((value, format)) = side else { continue };
        match part {
            Some(part) => live(sheet, (row, column), part, format)?,
            None => {
                sheet.write_number_with_format(row, column, value.to_f64(), format)?;
            }
        }
        sheet.write_number_with_format(row, column + 2, value.to_f64(), format)?;
    }
    if made.works.is_none() {
        return text(sheet, (row, 11), "value only", &looks.note);
    }
    let near = |a: char, b: char| format!("ABS({a}{here}-{b}{here})<={AGREES:e}*ABS({b}{here})");
    let test = match fails {
        Some(_) => format!("AND({},{})", near('H', 'J'), near('I', 'K')),
        None => near('H', 'J'),
    };
    let formula = SheetFormula::new(format!("=IF({test},\"agrees\",\"changed\")")).set_result("agrees");
    sheet.write_formula_with_format(row, 11, formula, &looks.text)?;
    Ok(())
}
