//! Writing answers into ods workbooks.

use std::collections::BTreeMap;

use super::ods_styles::OdsStyles;
use super::ods_table::{CellItem, Met, RowItem, cells, walk};
use super::package::Package;
use super::xml::{Kind, Tags, XmlTrouble, escape, retag, unescape};
use super::{Answer, AnswerValue, Book, BookTrouble, number_text};
use crate::document::patch::{Edit, Rewrite, apply};

/// The workbook with the answers; those of each sheet are sorted.
pub(super) fn write(book: &Book, answers: &[Vec<&Answer>]) -> Result<Vec<u8>, BookTrouble> {
    const CONTENT: &str = "content.xml";
    let broken = |e: XmlTrouble| BookTrouble::part(CONTENT, e);
    let mut package = Package::open(&book.bytes, &book.limits)?;
    let content = package.part(CONTENT)?;
    let common = if package.holds("styles.xml") { Some(package.part("styles.xml")?) } else { None };
    let mut styles = OdsStyles::default();
    if let Some(common) = &common {
        styles.read(&common.xml, false).map_err(|e| BookTrouble::part("styles.xml", e))?;
    }
    styles.read(&content.xml, true).map_err(broken)?;
    let xml = content.xml.as_str();
    let root = Tags::new(xml).next().map_err(broken)?;
    let calcext = root.is_some_and(|tag| tag.attributes().any(|a| a.name == "xmlns:calcext"));
    let mut patch = Patch { styles, calcext, columns: Vec::new(), edits: Vec::new() };
    let mut table = 0;
    let mut next = 0;
    walk(xml, |met| {
        let list = answers.get(table).map_or(&[][..], Vec::as_slice);
        match met {
            Met::Table(_) => (next, patch.columns) = (0, Vec::new()),
            Met::Columns(first, count, style) => {
                if let Some(style) = style {
                    patch.columns.push((first, first + count - 1, unescape(style).into_owned()));
                }
            }
            Met::Row(row) => {
                let count = list[next..].iter().take_while(|a| a.row < row.row + row.repeat).count();
                if count > 0 {
                    let due = &list[next..next + count];
                    next += count;
                    patch.rows(xml.get(row.span.clone()).unwrap_or(""), &row, due)?;
                }
            }
            Met::End(row, at) => {
                patch.new_rows(row, at, &list[next..])?;
                table += 1;
            }
            Met::Name(..) => {}
        }
        Ok(())
    })
    .map_err(broken)?;
    let mut edits = patch.edits;
    if edits.is_empty() {
        return Ok(book.bytes.clone());
    }
    edits.extend(patch.styles.edit());
    drop(patch.styles);
    match content.edited(edits) {
        None => Ok(book.bytes.clone()),
        Some(edited) => Package::rewrite(&book.bytes, BTreeMap::from([(CONTENT.into(), edited)])),
    }
}

struct Patch<'a> {
    styles: OdsStyles<'a>,
    /// Whether cells say their type a second time, in LibreOffice's words.
    calcext: bool,
    columns: Vec<(u32, u32, String)>,
    edits: Vec<Edit>,
}

/// An element with another count of repeats.
fn repeated(element: &str, name: &str, count: u32) -> Result<String, XmlTrouble> {
    let tag = Tags::new(element).next()?.ok_or("its XML is broken")?;
    let old = tag.raw_attribute(name).unwrap_or("1");
    if old == count.to_string() {
        return Ok(element.into());
    }
    let add = if count > 1 { format!(" {name}=\"{count}\"") } else { String::new() };
    let mut out = retag(&tag, |n| n == name, &add, tag.kind == Kind::Open);
    out.push_str(&element[tag.span.end..]);
    Ok(out)
}

