//! Notes to measure with: seeded, so that every run and machine has the same bytes.

use std::fmt::Write;

const NOUNS: [&str; 25] = [
    "pump",
    "valve",
    "controller",
    "relay",
    "sensor",
    "converter",
    "gearbox",
    "bearing",
    "fan",
    "filter",
    "battery",
    "inverter",
    "cable",
    "connector",
    "heater",
    "actuator",
    "encoder",
    "motor",
    "seal",
    "housing",
    "brake",
    "clutch",
    "panel",
    "rack",
    "supply",
];
const ADJECTIVES: [&str; 10] =
    ["primary", "standby", "shared", "remote", "cooled", "sealed", "spare", "upper", "lower", "local"];
const VERBS: [&str; 9] =
    ["feeds", "drives", "isolates", "monitors", "protects", "cools", "limits", "supplies", "holds"];
const JOINERS: [&str; 7] = ["because", "while", "although", "after", "unless", "whereas", "when"];

/// Random numbers; source: xorshift64*, S. Vigna, ACM TOMS 42 (2016), from memory.
pub(crate) struct Random(u64);

impl Random {
    pub(crate) fn new(seed: u64) -> Random {
        Random(seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1)
    }

    pub(crate) fn below(&mut self, n: usize) -> usize {
        self.0 ^= self.0 >> 12;
        self.0 ^= self.0 << 25;
        self.0 ^= self.0 >> 27;
        ((self.0.wrapping_mul(0x2545_f491_4f6c_dd1d) >> 33) % n as u64) as usize
    }

