//! The table of names, the settings, and everything found wrong with them.

use super::build::Built;
use super::exposure::Exposure;
use super::item::Item;
use super::quantity::Quantity;
use super::units::Units;
use crate::language::{ExprId, Line, Sym, Tree, words};
use crate::source::{Code, Level, Problem, Sources, Span};
use rustc_hash::{FxHashMap, FxHashSet};
use std::hash::BuildHasher;

/// A definition, by number.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct DefId(pub u32);

/// A problem that has been noted, by number; what rests on it has no answer.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Fault(pub u32);

/// A value, or the noted problem that prevents it.
pub type Out<T> = Result<T, Fault>;

/// One name and what it stands for.
#[derive(Clone, Debug)]
pub struct Def {
    /// The name.
    pub name: Sym,
    /// Where the name is defined.
    pub span: Span,
    /// The right side; `None` for a line in error.
    pub value: Option<ExprId>,
    /// The statement that defines it.
    pub statement: u32,
    /// Whether it takes parameters.
    pub has_params: bool,
    /// Why it cannot be used: defined twice, in a circle, its line in error.
    pub broken: Option<Fault>,
}

/// Everything that the notes say, with names bound.
#[derive(Clone)]
pub struct Model<'a> {
    /// The syntax.
    pub tree: &'a Tree,
    /// The texts.
    pub sources: &'a Sources,
    /// Definitions in the order they were read.
    pub defs: Vec<Def>,
    /// Units, declared exposures and attributes.
    pub units: Units,
    /// The mission, if one is set.
    pub mission: Option<Out<Exposure>>,
    /// Significant digits of answers.
    pub digits: u8,
    /// Everything found wrong so far.
    pub problems: Vec<Problem>,
    by_name: Vec<u32>,
    /// Settings that stand twice: what rests on one of them has no answer.
    pub(super) set_twice: Vec<(String, Fault)>,
    /// Names that nothing defines, by the node that uses them; lines that mix operators.
    pub(super) faulty: FxHashMap<ExprId, Fault>,
    /// Names that nothing defines, with the one error of each.
    pub(super) unknown: FxHashMap<Sym, Fault>,
    /// The same for units.
    pub(super) unknown_units: FxHashMap<Sym, Fault>,
    /// Faults that only carry the place of a line which has been told already.
    below: FxHashSet<Fault>,
    pub(super) items: FxHashMap<ExprId, Out<u32>>,
    pub(super) item_list: Vec<Item>,
    pub(super) figures: FxHashMap<ExprId, Out<Quantity>>,
    pub(super) built: Built,
}

const NONE: u32 = u32::MAX;
/// From so many definitions on, names are compared while they are bound.
const MANY: usize = 5000;

