//! Every step computed again: its formulas in 60 digits from the results of
//! the steps before it, and its printed numbers as a reviewer would.

use dashu_float::FBig;
use dashu_float::round::mode::HalfEven;
use std::collections::BTreeSet;
use tieback::answer::{Desk, Number};
use tieback::language::{self, Expr, Line};
use tieback::note::{Fetched, NotFetched, Shelf, fill, fill_from, syntax_from};
use tieback::number::{Chance, Real};
use tieback::source::Sources;
use tieback::steps::{Formula, Outcome, Rule, Side, StepList, shown};
use tieback::system::Model;
use tieback::system::network::Network;

type Wide = FBig<HalfEven, 2>;

/// Somewhat more than 60 digits.
const BITS: usize = 210;

fn whole(n: u32) -> Wide {
    Wide::from(n).with_precision(BITS).value()
}

fn wide(x: Real) -> Wide {
    let part = |x: f64| Wide::try_from(x).unwrap().with_precision(BITS).value();
    part(x.hi()) + part(x.lo())
}

/// A second evaluator. It knows nothing of complements: at 60 digits a
/// difference from 1 has digits to spare as long as the tails here are above 1e-30.
fn value(formula: &Formula, results: &[(Wide, Wide)]) -> Wide {
    let of = |f: &Formula| value(f, results);
    match formula {
        Formula::Datum { value, .. } => wide(*value),
        Formula::Step(at, Side::Works) => results[*at].0.clone(),
        Formula::Step(at, Side::Fails) => results[*at].1.clone(),
        Formula::Whole(n) => whole(*n),
        Formula::Sum(terms) => terms.iter().fold(whole(0), |sum, t| sum + of(t)),
        Formula::Product(factors) => factors.iter().fold(whole(1), |product, f| product * of(f)),
        Formula::Quotient(a, b) => of(a) / of(b),
        Formula::OneMinus(a) => whole(1) - of(a),
        Formula::ExpMinus(a) => exp(-of(a)),
        Formula::Power(a, b) => power(of(a), of(b)),
        Formula::Choose(n, k) => choose(*n, *k),
        Formula::Negate(a) => -of(a),
        Formula::Function(name, args) => function(name, &args.iter().map(of).collect::<Vec<_>>()),
        Formula::AtLeast(need, members, side) => {
            let members: Vec<Wide> = members.iter().map(|m| results[*m].0.clone()).collect();
            let works = at_least(*need as usize, &members);
            if *side == Side::Works { works } else { whole(1) - works }
        }
        Formula::Network(network, members, side) => {
            let members: Vec<Wide> = members.iter().map(|m| results[*m].0.clone()).collect();
            let works = ways(network, &members);
            if *side == Side::Works { works } else { whole(1) - works }
        }
    }
}

fn exp(x: Wide) -> Wide {
    if x == whole(0) { whole(1) } else { x.exp() }
}

fn power(base: Wide, exponent: Wide) -> Wide {
    if exponent == whole(0) || base == whole(1) {
        return whole(1);
    }
    if base == whole(0) { whole(0) } else { (base.ln() * exponent).exp() }
}

fn choose(n: u32, k: u32) -> Wide {
    (0..k).fold(whole(1), |c, i| c * whole(n - i) / whole(i + 1))
}

fn function(name: &str, args: &[Wide]) -> Wide {
    let first = args[0].clone();
    match name {
        "exp" => exp(first),
        "ln" => first.ln(),
        "log10" => first.ln() / whole(10).ln(),
        "sqrt" => power(first, whole(1) / whole(2)),
        "min" => args.iter().skip(1).fold(first, |a, b| if *b < a { b.clone() } else { a }),
        "max" => args.iter().skip(1).fold(first, |a, b| if *b > a { b.clone() } else { a }),
        _ => panic!("no function {name}"),
    }
}

