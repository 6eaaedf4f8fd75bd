//! Steps: one for each thing that is computed, in the order they rest on each other.

use super::formula::{Formula, Side};
use crate::number::{Chance, Real};
use crate::source::Span;
use crate::system::Part;
use rustc_hash::{FxHashMap, FxHashSet};

/// How a step computes, with its published source.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Rule {
    /// The probability as the note gives it.
    Given,
    /// A constant rate over the exposure.
    Exposure,
    /// The same probability at each occurrence.
    Occurrences,
    /// Several ways to fail on one item, in series.
    Ways,
    /// All of several independent things.
    Series,
    /// Any of several independent things.
    Parallel,
    /// At least k of n things with equal chances.
    LikeVote,
    /// At least k of n things with unequal chances.
    UnlikeVote,
    /// Over the states of a thing that stands in several places.
    TotalProbability,
    /// A node of a decision diagram.
    DiagramNode,
    /// A state of a network on the frontier of what is decided.
    NetworkState,
    /// A network of too many states to be shown.
    Network,
    /// Arithmetic that the note asks for.
    Arithmetic,
    /// A measure of importance.
    Importance,
}

impl Rule {
    /// The rule's name.
    pub fn name(self) -> &'static str {
        match self {
            Rule::Given => "as given",
            Rule::Exposure => "exponential law",
            Rule::Occurrences => "independent occurrences",
            Rule::Ways => "ways to fail in series",
            Rule::Series => "series",
            Rule::Parallel => "parallel",
            Rule::LikeVote => "k of n, like members",
            Rule::UnlikeVote => "k of n, unlike members",
            Rule::TotalProbability => "total probability",
            Rule::DiagramNode => "diagram node",
            Rule::NetworkState => "state of a network",
            Rule::Network => "frontier method",
            Rule::Arithmetic => "arithmetic",
            Rule::Importance => "importance",
        }
    }

    /// Where the rule is published; empty for the note's own data and arithmetic.
    /// Sources are cited from memory.
    pub fn source(self) -> &'static str {
        match self {
            Rule::Given | Rule::Arithmetic => "",
            Rule::Occurrences => "product law for independent events",
            Rule::Exposure | Rule::Ways => "IEC 61703; Rausand and Hoyland, System Reliability Theory, ch. 2",
            Rule::Series | Rule::Parallel => "IEC 61078, reliability block diagrams",
            Rule::LikeVote => "IEC 61078, m out of n, binomial law",
            Rule::UnlikeVote => "Barlow and Heidtmann, IEEE Trans. Reliability R-33 (1984)",
            Rule::TotalProbability => {
                "Barlow and Proschan, Statistical Theory of Reliability (1975), pivotal decomposition"
            }
            Rule::Importance => "Birnbaum (1969); Rausand and Hoyland, System Reliability Theory, ch. 5",
            Rule::NetworkState | Rule::Network => {
                "Carlier and Lucet, Discrete Applied Mathematics 65 (1996); Hardy, Lucet and Limnios, IEEE Trans. Reliability 56 (2007)"
            }
            Rule::DiagramNode => "Bryant, IEEE Trans. Computers C-35 (1986); Rauzy (1993)",
        }
    }
}

/// What a step comes to.
#[derive(Clone, PartialEq, Debug)]
pub enum Outcome {
    /// A probability, both tails.
    Chance(Chance),
    /// A figure in a unit.
    Figure(Real, String),
}

/// One step.
#[derive(Clone, PartialEq, Debug)]
pub struct Step {
    /// The thing or things that it is about; like copies share a step.
    pub thing: String,
    /// Its name in formulas: the first of several.
    pub symbol: String,
    /// Where the thing is written.
    pub place: Option<Span>,
    /// How it is computed.
    pub rule: Rule,
    /// The formula for "works", or for the figure.
    pub works: Formula,
    /// The formula for "fails".
    pub fails: Formula,
    /// Which of the two is printed.
    pub shown: Side,
    /// What it comes to.
    pub outcome: Outcome,
}

impl Step {
    /// The formula that is printed.
    pub fn formula(&self) -> &Formula {
        match self.shown {
            Side::Works => &self.works,
            Side::Fails => &self.fails,
        }
    }
}

/// All steps of an answer.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct StepList {
    /// The steps; a formula refers to them by position.
    pub steps: Vec<Step>,
    /// The defaults that acted.
    pub assumptions: Vec<String>,
    /// What the reader should know of the list itself.
    pub remarks: Vec<String>,
    pub(super) ledger: Ledger,
}

/// What has been written, so that several systems in one list state what they
/// have in common once.
#[derive(Clone, PartialEq, Debug, Default)]
pub(super) struct Ledger {
    /// The step that computes something, by what it computes.
    pub(super) known: FxHashMap<String, usize>,
    /// The names of the things that a step is about.
    pub(super) names: Vec<Vec<String>>,
    pub(super) named: FxHashSet<(usize, String)>,
    /// The exposures so far: data under different ones are different.
    pub(super) exposures: Vec<Vec<Part>>,
    /// How many systems have been written.
    pub(super) systems: usize,
}

impl StepList {
    /// The chances of all steps by position; figures stand as perfect, and no formula uses them.
    pub fn results(&self) -> Vec<Chance> {
        self.steps
            .iter()
            .map(|s| match s.outcome {
                Outcome::Chance(chance) => chance,
                Outcome::Figure(..) => Chance::PERFECT,
            })
            .collect()
    }
}
