//! Random systems, written as notes, against all of their states.
//!
//! The evaluator here knows nothing of the library's: it reads a tree of its
//! own, and sums the probabilities of states in exact decimals. The answers
//! come through the language, to 15 digits of the smaller side and, by the
//! library's types, to 1e-25.

use dashu_float::DBig;
use std::collections::{BTreeMap, BTreeSet};
use std::str::FromStr;
use tieback::answer::Desk;
use tieback::language::{self, Line, Tree};
use tieback::note;
use tieback::number::Real;
use tieback::source::Sources;
use tieback::system::Model;

/// Digits of the sums: a tail of 1e-65 beside 1 has all of its own.
const DIGITS: usize = 130;

/// What must work; things by number.
#[derive(Clone, Debug)]
enum Shape {
    Thing(usize),
    AtLeast(usize, Vec<Shape>),
    /// Works unless this combination of failures is there.
    FailsWhen(Box<Shape>),
    Routes(Box<Routes>),
}

/// Stops with one-way links between them, `in` and `out` first.
#[derive(Clone, Debug)]
struct Routes {
    stops: Vec<Shape>,
    links: Vec<(usize, usize)>,
    ends: Vec<usize>,
    need: usize,
}

impl Routes {
    /// Follows all ways until none leads further.
    fn holds(&self, state: u32) -> bool {
        let up: Vec<bool> =
            [true, true].into_iter().chain(self.stops.iter().map(|s| s.holds(state))).collect();
        let mut reached = BTreeSet::from([0]);
        loop {
            let before = reached.len();
            for (from, to) in &self.links {
                if reached.contains(from) && up[*to] {
                    reached.insert(*to);
                }
            }
            if reached.len() == before {
                return self.ends.iter().filter(|e| reached.contains(e)).count() >= self.need;
            }
        }
    }
}

impl Shape {
    /// For a combination of failures, `true` stands for "has failed".
    fn holds(&self, state: u32) -> bool {
        match self {
            Shape::Thing(i) => state >> i & 1 == 1,
            Shape::AtLeast(k, of) => of.iter().filter(|m| m.holds(state)).count() >= *k,
            Shape::FailsWhen(what) => !what.holds(!state),
            Shape::Routes(routes) => routes.holds(state),
        }
    }
}

/// SplitMix64, seeded, so that a failure repeats.
struct Random(u64);

impl Random {
    fn below(&mut self, n: usize) -> usize {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 33) as usize % n
    }
}

/// A note in the making.
struct Writer {
    random: Random,
    /// Failure probability of each thing, as written.
    fails: Vec<String>,
    /// How a question names each thing.
    names: Vec<String>,
    lines: Vec<String>,
    /// Named structures that may be used again.
    open: Vec<(String, Shape)>,
    /// Other names of things and structures that have one.
    same: BTreeMap<String, String>,
    most: usize,
}

impl Writer {
    fn probability(&mut self) -> String {
        let lead = 1 + self.random.below(9);
        match self.random.below(5) {
            0 => format!("0.{lead}"),
            1 => format!("0.00{lead}"),
            2 => "0.5".to_string(),
            _ => format!("{lead}e-{}", 2 + self.random.below(29)),
        }
    }

    fn new_thing(&mut self, name: String, fails: String) -> Shape {
        self.fails.push(fails);
        self.names.push(name);
        Shape::Thing(self.fails.len() - 1)
    }

    fn room(&self) -> usize {
        self.most - self.fails.len()
    }

    /// A named thing, old or new.
    fn thing(&mut self) -> (String, Shape) {
        let plain: Vec<usize> = (0..self.names.len()).filter(|i| !self.names[*i].contains('[')).collect();
        if !plain.is_empty() && (self.room() == 0 || self.random.below(3) == 0) {
            let i = plain[self.random.below(plain.len())];
            return (self.names[i].clone(), Shape::Thing(i));
        }
        let name = format!("t{}", self.fails.len());
        let fails = self.probability();
        self.lines.push(format!("{name} = fails {fails}"));
        let shape = self.new_thing(name.clone(), fails);
        (name, shape)
    }

