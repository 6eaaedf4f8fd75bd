//! What is wrong, or worth a remark, at a place in a source.

use super::Span;

/// How much a [`Problem`] weighs.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum Level {
    /// Worth knowing; the answers stand.
    Remark,
    /// What was written cannot be used as it stands.
    Error,
}

/// A further place that a problem points at, with what is to be seen there.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Label {
    /// The place.
    pub place: Span,
    /// What is to be seen there; one short phrase.
    pub text: String,
}

/// One problem: code, cause, places and mends.
///
/// `message` states the cause in lower case without a full stop and holds no
/// `#` outside double quotes, since it may stand in a note as an answer
/// (`? ! message`). Each of `mends` is something the writer can do.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Problem {
    /// What kind of problem it is; `tieback explain` knows each.
    pub code: Code,
    /// Error or remark.
    pub level: Level,
    /// The cause.
    pub message: String,
    /// The place that is marked.
    pub place: Span,
    /// What stands under the mark; may be empty.
    pub mark: String,
    /// Other places involved.
    pub labels: Vec<Label>,
    /// What to do about it.
    pub mends: Vec<String>,
}

impl Problem {
    /// An error at `place`.
    pub fn error(code: Code, place: Span, message: impl Into<String>) -> Problem {
        Problem {
            code,
            level: Level::Error,
            message: message.into(),
            place,
            mark: String::new(),
            labels: Vec::new(),
            mends: Vec::new(),
        }
    }

    /// A remark at `place`.
    pub fn remark(code: Code, place: Span, message: impl Into<String>) -> Problem {
        Problem { level: Level::Remark, ..Problem::error(code, place, message) }
    }

    /// Adds a mend.
    #[must_use]
    pub fn mend(mut self, text: impl Into<String>) -> Problem {
        self.mends.push(text.into());
        self
    }

    /// Sets the words under the mark.
    #[must_use]
    pub fn mark(mut self, text: impl Into<String>) -> Problem {
        self.mark = text.into();
        self
    }

    /// Adds another place.
    #[must_use]
    pub fn label(mut self, place: Span, text: impl Into<String>) -> Problem {
        self.labels.push(Label { place, text: text.into() });
        self
    }
}

