//! Single cells of a table: values, names, and what a spreadsheet made of them.

use super::expr::Read;
use super::grid::{CellKind, GridForm, GridReader, span_of};
use super::header::Column;
use super::read::{Source, read_expression};
use super::tree::*;
use crate::source::{Code, Problem, Span};

/// A number with a decimal comma, as it is written with a point: `0,25 %`.
fn with_decimal_comma(text: &str) -> Option<String> {
    let (whole, part) = text.split_once(',')?;
    let digits = |text: &str| !text.is_empty() && text.bytes().all(|b| b.is_ascii_digit());
    let end = part.find(|c: char| !c.is_ascii_digit()).unwrap_or(part.len());
    let rest = part[end..].trim_start();
    let unit =
        rest.is_empty() || rest.starts_with(['%', '/', 'e', 'E']) || rest.chars().all(char::is_alphabetic);
    (digits(whole.strip_prefix('-').unwrap_or(whole)) && digits(&part[..end]) && unit)
        .then(|| format!("{whole}.{part}"))
}

impl<'a> GridReader<'_, 'a> {
    /// The value in a cell.
    pub(super) fn value(&mut self, row: usize, column: usize) -> Read<ExprId> {
        let cell = self.cell(row, column);
        if let Some(problem) = self.no_value(row, column) {
            return Err(Box::new(problem));
        }
        read_expression(cell, self.grid.form == GridForm::Markdown, self.tree)
    }

    /// What is wrong where a value should be and the spreadsheet shows something else.
    pub(super) fn no_value(&self, row: usize, column: usize) -> Option<Problem> {
        let cell = self.cell(row, column);
        let (cause, mend) = match self.grid.cells.kind(row, column) {
            CellKind::Text | CellKind::Number => return None,
            CellKind::Date => (
                "a date or a time stands where a value should be".to_string(),
                "format the cell as a number or as text, and type the value again",
            ),
            CellKind::Logical => {
                (format!("{} stands where a value should be", cell.text), "write a number, or clear the cell")
            }
            CellKind::Failed => (
                format!("the formula of this cell fails: \"{}\"", cell.text),
                "mend the formula, or write the value itself",
            ),
            CellKind::NoValue => (
                "this cell holds a formula, and the file does not hold its value".to_string(),
                "open the file in a spreadsheet program and save it there, or write the value itself",
            ),
        };
        Some(Problem::error(Code::TableCell, span_of(cell), cause).mend(mend))
    }

    /// What is wrong where a name should be and the spreadsheet shows something else.
    pub(super) fn name_of_text(&self, row: usize, column: usize) -> Read<()> {
        let cell = self.cell(row, column);
        let made = match self.grid.cells.kind(row, column) {
            CellKind::Text => return Ok(()),
            CellKind::Number => "a number",
            CellKind::Date => "a date",
            CellKind::Logical => "true or false",
            CellKind::Failed | CellKind::NoValue => {
                return self.no_value(row, column).map_or(Ok(()), |problem| Err(Box::new(problem)));
            }
        };
        let message = format!("the spreadsheet has made {made} of the name that was typed here");
        Err(Box::new(
            Problem::error(Code::TableCell, span_of(cell), message)
                .mend("format the cell as text and type the name again")
                .mend("or put an apostrophe before it: `'1E5`"),
        ))
    }

    /// Whether the name of a row is one; an error if the spreadsheet has made
    /// something else of it. `false` for a row that has nothing else to say.
    pub(super) fn name_kept(&mut self, row: usize) -> Read<bool> {
        let Some(at) = self.columns.iter().position(|c| matches!(c, Column::Name)) else { return Ok(false) };
        if self.grid.form == GridForm::Markdown || self.grid.cells.kind(row, at) == CellKind::Text {
            return Ok(true);
        }
        let says_more = (0..self.columns.len()).any(|c| self.columns[c].defines() && !self.blank(row, c));
        let wrong = self.name_of_text(row, at);
        if says_more {
            return wrong.map(|()| true);
        }
        let asks = self.columns.iter().any(|c| matches!(c, Column::Ask | Column::Met));
        if let (Err(problem), true) = (wrong, asks) {
            let problem =
                Problem { message: format!("{}, and its row takes no part", problem.message), ..*problem };
            self.problems.push(Problem { level: crate::source::Level::Remark, ..problem });
        }
        Ok(false)
    }

    /// Whether a cell of the `perfect` column says yes.
    pub(super) fn yes(&self, cell: Source<'a>) -> Read<bool> {
        match cell.text.to_lowercase().as_str() {
            "yes" | "y" | "x" | "true" | "1" | "✓" | "✔" | "perfect" => Ok(true),
            "no" | "n" | "false" | "0" | "-" => Ok(false),
            _ => Err(Box::new(
                Problem::error(Code::TableCell, span_of(cell), "a part is `perfect` or not")
                    .mend("write `yes`, or leave the cell empty"),
            )),
        }
    }

    /// The value of a clause cell.
    pub(super) fn clause_value(&mut self, row: usize, column: usize, unit: Option<Unit>) -> Read<ExprId> {
        let span = span_of(self.cell(row, column));
        if let Some(point) = with_decimal_comma(self.cell(row, column).text) {
            return Err(Box::new(
                Problem::error(
                    Code::MalformedNumber,
                    span,
                    "a number is written with a point, not with a comma",
                )
                .mend(format!("write `{point}`"))
                .mend("in a spreadsheet, format the cell as a number and type it again"),
            ));
        }
        let value = self.value(row, column)?;
        if let Expr::Item(_) | Expr::Changed(..) = self.tree.expr(value) {
            return Err(Box::new(
                Problem::error(Code::TableCell, span, "this cell holds more than a value")
                    .mend("its clause stands in the header: write the value alone"),
            ));
        }
        match unit {
            Some(unit) => self.with_unit(value, unit, span),
            None => Ok(value),
        }
    }

    /// The header's unit, unless the cell brings its own.
    fn with_unit(&mut self, value: ExprId, unit: Unit, span: Span) -> Read<ExprId> {
        if let Expr::Literal(id) = self.tree.expr(value) {
            let literal = &mut self.tree.literals[id as usize];
            if literal.suffix == Suffix::None {
                literal.suffix = Suffix::Unit(unit);
                return Ok(value);
            }
            return Err(Box::new(
                Problem::error(
                    Code::TableCell,
                    span,
                    "the header gives the unit, and this cell has one of its own",
                )
                .label(unit.span, "the header's unit")
                .mend("write the number alone"),
            ));
        }
        self.tree.units.push(unit);
        let id = self.tree.units.len() as u32 - 1;
        Ok(self.tree.add(Expr::WithUnit(value, id), span))
    }
}
