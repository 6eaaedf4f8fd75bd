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
    /// Open elements around this one.
    pub(super) depth: u32,
}

impl<'a> Tag<'a> {
    /// The name with its prefix.
    pub(super) fn name(&self) -> &'a str {
        let inner = self.raw.trim_start_matches(['<', '/']);
        let end = inner.find(|c: char| c.is_ascii_whitespace() || matches!(c, '/' | '>'));
        &inner[..end.unwrap_or(inner.len())]
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
        attributes_of(self.raw)
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
    name.rsplit_once(':').map_or(name, |(_, local)| local)
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
pub(super) struct Tags<'a> {
    xml: &'a str,
    reader: Reader<&'a [u8]>,
    depth: u32,
}

impl<'a> Tags<'a> {
    /// The tags of `xml`, which holds no byte-order mark.
    pub(super) fn new(xml: &'a str) -> Tags<'a> {
        let mut reader = Reader::from_str(xml);
        reader.config_mut().check_comments = false;
        Tags { xml, reader, depth: 0 }
    }

    fn at(&self) -> usize {
        usize::try_from(self.reader.buffer_position()).unwrap_or(usize::MAX).min(self.xml.len())
    }

    /// The next tag; `None` at the end of the part.
    pub(super) fn next(&mut self) -> Result<Option<Tag<'a>>, XmlTrouble> {
        loop {
            let start = self.at();
            let event = self.reader.read_event().map_err(|e| format!("its XML is broken: {e}"))?;
            let kind = match event {
                Event::Start(_) => Kind::Open,
                Event::Empty(_) => Kind::Empty,
                Event::End(_) => Kind::Close,
                Event::DocType(_) => {
                    return Err("it declares a document type, which no workbook needs".into());
                }
                Event::Eof if self.depth > 0 => return Err("its XML ends within an element".into()),
                Event::Eof => return Ok(None),
                _ => continue,
            };
            let span = start..self.at();
            let raw = self.xml.get(span.clone()).ok_or("its XML is broken")?;
            if kind == Kind::Close {
                self.depth = self.depth.saturating_sub(1);
            }
            let depth = self.depth;
            if kind == Kind::Open {
                self.depth += 1;
            }
            return Ok(Some(Tag { kind, span, raw, depth }));
        }
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
