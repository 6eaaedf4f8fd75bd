//! The documents of the repository: filled as they stand, free of errors, and true about the program.

use std::path::{Path, PathBuf};
use std::process::Command;
use tieback::note::{Fetched, NotFetched, Rewrite, Shelf, fill_from};
use tieback::source::Level;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn text(path: &Path) -> String {
    std::fs::read_to_string(path).unwrap_or_else(|e| panic!("{}: {e}", path.display()))
}

/// README.md, DEVELOPERS.md and the examples, with at least one of these.
fn documents() -> Vec<PathBuf> {
    let mut examples: Vec<PathBuf> = std::fs::read_dir(root().join("examples"))
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "md"))
        .collect();
    assert!(!examples.is_empty());
    examples.sort();
    examples.extend(["README.md", "DEVELOPERS.md"].map(|name| root().join(name)));
    examples
}

/// The folder of a document.
struct Beside;

impl Shelf for Beside {
    fn fetch(&self, from: &str, path: &str) -> Result<Fetched, NotFetched> {
        let path = Path::new(from).with_file_name(path);
        let bytes = std::fs::read(&path).unwrap();
        Ok(Fetched { name: path.display().to_string(), key: path.display().to_string(), bytes })
    }
}

#[test]
fn documents_are_committed_filled() {
    for path in documents() {
        let name = path.display().to_string();
        let filled = fill_from(&name, text(&path).into(), &Beside);
        let errors: Vec<_> = filled.problems.iter().filter(|p| p.level == Level::Error).collect();
        assert!(errors.is_empty(), "{name}: {errors:#?}");
        for asked in &filled.asked {
            assert!(
                !asked.stale,
                "{name}: `{}` stands as {:?}, is {:?}",
                asked.question, asked.old, asked.new
            );
            assert!(!asked.error, "{name}: `{}` has no answer", asked.question);
        }
        assert_eq!(filled.unmet, 0, "{name}");
        assert_eq!(filled.rewrite, Rewrite::Unchanged, "{name}: refresh it with `tieback fill`");
    }
}

#[test]
fn the_example_asks_in_every_place() {
    let note = text(&root().join("examples/flood-gate.md"));
    for part in
        ["```tieback\n", "\n<!--? table -->\n", "\n<!--? rank(gate) -->\n", "probability <!--? R(gate) -->"]
    {
        assert!(note.contains(part), "{part}");
    }
}

#[test]
fn the_tour_quotes_the_example() {
    let note = text(&root().join("examples/flood-gate.md"));
    let readme = text(&root().join("README.md"));
    for quoted in [
        "supply = (grid // (genset -> transfer)) -> board",
        "F(gate) in chances ? 1 in 4660",
        "<!--? F(gate) in chances -->1 in 4660<!--/?-->",
        "1 in 83.83 |",
    ] {
        assert!(readme.contains(quoted) && note.contains(quoted), "{quoted}");
    }
}

/// The lines of the fences for a shell, without what follows a comment.
fn commands(note: &str) -> Vec<String> {
    let mut found = Vec::new();
    let mut inside = false;
    for line in note.lines() {
        match line.strip_prefix("```") {
            Some(info) => inside = !inside && matches!(info, "sh" | "console"),
            None if inside => {
                let line = line.split(" #").next().unwrap_or(line).trim();
                found.extend(Some(line.to_string()).filter(|l| !l.is_empty() && !l.starts_with('#')));
            }
            None => {}
        }
    }
    found
}

/// Words of a command line; only single quotes are known.
fn words(line: &str) -> Vec<String> {
    let mut words = Vec::new();
    for (index, part) in line.split('\'').enumerate() {
        match index % 2 {
            0 => words.extend(part.split_whitespace().map(ToString::to_string)),
            _ => words.push(part.to_string()),
        }
    }
    words
}

#[test]
fn the_commands_of_the_readme_run() {
    let mut ran = 0;
    for line in commands(&text(&root().join("README.md"))) {
        let line =
            line.strip_prefix("cargo run --release -- ").map_or(line.clone(), |l| format!("tieback {l}"));
        let words = words(&line);
        if words[0] == "cargo" {
            assert!(["test", "install"].contains(&words[1].as_str()), "{line}");
            continue;
        }
        assert_eq!(words[0], "tieback", "{line}");
        let output = Command::new(env!("CARGO_BIN_EXE_tieback"))
            .args(&words[1..])
            .current_dir(root())
            .stdin(std::process::Stdio::null())
            .output()
            .unwrap();
        let said = String::from_utf8_lossy(&output.stderr);
        assert_eq!(output.status.code(), Some(0), "{line}: {said}");
        ran += 1;
    }
    assert!(ran >= 5, "only {ran} commands were found");
}
