//! Lines: definitions, questions, requirements and settings.

use super::expr::{Read, Reader};
use super::token::{Tok, Token};
use super::tree::*;
use super::words;
use crate::source::{Code, Problem, Span};
use smallvec::SmallVec;

/// What a run of tokens begins.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Begins {
    /// `name =`, `n1, n2 =`, `name(p) =`
    Definition,
    /// `mission`, `require`, …
    Starter,
    /// Anything else.
    Other,
}

/// How a line begins: what closes an open line before it, for recovery.
pub(crate) fn begins(tokens: &[Token], names: &Names) -> Begins {
    match tokens.first().map(|t| t.tok) {
        Some(Tok::Name { sym, quoted }) => {
            if definition_head(tokens).is_some() {
                Begins::Definition
            } else if !quoted && words::STARTERS.contains(&names.text(sym)) {
                Begins::Starter
            } else {
                Begins::Other
            }
        }
        _ => Begins::Other,
    }
}

/// The number of tokens up to and with the `=` of a definition.
fn definition_head(tokens: &[Token]) -> Option<usize> {
    let is_name = |i: usize| matches!(tokens.get(i).map(|t| t.tok), Some(Tok::Name { .. }));
    let is = |i: usize, tok: Tok| tokens.get(i).map(|t| t.tok) == Some(tok);
    if !is_name(0) {
        return None;
    }
    let mut at = 1;
    if is(1, Tok::Open) {
        at = 2;
        while is_name(at) {
            at += 1;
            if is(at, Tok::Comma) {
                at += 1;
            }
        }
        if !is(at, Tok::Close) {
            return None;
        }
        at += 1;
    } else {
        while is(at, Tok::Comma) && is_name(at + 1) {
            at += 2;
        }
    }
    is(at, Tok::Equals).then_some(at + 1)
}

/// The names that a line in error would have defined: lists of names before `=`
/// that are whole, so that half of a misread name is not taken for a definition.
pub(crate) fn names_before_equals(tokens: &[Token]) -> Vec<(Sym, Span)> {
    let mut names = Vec::new();
    let mut from = 0;
    for (equals, _) in tokens.iter().enumerate().filter(|(_, t)| t.tok == Tok::Equals) {
        names.extend(whole_list(&tokens[from..equals]).unwrap_or_default());
        from = equals + 1;
    }
    names
}

/// `a`, `a, b` or `a(p, q)`.
fn whole_list(tokens: &[Token]) -> Option<Vec<(Sym, Span)>> {
    let name = |t: &Token| match t.tok {
        Tok::Name { sym, .. } => Some((sym, t.span)),
        _ => None,
    };
    if tokens.get(1).is_some_and(|t| t.tok == Tok::Open) {
        return Some(vec![name(&tokens[0])?]);
    }
    let commas = tokens.iter().skip(1).step_by(2).all(|t| t.tok == Tok::Comma);
    (commas && tokens.len() % 2 == 1).then_some(())?;
    tokens.iter().step_by(2).map(name).collect()
}

