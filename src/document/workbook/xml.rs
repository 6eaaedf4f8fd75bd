//! Tags of an XML part with the places where they stand.
//!
//! Nothing is ever written back from parsed events: the parts are patched in
//! their own text, so all that is needed is where each tag begins and ends.

use std::borrow::Cow;
use std::ops::Range;

use quick_xml::escape::resolve_predefined_entity;
use quick_xml::events::Event;
use quick_xml::reader::Reader;

/// What is wrong with a part's XML.
pub(super) type XmlTrouble = String;

/// How a tag stands.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Kind {
    Open,
    Empty,
    Close,
}

/// One tag.
#[derive(Clone, Debug)]
pub(super) struct Tag<'a> {
    pub(super) kind: Kind,
    /// Where the tag stands, its angle brackets included.
    pub(super) span: Range<usize>,
    /// `<name attributes>` as it is written.
    pub(super) raw: &'a str,
    name: &'a str,
    /// Open elements around this one.
    pub(super) depth: u32,
}

impl<'a> Tag<'a> {
    /// The name with its prefix.
    pub(super) fn name(&self) -> &'a str {
        self.name
    }

    /// The name without its prefix.
    pub(super) fn local(&self) -> &'a str {
        local(self.name())
    }

    /// The prefix with its colon, or nothing.
    pub(super) fn prefix(&self) -> &'a str {
        let name = self.name();
        name.find(':').map_or("", |at| &name[..=at])
    }

    /// Whether an element starts here.
    pub(super) fn starts(&self) -> bool {
        self.kind != Kind::Close
    }

    /// The attributes as they are written.
    pub(super) fn attributes(&self) -> Attributes<'a> {
        let start = if self.kind == Kind::Close { self.raw.len() } else { self.name.len() + 1 };
        Attributes { rest: self.raw.get(start..).unwrap_or("") }
    }

    /// The raw value of an attribute without prefix.
    pub(super) fn raw_attribute(&self, name: &str) -> Option<&'a str> {
        self.attributes().find(|a| a.name == name).map(|a| a.value)
    }

    /// The value of an attribute, its escapes resolved.
    pub(super) fn attribute(&self, name: &str) -> Option<Cow<'a, str>> {
        self.raw_attribute(name).map(unescape)
    }

    /// Whether an attribute says yes.
    pub(super) fn flag(&self, name: &str) -> bool {
        matches!(self.raw_attribute(name), Some("1" | "true" | "on"))
    }
}

/// A name without its prefix.
pub(super) fn local(name: &str) -> &str {
    match name.bytes().position(|b| b == b':') {
        Some(at) => name.get(at + 1..).unwrap_or(name),
        None => name,
    }
}

/// One attribute as it is written.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) struct Attribute<'a> {
    pub(super) name: &'a str,
    /// The value between its quotes, escapes and all.
    pub(super) value: &'a str,
    /// Name, sign, quotes and value.
    pub(super) text: &'a str,
}

/// The attributes of a tag.
#[derive(Clone, Debug)]
pub(super) struct Attributes<'a> {
    rest: &'a str,
}

/// The attributes of a tag written `<name a="b">`.
pub(super) fn attributes_of(raw: &str) -> Attributes<'_> {
    let rest = raw.find(|c: char| c.is_ascii_whitespace()).map_or("", |at| &raw[at..]);
    Attributes { rest }
}

impl<'a> Iterator for Attributes<'a> {
    type Item = Attribute<'a>;

    fn next(&mut self) -> Option<Attribute<'a>> {
        let rest = self.rest.trim_ascii_start();
        let equals = rest.find('=')?;
        let name = rest[..equals].trim_ascii_end();
        let after = rest[equals + 1..].trim_ascii_start();
        let quote = after.chars().next().filter(|c| matches!(c, '"' | '\''))?;
        let start = rest.len() - after.len() + 1;
        let end = start + rest[start..].find(quote)?;
        self.rest = &rest[end + 1..];
        Some(Attribute { name, value: &rest[start..end], text: &rest[..=end] })
    }
}

/// The tags of a part in order.
///
/// A sheet has millions of tags of which only places are wanted, so they are
/// found by hand: that takes a third of the time of parsing events.
pub(super) struct Tags<'a> {
    xml: &'a str,
    at: usize,
    open: Vec<&'a str>,
}