/// All sets of working members in which the network works. Only what is not
/// settled by what has been decided is split further.
fn ways(network: &Network, works: &[Wide]) -> Wide {
    let mut total = whole(0);
    let mut open = vec![(0, Vec::<bool>::new(), whole(1))];
    while let Some((at, known, mass)) = open.pop() {
        let up = |rest: bool| network.works(|m| known.get(m as usize).copied().unwrap_or(rest));
        if up(false) {
            total += mass;
        } else if up(true) {
            for state in [true, false] {
                let p = if state { works[at].clone() } else { whole(1) - &works[at] };
                let mut known = known.clone();
                known.push(state);
                open.push((at + 1, known, &mass * p));
            }
        }
    }
    total
}

/// All counts, one member after another.
fn at_least(need: usize, works: &[Wide]) -> Wide {
    let mut counts = vec![whole(1)];
    for p in works {
        let q = whole(1) - p;
        let mut next = vec![whole(0); counts.len() + 1];
        for (j, c) in counts.iter().enumerate() {
            next[j] = next[j].clone() + c * &q;
            next[j + 1] = next[j + 1].clone() + c * p;
        }
        counts = next;
    }
    counts[need..].iter().fold(whole(0), |sum, c| sum + c)
}

fn gap(got: &Wide, want: &Wide) -> f64 {
    if *want == whole(0) {
        return if *got == whole(0) { 0.0 } else { f64::INFINITY };
    }
    ((got - want) / want).to_f64().value().abs()
}

/// A number read as a reviewer reads it, and how far its digits let it be off.
type Read = (f64, f64);

/// Reads a printed formula: an expression of numbers with units, which carry no
/// weight since all are base units.
struct Reader<'t> {
    rest: &'t str,
}

