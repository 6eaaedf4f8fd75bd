//! Wrong notes: what each is told, where, and what is answered all the same.
//!
//! The cases stand in `fixtures/wrong/*.txt`, one after the other:
//!
//! ```text
//! === a title
//! pump = 0.98
//! R(pupm) ?
//! ---
//! unknown-name 3:3 unknown name "pupm"
//!     did you mean "pump"?
//! | R(pupm) ? ! unknown name "pupm": did you mean "pump"?
//! => 3: R(pump) ?
//! ```
//!
//! Above `---` stands the note: the lines of one block, or, where the title
//! begins with `note:`, a whole note. The title's line is line 1 of the note, so
//! that lines are counted as they stand here. Below it stand the problems as
//! `code line:column message`, each with its mends, then the lines that
//! filling changes or adds, and then, after `=>`, lines to put in place of others:
//! with them the note must be free of errors. `=> 3` without a colon takes line 3 away.
//!
//! With `BLESS=1` in the environment what was found is written into the files.

use std::fmt::Write as _;
use std::path::PathBuf;
use tieback::document::patch::Rewrite;
use tieback::note::{Filled, fill};
use tieback::report::Lines;
use tieback::source::Level;

struct Case {
    title: String,
    body: Vec<String>,
    expected: String,
    mended: Vec<(usize, Option<String>)>,
}

impl Case {
    fn note(&self) -> String {
        self.with(&[])
    }

    fn with(&self, replaced: &[(usize, Option<String>)]) -> String {
        let whole = self.title.starts_with("note:");
        let mut text = if whole { format!("# {}\n", self.title) } else { "```tieback\n".to_string() };
        for (index, line) in self.body.iter().enumerate() {
            let line = match replaced.iter().find(|(n, _)| *n == index + 2) {
                None => line,
                Some((_, Some(new))) => new,
                Some((_, None)) => continue,
            };
            text.push_str(line);
            text.push('\n');
        }
        if !whole {
            text.push_str("```\n");
        }
        text
    }
}

fn files() -> Vec<PathBuf> {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("fixtures/wrong");
    let mut files: Vec<PathBuf> = std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "txt"))
        .collect();
    files.sort();
    files
}

fn cases(text: &str) -> Vec<Case> {
    let mut cases = Vec::new();
    for part in text.split("\n=== ").skip(1) {
        let (title, rest) = part.split_once('\n').unwrap();
        let (body, expected) = rest.split_once("---\n").unwrap_or((rest, ""));
        let mut mended = Vec::new();
        let mut kept = String::new();
        for line in expected.trim_end().lines() {
            match line.strip_prefix("=> ") {
                None => writeln!(kept, "{line}").unwrap(),
                Some(mend) => mended.push(match mend.split_once(": ") {
                    Some((number, text)) => (number.parse().unwrap(), Some(text.replace("\\n", "\n"))),
                    None => (mend.parse().unwrap(), None),
                }),
            }
        }
        cases.push(Case {
            title: title.to_string(),
            body: body.lines().map(str::to_string).collect(),
            expected: kept,
            mended,
        });
    }
    cases
}

fn filled_text(note: &str, filled: &Filled) -> String {
    match &filled.rewrite {
        Rewrite::Unchanged => note.to_string(),
        Rewrite::Patched(bytes) => String::from_utf8(bytes.clone()).unwrap(),
    }
}

fn told(note: &str, filled: &Filled) -> String {
    let lines = Lines::new(&filled.sources);
    let mut out = String::new();
    for problem in &filled.problems {
        let place = lines.place(problem.place).unwrap();
        let level = if problem.level == Level::Remark { "remark " } else { "" };
        let code = problem.code.id();
        writeln!(out, "{level}{code} {}:{} {}", place.line, place.column, problem.message).unwrap();
        for mend in &problem.mends {
            writeln!(out, "    {mend}").unwrap();
        }
    }
    let before: Vec<&str> = note.lines().collect();
    for line in filled_text(note, filled).lines().filter(|l| !before.contains(l)) {
        writeln!(out, "| {line}").unwrap();
    }
    out
}

/// What holds for every problem of every note.
fn sound(case: &Case, filled: &Filled, note: &str) -> Vec<String> {
    let mut wrong = Vec::new();
    for problem in &filled.problems {
        let message = &problem.message;
        if message.ends_with('.') || problem.level == Level::Error && message.starts_with(char::is_uppercase)
        {
            wrong.push(format!("{}: message in another style: {message}", case.title));
        }
        if problem.level == Level::Error && problem.mends.is_empty() {
            wrong.push(format!("{}: no mend: {message}", case.title));
        }
    }
    let once = filled_text(note, filled);
    let twice = filled_text(&once, &fill("case.md", &once));
    if once != twice {
        wrong.push(format!("{}: filling twice is not filling once", case.title));
    }
    wrong
}

#[test]
fn every_wrong_note_is_told_exactly_what_is_wrong() {
    let bless = std::env::var_os("BLESS").is_some();
    let (mut wrong, mut count) = (Vec::new(), 0);
    for file in files() {
        let text = std::fs::read_to_string(&file).unwrap();
        let mut blessed = text.split("=== ").next().unwrap().trim_end().to_string();
        for case in cases(&text) {
            count += 1;
            let note = case.note();
            let filled = fill("case.md", &note);
            let found = told(&note, &filled);
            if found != case.expected && !bless {
                wrong.push(format!("{}\nexpected:\n{}found:\n{found}", case.title, case.expected));
            }
            wrong.extend(sound(&case, &filled, &note));
            if !case.mended.is_empty() {
                let mended = case.with(&case.mended);
                let after = fill("case.md", &mended);
                if after.problems.iter().any(|p| p.level == Level::Error) {
                    wrong.push(format!("{}: mended, and yet\n{}", case.title, told(&mended, &after)));
                }
            }
            write!(blessed, "\n\n=== {}\n{}\n---\n{found}", case.title, case.body.join("\n")).unwrap();
            for (line, text) in &case.mended {
                match text {
                    Some(text) => writeln!(blessed, "=> {line}: {}", text.replace('\n', "\\n")).unwrap(),
                    None => writeln!(blessed, "=> {line}").unwrap(),
                }
            }
            blessed = blessed.trim_end().to_string();
        }
        if bless {
            std::fs::write(&file, format!("{blessed}\n")).unwrap();
        }
    }
    assert!(wrong.is_empty(), "{} of {count}:\n\n{}", wrong.len(), wrong.join("\n\n"));
    assert!(count >= 100, "{count} cases");
}