impl<'a> Tags<'a> {
    /// The tags of `xml`, which holds no byte-order mark.
    pub(super) fn new(xml: &'a str) -> Tags<'a> {
        Tags { xml, at: 0, open: Vec::new() }
    }

    /// The next tag; `None` at the end of the part.
    pub(super) fn next(&mut self) -> Result<Option<Tag<'a>>, XmlTrouble> {
        let bytes = self.xml.as_bytes();
        loop {
            let Some(start) = bytes[self.at..].iter().position(|b| *b == b'<').map(|at| self.at + at) else {
                return match self.open.is_empty() {
                    true => Ok(None),
                    false => Err("its XML ends within an element".into()),
                };
            };
            match bytes.get(start + 1) {
                Some(b'?') => self.pass(start, "?>")?,
                Some(b'!') if self.xml[start..].starts_with("<!--") => self.pass(start + 4, "-->")?,
                Some(b'!') if self.xml[start..].starts_with("<![CDATA[") => self.pass(start, "]]>")?,
                Some(b'!') => return Err("it declares a document type, which no workbook needs".into()),
                _ => return self.tag(start).map(Some),
            }
        }
    }

    /// Goes on after `end`, which stands somewhere after `from`.
    fn pass(&mut self, from: usize, end: &str) -> Result<(), XmlTrouble> {
        let found = self.xml.get(from..).and_then(|rest| rest.find(end));
        self.at = found.map(|at| from + at + end.len()).ok_or("its XML is cut short")?;
        Ok(())
    }

    fn tag(&mut self, start: usize) -> Result<Tag<'a>, XmlTrouble> {
        let bytes = self.xml.as_bytes();
        let mut quote = 0u8;
        let mut end = start + 1;
        loop {
            match (bytes.get(end), quote) {
                (Some(b), 1..) if *b == quote => quote = 0,
                (Some(b'>'), 0) => break,
                (Some(b @ (b'"' | b'\'')), 0) => quote = *b,
                (Some(b'<'), _) | (None, _) => return Err(format!("its XML is broken at byte {start}")),
                _ => {}
            }
            end += 1;
        }
        let kind = match (bytes[start + 1], bytes[end - 1]) {
            (b'/', _) => Kind::Close,
            (_, b'/') => Kind::Empty,
            _ => Kind::Open,
        };
        let from = start + 1 + usize::from(kind == Kind::Close);
        let ends = |b: &u8| matches!(b, b' ' | b'\t' | b'\r' | b'\n' | b'/' | b'>');
        let length = bytes[from..=end].iter().position(ends).unwrap_or(0);
        let name = self.xml.get(from..from + length).unwrap_or("");
        let raw = self.xml.get(start..=end).unwrap_or("");
        match kind {
            _ if name.is_empty() => return Err(format!("its XML is broken at byte {start}")),
            Kind::Close if self.open.pop() != Some(name) => {
                return Err(format!("its XML is broken: `</{name}>` at byte {start} closes nothing"));
            }
            _ => {}
        }
        let depth = u32::try_from(self.open.len()).unwrap_or(u32::MAX);
        if kind == Kind::Open {
            self.open.push(name);
        }
        self.at = end + 1;
        Ok(Tag { kind, span: start..self.at, raw, name, depth })
    }

    /// Passes over an element that holds none of its own name; where it ends.
    /// Its inner tags are not looked at, and not checked.
    pub(super) fn leap(&mut self, tag: &Tag<'a>) -> Result<usize, XmlTrouble> {
        if tag.kind != Kind::Open {
            return Ok(tag.span.end);
        }
        let bytes = self.xml.as_bytes();
        let name = tag.name.as_bytes();
        let mut at = tag.span.end;
        while let Some(found) = bytes[at..].iter().position(|b| *b == b'<') {
            at += found;
            match bytes.get(at + 1) {
                // Comments and unparsed text may hold what looks like the end.
                Some(b'!' | b'?') => break,
                Some(b'/')
                    if bytes[at + 2..].starts_with(name) && bytes.get(at + 2 + name.len()) == Some(&b'>') =>
                {
                    self.open.pop();
                    self.at = at + 3 + name.len();
                    return Ok(self.at);
                }
                _ => at += 1,
            }
        }
        self.skip(tag)
    }

    /// Passes over the element that `tag` opened; where it ends.
    pub(super) fn skip(&mut self, tag: &Tag<'a>) -> Result<usize, XmlTrouble> {
        if tag.kind != Kind::Open {
            return Ok(tag.span.end);
        }
        while let Some(next) = self.next()? {
            if next.kind == Kind::Close && next.depth == tag.depth {
                return Ok(next.span.end);
            }
        }
        Err("its XML ends within an element".into())
    }
}

