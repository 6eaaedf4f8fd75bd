//! The syntax tree: what was written, with its place, before names mean anything.
//!
//! Nodes live in one arena and refer to each other by number, so that a tree
//! of any depth is built, walked and dropped without recursion. A node always
//! has a larger number than the nodes under it.

use super::words::ClauseWord;
use crate::source::Span;
use rustc_hash::FxHashMap;
use smallvec::SmallVec;
use unicode_normalization::UnicodeNormalization;

/// A name, as a number that is equal where the names are equal.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Sym(pub u32);

/// A node of the tree.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct ExprId(pub u32);

/// A run of node numbers in [`Tree::list`].
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug, Default)]
pub struct List {
    pub(crate) start: u32,
    pub(crate) end: u32,
}

impl List {
    /// How many there are.
    pub fn len(self) -> usize {
        (self.end - self.start) as usize
    }

    /// Whether there is none.
    pub fn is_empty(self) -> bool {
        self.start == self.end
    }
}

/// `+ - * / ^`
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub enum ArithOp {
    /// `+`
    Add,
    /// `-`
    Sub,
    /// `*`
    Mul,
    /// `/`
    Div,
    /// `^`
    Pow,
}

/// How many of a group must work (or, in `fails when`, have failed).
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub enum Need {
    /// `all of`
    All,
    /// `any of`
    Any,
    /// `2 of`; a number or a name for one.
    Count(ExprId),
}

/// How a unit was written.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub enum UnitForm {
    /// `h`, `FIT`, `kg`
    Plain,
    /// `/Mh`
    Per,
    /// `%/kh`
    PercentPer,
}

/// A unit as written.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Unit {
    /// With or without its stroke.
    pub form: UnitForm,
    /// The word after the stroke.
    pub word: Sym,
    /// The whole unit.
    pub span: Span,
}

/// What follows the digits of a literal.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Suffix {
    /// `0.98`
    None,
    /// `98%`
    Percent,
    /// `12 /Mh`
    Unit(Unit),
    /// `1 in 500`; the place of the second number.
    In(Span),
}

/// A number as written; its value is read from the text under `number`.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Literal {
    /// The digits.
    pub number: Span,
    /// What follows them.
    pub suffix: Suffix,
}

/// A clause of an item.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Clause {
    /// Which clause.
    pub word: ClauseWord,
    /// Its word as a name; for a bare probability the name is empty.
    pub name: Sym,
    /// Place of the word, or of the bare probability.
    pub word_span: Span,
    /// The whole clause.
    pub span: Span,
    /// Its value.
    pub value: Option<ExprId>,
    /// The exposure after `over`.
    pub over: Option<ExprId>,
}

/// `sharing (…)` and `separate (…)` after a copy.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Settles {
    /// Names after `sharing`.
    pub sharing: Vec<(Sym, Span)>,
    /// Names after `separate`.
    pub separate: Vec<(Sym, Span)>,
}

/// `routes(in -> A -> out, A <-> B) with ends all of (L1, L2)`
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Routes {
    /// All stops as written, way by way.
    pub stops: List,
    /// For each stop, how it leads to the next of its way.
    pub links: Vec<Link>,
    /// `ends`, with how many of which.
    pub ends: Option<(Need, List)>,
}

/// What stands between a stop of a way and the next.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Link {
    /// `->`
    Forth,
    /// `<->`
    Both,
    /// The way ends here.
    End,
}

/// A line that mixes kinds of operator: the readings it may have.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Mixed {
    /// One or two readings; none where three kinds meet.
    pub readings: Vec<ExprId>,
    /// The operators that meet, as written.
    pub operators: Vec<&'static str>,
}

/// A node; each variant's comment is the text it stands for.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Expr {
    /// `0.98`, `12 /Mh`, `1 in 50`; a number into [`Tree::literals`].
    Literal(u32),
    /// `pump`, `"Main pump"`, `pump.rate`, `feed.pump[1]`
    Name(Sym),
    /// `(base * 1.4) /h`
    WithUnit(ExprId, u32),
    /// `(…)`
    Group(ExprId),
    /// `-x`
    Negate(ExprId),
    /// `x + y`
    Arith(ArithOp, ExprId, ExprId),
    /// `A -> B -> C`
    Series(List),
    /// `A // B // C`
    Parallel(List),
    /// `2 of (A, B, C)`, `2 of 3 pump` (one member, a [`Expr::Counted`])
    AtLeast(Need, List),
    /// `3 pump`
    Counted(ExprId, ExprId),
    /// `a pump`
    Copy(ExprId),
    /// `2 of 3 lane sharing (psu)`; a number into [`Tree::settles`].
    Settled(ExprId, u32),
    /// `fails when …`
    FailsWhen(ExprId),
    /// `routes(in -> A -> out)`; a number into [`Tree::routes`].
    Routes(u32),
    /// `in` in `routes`: true; `out`: false.
    Terminal(bool),
    /// `E1 and E2`
    And(List),
    /// `E1 or E2`
    Or(List),
    /// `R(feed, 1 yr)`, `lane(S1)`
    Call(Sym, List),
    /// `order 3` among a question's arguments
    Choice(Sym, ExprId),
    /// `rate 18 /Mh, source "…"`; a range of [`Tree::clauses`].
    Item(List),
    /// `a pump, stress 2`
    Changed(ExprId, List),
    /// `A -> B // C`; a number into [`Tree::mixed`].
    Mixed(u32),
    /// Something that could not be read.
    Broken,
}