impl Patch<'_> {
    /// Writes answers into a row, or divides repeated rows around theirs.
    fn rows(&mut self, text: &str, item: &RowItem<'_>, due: &[&Answer]) -> Result<(), XmlTrouble> {
        const REPEAT: &str = "table:number-rows-repeated";
        let mut out = String::new();
        let mut at = item.row;
        for group in due.chunk_by(|a, b| a.row == b.row) {
            let Some(number) = group.first().map(|a| a.row) else { continue };
            let single = repeated(text, REPEAT, 1)?;
            let Some(row) = self.row(&single, group)? else { continue };
            if number > at {
                out.push_str(&repeated(text, REPEAT, number - at)?);
            }
            out.push_str(&row);
            at = number + 1;
        }
        let end = item.row + item.repeat;
        if at == item.row {
            return Ok(());
        }
        if at < end {
            out.push_str(&repeated(text, REPEAT, end - at)?);
        }
        self.edits.push(Edit { span: item.span.clone(), text: out });
        Ok(())
    }

    /// Puts in rows below the last one of a table.
    fn new_rows(&mut self, first: u32, at: usize, due: &[&Answer]) -> Result<(), XmlTrouble> {
        let mut out = String::new();
        let mut next = first;
        for group in due.chunk_by(|a, b| a.row == b.row) {
            let Some(number) = group.first().map(|a| a.row) else { continue };
            let Some(row) = self.row("<table:table-row/>", group)? else { continue };
            let gap = number.checked_sub(next).ok_or("it has no place for rows")?;
            if gap > 0 {
                let count =
                    if gap > 1 { format!(" table:number-rows-repeated=\"{gap}\"") } else { String::new() };
                out.push_str(&format!("<table:table-row{count}><table:table-cell/></table:table-row>"));
            }
            out.push_str(&row);
            next = number + 1;
        }
        if !out.is_empty() {
            self.edits.push(Edit { span: at..at, text: out });
        }
        Ok(())
    }

    /// A single row with answers in it; `None` if they change nothing.
    fn row(&mut self, text: &str, due: &[&Answer]) -> Result<Option<String>, XmlTrouble> {
        const REPEAT: &str = "table:number-columns-repeated";
        let tag = Tags::new(text).next()?.ok_or("its XML is broken")?;
        let default = tag.raw_attribute("table:default-cell-style-name").map(|s| unescape(s).into_owned());
        let mut edits = Vec::new();
        let mut next = 0;
        let mut width = 0;
        for cell in cells(text)? {
            width = cell.column + cell.repeat;
            let element = &text[cell.span.clone()];
            let mut out = String::new();
            let mut at = cell.column;
            while let Some(answer) = due.get(next).filter(|a| a.column < width) {
                next += 1;
                // The readers of a file may differ on what a merged range hides.
                if cell.covered {
                    return Err("an answer's cell lies hidden in a merged range".into());
                }
                let single = repeated(element, REPEAT, 1)?;
                let Some(new) = self.cell(text, &cell, answer, default.as_deref()) else { continue };
                if new == single {
                    continue;
                }
                if answer.column > at {
                    out.push_str(&repeated(element, REPEAT, answer.column - at)?);
                }
                out.push_str(&new);
                at = answer.column + 1;
            }
            if at > cell.column {
                if at < width {
                    out.push_str(&repeated(element, REPEAT, width - at)?);
                }
                edits.push(Edit { span: cell.span.clone(), text: out });
            }
        }
        let mut more = String::new();
        for answer in &due[next..] {
            if answer.value == AnswerValue::Clear {
                continue;
            }
            let gap = answer.column.saturating_sub(width);
            if gap > 0 {
                let count = if gap > 1 { format!(" {REPEAT}=\"{gap}\"") } else { String::new() };
                more.push_str(&format!("<table:table-cell{count}/>"));
            }
            let fresh = cells("<r><table:table-cell/></r>")?;
            if let Some(fresh) = fresh.first() {
                more.extend(self.cell("<r><table:table-cell/></r>", fresh, answer, default.as_deref()));
            }
            width = answer.column + 1;
        }
        if !more.is_empty() {
            let open = retag(&tag, |_| false, "", true);
            edits.push(match tag.kind {
                Kind::Empty => {
                    Edit { span: tag.span.clone(), text: format!("{open}{more}</{}>", tag.name()) }
                }
                _ => {
                    let end = text.rfind("</").ok_or("its XML is broken")?;
                    Edit { span: end..end, text: more }
                }
            });
        }
        match apply(text.as_bytes(), &edits).map_err(|e| e.to_string())? {
            Rewrite::Unchanged => Ok(None),
            Rewrite::Patched(new) => String::from_utf8(new).map(Some).map_err(|e| e.to_string()),
        }
    }

    /// A cell with an answer in it; `None` if it is empty and is to be so.
    fn cell(
        &mut self,
        row: &str,
        cell: &CellItem<'_>,
        answer: &Answer,
        row_style: Option<&str>,
    ) -> Option<String> {
        let kind = cell.tag.raw_attribute("office:value-type");
        if answer.value == AnswerValue::Clear && kind.is_none() && cell.paragraphs.is_empty() {
            return None;
        }
        let own = cell.tag.raw_attribute("table:style-name").map(|s| unescape(s).into_owned());
        let from_column = || {
            let found = self.columns.iter().find(|(a, b, _)| (*a..=*b).contains(&answer.column));
            found.map(|(_, _, style)| style.clone())
        };
        let base = own.clone().or_else(|| row_style.map(String::from)).or_else(from_column);
        let look = base.as_deref().map(|base| self.styles.look(base)).unwrap_or_default();
        let mut style = None;
        let mut shown = None;
        let (facts, paragraphs) = match &answer.value {
            AnswerValue::Number { value, format } => {
                if let Some(digits) = format.as_ref().filter(|_| look.general) {
                    style = self.styles.with_digits(base.as_deref(), digits);
                    shown = style.as_ref().map(|_| in_digits(*value, digits));
                }
                let kind = if look.percent { "percentage" } else { "float" };
                let text = number_text(*value);
                let facts =
                    format!(" office:value-type=\"{kind}\" office:value=\"{text}\"{}", self.twice(kind));
                (facts, format!("<text:p>{}</text:p>", shown.unwrap_or(text)))
            }
            AnswerValue::Text(text) => {
                let facts = format!(" office:value-type=\"string\"{}", self.twice("string"));
                (facts, text.split('\n').map(paragraph).collect())
            }
            AnswerValue::Clear => (String::new(), String::new()),
        };
        let style = style.filter(|new| Some(new) != own.as_ref());
        let styled = style.as_ref().map_or(String::new(), |s| format!(" table:style-name=\"{}\"", escape(s)));
        let drop = |name: &str| match name {
            "office:value-type"
            | "office:value"
            | "office:date-value"
            | "office:time-value"
            | "office:boolean-value"
            | "office:string-value"
            | "office:currency"
            | "calcext:value-type"
            | "table:number-columns-repeated" => true,
            "table:style-name" => style.is_some(),
            _ => false,
        };
        let kept: String = cell.kept.iter().filter_map(|range| row.get(range.clone())).collect();
        let content = kept + &paragraphs;
        let mut out = retag(&cell.tag, drop, &(styled + &facts), !content.is_empty());
        if !content.is_empty() {
            out.push_str(&format!("{content}</{}>", cell.tag.name()));
        }
        Some(out)
    }

    fn twice(&self, kind: &str) -> String {
        if self.calcext { format!(" calcext:value-type=\"{kind}\"") } else { String::new() }
    }
}

