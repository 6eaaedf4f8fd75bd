//! Items: what is known of one part, and its chance under an exposure.

use super::exposure::Exposure;
use super::model::{DefId, Fault, Model, Out};
use super::quantity::{Base, Dim, Quantity, STEP};
use crate::language::words::ClauseWord;
use crate::language::{Clause, Expr, ExprId, List, Names, Sym, unknown_clause};
use crate::number::{Chance, Real};
use crate::source::{Code, Problem, Span};

/// How a constant rate was given.
#[derive(Clone, PartialEq, Debug)]
pub enum Pace {
    /// `rate 12 /Mh`: failures per unit of exposure.
    Rate(Quantity),
    /// `mttf 50 kh`, `mtbf 50 kh`: exposure to, or between, failures.
    Mean(Quantity),
    /// `fails 0.001 /start`: the probability of each occurrence.
    Each(Chance),
    /// `0.98 over 1000 h`: the probability over so much of it.
    Over(Chance, Quantity),
}

/// One way to fail that grows with an exposure.
#[derive(Clone, PartialEq, Debug)]
pub struct Ageing {
    /// Which exposure.
    pub base: Base,
    /// How fast.
    pub pace: Pace,
    /// The clause that says so.
    pub clause: Clause,
}

/// What is known of one part.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Item {
    /// Where its data stand.
    pub span: Span,
    /// `perfect`: cannot fail.
    pub perfect: bool,
    /// A probability for one mission, with its clause.
    pub fixed: Option<(Chance, Option<Clause>)>,
    /// Ways to fail that grow with exposures.
    pub ageing: Vec<Ageing>,
    /// `duty 30%`
    pub duty: Option<Box<Quantity>>,
    /// `stress 8`
    pub stress: Option<Box<Quantity>>,
    /// `source "…"`
    pub source: Option<Sym>,
    /// `cost`, `mass` and declared ones.
    pub attributes: Vec<(Sym, Quantity)>,
    /// The clauses as written, those of a changed copy merged.
    pub clauses: Vec<Clause>,
}

impl Item {
    /// Whether anything says how it fails.
    pub fn has_failure_data(&self) -> bool {
        self.perfect || self.fixed.is_some() || !self.ageing.is_empty()
    }

    /// `duty` times `stress`, where either is given.
    pub fn factor(&self) -> Option<Real> {
        match (&self.duty, &self.stress) {
            (None, None) => None,
            (Some(d), None) => Some(d.value),
            (None, Some(s)) => Some(s.value),
            (Some(d), Some(s)) => Some(d.value * s.value),
        }
    }

    /// The figure of a clause, for `pump.rate`.
    pub(super) fn figure(&self, word: &str, names: &Names) -> Option<Quantity> {
        match word {
            "duty" => return self.duty.as_deref().cloned(),
            "stress" => return self.stress.as_deref().cloned(),
            _ => {}
        }
        if let Some((_, value)) = self.attributes.iter().find(|(w, _)| names.text(*w) == word) {
            return Some(value.clone());
        }
        if word == "fails"
            && let Some((chance, _)) = self.fixed
        {
            let mut quantity = Quantity::number(chance.fails());
            quantity.complement = Some(chance.works());
            return Some(quantity);
        }
        self.ageing.iter().find_map(|a| match (&a.pace, word) {
            (Pace::Rate(q), "rate") => Some(q.clone()),
            (Pace::Over(chance, _) | Pace::Each(chance), "fails") => {
                let mut quantity = Quantity::number(chance.fails());
                quantity.complement = Some(chance.works());
                Some(quantity)
            }
            (Pace::Mean(q), "mttf" | "mtbf") if names.text(a.clause.name) == word => Some(q.clone()),
            _ => None,
        })
    }

    /// The words that [`Item::figure`] knows here.
    pub(super) fn figure_words(&self, names: &Names) -> Vec<String> {
        let own = ["rate", "mttf", "mtbf", "fails", "duty", "stress"];
        let mut have: Vec<String> =
            own.iter().filter(|w| self.figure(w, names).is_some()).map(|w| (*w).to_string()).collect();
        have.extend(self.attributes.iter().map(|(w, _)| names.text(*w).to_string()));
        have
    }

    /// The first exposure that it ages by and `exposure` does not give.
    pub fn missing(&self, exposure: &Exposure) -> Option<&Ageing> {
        self.ageing.iter().find(|a| exposure.of(a.base).next().is_none())
    }

