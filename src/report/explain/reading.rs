//! Codes about how lines are written.

use super::{Explanation, lines, note};

pub(super) const STRAY_CHARACTER: Explanation = Explanation {
    what: "A character stands here that the language does not use. Outside double quotes and comments only \
           names, numbers, units and the operators `-> // <-> + - * / ^ = >= <=` stand. A comment begins with \
           `#` at the start of a line or after a space. A name with other characters goes in double quotes.",
    wrong: note!("mission 10 h", "intake & screen = rate 4 /Mh"),
    mended: note!("mission 10 h", "\"intake & screen\" = rate 4 /Mh"),
};

pub(super) const TYPOGRAPHIC_CHARACTER: Explanation = Explanation {
    what: "A curly quote or a long dash stands where a plain character is meant. Word processors put them there \
           unasked. They look like `\"` or `-` and are not, so tieback does not guess. Type the plain character; \
           inside quotes and comments any character may stand.",
    wrong: note!("mission 10 h", "sluice = rate 4 /Mh, source “maker's sheet 3”"),
    mended: note!("mission 10 h", "sluice = rate 4 /Mh, source \"maker's sheet 3\""),
};

pub(super) const MALFORMED_NUMBER: Explanation = Explanation {
    what: "This number is not written as a decimal. A decimal has one point at most, with a digit on both sides of \
           it, and may have an exponent: `0.98`, `12`, `1.2e-6`. There are no separators between thousands, and \
           a comma is never a decimal point, since it separates clauses.",
    wrong: note!("mission 10 h", "beacon = fails .02"),
    mended: note!("mission 10 h", "beacon = fails 0.02"),
};

pub(super) const UNCLOSED_QUOTE: Explanation = Explanation {
    what: "A quoted name or text has no closing quote on its line. Quoted text ends on the line where it begins. \
           A double quote inside it is written twice.",
    wrong: note!("\"Main pump = rate 18 /Mh"),
    mended: note!("\"Main pump\" = rate 18 /Mh"),
};

pub(super) const UNBALANCED_PARENTHESIS: Explanation = Explanation {
    what: "A parenthesis has no partner. An open parenthesis keeps the line going, so the missing one may belong \
           on an earlier line than where the text stops making sense. The next line that begins a definition \
           closes what is open, and the rest of the note is read as usual.",
    wrong: note!("S1, S2, S3 = 0.97", "level = 2 of (S1, S2, S3))", "R(level) ?"),
    mended: note!("S1, S2, S3 = 0.97", "level = 2 of (S1, S2, S3)", "R(level) ?"),
};

pub(super) const UNEXPECTED_TOKEN: Explanation = Explanation {
    what: "Something else should stand at this place. The message says what was found and what would fit. \
           Frequent causes are a missing operator between two names, a missing comma before a clause, and \
           digits that touch a word, as in `2 of3`.",
    wrong: note!("P1, P2 = rate 18 /Mh", "line = P1 P2"),
    mended: note!("P1, P2 = rate 18 /Mh", "line = P1 -> P2"),
};

pub(super) const UNFINISHED_LINE: Explanation = Explanation {
    what: "The line ends before it is complete. A line goes on after an operator, a comma, or `else`, `and`, `or`, \
           `of`, `with`, and while a parenthesis is open; what should follow there is missing. Add it, or take \
           away what announces it.",
    wrong: note!("P1, P2 = rate 18 /Mh", "line = P1 ->"),
    mended: note!("P1, P2 = rate 18 /Mh", "line = P1 -> P2"),
};

pub(super) const MIXED_OPERATORS: Explanation = Explanation {
    what: "Two kinds of operator meet without parentheses. Series `->` and parallel `//` have no precedence between \
           them, and neither have `and` and `or`, since readers of a signed note would differ on what was meant. \
           The message shows the readings. Put parentheses around the part that belongs together.",
    wrong: note!("psu, radio, mast = 0.99", "link = psu -> radio // mast", "R(link) ?"),
    mended: note!("psu, radio, mast = 0.99", "link = psu -> (radio // mast)", "R(link) ?"),
};

