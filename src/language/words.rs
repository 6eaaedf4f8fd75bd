//! The words that the language knows, and which of them this version computes.

/// What a word means where a clause may begin.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub enum ClauseWord {
    /// A bare probability that it works: `0.98`, `98%`.
    Works,
    /// `perfect`
    Perfect,
    /// `fails 0.02`
    Fails,
    /// `rate 12 /Mh`
    Rate,
    /// `mttf 50 kh`
    Mttf,
    /// `mtbf 50 kh`
    Mtbf,
    /// `duty 30%`
    Duty,
    /// `stress 8`
    Stress,
    /// `source "…"`
    Source,
    /// `cost 1200`, `mass 3.2 kg` or a declared one; the word is the clause's name.
    Attribute,
}

/// Clause words that this version computes, with their meaning.
pub const CLAUSES: &[(&str, ClauseWord)] = &[
    ("perfect", ClauseWord::Perfect),
    ("fails", ClauseWord::Fails),
    ("rate", ClauseWord::Rate),
    ("mttf", ClauseWord::Mttf),
    ("mtbf", ClauseWord::Mtbf),
    ("duty", ClauseWord::Duty),
    ("stress", ClauseWord::Stress),
    ("source", ClauseWord::Source),
    ("cost", ClauseWord::Attribute),
    ("mass", ClauseWord::Attribute),
];

/// Clause words of the design that a later version brings.
pub const LATER_CLAUSES: &[&str] = &[
    "weibull",
    "lognormal",
    "normal",
    "gamma",
    "age",
    "renewed",
    "repair",
    "mttr",
    "proof",
    "detected",
    "dangerous",
    "tested",
];

/// Words of structure that cannot be names unless quoted.
pub const RESERVED: &[&str] = &[
    "of", "all", "any", "else", "with", "sharing", "separate", "routes", "perfect", "fails", "when", "and",
    "or", "not",
];

/// Words that begin a line of their own.
pub const STARTERS: &[&str] = &["mission", "digits", "year", "use", "require", "exposure", "attribute"];

/// Questions that this version answers.
pub const QUESTIONS: &[&str] = &[
    "R",
    "F",
    "cuts",
    "paths",
    "single points",
    "count",
    "rank",
    "steps",
    "assumptions",
    "inputs",
    "total",
    "Birnbaum",
    "criticality",
    "FV",
    "RAW",
    "RRW",
    "doubled",
    "made perfect",
];

/// Questions of the design that a later version brings.
pub const LATER_QUESTIONS: &[&str] = &[
    "A",
    "U",
    "PFD",
    "PFH",
    "MTTF",
    "MTBF",
    "MDT",
    "average rate",
    "hazard",
    "frequency",
    "downtime",
    "life",
    "table",
    "solve",
    "trials",
    "diagram",
    "plot",
    "compare",
    "spread",
    "allot",
    "reinforce",
    "bound",
];

/// Functions in formulas.
pub const FUNCTIONS: &[&str] = &["exp", "ln", "log10", "sqrt", "min", "max"];

/// First words of the two-word calls, with their second words.
pub const TWO_WORD_CALLS: &[(&str, &str)] = &[("single", "points"), ("made", "perfect"), ("average", "rate")];

/// The clause that `word` begins, if any.
pub fn clause(word: &str) -> Option<ClauseWord> {
    CLAUSES.iter().find(|(w, _)| *w == word).map(|(_, c)| *c)
}

/// Whether `word` begins a clause, now or later.
pub fn begins_clause(word: &str) -> bool {
    may_be_word(word) && (clause(word).is_some() || LATER_CLAUSES.contains(&word))
}

/// Whether `word` cannot be a name unless it is quoted.
pub fn is_reserved(word: &str) -> bool {
    may_be_word(word) && (RESERVED.contains(&word) || begins_clause(word) || STARTERS.contains(&word))
}

/// Reserved words are of few small letters: most names are told from them
/// without looking through the lists.
fn may_be_word(word: &str) -> bool {
    word.len() <= LONGEST_WORD && word.bytes().all(|b| b.is_ascii_lowercase())
}

/// Letters of the longest reserved word.
const LONGEST_WORD: usize = 9;

/// The known word nearest to `word`, when one is near enough to be meant.
///
/// Distance is Damerau's (optimal string alignment: one insertion, deletion,
/// replacement or swap of neighbours counts 1); up to a third of the letters,
/// at least one, may differ.
pub fn nearest<'a>(word: &str, known: impl Iterator<Item = &'a str>) -> Option<&'a str> {
    let letters: Vec<char> = word.chars().collect();
    // A single letter is near to every other: only its case may differ.
    let allowed = if letters.len() == 1 { 0 } else { (letters.len() / 3).max(1) };
    let mut best: Option<(usize, &str)> = None;
    for candidate in known {
        let other: Vec<char> = candidate.chars().take(letters.len() + allowed + 1).collect();
        if other.len().abs_diff(letters.len()) > allowed || candidate == word {
            continue;
        }
        let mut d = distance(&letters, &other);
        if candidate.to_lowercase() == word.to_lowercase() {
            d = 0;
        }
        if d <= allowed && best.is_none_or(|(b, name)| d < b || (d == b && candidate < name)) {
            best = Some((d, candidate));
        }
    }
    best.map(|(_, name)| name)
}

fn distance(a: &[char], b: &[char]) -> usize {
    let mut before: Vec<usize> = vec![0; b.len() + 1];
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i; b.len() + 1];
        for j in 1..=b.len() {
            let replace = last[j - 1] + usize::from(a[i - 1] != b[j - 1]);
            row[j] = replace.min(last[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                row[j] = row[j].min(before[j - 2] + 1);
            }
        }
        before = std::mem::replace(&mut last, row);
    }
    last[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reserved_words_are_of_few_small_letters() {
        let clauses = CLAUSES.iter().map(|(w, _)| *w);
        for word in clauses.chain([LATER_CLAUSES, RESERVED, STARTERS].concat()) {
            assert!(is_reserved(word), "{word}");
        }
        assert!(!is_reserved("pump_1") && !is_reserved("Rate") && !is_reserved("separately"));
    }

    #[test]
    fn nearest_allows_a_third_of_the_letters() {
        let known = ["strainer", "pump", "valve"];
        assert_eq!(nearest("strainr", known.into_iter()), Some("strainer"));
        assert_eq!(nearest("pupm", known.into_iter()), Some("pump"));
        assert_eq!(nearest("Pump", known.into_iter()), Some("pump"));
        assert_eq!(nearest("r", ["F", "R"].into_iter()), Some("R"));
        assert_eq!(nearest("C", ["A", "B"].into_iter()), None);
        assert_eq!(nearest("gearbox", known.into_iter()), None);
    }
}