    /// An expression in parentheses or a name.
    fn part(&mut self, depth: usize) -> (String, Shape) {
        match self.random.below(if depth == 0 { 4 } else { 12 }) {
            0..=2 => self.thing(),
            3 if !self.open.is_empty() => {
                let at = self.random.below(self.open.len());
                self.open[at].clone()
            }
            4 if self.room() >= 4 => self.copies(),
            5 if self.room() >= 3 => self.copied_structure(),
            6 => self.parameter(depth),
            7 => {
                let (text, shape) = self.failing(depth - 1);
                (format!("(fails when {text})"), Shape::FailsWhen(Box::new(shape)))
            }
            8 if depth > 0 => {
                let (text, shape) = self.part(depth - 1);
                let name = format!("s{}", self.lines.len());
                self.lines.push(format!("{name} = {text}"));
                if !text.contains('(') {
                    let first = self.same.get(&text).unwrap_or(&text).clone();
                    self.same.insert(name.clone(), first);
                }
                self.open.push((name.clone(), shape.clone()));
                (name, shape)
            }
            9 if depth > 0 => self.routes(depth - 1),
            _ => self.group(depth.saturating_sub(1)),
        }
    }

    /// A network: one way that holds all together, and links at random.
    fn routes(&mut self, depth: usize) -> (String, Shape) {
        let mut known: Vec<String> = Vec::new();
        let (mut texts, mut stops) = (vec!["in".to_string(), "out".to_string()], Vec::new());
        for _ in 0..2 + self.random.below(5) {
            let (mut text, shape) = self.part(depth);
            // Among the ends stand names, and calls of names.
            if text.starts_with('(') || text.matches('(').count() > 1 {
                let name = format!("r{}", self.lines.len());
                self.lines.push(format!("{name} = {text}"));
                text = name;
            }
            // One name is one stop.
            let key = self.same.get(&text).unwrap_or(&text).clone();
            if !known.contains(&key) {
                known.push(key);
                texts.push(text);
                stops.push(shape);
            }
        }
        let n = stops.len();
        let (mut ways, mut links) = (Vec::new(), Vec::new());
        let some = self.random.below(n) + 2;
        let several = self.random.below(3) == 0;
        let ends: Vec<usize> =
            if several { (2..texts.len()).filter(|_| self.random.below(2) == 0).collect() } else { vec![1] };
        let (ends, several) = if ends.is_empty() { (vec![1], false) } else { (ends, several) };
        let need = 1 + self.random.below(ends.len());
        let mut linked = BTreeSet::new();
        let mut link = |ways: &mut Vec<String>, from: usize, to: usize, both: bool| {
            linked.extend([from, to]);
            let arrow = if both { "<->" } else { "->" };
            ways.push(format!("{} {arrow} {}", texts[from], texts[to]));
            links.push((from, to));
            if both {
                links.push((to, from));
            }
        };
        link(&mut ways, 0, some, false);
        if several {
            ends.iter().filter(|e| **e != some).for_each(|e| link(&mut ways, some, *e, false));
        } else {
            link(&mut ways, some, 1, false);
        }
        for _ in 0..n + self.random.below(2 * n) {
            let (a, b) = (self.random.below(n + 2), self.random.below(n + 2));
            let to_out = b == 1 && several;
            // Straight from `in` to `out` nothing can fail.
            if a != b && b != 0 && a != 1 && !to_out && (a, b) != (0, 1) {
                let both = a != 0 && b != 1 && self.random.below(2) == 0;
                link(&mut ways, a, b, both);
            }
        }
        // The rest leads somewhere, and nothing leads there.
        for stop in 2..texts.len() {
            if !linked.contains(&stop) {
                ways.push(format!("{} -> {}", texts[stop], texts[some]));
                if stop != some {
                    links.push((stop, some));
                }
            }
        }
        let with = match several {
            true => {
                let names: Vec<&str> = ends.iter().map(|e| texts[*e].as_str()).collect();
                format!(" with ends {need} of ({})", names.join(", "))
            }
            false => String::new(),
        };
        let routes = Routes { stops, links, ends, need };
        (format!("(routes({}){with})", ways.join(", ")), Shape::Routes(Box::new(routes)))
    }

    fn members(&mut self, depth: usize) -> (Vec<String>, Vec<Shape>) {
        let n = 2 + self.random.below(3);
        (0..n).map(|_| self.part(depth)).unzip()
    }

    fn group(&mut self, depth: usize) -> (String, Shape) {
        let (texts, shapes) = self.members(depth);
        let n = shapes.len();
        match self.random.below(3) {
            0 => (format!("({})", texts.join(" -> ")), Shape::AtLeast(n, shapes)),
            1 => (format!("({})", texts.join(" // ")), Shape::AtLeast(1, shapes)),
            _ => {
                let k = 1 + self.random.below(n);
                (format!("({k} of ({}))", texts.join(", ")), Shape::AtLeast(k, shapes))
            }
        }
    }

