//! The style table of an xlsx workbook, read and appended to.

use std::collections::BTreeMap;

use super::cells::Look;
use super::xml::{Kind, Tag, Tags, XmlTrouble, escape, retag};
use crate::document::patch::Edit;

/// A list within the style table.
#[derive(Clone, Debug)]
struct List<'a> {
    tag: Tag<'a>,
    /// Where its closing tag begins; the end of its tag when that is empty.
    end: usize,
}

/// The parts of a style table that tieback looks at.
pub(super) struct Styles<'a> {
    xml: &'a str,
    root: Option<Tag<'a>>,
    formats: Option<List<'a>>,
    xfs: Option<List<'a>>,
    codes: BTreeMap<u32, String>,
    /// Each cell style as it is written, and its number format.
    entries: Vec<(Tag<'a>, &'a str, u32, bool)>,
    new_codes: Vec<(u32, String)>,
    new_entries: Vec<String>,
    made: BTreeMap<(u32, String), u32>,
}

/// The number format code under which an answer's digits are shown.
///
/// It says twice what `digits` alone would say. A code that a user chose does
/// not look like that, and so the next run may change the digits of this one.
pub(super) fn answer_code(digits: &str) -> String {
    format!("{digits};-{digits};0")
}

/// Whether [`answer_code`] wrote this code.
pub(super) fn is_answer_code(code: &str) -> bool {
    let mut sections = code.split(';');
    let digits = sections.next().unwrap_or("");
    plain_digits(digits) && code == answer_code(digits)
}

/// Whether a code only says how many digits to show: `0.000`, `0.00E+00`.
pub(super) fn plain_digits(code: &str) -> bool {
    let (mantissa, exponent) = code.split_once('E').unwrap_or((code, "+0"));
    let zeros = |s: &str| !s.is_empty() && s.len() <= 30 && s.bytes().all(|b| b == b'0');
    let (whole, part) = mantissa.split_once('.').unwrap_or((mantissa, "0"));
    whole == "0" && zeros(part) && exponent.strip_prefix('+').is_some_and(zeros)
}

/// Whether a number format code shows a percentage.
fn is_percent(code: &str) -> bool {
    let mut quoted = false;
    let mut escaped = false;
    for c in code.chars() {
        match c {
            _ if escaped => escaped = false,
            '\\' | '_' | '*' if !quoted => escaped = true,
            '"' => quoted = !quoted,
            '%' if !quoted => return true,
            _ => {}
        }
    }
    false
}