impl Reader<'_> {
    fn eat(&mut self, token: &str) -> bool {
        let trimmed = self.rest.trim_start();
        match trimmed.strip_prefix(token) {
            Some(rest) => {
                self.rest = rest;
                true
            }
            None => false,
        }
    }

    fn sum(&mut self) -> Option<Read> {
        let mut left = self.product()?;
        loop {
            if self.eat("+ ") {
                let right = self.product()?;
                left = (left.0 + right.0, left.1 + right.1);
            } else if self.eat("- ") {
                let right = self.product()?;
                left = (left.0 - right.0, left.1 + right.1);
            } else {
                return Some(left);
            }
        }
    }

    fn product(&mut self) -> Option<Read> {
        let mut left = self.power()?;
        loop {
            let times = self.eat("·");
            if !times && !self.eat("/ ") && !self.slash() {
                return Some(left);
            }
            let right = self.power()?;
            let relative = relative(left) + relative(right);
            let value = if times { left.0 * right.0 } else { left.0 / right.0 };
            left = (value, value.abs() * relative);
        }
    }

    /// `1/2000`: a slash before a digit; before a letter it is a unit.
    fn slash(&mut self) -> bool {
        let rest = self.rest;
        if rest.starts_with('/') && rest[1..].starts_with(|c: char| c.is_ascii_digit()) {
            self.rest = &rest[1..];
            return true;
        }
        false
    }

    fn power(&mut self) -> Option<Read> {
        let base = self.atom()?;
        if !self.rest.starts_with('^') {
            return Some(base);
        }
        self.rest = &self.rest[1..];
        let exponent = self.atom()?;
        let value = base.0.powf(exponent.0);
        let error = relative(base) * exponent.0.abs() + base.0.ln().abs() * exponent.1;
        Some((value, value.abs() * error))
    }

    fn arguments(&mut self) -> Option<Vec<Read>> {
        let mut found = vec![self.sum()?];
        while self.eat(",") {
            found.push(self.sum()?);
        }
        self.eat(")").then_some(found)
    }

    fn atom(&mut self) -> Option<Read> {
        if self.eat("(") {
            let inner = self.sum()?;
            return self.eat(")").then_some(inner);
        }
        if self.eat("-") {
            let inner = self.product()?;
            return Some((-inner.0, inner.1));
        }
        if self.eat("exp(") {
            let inner = self.arguments()?[0];
            return Some((inner.0.exp(), inner.0.exp() * inner.1));
        }
        if self.eat("C(") {
            let args = self.arguments()?;
            let (n, k) = (args[0].0 as u32, args[1].0 as u32);
            return Some((choose(n, k).to_f64().value(), 0.0));
        }
        if self.eat("sqrt(") {
            let inner = self.arguments()?[0];
            return Some((inner.0.sqrt(), inner.1 / inner.0.sqrt()));
        }
        if self.eat("ln(") {
            let inner = self.arguments()?[0];
            return Some((inner.0.ln(), relative(inner)));
        }
        if self.eat("log10(") {
            let inner = self.arguments()?[0];
            return Some((inner.0.log10(), relative(inner)));
        }
        for (word, larger) in [("max(", true), ("min(", false)] {
            if self.eat(word) {
                let args = self.arguments()?;
                return args.into_iter().reduce(|a, b| if (b.0 > a.0) == larger { b } else { a });
            }
        }
        for (word, works) in [("P(at least ", true), ("P(fewer than ", false)] {
            if self.eat(word) {
                return self.vote(works);
            }
        }
        self.number()
    }

    fn vote(&mut self, works: bool) -> Option<Read> {
        let (head, rest) = self.rest.split_once(" work: ")?;
        let need: usize = head.split(" of ").next()?.parse().ok()?;
        self.rest = rest;
        let mut members = Vec::new();
        if let Some((n, rest)) = rest.split_once(" × ")
            && let Ok(n) = n.parse::<usize>()
        {
            self.rest = rest;
            let p = self.sum()?;
            members.resize(n, p);
            self.eat(")").then_some(())?;
        } else {
            members = self.arguments()?;
        }
        let parts: Vec<Wide> =
            members.iter().map(|m| Wide::try_from(m.0).unwrap().with_precision(BITS).value()).collect();
        let r = at_least(need, &parts);
        let value = if works { r } else { whole(1) - r };
        // The chance of a vote moves by no more than its members do, all of them together.
        Some((value.to_f64().value(), members.iter().map(|m| m.1).sum()))
    }

    fn number(&mut self) -> Option<Read> {
        let text = self.rest.trim_start();
        let mut end = text.find(|c: char| !c.is_ascii_digit() && c != '.').unwrap_or(text.len());
        if text[end..].starts_with('e') {
            let digits = text[end + 1..].trim_start_matches('-');
            let after = digits.find(|c: char| !c.is_ascii_digit()).unwrap_or(digits.len());
            end = text.len() - digits.len() + after;
        }
        let number = &text[..end];
        let value: f64 = number.parse().ok()?;
        self.rest = &text[end..];
        // Its unit: a space and a word, or a slash and a word.
        let unit = self.rest.trim_start();
        let word = unit.strip_prefix('/').unwrap_or(unit);
        if word.starts_with(|c: char| c.is_alphabetic() && c != 'P' && c != 'C') {
            let end = word.find(|c: char| !c.is_alphanumeric()).unwrap_or(word.len());
            self.rest = &word[end..];
        }
        if let Some(rest) = self.rest.strip_prefix('%') {
            self.rest = rest;
            return Some((value / 100.0, half_unit(number) / 100.0));
        }
        Some((value, half_unit(number)))
    }
}

fn relative(read: Read) -> f64 {
    if read.0 == 0.0 { 0.0 } else { (read.1 / read.0).abs() }
}

/// Half a unit in the last digit as printed.
fn half_unit(number: &str) -> f64 {
    let (mantissa, exponent) = number.split_once('e').unwrap_or((number, "0"));
    let decimals = mantissa.split_once('.').map_or(0, |(_, d)| d.len() as i32);
    0.5 * 10f64.powi(exponent.parse::<i32>().unwrap() - decimals)
}

fn read_all(text: &str) -> Option<Read> {
    let mut reader = Reader { rest: text };
    let value = reader.sum()?;
    // What is left may be a unit made of two.
    let rest = reader.rest.trim();
    (rest.is_empty() || !rest.contains(|c: char| c.is_ascii_digit())).then_some(value)
}