pub(super) const RESERVED_WORD: Explanation = Explanation {
    what: "A word of the language is used as a name. Words such as `of`, `all`, `with`, `when`, those that begin a \
           clause and those that begin a line are taken. Choose another name, or put the name in double quotes \
           everywhere.",
    wrong: note!("mission = 0.98"),
    mended: note!("\"mission\" = 0.98"),
};

pub(super) const UNKNOWN_CLAUSE: Explanation = Explanation {
    what: "No clause begins with this word. An item is a list of clauses, each a word and its values: `rate`, `fails`, \
           `mttf`, `source` and so on. The message names the nearest known word. A property of your own is \
           declared first, on a line such as `attribute power W`.",
    wrong: note!("mission 10 h", "pump = rate 18 /Mh, perfekt", "R(pump) ?"),
    mended: note!("mission 10 h", "pump = rate 18 /Mh, source \"maker's sheet 7\"", "R(pump) ?"),
};

pub(super) const REPEATED_CLAUSE: Explanation = Explanation {
    what: "The same clause stands twice on one item. tieback cannot tell which of the two holds, and does not add them. \
           Keep one. Rates of several ways to fail are added in the value: `rate 2 /Mh + 3 /Mh`.",
    wrong: note!("mission 10 h", "fan = rate 5 /Mh, stress 2, stress 3", "R(fan) ?"),
    mended: note!("mission 10 h", "fan = rate 5 /Mh, stress 6", "R(fan) ?"),
};

pub(super) const NOT_KNOWN_YET: Explanation = Explanation {
    what: "This part of the language is designed, and this version does not compute it. The word is taken already, \
           so that a note will not change its meaning later. Until then no answer is given that would leave it \
           out, and the lines that do not rest on it are answered as usual.",
    wrong: note!("mission 1 kh", "bearing = weibull shape 2.1 scale 40 kh"),
    mended: note!("mission 1 kh", "bearing = rate 3 /Mh"),
};

macro_rules! ten { ($($t:literal)*) => { concat!($($t, $t, $t, $t, $t, $t, $t, $t, $t, $t,)*) }; }
/// Far more parentheses than steps are written for.
macro_rules! deep {
    ($t:literal) => {
        concat!(ten!($t $t $t $t $t), ten!($t $t $t $t $t), ten!($t $t $t $t $t), ten!($t $t $t $t $t))
    };
}

pub(super) const TOO_DEEP: Explanation = Explanation {
    what: "A formula is nested too deep for its steps. Steps are written for people, and nobody follows a hundred \
           levels of parentheses. The value itself is still answered. Give the inner parts names and lines of their own.",
    wrong: note!("lamp = 0.9", concat!("steps(", deep!("(1 + "), "R(lamp)", deep!(")"), ") ?")),
    mended: note!("lamp = 0.9", "steps(1 + R(lamp)) ?"),
};

pub(super) const NOT_AN_ANSWER: Explanation = Explanation {
    what: "Text stands right of a `?` that is not shaped like an answer. tieback overwrites only what it wrote, so the text \
           stays and the question is left open. If it is a remark of yours, put ` #` before it; if it is of no \
           use, delete it.",
    wrong: note!("gate = 0.98", "R(gate) ? looks low to me"),
    mended: note!("gate = 0.98", "R(gate) ? # looks low to me"),
};

pub(super) const MALFORMED_QUESTION: Explanation = Explanation {
    what: "This line neither defines anything nor asks a question that can be answered. A \
           question is a question name with its arguments and ends in `?`, as in `R(gate) ?`. Settings such as \
           `digits 4` take no question mark.",
    wrong: lines!("```tieback", "gate = 0.98", "R(gate)", "```"),
    mended: lines!("```tieback", "gate = 0.98", "R(gate) ?", "```"),
};
