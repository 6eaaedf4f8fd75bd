//! What tieback promises of every note, on generated ones: filling twice is
//! filling once, no byte outside an answer moves, the order of definitions is
//! free, what is printed reads back the same, and nothing makes it panic.

use proptest::prelude::*;
use proptest::test_runner::{Config, RngAlgorithm, TestRng, TestRunner};
use std::sync::atomic::{AtomicU32, Ordering::Relaxed};
use tieback::document::patch::Rewrite;
use tieback::language::{self, Line, Tree};
use tieback::note::{Filled, NoShelf, ask, fill};
use tieback::source::{Code, Sources};

/// Runs a property on cases that are the same in every run; `TIEBACK_CASES`
/// sets how many, for a long run by hand.
fn check<S: Strategy>(
    seed: u8,
    cases: u32,
    strategy: S,
    property: impl Fn(S::Value) + std::panic::RefUnwindSafe,
) where
    S::Value: std::fmt::Debug,
{
    let cases = std::env::var("TIEBACK_CASES").ok().and_then(|n| n.parse().ok()).unwrap_or(cases);
    let config = Config { cases, failure_persistence: None, max_shrink_iters: 2000, ..Config::default() };
    let rng = TestRng::from_seed(RngAlgorithm::ChaCha, &[seed; 32]);
    let mut runner = TestRunner::new_with_rng(config, rng);
    if let Err(error) = runner.run(&strategy, |value| {
        property(value);
        Ok(())
    }) {
        panic!("{error}");
    }
}

/// An expression over things `t0` to `t5` and earlier structures.
fn structure(depth: u32) -> BoxedStrategy<String> {
    let leaf = prop_oneof![
        6 => (0..6).prop_map(|i| format!("t{i}")),
        1 => (1..99).prop_map(|p| format!("0.{p:02}")),
        1 => (1..4, 0..6).prop_map(|(n, i)| format!("(any of {n} t{i})")),
        1 => Just("\"Haupt pumpe\"".to_string()),
    ];
    leaf.prop_recursive(depth, 24, 4, |inner| {
        let many = prop::collection::vec(inner.clone(), 2..4);
        prop_oneof![
            many.clone().prop_map(|m| format!("({})", m.join(" -> "))),
            many.clone().prop_map(|m| format!("({})", m.join(" // "))),
            (1..3, many.clone()).prop_map(|(k, m)| format!("({k} of ({}))", m.join(", "))),
            many.prop_map(|m| format!("(fails when {})", m.join(" and "))),
            inner.prop_map(|m| format!("(a {m})")),
        ]
    })
    .boxed()
}

/// An expression in arithmetic.
fn figure() -> BoxedStrategy<String> {
    let leaf = prop_oneof![
        (1..1000u32).prop_map(|n| n.to_string()),
        (1..999u32).prop_map(|n| format!("0.{n:03}")),
        (1..99u32).prop_map(|n| format!("{n}%")),
        (1..9u32).prop_map(|n| format!("{n} /Mh")),
        (1..9u32).prop_map(|n| format!("{n} in 100")),
        (0..6).prop_map(|i| format!("F(t{i})")),
    ];
    leaf.prop_recursive(4, 24, 3, |inner| {
        let two = (inner.clone(), inner.clone());
        prop_oneof![
            (two.clone(), prop::sample::select(vec![" + ", " - ", " * ", " / ", "^"]))
                .prop_map(|((a, b), op)| format!("{a}{op}{b}")),
            inner.clone().prop_map(|a| format!("({a})")),
            inner.clone().prop_map(|a| format!("-{a}")),
            two.prop_map(|(a, b)| format!("max({a}, {b})")),
        ]
    })
    .boxed()
}

