//! Tokens to expressions, without recursion: open parentheses are a stack of
//! [`Level`]s on the heap, so that any depth is read in linear time.
//!
//! Arithmetic has the usual precedence. The operators of structure have none
//! between them: a level that mixes them becomes [`Expr::Mixed`] with the
//! readings it may have.

use super::chain::Chain;
use super::routes::Ways;
use super::token::{Tok, Token};
use super::tree::*;
use super::words;
use crate::source::{Code, Problem, Span};
use smallvec::{SmallVec, smallvec};

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Ar {
    Op(ArithOp),
    Negate,
}

impl Ar {
    fn binding(self) -> u8 {
        match self {
            Ar::Op(ArithOp::Add | ArithOp::Sub) => 1,
            Ar::Op(ArithOp::Mul | ArithOp::Div) => 2,
            Ar::Negate => 3,
            Ar::Op(ArithOp::Pow) => 4,
        }
    }
}

/// What waits for the next operand.
#[derive(Clone, Copy, Debug)]
enum Prefix {
    /// `a`
    Article(Span),
    /// `2 of`
    Of(Need, Span),
    /// `3` after `of` or at the start of a list entry
    Count(ExprId),
}

/// What opened a level.
#[derive(Debug)]
pub(super) enum Opened {
    Root,
    Paren,
    /// `2 of (`
    List(Need, Span),
    /// `R(`
    Call(Sym),
    /// `routes(`
    Routes(Ways),
}

#[derive(Debug)]
pub(super) struct Level {
    pub(super) opened: Opened,
    pub(super) at: Span,
    /// Inside `fails when`, where `and`, `or` and `k of` speak of failures.
    failing: bool,
    fails_when: Option<Span>,
    /// `order` of `order 3` in a question's arguments.
    choice: Option<(Sym, Span)>,
    /// Finished entries of a list or arguments of a call.
    entries: SmallVec<[ExprId; 4]>,
    pub(super) items: SmallVec<[ExprId; 4]>,
    pub(super) chain: SmallVec<[Chain; 4]>,
    pub(super) operands: SmallVec<[ExprId; 4]>,
    pub(super) operators: SmallVec<[Ar; 4]>,
    prefixes: SmallVec<[Prefix; 1]>,
}

/// Open levels, the innermost last. Few lines nest, and few operators stand on
/// one level: in place, they cost no allocation.
type Levels = SmallVec<[Level; 1]>;

impl Level {
    pub(super) fn new(opened: Opened, at: Span, failing: bool) -> Level {
        Level {
            opened,
            at,
            failing,
            fails_when: None,
            choice: None,
            entries: SmallVec::new(),
            items: SmallVec::new(),
            chain: SmallVec::new(),
            operands: SmallVec::new(),
            operators: SmallVec::new(),
            prefixes: SmallVec::new(),
        }
    }

    /// Whether an entry begins here.
    fn at_start(&self) -> bool {
        self.items.is_empty()
            && self.operands.is_empty()
            && self.operators.is_empty()
            && self.prefixes.is_empty()
    }
}

/// Reads the tokens of one statement.
pub(crate) struct Reader<'a> {
    pub(crate) tree: &'a mut Tree,
    pub(crate) tokens: &'a [Token],
    pub(crate) at: usize,
    /// Where a message about a missing rest points.
    pub(crate) end: Span,
}

pub(crate) type Read<T> = Result<T, Box<Problem>>;

