//! Notes that use other files: notes, parts lists, folders and links.

use std::path::Path;
use std::process::Command;
use tempfile::TempDir;

fn folder(files: &[(&str, &str)]) -> TempDir {
    let folder = TempDir::new().unwrap();
    for (name, text) in files {
        let path = folder.path().join(name);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(path, text).unwrap();
    }
    folder
}

/// Exit code, what the note became, and what was said.
fn fill(folder: &Path, arguments: &[&str], note: &str) -> (i32, String, String) {
    let output = Command::new(env!("CARGO_BIN_EXE_tieback"))
        .current_dir(folder)
        .env("NO_COLOR", "1")
        .args(arguments)
        .output()
        .unwrap();
    let text = std::fs::read_to_string(folder.join(note)).unwrap_or_default();
    (output.status.code().unwrap(), text, String::from_utf8_lossy(&output.stderr).into_owned())
}

fn block(lines: &str) -> String {
    format!("```tieback\n{lines}\n```\n")
}

const PARTS: &str = "mission 99 h\nexposure start\npump = fails 0.02\npsu = 0.9\nlane(s) = s -> pump\n\
                     spare = a pump, source \"pump sheet\"\nline = lane(psu)\nR(line) ?\nrequire R(line) >= 0.99";

#[test]
fn definitions_come_and_nothing_else() {
    let note = block(
        "use \"parts/pumps.md\"\nmission 10 h\nexposure start\nR(line) ?\nF(spare -> relay) ?\nrelay = rate 1e-3 /h",
    );
    let files = folder(&[("note.md", &note), ("parts/pumps.md", &block(PARTS))]);
    let (code, text, said) = fill(files.path(), &["fill", "note.md"], "note.md");
    assert_eq!((code, said.contains("error")), (0, false), "{said}");
    assert!(text.contains("R(line) ? 0.8820\nF(spare -> relay) ? 0.02975\n"), "{text}");
    // The used file is left alone, and the note is stale when it changes.
    assert_eq!(std::fs::read_to_string(files.path().join("parts/pumps.md")).unwrap(), block(PARTS));
    assert_eq!(fill(files.path(), &["check", "note.md"], "note.md").0, 0);
    std::fs::write(files.path().join("parts/pumps.md"), block(&PARTS.replace("0.02", "0.03"))).unwrap();
    assert_eq!(fill(files.path(), &["check", "note.md"], "note.md").0, 1);
    let asked = fill(files.path(), &["ask", "note.md", "F(pump)"], "note.md");
    assert_eq!(asked.0, 0, "{}", asked.2);
}

#[test]
fn a_prefix_keeps_files_apart() {
    let note = block(
        "use \"a.md\" as A\nuse \"a2.md\" as B\nuse \"b.md\" as B2\npump = 0.5\nR(A.line -> pump) ?\nR(A.pump // B.pump) ?\nB.pump.rate ?\nR(B2.A.pump) ?\nR(B2.two) ?\nR(A.lane(pump)) ?",
    );
    let parts = "pump = rate 2e-3 /h\nlane(s) = s -> pump\nline = lane(psu)\npsu = 0.9\n\"out put\" = pump -> psu\nk = pump.rate * 2 h\nq = psu -> k";
    let b = block("use \"a3.md\" as A\ntwo = 2 of 2 A.pump");
    let files = folder(&[
        ("note.md", &(note + "\n```tieback\nmission 100 h\n```\n")),
        ("a.md", &block(parts)),
        ("a2.md", &block(parts)),
        ("a3.md", &block(parts)),
        ("b.md", &b),
    ]);
    let (code, text, said) = fill(files.path(), &["fill", "note.md"], "note.md");
    assert_eq!(code, 0, "{said}");
    // exp(-0.2) = 0.81873; 0.5 of it; 1 - (1 - 0.81873)^2; exp(-0.4).
    for line in [
        "R(A.line -> pump) ? 0.3684",
        "R(A.pump // B.pump) ? 0.96714",
        "B.pump.rate ? 0.002000 /h",
        "R(B2.A.pump) ? 0.8187",
        "R(B2.two) ? 0.6703",
        "R(A.lane(pump)) ? 0.4094",
    ] {
        assert!(text.contains(line), "{line}: {text}\n{said}");
    }
}

