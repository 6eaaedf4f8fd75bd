//! Standard output and standard error.

use crate::report::render::Paint;
use std::io::{self, IsTerminal, Write};

/// The two streams and how text on standard error looks.
#[derive(Clone, Copy, Debug)]
pub(super) struct Terminal {
    paint: Paint,
    watched: bool,
}

impl Terminal {
    /// Colours only where a person looks at them and has not declined them.
    pub(super) fn new() -> Terminal {
        let dumb = std::env::var_os("TERM").is_some_and(|v| v == "dumb");
        let declined = dumb || std::env::var_os("NO_COLOR").is_some_and(|v| !v.is_empty());
        let terminal = io::stderr().is_terminal();
        let paint = if terminal && !declined { Paint::Coloured } else { Paint::Plain };
        Terminal { paint, watched: terminal && !dumb }
    }

    /// Whether messages are coloured.
    pub(super) fn paint(self) -> Paint {
        self.paint
    }

    /// Whether somebody may look at a line that moves.
    pub(super) fn is_watched(self) -> bool {
        self.watched
    }

    /// Says something on standard error.
    pub(super) fn say(self, text: &str) {
        // Where standard error is closed nobody is listening.
        let _ = io::stderr().lock().write_all(text.as_bytes());
    }

    /// Gives something on standard output; `false` when it could not be written.
    pub(super) fn give(self, bytes: &[u8]) -> bool {
        let mut out = io::stdout().lock();
        match out.write_all(bytes).and_then(|()| out.flush()) {
            Ok(()) => true,
            // The reader has all it wanted, as `head` does.
            Err(error) if error.kind() == io::ErrorKind::BrokenPipe => true,
            Err(error) => {
                self.say(&format!("error[file-access]: cannot write standard output: {error}\n"));
                false
            }
        }
    }
}
