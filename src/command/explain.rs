//! `tieback explain`: what a code means.

use super::Voice;
use super::each::give_json;
use super::verdict::Verdict;
use crate::report::explain;
use crate::source::Code;
use clap::Args;
use serde::Serialize;

/// Explain an error code, with an example and its mend
#[derive(Args, Debug)]
#[command(after_help = "Example:\n  tieback explain mixed-operators")]
pub(super) struct Explain {
    /// The code as messages show it; all codes are listed if it is left out
    #[arg(value_name = "CODE")]
    code: Option<String>,
}

/// A code as data.
#[derive(Serialize)]
struct Explained {
    code: &'static str,
    what: &'static str,
    wrong: &'static str,
    mended: &'static str,
}

impl Explained {
    fn new(code: Code) -> Explained {
        let explain::Explanation { what, wrong, mended } = explain::of(code);
        Explained { code: code.id(), what, wrong, mended }
    }
}

impl Explain {
    pub(super) fn run(&self, voice: Voice) -> Verdict {
        let Some(written) = &self.code else {
            let all = || Code::ALL.iter().map(|c| Explained::new(*c)).collect::<Vec<_>>();
            let given = if voice.json {
                give_json(&all(), voice)
            } else {
                voice.terminal.give(explain::list().as_bytes())
            };
            return Verdict { access: !given, ..Verdict::default() };
        };
        let Some(code) = explain::find(written) else {
            voice.terminal.say(&unknown(written));
            return Verdict { error: true, ..Verdict::default() };
        };
        let given = if voice.json {
            give_json(&Explained::new(code), voice)
        } else {
            voice.terminal.give(explain::text(code).as_bytes())
        };
        Verdict { access: !given, ..Verdict::default() }
    }
}

fn unknown(written: &str) -> String {
    let written = annotate_snippets::normalize_untrusted_str(written);
    let near = explain::nearest(&written);
    let help = match near.as_slice() {
        [] => "`tieback explain` lists all codes".to_string(),
        _ => format!(
            "did you mean {}?",
            near.iter().map(|c| format!("`{c}`")).collect::<Vec<_>>().join(" or ")
        ),
    };
    format!("error: no message has the code \"{written}\"\n  = help: {help}\n")
}