fn question() -> BoxedStrategy<String> {
    prop_oneof![
        4 => Just("R(top)".to_string()),
        2 => Just("F(top)".to_string()),
        1 => Just("F(top) in chances".to_string()),
        1 => Just("R(top) in %".to_string()),
        1 => prop::sample::select(vec!["3 h^2", "2 /h * 3 /h", "2 kg / 3 h", "3 kg * 2 h", "1 - 1e-200", "4 kh in yr", "-3",
            "R(t1 // t1 // t5) in %", "F(all of 3000 t5)", "R(any of 90 t1) in %", "R(any of 90 t1)", "2 FIT in %/kh"])
            .prop_map(str::to_string),
        1 => (0..6).prop_map(|i| format!("Birnbaum(top, t{i})")),
        1 => (1..9).prop_map(|h| format!("R(top, {h} kh)")),
        1 => Just("cuts(top)".to_string()),
        1 => Just("rank(top)".to_string()),
        1 => Just("steps(R(top))".to_string()),
        1 => Just("assumptions(top)".to_string()),
        1 => Just("inputs(top)".to_string()),
        1 => Just("count(paths(top))".to_string()),
        1 => Just("R(nothing)".to_string()),
        1 => Just("gain".to_string()),
        1 => figure(),
        1 => structure(2).prop_map(|s| format!("R({s})")),
    ]
    .boxed()
}

/// A piece of a note: definitions, questions, prose with pairs, tables.
fn piece() -> BoxedStrategy<Vec<String>> {
    let fence = (prop::collection::vec(question(), 1..4), any::<bool>(), any::<bool>()).prop_map(
        |(q, tail, indent)| {
            let mut lines = vec!["```tieback".to_string()];
            for q in q {
                let tail = if tail { "   # mine" } else { "" };
                lines.push(format!("{}{q} ?{tail}", if indent { "  " } else { "" }));
            }
            lines.push("require R(top) >= 0.9 ?".to_string());
            lines.push("```".to_string());
            lines
        },
    );
    let pair = question().prop_map(|q| vec![format!("It reaches <!--? {q} -->, or *so* <!--? F(t1) -->.")]);
    let block = question().prop_map(|q| vec![String::new(), format!("<!--? {q} -->"), String::new()]);
    let table = (question(), 1..4usize).prop_map(|(_, n)| {
        let mut lines =
            vec!["<!--? table -->".to_string(), "| name | is | R ? | F in chances ? |".to_string()];
        lines.push("| --- | --- | --- | --- |".to_string());
        lines.extend((0..n).map(|i| format!("| t{i} | | |{}", if i % 2 == 0 { " |" } else { "" })));
        lines
    });
    let prose = prop::sample::select(vec![
        "Some text.",
        "# Head",
        "> quoted",
        "- item",
        "1. one",
        "    code",
        "<b>html</b>",
        "",
    ]);
    prop_oneof![4 => fence, 2 => pair, 2 => block, 1 => table, 2 => prose.prop_map(|p| vec![p.to_string()])]
        .boxed()
}

/// A whole note.
#[derive(Clone, Debug)]
struct Note {
    text: String,
}

/// Definitions in order.
fn definitions() -> BoxedStrategy<Vec<String>> {
    let datum = prop::sample::select(vec![
        "0.9",
        "fails 1e-5",
        "fails 1 in 2000",
        "rate 18 /Mh",
        "mttf 50 kh, duty 30%",
        "0.98 over 1000 h",
        "perfect",
        "99%",
        "rate (base * 2), stress 2",
        "a t0",
        "fails 0.5",
    ]);
    (prop::collection::vec(datum, 6), structure(3))
        .prop_map(|(data, top)| {
            let mut lines: Vec<String> = data
                .iter()
                .enumerate()
                .map(|(i, d)| if i == 0 && *d == "a t0" { "t0 = 0.7".into() } else { format!("t{i} = {d}") })
                .collect();
            lines.extend(["mission 4 kh".into(), "base = 12 /Mh".into(), "\"Haupt pumpe\" = 0.95".into()]);
            lines.push(format!("top = {top}"));
            lines.push("gain = F(top) / F(t1)".into());
            lines
        })
        .boxed()
}

