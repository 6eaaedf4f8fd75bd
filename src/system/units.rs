//! Units: the trade's times and rates, and what a note declares.

use super::quantity::{Base, Dim};
use crate::language::{Names, Sym, Unit, UnitForm, words};
use crate::number::Real;
use crate::source::{Code, Problem, Span};
use rustc_hash::FxHashMap;

/// Time units with their length in seconds; a year is set apart.
const TIMES: &[(&str, f64)] = &[
    ("s", 1.0),
    ("min", 60.0),
    ("h", 3600.0),
    ("hr", 3600.0),
    ("hrs", 3600.0),
    ("hour", 3600.0),
    ("hours", 3600.0),
    ("kh", 3_600_000.0),
    ("Mh", 3_600_000_000.0),
    ("d", 86_400.0),
    ("day", 86_400.0),
    ("days", 86_400.0),
    ("wk", 604_800.0),
    ("week", 604_800.0),
    ("weeks", 604_800.0),
];

const YEARS: &[&str] = &["yr", "year", "years"];

const MASSES: &[(&str, f64)] = &[("kg", 1.0), ("g", 1e-3), ("t", 1e3)];

/// Whether a word is the year, or years.
pub(super) fn is_year(word: &str) -> bool {
    YEARS.contains(&word)
}

/// The units that a set of notes knows.
#[derive(Clone, Debug)]
pub struct Units {
    /// Hours in a year: 8760 unless a line `year` says otherwise.
    pub year: Real,
    /// Declared exposures, with their places.
    pub exposures: FxHashMap<Sym, Span>,
    /// Declared attributes, with their units and places.
    pub attributes: FxHashMap<Sym, (Option<Sym>, Span)>,
    /// Units of declared attributes.
    pub attribute_units: FxHashMap<Sym, Span>,
}

impl Default for Units {
    fn default() -> Units {
        Units {
            year: Real::from(8760.0),
            exposures: FxHashMap::default(),
            attributes: FxHashMap::default(),
            attribute_units: FxHashMap::default(),
        }
    }
}

/// A declared word as it stands behind an answer: in one piece, since quotes
/// or blanks there would look like a remark of the writer's.
pub fn unit_word(text: &str) -> String {
    text.chars().map(|c| if c.is_alphanumeric() || matches!(c, '.' | '-') { c } else { '_' }).collect()
}

impl Units {
    /// Hours in the time unit `word`.
    pub fn hours(&self, word: &str) -> Option<Real> {
        if YEARS.contains(&word) {
            return Some(self.year);
        }
        let seconds = TIMES.iter().find(|(w, _)| *w == word)?.1;
        Some(Real::from(seconds) / Real::from(3600.0))
    }

    /// Whether an answer of these notes may carry this word as its unit.
    pub fn is_unit(&self, word: &str, names: &Names) -> bool {
        self.hours(word).is_some()
            || word == "FIT"
            || MASSES.iter().any(|(w, _)| *w == word)
            || names
                .find(word)
                .is_some_and(|s| self.exposures.contains_key(&s) || self.attribute_units.contains_key(&s))
    }

    /// What one of `unit` is, in base units.
    ///
    /// # Errors
    /// A unit that is neither the trade's nor declared.
    pub fn resolve(&self, unit: Unit, names: &Names) -> Result<(Dim, Real), Box<Problem>> {
        let word = names.text(unit.word);
        let percent = Real::ONE / Real::from(100.0);
        let found = match unit.form {
            UnitForm::Plain => self.plain(unit.word, word),
            UnitForm::Per => self.per(unit.word, word),
            UnitForm::PercentPer => self.per(unit.word, word).map(|(d, f)| (d, f * percent)),
        };
        found.ok_or_else(|| Box::new(self.unknown(unit, word, names)))
    }

    fn plain(&self, sym: Sym, word: &str) -> Option<(Dim, Real)> {
        if let Some(hours) = self.hours(word) {
            return Some((Dim::of(Base::Time, 1), hours));
        }
        if word == "FIT" {
            return Some((Dim::of(Base::Time, -1), Real::ONE / Real::from(1e9)));
        }
        if let Some((_, kg)) = MASSES.iter().find(|(w, _)| *w == word) {
            let factor = if *kg < 1.0 { Real::ONE / Real::from(1.0 / kg) } else { Real::from(*kg) };
            return Some((Dim::of(Base::Mass, 1), factor));
        }
        let declared = self.exposures.contains_key(&sym) || self.attribute_units.contains_key(&sym);
        declared.then(|| (Dim::of(Base::Word(sym), 1), Real::ONE))
    }

    fn per(&self, sym: Sym, word: &str) -> Option<(Dim, Real)> {
        if let Some(hours) = self.hours(word) {
            return Some((Dim::of(Base::Time, -1), Real::ONE / hours));
        }
        self.exposures.contains_key(&sym).then(|| (Dim::of(Base::Word(sym), -1), Real::ONE))
    }

    fn unknown(&self, unit: Unit, word: &str, names: &Names) -> Problem {
        let shown = match unit.form {
            UnitForm::Plain => word.to_string(),
            UnitForm::Per => format!("/{word}"),
            UnitForm::PercentPer => format!("%/{word}"),
        };
        let problem =
            Problem::error(Code::UnknownUnit, unit.span, format!("the unit `{shown}` is not known"));
        let declared = self.exposures.keys().chain(self.attribute_units.keys()).map(|s| names.text(*s));
        let known = TIMES.iter().map(|(w, _)| *w).chain(YEARS.iter().copied()).chain(declared);
        let known = known.chain(MASSES.iter().map(|(w, _)| *w)).chain(["FIT"]);
        match words::nearest(word, known) {
            Some(near) => problem.mend(format!("did you mean `{}`?", shown.replace(word, near))),
            None => problem.mend(format!(
                "units of time are s, min, h, kh, Mh, d, wk, yr; rates are / and one of these, FIT, %/kh; declare another with `exposure {word}`"
            )),
        }
    }

    /// A dimension in words, for messages.
    pub fn describe(&self, dim: &Dim, names: &Names) -> String {
        if dim.is_none() {
            return "a bare number".to_string();
        }
        match dim.single() {
            Some((Base::Time, 1)) => "a time".to_string(),
            Some((Base::Time, -1)) => "a rate per time".to_string(),
            Some((Base::Mass, 1)) => "a mass".to_string(),
            Some((Base::Word(w), 1)) => format!("a number of `{}`", names.text(w)),
            Some((Base::Word(w), -1)) => format!("a rate per `{}`", names.text(w)),
            _ => format!("a figure in {}", self.symbol(dim, names)),
        }
    }

    /// The unit in which a figure of this dimension is shown: `h`, `/h`, `kg`, `start`, `h·kg/start`.
    pub fn symbol(&self, dim: &Dim, names: &Names) -> String {
        let mut above: Vec<String> = Vec::new();
        let mut below: Vec<String> = Vec::new();
        for (base, power) in dim.parts() {
            let word = match base {
                Base::Time => "h".to_string(),
                Base::Mass => "kg".to_string(),
                Base::Word(w) => unit_word(names.text(*w)),
            };
            let size = power.unsigned_abs();
            let text = if size == 1 { word } else { format!("{word}^{size}") };
            if *power > 0 { above.push(text) } else { below.push(text) }
        }
        let mut out = above.join("·");
        for text in below {
            out.push('/');
            out.push_str(&text);
        }
        out
    }
}