    /// Failures told with `and`, `or` and `k of`.
    fn failing(&mut self, depth: usize) -> (String, Shape) {
        if depth == 0 || self.random.below(3) == 0 {
            return self.thing();
        }
        let n = 2 + self.random.below(2);
        let (texts, shapes): (Vec<String>, Vec<Shape>) = (0..n).map(|_| self.failing(depth - 1)).unzip();
        match self.random.below(3) {
            0 => (format!("({})", texts.join(" and ")), Shape::AtLeast(n, shapes)),
            1 => (format!("({})", texts.join(" or ")), Shape::AtLeast(1, shapes)),
            _ => {
                let k = 1 + self.random.below(n);
                (format!("({k} of ({}))", texts.join(", ")), Shape::AtLeast(k, shapes))
            }
        }
    }

    /// `s = 2 of 3 c`
    fn copies(&mut self) -> (String, Shape) {
        let fails = self.probability();
        let (kind, name) = (format!("c{}", self.lines.len()), format!("v{}", self.lines.len()));
        let n = 2 + self.random.below(3);
        let k = 1 + self.random.below(n);
        self.lines.push(format!("{kind} = fails {fails}"));
        self.lines.push(format!("{name} = {k} of {n} {kind}"));
        let of = (1..=n).map(|i| self.new_thing(format!("{name}.{kind}[{i}]"), fails.clone())).collect();
        let shape = Shape::AtLeast(k, of);
        self.open.push((name.clone(), shape.clone()));
        (name, shape)
    }

    /// A named pair and a fresh copy of it by `a`.
    fn copied_structure(&mut self) -> (String, Shape) {
        let (one, two) = (self.probability(), self.probability());
        let at = self.lines.len();
        let series = self.random.below(2) == 0;
        let op = if series { "->" } else { "//" };
        self.lines.push(format!("x{at} = fails {one}"));
        self.lines.push(format!("y{at} = fails {two}"));
        self.lines.push(format!("l{at} = x{at} {op} y{at}"));
        self.lines.push(format!("m{at} = a l{at}"));
        let of =
            vec![self.new_thing(format!("m{at}.x{at}"), one), self.new_thing(format!("m{at}.y{at}"), two)];
        // Names with a dot are no plain names to be used again by `thing`.
        let shape = Shape::AtLeast(if series { 2 } else { 1 }, of);
        self.open.push((format!("m{at}"), shape.clone()));
        (format!("m{at}"), shape)
    }

    /// A definition with a parameter, called.
    fn parameter(&mut self, depth: usize) -> (String, Shape) {
        let (text, shape) = self.part(depth.saturating_sub(1));
        let (own, own_shape) = self.thing();
        let name = format!("f{}", self.lines.len());
        self.lines.push(format!("{name}(z) = (z -> {own}) // z"));
        let series = Shape::AtLeast(2, vec![shape.clone(), own_shape]);
        (format!("{name}({text})"), Shape::AtLeast(1, vec![series, shape]))
    }
}

/// A random note, the system in it and its things.
struct Trial {
    note: String,
    shape: Shape,
    fails: Vec<DBig>,
    names: Vec<String>,
}

fn trial(seed: u64, most: usize) -> Trial {
    let mut writer = Writer {
        random: Random(seed),
        fails: Vec::new(),
        names: Vec::new(),
        lines: Vec::new(),
        open: Vec::new(),
        same: BTreeMap::new(),
        most,
    };
    let (text, shape) = writer.group(4);
    let mut lines = writer.lines;
    lines.push(format!("top = {text}"));
    // Order is free: the last definition may stand first.
    if seed.is_multiple_of(2) {
        lines.reverse();
    }
    Trial {
        note: format!("```tieback\ndigits 15\n{}\n```\n", lines.join("\n")),
        shape,
        fails: writer
            .fails
            .iter()
            .map(|f| DBig::from_str(f).unwrap().with_precision(DIGITS).value())
            .collect(),
        names: writer.names,
    }
}

fn big(n: u32) -> DBig {
    DBig::from(n).with_precision(DIGITS).value()
}

