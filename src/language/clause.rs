//! Clauses of items: `rate 18 /Mh, source "…"`.

use super::expr::{Read, Reader, later};
use super::token::Tok;
use super::tree::*;
use super::words::{self, ClauseWord};
use crate::source::{Code, Problem, Span};
use smallvec::{SmallVec, smallvec};

impl Reader<'_> {
    /// Whether a clause begins here: a clause word, or a word before a number.
    pub(crate) fn clause_starts(&self) -> bool {
        match self.word(0) {
            Some("fails") => self.word(1) != Some("when"),
            Some(word) if words::begins_clause(word) => true,
            Some(word) if !words::is_reserved(word) => {
                self.word_before_number() || self.misspelt_before_text(word)
            }
            _ => false,
        }
    }

    /// `sorce "sheet 7"`: no two things stand side by side like this.
    fn misspelt_before_text(&self, word: &str) -> bool {
        matches!(self.tok(1), Some(Tok::Name { quoted: true, .. }))
            && words::nearest(word, std::iter::once("source")).is_some()
    }

    fn word_before_number(&self) -> bool {
        matches!(self.tokens.get(self.at + 1).map(|t| t.tok), Some(Tok::Number))
            && !matches!(self.word(0), Some("all" | "any" | "a" | "an" | "in"))
    }

    /// The right side of a definition: an item, a changed copy, or an expression.
    pub(crate) fn right_side(&mut self) -> Read<ExprId> {
        if self.clause_starts() {
            let clause = self.clause()?;
            return self.item(smallvec![clause]);
        }
        let start = self.at;
        let value = self.expression()?;
        let goes_on = self.peek() == Some(Tok::Comma) || self.word(0) == Some("over") || self.uncertain();
        if !goes_on {
            return Ok(value);
        }
        if let Expr::Copy(_) | Expr::Settled(..) = self.tree.expr(value) {
            return self.changed_copy(value);
        }
        if self.is_thing(value) {
            return Err(self.stray_comma());
        }
        let clause = self.finish_probability(start, value)?;
        self.item(smallvec![clause])
    }

    /// Whether a value can only be a structure, so that no clause may follow it.
    fn is_thing(&self, value: ExprId) -> bool {
        matches!(
            self.tree.expr(self.tree.inside_groups(value)),
            Expr::Series(_)
                | Expr::Parallel(_)
                | Expr::AtLeast(..)
                | Expr::FailsWhen(_)
                | Expr::Mixed(_)
                | Expr::Routes(_)
        )
    }

    fn stray_comma(&self) -> Box<Problem> {
        let place = self.peek_span();
        Box::new(
            Problem::error(Code::UnexpectedToken, place, "a structure takes no clauses and no list after it")
                .mend("say how many of a list must work, as in `2 of (A, B, C)`; give data to its parts"),
        )
    }

    fn changed_copy(&mut self, copy: ExprId) -> Read<ExprId> {
        let mut clauses = Vec::new();
        while self.accept(Tok::Comma).is_some() {
            clauses.push(self.clause()?);
        }
        let span = self.tree.span(copy).to(self.last_span());
        let list = self.add_clauses(&clauses);
        Ok(self.tree.add(Expr::Changed(copy, list), span))
    }

    fn item(&mut self, mut clauses: SmallVec<[Clause; 2]>) -> Read<ExprId> {
        while self.accept(Tok::Comma).is_some() {
            clauses.push(self.clause()?);
        }
        let span = clauses[0].span.to(self.last_span());
        let list = self.add_clauses(&clauses);
        Ok(self.tree.add(Expr::Item(list), span))
    }

    pub(crate) fn add_clauses(&mut self, clauses: &[Clause]) -> List {
        let start = self.tree.clauses.len() as u32;
        self.tree.clauses.extend_from_slice(clauses);
        List { start, end: self.tree.clauses.len() as u32 }
    }

    /// Whether an uncertainty (`± 30%`, `.. 0.99`, `error factor 3`) follows.
    fn uncertain(&self) -> bool {
        matches!(self.peek(), Some(Tok::PlusMinus | Tok::Dots))
            || (self.word(0) == Some("error") && self.word(1) == Some("factor"))
    }

    /// One clause.
    pub(crate) fn clause(&mut self) -> Read<Clause> {
        let start = self.at;
        let span = self.peek_span();
        let Some(Tok::Name { sym, quoted }) = self.peek() else {
            if self.peek().is_none() {
                return Err(self.unexpected("a clause"));
            }
            return self.bare_probability(start);
        };
        let text = if quoted { "" } else { self.tree.names.text(sym) };
        if words::LATER_CLAUSES.contains(&text) {
            return Err(Box::new(later(span, &format!("the clause `{text}`"))));
        }
        let Some(word) = words::clause(text) else {
            let text = text.to_string();
            return self.unknown_word(start, sym, &text);
        };
        self.at += 1;
        self.clause_value(word, sym, span)
    }

    /// The value of a clause whose word has been read.
    pub(crate) fn clause_value(&mut self, word: ClauseWord, name: Sym, word_span: Span) -> Read<Clause> {
        let mut clause = Clause { word, name, word_span, span: word_span, value: None, over: None };
        match word {
            ClauseWord::Perfect => {}
            ClauseWord::Source => match self.peek() {
                Some(Tok::Name { sym, quoted: true }) => {
                    let span = self.peek_span();
                    self.at += 1;
                    clause.value = Some(self.tree.add(Expr::Name(sym), span));
                }
                _ => {
                    return Err(Box::new(
                        self.unexpected("a text in double quotes").mend("write `source \"maker's sheet 7\"`"),
                    ));
                }
            },
            _ => {
                if self.peek().is_none() || self.peek() == Some(Tok::Comma) {
                    let text = self.tree.names.text(name);
                    return Err(Box::new(
                        Problem::error(Code::UnfinishedLine, word_span, format!("`{text}` has no value"))
                            .mend(format!("write its value after it, as in `{}`", example(word))),
                    ));
                }
                clause.value = Some(self.expression()?);
                if word == ClauseWord::Fails {
                    clause.over = self.over()?;
                }
            }
        }
        self.no_uncertainty()?;
        clause.span = word_span.to(self.last_span());
        Ok(clause)
    }

    fn no_uncertainty(&self) -> Read<()> {
        if self.uncertain() {
            return Err(Box::new(later(self.peek_span(), "an uncertainty after a value")));
        }
        Ok(())
    }

    fn over(&mut self) -> Read<Option<ExprId>> {
        if self.word(0) != Some("over") {
            return Ok(None);
        }
        self.at += 1;
        Ok(Some(self.expression()?))
    }

    fn bare_probability(&mut self, start: usize) -> Read<Clause> {
        let value = self.expression()?;
        self.finish_probability(start, value)
    }

    fn finish_probability(&mut self, start: usize, value: ExprId) -> Read<Clause> {
        let over = self.over()?;
        self.no_uncertainty()?;
        let word_span = self.tree.span(value);
        let span = self.tokens[start].span.to(self.last_span());
        let name = self.tree.names.intern("");
        Ok(Clause { word: ClauseWord::Works, name, word_span, span, value: Some(value), over })
    }

    /// A word that begins no known clause: an attribute if a value follows, else an error.
    fn unknown_word(&mut self, start: usize, sym: Sym, text: &str) -> Read<Clause> {
        let span = self.peek_span();
        if !text.is_empty() && !words::is_reserved(text) && self.word_before_number() {
            self.at += 1;
            return self.clause_value(ClauseWord::Attribute, sym, span);
        }
        let ends = self.tokens.get(self.at + 1).is_none_or(|t| t.tok == Tok::Comma);
        let says = matches!(self.tokens.get(self.at + 1), Some(t) if matches!(t.tok, Tok::Name { quoted: true, .. }));
        if (ends || says) && !text.is_empty() && start > 0 {
            return Err(Box::new(unknown_clause(span, text, std::iter::empty())));
        }
        self.bare_probability(start)
    }
}

