//! Ways of a network: `routes(in -> A -> out, A <-> B) with ends all of (L1, L2)`.
//!
//! A stop is a name, a call, a number or a structure in parentheses; `in` and
//! `out` are words of the language here and nowhere else.

use super::expr::{Level, Opened, Read, Reader};
use super::token::Tok;
use super::tree::*;
use crate::source::{Code, Problem, Span};

/// The ways of a level, as far as they have been read.
#[derive(Debug, Default)]
pub(super) struct Ways {
    stops: Vec<ExprId>,
    links: Vec<Link>,
}

impl Reader<'_> {
    /// `routes(`; the level for what follows.
    pub(super) fn open_routes(&mut self, span: Span) -> Read<Level> {
        self.at += 1;
        match self.accept(Tok::Open) {
            Some(open) => Ok(Level::new(Opened::Routes(Ways::default()), span.to(open), false)),
            None => {
                let problem = self.unexpected("`(`");
                Err(Box::new(problem.mend("write the ways in parentheses: `routes(in -> A -> out)`")))
            }
        }
    }

    /// After a stop: a link or a comma, which are taken; false before `)`.
    pub(super) fn link(&mut self, level: &mut Level) -> Read<bool> {
        let link = match self.peek() {
            Some(Tok::Arrow) => Link::Forth,
            Some(Tok::Both) => Link::Both,
            Some(Tok::Comma) => Link::End,
            Some(Tok::Close) => return Ok(false),
            None => {
                return Err(Box::new(
                    Problem::error(Code::UnbalancedParenthesis, level.at, "this parenthesis is never closed")
                        .mend("close it with `)`"),
                ));
            }
            _ => {
                let problem = self.missing_operator("`->`, `<->`, a comma or `)`");
                return Err(Box::new(problem.mend("a stop that is a structure stands in parentheses")));
            }
        };
        self.at += 1;
        self.stop(level, link)?;
        Ok(true)
    }

    /// Takes the operand just read as a stop.
    fn stop(&mut self, level: &mut Level, link: Link) -> Read<()> {
        let operand = level.operands.pop();
        let bare = level.operators.is_empty();
        let Some(stop) = operand.filter(|_| bare) else { return Err(self.no_stop(self.last_span())) };
        let ways = match &mut level.opened {
            Opened::Routes(ways) => ways,
            _ => return Ok(()),
        };
        match self.tree.expr(stop) {
            Expr::Name(_) | Expr::Call(..) | Expr::Literal(_) | Expr::Group(_) | Expr::Terminal(_) => {}
            _ => return Err(self.no_stop(self.tree.span(stop))),
        }
        ways.stops.push(stop);
        ways.links.push(link);
        Ok(())
    }

    fn no_stop(&self, place: Span) -> Box<Problem> {
        let message = "a stop is a name, a call, a number, or a structure in parentheses";
        Box::new(Problem::error(Code::UnexpectedToken, place, message).mend("put it in parentheses"))
    }

    /// The ways of a level whose `)` has come.
    pub(super) fn close_routes(&mut self, mut level: Level, close: Span) -> Read<ExprId> {
        let span = level.at.to(close);
        if level.operands.is_empty() {
            return Err(Box::new(
                Problem::error(Code::UnexpectedToken, close, "`)` stands where a stop should")
                    .mend("write the ways: `routes(in -> A -> out)`"),
            ));
        }
        self.stop(&mut level, Link::End)?;
        let Opened::Routes(ways) = level.opened else { return Ok(self.tree.add(Expr::Broken, span)) };
        let stops = self.tree.add_list(&ways.stops);
        self.tree.routes.push(Routes { stops, links: ways.links, ends: None });
        let id = self.tree.routes.len() as u32 - 1;
        Ok(self.tree.add(Expr::Routes(id), span))
    }

    /// `with ends all of (L1, L2)` after the ways. `within` is the level that
    /// the ways stand in.
    pub(super) fn ends(&mut self, routes: ExprId, within: &Level) -> Read<()> {
        let Expr::Routes(id) = self.tree.expr(routes) else { return Ok(()) };
        if self.word(0) != Some("with") || self.word(1) != Some("ends") {
            return Ok(());
        }
        let at = self.peek_span();
        if !within.items.is_empty() || !within.chain.is_empty() {
            return Err(Box::new(
                Problem::error(
                    Code::MixedOperators,
                    at,
                    "`with` binds to everything since the last parenthesis",
                )
                .mend("put the network in parentheses with its ends: `A -> (routes(…) with ends …)`"),
            ));
        }
        self.at += 2;
        let need = self.ends_need()?;
        if self.accept(Tok::Open).is_none() {
            return Err(Box::new(self.unexpected("`(`").mend("list the ends: `with ends all of (L1, L2)`")));
        }
        let mut ends = Vec::new();
        loop {
            match self.peek() {
                Some(Tok::Name { sym, quoted }) => {
                    let end = self.end(sym, quoted)?;
                    ends.push(end);
                }
                _ => return Err(self.unexpected("the name of a stop")),
            }
            if self.accept(Tok::Comma).is_none() {
                break;
            }
        }
        let Some(close) = self.accept(Tok::Close) else { return Err(self.unexpected("a comma or `)`")) };
        let list = self.tree.add_list(&ends);
        self.tree.routes[id as usize].ends = Some((need, list));
        let span = self.tree.span(routes).to(close);
        self.tree.set_span(routes, span);
        Ok(())
    }

    /// The name of a stop, or a call with names for its arguments.
    fn end(&mut self, sym: Sym, quoted: bool) -> Read<ExprId> {
        let span = self.peek_span();
        let calls = self.tok(1) == Some(Tok::Open) && self.touches(0);
        self.at += 1;
        if !calls {
            let expr = match (quoted, self.tree.names.text(sym)) {
                (false, "out") => Expr::Terminal(false),
                (false, "in") => Expr::Terminal(true),
                _ => Expr::Name(sym),
            };
            return Ok(self.tree.add(expr, span));
        }
        self.at += 1;
        let mut arguments = Vec::new();
        while let Some(Tok::Name { sym, .. }) = self.peek() {
            arguments.push(self.tree.add(Expr::Name(sym), self.peek_span()));
            self.at += 1;
            if self.accept(Tok::Comma).is_none() {
                break;
            }
        }
        let Some(close) = self.accept(Tok::Close) else { return Err(self.unexpected("a name or `)`")) };
        let list = self.tree.add_list(&arguments);
        Ok(self.tree.add(Expr::Call(sym, list), span.to(close)))
    }

    /// `all of`, `any of`, `2 of`, `k of`.
    fn ends_need(&mut self) -> Read<Need> {
        let span = self.peek_span();
        let need = match self.peek() {
            Some(Tok::Number) => {
                let literal = Literal { number: span, suffix: Suffix::None };
                Need::Count(self.add_literal(literal, span))
            }
            Some(Tok::Name { sym, quoted }) => match (quoted, self.tree.names.text(sym)) {
                (false, "all") => Need::All,
                (false, "any") => Need::Any,
                _ => Need::Count(self.tree.add(Expr::Name(sym), span)),
            },
            _ => return Err(self.unexpected("`all of`, `any of` or a count")),
        };
        self.at += 1;
        if self.word(0) != Some("of") {
            return Err(self.unexpected("`of`"));
        }
        self.at += 1;
        Ok(need)
    }
}