fn note() -> BoxedStrategy<Note> {
    let quote = prop::sample::select(vec!["", "", "", "> ", "- ", "> - "]);
    (definitions(), prop::collection::vec((piece(), quote), 1..6), any::<bool>(), 0..8u8)
        .prop_map(|(definitions, pieces, crlf, bom)| {
            let mut lines = vec!["```tieback".to_string()];
            lines.extend(definitions);
            lines.extend(["```".to_string(), String::new()]);
            for (piece, quote) in pieces {
                // A list item's further lines are indented, a quote's repeat its mark.
                let rest = quote.replace('-', " ");
                for (i, line) in piece.iter().enumerate() {
                    lines.push(format!("{}{line}", if i == 0 { quote } else { &rest }));
                }
                lines.push(String::new());
            }
            let text = lines.join(if crlf { "\r\n" } else { "\n" });
            Note { text: if bom == 0 { format!("\u{feff}{text}") } else { text } }
        })
        .boxed()
}

const TOKENS: &[&str] = &[
    "?",
    " ? ",
    "<!--?",
    "-->",
    "<!--/?-->",
    "```",
    "```tieback\n",
    "\n",
    "\r\n",
    "\r",
    "#",
    " # ",
    "\"",
    "(",
    ")",
    "//",
    "->",
    "→",
    "∥",
    "|",
    "\\|",
    "> ",
    "- ",
    "\t",
    "\u{a0}",
    "–",
    "“",
    "2 of ",
    "fails when ",
    "a ",
    "=",
    "top",
    "R(top) ?",
    "<!--? R(top) -->",
    "<!--? rank(top) -->\n",
    "? 0.9",
    "! ",
    "é",
    "\u{0}",
    "~~~",
    "    ",
    "with ",
    "sharing (t0)",
    "require ",
    "1e999",
    "0.",
    "/Mh",
    "%",
    " in ",
    "else",
    "<div>",
    "[a](b)",
    "`",
    "*",
    "&amp;",
    "<!--",
];

/// A note with tokens put in, and pieces cut out, anywhere.
fn mangled() -> BoxedStrategy<Note> {
    let change = (any::<prop::sample::Index>(), prop::sample::select(TOKENS), 0..3u8, 0..12usize);
    (note(), prop::collection::vec(change, 1..6))
        .prop_map(|(note, changes)| {
            let mut text: Vec<char> = note.text.chars().collect();
            for (index, token, kind, length) in changes {
                let at = index.index(text.len() + 1);
                let end = if kind == 0 { (at + length).min(text.len()) } else { at };
                let put: Vec<char> = if kind == 0 { Vec::new() } else { token.chars().collect() };
                text.splice(at..end, put);
            }
            Note { text: text.into_iter().collect() }
        })
        .boxed()
}

fn after(text: &str, filled: &Filled) -> String {
    match &filled.rewrite {
        Rewrite::Unchanged => text.to_string(),
        Rewrite::Patched(bytes) => String::from_utf8(bytes.clone()).unwrap(),
    }
}

/// Filling twice is filling once; what stays is in order in both.
fn keeps_its_promises(text: &str) {
    let first = fill("note.md", text);
    let once = after(text, &first);
    let second = fill("note.md", &once);
    let twice = after(&once, &second);
    assert_eq!(once, twice, "filling twice is not filling once; before:\n{text}");
    assert!(second.asked.iter().all(|a| !a.stale), "stale after filling:\n{once}");
    // What was written is known again as an answer; other text that stays is reported in both.
    let strangers = |f: &Filled| f.problems.iter().filter(|p| p.code == Code::NotAnAnswer).count();
    assert_eq!(strangers(&first), strangers(&second), "an answer is not known again:\n{once}");
    // A note without a stale answer is not rewritten at all.
    assert_eq!(first.asked.iter().any(|a| a.stale), once != text, "before:\n{text}");
}

#[test]
fn filling_twice_is_filling_once() {
    check(1, 250, note(), |note| keeps_its_promises(&note.text));
}

#[test]
fn so_it_is_for_mangled_notes() {
    check(2, 350, mangled(), |note| keeps_its_promises(&note.text));
}

