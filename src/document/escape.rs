//! Answers as Markdown text, and Markdown text as answers.

/// Where a piece of text will stand; each has its own escapes.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Context {
    /// A paragraph, heading, link text, list item or footnote.
    Prose,
    /// A table cell, where `|` would end it.
    Cell,
    /// A line that Markdown takes as HTML: no Markdown escapes there.
    Html,
}

/// Writes an answer so that Markdown shows it as it is.
///
/// Only what would mean something is escaped: `< 1e-300`, `~0.9` and
/// `71.5%` come out as they went in.
pub fn escape(answer: &str, context: Context) -> String {
    let chars: Vec<char> = answer.chars().collect();
    let mut out = String::with_capacity(answer.len() + 8);
    for (i, &c) in chars.iter().enumerate() {
        let before = i.checked_sub(1).map(|j| chars[j]);
        let after = chars.get(i + 1).copied();
        let blank = |c: Option<char>| c.is_some_and(char::is_whitespace);
        let word = |c: Option<char>| c.is_some_and(char::is_alphanumeric);
        let special = match c {
            // A line break would end the paragraph or the row.
            '\n' | '\r' => {
                if !out.ends_with(' ') {
                    out.push(' ');
                }
                continue;
            }
            '<' => after.is_none_or(|a| a.is_ascii_alphabetic() || "/!?".contains(a)),
            '&' => after.is_some_and(|a| a.is_ascii_alphanumeric() || a == '#'),
            _ if context == Context::Html => false,
            '|' => context == Context::Cell,
            '\\' => after.is_none_or(|a| a.is_ascii_punctuation()),
            '`' | '[' | ']' => true,
            '*' => !(blank(before) && blank(after)),
            '_' => !((blank(before) && blank(after)) || (word(before) && word(after))),
            // `~0.9` is a sampled value; such a mark opens nothing without a partner.
            '~' => {
                !(after.is_some_and(|a| a.is_ascii_digit())
                    && before.is_none_or(|b| b.is_whitespace() || b == '('))
            }
            _ => false,
        };
        match (special, context, c) {
            (true, Context::Html, '<') => out.push_str("&lt;"),
            (true, Context::Html, _) => out.push_str("&amp;"),
            (true, ..) => out.extend(['\\', c]),
            (false, ..) => out.push(c),
        }
    }
    out
}

/// Undoes the escapes of [`escape`] and those that formatters put in their place.
pub fn unescape(text: &str) -> String {
    const ENTITIES: [(&str, &str); 8] = [
        ("&lt;", "<"),
        ("&gt;", ">"),
        ("&amp;", "&"),
        ("&quot;", "\""),
        ("&#39;", "'"),
        ("&#124;", "|"),
        ("&nbsp;", " "),
        ("&#42;", "*"),
    ];
    let mut out = String::with_capacity(text.len());
    let mut rest = text;
    while let Some(n) = rest.find(['\\', '&']) {
        out.push_str(&rest[..n]);
        rest = &rest[n..];
        let after = rest.as_bytes().get(1).copied();
        if rest.starts_with('\\') && after.is_some_and(|b| b.is_ascii_punctuation()) {
            out.push_str(&rest[1..2]);
            rest = &rest[2..];
        } else if let Some((entity, plain)) = ENTITIES.iter().find(|(e, _)| rest.starts_with(e)) {
            out.push_str(plain);
            rest = &rest[entity.len()..];
        } else {
            out.push_str(&rest[..1]);
            rest = &rest[1..];
        }
    }
    out.push_str(rest);
    out
}

/// The text of a table cell: `\|` is a `|`, everything else stays.
pub fn unescape_cell(text: &str) -> String {
    text.replace("\\|", "|")
}

/// Whether two pieces of note text say the same answer: equal once escapes
/// are undone and runs of blanks, also over lines, count as one.
pub fn same_answer(old: &str, new: &str) -> bool {
    old == new || flat(old) == flat(new)
}

fn flat(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for (i, line) in text.lines().enumerate() {
        // A later line may stand in a block quote and repeat its marks.
        let line = if i == 0 { line } else { unquoted(line) };
        for word in line.split_whitespace() {
            if !out.is_empty() {
                out.push(' ');
            }
            out.push_str(word);
        }
    }
    unescape(&out)
}

/// A line without blanks and quote marks before it.
fn unquoted(line: &str) -> &str {
    line.trim_start_matches(|c: char| c.is_whitespace() || c == '>')
}

/// Whether the bytes of a filled block pair say the same as `lines`: tables
/// cell by cell without regard to padding, lists without regard to the bullet,
/// paragraphs without regard to where their lines break.
pub fn same_block(old: &str, lines: &[String]) -> bool {
    units(old.lines()) == units(lines.iter().map(String::as_str))
}

/// Rows, list items and paragraphs, each in one spelling.
fn units<'a>(lines: impl Iterator<Item = &'a str>) -> Vec<Vec<String>> {
    let mut units: Vec<Vec<String>> = Vec::new();
    let mut fresh = true;
    for line in lines {
        let line = unquoted(line).trim_end();
        if line.is_empty() {
            fresh = true;
            continue;
        }
        if line.starts_with('|') {
            units.push(row(line));
            fresh = true;
            continue;
        }
        let (bullet, text) = item(line);
        match units.last_mut() {
            Some(unit) if !fresh && bullet.is_empty() => {
                if let Some(last) = unit.last_mut() {
                    *last = flat(&format!("{last} {text}"));
                }
            }
            _ => units.push(vec![bullet.to_string(), flat(text)]),
        }
        fresh = false;
    }
    units
}

