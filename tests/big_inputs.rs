//! Inputs far larger than anyone writes: an answer or a clear error, in linear
//! time, on a thread with a small stack, also when all of it is dropped.

use tieback::note::{Filled, fill};

/// What the note's questions are answered with, found on 2 MiB of stack.
fn answers(lines: Vec<String>) -> Vec<String> {
    on_small_stack(move || {
        let text = format!("```tieback\n{}\n```\n", lines.join("\n"));
        let filled: Filled = fill("big.md", &text);
        filled.asked.into_iter().map(|a| a.new).collect()
    })
}

fn on_small_stack<T: Send + 'static>(work: impl FnOnce() -> T + Send + 'static) -> T {
    std::thread::Builder::new().stack_size(2 << 20).spawn(work).unwrap().join().unwrap()
}

#[track_caller]
fn check(lines: Vec<String>, want: &[&str]) {
    let got = answers(lines);
    assert_eq!(got.len(), want.len(), "{got:?}");
    for (got, want) in got.iter().zip(want) {
        match want.strip_suffix('…') {
            Some(start) => assert!(got.starts_with(start), "{got}"),
            None => assert_eq!(got, want),
        }
    }
}

fn nested(open: &str, inner: &str, close: &str, times: usize) -> String {
    format!("{}{inner}{}", open.repeat(times), close.repeat(times))
}

fn lines(parts: &[&str]) -> Vec<String> {
    parts.iter().map(ToString::to_string).collect()
}

#[test]
fn deep_parentheses() {
    let deep = nested("(", "0.9 -> 0.8", ")", 100_000);
    check(vec![format!("x = {deep}"), "R(x) ?".into()], &["0.7200"]);
    let sum = nested("(", "0.9 * 0.8", ")", 100_000);
    check(vec![format!("x = {sum}"), "x ?".into()], &["0.7200"]);
    let open = format!("x = {}0.9 -> 0.8", "(".repeat(100_000));
    check(vec![open, "R(x) ?".into()], &["! …"]);
}

#[test]
fn deep_structures() {
    let alternating = nested("0.9 -> (0.9 // (", "0.5", "))", 50_000);
    check(vec![format!("x = {alternating}"), "R(x) ?".into()], &["0.8901"]);
    let groups = nested("1 of (0.9, ", "0.9", ")", 20_000);
    check(vec![format!("x = {groups}"), "F(x) ?".into()], &["< 1e-300"]);
    let told = nested("(E0 and (E1 or ", "E2", "))", 20_000);
    check(vec!["E0, E1, E2 = 0.9".into(), format!("x = fails when {told}"), "R(x) ?".into()], &["0.98100"]);
    let signs = format!("x = {}3", "-".repeat(100_000));
    check(vec![signs, "x ?".into()], &["3.000"]);
    let powers = format!("x = {}2", "1^".repeat(50_000));
    check(vec![powers, "x ?".into()], &["1.000"]);
    let calls = nested("exp(", "-1", ")", 50_000);
    check(vec![format!("x = {calls}"), "x ?".into()], &["! …"]);
}

#[test]
fn deep_copies_and_calls() {
    let copies = nested("a (", "p -> 0.8", ")", 100_000);
    check(vec!["p = 0.9".into(), format!("x = {copies}"), "R(x) ?".into()], &["0.7200"]);
    let mut chain = vec!["n0 = 0.9".to_string()];
    chain.extend((1..20_000).map(|i| format!("n{i} = a n{}", i - 1)));
    chain.push("R(n19999) ?".into());
    check(chain, &["0.9000"]);
    let mut functions = vec!["f0(x) = x -> 0.9".to_string()];
    functions.extend((1..10_000).map(|i| format!("f{i}(x) = f{}(x)", i - 1)));
    functions.extend(["y = f9999(0.9)".into(), "R(y) ?".into()]);
    check(functions, &["0.8100"]);
}

#[test]
fn copies_that_double_end_in_an_error() {
    let mut doubling = vec!["n0 = 0.9".to_string()];
    doubling.extend((1..60).map(|i| format!("n{i} = a n{} -> a n{}", i - 1, i - 1)));
    doubling.push("R(n59) ?".into());
    check(doubling, &["! …"]);
}

#[test]
fn many_names_and_long_lines() {
    let mut names: Vec<String> = (0..200_000).map(|i| format!("n{i} = 0.9999")).collect();
    names.push("R(n1 -> n199999) ?".into());
    check(names, &["0.9998000"]);
    let all: Vec<String> = (0..100_000).map(|i| format!("n{i}")).collect();
    let mut series = vec![format!("x = {}", all.join(" -> ")), "F(x) ?".into()];
    series.extend(all.iter().map(|n| format!("{n} = fails 1e-7")));
    check(series, &["0.009950"]);
}

#[test]
fn long_chains_of_definitions() {
    let mut chain = vec!["n0 = fails 1e-9".to_string()];
    chain.extend((1..100_000).map(|i| format!("n{i} = n{} -> 0.99999999", i - 1)));
    chain.push("F(n99999) ?".into());
    check(chain, &["0.0009995"]);
    let mut figures = vec!["n0 = 1".to_string()];
    figures.extend((1..100_000).map(|i| format!("n{i} = n{} + 1", i - 1)));
    figures.push("n99999 ?".into());
    check(figures, &["100000"]);
}