macro_rules! codes {
    ($($(#[$doc:meta])* $variant:ident = $id:literal,)*) => {
        /// The kinds of problem, each with the word that `tieback explain` takes.
        #[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
        pub enum Code { $($(#[$doc])* $variant,)* }

        impl Code {
            /// Every code.
            pub const ALL: &'static [Code] = &[$(Code::$variant,)*];

            /// The code as it is written in messages.
            pub fn id(self) -> &'static str {
                match self { $(Code::$variant => $id,)* }
            }
        }
    };
}

codes! {
    // --- reading ---
    /// A character that the language does not use.
    StrayCharacter = "stray-character",
    /// A curly quote or a long dash that a word processor put there.
    TypographicCharacter = "typographic-character",
    /// A number that is not written as a decimal.
    MalformedNumber = "malformed-number",
    /// A quoted name or text without its closing quote.
    UnclosedQuote = "unclosed-quote",
    /// A parenthesis without its partner.
    UnbalancedParenthesis = "unbalanced-parenthesis",
    /// Something else was expected here.
    UnexpectedToken = "unexpected-token",
    /// A line that ends before it is complete.
    UnfinishedLine = "unfinished-line",
    /// `->` and `//` (or `and` and `or`, or a bare `k of`) without parentheses.
    MixedOperators = "mixed-operators",
    /// A word of the language used as a name.
    ReservedWord = "reserved-word",
    /// A word that begins no clause.
    UnknownClause = "unknown-clause",
    /// The same clause twice on one item.
    RepeatedClause = "repeated-clause",
    /// Part of the language that this version does not compute yet.
    NotKnownYet = "not-known-yet",
    /// Nested deeper than the program reads.
    TooDeep = "too-deep",
    /// Text after a question that is not shaped like an answer.
    NotAnAnswer = "not-an-answer",
    /// A question inside a question, or one with nothing asked.
    MalformedQuestion = "malformed-question",
    // --- places in documents ---
    /// A comment pair without its closer.
    UnclosedPair = "unclosed-pair",
    /// A closer without an opener.
    StrayCloser = "stray-closer",
    /// A comment pair where none can be filled.
    MisplacedPair = "misplaced-pair",
    /// A pair at the start of a line, which Markdown shows as HTML.
    PairStartsLine = "pair-starts-line",
    /// A table that takes no part, or not as it stands.
    TableShape = "table-shape",
    /// A header that looks like a known one.
    TableHeader = "table-header",
    /// A cell that holds what it cannot.
    TableCell = "table-cell",
    /// A block that is never closed.
    UnclosedFence = "unclosed-fence",
    /// A block whose info word is nearly the one that is read.
    NearlyABlock = "nearly-a-block",
    /// Bytes that are not UTF-8.
    NotUtf8 = "not-utf8",
    /// A file that could not be read or written.
    FileAccess = "file-access",
    /// A file that a note uses and that cannot be had, or says nothing.
    UnusableFile = "unusable-file",
    /// Nothing for tieback in a file.
    NothingToDo = "nothing-to-do",
    // --- names and things ---
    /// A name that nothing defines.
    UnknownName = "unknown-name",
    /// A name that two lines define.
    DefinedTwice = "defined-twice",
    /// Definitions that rest on each other in a circle.
    Circle = "circle",
    /// Several names for one bare name.
    SeveralNames = "several-names",
    /// Two names that differ by case or look-alike letters only.
    LookAlikeNames = "look-alike-names",
    /// Another name for the same thing.
    SameThing = "same-thing",
    /// A figure where a thing is needed, or the other way round.
    WrongKind = "wrong-kind",
    /// A number used as a figure and as an item.
    UsedBothWays = "used-both-ways",
    /// Parts of a copied structure that are also used outside it.
    UnsettledCopy = "unsettled-copy",
    /// `sharing` or `separate` that names nothing under the copy.
    SettlesNothing = "settles-nothing",
    /// A call with the wrong number of arguments.
    WrongArguments = "wrong-arguments",
    /// A setting given twice or out of range.
    BadSetting = "bad-setting",
    /// A name with several possible readings.
    AmbiguousName = "ambiguous-name",
    // --- data ---
    /// A value without its unit.
    MissingUnit = "missing-unit",
    /// A unit that is not known.
    UnknownUnit = "unknown-unit",
    /// A unit that does not fit.
    WrongUnit = "wrong-unit",
    /// An exposure or attribute that was not declared.
    Undeclared = "undeclared",
    /// A probability outside 0 to 1.
    OutsideRange = "outside-range",
    /// `k of n` with k greater than n, or less than one.
    ImpossibleCount = "impossible-count",
    /// `routes` that make no network, or stops that lie on no way.
    WrongRoutes = "wrong-routes",
    /// Data that contradict each other on one item.
    ContradictoryData = "contradictory-data",
    /// An item without any data of failure.
    MissingData = "missing-data",
    /// A part ages by an exposure that is not given.
    ExposureNotGiven = "exposure-not-given",
    /// A question's exposure leaves fixed probabilities as they are.
    FixedProbability = "fixed-probability",
    /// An attribute that some things under the asked one lack.
    MissingAttribute = "missing-attribute",
    /// A calculation without a value: division by zero and its kind.
    NoValue = "no-value",
    /// Things that stand in several places and count as one.
    UsedTwice = "used-twice",
    /// A system too large for this method.
    TooLarge = "too-large",
    /// A list that was cut short.
    CutShort = "cut-short",
    /// A requirement that is not met.
    NotMet = "not-met",
    /// Formulas of a workbook whose stored values rest on answers that have changed.
    OutOfDateFormula = "out-of-date-formula",
    /// A workbook that is open in a spreadsheet program.
    OpenElsewhere = "open-elsewhere",
    /// An answer that no longer is what tieback would write.
    Stale = "stale",
}