#[test]
fn arbitrary_text_is_no_trouble() {
    check(3, 300, any::<String>(), |text| {
        keeps_its_promises(&text);
        keeps_its_promises(&format!("```tieback\n{text}\n```\n"));
        let _ = ask("note.md", "", &NoShelf, std::slice::from_ref(&text), &text);
    });
}

#[test]
fn token_soups_are_no_trouble() {
    let words = prop_oneof![
        2 => prop::sample::select(TOKENS).prop_map(str::to_string),
        1 => prop::sample::select(vec![
            "t0", "t1", "x", "0.9", "3", "rate", "mttf", "fails", "over", "kh", "of", "and", "or", "not", "with", "routes(",
            "R(", "F(", "cuts(", "steps(", "rank(", ",", "<->", ">=", "<=", "-", "+", "*", "/", "^", "mission", "digits",
            "year", "exposure", "attribute", "use", "separate", "perfect", "source", "duty", "stress", "confidence", " ",
        ]).prop_map(str::to_string),
        1 => (0..20u32).prop_map(|n| n.to_string()),
    ];
    check(4, 500, prop::collection::vec(words, 0..40), |words| {
        for between in ["", " "] {
            let soup = words.join(between);
            keeps_its_promises(&format!("```tieback\nt0 = 0.9\nt1 = a t0\n{soup}\n```\n"));
            keeps_its_promises(&soup);
        }
    });
}

/// The text without its answers, found without the library: what stands right
/// of a `?` in a fence, lines that begin with `?`, what stands between the
/// comments of a pair.
fn without_answers(text: &str) -> String {
    let mut out = String::new();
    let (mut fenced, mut skipping) = (false, false);
    for line in text.split_inclusive('\n') {
        let bare = line.trim_start_matches(['>', ' ', '-', '\u{feff}']).trim_end();
        if bare.starts_with("```") {
            fenced = !fenced;
            out.push_str(line);
        } else if fenced {
            if bare.starts_with('?') {
                continue;
            }
            let end = line.trim_end_matches(['\r', '\n']);
            match end.find('?') {
                Some(at) => {
                    let answer = &end[at + 1..];
                    let comment = answer.find(" #").map_or("", |c| {
                        let before = answer[..c].trim_end().len();
                        &answer[before..]
                    });
                    out.push_str(&end[..=at]);
                    out.push_str(comment);
                    out.push_str(&line[end.len()..]);
                }
                None => out.push_str(line),
            }
        } else {
            let mut rest = line;
            while !rest.is_empty() {
                if skipping {
                    match rest.find("<!--/?-->") {
                        Some(at) => {
                            rest = &rest["<!--/?-->".len() + at..];
                            skipping = false;
                        }
                        None => break,
                    }
                } else {
                    match rest.find("<!--? ").and_then(|a| Some(a + rest[a..].find("-->")? + 3)) {
                        Some(at) => {
                            out.push_str(&rest[..at]);
                            rest = &rest[at..];
                            // Filled only if a closer comes before the next opener.
                            let tail = &text[rest.as_ptr() as usize - text.as_ptr() as usize..];
                            let closer = tail.find("<!--/?-->");
                            let opener = tail.find("<!--? ").unwrap_or(usize::MAX);
                            skipping = closer.is_some_and(|c| c < opener);
                        }
                        None => {
                            out.push_str(rest);
                            break;
                        }
                    }
                }
            }
        }
    }
    out
}

/// Blank lines and quote marks around a block pair's answer come and go with it.
fn squeezed(text: &str) -> String {
    text.lines()
        .map(|l| l.trim_end())
        .filter(|l| !l.trim_matches(['>', ' ']).is_empty())
        .collect::<Vec<_>>()
        .join("\n")
}