impl<'a> Model<'a> {
    /// Binds the names of `tree`. What is wrong is in [`Model::problems`].
    pub fn new(tree: &'a Tree, sources: &'a Sources) -> Model<'a> {
        let mut model = Model {
            tree,
            sources,
            defs: Vec::new(),
            units: Units::default(),
            mission: None,
            digits: 4,
            problems: Vec::new(),
            by_name: vec![NONE; tree.names.len()],
            set_twice: Vec::new(),
            faulty: FxHashMap::default(),
            unknown: FxHashMap::default(),
            unknown_units: FxHashMap::default(),
            below: FxHashSet::default(),
            items: FxHashMap::default(),
            item_list: Vec::new(),
            figures: FxHashMap::default(),
            built: Built::default(),
        };
        model.define_all();
        model.declare();
        let look_alikes = if model.defs.len() < MANY {
            model.bind();
            look_alikes(tree, &model.defs)
        } else {
            let defs = model.defs.clone();
            rayon::join(|| model.bind(), || look_alikes(tree, &defs)).1
        };
        for problem in look_alikes {
            model.fault(problem);
        }
        model
    }

    fn bind(&mut self) {
        self.check_names();
        self.settle_year_and_digits();
        self.settle_mission();
    }

    /// Notes a problem; the same one twice is one.
    pub fn fault(&mut self, problem: Problem) -> Fault {
        let known = self.problems.iter().rev().take(64).position(|p| *p == problem);
        if let Some(back) = known {
            return Fault((self.problems.len() - 1 - back) as u32);
        }
        self.problems.push(problem);
        Fault(self.problems.len() as u32 - 1)
    }

    /// The problem behind a fault.
    pub fn problem(&self, fault: Fault) -> &Problem {
        &self.problems[fault.0 as usize]
    }

    /// Whether a fault says only that a line below has been found in error.
    pub fn rests_below(&self, fault: Fault) -> bool {
        self.below.contains(&fault)
    }

    /// The problems, without those that the reader has told.
    pub fn take_problems(&mut self) -> Vec<Problem> {
        let below = std::mem::take(&mut self.below);
        let all = std::mem::take(&mut self.problems).into_iter().enumerate();
        all.filter(|(i, _)| !below.contains(&Fault(*i as u32))).map(|(_, p)| p).collect()
    }

    /// A fault for what rests on a line that the reader has found in error.
    pub(super) fn broken_line(&mut self, what: &str, place: Span) -> Fault {
        let message = format!("`{what}` rests on {}, which is in error", self.sources.words(place));
        let fault = self.fault(Problem::error(Code::UnexpectedToken, place, message));
        self.below.insert(fault);
        fault
    }

    /// Whether any problem is an error.
    pub fn has_errors(&self) -> bool {
        self.problems.iter().any(|p| p.level == Level::Error)
    }

    /// The definition of a name.
    pub fn lookup(&self, name: Sym) -> Option<DefId> {
        self.by_name.get(name.0 as usize).copied().filter(|d| *d != NONE).map(DefId)
    }

    /// A definition.
    pub fn def(&self, id: DefId) -> &Def {
        &self.defs[id.0 as usize]
    }

    /// The parameters of a definition.
    pub fn params(&self, id: DefId) -> &'a [(Sym, Span)] {
        match &self.tree.statements[self.def(id).statement as usize].line {
            Line::Define { params: Some(params), .. } => params,
            _ => &[],
        }
    }

    /// A name as it is written.
    pub fn written(&self, sym: Sym) -> String {
        self.tree.names.written(sym)
    }

    /// An expression as text.
    pub fn text_of(&self, expr: ExprId) -> String {
        crate::language::print(self.tree, expr, &|span| self.sources.text(span).to_string())
    }

    /// The name whose definition a place lies in.
    pub fn defined_at(&self, place: Span) -> Option<String> {
        let holds = |s: Span| s.start <= place.start && place.start <= s.end;
        let def = self.defs.iter().find(|d| holds(self.tree.statements[d.statement as usize].span))?;
        Some(self.written(def.name))
    }

    /// An expression as text, of which about `most` bytes are wanted.
    pub fn start_of_text(&self, expr: ExprId, most: usize) -> String {
        crate::language::print_start(self.tree, expr, &|span| self.sources.text(span).to_string(), most)
    }

    fn define_all(&mut self) {
        for (index, statement) in self.tree.statements.iter().enumerate() {
            match &statement.line {
                Line::Define { names, params, value, .. } => {
                    for (name, span) in names {
                        self.define(*name, *span, Some(*value), index as u32, params.is_some());
                    }
                    self.check_several(names, *value);
                }
                Line::Broken(names) if !names.is_empty() => {
                    for (name, span) in names {
                        self.define(*name, *span, None, index as u32, false);
                    }
                }
                _ => {}
            }
        }
    }

    fn define(&mut self, name: Sym, span: Span, value: Option<ExprId>, statement: u32, has_params: bool) {
        let slot = self.by_name[name.0 as usize];
        if slot != NONE {
            let first = self.defs[slot as usize].span;
            let text = self.written(name);
            let problem = Problem::error(Code::DefinedTwice, span, format!("`{text}` is defined twice"))
                .label(first, "first here")
                .mend("one name is one thing: give the second another name, or delete one of the two");
            let fault = self.fault(match self.sources.cell(span) {
                Some(_) => problem.mend("several of one sort are one row with their number under `qty`"),
                None => problem,
            });
            self.defs[slot as usize].broken = Some(fault);
            return;
        }
        // The line's own problem has been reported by the reader; this one only carries the place.
        let broken = value.is_none().then_some(Fault(NONE));
        self.by_name[name.0 as usize] = self.defs.len() as u32;
        self.defs.push(Def { name, span, value, statement, has_params, broken });
    }

    /// `B, C = A` would make two names for one thing; several names mean several things.
    fn check_several(&mut self, names: &[(Sym, Span)], value: ExprId) {
        use crate::language::Expr;
        if names.len() < 2 {
            return;
        }
        let (message, mend) = match self.tree.expr(self.tree.inside_groups(value)) {
            Expr::Name(a) => (
                format!("several names stand for the one thing `{}`", self.written(a)),
                format!("write `a {}` for fresh copies, or one name for each line", self.written(a)),
            ),
            Expr::Series(_)
            | Expr::Parallel(_)
            | Expr::AtLeast(..)
            | Expr::FailsWhen(_)
            | Expr::Routes(_)
            | Expr::Call(..) => (
                "several names stand for one structure".to_string(),
                format!("write `a ({})` for fresh copies of it", self.text_of(value)),
            ),
            _ => return,
        };
        let place = self.tree.span(value);
        let fault = self.fault(Problem::error(Code::SeveralNames, place, message).mend(mend));
        for (name, _) in names {
            if let Some(def) = self.lookup(*name) {
                self.defs[def.0 as usize].broken = Some(fault);
            }
        }
    }

    fn declare(&mut self) {
        for statement in &self.tree.statements {
            match &statement.line {
                Line::Exposure(words) => {
                    for (word, span) in words {
                        self.declare_exposure(*word, *span);
                    }
                }
                Line::Attribute(found) => {
                    for (word, span, unit) in found {
                        self.declare_attribute(*word, *span, unit.map(|u| (u.word, u.span)));
                    }
                }
                _ => {}
            }
        }
    }

    fn declare_exposure(&mut self, word: Sym, span: Span) {
        let text = self.tree.names.text(word);
        if self.units.hours(text).is_some() || matches!(text, "FIT" | "kg" | "g" | "t") {
            self.fault(
                Problem::error(Code::BadSetting, span, format!("`{text}` is a unit already"))
                    .mend("give the exposure another name"),
            );
            return;
        }
        if let Some(first) = self.units.exposures.insert(word, span) {
            self.declared_twice(word, span, first);
        }
    }

    fn declare_attribute(&mut self, word: Sym, span: Span, unit: Option<(Sym, Span)>) {
        let text = self.tree.names.text(word);
        if words::is_reserved(text) {
            self.fault(
                Problem::error(Code::BadSetting, span, format!("`{text}` is a word of the language already"))
                    .mend("give the attribute another name"),
            );
            return;
        }
        let known = self.units.attributes.insert(word, (unit.map(|u| u.0), span));
        if let Some((_, first)) = known {
            self.declared_twice(word, span, first);
        }
        if let Some((unit, span)) = unit {
            let text = self.tree.names.text(unit);
            if self.units.hours(text).is_none() && !matches!(text, "kg" | "g" | "t" | "FIT") {
                self.units.attribute_units.entry(unit).or_insert(span);
            }
        }
    }

    fn declared_twice(&mut self, word: Sym, span: Span, first: Span) {
        let text = self.written(word);
        self.fault(
            Problem::error(Code::BadSetting, span, format!("`{text}` is declared twice"))
                .label(first, "first here")
                .mend("delete one of the two"),
        );
    }

    fn settle_year_and_digits(&mut self) {
        let (mut year, mut digits): (Option<Span>, Option<Span>) = (None, None);
        for statement in &self.tree.statements {
            match &statement.line {
                Line::Year(value) if self.first_setting(&mut year, "year", statement.span) => {
                    self.settle_year(*value);
                }
                Line::Digits(value) if self.first_setting(&mut digits, "digits", statement.span) => {
                    self.settle_digits(*value);
                }
                _ => {}
            }
        }
    }

    /// The fault of a setting that stands twice.
    pub(super) fn twice(&self, word: &str) -> Option<Fault> {
        self.set_twice.iter().find(|(w, _)| w == word).map(|(_, f)| *f)
    }

    pub(super) fn first_setting(&mut self, seen: &mut Option<Span>, word: &str, span: Span) -> bool {
        match *seen {
            None => {
                *seen = Some(span);
                true
            }
            Some(first) => {
                let fault = self.fault(
                    Problem::error(Code::BadSetting, span, format!("`{word}` is set twice"))
                        .label(first, "first here")
                        .mend("a setting stands once in a note: delete one of the two"),
                );
                self.set_twice.push((word.to_string(), fault));
                false
            }
        }
    }

    fn settle_year(&mut self, value: ExprId) {
        let Ok(quantity) = self.figure(value) else { return };
        let time = super::quantity::Dim::of(super::quantity::Base::Time, 1);
        if quantity.dim != time || quantity.value.to_f64() <= 0.0 {
            self.fault(
                Problem::error(
                    Code::BadSetting,
                    self.tree.span(value),
                    "the length of a year is a time above zero",
                )
                .mend("write `year 8766 h`"),
            );
            return;
        }
        self.figures.clear();
        self.units.year = quantity.value;
    }

    fn settle_digits(&mut self, value: ExprId) {
        let Ok(quantity) = self.figure(value) else { return };
        match quantity.whole() {
            Some(digits @ 1..=15) => self.digits = digits as u8,
            _ => {
                self.fault(
                    Problem::error(
                        Code::BadSetting,
                        self.tree.span(value),
                        "digits are a whole number from 1 to 15",
                    )
                    .mend("write `digits 4`"),
                );
            }
        }
    }

    /// The fault that a definition's right side rests on, as an error to carry.
    pub(super) fn usable(&mut self, def: DefId) -> Out<ExprId> {
        let found = self.def(def);
        match (found.broken, found.value) {
            (Some(Fault(NONE)), _) | (None, None) => {
                let (name, span) = (found.name, found.span);
                let text = self.written(name);
                let fault = self.broken_line(&text, span);
                self.defs[def.0 as usize].broken = Some(fault);
                Err(fault)
            }
            (Some(fault), _) => Err(fault),
            (None, Some(value)) => Ok(value),
        }
    }

    /// The nearest known name, as a mend.
    pub(super) fn with_nearest(&self, problem: Problem, name: &str) -> Problem {
        let known = self.defs.iter().map(|d| self.tree.names.text(d.name));
        match words::nearest(name, known.chain(["perfect"])) {
            Some(near) => problem.mend(format!("did you mean \"{near}\"?")),
            None => problem.mend(format!(
                "define it on a line of its own: `{} = …`",
                crate::language::written_name(name)
            )),
        }
    }
}