/// A number as `0.000` or `0.00E+00` shows it.
fn in_digits(value: f64, digits: &str) -> String {
    let (mantissa, exponent) = digits.split_once("E+").unwrap_or((digits, ""));
    let places = mantissa.split_once('.').map_or(0, |(_, part)| part.len());
    if exponent.is_empty() {
        return format!("{value:.places$}");
    }
    let text = format!("{value:.places$e}");
    let (mantissa, power) = text.split_once('e').unwrap_or((&text, "0"));
    let (sign, power) = power.strip_prefix('-').map_or(('+', power), |power| ('-', power));
    format!("{mantissa}E{sign}{power:0>width$}", width = exponent.len())
}

/// A line of text as a paragraph that keeps its spaces.
fn paragraph(line: &str) -> String {
    let mut out = String::from("<text:p>");
    let mut spaces = 0;
    let flush = |out: &mut String, spaces: &mut usize, edge: bool| {
        if *spaces > 0 {
            let plain = usize::from(!edge);
            out.push_str(&" ".repeat(plain));
            match *spaces - plain {
                0 => {}
                1 => out.push_str("<text:s/>"),
                more => out.push_str(&format!("<text:s text:c=\"{more}\"/>")),
            }
            *spaces = 0;
        }
    };
    for (at, c) in line.char_indices() {
        if c == ' ' {
            spaces += 1;
            continue;
        }
        let edge = spaces == at;
        flush(&mut out, &mut spaces, edge);
        match c {
            '\t' => out.push_str("<text:tab/>"),
            '\r' => {}
            c => out.push_str(&escape(c.encode_utf8(&mut [0; 4]))),
        }
    }
    flush(&mut out, &mut spaces, true);
    out.push_str("</text:p>");
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn spaces_and_digits_are_shown() {
        assert_eq!(
            paragraph("  a  b <c "),
            "<text:p><text:s text:c=\"2\"/>a <text:s/>b &lt;c<text:s/></text:p>"
        );
        assert_eq!(in_digits(0.99999999, "0.00000000"), "0.99999999");
        assert_eq!(in_digits(1.25e-9, "0.000E+00"), "1.250E-09");
        assert_eq!(in_digits(3.0, "0"), "3");
    }
}