impl<'a> Styles<'a> {
    /// Reads the table.
    pub(super) fn new(xml: &'a str) -> Result<Styles<'a>, XmlTrouble> {
        let mut styles = Styles {
            xml,
            root: None,
            formats: None,
            xfs: None,
            codes: BTreeMap::new(),
            entries: Vec::new(),
            new_codes: Vec::new(),
            new_entries: Vec::new(),
            made: BTreeMap::new(),
        };
        let mut tags = Tags::new(xml);
        while let Some(tag) = tags.next()? {
            match (tag.depth, tag.kind, tag.local()) {
                (0, Kind::Open | Kind::Empty, _) => styles.root = Some(tag),
                (1, Kind::Open, "numFmts" | "cellXfs") => styles.list(&mut tags, tag)?,
                (1, Kind::Empty, "numFmts") => styles.formats = Some(List { end: tag.span.end, tag }),
                (1, Kind::Open, _) => {
                    tags.skip(&tag)?;
                }
                _ => {}
            }
        }
        Ok(styles)
    }

    fn list(&mut self, tags: &mut Tags<'a>, list: Tag<'a>) -> Result<(), XmlTrouble> {
        let formats = list.local() == "numFmts";
        while let Some(tag) = tags.next()? {
            if tag.kind == Kind::Close {
                let list = List { end: tag.span.start, tag: list };
                *(if formats { &mut self.formats } else { &mut self.xfs }) = Some(list);
                return Ok(());
            }
            let number = |name: &str| tag.raw_attribute(name).and_then(|v| v.parse::<u32>().ok());
            if formats {
                if let (Some(id), Some(code)) = (number("numFmtId"), tag.attribute("formatCode")) {
                    self.codes.insert(id, code.into_owned());
                }
                tags.skip(&tag)?;
            } else {
                let format = number("numFmtId").unwrap_or(0);
                let (locked, end) = protection(tags, &tag)?;
                let raw = self.xml.get(tag.span.start..end).unwrap_or("");
                self.entries.push((tag, raw, format, locked));
            }
        }
        Err("its XML ends within a list".into())
    }

    /// How each cell style shows numbers.
    pub(super) fn looks(&self) -> Vec<Look> {
        (self.entries.iter())
            .map(|(_, _, format, locked)| {
                let code = self.codes.get(format).map(String::as_str);
                let general = match code {
                    Some(code) => code.eq_ignore_ascii_case("general") || is_answer_code(code),
                    None => *format == 0,
                };
                let percent = code.map_or(matches!(format, 9 | 10), is_percent);
                Look { percent, general, locked: *locked }
            })
            .collect()
    }

    /// The cell style that is like `base` but shows these digits; `None` if
    /// there is no such style and none can be made.
    pub(super) fn with_digits(&mut self, base: u32, digits: &str) -> Option<u32> {
        let code = answer_code(digits);
        let (tag, raw, format, _) = self.entries.get(base as usize)?;
        if self.codes.get(format) == Some(&code) {
            return Some(base);
        }
        let key = (base, code.clone());
        if let Some(made) = self.made.get(&key) {
            return Some(*made);
        }
        let known = self.codes.iter().find(|(_, c)| **c == code).map(|(id, _)| *id);
        let id = match known {
            Some(id) => id,
            None => {
                let id = self.codes.keys().next_back().copied().unwrap_or(0).max(163).checked_add(1)?;
                self.codes.insert(id, code.clone());
                self.new_codes.push((id, code));
                id
            }
        };
        let add = format!(" numFmtId=\"{id}\" applyNumberFormat=\"1\"");
        let drop = |name: &str| matches!(name, "numFmtId" | "applyNumberFormat");
        let mut entry = retag(tag, drop, &add, tag.kind == Kind::Open);
        entry.push_str(&raw[tag.raw.len()..]);
        // A run that was made earlier may have left the very style.
        let same = self.entries.iter().position(|(t, r, f, _)| {
            *f == id && {
                let mut other = retag(t, drop, &add, t.kind == Kind::Open);
                other.push_str(&r[t.raw.len()..]);
                other == entry
            }
        });
        let index = match same {
            Some(index) => u32::try_from(index).ok()?,
            None => {
                let index = u32::try_from(self.entries.len() + self.new_entries.len()).ok()?;
                // Spreadsheet programs take no more styles than this.
                if index > 64_000 {
                    return None;
                }
                self.new_entries.push(entry);
                index
            }
        };
        self.made.insert(key, index);
        Some(index)
    }

    /// The edits that append what [`Styles::with_digits`] made.
    pub(super) fn edits(&self) -> Vec<Edit> {
        let mut edits = Vec::new();
        let (Some(root), Some(xfs)) = (&self.root, &self.xfs) else { return edits };
        if !self.new_codes.is_empty() {
            let prefix = root.prefix();
            let codes: String = (self.new_codes.iter())
                .map(|(id, code)| {
                    format!("<{prefix}numFmt numFmtId=\"{id}\" formatCode=\"{}\"/>", escape(code))
                })
                .collect();
            match &self.formats {
                Some(list) if list.tag.kind == Kind::Open => {
                    edits.extend(recount(&list.tag, self.new_codes.len()));
                    edits.push(Edit { span: list.end..list.end, text: codes });
                }
                list => {
                    let count = self.new_codes.len();
                    let at = root.span.end..root.span.end;
                    let span = list.as_ref().map_or(at, |l| l.tag.span.clone());
                    let text = format!("<{prefix}numFmts count=\"{count}\">{codes}</{prefix}numFmts>");
                    edits.push(Edit { span, text });
                }
            }
        }
        if !self.new_entries.is_empty() {
            edits.extend(recount(&xfs.tag, self.new_entries.len()));
            edits.push(Edit { span: xfs.end..xfs.end, text: self.new_entries.concat() });
        }
        edits
    }
}

/// Reads to the end of a cell style; whether it locks its cells, and where
/// it ends.
fn protection<'a>(tags: &mut Tags<'a>, xf: &Tag<'a>) -> Result<(bool, usize), XmlTrouble> {
    let mut locked = true;
    if xf.kind == Kind::Empty {
        return Ok((locked, xf.span.end));
    }
    while let Some(tag) = tags.next()? {
        if tag.kind == Kind::Close && tag.depth == xf.depth {
            return Ok((locked, tag.span.end));
        }
        if tag.starts() && tag.local() == "protection" {
            locked = !matches!(tag.raw_attribute("locked"), Some("0" | "false"));
        }
    }
    Err("its XML ends within a cell style".into())
}

