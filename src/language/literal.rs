//! Numbers with what belongs to them: `%`, a unit, `in 500`.

use super::expr::{Read, Reader};
use super::token::Tok;
use super::tree::*;
use super::words;
use crate::source::Span;

impl Reader<'_> {
    pub(super) fn add_literal(&mut self, literal: Literal, span: Span) -> ExprId {
        self.tree.literals.push(literal);
        let id = self.tree.literals.len() as u32 - 1;
        self.tree.add(Expr::Literal(id), span)
    }

    /// A number with what belongs to it: `%`, a unit, `in 500`.
    pub(crate) fn literal(&mut self) -> Read<ExprId> {
        let number = self.peek_span();
        self.at += 1;
        if let Some(problem) = self.run_together() {
            return Err(problem);
        }
        let mut span = number;
        let suffix = match self.peek() {
            Some(Tok::Percent) => {
                span = span.to(self.peek_span());
                self.at += 1;
                if self.peek() == Some(Tok::Slash) && self.touches(0) && self.unit_word(1).is_some() {
                    let word = self.unit_word(1).expect("looked at before");
                    let from = self.last_span();
                    self.at += 2;
                    span = span.to(self.last_span());
                    Suffix::Unit(Unit { form: UnitForm::PercentPer, word, span: from.to(self.last_span()) })
                } else {
                    Suffix::Percent
                }
            }
            Some(Tok::Slash) => match self.per_unit() {
                Some(unit) => {
                    span = span.to(unit.span);
                    Suffix::Unit(unit)
                }
                None => Suffix::None,
            },
            Some(Tok::Name { .. }) if self.word(0) == Some("in") => {
                if self.tok(1) == Some(Tok::Number) {
                    let second = self.tokens[self.at + 1].span;
                    self.at += 2;
                    span = span.to(second);
                    Suffix::In(second)
                } else {
                    Suffix::None
                }
            }
            Some(Tok::Name { .. }) => match self.unit_word(0) {
                Some(word) if self.tok(1) != Some(Tok::Number) || !self.is_inner_word() => {
                    let unit = self.peek_span();
                    self.at += 1;
                    span = span.to(unit);
                    Suffix::Unit(Unit { form: UnitForm::Plain, word, span: unit })
                }
                _ => Suffix::None,
            },
            _ => Suffix::None,
        };
        Ok(self.add_literal(Literal { number, suffix }, span))
    }

    /// `over 1000 h` after a probability: the word is no unit there.
    pub(super) fn is_inner_word(&self) -> bool {
        matches!(self.word(0), Some("over" | "error"))
    }

    /// A word that may be a unit.
    pub(super) fn unit_word(&self, ahead: usize) -> Option<Sym> {
        match self.tok(ahead)? {
            Tok::Name { sym, quoted } => {
                let text = self.tree.names.text(sym);
                // A line may begin with `year`, and a number may be counted in it.
                (quoted || text == "year" || !words::is_reserved(text)).then_some(sym)
            }
            _ => None,
        }
    }

    /// `/Mh` directly after a literal or `)`; with a space after the stroke it is division.
    pub(crate) fn per_unit(&mut self) -> Option<Unit> {
        if self.peek() != Some(Tok::Slash) || !self.touches(0) {
            return None;
        }
        let word = self.unit_word(1)?;
        let from = self.peek_span();
        self.at += 2;
        Some(Unit { form: UnitForm::Per, word, span: from.to(self.last_span()) })
    }
}