/// The text within a stretch of XML, tags left out.
pub(super) fn text(xml: &str) -> Result<String, XmlTrouble> {
    let mut out = String::new();
    let mut reader = Reader::from_str(xml);
    reader.config_mut().check_end_names = false;
    reader.config_mut().allow_unmatched_ends = true;
    loop {
        match reader.read_event().map_err(|e| format!("its XML is broken: {e}"))? {
            Event::Text(t) => out.push_str(&t.xml10_content()),
            Event::CData(t) => out.push_str(&t.xml10_content()),
            Event::GeneralRef(name) => match name.resolve_char_ref() {
                Ok(Some(c)) => out.push(c),
                _ => out.push_str(resolve_predefined_entity(&name.into_inner()).unwrap_or("\u{fffd}")),
            },
            Event::Eof => return Ok(out),
            _ => {}
        }
    }
}

/// A raw attribute value with its escapes resolved; as it is where they are
/// unknown.
pub(super) fn unescape(raw: &str) -> Cow<'_, str> {
    quick_xml::escape::unescape(raw).unwrap_or(Cow::Borrowed(raw))
}

/// Text as it stands between tags or quotes.
pub(super) fn escape(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            c => out.push(c),
        }
    }
    out
}

/// The first character that XML cannot hold.
pub(super) fn unwritable(text: &str) -> Option<char> {
    text.chars().find(
        |c| matches!(c, '\0'..='\u{8}' | '\u{b}' | '\u{c}' | '\u{e}'..='\u{1f}' | '\u{fffe}' | '\u{ffff}'),
    )
}

/// A tag written anew: its attributes without those that `drop` names, then
/// `add`, open or empty.
pub(super) fn retag(tag: &Tag<'_>, drop: impl Fn(&str) -> bool, add: &str, open: bool) -> String {
    let mut out = format!("<{}", tag.name());
    for attribute in tag.attributes().filter(|a| !drop(a.name)) {
        out.push(' ');
        out.push_str(attribute.text);
    }
    out.push_str(add);
    out.push_str(if open { ">" } else { "/>" });
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn finds_tags_and_attributes() {
        let xml =
            "<?xml version='1.0'?><x:a b = 'c>d' e=\"&lt;\"><!-- <f/> --><g/>t&amp;<![CDATA[<h>]]></x:a>";
        let mut tags = Tags::new(xml);
        let a = tags.next().unwrap().unwrap();
        assert_eq!((a.name(), a.local(), a.prefix(), a.depth), ("x:a", "a", "x:", 0));
        assert_eq!(a.raw_attribute("b"), Some("c>d"));
        assert_eq!(a.attribute("e").as_deref(), Some("<"));
        assert_eq!(retag(&a, |n| n == "b", " z=\"1\"", true), "<x:a e=\"&lt;\" z=\"1\">");
        let g = tags.next().unwrap().unwrap();
        assert_eq!((g.local(), g.kind, g.depth), ("g", Kind::Empty, 1));
        let end = tags.next().unwrap().unwrap();
        assert_eq!((end.local(), end.kind, end.depth), ("a", Kind::Close, 0));
        assert_eq!(text(&xml[a.span.end..end.span.start]).unwrap(), "t&<h>");
        assert!(tags.next().unwrap().is_none());
    }

    #[test]
    fn refuses_document_types_and_broken_xml() {
        assert!(Tags::new("<!DOCTYPE a []><a/>").next().is_err());
        let mut tags = Tags::new("<a><b></a>");
        assert!((0..3).any(|_| tags.next().is_err()));
        let mut tags = Tags::new("<a>");
        assert!((0..3).any(|_| tags.next().is_err()));
    }
}