#[test]
fn large_votes() {
    check(
        lines(&["p = 0.9", "x = 17000 of 20000 p", "F(x) ?", "Birnbaum(x, p[7]) ?", "steps(R(x)) ?"]),
        &["7.146e-109", "3.981e-109", "1. …"],
    );
    check(lines(&["p = 0.9", "x = 10000 of 20000 p", "F(x) ?", "R(x) ?"]), &["< 1e-300", "> 1 - 1e-300"]);
    check(lines(&["p = 0.9", "x = 21 of 20 p", "R(x) ?"]), &["! …"]);
    // Odd and fair: as likely above the middle as below.
    check(lines(&["p = 0.5", "x = 5001 of 10001 p", "R(x) ?"]), &["0.5000"]);
}

/// 500 things, a fifth of them used twice near each other.
#[test]
fn a_nested_system_that_shares_a_fifth() {
    let rates = ["1e-3", "2e-5", "0.01"];
    let mut note: Vec<String> = (0..500).map(|i| format!("t{i} = fails {}", rates[i * 7 % 3])).collect();
    let mut row = Vec::new();
    for g in 0..100 {
        let t = |i: usize| format!("t{}", 5 * g + i);
        note.push(format!("g{g} = ({} -> {}) // ({} -> {} -> {}) // {}", t(0), t(1), t(2), t(0), t(3), t(4)));
        row.push(format!("g{g}"));
    }
    while row.len() > 1 {
        let mut above = Vec::new();
        for (i, members) in row.chunks(4).enumerate() {
            let name = format!("h{}_{i}", row.len());
            let need = members.len().min(1 + (row.len() + i) % 3);
            note.push(format!("{name} = {need} of ({})", members.join(", ")));
            above.push(name);
        }
        row = above;
    }
    let questions =
        [format!("R({}) ?", row[0]), format!("F({}) ?", row[0]), format!("count(cuts({})) ?", row[0])];
    note.extend(questions);
    let got = answers(note);
    assert!(got.iter().all(|a| !a.starts_with('!')), "{got:?}");
}

#[test]
fn markdown_made_of_openers() {
    on_small_stack(|| {
        for text in [
            "> ".repeat(20_000) + "```tieback\n" + &"> ".repeat(20_000) + "R(x) ?\n",
            "x <!--? 1+1 --> ".repeat(20_000),
            "<!--? ".repeat(50_000),
            "<!--/?-->".repeat(50_000),
            "```tieback\n".repeat(20_000),
            "- ".repeat(500) + "<!--? 1 + 1 -->",
            "[".repeat(50_000),
        ] {
            let _ = fill("big.md", &text);
        }
    });
}

#[test]
fn large_networks() {
    // A chain, a ladder and a nest of networks; stops fail with 1e-6 each.
    let names = |n: usize| (0..n).map(|i| format!("s{i}")).collect::<Vec<_>>();
    let define = |n: usize| format!("{} = fails 1e-6", names(n).join(", "));
    let chain = format!("x = routes(in -> {} -> out)", names(20_000).join(" -> "));
    check(vec![define(20_000), chain, "F(x) ?".into()], &["0.01980"]);
    let rungs = (0..3000).map(|i| format!("s{} <-> s{}", 2 * i, 2 * i + 1));
    let rails = (0..5998).map(|i| format!("s{i} <-> s{}", i + 2));
    let ladder: Vec<String> = rungs.chain(rails).collect();
    let ladder = format!("x = routes(in -> s0, in -> s1, {}, s5998 -> out, s5999 -> out)", ladder.join(", "));
    // Cut by both stops of a rung, or by two that lie crosswise on neighbouring
    // rungs: 3000 + 2 * 2999 sets of two, 1e-12 each, and hardly ever two at once.
    check(vec![define(6000), ladder, "F(x) ?".into(), "count(cuts(x)) ?".into()], &["8.998e-9", "8998"]);
    let nest = nested("routes(in -> (", "s0", ") -> s1 -> out)", 3000);
    check(vec![define(2), format!("x = {nest}"), "F(x) ?".into()], &["2.000e-6"]);
    // Sixteen by sixteen: too many states to be kept, and what is likely is soon summed.
    let stop = |i: usize, j: usize| format!("s{}", 16 * i + j);
    let mut ways = vec!["in -> s0".to_string(), "s255 -> out".to_string()];
    for (i, j) in (0..16).flat_map(|i| (0..15).map(move |j| (i, j))) {
        ways.push(format!("{} <-> {}", stop(i, j), stop(i, j + 1)));
        ways.push(format!("{} <-> {}", stop(j, i), stop(j + 1, i)));
    }
    let grid = format!("x = routes({})", ways.join(", "));
    check(vec![define(256), grid, "F(x) ?".into(), "rank(x) ?".into()], &["2.000e-6", "! …"]);
}
