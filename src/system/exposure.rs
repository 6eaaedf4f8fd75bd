//! How long and how often: the mission, or what a question gives instead.

use super::model::{Model, Out};
use super::quantity::{Base, Dim, Quantity};
use crate::language::{ExprId, Line, Phase, Sym};
use crate::source::{Code, Problem, Span};

/// One phase or one kind of exposure.
#[derive(Clone, PartialEq, Debug)]
pub struct Part {
    /// The phase's name.
    pub name: Option<Sym>,
    /// Time, or which declared exposure.
    pub base: Base,
    /// How much of it, in base units.
    pub amount: Quantity,
    /// The factor on the pace of ageing, where one is given.
    pub stress: Option<Quantity>,
    /// How the amount was written.
    pub written: ExprId,
}

/// An exposure: what things have to bear.
#[derive(Clone, PartialEq, Debug)]
pub struct Exposure {
    /// Its parts, in the order they were written.
    pub parts: Vec<Part>,
    /// Whether a question gave it in place of the mission.
    pub asked: bool,
    /// Where it stands.
    pub span: Span,
}

impl Exposure {
    /// The parts that are counted in `base`.
    pub fn of(&self, base: Base) -> impl Iterator<Item = &Part> {
        self.parts.iter().filter(move |p| p.base == base)
    }
}

impl Model<'_> {
    pub(super) fn settle_mission(&mut self) {
        let mut seen = None;
        for index in 0..self.tree.statements.len() {
            let statement = &self.tree.statements[index];
            // A mission that cannot be read is none: what ages rests on that line.
            let first = self.sources.text(statement.span).split_whitespace().next();
            if matches!(statement.line, Line::Broken(_)) && first == Some("mission") && self.mission.is_none()
            {
                self.mission = Some(Err(self.broken_line("the mission", statement.span)));
            }
            if let Line::Mission(phases) = &statement.line
                && self.first_setting(&mut seen, "mission", statement.span)
            {
                self.mission = Some(self.exposure(phases, false, statement.span));
            }
        }
        if let Some(fault) = self.twice("mission") {
            self.mission = Some(Err(fault));
        }
    }

    /// Reads an exposure: `10 h, 4 start`, or phases.
    ///
    /// # Errors
    /// A part that is neither a time nor a declared exposure, or below zero;
    /// the same exposure twice without phase names.
    pub fn exposure(&mut self, phases: &[Phase], asked: bool, span: Span) -> Out<Exposure> {
        let mut parts: Vec<Part> = Vec::with_capacity(phases.len());
        for phase in phases {
            let amount = self.figure(phase.amount)?;
            let place = self.tree.span(phase.amount);
            let base = match amount.dim.single() {
                Some((base @ (Base::Time | Base::Word(_)), 1)) if self.is_exposure(base) => base,
                _ => return Err(self.no_exposure(&amount, place)),
            };
            if amount.value.is_negative() {
                return Err(self.fault(
                    Problem::error(Code::OutsideRange, place, "an exposure is not below zero")
                        .mend("write it without the minus"),
                ));
            }
            let stress = phase.stress.map(|s| self.factor(s, "stress", None)).transpose()?;
            if phase.name.is_none()
                && let Some(twice) = parts.iter().find(|p| p.base == base && p.name.is_none())
            {
                let first = self.tree.span(twice.written);
                return Err(self.fault(
                    Problem::error(Code::BadSetting, place, "the same exposure is given twice")
                        .label(first, "first here")
                        .mend("add them, or name them as phases: `mission climb 0.2 h, cruise 9 h`"),
                ));
            }
            if phase.name.is_some()
                && let Some(twice) = parts.iter().find(|p| p.base == base && p.name == phase.name)
            {
                let first = self.tree.span(twice.written);
                let name = phase.name.map_or(String::new(), |n| self.written(n));
                return Err(self.fault(
                    Problem::error(Code::BadSetting, place, format!("the phase `{name}` is given twice"))
                        .label(first, "first here")
                        .mend("give each phase a name of its own, or add the two"),
                ));
            }
            parts.push(Part { name: phase.name, base, amount, stress, written: phase.amount });
        }
        Ok(Exposure { parts, asked, span })
    }

    fn is_exposure(&self, base: Base) -> bool {
        match base {
            Base::Time => true,
            Base::Word(word) => self.units.exposures.contains_key(&word),
            Base::Mass => false,
        }
    }

    fn no_exposure(&mut self, amount: &Quantity, place: Span) -> super::model::Fault {
        let what = self.units.describe(&amount.dim, &self.tree.names);
        let problem = if amount.dim.is_none() {
            Problem::error(Code::MissingUnit, place, "an exposure needs its unit")
                .mend("write `10 h`, `2 yr`, or a declared one such as `4 start`")
        } else {
            Problem::error(
                Code::WrongUnit,
                place,
                format!("an exposure is a time or a declared exposure, and this is {what}"),
            )
            .mend("write `10 h`, `2 yr`, or declare one with `exposure start`")
        };
        self.fault(problem)
    }

    /// A bare factor above zero: `stress 4`, `duty 30%`.
    pub(super) fn factor(&mut self, value: ExprId, word: &str, most: Option<f64>) -> Out<Quantity> {
        let factor = self.figure(value)?;
        let place = self.tree.span(value);
        if factor.dim != Dim::NONE {
            let what = self.units.describe(&factor.dim, &self.tree.names);
            return Err(self.fault(
                Problem::error(
                    Code::WrongUnit,
                    place,
                    format!("`{word}` is a bare factor, and this is {what}"),
                )
                .mend(format!("write `{word} 0.5` without a unit")),
            ));
        }
        let f = factor.value.to_f64();
        if f < 0.0 || most.is_some_and(|m| f > m) {
            let range = if most.is_some() { "from 0 to 100%" } else { "zero or more" };
            return Err(self.fault(
                Problem::error(Code::OutsideRange, place, format!("`{word}` is {range}")).mend(
                    match f < 0.0 {
                        true => "write it without the minus",
                        false => "a factor on the pace of ageing above 1 is written with `stress`",
                    },
                ),
            ));
        }
        Ok(factor)
    }
}
