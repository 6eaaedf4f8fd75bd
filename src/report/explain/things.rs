//! Codes about names and the things behind them.

use super::{Explanation, note};

pub(super) const UNKNOWN_NAME: Explanation = Explanation {
    what: "Nothing defines this name. Names compare letter by letter, with their case; a definition may stand before or after its \
           use, anywhere in the note. The message names the nearest known one. What rests on the unknown name is \
           not computed.",
    wrong: note!("strainer = 0.98", "R(strainr) ?"),
    mended: note!("strainer = 0.98", "R(strainer) ?"),
};

pub(super) const DEFINED_TWICE: Explanation = Explanation {
    what: "Two lines define the same name. A name denotes one physical thing, and all blocks and tables of a note share one set of \
           names, so the two lines contradict each other. Rename one of the things, or delete one of the lines.",
    wrong: note!("pump = rate 18 /Mh", "pump = rate 20 /Mh"),
    mended: note!("pump = rate 18 /Mh", "spare = rate 20 /Mh"),
};

pub(super) const CIRCLE: Explanation = Explanation {
    what: "Definitions rest on each other in a circle. The message shows the way round, with the place of every definition in it. \
           Nothing in the circle can be computed. Often one name in it was meant to be another thing: a stage \
           of a pump and not the pump itself.",
    wrong: note!("motor = 0.99", "pump = motor -> plant", "plant = pump -> motor", "R(plant) ?"),
    mended: note!("motor = 0.99", "pump = 0.98", "plant = pump -> motor", "R(plant) ?"),
};

pub(super) const SEVERAL_NAMES: Explanation = Explanation {
    what: "Several names stand for one thing. A bare name, or a structure, on the right is one physical thing, and one thing has one \
           name. If separate things with the same data are meant, write `a` before it: each name then gets \
           a fresh copy.",
    wrong: note!("sensor = 0.97", "S1, S2 = sensor"),
    mended: note!("sensor = 0.97", "S1, S2 = a sensor"),
};

pub(super) const LOOK_ALIKE_NAMES: Explanation = Explanation {
    what: "Two names differ only by case or by letters that look alike. They denote two different things, and a reader may take them \
           for one. If they are one, spell them alike; if not, names that differ to the eye are safer.",
    wrong: note!("Valve = 0.98", "valve = 0.96", "R(Valve -> valve) ?"),
    mended: note!("inlet = 0.98", "outlet = 0.96", "R(inlet -> outlet) ?"),
};

pub(super) const SAME_THING: Explanation = Explanation {
    what: "This line gives a thing a second name. Both names denote the same physical thing: if it fails, it fails under both. A \
           redundant pair of the two is worth no more than one. If a second thing with the same data is meant, \
           write `a` before the name.",
    wrong: note!("P1 = 0.98", "P2 = P1", "R(P1 // P2) ?"),
    mended: note!("P1 = 0.98", "P2 = a P1", "R(P1 // P2) ?"),
};

pub(super) const WRONG_KIND: Explanation = Explanation {
    what: "A figure stands where a thing is needed, or a thing where a figure is needed. Structures are built of things; arithmetic is \
           done with figures. A figure is taken from a thing by a question, `R(pump)`, or by a clause, `pump.rate`. A \
           thing is made from a figure by a clause, `rate x`.",
    wrong: note!("mission 10 h", "base = 12 /Mh", "R(base) ?"),
    mended: note!("mission 10 h", "base = 12 /Mh", "relay = rate base", "R(relay) ?"),
};

pub(super) const USED_BOTH_WAYS: Explanation = Explanation {
    what: "One name is used as a number in arithmetic and as a thing in a structure. A name that stands for a bare number is \
           either a figure or an item with that probability, never both, since only the item can fail. Give \
           the figure and the thing names of their own.",
    wrong: note!("relay = 0.98", "half = relay / 2 ?", "R(relay) ?"),
    mended: note!("p = 0.98", "half = p / 2 ?", "relay = fails (1 - p)", "R(relay) ?"),
};

pub(super) const UNSETTLED_COPY: Explanation = Explanation {
    what: "A copied structure holds a part that is also used outside it. Whether the copies share that part or have one each \
           decides the result, so tieback does not choose. Add `sharing (…)` for parts that stay one and the same, \
           `separate (…)` for parts that are copied.",
    wrong: note!(
        "supply = 0.999",
        "radio = 0.97",
        "lane = supply -> radio",
        "pair = 1 of 2 lane",
        "post = supply -> pair",
        "R(post) ?"
    ),
    mended: note!(
        "supply = 0.999",
        "radio = 0.97",
        "lane = supply -> radio",
        "pair = 1 of 2 lane sharing (supply)",
        "post = supply -> pair",
        "R(post) ?"
    ),
};

pub(super) const SETTLES_NOTHING: Explanation = Explanation {
    what: "`sharing` or `separate` names something that is not under the copied structure. The line then settles nothing, and the \
           part that was meant may be left open. Name a part that stands in the structure, as the structure \
           names it.",
    wrong: note!(
        "supply, horn = 0.99",
        "lane = supply -> horn",
        "lamp = 0.9",
        "pair = 1 of 2 lane sharing (lamp)",
        "R(pair) ?"
    ),
    mended: note!(
        "supply, horn = 0.99",
        "lane = supply -> horn",
        "pair = 1 of 2 lane sharing (supply)",
        "R(pair) ?"
    ),
};

pub(super) const WRONG_ARGUMENTS: Explanation = Explanation {
    what: "A call has the wrong number or kind of arguments. A structure with parameters takes as many arguments as it has \
           parameters, a function as many as the message says, and a question the thing it asks about, then \
           its options.",
    wrong: note!("x = sqrt(2, 3) ?"),
    mended: note!("x = sqrt(2) ?"),
};

pub(super) const BAD_SETTING: Explanation = Explanation {
    what: "A setting stands twice in the note, or its value is out of range. Settings such as `mission`, `digits` and `year` hold for the \
           whole note, wherever they stand, so each stands once. `digits` is a whole number from 1 to 15. A \
           question may give an exposure of its own: `R(gate, 20 h)`.",
    wrong: note!("digits 40", "gate = 0.98", "R(gate) ?"),
    mended: note!("digits 6", "gate = 0.98", "R(gate) ?"),
};

pub(super) const AMBIGUOUS_NAME: Explanation = Explanation {
    what: "This name can be read in several ways. The short name of a copy, such as `pump[1]`, serves only where there is one such \
           copy. Where several structures have copies of the same part, put the owner before it.",
    wrong: note!(
        "pump = 0.98",
        "north = 1 of 2 pump",
        "south = 1 of 2 pump",
        "plant = north -> south",
        "Birnbaum(plant, pump[1]) ?"
    ),
    mended: note!(
        "pump = 0.98",
        "north = 1 of 2 pump",
        "south = 1 of 2 pump",
        "plant = north -> south",
        "Birnbaum(plant, north.pump[1]) ?"
    ),
};
