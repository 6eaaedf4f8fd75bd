//! Notes before and after filling, byte for byte.
//!
//! The cases stand in `fixtures/fill/*.txt`: `=== a title`, the note, `---`, the note filled.
//! Where the title begins with `crlf:`, its lines end in CR LF. Each filled note is
//! filled again, and must stay as it is. With `BLESS=1` in the environment what was found is written.

use std::fmt::Write as _;
use std::path::PathBuf;
use tieback::document::patch::Rewrite;
use tieback::note::fill;
use tieback::source::Level;

fn filled(note: &str) -> String {
    match fill("case.md", note).rewrite {
        Rewrite::Unchanged => note.to_string(),
        Rewrite::Patched(bytes) => String::from_utf8(bytes).unwrap(),
    }
}

#[test]
fn every_note_is_filled_byte_for_byte() {
    let bless = std::env::var_os("BLESS").is_some();
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("fixtures/fill");
    let mut wrong = Vec::new();
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        let text = std::fs::read_to_string(&path).unwrap();
        let mut blessed = text.split("=== ").next().unwrap().trim_end().to_string();
        for part in text.split("\n=== ").skip(1) {
            let (title, rest) = part.split_once('\n').unwrap();
            let (before, after) = rest.split_once("\n---\n").unwrap();
            let ending = |text: &str| match title.starts_with("crlf:") {
                true => format!("{}\n", text.trim_end()).replace('\n', "\r\n"),
                false => format!("{}\n", text.trim_end()),
            };
            let note = ending(before);
            let found = filled(&note);
            if found != ending(after) && !bless {
                wrong.push(format!("{title}\nexpected:\n{after}\nfound:\n{found}"));
            }
            if filled(&found) != found {
                wrong.push(format!("{title}: filling twice is not filling once"));
            }
            for problem in fill("case.md", &note).problems.iter().filter(|p| p.level == Level::Error) {
                wrong.push(format!("{title}: {}", problem.message));
            }
            let shown = found.replace("\r\n", "\n");
            write!(blessed, "\n\n=== {title}\n{before}\n---\n{}", shown.trim_end()).unwrap();
        }
        if bless {
            std::fs::write(&path, format!("{blessed}\n")).unwrap();
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n\n"));
}
