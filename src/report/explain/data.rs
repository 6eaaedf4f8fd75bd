//! Codes about data and results.

use super::{Explanation, lines, note};

pub(super) const MISSING_UNIT: Explanation = Explanation {
    what: "A value stands without its unit. A rate of 12 may be per hour or per million hours, and nothing in the note would show \
           which was meant. Every clause says its unit; the message names those that fit.",
    wrong: note!("mission 10 h", "pump = rate 18", "R(pump) ?"),
    mended: note!("mission 10 h", "pump = rate 18 /Mh", "R(pump) ?"),
};

pub(super) const UNKNOWN_UNIT: Explanation = Explanation {
    what: "This unit is not known. Times are `s min h kh Mh d wk yr`; rates are `/` and a time, `FIT` or `%/kh`. Others are declared on a \
           line of their own: `exposure start`, `attribute power W`. Letters count with their case.",
    wrong: note!("mission 10 h", "pump = rate 18 /mh", "R(pump) ?"),
    mended: note!("mission 10 h", "pump = rate 18 /Mh", "R(pump) ?"),
};

pub(super) const WRONG_UNIT: Explanation = Explanation {
    what: "This unit does not fit here. A rate is per time or per declared exposure, a mean life is a time, a probability has no unit. \
           Figures are added only where their units are of one kind. The message says what would fit.",
    wrong: note!("mission 10 h", "pump = rate 18 kh", "R(pump) ?"),
    mended: note!("mission 10 h", "pump = mttf 18 kh", "R(pump) ?"),
};

pub(super) const UNDECLARED: Explanation = Explanation {
    what: "A property is used that no line declares. `cost` and `mass` are known; any other is declared once, with its unit if it has one, \
           so that a misspelt word cannot pass for a property.",
    wrong: note!("siren = 0.99, power 40", "total(siren, power) ?"),
    mended: note!("attribute power W", "siren = 0.99, power 40 W", "total(siren, power) ?"),
};

pub(super) const OUTSIDE_RANGE: Explanation = Explanation {
    what: "A value lies outside what it can be. A probability lies between 0 and 1, a rate or a factor is not negative. Percentages need \
           their sign: `98%` and not `98`.",
    wrong: note!("gate = 1.2", "R(gate) ?"),
    mended: note!("gate = 0.92", "R(gate) ?"),
};

pub(super) const IMPOSSIBLE_COUNT: Explanation = Explanation {
    what: "More are asked to work than there are, or fewer than one. `k of` a group lies between 1 and the number of its members. Copies \
           count each: `2 of (A, 3 B)` has four members.",
    wrong: note!("S1, S2 = 0.97", "level = 3 of (S1, S2)", "R(level) ?"),
    mended: note!("S1, S2 = 0.97", "level = 2 of (S1, S2)", "R(level) ?"),
};

pub(super) const CONTRADICTORY_DATA: Explanation = Explanation {
    what: "Two clauses of one item contradict each other. An item has one probability, one rate for each exposure, and a perfect item has no \
           failure data. tieback does not choose between two values. Keep one, or split the item into two in series.",
    wrong: note!("mission 10 h", "pump = rate 18 /Mh, mttf 40 kh", "R(pump) ?"),
    mended: note!("mission 10 h", "pump = rate 18 /Mh", "R(pump) ?"),
};

pub(super) const MISSING_DATA: Explanation = Explanation {
    what: "An item says nothing about how it fails. A cost or a source alone gives no probability, and taking it for perfect would make every \
           result too good. Give it a probability, a rate or a life, or say `perfect`.",
    wrong: note!("cabinet = cost 1200", "R(cabinet) ?"),
    mended: note!("cabinet = perfect, cost 1200", "R(cabinet) ?"),
};

pub(super) const EXPOSURE_NOT_GIVEN: Explanation = Explanation {
    what: "A part ages by an exposure that is not given. A rate per hour needs hours, a rate per start needs starts. They come from the \
           `mission` line, or from the question, whose exposure replaces the mission whole.",
    wrong: note!("pump = rate 18 /Mh", "R(pump) ?"),
    mended: note!("mission 4 kh", "pump = rate 18 /Mh", "R(pump) ?"),
};

pub(super) const FIXED_PROBABILITY: Explanation = Explanation {
    what: "The question gives an exposure, and some parts have a probability that does not depend on one. Their probability is for one \
           mission, however long, and stands in the answer as it is. If it was measured over a time, say so: \
           `0.98 over 1 kh` is scaled.",
    wrong: note!("mission 1 kh", "gate = 0.98", "R(gate, 5 kh) ?"),
    mended: note!("mission 1 kh", "gate = 0.98 over 1 kh", "R(gate, 5 kh) ?"),
};

