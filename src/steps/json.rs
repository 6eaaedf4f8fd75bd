//! Steps as JSON: the data that every other form is drawn from.

use super::list::{Outcome, StepList};
use super::render::shown;
use crate::source::Sources;
use serde::Serialize;

#[derive(Serialize)]
struct JsonStep {
    number: usize,
    thing: String,
    file: Option<String>,
    line: Option<usize>,
    #[serde(skip_serializing_if = "Option::is_none")]
    sheet: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    cell: Option<String>,
    rule: &'static str,
    source: &'static str,
    left: String,
    symbols: String,
    numbers: String,
    /// Data that the note writes in another way: `λ = 18 /Mh = 1.8e-5 /h`.
    data: Vec<String>,
    result: String,
    /// Both tails to 15 digits, as text: JSON readers round numbers.
    works: Option<String>,
    fails: Option<String>,
    value: Option<String>,
    rests_on: Vec<usize>,
}

#[derive(Serialize)]
struct JsonSteps {
    steps: Vec<JsonStep>,
    assumptions: Vec<String>,
    remarks: Vec<String>,
}

/// The steps as one JSON object.
pub fn json(list: &StepList, sources: &Sources, digits: u8) -> String {
    let texts = shown(list, sources, digits);
    let steps = list
        .steps
        .iter()
        .zip(texts)
        .enumerate()
        .map(|(i, (step, text))| {
            let cell = step.place.and_then(|p| sources.cell(p));
            let file = step.place.and_then(|p| sources.find(p)).map(|(file, _)| file.name.clone());
            let line = step.place.filter(|_| cell.is_none()).and_then(|p| sources.line(p)).map(|l| l.1);
            let (works, fails, value) = match &step.outcome {
                Outcome::Chance(c) => (Some(super::plain(c.works())), Some(super::plain(c.fails())), None),
                Outcome::Figure(v, _) => (None, None, Some(super::plain(*v))),
            };
            JsonStep {
                number: i + 1,
                thing: text.thing,
                file,
                line,
                sheet: cell.and_then(|c| c.sheet).map(str::to_string),
                cell: cell.map(|c| c.cell()),
                rule: text.rule,
                source: text.source,
                left: text.left,
                symbols: text.symbols,
                numbers: text.numbers,
                data: text.data,
                result: text.result,
                works,
                fails,
                value,
                rests_on: text.rests_on,
            }
        })
        .collect();
    let all = JsonSteps { steps, assumptions: list.assumptions.clone(), remarks: list.remarks.clone() };
    serde_json::to_string_pretty(&all).unwrap_or_default()
}
