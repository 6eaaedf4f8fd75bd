//! Cell styles of an ods and their number formats.

use std::collections::BTreeMap;

use super::cells::Look;
use super::xml::{Kind, Tags, XmlTrouble, escape, retag};
use crate::document::patch::Edit;

/// How the names of styles begin that tieback put in.
const OURS: &str = "tieback-";

#[derive(Clone, Default, Debug)]
struct Style<'a> {
    parent: Option<String>,
    data: Option<String>,
    locked: Option<bool>,
    /// The element, if it is an automatic style of the content part.
    raw: Option<&'a str>,
}

/// The cell styles of a book.
#[derive(Default)]
pub(super) struct OdsStyles<'a> {
    styles: BTreeMap<String, Style<'a>>,
    /// Number formats: whether a percentage, whether General.
    data: BTreeMap<String, (bool, bool)>,
    /// Where automatic styles of the content part end.
    end: Option<usize>,
    made: BTreeMap<String, String>,
}

impl<'a> OdsStyles<'a> {
    /// Reads the styles of a part; `own` for the content part, whose automatic
    /// styles can be copied and added to.
    pub(super) fn read(&mut self, xml: &'a str, own: bool) -> Result<(), XmlTrouble> {
        let mut tags = Tags::new(xml);
        while let Some(tag) = tags.next()? {
            let list = matches!(tag.local(), "automatic-styles" | "styles");
            if tag.depth == 1 && own && tag.kind == Kind::Close && tag.local() == "automatic-styles" {
                self.end = Some(tag.span.start);
            }
            if tag.depth == 1 && !list {
                tags.skip(&tag)?;
            }
            if tag.depth != 2 || !tag.starts() {
                continue;
            }
            let Some(name) = tag.attribute("style:name").map(|n| n.into_owned()) else {
                tags.skip(&tag)?;
                continue;
            };
            let end = tags.skip(&tag)?;
            let raw = xml.get(tag.span.start..end).unwrap_or("");
            match tag.local() {
                "percentage-style" => drop(self.data.insert(name, (true, false))),
                "number-style" => {
                    let general = name.starts_with(OURS) || is_general(raw);
                    self.data.insert(name, (false, general));
                }
                "style" if tag.raw_attribute("style:family") == Some("table-cell") => {
                    let protect = raw.split("style:cell-protect=").nth(1).and_then(|r| r.get(1..5));
                    let style = Style {
                        parent: tag.attribute("style:parent-style-name").map(|n| n.into_owned()),
                        data: tag.attribute("style:data-style-name").map(|n| n.into_owned()),
                        locked: protect.map(|p| p != "none"),
                        raw: own.then_some(raw),
                    };
                    self.styles.insert(name, style);
                }
                "style" => {}
                kind if kind.ends_with("-style") => drop(self.data.insert(name, (false, false))),
                _ => {}
            }
        }
        Ok(())
    }

    /// How a style shows numbers.
    pub(super) fn look(&self, name: &str) -> Look {
        let mut look = Look::default();
        let (mut data, mut locked) = (None, None);
        let mut next = self.styles.get(name);
        // Styles that are their own parents end here.
        for _ in 0..16 {
            let Some(style) = next else { break };
            data = data.or(style.data.as_ref());
            locked = locked.or(style.locked);
            next = style.parent.as_ref().and_then(|parent| self.styles.get(parent));
        }
        if let Some((percent, general)) = data.and_then(|data| self.data.get(data)) {
            (look.percent, look.general) = (*percent, *general);
        }
        look.locked = locked.unwrap_or(true);
        look
    }