/// The steps of each question of a note, with the answer to the question itself.
fn each_step_list(text: &str, questions: &[&str], check: impl FnMut(&str, &StepList, &Number, &Sources)) {
    each_step_list_of_note(&format!("```tieback\n{text}\n```\n"), questions, check);
}

fn each_step_list_of_note(
    text: &str,
    questions: &[&str],
    mut check: impl FnMut(&str, &StepList, &Number, &Sources),
) {
    let (mut sources, mut tree, mut problems) = syntax_from("note.md", text, &Examples);
    let first = tree.statements.len();
    for question in questions {
        let at = sources.add("question", *question).unwrap();
        language::read_question(language::Source { text: question, at }, 1, &mut tree, &mut problems);
    }
    assert!(problems.is_empty(), "{problems:?}");
    let mut model = Model::new(&tree, &sources);
    let mut desk = Desk::default();
    for (statement, question) in tree.statements[first..].iter().zip(questions) {
        let Line::Ask { value, .. } = &statement.line else { panic!("{question}") };
        let list = desk.steps(&mut model, *value);
        let list = list.unwrap_or_else(|f| panic!("{question}: {:?}", model.problem(f)));
        let number = match tree.expr(tree.inside_groups(*value)) {
            Expr::Call(..) => desk.call(&mut model, tree.inside_groups(*value)),
            _ => desk.number(&mut model, *value),
        };
        check(question, &list, &number.unwrap(), &sources);
    }
}

fn same_chance(got: &Chance, works: &Wide, fails: &Wide) -> bool {
    gap(&wide(got.works()), works) < 1e-25 && gap(&wide(got.fails()), fails) < 1e-25
}

fn recompute(question: &str, list: &StepList, answer: &Number, sources: &Sources, rules: &mut Vec<Rule>) {
    let mut results: Vec<(Wide, Wide)> = Vec::new();
    for (at, step) in list.steps.iter().enumerate() {
        rules.push(step.rule);
        for formula in [&step.works, &step.fails] {
            assert!(formula.uses().iter().all(|s| *s < at), "{question}, step {}", at + 1);
        }
        let works = value(&step.works, &results);
        match &step.outcome {
            Outcome::Chance(chance) => {
                let fails = value(&step.fails, &results);
                assert!(same_chance(chance, &works, &fails), "{question}: {}: {works} {fails}", step.thing);
                results.push((wide(chance.works()), wide(chance.fails())));
            }
            Outcome::Figure(figure, _) => {
                assert!(gap(&wide(*figure), &works) < 1e-25, "{question}: {}: {works}", step.thing);
                results.push((whole(1), whole(0)));
            }
        }
    }
    let last = list.steps.last().unwrap();
    match (answer, &last.outcome) {
        (Number::Chance(chance, ..), Outcome::Chance(step)) => {
            assert!(same_chance(chance, &wide(step.works()), &wide(step.fails())), "{question}");
        }
        (Number::Figure(quantity), Outcome::Figure(step, _)) => {
            assert!(gap(&wide(quantity.value), &wide(*step)) < 1e-25, "{question}");
        }
        other => panic!("{question}: {other:?}"),
    }
    for text in shown(list, sources, 7) {
        if text.numbers.contains('…') {
            continue;
        }
        let (Some(got), Some(want)) = (read_all(&text.numbers), read_all(&text.result)) else {
            panic!("{question}: not read: {} = {}", text.numbers, text.result);
        };
        // First order in the inputs, with a quarter to spare for the second, and doubles.
        let room = 1.25 * got.1 + want.1 + 1e-14 * got.0.abs();
        assert!((got.0 - want.0).abs() <= room, "{question}: {} = {}: {got:?}", text.numbers, text.result);
    }
}

