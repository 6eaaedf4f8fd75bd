//! Times as ratios to floors, both measured in turn in one run.
//!
//! Absolute times differ between machines and hours; a ratio to work that
//! nobody can leave out differs much less. `cargo bench` runs everything;
//! `cargo bench -- fill small` runs the groups named.
#![allow(clippy::print_stdout)]

mod networks;
mod note;
mod process;

use pulldown_cmark::{Options, Parser};
use std::hint::black_box;
use std::time::{Duration, Instant};

fn main() {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|a| a != "--bench").collect();
    if process::floor(&arguments) {
        return;
    }
    let wanted = |group: &str| arguments.is_empty() || arguments.iter().any(|a| a == group);
    println!("{:<58} {:>9} {:>6}", "case", "ratio", "goal");
    if wanted("fill") {
        fill();
    }
    if wanted("process") {
        process::large(&note::note(10_000_000, 10_000, 1));
    }
    if wanted("small") {
        process::small(&note::note(5_000, 5, 2));
    }
    if wanted("systems") {
        systems();
    }
    if wanted("sizes") {
        sizes();
    }
    if wanted("networks") {
        networks::networks();
    }
}

/// One line of the table.
fn row(case: &str, ratio: f64, goal: Option<f64>) {
    let goal = goal.map_or("-".to_string(), |g| format!("{g}"));
    println!("{case:<58} {ratio:>9.2} {goal:>6}");
}

/// The median of the ratios of pairs: `work` and `floor` take turns, so that
/// what else the machine does falls on both.
fn paired(rounds: usize, mut work: impl FnMut() -> Duration, mut floor: impl FnMut() -> Duration) -> f64 {
    work();
    floor();
    let mut ratios: Vec<f64> = (0..rounds).map(|_| work().as_secs_f64() / floor().as_secs_f64()).collect();
    ratios.sort_by(f64::total_cmp);
    ratios[rounds / 2]
}

fn timed<T>(work: impl FnOnce() -> T) -> Duration {
    let start = Instant::now();
    let made = black_box(work());
    let took = start.elapsed();
    drop(made);
    took
}

/// What any program does that finds fences by the rules of Markdown.
fn parse(text: &str) -> usize {
    Parser::new_ext(text, Options::ENABLE_TABLES).into_offset_iter().map(|(_, range)| range.len()).sum()
}

fn filled(text: &str) -> usize {
    let filled = tieback::note::fill("note.md", text);
    assert!(filled.asked.iter().all(|a| !a.error), "{:?}", filled.problems.first());
    filled.asked.len()
}

fn fill() {
    let text = note::note(10_000_000, 10_000, 1);
    let floor = || timed(|| parse(&text));
    row("fill 10 MB, 10,000 blocks / parse it", paired(15, || timed(|| filled(&text)), floor), Some(2.0));
    let find = || timed(|| tieback::document::markdown::find(&text, 0));
    row("  of that, finding the places", paired(15, find, floor), None);
    let prose = text.replace("tieback", "text");
    row("fill 10 MB without a block / parse it", paired(15, || timed(|| filled(&prose)), floor), None);
}

fn systems() {
    for (case, text) in [
        ("500 nested, a fifth repeated / parse", note::nested(500, 3)),
        ("100,000 in series in one line / parse", note::long(100_000, false)),
        ("9,700 of 10,000 / parse", note::long(10_000, true)),
    ] {
        row(case, paired(7, || timed(|| filled(&text)), || timed(|| parse(&text))), None);
    }
}

/// Makes a note of a size.
type Make<'a> = &'a dyn Fn(usize) -> String;

/// Times that must grow with the size and no faster, in seconds.
fn sizes() {
    let deep =
        |n: usize| format!("```tieback\na = 0.9\nb = {}a{}\nR(b) ?\n```\n", "(".repeat(n), ")".repeat(n));
    let wide = |n: usize| note::long(n, false);
    let names = |n: usize| {
        let lines: String = (0..n).map(|i| format!("name_{i} = 0.9\n")).collect();
        format!("```tieback\n{lines}R(name_{}) ?\n```\n", n / 2)
    };
    let cases: [(&str, Make<'_>, usize); 3] =
        [("names", &names, 1_000_000), ("in series", &wide, 1_000_000), ("parentheses", &deep, 100_000)];
    for (case, make, size) in cases {
        let (part, whole) = (make(size / 4), make(size));
        let mut seconds = 0.0;
        let ratio = paired(
            3,
            || {
                let took = timed(|| filled(&whole));
                seconds = took.as_secs_f64();
                took
            },
            || timed(|| filled(&part)),
        );
        let case = format!("{size} {case}, {:.1} MB, {seconds:.2} s / a quarter", whole.len() as f64 / 1e6);
        row(&case, ratio, Some(5.0));
    }
}