/// Remarks on names that a reader would take for each other.
fn look_alikes(tree: &Tree, defs: &[Def]) -> Vec<Problem> {
    // By hash: the keys themselves took 100 bytes a name.
    let mut seen: FxHashMap<u64, u32> = FxHashMap::default();
    seen.reserve(2 * defs.len());
    let (mut keys, mut other_keys) = ([String::new(), String::new()], [String::new(), String::new()]);
    let mut found = Vec::new();
    for (index, def) in defs.iter().enumerate() {
        let name = tree.names.text(def.name);
        super::scope::look_alike_keys(name, &mut keys);
        for key in &keys {
            let first = *seen.entry(rustc_hash::FxBuildHasher.hash_one(key)).or_insert(index as u32);
            if first == index as u32 {
                continue;
            }
            let other = &defs[first as usize];
            let other_name = tree.names.text(other.name);
            super::scope::look_alike_keys(other_name, &mut other_keys);
            if !other_keys.contains(key) {
                continue; // equal by hash alone
            }
            let message =
                format!("`{name}` and `{other_name}` differ only by case or by letters that look alike");
            found.push(
                Problem::remark(Code::LookAlikeNames, def.span, message)
                    .label(other.span, "the other one")
                    .mend("rename one of them, unless both are meant"),
            );
            break;
        }
    }
    found
}