#[test]
fn parts_lists_are_used_by_sheet() {
    let mut book = rust_xlsxwriter::Workbook::new();
    for (sheet, rate) in [("Power", 20.0), ("Water", 50.0)] {
        let sheet = book.add_worksheet().set_name(sheet).unwrap();
        for (column, head) in ["name", "rate (/Mh)", "R ?"].iter().enumerate() {
            sheet.write(0, column as u16, *head).unwrap();
        }
        let name = if rate > 30.0 { "pump" } else { "psu" };
        sheet.write(1, 0, name).unwrap();
        sheet.write(1, 1, rate).unwrap();
    }
    let csv = "name;is\nfan;0,9\n";
    let note = block(
        "use \"parts.xlsx\" sheet \"Power\"\nuse \"parts.xlsx\" sheet \"Water\" as W\nuse \"fans.csv\"\nmission 1 kh\nF(psu) ?\nF(W.pump) ?\nR(fan) ?\nR(pump) ?",
    );
    let files = folder(&[("note.md", &note), ("fans.csv", csv)]);
    book.save(files.path().join("parts.xlsx")).unwrap();
    let (code, text, said) = fill(files.path(), &["fill", "note.md"], "note.md");
    assert_eq!(code, 2, "{said}");
    assert!(
        text.contains(
            "F(psu) ? 0.01980\nF(W.pump) ? 0.04877\nR(fan) ? 0.9000\nR(pump) ? ! unknown name \"pump\""
        ),
        "{text}\n{said}"
    );
    let wrong = block("use \"parts.xlsx\" sheet \"Pover\"\nuse \"fans.md\"");
    std::fs::write(files.path().join("note.md"), wrong).unwrap();
    let (code, _, said) = fill(files.path(), &["fill", "note.md"], "note.md");
    assert_eq!(code, 2);
    assert!(
        said.contains("has no sheet \"Pover\"") && said.contains("its sheets are \"Power\", \"Water\""),
        "{said}"
    );
    assert!(said.contains("cannot use \"fans.md\": there is no such file"), "{said}");
    assert!(said.contains("note.md:2:5") && said.contains("note.md:3:5"), "{said}");
}

#[test]
fn errors_say_their_file() {
    let note = block("use \"deep/one.md\"\nR(x) ?\nR(y) ?\ny = 0.5");
    let files = folder(&[
        ("note.md", &note),
        ("deep/one.md", &block("use \"two.md\"\n\nx = 0.9 -> z\ny = 0.8")),
        ("deep/two.md", &block("z = rate 3\nu = ???")),
    ]);
    let (code, text, said) = fill(files.path(), &["fill", "note.md"], "note.md");
    assert_eq!(code, 2);
    assert!(text.contains("R(x) ? ! rests on deep/two.md line 2, which is in error"), "{text}\n{said}");
    // From another folder the answer reads the same.
    let from_above =
        fill(files.path().parent().unwrap(), &["check", files.path().join("note.md").to_str().unwrap()], "x");
    assert!(!from_above.2.contains("stale"), "{}", from_above.2);
    assert!(said.contains("deep/two.md:2:10") && said.contains("`y` is defined twice"), "{said}");
    assert!(said.contains("deep/one.md:5:1") && said.contains("note.md:5:1"), "{said}");
    let year = block("year 8766 h\np = mttf 2 yr");
    std::fs::write(files.path().join("deep/one.md"), year).unwrap();
    let (code, _, said) = fill(files.path(), &["fill", "note.md"], "note.md");
    assert!(code == 2 && said.contains("sets the length of a year"), "{said}");
}

#[test]
fn a_year_of_another_length_is_told() {
    let list = "year,8766 h\nname,is\nfan,mttf 2 yr\n";
    for (year, code) in [("", 2), ("year 8766 h\n", 0)] {
        let note = block(&format!("{year}use \"fans.csv\"\nmission 100 h\nF(fan) ?"));
        let files = folder(&[("note.md", &note), ("fans.csv", list)]);
        let (found, _, said) = fill(files.path(), &["fill", "note.md"], "note.md");
        assert_eq!(found, code, "{said}");
        assert_eq!(said.contains("the length of a year"), code == 2, "{said}");
    }
}