/// R and F by the sum over all states; the sums of each side are of positive terms.
fn enumerate(shape: &Shape, fails: &[DBig], set: Option<(usize, bool)>) -> (DBig, DBig) {
    let n = fails.len();
    let works: Vec<DBig> = fails.iter().map(|q| big(1) - q).collect();
    let mut states = vec![big(1)];
    for i in 0..n {
        let (up, down) = match set {
            Some((j, up)) if i == j => (big(up.into()), big((!up).into())),
            _ => (works[i].clone(), fails[i].clone()),
        };
        let with: Vec<DBig> = states.iter().map(|s| s * &up).collect();
        states = states.iter().map(|s| s * &down).collect();
        states.extend(with);
    }
    let (mut r, mut f) = (big(0), big(0));
    for (state, chance) in states.iter().enumerate() {
        if shape.holds(state as u32) { r += chance } else { f += chance }
    }
    (r, f)
}

/// Minimal sets of things whose failure fails it, or whose work makes it work.
fn minimal(shape: &Shape, n: usize, cuts: bool) -> Vec<u32> {
    let all = (1u32 << n) - 1;
    let enough = |set: u32| if cuts { !shape.holds(all & !set) } else { shape.holds(set) };
    (0..=all).filter(|&s| enough(s) && (0..n).all(|i| s >> i & 1 == 0 || !enough(s & !(1 << i)))).collect()
}

fn wide(x: Real) -> DBig {
    let part = |x: f64| {
        dashu_float::FBig::<dashu_float::round::mode::HalfEven, 2>::try_from(x)
            .unwrap()
            .with_precision(400)
            .value()
            .with_rounding::<dashu_float::round::mode::HalfAway>()
            .to_decimal()
            .value()
            .with_precision(DIGITS)
            .value()
    };
    part(x.hi()) + part(x.lo())
}

fn gap(got: &DBig, want: &DBig) -> f64 {
    if *want == big(0) {
        return if *got == big(0) { 0.0 } else { f64::INFINITY };
    }
    ((got - want) / want).to_f64().value().abs()
}

/// The chance of `top` as the library holds it.
fn through_types(note: &str) -> (DBig, DBig) {
    let mut sources = Sources::default();
    let body = note.trim_start_matches("```tieback\n").trim_end_matches("\n```\n");
    let at = sources.add("note", body).unwrap();
    let (mut tree, mut problems) = (Tree::default(), Vec::new());
    let mut start = at;
    let lines: Vec<language::Source<'_>> = body
        .split('\n')
        .map(|text| {
            let line = language::Source { text, at: start };
            start += text.len() as u32 + 1;
            line
        })
        .collect();
    language::read_block(lines.into_iter(), 0, &mut tree, &mut problems);
    let top = sources.add("question", "R(top)").unwrap();
    language::read_question(language::Source { text: "R(top)", at: top }, 1, &mut tree, &mut problems);
    let mut model = Model::new(&tree, &sources);
    let Some(Line::Ask { value, .. }) = tree.statements.last().map(|s| &s.line) else { panic!() };
    let language::Expr::Call(_, args) = tree.expr(*value) else { panic!() };
    let thing = tree.list(args)[0];
    let mut desk = Desk::default();
    let prepared = desk.prepare(&mut model, thing);
    let prepared = prepared.unwrap_or_else(|f| panic!("{:?}\n{note}", model.problem(f)));
    let valued = desk.value(&mut model, thing, &prepared, &[], Default::default()).unwrap();
    (wide(valued.chance.works()), wide(valued.chance.fails()))
}

/// An answer as a number, whatever its notation.
fn number(answer: &str) -> DBig {
    let parse = |t: &str| DBig::from_str(t.trim()).unwrap_or_else(|_| panic!("{answer}"));
    match answer.split_once("1 - ") {
        Some((_, small)) => big(1) - parse(small),
        None => parse(answer).with_precision(DIGITS).value(),
    }
}

/// The names of the sets that `cuts` or `paths` lists.
fn listed(answer: &str) -> BTreeSet<BTreeSet<String>> {
    let mut rows = answer.lines();
    let head = rows.next().unwrap_or_default();
    // Columns stand under their heads; the set is the last.
    let from = head.rfind("cut set").or(head.rfind("path set")).unwrap_or(0);
    rows.filter(|r| !r.starts_with('…'))
        .map(|r| r[from..].split(',').map(|n| n.trim().to_string()).collect())
        .collect()
}

