//! What a question is answered with, before it goes into a document.

/// An answer.
#[derive(Clone, PartialEq, Debug)]
pub enum Reply {
    /// One line.
    Line(String),
    /// A table with a header.
    Table {
        /// Column heads.
        head: Vec<String>,
        /// Rows, as many cells as the head.
        rows: Vec<Vec<String>>,
        /// A line under it: what was cut short.
        foot: Option<String>,
    },
    /// A list; each entry may go on over several lines.
    List {
        /// The entries.
        entries: Vec<Vec<String>>,
        /// Whether they are numbered.
        numbered: bool,
        /// Lines at its end that are no entries: what was assumed, what to know of it.
        notes: Vec<String>,
    },
    /// No answer: the message.
    Error(String),
}

impl Reply {
    /// The one line that stands after the question mark, if it is one.
    pub fn line(&self) -> Option<String> {
        match self {
            Reply::Line(text) => Some(text.clone()),
            Reply::Error(message) => Some(format!("! {message}")),
            Reply::Table { .. } | Reply::List { .. } => None,
        }
    }

    /// The lines under a question in a fenced block, each with its `? `.
    pub fn fence_lines(&self) -> Vec<String> {
        let lines = match self {
            Reply::Line(_) | Reply::Error(_) => Vec::new(),
            Reply::Table { head, rows, foot } => {
                let mut lines = columns(head, rows);
                lines.extend(foot.clone());
                lines
            }
            Reply::List { entries, numbered, notes } => {
                let mut lines = listed(entries, *numbered);
                lines.extend(notes.iter().cloned());
                lines
            }
        };
        lines.iter().map(|l| format!("? {l}").trim_end().to_string()).collect()
    }

    /// Plain text, as a terminal shows it.
    pub fn text(&self) -> String {
        match self.line() {
            Some(line) => line,
            None => {
                self.fence_lines().iter().map(|l| l.trim_start_matches("? ")).collect::<Vec<_>>().join("\n")
            }
        }
    }

    /// Lines of Markdown: a table or a list.
    pub fn markdown(&self) -> Vec<String> {
        let cell = |text: &str| crate::document::escape::escape(text, crate::document::escape::Context::Cell);
        let prose =
            |text: &str| crate::document::escape::escape(text, crate::document::escape::Context::Prose);
        match self {
            Reply::Line(text) => vec![prose(text)],
            Reply::Error(message) => vec![format!("! {}", prose(message))],
            Reply::Table { head, rows, foot } => {
                let row = |cells: &[String]| {
                    format!("| {} |", cells.iter().map(|c| cell(c)).collect::<Vec<_>>().join(" | "))
                };
                let mut lines = vec![row(head), format!("|{}", " --- |".repeat(head.len()))];
                lines.extend(rows.iter().map(|r| row(r)));
                if let Some(foot) = foot {
                    let mut cells = vec![foot.clone()];
                    cells.resize(head.len().max(1), String::new());
                    lines.push(row(&cells));
                }
                lines
            }
            Reply::List { entries, numbered, notes } => {
                let mark = |i: usize| if *numbered { format!("{i}.") } else { "-".to_string() };
                let mut lines: Vec<String> = Vec::new();
                for (i, entry) in entries.iter().enumerate() {
                    let mark = mark(i + 1);
                    let indent = " ".repeat(mark.len() + 1);
                    for (at, line) in entry.iter().enumerate() {
                        let lead = if at == 0 { format!("{mark} ") } else { indent.clone() };
                        // A backslash at its end keeps a line of an entry a line of its own.
                        let more = if at + 1 < entry.len() { "\\" } else { "" };
                        lines.push(format!("{lead}{}{more}", prose(line)));
                    }
                }
                // Below the last entry: a second list of its own would not be
                // found again as a part of this answer.
                let indent = if entries.is_empty() { 0 } else { mark(entries.len()).len() + 1 };
                lines.extend(notes.iter().map(|n| format!("{}- {}", " ".repeat(indent), prose(n))));
                lines
            }
        }
    }
}

/// Cells in columns as wide as their widest, two spaces between.
fn columns(head: &[String], rows: &[Vec<String>]) -> Vec<String> {
    let mut widths: Vec<usize> = head.iter().map(|c| c.chars().count()).collect();
    for row in rows {
        for (width, cell) in widths.iter_mut().zip(row) {
            *width = (*width).max(cell.chars().count());
        }
    }
    std::iter::once(head)
        .chain(rows.iter().map(Vec::as_slice))
        .map(|row| {
            let mut line = String::new();
            for (cell, width) in row.iter().zip(&widths) {
                line.push_str(cell);
                line.extend(std::iter::repeat_n(' ', width - cell.chars().count() + 2));
            }
            line.trim_end().to_string()
        })
        .collect()
}

fn listed(entries: &[Vec<String>], numbered: bool) -> Vec<String> {
    let width = entries.len().to_string().len();
    let mut lines = Vec::new();
    for (i, entry) in entries.iter().enumerate() {
        let lead = if numbered { format!("{:>width$}. ", i + 1) } else { "- ".to_string() };
        for (j, line) in entry.iter().enumerate() {
            let indent = " ".repeat(lead.chars().count());
            lines.push(format!("{}{line}", if j == 0 { &lead } else { &indent }));
        }
    }
    lines
}