pub(super) const MISSING_ATTRIBUTE: Explanation = Explanation {
    what: "A total is asked, and some things under it do not have the property. Counting them as nothing would make the total too \
           small. The message names them; give each its value, 0 if it is none.",
    wrong: note!(
        "attribute power W",
        "pump = 0.98, power 900 W",
        "lamp = 0.999",
        "line = pump -> lamp",
        "total(line, power) ?"
    ),
    mended: note!(
        "attribute power W",
        "pump = 0.98, power 900 W",
        "lamp = 0.999, power 40 W",
        "line = pump -> lamp",
        "total(line, power) ?"
    ),
};

pub(super) const NO_VALUE: Explanation = Explanation {
    what: "This calculation has no value. It divides by zero, takes a root or logarithm of a negative figure, or grows beyond every number. \
           The mark shows the operation; look at the figures that go into it.",
    wrong: note!("spare = 2 - 2", "share = 1 / spare ?"),
    mended: note!("spare = 3 - 2", "share = 1 / spare ?"),
};

pub(super) const USED_TWICE: Explanation = Explanation {
    what: "The answer rests on things that stand in several places. Each counts as one physical thing: if it fails, it fails everywhere, \
           and multiplying down the page would be wrong. The remark names them, so that you can see whether \
           separate things were meant; those are written with `a`.",
    wrong: note!("supply = 0.99", "R1, R2 = 0.97", "post = (supply -> R1) // (supply -> R2)", "R(post) ?"),
    mended: note!("supply = 0.99", "R1, R2 = 0.97", "post = supply -> (R1 // R2)", "R(post) ?"),
};

pub(super) const TOO_LARGE: Explanation = Explanation {
    what: "The system is too large for this method. Exact answers need memory that can grow fast with the number of things and with how \
           they are tangled, so there is a limit rather than a machine that stops answering. Split the system into \
           parts that do not share things, or write copies by a count.",
    wrong: note!("cell = 0.99", "bank = 3 of 4000000000 cell", "R(bank) ?"),
    mended: note!("cell = 0.99", "bank = 3 of 4000 cell", "R(bank) ?"),
};

pub(super) const WRONG_ROUTES: Explanation = Explanation {
    what: "The ways of `routes` make no network, or some stops lie on no way. A network works if a way of links leads from `in` to `out`, or \
           to the ends that `with ends` names, through stops that all work. `->` leads one way, `<->` both ways. A stop \
           that no way needs changes no answer, so a link is mostly missing or turned the wrong way there.",
    wrong: note!("A, B, C = 0.9", "net = routes(in -> A -> out, B -> A, C -> B)", "R(net) ?"),
    mended: note!("A, B, C = 0.9", "net = routes(in -> A -> out, in -> C -> B -> out, A <-> B)", "R(net) ?"),
};

pub(super) const CUT_SHORT: Explanation = Explanation {
    what: "A list was cut short. There are more cut sets or path sets than are listed, and the answer says how many are shown. Ask for those \
           of low order, `cuts(x, order 3)`, for a number of your own, `cuts(x, first 20)`, or only for how \
           many there are, `count(cuts(x))`.",
    wrong: note!("fan = 0.98", "wall = 20 of 40 fan", "cuts(wall) ?"),
    mended: note!("fan = 0.98", "wall = 20 of 40 fan", "count(cuts(wall)) ?"),
};

pub(super) const NOT_MET: Explanation = Explanation {
    what: "A requirement is not met, or cannot be decided. The limit is compared with the value before rounding, and the answer says how much \
           of the allowed failure probability is used. A requirement holds in `tieback check` whether or not it asks.",
    wrong: note!("gate = 0.98", "require R(gate) >= 0.999 ?"),
    mended: note!("gate = 0.98", "pair = 1 of 2 gate", "require R(pair) >= 0.999 ?"),
};

pub(super) const STALE: Explanation = Explanation {
    what: "An answer is no longer what tieback would write. A definition has changed since the note was filled, or the answer was edited. \
           `tieback check` reports it and changes nothing. Fill the note, and read again what leans on the answer.",
    wrong: lines!("tieback check flood-gate.md"),
    mended: lines!("tieback fill flood-gate.md", "tieback check flood-gate.md"),
};