/// The edit that raises a list's `count`, if it has one.
fn recount(tag: &Tag<'_>, by: usize) -> Option<Edit> {
    let old = tag.raw_attribute("count")?;
    let new = old.parse::<usize>().ok()?.checked_add(by)?;
    let text = retag(tag, |name| name == "count", &format!(" count=\"{new}\""), true);
    Some(Edit { span: tag.span.clone(), text })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::document::patch::{Rewrite, apply};

    const TABLE: &str = r#"<styleSheet xmlns="m"><fonts count="1"><font/></fonts><cellXfs count="3"><xf numFmtId="0" fontId="0"/><xf numFmtId="9" fontId="1"><alignment wrapText="1"/><protection locked="0"/></xf><xf numFmtId="0" fillId="2"><alignment horizontal="right"/></xf></cellXfs></styleSheet>"#;

    #[test]
    fn a_format_is_appended_once() {
        let mut styles = Styles::new(TABLE).unwrap();
        let looks = styles.looks();
        assert!(looks[0].general && looks[0].locked && looks[1].percent && !looks[1].locked);
        assert_eq!(styles.with_digits(2, "0.00000"), Some(3));
        assert_eq!(styles.with_digits(2, "0.00000"), Some(3));
        assert_eq!(styles.with_digits(0, "0.00000"), Some(4));
        assert_eq!(styles.with_digits(9, "0.0"), None);
        let Rewrite::Patched(new) = apply(TABLE.as_bytes(), &styles.edits()).unwrap() else { panic!() };
        let new = String::from_utf8(new).unwrap();
        assert!(new.starts_with(r#"<styleSheet xmlns="m"><numFmts count="1"><numFmt numFmtId="164" formatCode="0.00000;-0.00000;0"/></numFmts><fonts"#), "{new}");
        assert!(new.contains(r#"<cellXfs count="5">"#), "{new}");
        assert!(
            new.contains(
                r#"<xf fillId="2" numFmtId="164" applyNumberFormat="1"><alignment horizontal="right"/></xf>"#
            ),
            "{new}"
        );
        // Once more on the result: everything is there already.
        let mut again = Styles::new(&new).unwrap();
        assert!(again.looks()[3].general);
        assert_eq!(again.with_digits(2, "0.00000"), Some(3));
        assert_eq!(again.with_digits(3, "0.00000"), Some(3));
        assert_eq!(again.with_digits(3, "0.000000"), Some(5));
        assert_eq!(again.edits().len(), 4);
    }

    #[test]
    fn codes_are_told_apart() {
        assert!(plain_digits("0.000") && plain_digits("0.0E+00") && plain_digits("0"));
        assert!(!plain_digits("#,##0") && !plain_digits("0.0%") && !plain_digits(""));
        assert!(is_answer_code("0.00;-0.00;0") && !is_answer_code("0.00") && !is_answer_code("0.00;-0.00"));
        assert!(is_percent("0.0%") && !is_percent("0.0\"%\"") && !is_percent("0\\%"));
    }
}