const PLANT: &str = "\
mission start-up 2 h stress 3, steady 4 kh
base = 12 /Mh
fan = rate 18 /Mh, duty 30%, stress 2
coupling = mttf 50 kh
belt = 0.98 over 1000 h
guard = fails 2% over 1 yr
plug = fails 1 in 2000
lamp = 98%
gear = rate (base * 1.4)
F1, F2, F3 = a fan
row = (2 of (F1, F2, F3)) -> plug -> lamp -> coupling -> belt -> guard -> gear
pair = 1 of 2 gear
mixed = 2 of (fan, lamp, coupling)
wide = 2 of (fan, lamp, coupling, belt, guard, pair)
many = 17 of 30 lamp
twelve = 9 of 12 lamp
i1, i2, i3, i4, i5 = a fan
bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)
nest = (bridge -> F1) // (F1 -> lamp) // (lane -> plug) // (lane -> belt)
lane = F2 -> gear
told = fails when (F1 and F2) or (F2 and F3) or (F1 and plug and lamp)
tiny = any of 6 safe
safe = fails 1e-5
gain = F(row) / F(bridge)";

const SWITCHING: &str = "\
exposure start, km
mission 10 h, 4 start, 300 km
relay = fails 0.001 /start
motor = rate 2 /Mh, fails 0.002 /start, 0.999
tyre = rate 2e-5 /km, stress 1.5
cable = perfect
cart = relay -> motor -> tyre -> cable
two = any of 2 cart";

#[test]
fn steps_can_be_computed_again() {
    let mut rules = Vec::new();
    let plant = [
        "R(row)",
        "F(row)",
        "R(row, 500 h)",
        "R(pair)",
        "R(mixed)",
        "R(wide)",
        "R(many)",
        "F(twelve)",
        "R(bridge)",
        "R(nest)",
        "F(told)",
        "F(tiny)",
        "R(plug)",
        "gain",
        "gain * base + 1 /yr",
        "1 - R(row) * R(nest)",
        "sqrt(F(row)) + max(R(row), 0.2, R(pair)) - min(ln(2), log10(3))",
        "exp(-F(row)) ^ 2",
        "F(row) / F(bridge)",
        "R(row, 500 h) / R(row, 600 h)",
        "Birnbaum(row, plug)",
        "Birnbaum(nest, F1)",
        "criticality(nest, F1)",
        "FV(nest, F2)",
        "RAW(nest, i3)",
        "RRW(bridge, i3)",
        "doubled(mixed, fan)",
        "made perfect(wide, pair)",
        "RAW(row, plug)",
        "RRW(row, plug)",
        "Birnbaum(bridge, i3, 900 h)",
    ];
    each_step_list(PLANT, &plant, |question, list, answer, sources| {
        recompute(question, list, answer, sources, &mut rules);
    });
    let switching = ["R(cart)", "R(two)", "F(motor, 1 h, 9 start)"];
    each_step_list(SWITCHING, &switching, |question, list, answer, sources| {
        recompute(question, list, answer, sources, &mut rules);
    });
    // Sharing too wide for cases: the diagram's nodes are the steps.
    let names: Vec<String> = (0..12).map(|i| format!("d{i}")).collect();
    let mut mesh: Vec<String> =
        names.iter().enumerate().map(|(i, n)| format!("{n} = fails 0.0{}", 1 + i % 9)).collect();
    let pairs: Vec<String> = (0..12)
        .map(|i| format!("({} -> {} -> {})", names[i], names[(i + 1) % 12], names[(i + 5) % 12]))
        .collect();
    mesh.push(format!("mesh = {}", pairs.join(" // ")));
    each_step_list(&mesh.join("\n"), &["R(mesh)"], |question, list, answer, sources| {
        recompute(question, list, answer, sources, &mut rules);
    });
    // Networks: by reductions and a few cases, by their states, and in one step.
    let small = "a, b, c, d, e = fails 3%\n\
        net = routes(in -> a -> c -> out, in -> b -> d -> out, a <-> e <-> b, c <-> e <-> d)\n\
        line = routes(in -> a -> (b // c) -> out, a -> d -> e -> out)\n\
        lines = routes(in -> a -> b, in -> c -> b, in -> c -> d, a -> d, b <-> e) with ends 2 of (b, d, e)\n\
        nest = (net -> a) // (line -> e)";
    each_step_list(
        small,
        &["R(net)", "F(line)", "R(lines)", "F(nest)"],
        |question, list, answer, sources| {
            recompute(question, list, answer, sources, &mut rules);
        },
    );
    let square: Vec<(usize, usize)> = (0..16)
        .flat_map(|i| [(i, i + 4), (i, i + 1)])
        .filter(|(i, j)| *j < 16 && (j % 4 > 0 || j - i > 1))
        .collect();
    let ring: Vec<(usize, usize)> =
        (0..15).flat_map(|i| [1, 3, 4].map(|step| (i, (i + step) % 15))).collect();
    for (links, firsts, lasts, rule) in
        [(square, [0, 0], [15, 15], Rule::NetworkState), (ring, [0, 1], [7, 9], Rule::Network)]
    {
        let names: BTreeSet<String> =
            links.iter().flat_map(|(i, j)| [format!("g{i}"), format!("g{j}")]).collect();
        let names: Vec<String> = names.into_iter().collect();
        let mut ways: Vec<String> = firsts.iter().map(|i| format!("in -> g{i}")).collect();
        ways.extend(lasts.iter().map(|i| format!("g{i} -> out")));
        ways.extend(links.iter().map(|(i, j)| format!("g{i} <-> g{j}")));
        let net = format!("{} = fails 5%\nnet = routes({})", names.join(", "), ways.join(", "));
        let mut own = Vec::new();
        each_step_list(&net, &["R(net)"], |question, list, answer, sources| {
            recompute(question, list, answer, sources, &mut own);
        });
        assert!(own.contains(&rule), "{own:?}");
    }
    for rule in [
        Rule::Given,
        Rule::Exposure,
        Rule::Occurrences,
        Rule::Ways,
        Rule::Series,
        Rule::Parallel,
        Rule::LikeVote,
        Rule::UnlikeVote,
        Rule::TotalProbability,
        Rule::Importance,
        Rule::DiagramNode,
        Rule::Arithmetic,
    ] {
        assert!(rules.contains(&rule), "{rule:?} is not reached");
    }
}

