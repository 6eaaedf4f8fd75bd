//! Names in expressions: every one must be known, none may rest on itself, and
//! a number is used as a figure or as a thing, not as both.

use super::model::{DefId, Fault, Model};
use crate::language::{Expr, ExprId, Line, Need, Suffix, Sym, words};
use crate::source::{Code, Label, Problem, Span};
use smallvec::{SmallVec, smallvec};
use unicode_security::skeleton;

/// Places shown beside the first where one cause has many.
const MOST_LABELS: usize = 8;

/// Unknown names for which the nearest known one is looked for.
const MOST_HINTS: usize = 200;

/// What a node is used as.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
enum Use {
    /// In arithmetic, in a clause, as a count.
    Figure,
    /// In a structure.
    Thing,
    /// As another name, as a parameter, as an argument of a question.
    Open,
}

/// Two keys under which names that look alike are equal: one without case, one
/// by the shapes of letters (Unicode Technical Standard 39 beyond ASCII).
///
/// They are written into the two given texts: thousands of names in turn take
/// the room of one.
pub(super) fn look_alike_keys(name: &str, [case, shapes]: &mut [String; 2]) {
    case.clear();
    shapes.clear();
    // The mark keeps the two kinds of key apart.
    shapes.push('~');
    if name.is_ascii() {
        case.push_str(name);
        case.make_ascii_lowercase();
        name.chars().for_each(|c| push_shape(c, shapes));
    } else {
        case.extend(name.chars().flat_map(char::to_lowercase));
        // Letters of other scripts become the Latin ones that they look like.
        skeleton(name).for_each(|c| push_shape(c, shapes));
    }
}

/// What is alike in small print is made one: I, l, 1; O, o, 0; rn, m.
fn push_shape(c: char, shapes: &mut String) {
    match c {
        'I' | '1' | 'l' => shapes.push('l'),
        'O' | 'o' | '0' => shapes.push('o'),
        'n' | 'N' if shapes.ends_with('r') => {
            shapes.pop();
            shapes.push('m');
        }
        c => shapes.push(c.to_ascii_lowercase()),
    }
}

