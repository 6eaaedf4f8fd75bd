//! What a run came to, as an exit code.

use crate::answer::Filled;
use crate::source::{Code, Level};

/// What was found in a file or a run; several may hold at once.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Default)]
pub struct Verdict {
    /// An answer is stale.
    pub stale: bool,
    /// A requirement is not met or undecided.
    pub unmet: bool,
    /// There is an error in what was written.
    pub error: bool,
    /// A file could not be read or written.
    pub access: bool,
}

impl Verdict {
    /// What filling a note came to. Whether an answer was stale is left out:
    /// only `check` minds.
    pub fn of(filled: &Filled) -> Verdict {
        let mut verdict = Verdict { unmet: filled.unmet > 0, ..Verdict::default() };
        for asked in &filled.asked {
            verdict.error |= asked.error;
            verdict.unmet |= asked.unmet;
        }
        for problem in &filled.problems {
            match (problem.code, problem.level) {
                // These have exit codes of their own, however loudly they are said.
                (Code::NotMet, _) => verdict.unmet = true,
                (Code::FileAccess, Level::Error) => verdict.access = true,
                (Code::Stale, _) | (_, Level::Remark) => {}
                (_, Level::Error) => verdict.error = true,
            }
        }
        verdict
    }

    /// Both together.
    #[must_use]
    pub fn and(self, other: Verdict) -> Verdict {
        Verdict {
            stale: self.stale | other.stale,
            unmet: self.unmet | other.unmet,
            error: self.error | other.error,
            access: self.access | other.access,
        }
    }

    /// The exit code. Where several hold: a file that was not even read comes
    /// first, then an error, which leaves answers open, then 4, then 1.
    pub fn code(self) -> u8 {
        match self {
            Verdict { access: true, .. } => 3,
            Verdict { error: true, .. } => 2,
            Verdict { unmet: true, .. } => 4,
            Verdict { stale: true, .. } => 1,
            _ => 0,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_weightiest_decides() {
        let with = |stale, unmet, error, access| Verdict { stale, unmet, error, access }.code();
        assert_eq!(with(false, false, false, false), 0);
        assert_eq!(with(true, false, false, false), 1);
        assert_eq!(with(true, true, false, false), 4);
        assert_eq!(with(true, true, true, false), 2);
        assert_eq!(with(true, true, true, true), 3);
    }
}