    /// The name of a style like `base` that shows these digits; `None` if
    /// none can be made.
    pub(super) fn with_digits(&mut self, base: Option<&str>, digits: &str) -> Option<String> {
        self.end?;
        let (kind, exponent) = match digits.split_once("E+") {
            Some((_, exponent)) => ('e', exponent.len()),
            None => ('f', 0),
        };
        let places = digits.split('E').next()?.split_once('.').map_or(0, |(_, part)| part.len());
        let data = match kind {
            'e' => format!("{OURS}e{places}.{exponent}"),
            _ => format!("{OURS}f{places}"),
        };
        // A style that an earlier run made leads back to the user's.
        let base = base.unwrap_or("Default");
        let origin = match base.strip_prefix(OURS).and_then(|rest| rest.split_once('-')) {
            Some((_, origin)) => origin,
            None => base,
        };
        let name = format!("{data}-{origin}");
        if !self.data.contains_key(&data) {
            let shape = format!(
                "number:decimal-places=\"{places}\" number:min-decimal-places=\"{places}\" number:min-integer-digits=\"1\""
            );
            let number = match kind {
                'e' => {
                    format!("<number:scientific-number {shape} number:min-exponent-digits=\"{exponent}\"/>")
                }
                _ => format!("<number:number {shape}/>"),
            };
            let element =
                format!("<number:number-style style:name=\"{data}\">{number}</number:number-style>");
            self.data.insert(data.clone(), (false, true));
            self.made.insert(format!("0{data}"), element);
        }
        if !self.styles.contains_key(&name) {
            let source = self.styles.get(origin).and_then(|style| style.raw);
            let add = format!(" style:name=\"{}\" style:data-style-name=\"{data}\"", escape(&name));
            let element = match source.map(|raw| (raw, Tags::new(raw).next())) {
                Some((raw, Ok(Some(tag)))) => {
                    let drop = |name: &str| matches!(name, "style:name" | "style:data-style-name");
                    let mut element = retag(&tag, drop, &add, tag.kind == Kind::Open);
                    element.push_str(&raw[tag.span.end..]);
                    element
                }
                _ => format!(
                    "<style:style{add} style:family=\"table-cell\" style:parent-style-name=\"{}\"/>",
                    escape(origin)
                ),
            };
            let style = Style { data: Some(data), ..Style::default() };
            self.styles.insert(name.clone(), style);
            self.made.insert(format!("1{name}"), element);
        }
        Some(name)
    }

    /// The edit that adds what [`OdsStyles::with_digits`] made: number formats
    /// first, cell styles after them.
    pub(super) fn edit(&self) -> Option<Edit> {
        let at = self.end?;
        let text: String = self.made.values().map(String::as_str).collect();
        (!text.is_empty()).then_some(Edit { span: at..at, text })
    }
}

/// Whether a number format shows a number as it comes.
fn is_general(raw: &str) -> bool {
    let mut numbers = 0;
    let mut tags = Tags::new(raw);
    let _ = tags.next();
    while let Ok(Some(tag)) = tags.next() {
        if !tag.starts() {
            continue;
        }
        numbers += 1;
        let plain = tag.local() == "number"
            && tag.attributes().all(|a| a.name == "number:min-integer-digits" && a.value == "1");
        if !plain {
            return false;
        }
    }
    numbers == 1
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn styles_are_added_beside_the_users() {
        let xml = "<office:document-content><office:automatic-styles>\
            <number:percentage-style style:name=\"N1\"/>\
            <style:style style:name=\"ce1\" style:family=\"table-cell\" style:parent-style-name=\"Default\"><a/></style:style>\
            <style:style style:name=\"ce2\" style:family=\"table-cell\" style:data-style-name=\"N1\"/>\
            </office:automatic-styles></office:document-content>";
        let mut styles = OdsStyles::default();
        styles.read(xml, true).unwrap();
        assert!(styles.look("ce1").general && styles.look("ce2").percent && !styles.look("ce2").general);
        assert_eq!(styles.with_digits(Some("ce1"), "0.000").as_deref(), Some("tieback-f3-ce1"));
        assert_eq!(
            styles.with_digits(Some("tieback-f3-ce1"), "0.0E+00").as_deref(),
            Some("tieback-e1.2-ce1")
        );
        assert!(styles.look("tieback-f3-ce1").general);
        let edit = styles.edit().unwrap();
        assert!(edit.text.contains("<style:style style:family=\"table-cell\" style:parent-style-name=\"Default\" style:name=\"tieback-f3-ce1\" style:data-style-name=\"tieback-f3\"><a/></style:style>"), "{}", edit.text);
    }

    #[test]
    fn general_formats_are_known() {
        assert!(is_general(
            "<number:number-style style:name=\"N0\"><number:number number:min-integer-digits=\"1\"/></number:number-style>"
        ));
        assert!(!is_general(
            "<number:number-style><number:number number:decimal-places=\"2\"/></number:number-style>"
        ));
        assert!(!is_general("<number:number-style/>"));
    }
}