    /// The chance that it works throughout `exposure`.
    ///
    /// Constant rate: R = exp(−Λ) with Λ = Σ rate · duty · stress · Σ (amount · stress of the phase);
    /// a fixed probability and each way to fail are in series. Source: exponential law, for
    /// instance Rausand and Høyland, System Reliability Theory, ch. 2 (from memory).
    pub fn chance(&self, exposure: &Exposure) -> Chance {
        let mut chance = self.fixed.map_or(Chance::PERFECT, |(chance, _)| chance);
        let mut hazard = Real::ZERO;
        for ageing in &self.ageing {
            let amount = self.borne(exposure, ageing.base);
            hazard += match &ageing.pace {
                Pace::Rate(rate) => rate.value * amount,
                Pace::Mean(mean) => amount / mean.value,
                Pace::Each(each) => each.hazard() * amount,
                Pace::Over(each, over) => each.hazard() * amount / over.value,
            };
        }
        if !self.ageing.is_empty() {
            let aged = Chance::from_hazard(hazard);
            // exp(-Λ) is never zero: what left the range of numbers is carried as the least of them.
            let aged = if aged.works().is_zero() && hazard.is_finite() {
                Chance::new(Real::from(f64::from_bits(1)), Real::ONE)
            } else {
                aged
            };
            chance = chance.and(aged);
        }
        chance
    }

    /// How much of an exposure it bears, with all factors.
    fn borne(&self, exposure: &Exposure, base: Base) -> Real {
        let mut total = Real::ZERO;
        for part in exposure.of(base) {
            total += match &part.stress {
                Some(stress) => part.amount.value * stress.value,
                None => part.amount.value,
            };
        }
        self.factor().map_or(total, |f| total * f)
    }
}