impl Reader<'_> {
    pub(crate) fn peek(&self) -> Option<Tok> {
        self.tokens.get(self.at).map(|t| t.tok)
    }

    pub(crate) fn peek_span(&self) -> Span {
        self.tokens.get(self.at).map_or(self.end, |t| t.span)
    }

    pub(crate) fn last_span(&self) -> Span {
        self.at.checked_sub(1).and_then(|i| self.tokens.get(i)).map_or(self.end, |t| t.span)
    }

    pub(crate) fn accept(&mut self, tok: Tok) -> Option<Span> {
        (self.peek() == Some(tok)).then(|| {
            self.at += 1;
            self.tokens[self.at - 1].span
        })
    }

    pub(super) fn tok(&self, ahead: usize) -> Option<Tok> {
        self.tokens.get(self.at + ahead).map(|t| t.tok)
    }

    /// The word `ahead` tokens on, when it is unquoted.
    pub(crate) fn word(&self, ahead: usize) -> Option<&str> {
        match self.tok(ahead)? {
            Tok::Name { sym, quoted: false } => Some(self.tree.names.text(sym)),
            _ => None,
        }
    }

    pub(super) fn touches(&self, ahead: usize) -> bool {
        match (self.tokens.get(self.at + ahead), self.tokens.get(self.at + ahead + 1)) {
            (Some(a), Some(b)) => a.span.end == b.span.start,
            _ => false,
        }
    }

    pub(crate) fn unexpected(&self, wanted: &str) -> Box<Problem> {
        let place = self.peek_span();
        Box::new(match self.peek() {
            None => Problem::error(
                Code::UnfinishedLine,
                place,
                format!("the line ends where {wanted} should stand"),
            )
            .mend(format!("add {wanted}, or take away what is left open")),
            Some(Tok::Both) => Problem::error(Code::UnexpectedToken, place, "`<->` stands in `routes` only")
                .mend("write `routes(in -> A -> out, in -> B -> out, A <-> B)`"),
            Some(tok) => {
                let what = self.describe(tok);
                Problem::error(Code::UnexpectedToken, place, format!("{what} stands where {wanted} should"))
            }
        })
    }

    fn describe(&self, tok: Tok) -> String {
        let text = match tok {
            Tok::Name { sym, .. } => return format!("`{}`", self.tree.names.text(sym)),
            Tok::Number => "a number",
            Tok::Percent => "`%`",
            Tok::Arrow => "`->`",
            Tok::Bars => "`//`",
            Tok::Both => "`<->`",
            Tok::Plus => "`+`",
            Tok::Minus => "`-`",
            Tok::Star => "`*`",
            Tok::Slash => "`/`",
            Tok::Caret => "`^`",
            Tok::Open => "`(`",
            Tok::Close => "`)`",
            Tok::Comma => "a comma",
            Tok::Equals => "`=`",
            Tok::AtLeast => "`>=`",
            Tok::AtMost => "`<=`",
            Tok::PlusMinus => "`±`",
            Tok::Dots => "`..`",
        };
        text.to_string()
    }

    /// An expression, up to the first token that cannot go on with it outside
    /// parentheses; the caller looks at what that token is.
    pub(crate) fn expression(&mut self) -> Read<ExprId> {
        let mut levels: Levels = smallvec![Level::new(Opened::Root, self.peek_span(), false)];
        loop {
            self.operand(&mut levels)?;
            // After an operand: operators go on, closers finish levels.
            loop {
                let depth = levels.len();
                let level = &mut levels[depth - 1];
                let goes_on = match level.opened {
                    Opened::Routes(_) => self.link(level)?,
                    _ => self.operator(level)?,
                };
                if goes_on {
                    break;
                }
                match self.peek() {
                    Some(Tok::Comma) if !matches!(level.opened, Opened::Root | Opened::Paren) => {
                        self.at += 1;
                        let entry = self.finish_entry(level)?;
                        level.entries.push(entry);
                        break;
                    }
                    Some(Tok::Close) if depth > 1 => {
                        let close = self.tokens[self.at].span;
                        self.at += 1;
                        let level = levels.pop().expect("depth is above one");
                        let done = self.close(level, close)?;
                        self.ends(done, &levels[depth - 2])?;
                        self.finish_operand(&mut levels[depth - 2], done)?;
                    }
                    _ if depth == 1 => return self.finish_entry(&mut levels[0]),
                    Some(_) => return Err(self.no_operator(&levels[depth - 1])),
                    None => return Err(self.never_closed(&levels[depth - 1])),
                }
            }
        }
    }

    fn never_closed(&self, level: &Level) -> Box<Problem> {
        Box::new(
            Problem::error(Code::UnbalancedParenthesis, level.at, "this parenthesis is never closed")
                .mend("close it with `)`"),
        )
    }

    fn no_operator(&self, level: &Level) -> Box<Problem> {
        let place = self.peek_span();
        if self.peek() == Some(Tok::Comma) {
            return Box::new(
                Problem::error(Code::UnexpectedToken, place, "a comma stands in plain parentheses")
                    .label(level.at, "opened here")
                    .mend("say how many of the list must work, as in `2 of (A, B, C)`"),
            );
        }
        let mut problem = self.missing_operator("an operator or `)`");
        if problem.place != level.at {
            problem = Box::new(problem.label(level.at, "still open from here"));
        }
        problem
    }

    /// Something stands directly after an operand.
    pub(crate) fn missing_operator(&self, wanted: &str) -> Box<Problem> {
        let problem = self.unexpected(wanted);
        let before = self.at.checked_sub(1).map(|i| self.tokens[i].tok);
        let mend = match (before, self.peek()) {
            (Some(Tok::Number), Some(Tok::Number)) => "write one number without a space in it",
            (Some(_), Some(Tok::Number)) => "a name that begins with a digit stands in double quotes",
            (Some(Tok::Name { .. } | Tok::Close), Some(Tok::Name { .. } | Tok::Open))
                if !self.word(0).is_some_and(words::is_reserved) =>
            {
                "put an operator between the two: `->` where both must work, `//` where one is enough"
            }
            _ => return problem,
        };
        Box::new(problem.mend(mend))
    }

    /// `2of3`, `2 of3`: a word of its own to the reader, and no unit.
    pub(super) fn run_together(&self) -> Option<Box<Problem>> {
        let word = self.word(0)?;
        let n = word.strip_prefix("of").filter(|n| n.starts_with(|c: char| c.is_ascii_digit()))?;
        let problem =
            Problem::error(Code::UnexpectedToken, self.peek_span(), format!("`{word}` reads as one word"));
        Some(Box::new(problem.mend(format!("write `of {n}` with spaces around `of`"))))
    }

    /// Everything up to and with one operand; may open levels.
    fn operand(&mut self, levels: &mut Levels) -> Read<()> {
        loop {
            let depth = levels.len();
            let level = &mut levels[depth - 1];
            let span = self.peek_span();
            match self.peek() {
                Some(Tok::Minus) if level.prefixes.is_empty() => {
                    self.at += 1;
                    level.operators.push(Ar::Negate);
                }
                Some(Tok::Open) => {
                    self.at += 1;
                    let failing = level.failing;
                    let opened = match level.prefixes.last() {
                        Some(Prefix::Of(need, of)) => {
                            let list = Opened::List(*need, *of);
                            level.prefixes.pop();
                            list
                        }
                        _ => Opened::Paren,
                    };
                    levels.push(Level::new(opened, span, failing));
                }
                Some(Tok::Number) => {
                    if self.count_starts(level) {
                        self.at += 1;
                        let literal = Literal { number: span, suffix: Suffix::None };
                        let count = self.add_literal(literal, span);
                        level.prefixes.push(Prefix::Count(count));
                        continue;
                    }
                    if self.word(1) == Some("of") {
                        self.at += 2;
                        let count = self.add_literal(Literal { number: span, suffix: Suffix::None }, span);
                        level.prefixes.push(Prefix::Of(Need::Count(count), span.to(self.last_span())));
                        continue;
                    }
                    let literal = self.literal()?;
                    return self.finish_operand(level, literal);
                }
                Some(Tok::Name { sym, quoted }) => {
                    if self.name(levels, sym, quoted, span)? {
                        return Ok(());
                    }
                }
                Some(Tok::Close)
                    if matches!(level.opened, Opened::Call(_))
                        && level.at_start()
                        && level.entries.is_empty() =>
                {
                    self.at += 1;
                    let level = levels.pop().expect("a call level is above the root");
                    let done = self.close(level, span)?;
                    return self.finish_operand(&mut levels[depth - 2], done);
                }
                _ => return Err(self.unexpected("a name, a number or `(`")),
            }
        }
    }

    /// A word where an operand may stand. Whether it was a whole operand.
    fn name(&mut self, levels: &mut Levels, sym: Sym, quoted: bool, span: Span) -> Read<bool> {
        let depth = levels.len();
        let level = &mut levels[depth - 1];
        let text = if quoted { "" } else { self.tree.names.text(sym) };
        let count_wanted = matches!(level.prefixes.last(), Some(Prefix::Of(..)));
        match text {
            "all" | "any" if self.word(1) == Some("of") => {
                let need = if text == "all" { Need::All } else { Need::Any };
                self.at += 2;
                level.prefixes.push(Prefix::Of(need, span.to(self.last_span())));
                return Ok(false);
            }
            "fails" if self.word(1) == Some("when") => {
                if !level.at_start() || !level.chain.is_empty() || level.failing {
                    return Err(Box::new(
                        Problem::error(
                            Code::MixedOperators,
                            span,
                            "`fails when` reaches to the end of its line or parenthesis",
                        )
                        .mend("put it in parentheses: `A -> (fails when E1 and E2)`"),
                    ));
                }
                self.at += 2;
                level.fails_when = Some(span.to(self.last_span()));
                level.failing = true;
                return Ok(false);
            }
            "a" | "an" if self.article_follows(count_wanted) => {
                self.at += 1;
                level.prefixes.push(Prefix::Article(span));
                return Ok(false);
            }
            "routes" => {
                let opened = self.open_routes(span)?;
                levels.push(opened);
                return Ok(false);
            }
            "in" | "out" if matches!(level.opened, Opened::Routes(_)) => {
                self.at += 1;
                let terminal = self.tree.add(Expr::Terminal(text == "in"), span);
                self.finish_operand(level, terminal)?;
                return Ok(true);
            }
            "else" | "with" => return Err(Box::new(later(span, &format!("`{text}`")))),
            "" => {}
            // `total(feed, mass)`: attribute words are arguments of questions.
            _ if matches!(level.opened, Opened::Call(_))
                && words::clause(text) == Some(words::ClauseWord::Attribute) => {}
            _ if words::is_reserved(text) => return Err(self.reserved_as_operand(span, text)),
            _ => {}
        }
        // A count by name: `2 of n pump`, or `n of …`.
        if self.word(1) == Some("of") {
            self.at += 2;
            let count = self.tree.add(Expr::Name(sym), span);
            level.prefixes.push(Prefix::Of(Need::Count(count), span.to(self.last_span())));
            return Ok(false);
        }
        if count_wanted && !self.called(1) && self.operand_follows(1) {
            self.at += 1;
            let count = self.tree.add(Expr::Name(sym), span);
            level.prefixes.push(Prefix::Count(count));
            return Ok(false);
        }
        if matches!(level.opened, Opened::Call(_)) && level.at_start() && self.tok(1) == Some(Tok::Number) {
            self.at += 1;
            level.choice = Some((sym, span));
            return Ok(false);
        }
        if let Some(second) = self.second_word(text) {
            let both = format!("{text} {second}");
            let word = self.tree.names.intern(&both);
            self.at += 3;
            levels.push(Level::new(Opened::Call(word), span.to(self.last_span()), false));
            return Ok(false);
        }
        if !quoted && self.called(1) && words::LATER_QUESTIONS.contains(&text) {
            return Err(Box::new(later(span, &format!("the question `{text}(…)`"))));
        }
        if !quoted && self.called(1) {
            self.at += 2;
            levels.push(Level::new(Opened::Call(sym), span.to(self.last_span()), false));
            return Ok(false);
        }
        self.at += 1;
        let name = self.tree.add(Expr::Name(sym), span);
        self.finish_operand(level, name)?;
        Ok(true)
    }

    /// Whether the token `ahead` is `(` that touches the word before it.
    fn called(&self, ahead: usize) -> bool {
        self.tok(ahead) == Some(Tok::Open) && self.touches(ahead - 1)
    }

    fn second_word(&self, first: &str) -> Option<&'static str> {
        let (_, second) = words::TWO_WORD_CALLS.iter().find(|(a, _)| *a == first)?;
        (self.word(1) == Some(second) && self.called(2)).then_some(*second)
    }

    fn reserved_as_operand(&self, span: Span, text: &str) -> Box<Problem> {
        if matches!(text, "and" | "or") {
            return self.unexpected("a name, a number or `(`");
        }
        if text == "not" {
            return Box::new(
                Problem::error(Code::ReservedWord, span, "there is no `not` in this language")
                    .mend("name the things whose failure counts; a thing called so is written \"not\""),
            );
        }
        let problem = Problem::error(
            Code::ReservedWord,
            span,
            format!("`{text}` is a word of the language and no name"),
        );
        let problem = match words::begins_clause(text) {
            true => problem.mend(format!("data stand on a line of their own, as in `item = {text} …`")),
            false => problem,
        };
        Box::new(problem.mend(format!("write \"{text}\" in double quotes if a thing is called so")))
    }

    /// `a` is the article only directly before a name or `(`; `a(` is a call.
    fn article_follows(&self, count_wanted: bool) -> bool {
        if count_wanted && self.tok(1) == Some(Tok::Open) {
            return false;
        }
        match self.tok(1) {
            Some(Tok::Open) => !self.touches(0),
            Some(Tok::Name { quoted: true, .. }) => true,
            Some(Tok::Name { sym, .. }) => {
                let next = self.tree.names.text(sym);
                !words::is_reserved(next) && !matches!(next, "in")
            }
            _ => false,
        }
    }

    /// Whether a number here is a count: after `of`, or before a thing at the start of a list entry.
    fn count_starts(&self, level: &Level) -> bool {
        match level.prefixes.last() {
            Some(Prefix::Of(..)) => true,
            None if matches!(level.opened, Opened::List(..)) && level.at_start() => self.operand_follows(1),
            _ => false,
        }
    }

    fn operand_follows(&self, ahead: usize) -> bool {
        match self.tok(ahead) {
            Some(Tok::Open | Tok::Name { quoted: true, .. }) => true,
            Some(Tok::Name { sym, .. }) => !words::is_reserved(self.tree.names.text(sym)),
            _ => false,
        }
    }

    /// A finished operand: what waited for it is applied.
    fn finish_operand(&mut self, level: &mut Level, operand: ExprId) -> Read<()> {
        let mut done = operand;
        while let Some(prefix) = level.prefixes.pop() {
            let span = self.tree.span(done);
            done = match prefix {
                Prefix::Article(at) => self.tree.add(Expr::Copy(done), at.to(span)),
                Prefix::Count(count) => {
                    let at = self.tree.span(count);
                    self.tree.add(Expr::Counted(count, done), at.to(span))
                }
                Prefix::Of(need, at) => {
                    if !matches!(self.tree.expr(done), Expr::Counted(..)) {
                        return Err(Box::new(
                            Problem::error(
                                Code::UnexpectedToken,
                                span,
                                "after `of` stands how many there are, or a list",
                            )
                            .mend("write `2 of 3 pump` for copies of one, `2 of (A, B, C)` for a list"),
                        ));
                    }
                    let members = self.tree.add_list(&[done]);
                    self.tree.add(Expr::AtLeast(need, members), at.to(span))
                }
            };
        }
        if matches!(self.tree.expr(done), Expr::Group(_))
            && let Some(unit) = self.per_unit()
        {
            let span = self.tree.span(done).to(unit.span);
            self.tree.units.push(unit);
            let id = self.tree.units.len() as u32 - 1;
            done = self.tree.add(Expr::WithUnit(done, id), span);
        }
        let done = self.settled(done)?;
        level.operands.push(done);
        Ok(())
    }

    /// `sharing (psu, bus) separate (cpu)` after a copy or a count.
    fn settled(&mut self, copy: ExprId) -> Read<ExprId> {
        let mut settles = Settles::default();
        let mut span = self.tree.span(copy);
        while let Some(word @ ("sharing" | "separate")) = self.word(0) {
            let sharing = word == "sharing";
            if !matches!(self.tree.expr(copy), Expr::AtLeast(..) | Expr::Copy(_) | Expr::Counted(..)) {
                return Err(Box::new(
                    Problem::error(Code::UnexpectedToken, self.peek_span(), "this stands after no copy")
                        .mend("it follows a count or an article: `2 of 3 lane sharing (psu)`"),
                ));
            }
            self.at += 1;
            if self.accept(Tok::Open).is_none() {
                return Err(Box::new(
                    self.unexpected("`(`").mend("name the parts in parentheses: `sharing (psu, bus)`"),
                ));
            }
            loop {
                match self.peek() {
                    Some(Tok::Name { sym, .. }) => {
                        let entry = (sym, self.peek_span());
                        if sharing {
                            settles.sharing.push(entry)
                        } else {
                            settles.separate.push(entry)
                        }
                        self.at += 1;
                    }
                    _ => return Err(self.unexpected("the name of a part")),
                }
                if self.accept(Tok::Comma).is_none() {
                    break;
                }
            }
            match self.accept(Tok::Close) {
                Some(close) => span = span.to(close),
                None => return Err(self.unexpected("a comma or `)`")),
            }
        }
        if settles == Settles::default() {
            return Ok(copy);
        }
        self.tree.settles.push(settles);
        let id = self.tree.settles.len() as u32 - 1;
        Ok(self.tree.add(Expr::Settled(copy, id), span))
    }

    /// An operator after an operand; whether there was one.
    fn operator(&mut self, level: &mut Level) -> Read<bool> {
        let span = self.peek_span();
        let chain = match self.peek() {
            Some(Tok::Plus) => return Ok(self.arith(level, ArithOp::Add)),
            Some(Tok::Minus) => return Ok(self.arith(level, ArithOp::Sub)),
            Some(Tok::Star) => return Ok(self.arith(level, ArithOp::Mul)),
            Some(Tok::Slash) => return Ok(self.arith(level, ArithOp::Div)),
            Some(Tok::Caret) => return Ok(self.arith(level, ArithOp::Pow)),
            Some(Tok::Arrow) => Chain::Series,
            Some(Tok::Bars) => Chain::Parallel,
            Some(Tok::Both) => return Err(self.unexpected("`->` or `//`")),
            _ => match self.word(0) {
                Some("and") => Chain::And,
                Some("or") => Chain::Or,
                Some("of") => return self.late_of(level, span),
                // A phase of a question's exposure: `R(x, climb 1 h stress 2)`. Stress is a factor on it.
                Some("stress") if matches!(level.opened, Opened::Call(_)) && level.chain.is_empty() => {
                    while !level.operators.is_empty() {
                        self.reduce(level);
                    }
                    return Ok(self.arith(level, ArithOp::Mul));
                }
                Some(word @ ("else" | "with")) => return Err(Box::new(later(span, &format!("`{word}`")))),
                _ => return Ok(false),
            },
        };
        let logic = matches!(chain, Chain::And | Chain::Or);
        if logic != level.failing {
            let (message, mend) = if logic {
                (
                    "`and` and `or` speak of failures and stand after `fails when` only",
                    "write `->` where all must work, `//` where any does, or begin with `fails when`",
                )
            } else {
                (
                    "`->` and `//` do not stand in `fails when`",
                    "give the structure a name of its own and use the name here, or write `and` and `or`",
                )
            };
            return Err(Box::new(Problem::error(Code::UnexpectedToken, span, message).mend(mend)));
        }
        self.at += 1;
        self.finish_item(level);
        level.chain.push(chain);
        Ok(true)
    }

    /// `(k + 1) of …`: the operand before turns out to be how many are needed.
    fn late_of(&mut self, level: &mut Level, span: Span) -> Read<bool> {
        match (level.operands.pop(), level.operators.is_empty()) {
            (Some(need), true) if matches!(self.tree.expr(need), Expr::Group(_)) => {
                self.at += 1;
                let at = self.tree.span(need).to(span);
                level.prefixes.push(Prefix::Of(Need::Count(need), at));
                Ok(true)
            }
            _ => Err(Box::new(
                Problem::error(
                    Code::UnexpectedToken,
                    span,
                    "before `of` stands one whole number, a name of one, `all` or `any`",
                )
                .mend("put a calculation in parentheses: `(k + 1) of 5 pump`"),
            )),
        }
    }

    fn arith(&mut self, level: &mut Level, op: ArithOp) -> bool {
        self.at += 1;
        let binding = Ar::Op(op).binding();
        while let Some(top) = level.operators.last() {
            let right = op == ArithOp::Pow;
            if top.binding() > binding || (top.binding() == binding && !right) {
                self.reduce(level);
            } else {
                break;
            }
        }
        level.operators.push(Ar::Op(op));
        true
    }

    fn reduce(&mut self, level: &mut Level) {
        let Some(operator) = level.operators.pop() else { return };
        let Some(right) = level.operands.pop() else { return };
        let span = self.tree.span(right);
        let done = match operator {
            Ar::Negate => self.tree.add(Expr::Negate(right), span),
            Ar::Op(op) => {
                let Some(left) = level.operands.pop() else { return };
                let span = self.tree.span(left).to(span);
                self.tree.add(Expr::Arith(op, left, right), span)
            }
        };
        level.operands.push(done);
    }

    fn finish_item(&mut self, level: &mut Level) {
        while !level.operators.is_empty() {
            self.reduce(level);
        }
        level.items.append(&mut level.operands);
    }

    /// The end of an entry, of an argument, or of the whole: the chain becomes one node.
    fn finish_entry(&mut self, level: &mut Level) -> Read<ExprId> {
        self.finish_item(level);
        let items = std::mem::take(&mut level.items);
        let chain = std::mem::take(&mut level.chain);
        let mut done = self.chain(&items, &chain);
        if let Some(at) = level.fails_when.take() {
            level.failing = false;
            let span = at.to(self.tree.span(done));
            done = self.tree.add(Expr::FailsWhen(done), span);
        }
        if let Some((word, at)) = level.choice.take() {
            let span = at.to(self.tree.span(done));
            done = self.tree.add(Expr::Choice(word, done), span);
        }
        Ok(done)
    }

    /// A level whose `)` has come.
    fn close(&mut self, mut level: Level, close: Span) -> Read<ExprId> {
        if let Opened::Routes(_) = level.opened {
            return self.close_routes(level, close);
        }
        let span = level.at.to(close);
        let empty = level.at_start() && level.chain.is_empty();
        if !(empty && level.entries.is_empty()) {
            let entry = self.finish_entry(&mut level)?;
            level.entries.push(entry);
        }
        Ok(match level.opened {
            Opened::Root | Opened::Paren => {
                let inner = level.entries[0];
                self.tree.add(Expr::Group(inner), span)
            }
            Opened::List(need, at) => {
                let list = self.tree.add_list(&level.entries);
                self.tree.add(Expr::AtLeast(need, list), at.to(close))
            }
            Opened::Call(word) => {
                let list = self.tree.add_list(&level.entries);
                self.tree.add(Expr::Call(word, list), span)
            }
            Opened::Routes(_) => self.tree.add(Expr::Broken, span),
        })
    }
}

/// A part of the design that a later version brings.
pub(crate) fn later(place: Span, what: &str) -> Problem {
    Problem::error(Code::NotKnownYet, place, format!("{what} is not known yet"))
        .mark("reserved for a later version")
        .mend("this version cannot compute it; see the README for what it does")
}