/// The folder of the examples, whose notes use its parts lists.
struct Examples;

impl Shelf for Examples {
    fn fetch(&self, _: &str, path: &str) -> Result<Fetched, NotFetched> {
        let bytes = std::fs::read(std::path::Path::new("examples").join(path)).unwrap();
        Ok(Fetched { name: path.to_string(), key: path.to_string(), bytes })
    }
}

/// Questions of the examples, where there are any.
#[test]
fn steps_of_the_examples_can_be_computed_again() {
    let folder = std::fs::read_dir("examples").unwrap();
    for entry in folder.flatten() {
        if entry.path().extension().is_none_or(|e| e != "md") {
            continue;
        }
        let text = std::fs::read_to_string(entry.path()).unwrap();
        let mut questions: Vec<&str> = Vec::new();
        for asked in fill_from("example.md", text.as_str().into(), &Examples).asked {
            let question =
                text[asked.place.start as usize..asked.place.end as usize].split('?').next().unwrap();
            let word = question.trim_start();
            if (word.starts_with("R(") || word.starts_with("F("))
                && !asked.error
                && !asked.new.starts_with("none")
            {
                questions.push(question.split(" in ").next().unwrap());
            }
        }
        assert!(!questions.is_empty(), "an example asks nothing");
        each_step_list_of_note(&text, &questions, |question, list, answer, sources| {
            if !list.steps.is_empty() {
                recompute(question, list, answer, sources, &mut Vec::new());
            }
        });
    }
}

fn steps_text(definitions: &str, question: &str) -> Vec<String> {
    let text = format!("```tieback\n{definitions}\nsteps({question}) ?\n```\n");
    fill("note.md", &text).asked.pop().unwrap().new.lines().map(str::trim).map(str::to_string).collect()
}