impl Reader<'_> {
    /// The whole line; `asks` when a question mark ends it.
    pub(crate) fn line(&mut self, asks: bool) -> Read<Line> {
        let line = match begins(self.tokens, &self.tree.names) {
            Begins::Definition => self.definition(asks)?,
            Begins::Starter => self.starter(asks)?,
            Begins::Other => self.question(asks)?,
        };
        if self.peek().is_some() {
            return Err(self.left_over());
        }
        Ok(line)
    }

    fn left_over(&self) -> Box<Problem> {
        if self.peek() == Some(Tok::Close) {
            return Box::new(
                Problem::error(Code::UnbalancedParenthesis, self.peek_span(), "this `)` closes nothing")
                    .mend("delete it, or open its parenthesis before"),
            );
        }
        let mut problem = self.missing_operator("an operator or the end of the line");
        if let Some(word) = self.word(0).filter(|w| words::begins_clause(w)) {
            problem = Box::new(problem.mend(format!("put a comma before `{word}`")));
        }
        if self.peek() == Some(Tok::Equals) {
            problem = Box::new(problem.mend("a definition is `name = …`, with nothing else before the `=`"));
        }
        problem
    }

    fn definition(&mut self, asks: bool) -> Read<Line> {
        let mut names = SmallVec::new();
        let mut params = None;
        while let Some(Tok::Name { sym, quoted }) = self.peek() {
            let span = self.peek_span();
            self.definable(sym, quoted, span)?;
            self.at += 1;
            names.push((sym, span));
            if self.peek() == Some(Tok::Open) {
                params = Some(self.parameters()?);
            }
            if self.accept(Tok::Comma).is_none() {
                break;
            }
        }
        if self.accept(Tok::Equals).is_none() {
            return Err(self.unexpected("`=`"));
        }
        if params.is_some() {
            self.callable(names[0])?;
        }
        if self.peek().is_none() {
            return Err(self.unexpected("a right side"));
        }
        let value = self.right_side()?;
        let display = self.display()?;
        if display.is_some() && !asks {
            return Err(Box::new(
                Problem::error(
                    Code::MalformedQuestion,
                    self.last_span(),
                    "`in` chooses how an answer is shown, and nothing is asked",
                )
                .mend("end the line with `?` to ask"),
            ));
        }
        Ok(Line::Define { names, params, value, display })
    }

    fn definable(&self, sym: Sym, quoted: bool, span: Span) -> Read<()> {
        let text = self.tree.names.text(sym);
        if !quoted && words::is_reserved(text) {
            return Err(Box::new(
                Problem::error(
                    Code::ReservedWord,
                    span,
                    format!("`{text}` is a word of the language and cannot be defined"),
                )
                .mend(format!("choose another name, or write \"{text}\" in double quotes")),
            ));
        }
        Ok(())
    }

    /// Question names and functions cannot be defined with parameters.
    fn callable(&self, (sym, span): (Sym, Span)) -> Read<()> {
        let text = self.tree.names.text(sym);
        let taken =
            [words::QUESTIONS, words::LATER_QUESTIONS, words::FUNCTIONS].iter().any(|l| l.contains(&text));
        if taken {
            return Err(Box::new(
                Problem::error(
                    Code::ReservedWord,
                    span,
                    format!("`{text}(…)` is a question or a function already"),
                )
                .mend("choose another name for the structure"),
            ));
        }
        Ok(())
    }

    fn parameters(&mut self) -> Read<Vec<(Sym, Span)>> {
        self.at += 1;
        let mut params: Vec<(Sym, Span)> = Vec::new();
        while let Some(Tok::Name { sym, quoted }) = self.peek() {
            let span = self.peek_span();
            self.definable(sym, quoted, span)?;
            if let Some((_, first)) = params.iter().find(|(s, _)| *s == sym) {
                let text = self.tree.names.text(sym);
                return Err(Box::new(
                    Problem::error(Code::DefinedTwice, span, format!("the parameter `{text}` stands twice"))
                        .label(*first, "first here")
                        .mend("give each parameter a name of its own"),
                ));
            }
            params.push((sym, span));
            self.at += 1;
            if self.accept(Tok::Comma).is_none() {
                break;
            }
        }
        if self.accept(Tok::Close).is_none() {
            return Err(self.unexpected("the name of a parameter or `)`"));
        }
        Ok(params)
    }

    /// `in chances`, `in %`, `in yr`.
    pub(crate) fn display(&mut self) -> Read<Option<Display>> {
        if self.word(0) != Some("in") {
            return Ok(None);
        }
        self.at += 1;
        let span = self.peek_span();
        let display = match self.peek() {
            Some(Tok::Percent) => {
                self.at += 1;
                if self.peek() == Some(Tok::Slash)
                    && let Some(unit) = self.per_unit()
                {
                    Display::Unit(Unit {
                        form: UnitForm::PercentPer,
                        word: unit.word,
                        span: span.to(unit.span),
                    })
                } else {
                    Display::Percent
                }
            }
            Some(Tok::Slash) => match self.per_unit() {
                Some(unit) => Display::Unit(unit),
                None => return Err(self.unexpected("a unit")),
            },
            Some(Tok::Name { sym, quoted: false }) => {
                self.at += 1;
                if self.tree.names.text(sym) == "chances" {
                    Display::Chances
                } else {
                    Display::Unit(Unit { form: UnitForm::Plain, word: sym, span })
                }
            }
            _ => return Err(self.unexpected("`chances`, `%` or a unit")),
        };
        Ok(Some(display))
    }

    fn question(&mut self, asks: bool) -> Read<Line> {
        if self.peek().is_none() {
            return Err(Box::new(
                Problem::error(Code::MalformedQuestion, self.end, "nothing is asked before this `?`")
                    .mend("write the question left of it, as in `R(pump) ?`"),
            ));
        }
        if !asks && self.clause_starts() {
            return Err(Box::new(
                Problem::error(
                    Code::UnexpectedToken,
                    self.peek_span(),
                    "a clause stands without the name of its item",
                )
                .mend("begin the line with `name =`"),
            ));
        }
        let value = self.expression()?;
        let display = self.display()?;
        if !asks && self.peek().is_none() {
            let span = self.tokens[0].span.to(self.last_span());
            return Err(Box::new(
                Problem::error(Code::MalformedQuestion, span, "this line neither defines nor asks")
                    .mend("end it with `?` to ask, or begin it with `name =` to define"),
            ));
        }
        Ok(Line::Ask { value, display })
    }

    fn starter(&mut self, asks: bool) -> Read<Line> {
        let span = self.peek_span();
        let word = self.word(0).unwrap_or_default().to_string();
        if self.tokens.get(1).is_some_and(|t| matches!(t.tok, Tok::Equals | Tok::Comma)) {
            let Some(Tok::Name { sym, quoted }) = self.peek() else { return Err(self.unexpected("a line")) };
            self.definable(sym, quoted, span)?;
        }
        self.at += 1;
        if asks && word != "require" {
            return Err(Box::new(
                Problem::error(
                    Code::MalformedQuestion,
                    span,
                    format!("`{word}` sets something and cannot ask"),
                )
                .mend("a setting stands on a line of a block, without `?`"),
            ));
        }
        match word.as_str() {
            "mission" => self.mission().map(Line::Mission),
            "digits" => Ok(Line::Digits(self.expression()?)),
            "year" => Ok(Line::Year(self.expression()?)),
            "exposure" => self.exposures(),
            "attribute" => self.attributes(),
            "require" => self.requirement(),
            _ => self.used().map(Line::Use),
        }
    }

    /// `"parts.xlsx" sheet "Power" as P`
    fn used(&mut self) -> Read<Use> {
        let path = self.quoted("the path of a file in double quotes", "write `use \"parts.xlsx\"`")?;
        let mut used = Use { path, sheet: None, prefix: None };
        loop {
            match self.word(0) {
                Some("sheet") if used.sheet.is_none() => {
                    self.at += 1;
                    let mend = "write `use \"parts.xlsx\" sheet \"Power\"`";
                    used.sheet = Some(self.quoted("the name of a sheet in double quotes", mend)?);
                }
                Some("as") if used.prefix.is_none() => {
                    self.at += 1;
                    let span = self.peek_span();
                    let Some(Tok::Name { sym, quoted }) = self.peek() else {
                        return Err(self.unexpected("a name to stand before those of the file"));
                    };
                    self.definable(sym, quoted, span)?;
                    self.at += 1;
                    used.prefix = Some((sym, span));
                }
                _ => return Ok(used),
            }
        }
    }

    fn quoted(&mut self, wanted: &str, mend: &str) -> Read<(Sym, Span)> {
        let span = self.peek_span();
        match self.peek() {
            Some(Tok::Name { sym, quoted: true }) => {
                self.at += 1;
                Ok((sym, span))
            }
            _ => Err(Box::new(self.unexpected(wanted).mend(mend))),
        }
    }

    fn mission(&mut self) -> Read<Vec<Phase>> {
        let mut phases = Vec::new();
        loop {
            let named = matches!(self.peek(), Some(Tok::Name { .. }))
                && matches!(self.tokens.get(self.at + 1).map(|t| t.tok), Some(Tok::Number));
            let name = match self.peek() {
                Some(Tok::Name { sym, .. }) if named => {
                    self.at += 1;
                    Some(sym)
                }
                _ => None,
            };
            let amount = self.expression()?;
            let stress = match self.word(0) {
                Some("stress") => {
                    self.at += 1;
                    Some(self.expression()?)
                }
                _ => None,
            };
            phases.push(Phase { name, amount, stress });
            if self.accept(Tok::Comma).is_none() {
                return Ok(phases);
            }
        }
    }

    fn exposures(&mut self) -> Read<Line> {
        let mut words = Vec::new();
        while let Some(Tok::Name { sym, .. }) = self.peek() {
            words.push((sym, self.peek_span()));
            self.at += 1;
            if self.accept(Tok::Comma).is_none() {
                return Ok(Line::Exposure(words));
            }
        }
        Err(self.unexpected("the name of an exposure"))
    }

    fn attributes(&mut self) -> Read<Line> {
        let mut found = Vec::new();
        while let Some(Tok::Name { sym, .. }) = self.peek() {
            let span = self.peek_span();
            self.at += 1;
            let unit = match self.peek() {
                Some(Tok::Name { sym: word, .. }) => {
                    let span = self.peek_span();
                    self.at += 1;
                    Some(Unit { form: UnitForm::Plain, word, span })
                }
                _ => None,
            };
            found.push((sym, span, unit));
            if self.accept(Tok::Comma).is_none() {
                return Ok(Line::Attribute(found));
            }
        }
        Err(self.unexpected("the name of an attribute"))
    }

    /// `R(feed) >= 0.98`, after `require` or in a cell.
    pub(crate) fn requirement(&mut self) -> Read<Line> {
        let left = self.expression()?;
        let limit = match self.peek() {
            Some(Tok::AtLeast) => Limit::AtLeast,
            Some(Tok::AtMost) => Limit::AtMost,
            _ => {
                return Err(Box::new(
                    self.unexpected("`>=` or `<=`").mend("write `require R(feed) >= 0.98`"),
                ));
            }
        };
        self.at += 1;
        let right = self.expression()?;
        Ok(Line::Require { left, limit, right })
    }
}