    fn of(&mut self, words: &[&'static str]) -> &'static str {
        words[self.below(words.len())]
    }

    fn percent(&mut self, share: usize) -> bool {
        self.below(100) < share
    }
}

fn sentence(r: &mut Random, out: &mut String) {
    let (a, n, v) = (r.of(&ADJECTIVES), r.of(&NOUNS), r.of(&VERBS));
    let _ = write!(out, "The {a} {n} {v} the {} {}", r.of(&ADJECTIVES), r.of(&NOUNS));
    if r.percent(50) {
        let (j, n, v) = (r.of(&JOINERS), r.of(&NOUNS), r.of(&VERBS));
        let _ = write!(out, " {j} the {n} {v} a {}", r.of(&NOUNS));
    }
    if r.percent(15) {
        let _ = write!(out, " (see `{}_{}`)", r.of(&NOUNS), r.below(90));
    }
    if r.percent(10) {
        let _ = write!(out, " at **{}.{}** degC", r.below(90), r.below(10));
    }
    if r.percent(5) {
        let _ = write!(out, " per [sheet {0}](#s{0})", r.below(99));
    }
    out.push('.');
}

fn paragraph(r: &mut Random) -> String {
    let mut words = String::new();
    for i in 0..=r.below(4) {
        if i > 0 {
            words.push(' ');
        }
        sentence(r, &mut words);
    }
    let (mut out, mut width) = (String::new(), 0);
    for word in words.split(' ') {
        if width + word.len() > 88 {
            out.push('\n');
            width = 0;
        } else if width > 0 {
            out.push(' ');
        }
        out.push_str(word);
        width += word.len() + 1;
    }
    out + "\n"
}

fn table(r: &mut Random) -> String {
    let mut out = String::from("| item | qty | failures per 1e6 h | note |\n| --- | ---: | ---: | --- |\n");
    for _ in 0..3 + r.below(6) {
        let (a, n) = (r.of(&ADJECTIVES), r.of(&NOUNS));
        let (qty, rate) = (1 + r.below(9), r.below(9000));
        let _ =
            writeln!(out, "| {a} {n} | {qty} | {}.{:03} | {} |", rate / 1000, rate % 1000, r.of(&ADJECTIVES));
    }
    out
}

fn bullets(r: &mut Random) -> String {
    let mut out = String::new();
    for _ in 0..2 + r.below(4) {
        out.push_str("- ");
        sentence(r, &mut out);
        out.push('\n');
    }
    out
}

/// One block: two or three items, a structure of them, one or two questions.
fn block(r: &mut Random, i: usize) -> String {
    let mut out = String::from("```tieback\n");
    if i == 0 {
        out.push_str("mission 1000 h\n");
    }
    let first = r.below(NOUNS.len());
    let names: Vec<String> =
        (0..2 + r.below(2)).map(|n| format!("{}_{i}", NOUNS[(first + n) % NOUNS.len()])).collect();
    for name in &names {
        let _ = match r.below(4) {
            0 => writeln!(out, "{name} = 0.9{:03}", 1 + r.below(999)),
            1 => writeln!(out, "{name} = fails 0.0{:03}", 1 + r.below(999)),
            2 => writeln!(out, "{name} = mttf {} kh", 5 + r.below(500)),
            _ => writeln!(out, "{name} = rate {}.{:02} /Mh", 1 + r.below(80), r.below(100)),
        };
    }
    let structure = match (&names[..], r.below(3)) {
        ([a, b], 0) => format!("{a} -> {b}"),
        ([a, b], _) => format!("{a} // {b}"),
        ([a, b, c], 0) => format!("{a} -> ({b} // {c})"),
        ([a, b, c], 1) => format!("2 of ({a}, {b}, {c})"),
        (all, _) => all.join(" -> "),
    };
    let _ = writeln!(out, "unit_{i} = {structure}\nR(unit_{i}) ?");
    if r.percent(50) {
        let _ = writeln!(out, "F(unit_{i}) ?");
    }
    out + "```\n"
}

/// A note of about `size` bytes with so many blocks between headings, prose, tables and lists.
pub(crate) fn note(size: usize, blocks: usize, seed: u64) -> String {
    let r = &mut Random::new(seed);
    let mut out = String::with_capacity(size + 4096);
    for i in 0..blocks {
        if i % 40 == 0 {
            let _ = writeln!(out, "# Assembly {}: {} {}\n", i / 40, r.of(&ADJECTIVES), r.of(&NOUNS));
        }
        if i % 5 == 0 {
            let _ = writeln!(out, "## {} {} {i}\n", r.of(&ADJECTIVES), r.of(&NOUNS));
        }
        let mut parts = vec![block(r, i)];
        if r.percent(30) {
            parts.push(table(r));
        }
        if r.percent(20) {
            parts.push(bullets(r));
        }
        // Prose fills up to this block's share of the whole.
        let share = size / blocks * (i + 1);
        let mut used = out.len() + parts.iter().map(|p| p.len() + 1).sum::<usize>();
        while used < share {
            let prose = paragraph(r);
            used += prose.len() + 1;
            let at = r.below(parts.len() + 1);
            parts.insert(at, prose);
        }
        for part in parts {
            out.push_str(&part);
            out.push('\n');
        }
    }
    out
}

/// So many things in a nested structure with one question; a fifth of them
/// stand a second time within twelve places of the first.
pub(crate) fn nested(things: usize, seed: u64) -> String {
    let r = &mut Random::new(seed);
    let mut out = String::from("```tieback\n");
    for i in 0..things {
        let _ = writeln!(out, "t{i} = 0.9{:03}", 1 + r.below(999));
    }
    let mut places: Vec<String> = (0..things).map(|i| format!("t{i}")).collect();
    for i in (0..things).step_by(5) {
        // Those put in before have moved the first on.
        let name = format!("t{i}");
        let first = places.iter().position(|p| *p == name).unwrap_or(0);
        let at = (first + 1 + r.below(12)).min(places.len());
        places.insert(at, name);
    }
    // Neighbours join to groups of two to four until one is left.
    while places.len() > 1 {
        let mut next = Vec::new();
        let mut rest = &places[..];
        while !rest.is_empty() {
            let (group, after) = rest.split_at((2 + r.below(3)).min(rest.len()));
            rest = after;
            next.push(match (group, r.below(3)) {
                ([only], _) => only.clone(),
                (group, 0) => format!("({})", group.join(" // ")),
                (group, 1) if group.len() > 2 => format!("(2 of ({}))", group.join(", ")),
                (group, _) => format!("({})", group.join(" -> ")),
            });
        }
        places = next;
    }
    let _ = writeln!(out, "whole = {}\nR(whole) ?\n```", places[0]);
    out
}

/// One line that puts so many things in series, or asks for most of them.
pub(crate) fn long(things: usize, most: bool) -> String {
    let line = |between: &str| (0..things).map(|i| format!("t{i}")).collect::<Vec<_>>().join(between);
    let mut out = String::from("```tieback\n");
    for i in 0..things {
        let _ = writeln!(out, "t{i} = fails 1e-{}", 7 + i % 3);
    }
    let line = if most { format!("{} of ({})", things * 97 / 100, line(", ")) } else { line(" -> ") };
    let _ = writeln!(out, "whole = {line}\nR(whole) ?\n```");
    out
}