/// One file under two prefixes would make two things of one.
#[test]
fn one_thing_is_not_made_two() {
    let bus = block("bus = 0.9\nlife = mttf 1 yr");
    let files = folder(&[
        ("bus.md", &bus),
        ("left.md", &block("use \"bus.md\"\nleft = bus")),
        ("a.md", &block("use \"bus.md\" as P\nuse \"bus.md\" as Q\nR(P.bus -> Q.bus) ?")),
        ("b.md", &block("use \"left.md\"\nuse \"bus.md\" as B\nR(left // B.bus) ?")),
        ("c.md", &block("use \"bus.md\"\nuse \"left.md\"\nR(left -> bus) ?")),
        ("d.md", &block("year 8766 h\nmission 1 h\nuse \"bus.md\"\nR(life) ?")),
    ]);
    for (note, code, part) in [
        ("a.md", 2, "would count twice"),
        ("b.md", 2, "would count twice"),
        ("c.md", 0, "stand"),
        ("d.md", 2, "has data in years"),
    ] {
        let (found, text, said) = fill(files.path(), &["fill", note], note);
        assert_eq!(found, code, "{note}: {said}");
        assert!(said.contains(part) || code == 0, "{note}: {said}");
        assert!(code != 0 || text.contains("R(left -> bus) ? 0.9000"), "{text}");
    }
}

#[test]
fn circles_and_diamonds() {
    let files = folder(&[
        ("a.md", &block("use \"b.md\"\nuse \"c.md\"\na = b -> c\nF(a) ?")),
        ("b.md", &block("use \"c.md\"\nb = c // 0.5")),
        ("c.md", &block("c = 0.9")),
    ]);
    let (code, text, said) = fill(files.path(), &["fill", "a.md"], "a.md");
    assert_eq!(code, 0, "{said}");
    // c works, since a rests on it, and b then works.
    assert!(text.contains("F(a) ? 0.1000"), "{text}");
    std::fs::write(files.path().join("c.md"), block("use \"a.md\"\nc = 0.9")).unwrap();
    let (code, _, said) = fill(files.path(), &["fill", "a.md"], "a.md");
    assert_eq!(code, 2);
    assert!(said.contains("files use each other in a circle: a.md -> b.md -> c.md -> a.md"), "{said}");
}

#[cfg(unix)]
#[test]
fn files_stay_below_the_note_unless_allowed() {
    let files = folder(&[
        ("notes/n.md", &block("use \"link.md\"\nR(far) ?")),
        ("notes/up.md", &block("use \"../stores/far.md\"\nR(far) ?")),
        ("stores/far.md", &block("far = 0.7")),
    ]);
    std::os::unix::fs::symlink(files.path().join("stores/far.md"), files.path().join("notes/link.md"))
        .unwrap();
    for note in ["notes/n.md", "notes/up.md"] {
        let (code, text, said) = fill(files.path(), &["fill", note], note);
        assert_eq!(code, 2, "{said}");
        assert!(text.contains("R(far) ? ! unknown name"), "{text}");
        assert!(said.contains("--use-from FOLDER"), "{said}");
        let (code, text, said) = fill(files.path(), &["fill", note, "--use-from", "stores"], note);
        assert_eq!(code, 0, "{said}");
        assert!(text.contains("R(far) ? 0.7000"), "{text}");
    }
    for (path, cause) in
        [("/etc/passwd", "not relative"), ("a\\\\b.md", "`/` between"), ("", "no file is named")]
    {
        std::fs::write(files.path().join("notes/n.md"), block(&format!("use \"{path}\""))).unwrap();
        let (code, _, said) = fill(files.path(), &["fill", "notes/n.md"], "notes/n.md");
        assert!(code == 2 && said.contains(cause), "{path}: {said}");
    }
}