#[test]
fn data_stand_as_the_note_has_them() {
    let steps = steps_text("valve = fails 1 in 2000", "F(valve)");
    assert_eq!(steps[1], "F(valve) = q = 1/2000 = 0.0005; R = 0.9995");
    let steps = steps_text("mission 1 yr\nfan = rate 18 /Mh", "F(fan)");
    assert_eq!(steps[2], "with λ = 18 /Mh = 1.8e-5 /h, t = 1 yr = 8760 h");
}

#[test]
fn names_in_formulas_are_single() {
    let steps = steps_text("A, B, C = 0.9\nx = 2 of (A, B, C)", "R(x)");
    assert_eq!(steps[0], "1. A, B, C, as given");
    assert!(steps[3].contains("C(3, 2) · R(A)^2 · F(A) + R(A)^3"), "{}", steps[3]);
    let steps = steps_text("A = 0.9\nx = 2 of 3 A", "R(x)");
    assert!(steps[1].starts_with("R(x.A[1..3]) = p"), "{}", steps[1]);
    // What is conditioned upon stands alone.
    let steps = steps_text("A, B, C = 0.9\nx = (A -> B) // (A -> C)", "R(x)");
    assert!(steps[0].starts_with("1. A,") && steps.iter().any(|s| s.starts_with("2. B, C,")), "{steps:?}");
}

#[test]
fn assumptions_are_no_steps() {
    let steps = steps_text("A = 0.9\nx = 2 of 3 A", "R(x)");
    let assumed: Vec<&String> = steps.iter().filter(|s| s.contains("assumed")).collect();
    assert!(!assumed.is_empty() && assumed.iter().all(|s| s.starts_with("assumed: ")), "{steps:?}");
    let text = "```tieback\nA = 0.9\nx = 2 of 3 A\n```\n\n<!--? steps(R(x)) -->\n";
    let tieback::document::patch::Rewrite::Patched(once) = fill("note.md", text).rewrite else { panic!() };
    let once = String::from_utf8(once).unwrap();
    assert!(once.contains("\n   - assumed: "), "{once}");
    assert_eq!(fill("note.md", &once).rewrite, tieback::document::patch::Rewrite::Unchanged);
}

#[test]
fn long_rows_say_what_they_leave_out() {
    let names: Vec<String> = (0..20).map(|i| format!("n{i}")).collect();
    let mut note: Vec<String> = names.iter().enumerate().map(|(i, n)| format!("{n} = 0.9{i:02}")).collect();
    note.push(format!("x = {}", names.join(" -> ")));
    let steps = steps_text(&note.join("\n"), "R(x)");
    let row = steps.iter().find(|s| s.starts_with("R(x)")).unwrap();
    assert!(row.starts_with("R(x) = R(n0) · R(n1) · R(n2) · … (16 more) · R(n19) = "), "{row}");
}

/// Shared things that rest on shared things, many ways: the last step must be the answer.
#[test]
fn steps_of_random_systems_end_in_the_answer() {
    let mut state = 0x9E37_79B9_7F4A_7C15_u64;
    let mut draw = move |n: u64| {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 33) % n
    };
    let mut rules = Vec::new();
    for _ in 0..300 {
        let things = 3 + draw(5);
        let mut lines: Vec<String> =
            (0..things).map(|i| format!("p{i} = fails 0.0{}", 1 + draw(9))).collect();
        let mut names: Vec<String> = (0..things).map(|i| format!("p{i}")).collect();
        for i in 0..2 + draw(5) {
            let count = 2 + draw(3);
            let members: Vec<String> =
                (0..count).map(|_| names[draw(names.len() as u64) as usize].clone()).collect();
            lines.push(match draw(3) {
                0 => format!("q{i} = {}", members.join(" -> ")),
                1 => format!("q{i} = {}", members.join(" // ")),
                _ => format!("q{i} = {} of ({})", 1 + draw(count), members.join(", ")),
            });
            names.push(format!("q{i}"));
        }
        let question = format!("R({})", names[names.len() - 1]);
        each_step_list(&lines.join("\n"), &[&question], |question, list, answer, sources| {
            recompute(question, list, answer, sources, &mut rules);
        });
    }
}
