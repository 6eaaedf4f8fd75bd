//! The program from outside: arguments and files in, streams, files and exit code out.

use std::io::Write;
use std::process::{Command, Stdio};
use tempfile::TempDir;

/// One run of the program in a folder of its own.
struct Case {
    folder: TempDir,
    arguments: Vec<String>,
    input: Vec<u8>,
}

/// What a run gave.
struct Ran {
    folder: TempDir,
    code: i32,
    out: String,
    err: String,
}

impl Case {
    fn new(arguments: &[&str]) -> Case {
        Case {
            folder: TempDir::new().unwrap(),
            arguments: arguments.iter().map(ToString::to_string).collect(),
            input: Vec::new(),
        }
    }

    fn file(self, name: &str, bytes: impl AsRef<[u8]>) -> Case {
        let path = self.folder.path().join(name);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(path, bytes).unwrap();
        self
    }

    fn input(mut self, bytes: impl Into<Vec<u8>>) -> Case {
        self.input = bytes.into();
        self
    }

    fn run(self) -> Ran {
        let mut child = Command::new(env!("CARGO_BIN_EXE_tieback"))
            .args(&self.arguments)
            .current_dir(self.folder.path())
            .env("NO_COLOR", "1")
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        // A run that takes no input may have closed it already.
        let _ = child.stdin.take().unwrap().write_all(&self.input);
        let output = child.wait_with_output().unwrap();
        let ran = Ran {
            code: output.status.code().unwrap(),
            out: String::from_utf8_lossy(&output.stdout).into_owned(),
            err: String::from_utf8_lossy(&output.stderr).into_owned(),
            folder: self.folder,
        };
        let root = ran.folder.path().to_string_lossy();
        assert!(!ran.out.contains(&*root) && !ran.err.contains(&*root), "an absolute path: {}", ran.err);
        assert!(!ran.err.contains('\u{1b}'), "colours without a terminal: {}", ran.err);
        ran
    }
}

impl Ran {
    #[track_caller]
    fn exits(self, code: i32) -> Ran {
        assert_eq!(self.code, code, "stdout: {}\nstderr: {}", self.out, self.err);
        self
    }

    #[track_caller]
    fn gives(self, out: &str) -> Ran {
        assert_eq!(self.out, out);
        self
    }

    #[track_caller]
    fn says(self, err: &str) -> Ran {
        assert_eq!(self.err, err);
        self
    }

    #[track_caller]
    fn mentions(self, part: &str) -> Ran {
        assert!(
            self.out.contains(part) || self.err.contains(part),
            "{part:?} is not in {}{}",
            self.out,
            self.err
        );
        self
    }

    #[track_caller]
    fn holds(self, name: &str, bytes: impl AsRef<[u8]>) -> Ran {
        assert_eq!(std::fs::read(self.folder.path().join(name)).unwrap(), bytes.as_ref());
        self
    }

    fn json(&self) -> serde_json::Value {
        serde_json::from_str(&self.out).unwrap()
    }

    /// The places that problems are shown at, in order.
    fn places(&self) -> Vec<&str> {
        self.err.lines().filter_map(|l| l.trim().strip_prefix("--> ")).collect()
    }
}

/// A note that is taken and asks nothing.
const BLOCK: &str = "# Gate\r\n\r\n```tieback\r\ngate = 0.98\r\n```\r\n";

// --- help ---

#[test]
fn long_help_ends_with_the_caution() {
    let ran = Case::new(&["--help"]).run().exits(0);
    assert!(ran.out.trim_end().ends_with("the judgement of a licensed engineer."), "{}", ran.out);
}

#[test]
fn each_command_has_an_example() {
    for command in ["fill", "check", "ask", "steps", "explain"] {
        let example = format!("  tieback {command} ");
        Case::new(&[command, "--help"]).run().exits(0).mentions("Example").mentions(&example).says("");
    }
}

#[test]
fn the_version_is_that_of_the_package() {
    Case::new(&["--version"]).run().exits(0).gives(concat!("tieback ", env!("CARGO_PKG_VERSION"), "\n"));
}

#[test]
fn wrong_arguments_exit_with_2() {
    Case::new(&["fill"]).run().exits(2).gives("");
    Case::new(&["flil", "a.md"]).run().exits(2).gives("");
    Case::new(&[]).run().exits(2).gives("");
    Case::new(&["ask", "a.md", "R(x)", "R(y)"]).run().exits(2).gives("");
}

// --- explain ---

#[test]
fn explain_shows_an_example_and_its_mend() {
    let ran = Case::new(&["explain", "mixed-operators"]).run().exits(0).says("");
    assert!(ran.out.starts_with("mixed-operators\n\n"));
    ran.mentions("\nwrong:\n\n    ```tieback\n").mentions("\nmended:\n\n    ```tieback\n");
}

#[test]
fn explain_alone_lists_every_code_on_one_line() {
    let ran = Case::new(&["explain"]).run().exits(0);
    assert!(ran.out.lines().any(|l| l.starts_with("unknown-name ")));
    assert!(ran.out.lines().all(|l| l.chars().count() <= 130));
    assert_eq!(ran.out.lines().count(), tieback::source::Code::ALL.len());
}