/// The error for a word that begins no clause.
pub(crate) fn unknown_clause<'a>(span: Span, text: &str, declared: impl Iterator<Item = &'a str>) -> Problem {
    let known =
        words::CLAUSES.iter().map(|(w, _)| *w).chain(words::LATER_CLAUSES.iter().copied()).chain(declared);
    let problem = Problem::error(Code::UnknownClause, span, format!("no clause begins with `{text}`"));
    match words::nearest(text, known) {
        Some(near) => problem.mend(format!("did you mean `{near}`?")),
        None => problem.mend(format!(
            "clauses are {}; other words are declared with `attribute`",
            words::CLAUSES.iter().map(|(w, _)| format!("`{w}`")).collect::<Vec<_>>().join(", ")
        )),
    }
}

fn example(word: ClauseWord) -> &'static str {
    match word {
        ClauseWord::Works | ClauseWord::Perfect => "0.98",
        ClauseWord::Fails => "fails 0.02",
        ClauseWord::Rate => "rate 12 /Mh",
        ClauseWord::Mttf => "mttf 50 kh",
        ClauseWord::Mtbf => "mtbf 50 kh",
        ClauseWord::Duty => "duty 30%",
        ClauseWord::Stress => "stress 8",
        ClauseWord::Source => "source \"maker's sheet 7\"",
        ClauseWord::Attribute => "mass 3.2 kg",
    }
}
