//! The inputs: each datum of the steps once, in a cell with a name.

use super::gather::Review;
use super::looks::{Looks, heads, place_of, tall, text};
use crate::number::Real;
use crate::source::Sources;
use crate::steps::Formula;
use rust_xlsxwriter::{Worksheet, XlsxError};

/// An input: a datum of one step, or of the exposure that all share.
pub(super) struct Input {
    pub(super) symbol: String,
    pub(super) value: Real,
    pub(super) name: String,
    /// How the formula with numbers has it, and how the document does.
    text: String,
    written: String,
    thing: String,
    place: String,
    source: String,
    /// The step it belongs to; none for an exposure.
    pub(super) step: Option<usize>,
}

/// The data of all steps, each once.
pub(super) fn inputs(review: &Review, sources: &Sources) -> Vec<Input> {
    let mut found: Vec<Input> = Vec::new();
    for (at, step) in review.steps.steps.iter().enumerate() {
        let mut data = Vec::new();
        data_of(&step.works, &mut data);
        data_of(&step.fails, &mut data);
        for datum in data {
            let Formula::Datum { symbol, value, text, written, .. } = datum else { continue };
            let owner = (!is_shared(symbol)).then_some(at);
            if found.iter().any(|i| i.symbol == *symbol && i.value == *value && i.step == owner) {
                continue;
            }
            let own = review.sources.iter().find(|(place, _)| Some(*place) == step.place);
            found.push(Input {
                symbol: symbol.clone(),
                value: *value,
                name: format!("in_{}_{}", found.len() + 1, plain_word(symbol)),
                text: text.clone(),
                written: written.clone().unwrap_or_default(),
                thing: if owner.is_some() { step.thing.clone() } else { "exposure".to_string() },
                place: match owner {
                    Some(_) => step.place.map_or(String::new(), |p| place_of(sources, p)),
                    None => String::new(),
                },
                source: own.filter(|_| owner.is_some()).map_or(String::new(), |(_, source)| source.clone()),
                step: owner,
            });
        }
    }
    found
}

/// Whether a datum is of the exposure, which all steps share.
pub(super) fn is_shared(symbol: &str) -> bool {
    symbol == "t" || ["t(", "n(", "stress("].iter().any(|start| symbol.starts_with(start))
}

/// A symbol as a part of the name of a cell: plain letters and digits.
fn plain_word(symbol: &str) -> String {
    let word: String = match symbol {
        "λ" => "rate".to_string(),
        "θ" => "mean".to_string(),
        other => other.chars().map(|c| if c.is_ascii_alphanumeric() { c } else { '_' }).collect(),
    };
    word.trim_matches('_').chars().take(40).collect()
}

fn data_of<'f>(formula: &'f Formula, found: &mut Vec<&'f Formula>) {
    match formula {
        Formula::Datum { .. } => found.push(formula),
        Formula::Sum(list) | Formula::Product(list) | Formula::Function(_, list) => {
            list.iter().for_each(|f| data_of(f, found));
        }
        Formula::Quotient(a, b) | Formula::Power(a, b) => {
            data_of(a, found);
            data_of(b, found);
        }
        Formula::OneMinus(a) | Formula::ExpMinus(a) | Formula::Negate(a) => data_of(a, found),
        Formula::Whole(_)
        | Formula::Choose(..)
        | Formula::Step(..)
        | Formula::AtLeast(..)
        | Formula::Network(..) => {}
    }
}

/// Writes the sheet.
pub(super) fn input_sheet(sheet: &mut Worksheet, inputs: &[Input], looks: &Looks) -> Result<(), XlsxError> {
    sheet.set_name("Inputs")?;
    text(sheet, (0, 0), "Inputs: change one of the coloured cells, and every step follows", &looks.title)?;
    let columns = [
        ("No.", 6.0),
        ("Name of the cell", 20.0),
        ("Symbol", 22.0),
        ("Value", 18.0),
        ("In formulas", 20.0),
        ("As written", 26.0),
        ("Thing", 34.0),
        ("Place", 16.0),
        ("Source", 40.0),
    ];
    heads(sheet, 2, &columns, looks)?;
    for (at, input) in inputs.iter().enumerate() {
        let row = at as u32 + 3;
        sheet.write_number_with_format(row, 0, (at + 1) as f64, &looks.text)?;
        sheet.write_number_with_format(row, 3, input.value.to_f64(), &looks.input)?;
        let texts = [
            (1, input.name.as_str()),
            (2, input.symbol.as_str()),
            (4, input.text.as_str()),
            (5, input.written.as_str()),
            (6, input.thing.as_str()),
            (7, input.place.as_str()),
            (8, input.source.as_str()),
        ];
        for (column, words) in texts {
            text(sheet, (row, column), words, &looks.text)?;
        }
        sheet.set_row_height(row, tall(&texts, &columns))?;
    }
    Ok(())
}