/// How an answer is shown.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Display {
    /// `in chances`
    Chances,
    /// `in %`
    Percent,
    /// `in yr`, `in FIT`, `in /h`
    Unit(Unit),
}

/// A `?`, and what stands right of it.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Mark {
    /// Place of the `?`.
    pub at: u32,
    /// What stands right of it, without blanks around and without a comment.
    pub answer: Span,
    /// Which line of its block holds the `?`.
    pub line: u32,
}

/// `>=` or `<=` in a requirement.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Limit {
    /// `>=`
    AtLeast,
    /// `<=`
    AtMost,
}

/// One phase, or one exposure, of a mission.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Phase {
    /// Its name, if it has one.
    pub name: Option<Sym>,
    /// How long, or how many.
    pub amount: ExprId,
    /// `stress 4`
    pub stress: Option<ExprId>,
}

/// Another file whose definitions a note takes.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Use {
    /// The path as written, with its place.
    pub path: (Sym, Span),
    /// The one sheet of a workbook that is wanted.
    pub sheet: Option<(Sym, Span)>,
    /// What stands before its names here: `P` of `P.pump`.
    pub prefix: Option<(Sym, Span)>,
}

/// What a line says.
#[derive(Clone, PartialEq, Debug)]
pub enum Line {
    /// `P1, P2 = a pump`, `lane(s) = s -> cpu`, `gain = F(a) / F(b) ?`
    Define {
        /// The names, with their places.
        names: SmallVec<[(Sym, Span); 1]>,
        /// Parameters, where there is a list of them.
        params: Option<Vec<(Sym, Span)>>,
        /// The right side.
        value: ExprId,
        /// `in chances` where it also asks.
        display: Option<Display>,
    },
    /// `R(feed) ?`
    Ask {
        /// What is asked.
        value: ExprId,
        /// `in chances`
        display: Option<Display>,
    },
    /// `require R(feed) >= 0.98`
    Require {
        /// What is required.
        left: ExprId,
        /// At least or at most.
        limit: Limit,
        /// The limit.
        right: ExprId,
    },
    /// `mission 10 h, 4 start`
    Mission(Vec<Phase>),
    /// `digits 4`
    Digits(ExprId),
    /// `year 8766 h`
    Year(ExprId),
    /// `exposure start, km`
    Exposure(Vec<(Sym, Span)>),
    /// `attribute power W`: the words with their units, if any.
    Attribute(Vec<(Sym, Span, Option<Unit>)>),
    /// `use "parts.xlsx" sheet "Power" as P`
    Use(Use),
    /// A line in error, with the names it would have defined.
    Broken(Vec<(Sym, Span)>),
}

/// A line with its place.
#[derive(Clone, PartialEq, Debug)]
pub struct Statement {
    /// What it says.
    pub line: Line,
    /// From its first to its last token.
    pub span: Span,
    /// Its question mark, if it asks.
    pub mark: Option<Mark>,
    /// The block that it stands in, as the caller counts them.
    pub block: u32,
}

/// Nodes, names and lines of all sources.
#[derive(Clone, Debug, Default)]
pub struct Tree {
    exprs: Vec<Expr>,
    spans: Vec<Span>,
    list: Vec<ExprId>,
    /// Numbers as written.
    pub literals: Vec<Literal>,
    /// Units after parentheses.
    pub units: Vec<Unit>,
    /// Clauses of items.
    pub clauses: Vec<Clause>,
    /// `sharing` and `separate` lists.
    pub settles: Vec<Settles>,
    /// Networks.
    pub routes: Vec<Routes>,
    /// Lines that mix operators.
    pub mixed: Vec<Mixed>,
    /// Lines in the order they were read.
    pub statements: Vec<Statement>,
    /// Names.
    pub names: Names,
}

impl Tree {
    /// Adds a node.
    pub fn add(&mut self, expr: Expr, span: Span) -> ExprId {
        self.exprs.push(expr);
        self.spans.push(span);
        ExprId(self.exprs.len() as u32 - 1)
    }