/// Bullet or number of a list item, in one spelling, and its text.
fn item(line: &str) -> (&str, &str) {
    let digits = line.bytes().take_while(u8::is_ascii_digit).count();
    let mark = match line.as_bytes().get(digits) {
        Some(b'.' | b')') if digits > 0 => digits + 1,
        Some(b'-' | b'*' | b'+') if digits == 0 => 1,
        _ => 0,
    };
    match line.get(mark..) {
        Some(rest) if mark > 0 && rest.starts_with([' ', '\t']) => {
            (if digits > 0 { &line[..digits] } else { "-" }, rest)
        }
        _ => ("", line),
    }
}

/// The cells of a table row; those of the line of dashes shortened to one dash.
fn row(line: &str) -> Vec<String> {
    let line = line.strip_prefix('|').unwrap_or(line);
    let mut cells = Vec::new();
    let (mut start, mut escaped) = (0, false);
    for (i, b) in line.bytes().enumerate() {
        if b == b'|' && !escaped {
            cells.push(&line[start..i]);
            start = i + 1;
        }
        escaped = b == b'\\' && !escaped;
    }
    if !line[start..].trim().is_empty() {
        cells.push(&line[start..]);
    }
    let dashes = |c: &&str| -> bool {
        let c = c.trim();
        let inner = c.trim_matches(':');
        !inner.is_empty() && inner.bytes().all(|b| b == b'-')
    };
    let ruler = !cells.is_empty() && cells.iter().all(dashes);
    let spell = |cell: &str| {
        let cell = cell.trim();
        if ruler {
            let end = |yes: bool| if yes { ":" } else { "" };
            return format!("{}-{}", end(cell.starts_with(':')), end(cell.ends_with(':')));
        }
        flat(cell)
    };
    std::iter::once("|".to_string()).chain(cells.into_iter().map(spell)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use pulldown_cmark::{Event, Options, Parser};

    #[test]
    fn plain_answers_stay_readable() {
        for answer in [
            "0.98570",
            "1 in 69.93",
            "met: 0.98570, uses 71.5% of the allowed 0.02",
            "< 1e-300",
            "~0.9",
            "~0.9 (0.88 .. 0.92)",
            "none: R does not tend to 0",
            "1 - 6.403e-93",
            "3 * 4",
            "! unknown name \"strainr\": did you mean \"strainer\"?",
            "P_101 & Q",
        ] {
            for context in [Context::Prose, Context::Cell, Context::Html] {
                assert_eq!(escape(answer, context), answer);
            }
        }
    }

    #[test]
    fn what_means_something_is_escaped() {
        assert_eq!(
            escape("pump[1] *x* `y` <b> &lt; a|b ~~z", Context::Prose),
            r"pump\[1\] \*x\* \`y\` \<b> \&lt; a|b \~\~z"
        );
        assert_eq!(escape(r"a|b \| c\d", Context::Cell), r"a\|b \\\| c\d");
        assert_eq!(escape("pump[1] *x* <b> &lt;", Context::Html), "pump[1] *x* &lt;b> &amp;lt;");
        assert_eq!(escape("_a_b_", Context::Prose), r"\_a_b\_");
        assert_eq!(escape("two\r\nlines", Context::Prose), "two lines");
    }

    #[test]
    fn formatters_do_not_make_stale() {
        assert!(same_answer(" met:  0.98,\n> uses 3%", "met: 0.98, uses 3%"));
        assert!(same_answer(r"pump\[1]", r"pump\[1\]"));
        assert!(same_answer("&lt; 1e-300", "< 1e-300"));
        assert!(!same_answer("0.98", "0.99"));
        let table = ["| a | b |".to_string(), "|---|:--|".into(), "| 1 | x\\|y |".into()];
        assert!(same_block("\n> | a   | b    |\n> | --- | :----- |\n>\n> | 1 | x\\|y |\n> ", &table));
        assert!(!same_block("\n| a | b |\n|---|---|\n| 1 | x\\|y |\n", &table));
        assert!(!same_block("\n| a | b |\n|---|:--|\n| 1 | x | y |\n", &table));
        let list = ["1. one two".to_string(), "2. three".into()];
        assert!(same_block("\n1.  one\n    two\n2.  three\n", &list));
        assert!(same_block("\n* x", &["- x".to_string()]));
        assert!(!same_block("\n1. one two\n2. four\n", &list));
    }

    proptest! {
        #[test]
        fn escapes_come_back(text in "[ -~é]{0,40}") {
            for context in [Context::Prose, Context::Cell] {
                prop_assert!(same_answer(&escape(&text, context), &escape(&text, Context::Prose)));
                prop_assert_eq!(unescape(&escape(&text, context)), text.clone());
            }
        }

        #[test]
        fn markdown_shows_the_answer(text in "[0-9a-z<>&*_`~|!\\\\\\[\\]() .:\"-]{0,24}") {
            let text = text.trim();
            let note = format!("x <!--? q -->{}<!--/?--> y\n", escape(text, Context::Prose));
            let mut shown = String::new();
            let options = Options::ENABLE_GFM | Options::ENABLE_TABLES | Options::ENABLE_STRIKETHROUGH;
            for event in Parser::new_ext(&note, options) {
                match event {
                    Event::Text(t) => shown.push_str(&t),
                    Event::Code(_) | Event::Html(_) => prop_assert!(false, "{}", note),
                    Event::InlineHtml(h) => prop_assert!(h.starts_with("<!--"), "{}", note),
                    _ => {}
                }
            }
            prop_assert_eq!(shown, format!("x {text} y"));
        }
    }
}