impl Model<'_> {
    /// Looks at every name in every line once: unknown names, circles, uses both ways.
    pub(super) fn check_names(&mut self) {
        let mut uses: Vec<(Option<Span>, Option<Span>)> = vec![(None, None); self.defs.len()];
        // Who rests on whom; sorted by owner only where a circle is possible.
        let mut below: Vec<(DefId, DefId)> = Vec::new();
        let mut owners: Vec<DefId> = Vec::new();
        let mut stack: Vec<(ExprId, Use)> = Vec::new();
        let mut only_back = true;
        for index in 0..self.tree.statements.len() {
            let statement = &self.tree.statements[index];
            let params: Vec<Sym> = match &statement.line {
                Line::Define { params: Some(params), .. } => params.iter().map(|(s, _)| *s).collect(),
                _ => Vec::new(),
            };
            owners.clear();
            if let Line::Define { names, .. } = &statement.line {
                owners.extend(names.iter().filter_map(|(s, _)| self.lookup(*s)));
            }
            for root in roots(&statement.line) {
                stack.push((root, Use::Open));
                self.walk(&mut stack, &params, &mut |model, expr, def, used| {
                    let slot = &mut uses[def.0 as usize];
                    let place = model.tree.span(expr);
                    match used {
                        Use::Figure => slot.0 = slot.0.or(Some(place)),
                        Use::Thing => slot.1 = slot.1.or(Some(place)),
                        Use::Open => {}
                    }
                    for owner in &owners {
                        below.push((*owner, def));
                        only_back &= def < *owner;
                    }
                });
            }
        }
        if !only_back {
            let mut lists: Vec<Vec<DefId>> = vec![Vec::new(); self.defs.len()];
            for (owner, def) in below {
                lists[owner.0 as usize].push(def);
            }
            self.find_circles(&lists);
        }
        self.check_both_ways(&uses);
        self.check_aliases(&uses);
    }

    /// Calls `found` with every name under those on the stack that is defined.
    fn walk(
        &mut self,
        stack: &mut Vec<(ExprId, Use)>,
        params: &[Sym],
        found: &mut impl FnMut(&Model<'_>, ExprId, DefId, Use),
    ) {
        while let Some((id, used)) = stack.pop() {
            match self.tree.expr(id) {
                Expr::Literal(_) | Expr::Broken | Expr::Terminal(_) => {}
                Expr::Name(sym) => {
                    if params.contains(&sym) {
                        continue;
                    }
                    match self.name_or_prefix(sym, params) {
                        Some(Bound::Def(def)) => found(self, id, def, used),
                        Some(Bound::Path(def)) => found(self, id, def, Use::Open),
                        Some(Bound::Param) => {}
                        None if used == Use::Open && self.tree.names.text(sym).contains('[') => {}
                        None => self.unknown_name(id, sym, params),
                    }
                }
                Expr::WithUnit(x, _) | Expr::Negate(x) | Expr::Choice(_, x) => stack.push((x, Use::Figure)),
                Expr::Group(x) => stack.push((x, used)),
                Expr::Arith(_, a, b) => stack.extend([(a, Use::Figure), (b, Use::Figure)]),
                Expr::Series(l) | Expr::Parallel(l) | Expr::And(l) | Expr::Or(l) => {
                    stack.extend(self.tree.list(l).iter().map(|x| (*x, Use::Thing)));
                }
                Expr::Routes(id) => {
                    let routes = &self.tree.routes[id as usize];
                    stack.extend(self.tree.list(routes.stops).iter().map(|x| (*x, Use::Thing)));
                    if let Some((need, ends)) = routes.ends {
                        if let Need::Count(k) = need {
                            stack.push((k, Use::Figure));
                        }
                        stack.extend(self.tree.list(ends).iter().map(|x| (*x, Use::Thing)));
                    }
                }
                Expr::AtLeast(need, l) => {
                    if let Need::Count(k) = need {
                        stack.push((k, Use::Figure));
                    }
                    stack.extend(self.tree.list(l).iter().map(|x| (*x, Use::Thing)));
                }
                Expr::Counted(n, x) => stack.extend([(n, Use::Figure), (x, Use::Thing)]),
                Expr::Copy(x) | Expr::FailsWhen(x) => stack.push((x, Use::Thing)),
                Expr::Settled(x, _) => stack.push((x, used)),
                Expr::Call(word, args) => {
                    if let Some(def) = self.lookup(word).filter(|d| self.def(*d).has_params) {
                        found(self, id, def, Use::Open);
                    }
                    let text = self.tree.names.text(word);
                    let inner = match text {
                        w if words::FUNCTIONS.contains(&w) => Use::Figure,
                        _ => Use::Open,
                    };
                    // What is asked about is a thing; `steps` may be asked of a figure.
                    let asked = words::QUESTIONS.contains(&text) && text != "steps";
                    let of = |i: usize| if asked && i == 0 { Use::Thing } else { inner };
                    let total = self.tree.names.text(word) == "total";
                    let args = self.tree.list(args).iter().enumerate();
                    // The second argument of `total` is the word of an attribute, no name.
                    stack.extend(args.filter(|(i, _)| !(total && *i == 1)).map(|(i, x)| (*x, of(i))));
                }
                Expr::Item(clauses) => self.clause_values(clauses, stack),
                Expr::Changed(copy, clauses) => {
                    stack.push((copy, Use::Thing));
                    self.clause_values(clauses, stack);
                }
                Expr::Mixed(mixed) => {
                    self.mixed_operators(id, mixed);
                    if let Some(first) = self.tree.mixed[mixed as usize].readings.first() {
                        stack.push((*first, Use::Thing));
                    }
                }
            }
        }
    }

    fn clause_values(&self, clauses: crate::language::List, stack: &mut Vec<(ExprId, Use)>) {
        for clause in self.tree.clauses(clauses) {
            if clause.word != words::ClauseWord::Source {
                stack.extend(clause.value.map(|v| (v, Use::Figure)));
            }
            stack.extend(clause.over.map(|v| (v, Use::Figure)));
        }
    }

    /// What a name is bound to: itself, or the longest defined name that it begins with.
    pub(super) fn name_or_prefix(&self, sym: Sym, params: &[Sym]) -> Option<Bound> {
        if let Some(def) = self.lookup(sym) {
            return Some(Bound::Def(def));
        }
        let text = self.tree.names.text(sym);
        for (at, _) in text.rmatch_indices(['.', '[']) {
            let Some(prefix) = self.tree.names.find(&text[..at]) else { continue };
            if params.contains(&prefix) {
                return Some(Bound::Param);
            }
            if let Some(def) = self.lookup(prefix) {
                return Some(Bound::Path(def));
            }
        }
        None
    }

    fn unknown_name(&mut self, id: ExprId, sym: Sym, params: &[Sym]) {
        let text = self.tree.names.text(sym);
        // One missing definition is one error, however often its name stands.
        if let Some(fault) = self.unknown.get(&sym).copied().filter(|_| params.is_empty()) {
            let place = self.tree.span(id);
            let labels = &mut self.problems[fault.0 as usize].labels;
            if labels.len() < MOST_LABELS {
                labels.push(Label { place, text: "and here".to_string() });
            }
            self.faulty.insert(id, fault);
            return;
        }
        let mut problem =
            Problem::error(Code::UnknownName, self.tree.span(id), format!("unknown name \"{text}\""));
        let near = words::nearest(text, params.iter().map(|p| self.tree.names.text(*p)));
        problem = match near {
            Some(near) => problem.mend(format!("did you mean \"{near}\"?")),
            None if self.units.hours(text).is_some() => {
                problem.mend(format!("a unit stands directly after its number, as in `4 {text}`"))
            }
            // A search for each of many would take the square of their number.
            None if self.unknown.len() >= MOST_HINTS => {
                problem.mend("define it, or give it the name that it has elsewhere")
            }
            None => self.with_nearest(problem, text),
        };
        let fault = self.fault(problem);
        if params.is_empty() {
            self.unknown.insert(sym, fault);
        }
        self.faulty.insert(id, fault);
    }

    /// A line that mixes operators; what its readings give is added when all else is known.
    fn mixed_operators(&mut self, id: ExprId, mixed: u32) {
        let found = &self.tree.mixed[mixed as usize];
        let operators: Vec<String> = found.operators.iter().map(|o| format!("`{o}`")).collect();
        let message = format!("{} have no precedence between them", operators.join(" and "));
        let mut problem = Problem::error(Code::MixedOperators, self.tree.span(id), message);
        if found.readings.is_empty() {
            problem = problem.mend("put parentheses around what belongs together");
        }
        let fault = self.fault(problem);
        self.faulty.insert(id, fault);
    }

    fn find_circles(&mut self, below: &[Vec<DefId>]) {
        // 0 not seen, 1 on the way, 2 done
        let mut state = vec![0_u8; below.len()];
        for start in 0..below.len() {
            if state[start] != 0 {
                continue;
            }
            state[start] = 1;
            let mut path = vec![(start, 0_usize)];
            while let Some((at, next)) = path.last_mut() {
                let Some(child) = below[*at].get(*next).map(|d| d.0 as usize) else {
                    state[*at] = 2;
                    path.pop();
                    continue;
                };
                *next += 1;
                match state[child] {
                    0 => {
                        state[child] = 1;
                        path.push((child, 0));
                    }
                    1 => {
                        let from = path.iter().position(|(d, _)| *d == child).unwrap_or(0);
                        let circle: Vec<DefId> = path[from..].iter().map(|(d, _)| DefId(*d as u32)).collect();
                        self.circle(&circle);
                    }
                    _ => {}
                }
            }
        }
    }

    fn circle(&mut self, circle: &[DefId]) {
        // A long way round is shown by its ends.
        const SHOWN: usize = 6;
        let mut names: Vec<String> =
            circle.iter().take(SHOWN).map(|d| self.written(self.def(*d).name)).collect();
        if circle.len() > SHOWN {
            names.push(format!("… ({} more)", circle.len() - SHOWN));
        }
        names.push(names[0].clone());
        let message = if circle.len() == 1 {
            format!("`{}` rests on itself", names[0])
        } else {
            format!("definitions go in a circle: {}", names.join(" -> "))
        };
        let mut problem = Problem::error(Code::Circle, self.def(circle[0]).span, message);
        for def in circle.iter().skip(1).take(SHOWN) {
            problem = problem.label(self.def(*def).span, "on the way round");
        }
        let problem = problem.mend(match circle {
            [_] => "define it without itself",
            _ => "define one of them without the others",
        });
        let fault = self.fault(problem);
        for def in circle {
            self.defs[def.0 as usize].broken = Some(fault);
        }
    }

    fn check_both_ways(&mut self, uses: &[(Option<Span>, Option<Span>)]) {
        for (index, used) in uses.iter().enumerate() {
            let (Some(figure), Some(thing)) = *used else { continue };
            let def = &self.defs[index];
            let number = def.value.is_some_and(|v| {
                match self.tree.expr(self.tree.inside_groups(v)) {
                    // A figure with a unit is never a thing: the use that takes it for one is told.
                    Expr::Literal(id) => !matches!(self.tree.literals[id as usize].suffix, Suffix::Unit(_)),
                    Expr::Arith(..) | Expr::Negate(_) => true,
                    _ => false,
                }
            });
            if !number || def.broken.is_some() {
                continue;
            }
            let (name, span) = (self.written(def.name), def.span);
            let fault = self.fault(
                Problem::error(Code::UsedBothWays, span, format!("`{name}` is used as a figure and as a thing"))
                    .label(figure, "a figure here")
                    .label(thing, "a thing here")
                    .mend(format!("define the figure, and the thing from it on a line of its own: `{name}_item = {name} * 1`")),
            );
            self.defs[index].broken = Some(fault);
        }
    }

    /// `B = A` gives one thing two names, which a reader may take for two things.
    fn check_aliases(&mut self, uses: &[(Option<Span>, Option<Span>)]) {
        for index in 0..self.defs.len() {
            let def = &self.defs[index];
            let (name, None, Some(value), false) = (def.name, def.broken, def.value, def.has_params) else {
                continue;
            };
            let Expr::Name(sym) = self.tree.expr(self.tree.inside_groups(value)) else { continue };
            let Some(first) = self.lookup(sym) else { continue };
            let Some((last, number)) = self.end_of_names(first) else { continue };
            // A number is a thing only where it is used as one.
            let as_figure = |d: usize| uses[d].0.is_some();
            if number && (as_figure(index) || as_figure(first.0 as usize) || as_figure(last.0 as usize)) {
                continue;
            }
            let (name, other, span) = (self.written(name), self.written(sym), self.tree.span(value));
            self.fault(
                Problem::remark(
                    Code::SameThing,
                    span,
                    format!("`{name}` is another name for the one thing `{other}`"),
                )
                .mend(format!("write `{name} = a {other}` if it is a second thing with the same data")),
            );
        }
    }

    /// The definition at the end of a chain of names, where that can be a thing; and
    /// whether it is a bare number, which is one only if it is used so.
    fn end_of_names(&self, first: DefId) -> Option<(DefId, bool)> {
        let mut def = first;
        loop {
            let found = self.def(def);
            if found.broken.is_some() || found.has_params {
                return None;
            }
            let value = self.tree.inside_groups(found.value?);
            match self.tree.expr(value) {
                Expr::Name(sym) => def = self.lookup(sym)?,
                Expr::Literal(id) => {
                    let literal = self.tree.literals[id as usize];
                    let decimal = crate::number::Decimal::parse(self.sources.text(literal.number))?;
                    let chance = match literal.suffix {
                        Suffix::None => decimal.to_real().to_f64() <= 1.0,
                        Suffix::Percent | Suffix::In(_) => true,
                        Suffix::Unit(_) => false,
                    };
                    return chance.then_some((def, true));
                }
                Expr::Call(word, _) => {
                    let def_of_call = self.lookup(word)?;
                    return self.def(def_of_call).has_params.then_some((def, false));
                }
                _ => return self.is_thing_only(value).then_some((def, false)),
            }
        }
    }

    /// The noted fault of a node, if it has one.
    pub(crate) fn faulty(&self, id: ExprId) -> Option<Fault> {
        self.faulty.get(&id).copied()
    }
}

/// What a name is bound to.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Bound {
    Def(DefId),
    /// A defined name, then a path of copies or a figure under it.
    Path(DefId),
    Param,
}

/// The expressions of a line.
fn roots(line: &Line) -> SmallVec<[ExprId; 2]> {
    match line {
        Line::Define { value, .. } | Line::Ask { value, .. } | Line::Digits(value) | Line::Year(value) => {
            smallvec![*value]
        }
        Line::Require { left, right, .. } => smallvec![*left, *right],
        Line::Mission(phases) => phases.iter().flat_map(|p| [Some(p.amount), p.stress]).flatten().collect(),
        Line::Exposure(_) | Line::Attribute(_) | Line::Use(_) | Line::Broken(_) => SmallVec::new(),
    }
}