#[test]
fn answers_equal_enumeration() {
    let mut seen = BTreeMap::new();
    for seed in 0..120u64 {
        let t = trial(seed, 4 + (seed % 13) as usize);
        let n = t.fails.len();
        if n > 16 {
            continue;
        }
        *seen.entry(n).or_insert(0) += 1;
        let (r, f) = enumerate(&t.shape, &t.fails, None);
        // Through the types, both tails to 1e-25: 2^16 terms at 130 digits err by far less.
        let (got_r, got_f) = through_types(&t.note);
        assert!(gap(&got_r, &r) < 1e-25, "seed {seed}\n{}\n{got_r} {r}", t.note);
        assert!(gap(&got_f, &f) < 1e-25, "seed {seed}\n{}\n{got_f} {f}", t.note);
        // As written, 15 digits of the smaller side.
        let ask = |q: &str| {
            let filled = note::ask("note", &t.note, &note::NoShelf, &[], q);
            assert!(!filled.asked[0].error, "seed {seed} {q}: {}\n{}", filled.asked[0].new, t.note);
            filled.asked[0].new.clone()
        };
        let smaller = if r < f { &r } else { &f };
        for (question, want) in [("R(top)", &r), ("F(top)", &f)] {
            let answer = ask(question);
            let off = (number(&answer) - want) / smaller;
            assert!(off.to_f64().value().abs() < 5.1e-15, "seed {seed} {question} {answer} {want}");
        }
        if seed % 4 == 0 && n <= 12 {
            sets_and_ranks(&t, seed, &f, &ask);
        }
    }
    assert!(seen.len() > 8 && seen.keys().any(|n| *n >= 14), "{seen:?}");
}

fn sets_and_ranks(t: &Trial, seed: u64, f: &DBig, ask: &dyn Fn(&str) -> String) {
    let n = t.fails.len();
    let cuts = minimal(&t.shape, n, true);
    for (word, sets) in [("cuts", &cuts), ("paths", &minimal(&t.shape, n, false))] {
        let want: BTreeSet<BTreeSet<String>> = sets
            .iter()
            .map(|s| (0..n).filter(|i| s >> i & 1 == 1).map(|i| t.names[i].clone()).collect())
            .collect();
        let got = listed(&ask(&format!("{word}(top, first 5000)")));
        assert_eq!(got, want, "seed {seed}\n{}", t.note);
        assert_eq!(ask(&format!("count({word}(top))")), want.len().to_string(), "seed {seed}");
    }
    for i in 0..n {
        let q = &t.fails[i];
        let (_, failed) = enumerate(&t.shape, &t.fails, Some((i, false)));
        let (_, perfect) = enumerate(&t.shape, &t.fails, Some((i, true)));
        // States in which the thing decides, summed and not subtracted.
        let mut birnbaum = big(0);
        let mut cut_failed = big(0);
        for state in 0..1u32 << n {
            let chance = |skip: Option<usize>| {
                (0..n).filter(|j| Some(*j) != skip).fold(big(1), |p, j| {
                    if state >> j & 1 == 1 { p * (big(1) - &t.fails[j]) } else { p * &t.fails[j] }
                })
            };
            if state >> i & 1 == 0 && t.shape.holds(state | 1 << i) && !t.shape.holds(state) {
                birnbaum += chance(Some(i));
            }
            if cuts.iter().any(|c| c >> i & 1 == 1 && c & state == 0) {
                cut_failed += chance(None);
            }
        }
        let in_some_cut = cuts.iter().any(|c| c >> i & 1 == 1);
        let name = &t.names[i];
        let rows = [
            ("Birnbaum", birnbaum.clone()),
            ("criticality", &birnbaum * q / f),
            ("FV", &cut_failed / f),
            ("RAW", &failed / f),
            ("doubled", &birnbaum * q * (big(1) - q)),
            ("made perfect", &birnbaum * q),
        ];
        for (word, want) in rows {
            let got = number(&ask(&format!("{word}(top, {name})")));
            assert!(gap(&got, &want) < 5.1e-15, "seed {seed} {word} {name}: {got} {want}\n{}", t.note);
        }
        let rrw = ask(&format!("RRW(top, {name})"));
        if perfect == big(0) {
            assert_eq!(rrw, "infinite", "seed {seed} {name} {in_some_cut}");
        } else {
            let got = number(&rrw);
            assert!(gap(&got, &(f / &perfect)) < 5.1e-15, "seed {seed} RRW {name}: {got}\n{}", t.note);
        }
    }
}