#[test]
fn explain_offers_the_nearest_code() {
    Case::new(&["explain", "unkown-name"]).run().exits(2).gives("").mentions("did you mean `unknown-name`");
    Case::new(&["explain", "error[unknown-name]"]).run().exits(0);
}

#[test]
fn explain_gives_json() {
    let ran = Case::new(&["explain", "stale", "--json"]).run().exits(0);
    assert_eq!(ran.json()["code"], "stale");
}

// --- files that cannot be taken ---

#[test]
fn a_missing_file_exits_with_3_and_the_others_are_still_done() {
    Case::new(&["check", "gone.md", "old.md"])
        .file("old.md", b"\xFF")
        .run()
        .exits(3)
        .gives("")
        .mentions("error[file-access]: cannot read \"gone.md\": there is no such file or folder\n")
        .mentions("error[not-utf8]");
}

#[test]
fn text_that_is_not_utf8_is_left_as_it_is() {
    let bytes = b"# Gate\nthe gr\xF6\xDFe\n```tieback\n```\n";
    Case::new(&["fill", "old.md"])
        .file("old.md", bytes)
        .run()
        .exits(2)
        .mentions("error[not-utf8]: byte 14 of the file, 0xF6, is not UTF-8 text\n --> old.md:2:7\n")
        .holds("old.md", bytes);
}

#[test]
fn a_filter_hands_back_what_it_cannot_read() {
    let ran = Case::new(&["fill", "-"]).input(*b"plain \xFF text\n").run().exits(2);
    assert_eq!(ran.out, "plain \u{FFFD} text\n");
}

#[test]
fn problems_are_data_with_json() {
    let ran = Case::new(&["check", "--json", "gone.md", "old.md"])
        .file("old.md", b"a\n\xFF")
        .run()
        .exits(3)
        .says("");
    let data = ran.json();
    assert_eq!(data["exit"], 3);
    assert_eq!(data["files"][0]["name"], "gone.md");
    assert_eq!(data["files"][0]["problems"][0]["code"], "file-access");
    assert!(data["files"][0]["problems"][0]["line"].is_null());
    let problem = &data["files"][1]["problems"][0];
    assert_eq!((problem["line"].as_u64(), problem["column"].as_u64()), (Some(2), Some(1)));
    assert_eq!(problem["level"], "error");
}

// --- which files are taken ---

#[test]
fn a_folder_is_walked_in_order_without_hidden_or_ignored_files() {
    let ran = Case::new(&["check", "notes"])
        .file("notes/b.md", b"\xFF")
        .file("notes/a/z.MARKDOWN", b"\xFF")
        .file("notes/c.txt", b"\xFF")
        .file("notes/.hidden.md", b"\xFF")
        .file("notes/drafts/d.md", b"\xFF")
        .file("notes/.gitignore", "drafts/\n")
        .run()
        .exits(2);
    assert_eq!(ran.places(), ["notes/a/z.MARKDOWN:1:1", "notes/b.md:1:1"]);
}

#[test]
fn a_pattern_is_taken_where_the_shell_left_it() {
    let check = |pattern: &str, expected: &[&str]| {
        let ran = Case::new(&["check", pattern])
            .file("notes/b.md", b"\xFF")
            .file("notes/deep/a.md", b"\xFF")
            .file("notes/c.txt", b"\xFF")
            .file("top.md", b"\xFF")
            .run()
            .exits(2);
        let files: Vec<&str> = ran.places().iter().map(|p| p.trim_end_matches(":1:1")).collect();
        assert_eq!(files, expected, "{pattern}");
    };
    check("notes/**/*.md", &["notes/b.md", "notes/deep/a.md"]);
    check("notes/*.md", &["notes/b.md"]);
    check("./*.md", &["top.md"]);
    check("**/*.md", &["notes/b.md", "notes/deep/a.md", "top.md"]);
    check("notes/*", &["notes/b.md"]);
    check("*/?.{md,txt}", &["notes/b.md"]);
    check("notes/*.txt", &["notes/c.txt"]);
}

#[test]
fn a_pattern_that_fits_nothing_is_an_error() {
    Case::new(&["fill", "notes/*.md"]).run().exits(3).mentions("no file matches \"notes/*.md\"");
    Case::new(&["fill", "x[.md"]).run().exits(3).mentions("\"x[.md\" is no pattern");
}

#[test]
fn a_folder_without_notes_is_a_remark() {
    Case::new(&["fill", "."])
        .file("a.txt", "")
        .run()
        .exits(0)
        .mentions("remark[nothing-to-do]: there is no note and no parts list");
}

#[test]
fn one_file_given_in_several_ways_is_taken_once() {
    let ran =
        Case::new(&["check", "a.md", ".", "./a.md", "*.md", "--json"]).file("a.md", BLOCK).run().exits(0);
    assert_eq!(ran.json()["files"].as_array().unwrap().len(), 1);
}