    /// Adds a list of nodes.
    pub fn add_list(&mut self, members: &[ExprId]) -> List {
        let start = self.list.len() as u32;
        self.list.extend_from_slice(members);
        List { start, end: self.list.len() as u32 }
    }

    /// How many nodes there are.
    pub(super) fn count(&self) -> u32 {
        self.exprs.len() as u32
    }

    /// The node.
    pub fn expr(&self, id: ExprId) -> Expr {
        self.exprs[id.0 as usize]
    }

    /// Its place.
    pub fn span(&self, id: ExprId) -> Span {
        self.spans[id.0 as usize]
    }

    /// Puts another node in place of one.
    pub(super) fn set_expr(&mut self, id: ExprId, expr: Expr) {
        self.exprs[id.0 as usize] = expr;
    }

    /// Widens or moves a node's place.
    pub fn set_span(&mut self, id: ExprId, span: Span) {
        self.spans[id.0 as usize] = span;
    }

    /// The nodes of a list.
    pub fn list(&self, list: List) -> &[ExprId] {
        &self.list[list.start as usize..list.end as usize]
    }

    /// The clauses of an item.
    pub fn clauses(&self, list: List) -> &[Clause] {
        &self.clauses[list.start as usize..list.end as usize]
    }

    /// How many nodes there are.
    pub fn len(&self) -> usize {
        self.exprs.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.exprs.is_empty()
    }

    /// The mixed line whose node stands exactly at `place`.
    pub fn mixed_at(&self, place: Span) -> Option<&Mixed> {
        let found =
            self.exprs.iter().zip(&self.spans).find(|(e, s)| matches!(e, Expr::Mixed(_)) && **s == place);
        match found {
            Some((Expr::Mixed(id), _)) => self.mixed.get(*id as usize),
            _ => None,
        }
    }

    /// The node without the parentheses around it.
    pub fn inside_groups(&self, mut id: ExprId) -> ExprId {
        while let Expr::Group(inner) = self.expr(id) {
            id = inner;
        }
        id
    }
}

/// All names, each once, in Unicode NFC.
#[derive(Clone, Debug, Default)]
pub struct Names {
    /// All names end to end.
    text: String,
    ends: Vec<u32>,
    /// First name with a hash, and for each name the next with the same hash.
    heads: FxHashMap<u64, u32>,
    next: Vec<u32>,
}

const NO_NAME: u32 = u32::MAX;

impl Names {
    /// The number of a name; names equal in NFC have equal numbers.
    pub fn intern(&mut self, name: &str) -> Sym {
        if name.is_ascii() {
            return self.intern_normal(name);
        }
        let normal: String = name.nfc().collect();
        self.intern_normal(&normal)
    }

    /// The number of a name if it has been seen.
    pub fn find(&self, name: &str) -> Option<Sym> {
        let normal: String;
        let name = if name.is_ascii() {
            name
        } else {
            normal = name.nfc().collect();
            &normal
        };
        self.find_normal(name, *self.heads.get(&hash(name))?)
    }

    fn find_normal(&self, name: &str, head: u32) -> Option<Sym> {
        let mut at = head;
        while at != NO_NAME {
            if self.text(Sym(at)) == name {
                return Some(Sym(at));
            }
            at = self.next[at as usize];
        }
        None
    }

    fn intern_normal(&mut self, name: &str) -> Sym {
        let key = hash(name);
        let head = self.heads.get(&key).copied().unwrap_or(NO_NAME);
        if let Some(known) = self.find_normal(name, head) {
            return known;
        }
        let id = self.ends.len() as u32;
        self.text.push_str(name);
        self.ends.push(self.text.len() as u32);
        self.next.push(head);
        self.heads.insert(key, id);
        Sym(id)
    }

    /// The name.
    pub fn text(&self, sym: Sym) -> &str {
        let i = sym.0 as usize;
        let start = if i == 0 { 0 } else { self.ends[i - 1] as usize };
        &self.text[start..self.ends[i] as usize]
    }

    /// The name as it is written in the language: quoted where it must be.
    pub fn written(&self, sym: Sym) -> String {
        written(self.text(sym))
    }

    /// How many names there are.
    pub fn len(&self) -> usize {
        self.ends.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.ends.is_empty()
    }
}

/// A name as it is written in the language: quoted where it must be.
pub fn written(name: &str) -> String {
    if super::token::is_plain_name(name) && !super::words::is_reserved(name) {
        name.to_string()
    } else {
        format!("\"{}\"", name.replace('"', "\"\""))
    }
}

fn hash(name: &str) -> u64 {
    use std::hash::{Hash, Hasher};
    let mut hasher = rustc_hash::FxHasher::default();
    name.hash(&mut hasher);
    hasher.finish()
}
