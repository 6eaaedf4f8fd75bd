//! Every example of `tieback explain` does what its text says.

use tieback::note::fill;
use tieback::report::explain;
use tieback::source::{Code, Level};

/// What the program itself reports: no note alone can show it.
const OF_THE_PROGRAM: &[Code] = &[
    Code::FileAccess,
    Code::NotUtf8,
    Code::NothingToDo,
    Code::Stale,
    Code::OutOfDateFormula,
    Code::OpenElsewhere,
];

#[test]
fn wrong_examples_give_their_code_and_mended_ones_do_not() {
    let mut wrong = Vec::new();
    for &code in Code::ALL.iter().filter(|c| !OF_THE_PROGRAM.contains(c)) {
        let explanation = explain::of(code);
        let found = fill("wrong.md", explanation.wrong).problems;
        if !found.iter().any(|p| p.code == code) {
            wrong.push(format!("{}: its wrong note gives {:?}", code.id(), codes(&found)));
        }
        if found.iter().any(|p| p.code != code && p.level == Level::Error) {
            wrong.push(format!("{}: its wrong note also gives {:?}", code.id(), codes(&found)));
        }
        let after = fill("mended.md", explanation.mended).problems;
        if after.iter().any(|p| p.code == code || p.level == Level::Error) {
            wrong.push(format!("{}: its mended note gives {:?}", code.id(), codes(&after)));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

fn codes(problems: &[tieback::source::Problem]) -> Vec<&'static str> {
    problems.iter().map(|p| p.code.id()).collect()
}