#[test]
fn many_files_are_reported_in_order() {
    let mut case = Case::new(&["check", "--json", "notes"]);
    for n in 0..300 {
        case = case.file(&format!("notes/{n:03}.md"), if n % 2 == 0 { &b"\xFF"[..] } else { b"text" });
    }
    let ran = case.run().exits(2);
    let data = ran.json();
    let names = data["files"].as_array().unwrap().iter().map(|f| f["name"].as_str().unwrap());
    assert!(names.eq((0..300).map(|n| format!("notes/{n:03}.md"))));
}

// --- fill ---

#[test]
fn a_filter_gives_text_without_tieback_as_it_is() {
    let text = "# Gate\r\n\r\nprose, no newline at the end";
    Case::new(&["fill", "-"]).input(text).run().exits(0).gives(text).mentions("remark[nothing-to-do]");
}

#[test]
fn a_named_file_without_tieback_is_remarked_and_one_in_a_folder_is_not() {
    let ran = Case::new(&["fill", "list.md"]).file("list.md", "milk\n").run().exits(0).gives("");
    assert!(ran.err.starts_with("remark[nothing-to-do]"), "{}", ran.err);
    assert_eq!(ran.places(), ["list.md"]);
    ran.holds("list.md", "milk\n");
    Case::new(&["fill", "."]).file("list.md", "milk\n").run().exits(0).gives("").says("");
}

#[test]
fn output_goes_elsewhere_and_the_note_stays() {
    let fill = |out: &str| Case::new(&["fill", "gate.md", "-o", out]).file("gate.md", BLOCK).run().exits(0);
    fill("out.md").gives("").holds("gate.md", BLOCK).holds("out.md", BLOCK);
    fill("gate.md").gives("").holds("gate.md", BLOCK);
    fill("-").gives(BLOCK).holds("gate.md", BLOCK);
    Case::new(&["fill", "-", "-o", "out.md"]).input("text").run().exits(0).gives("").holds("out.md", "text");
}

#[test]
fn output_takes_one_note() {
    Case::new(&["fill", "a.md", "b.md", "-o", "c.md"])
        .file("a.md", "")
        .file("b.md", "")
        .run()
        .exits(2)
        .mentions("-o takes one note, and 2 are given");
}

#[test]
fn output_that_cannot_be_written_exits_with_3() {
    Case::new(&["fill", "gate.md", "-o", "gone/out.md"])
        .file("gate.md", BLOCK)
        .run()
        .exits(3)
        .mentions("cannot write \"gone/out.md\"")
        .holds("gate.md", BLOCK);
}

#[test]
fn a_filter_gives_its_text_inside_json() {
    let ran = Case::new(&["fill", "-", "--json"]).input("text").run().exits(0).says("");
    assert_eq!(ran.json()["files"][0]["text"], "text");
}

#[test]
#[cfg(unix)]
fn a_reader_that_leaves_is_no_error() {
    let mut child = Command::new(env!("CARGO_BIN_EXE_tieback"))
        .arg("explain")
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(0));
    assert!(output.stderr.is_empty());
}

#[test]
fn a_review_is_a_workbook() {
    let note = "```tieback\nA = 0.9\nR(A // A) ?\nrequire R(A) >= 0.95\n```\n";
    let ran = Case::new(&["review", "note.md", "-o", "review.xlsx"]).file("note.md", note).run();
    assert_eq!(ran.code, 4, "{}", ran.err);
    assert!(ran.err.contains("note.md: 2 answers with their steps in review.xlsx"), "{}", ran.err);
    let book = std::fs::read(ran.folder.path().join("review.xlsx")).unwrap();
    assert!(book.starts_with(b"PK"));
    // The note is only read.
    assert_eq!(std::fs::read_to_string(ran.folder.path().join("note.md")).unwrap(), note);

    let csv = "name,fails,R ?\npump,0.1,\n";
    let ran = Case::new(&["review", "parts.csv", "-o", "r.xlsx"]).file("parts.csv", csv).run();
    assert_eq!((ran.code, ran.folder.path().join("r.xlsx").exists()), (0, true), "{}", ran.err);

    let wrong = "```tieback\nA = 0.9 -> B\nR(A) ?\n```\n";
    let ran = Case::new(&["review", "note.md", "-o", "r.xlsx"]).file("note.md", wrong).run();
    assert!(ran.code == 2 && ran.err.contains("unknown name"), "{}", ran.err);

    let ran = Case::new(&["review", "note.md", "-o", "page.html"]).file("note.md", note).run();
    assert!(ran.code == 2 && ran.err.contains("not known yet"), "{}", ran.err);
    let ran = Case::new(&["review", "note.md", "-o", "page.pdf"]).file("note.md", note).run();
    assert!(ran.code == 3 && ran.err.contains("ends in .xlsx"), "{}", ran.err);
    let ran = Case::new(&["review", "note.md", "-o", "none/r.xlsx"]).file("note.md", note).run();
    assert_eq!(ran.code, 3, "{}", ran.err);
}