#[test]
fn only_answers_change() {
    check(5, 250, note(), |note| {
        if note.text.contains("table -->") {
            return;
        }
        let once = after(&note.text, &fill("note.md", &note.text));
        assert_eq!(
            squeezed(&without_answers(&once)),
            squeezed(&without_answers(&note.text)),
            "{}\n{once}",
            note.text
        );
        // Filled again without its answers it is the same, to the byte.
        if note.text.contains("<!--?") {
            return;
        }
        let cut = without_answers(&once);
        assert_eq!(after(&cut, &fill("note.md", &cut)), once);
    });
}

#[test]
fn definitions_stand_in_any_order() {
    let shuffled = definitions().prop_flat_map(|d| (Just(d.clone()), Just(d).prop_shuffle()));
    check(6, 120, (shuffled, question()), |((one, other), question)| {
        let answer = |lines: &[String]| {
            let text = format!("```tieback\n{}\n```\n", lines.join("\n"));
            let filled = ask("note.md", &text, &NoShelf, &[], &question);
            // A line that moved has another number; that it is in error stays.
            match filled.asked[0].new.strip_prefix("! rests on line ") {
                Some(_) => "! rests on a line in error".to_string(),
                None => filled.asked[0].new.clone(),
            }
        };
        let (one, other) = (answer(&one), answer(&other));
        // Rows of like rank, and steps, follow the order of the note.
        let sorted = |text: &str| {
            let mut lines: Vec<String> = text.lines().map(str::to_string).collect();
            lines.sort();
            lines
        };
        if !question.starts_with("steps") {
            assert_eq!(sorted(&one), sorted(&other), "{question}");
        }
    });
}

/// A tree as text in which everything but places shows.
fn dump(tree: &Tree, root: language::ExprId, sources: &Sources) -> String {
    language::print(tree, root, &|span| sources.text(span).to_string())
}

fn read(text: &str) -> Option<String> {
    let mut sources = Sources::default();
    let at = sources.add("x", text)?;
    let (mut tree, mut problems) = (Tree::default(), Vec::new());
    language::read_question(language::Source { text, at }, 0, &mut tree, &mut problems);
    let Some(Line::Ask { value, display: None }) = tree.statements.last().map(|s| &s.line) else {
        return None;
    };
    if !problems.is_empty() {
        return None;
    }
    Some(format!("{:?} {}", shape(&tree, *value), dump(&tree, *value, &sources)))
}

/// The kinds of nodes from the root down, without places.
fn shape(tree: &Tree, root: language::ExprId) -> Vec<String> {
    use language::Expr;
    let mut found = Vec::new();
    let mut stack = vec![root];
    while let Some(id) = stack.pop() {
        let expr = tree.expr(id);
        let name = format!("{expr:?}");
        found.push(name.split(['(', ' ']).next().unwrap_or_default().to_string());
        match expr {
            Expr::Group(x) | Expr::Negate(x) | Expr::Copy(x) | Expr::FailsWhen(x) | Expr::WithUnit(x, _) => {
                stack.push(x)
            }
            Expr::Settled(x, _) | Expr::Choice(_, x) => stack.push(x),
            Expr::Arith(op, a, b) => {
                found.push(format!("{op:?}"));
                stack.extend([a, b]);
            }
            Expr::Counted(a, b) => stack.extend([a, b]),
            Expr::Series(l)
            | Expr::Parallel(l)
            | Expr::And(l)
            | Expr::Or(l)
            | Expr::AtLeast(_, l)
            | Expr::Call(_, l) => {
                stack.extend(tree.list(l));
            }
            _ => {}
        }
    }
    found
}

#[test]
fn what_is_printed_reads_back() {
    let expressions = prop_oneof![structure(5), figure()];
    let (all, sound) = (AtomicU32::new(0), AtomicU32::new(0));
    check(7, 600, expressions, |text| {
        all.fetch_add(1, Relaxed);
        let Some(first) = read(&text) else { return };
        sound.fetch_add(1, Relaxed);
        let printed = first.rsplit_once("] ").unwrap().1.to_string();
        assert_eq!(read(&printed).as_ref(), Some(&first), "{text} is printed as {printed}");
    });
    assert!(2 * sound.into_inner() > all.into_inner(), "most of the expressions must be sound");
}