impl Model<'_> {
    /// The item with a number.
    pub fn item(&self, id: u32) -> &Item {
        &self.item_list[id as usize]
    }

    /// The item that a definition is, if it is one: its own data, or its template's.
    pub(super) fn item_of_def(&mut self, def: DefId) -> Out<Option<u32>> {
        let mut value = self.usable(def)?;
        loop {
            value = self.tree.inside_groups(value);
            value = match self.tree.expr(value) {
                Expr::Name(sym) => match self.lookup(sym) {
                    Some(next) => self.usable(next)?,
                    None => return Ok(None),
                },
                Expr::Copy(x) | Expr::Settled(x, _) => match self.tree.expr(self.tree.inside_groups(x)) {
                    Expr::Name(_) => x,
                    _ => return Ok(None),
                },
                Expr::Item(_) | Expr::Changed(..) => return self.item_at(value).map(Some),
                Expr::Literal(_) => return self.number_item(value).map(Some),
                _ => return Ok(None),
            };
        }
    }

    /// The item that an expression states.
    ///
    /// # Errors
    /// What is wrong with its data.
    pub(super) fn item_at(&mut self, expr: ExprId) -> Out<u32> {
        if let Some(known) = self.items.get(&expr) {
            return *known;
        }
        let read = match self.tree.expr(expr) {
            Expr::Item(clauses) => self.read_item(expr, clauses),
            Expr::Changed(copy, clauses) => self.changed_item(copy, clauses),
            _ => return self.number_item(expr),
        };
        let out = read.map(|item| {
            self.item_list.push(item);
            self.item_list.len() as u32 - 1
        });
        self.items.insert(expr, out);
        out
    }

    /// A bare number in a structure: an item with that probability.
    pub(super) fn number_item(&mut self, expr: ExprId) -> Out<u32> {
        if let Some(known) = self.items.get(&expr) {
            return *known;
        }
        let out = self.figure(expr).and_then(|figure| {
            let place = self.tree.span(expr);
            if !figure.dim.is_none() {
                let what = self.units.describe(&figure.dim, &self.tree.names);
                return Err(self.fault(
                    Problem::error(Code::WrongKind, place, format!("{what} is no thing"))
                        .mend("write `rate …` before it for an item with that rate"),
                ));
            }
            let chance = self.probability(&figure, place, true)?;
            self.item_list.push(Item { span: place, fixed: Some((chance, None)), ..Item::default() });
            Ok(self.item_list.len() as u32 - 1)
        });
        self.items.insert(expr, out);
        out
    }

    fn read_item(&mut self, expr: ExprId, clauses: List) -> Out<Item> {
        let mut item = Item { span: self.tree.span(expr), ..Item::default() };
        let mut failed = None;
        let tree = self.tree;
        item.clauses.reserve_exact(clauses.len());
        for clause in tree.clauses(clauses) {
            if let Err(fault) = self.read_clause(&mut item, *clause) {
                failed = failed.or(Some(fault));
            }
        }
        failed.map_or(Ok(item), Err)
    }

    /// `a pump, stress 2`: the template's clauses, those of the same word replaced.
    fn changed_item(&mut self, copy: ExprId, clauses: List) -> Out<Item> {
        let template = match self.tree.expr(copy) {
            Expr::Copy(of) | Expr::Settled(of, _) => self.tree.inside_groups(of),
            _ => copy,
        };
        let place = self.tree.span(template);
        let known = match self.tree.expr(template) {
            Expr::Name(sym) => match self.lookup(sym) {
                Some(def) => self.item_of_def(def)?,
                None => return Err(self.faulty(template).unwrap_or(Fault(0))),
            },
            Expr::Literal(_) => Some(self.number_item(template)?),
            _ => None,
        };
        let Some(known) = known else {
            let text = self.text_of(template);
            return Err(self.fault(
                Problem::error(
                    Code::WrongKind,
                    place,
                    format!("`{text}` is a structure, and a changed copy is of an item"),
                )
                .mend("change the part that has the clause, and build the structure from it"),
            ));
        };
        let old = self.item(known).clone();
        let new = self.tree.clauses(clauses).to_vec();
        let mut item = Item { span: self.tree.span(copy), ..Item::default() };
        let kept: Vec<Clause> =
            old.clauses.iter().filter(|o| !new.iter().any(|n| replaces(n, o))).copied().collect();
        if old.clauses.is_empty() && !new.iter().any(|n| is_failure(n.word)) {
            item.fixed = old.fixed;
        }
        for clause in kept.into_iter().chain(new) {
            self.read_clause(&mut item, clause)?;
        }
        Ok(item)
    }

    fn read_clause(&mut self, item: &mut Item, clause: Clause) -> Out<()> {
        let word = self.tree.names.text(clause.name);
        // Ways to fail may stand twice, for different exposures; `add_pace` looks at those.
        let way =
            matches!(clause.word, ClauseWord::Fails | ClauseWord::Rate | ClauseWord::Mttf | ClauseWord::Mtbf);
        if !way
            && let Some(first) = item.clauses.iter().find(|c| c.word == clause.word && c.name == clause.name)
        {
            let shown = if word.is_empty() { "a bare probability".to_string() } else { format!("`{word}`") };
            return Err(self.fault(
                Problem::error(
                    Code::RepeatedClause,
                    clause.span,
                    format!("{shown} stands twice on one item"),
                )
                .label(first.span, "first here")
                .mend("keep one of the two"),
            ));
        }
        item.clauses.push(clause);
        match clause.word {
            ClauseWord::Perfect => item.perfect = true,
            ClauseWord::Works | ClauseWord::Fails => self.read_probability(item, clause)?,
            ClauseWord::Rate | ClauseWord::Mttf | ClauseWord::Mtbf => self.read_pace(item, clause)?,
            ClauseWord::Duty => {
                item.duty =
                    clause.value.map(|v| self.factor(v, "duty", Some(1.0)).map(Box::new)).transpose()?;
            }
            ClauseWord::Stress => {
                item.stress =
                    clause.value.map(|v| self.factor(v, "stress", None).map(Box::new)).transpose()?;
            }
            ClauseWord::Source => {
                if let Some(Expr::Name(sym)) = clause.value.map(|v| self.tree.expr(v)) {
                    item.source = Some(sym);
                }
            }
            ClauseWord::Attribute => self.read_attribute(item, clause)?,
        }
        if item.perfect && (item.fixed.is_some() || !item.ageing.is_empty()) {
            return Err(self.fault(
                Problem::error(
                    Code::ContradictoryData,
                    clause.span,
                    "a perfect item cannot fail, and this says how it does",
                )
                .mend("take `perfect` away, or the other clause"),
            ));
        }
        Ok(())
    }

    fn read_probability(&mut self, item: &mut Item, clause: Clause) -> Out<()> {
        let Some(value) = clause.value else { return Ok(()) };
        let place = self.tree.span(value);
        let figure = self.figure(value)?;
        let works = clause.word == ClauseWord::Works;
        if let Some((base, -1)) = figure.dim.single() {
            return self.read_each(item, clause, &figure, base);
        }
        if !figure.dim.is_none() {
            let what = self.units.describe(&figure.dim, &self.tree.names);
            let mend = if works {
                "write the clause's word before it, as in `mttf 50 kh`"
            } else {
                "write `fails 0.02` or `fails 0.02 over 1 yr`"
            };
            return Err(self.fault(
                Problem::error(
                    Code::WrongUnit,
                    place,
                    format!("a probability has no unit, and this is {what}"),
                )
                .mend(mend),
            ));
        }
        let chance = self.probability(&figure, place, works)?;
        match clause.over {
            None => {
                if let Some((_, first)) = item.fixed {
                    let first = first.map_or(place, |c| c.span);
                    return Err(self.fault(
                        Problem::error(
                            Code::ContradictoryData,
                            clause.span,
                            "one item has two probabilities",
                        )
                        .label(first, "the first")
                        .mend("keep one; two parts in series are written `A -> B`"),
                    ));
                }
                item.fixed = Some((chance, Some(clause)));
                Ok(())
            }
            Some(over) => {
                let amount = self.figure(over)?;
                let place = self.tree.span(over);
                let base = self.exposure_base(&amount, 1, place, &|| {
                    "after `over` stands a time or a declared exposure".to_string()
                })?;
                if amount.value <= Real::ZERO {
                    return Err(self.fault(
                        Problem::error(Code::OutsideRange, place, "the exposure after `over` is above zero")
                            .mend("write how long the probability is for"),
                    ));
                }
                self.add_pace(item, Ageing { base, pace: Pace::Over(chance, amount), clause })
            }
        }
    }

    /// `fails 0.001 /start`
    fn read_each(&mut self, item: &mut Item, clause: Clause, figure: &Quantity, base: Base) -> Out<()> {
        let place = clause.value.map_or(clause.span, |v| self.tree.span(v));
        if !matches!(base, Base::Word(w) if self.units.exposures.contains_key(&w))
            || clause.word == ClauseWord::Works
        {
            return Err(self.fault(
                Problem::error(
                    Code::WrongUnit,
                    place,
                    "a probability is per mission or per occurrence, not per time",
                )
                .mend(
                    "write `rate …` for a rate per time, `fails … over 1 yr` for a probability over a time",
                ),
            ));
        }
        let bare = Quantity { dim: Dim::NONE, ..figure.clone() };
        let each = self.probability(&bare, place, false)?;
        self.add_pace(item, Ageing { base, pace: Pace::Each(each), clause })
    }

    fn read_pace(&mut self, item: &mut Item, clause: Clause) -> Out<()> {
        let Some(value) = clause.value else { return Ok(()) };
        let place = self.tree.span(value);
        let figure = self.figure(value)?;
        let is_rate = clause.word == ClauseWord::Rate;
        let tree = self.tree;
        let word = tree.names.text(clause.name);
        let (power, wants) = if is_rate {
            (-1, "takes a rate: /h, /Mh, /yr, FIT, %/kh, or per a declared exposure")
        } else {
            (1, "takes a time: h, kh, Mh, yr, or a declared exposure")
        };
        let wants = || format!("`{word}` {wants}");
        let base = self.exposure_base(&figure, power, place, &wants)?;
        if figure.value.is_negative() || (!is_rate && figure.value.is_zero()) {
            return Err(self.fault(if is_rate {
                Problem::error(Code::OutsideRange, place, format!("`{word}` is not below zero"))
                    .mend("write it without the minus")
            } else {
                Problem::error(Code::OutsideRange, place, format!("`{word}` is above zero"))
                    .mend("write the mean time to a failure; what cannot fail is `perfect`")
            }));
        }
        let pace = if is_rate { Pace::Rate(figure) } else { Pace::Mean(figure) };
        self.add_pace(item, Ageing { base, pace, clause })
    }

    fn add_pace(&mut self, item: &mut Item, ageing: Ageing) -> Out<()> {
        if let Some(first) = item.ageing.iter().find(|a| a.base == ageing.base) {
            let first = first.clause.span;
            return Err(self.fault(
                Problem::error(
                    Code::ContradictoryData,
                    ageing.clause.span,
                    "one item has two rates for one exposure",
                )
                .label(first, "the first")
                .mend("keep one, or add the rates: `rate 2 /Mh + 3 /Mh`"),
            ));
        }
        // Nearly all items have one: left to itself, the list makes room for four.
        item.ageing.reserve_exact(1);
        item.ageing.push(ageing);
        Ok(())
    }

    /// The base of a figure that must be an exposure (`power` 1) or a rate (−1).
    fn exposure_base(
        &mut self,
        figure: &Quantity,
        power: i16,
        place: Span,
        wants: &dyn Fn() -> String,
    ) -> Out<Base> {
        let fits = |b: Base, this: &Model<'_>| match b {
            Base::Time => true,
            Base::Word(w) => this.units.exposures.contains_key(&w),
            Base::Mass => false,
        };
        match figure.dim.single() {
            Some((base, p)) if p == power && fits(base, self) => Ok(base),
            None if figure.dim.is_none() => Err(self
                .fault(Problem::error(Code::MissingUnit, place, "this value needs its unit").mend(wants()))),
            _ => {
                let what = self.units.describe(&figure.dim, &self.tree.names);
                let problem = Problem::error(
                    Code::WrongUnit,
                    place,
                    format!("this is {what}, which does not fit here"),
                );
                Err(self.fault(problem.mend(wants())))
            }
        }
    }

    fn read_attribute(&mut self, item: &mut Item, clause: Clause) -> Out<()> {
        let Some(value) = clause.value else { return Ok(()) };
        let word = self.tree.names.text(clause.name);
        let wanted = match word {
            "cost" => Dim::NONE,
            "mass" => Dim::of(Base::Mass, 1),
            _ => match self.units.attributes.get(&clause.name) {
                None => {
                    let declared: Vec<&str> =
                        self.units.attributes.keys().map(|s| self.tree.names.text(*s)).collect();
                    let mut problem = unknown_clause(clause.word_span, word, declared.into_iter());
                    if problem.mends.iter().any(|m| m.starts_with("did you mean")) {
                        problem = problem.mend(format!("or declare it: `attribute {word}`"));
                    } else {
                        let message = format!("`{word}` is no clause and no declared attribute");
                        problem = Problem::error(Code::Undeclared, clause.word_span, message)
                            .mend(format!("declare it on a line of its own: `attribute {word}`"));
                    }
                    return Err(self.fault(problem));
                }
                Some((None, _)) => Dim::NONE,
                Some((Some(unit), _)) => match self.tree.names.text(*unit) {
                    u if self.units.hours(u).is_some() => Dim::of(Base::Time, 1),
                    "kg" | "g" | "t" => Dim::of(Base::Mass, 1),
                    "FIT" => Dim::of(Base::Time, -1),
                    _ => Dim::of(Base::Word(*unit), 1),
                },
            },
        };
        let figure = self.figure(value)?;
        if figure.dim != wanted {
            let place = self.tree.span(value);
            let have = self.units.describe(&figure.dim, &self.tree.names);
            let want = self.units.describe(&wanted, &self.tree.names);
            let code = if figure.dim.is_none() { Code::MissingUnit } else { Code::WrongUnit };
            let symbol = self.units.symbol(&wanted, &self.tree.names);
            let example =
                if symbol.is_empty() { format!("{word} 12") } else { format!("{word} 12 {symbol}") };
            let problem = Problem::error(code, place, format!("`{word}` takes {want}, and this is {have}"));
            return Err(self.fault(problem.mend(format!("write it as in `{example}`"))));
        }
        item.attributes.push((clause.name, figure));
        Ok(())
    }

    /// A figure as a probability, with both tails.
    pub(super) fn probability(&mut self, figure: &Quantity, place: Span, works: bool) -> Out<Chance> {
        let value = figure.value;
        // A huge figure's error is huge, too: it must not make the figure fit.
        let slack = figure.error.max(STEP);
        let slack = slack.min(1e-9);
        if value.is_negative()
            || value.to_f64() > 1.0 + slack
            || !value.is_finite()
            || (value - Real::ONE).to_f64() > slack
        {
            let mut problem = Problem::error(Code::OutsideRange, place, "a probability lies between 0 and 1");
            let text = self.sources.text(place);
            // `98` was meant as a percentage, `1.2` or `3 in 2` hardly.
            if (2.0..=100.0).contains(&value.to_f64())
                && text.bytes().all(|b| b == b'.' || b.is_ascii_digit())
            {
                problem = problem.mend(format!("write a percentage with its sign: `{text}%`"));
            } else {
                problem = problem.mend("write it as a decimal from 0 to 1, as `98%`, or as `1 in 500`");
            }
            return Err(self.fault(problem));
        }
        let value = value.min(Real::ONE);
        let other = figure.complement.unwrap_or(Real::ONE - value);
        Ok(if works { Chance::new(value, other) } else { Chance::new(other, value) })
    }
}

fn is_failure(word: ClauseWord) -> bool {
    matches!(
        word,
        ClauseWord::Works
            | ClauseWord::Perfect
            | ClauseWord::Fails
            | ClauseWord::Rate
            | ClauseWord::Mttf
            | ClauseWord::Mtbf
    )
}

/// Whether a new clause of a changed copy takes the place of an old one: the
/// same word, or another way to state how it fails.
fn replaces(new: &Clause, old: &Clause) -> bool {
    (new.word == old.word && new.name == old.name) || (is_failure(new.word) && is_failure(old.word))
}
