//! Writing answers into xlsx and xlsm workbooks.

use std::collections::BTreeMap;

use super::cells::a1;
use super::package::{Edited, Package};
use super::sheet::{CellItem, Item, Walk};
use super::styles::Styles;
use super::xml::{Kind, Tag, Tags, XmlTrouble, escape, retag};
use super::{Answer, AnswerValue, Book, BookTrouble, Sheet, number_text, stands_as_value};
use crate::document::patch::Edit;

/// The workbook with the answers; those of each sheet are sorted.
pub(super) fn write(
    book: &Book,
    workbook: &str,
    styles: Option<&str>,
    answers: &[Vec<&Answer>],
) -> Result<Vec<u8>, BookTrouble> {
    let mut package = Package::open(&book.bytes, &book.limits)?;
    let style_part = styles.map(|name| package.part(name)).transpose()?;
    let mut table = match (&style_part, styles) {
        (Some(part), Some(name)) => Some(Styles::new(&part.xml).map_err(|e| BookTrouble::part(name, e))?),
        _ => None,
    };
    let mut changed: BTreeMap<String, Edited> = BTreeMap::new();
    for (sheet, answers) in book.sheets.iter().zip(answers) {
        if answers.is_empty() {
            continue;
        }
        let part = package.part(&sheet.part)?;
        let edits = sheet_edits(&part.xml, sheet, answers, table.as_mut())
            .map_err(|e| BookTrouble::part(&sheet.part, e))?;
        changed.extend(part.edited(edits).map(|edited| (sheet.part.clone(), edited)));
    }
    if changed.is_empty() {
        return Ok(book.bytes.clone());
    }
    let style_edits = table.map(|table| table.edits()).unwrap_or_default();
    if let (Some(part), Some(name)) = (style_part, styles) {
        changed.extend(part.edited(style_edits).map(|edited| (name.to_string(), edited)));
    }
    if book.holds_formula() {
        let part = package.part(workbook)?;
        let edits = calculation(&part.xml).map_err(|e| BookTrouble::part(workbook, e))?;
        changed.extend(part.edited(edits).map(|edited| (workbook.to_string(), edited)));
    }
    drop(package);
    Package::rewrite(&book.bytes, changed)
}

/// The edit that asks the spreadsheet program to compute everything anew when
/// it opens the workbook.
fn calculation(xml: &str) -> Result<Vec<Edit>, XmlTrouble> {
    let mut tags = Tags::new(xml);
    let mut after = None;
    while let Some(tag) = tags.next()? {
        if tag.depth != 1 || !tag.starts() {
            continue;
        }
        let end = tags.skip(&tag)?;
        match tag.local() {
            "calcPr" if tag.flag("fullCalcOnLoad") => return Ok(Vec::new()),
            "calcPr" => {
                let drop = |name: &str| name == "fullCalcOnLoad";
                let text = retag(&tag, drop, " fullCalcOnLoad=\"1\"", tag.kind == Kind::Open);
                return Ok(vec![Edit { span: tag.span, text }]);
            }
            // The order that the format prescribes puts these before it.
            "sheets" | "functionGroups" | "externalReferences" | "definedNames" => {
                after = Some((end, tag.prefix()));
            }
            _ => {}
        }
    }
    let (at, prefix) = after.ok_or("it lists no sheets")?;
    Ok(vec![Edit { span: at..at, text: format!("<{prefix}calcPr fullCalcOnLoad=\"1\"/>") }])
}

/// The edits of one sheet while its part is walked through.
struct Patch<'a, 'b, 's> {
    xml: &'a str,
    sheet: &'b Sheet,
    answers: &'b [&'b Answer],
    /// The first answer that is not yet placed.
    next: usize,
    styles: Option<&'b mut Styles<'s>>,
    prefix: &'a str,
    edits: Vec<Edit>,
    /// The least and the greatest place of the cells that are put in.
    added: Option<((u32, u32), (u32, u32))>,
}

fn sheet_edits<'a>(
    xml: &'a str,
    sheet: &Sheet,
    answers: &[&Answer],
    styles: Option<&mut Styles<'_>>,
) -> Result<Vec<Edit>, XmlTrouble> {
    let mut patch =
        Patch { xml, sheet, answers, next: 0, styles, prefix: "", edits: Vec::new(), added: None };
    let mut dimension: Option<Tag<'a>> = None;
    let mut row: Option<(Tag<'a>, u32)> = None;
    let mut grown = None;
    let mut walk = Walk::new(xml);
    loop {
        // Of all other cells only the place is of interest.
        walk.only(answers.get(patch.next).map(|a| (a.row, a.column)));
        let Some(item) = walk.next()? else { break };
        match item {
            Item::Dimension(tag) => dimension = Some(tag),
            Item::Data(tag) => {
                patch.prefix = tag.prefix();
                if tag.kind == Kind::Empty {
                    let rows = patch.rows_before(u32::MAX);
                    if !rows.is_empty() {
                        let text = format!("{}{rows}</{}>", retag(&tag, |_| false, "", true), tag.name());
                        patch.edits.push(Edit { span: tag.span, text });
                    }
                }
            }
            Item::Row(tag, number, _) => {
                let rows = patch.rows_before(number);
                patch.insert(tag.span.start, rows);
                if tag.kind == Kind::Empty {
                    patch.fill_empty_row(&tag, number);
                    row = None;
                } else {
                    grown = None;
                    row = Some((tag, number));
                }
            }
            Item::Cell(cell) => {
                let start = cell.tag.span.start;
                let (cells, columns) = patch.cells_before(cell.row, cell.column);
                grown = join(grown, columns);
                patch.insert(start, cells);
                if patch.due(cell.row).is_some_and(|a| a.column == cell.column) {
                    patch.replace(&cell);
                }
            }
            Item::RowEnd(tag) => {
                if let Some((open, number)) = row.take() {
                    let (cells, columns) = patch.cells_before(number, u32::MAX);
                    grown = join(grown, columns);
                    patch.insert(tag.span.start, cells);
                    patch.edits.extend(grown.and_then(|columns| spans(&open, columns)));
                }
            }
            Item::DataEnd(tag) => {
                let rows = patch.rows_before(u32::MAX);
                patch.insert(tag.span.start, rows);
            }
            Item::Columns(..) | Item::Protection | Item::Merge(_) => {}
        }
    }
    if patch.next < answers.len() {
        return Err("it has no place for rows".into());
    }
    if let (Some(tag), Some(added)) = (dimension, patch.added) {
        patch.edits.extend(extend(&tag, added));
    }
    Ok(patch.edits)
}

fn join(a: Option<(u32, u32)>, b: Option<(u32, u32)>) -> Option<(u32, u32)> {
    match (a, b) {
        (Some(a), Some(b)) => Some((a.0.min(b.0), a.1.max(b.1))),
        (a, b) => a.or(b),
    }
}

impl<'a> Patch<'a, '_, '_> {
    fn due(&self, row: u32) -> Option<&Answer> {
        self.answers.get(self.next).copied().filter(|a| a.row == row)
    }

    fn insert(&mut self, at: usize, text: String) {
        if !text.is_empty() {
            self.edits.push(Edit { span: at..at, text });
        }
    }

    /// New cells for the answers of a row that stand before a column, and the
    /// columns that they take.
    fn cells_before(&mut self, row: u32, column: u32) -> (String, Option<(u32, u32)>) {
        let mut out = String::new();
        let mut columns = None;
        while let Some(answer) = self.answers.get(self.next).filter(|a| a.row == row && a.column < column) {
            self.next += 1;
            if answer.value == AnswerValue::Clear {
                continue;
            }
            let at = (row, answer.column);
            columns = join(columns, Some((at.1, at.1)));
            self.added =
                Some(self.added.map_or((at, at), |(a, b)| {
                    ((a.0.min(at.0), a.1.min(at.1)), (b.0.max(at.0), b.1.max(at.1)))
                }));
            let inherited = self.sheet.grid.inherited(row, answer.column);
            let style = self.style(answer, inherited.unwrap_or(0)).or(inherited);
            let mut tag = format!("<{}c r=\"{}\"", self.prefix, a1(row, answer.column));
            if let Some(style) = style {
                tag.push_str(&format!(" s=\"{style}\""));
            }
            out.push_str(&tag);
            out.push_str(&self.tail(&answer.value, &format!("{}c", self.prefix), ""));
        }
        (out, columns)
    }

    /// Whole new rows for the answers that stand before a row.
    fn rows_before(&mut self, row: u32) -> String {
        let mut out = String::new();
        while let Some(number) = self.answers.get(self.next).map(|a| a.row).filter(|r| *r < row) {
            let (cells, _) = self.cells_before(number, u32::MAX);
            if !cells.is_empty() {
                let p = self.prefix;
                out.push_str(&format!("<{p}row r=\"{}\">{cells}</{p}row>", u64::from(number) + 1));
            }
        }
        out
    }

    fn fill_empty_row(&mut self, tag: &Tag<'a>, row: u32) {
        let (cells, columns) = self.cells_before(row, u32::MAX);
        let Some(columns) = columns else { return };
        let open = spans(tag, columns).map_or_else(|| retag(tag, |_| false, "", true), |edit| edit.text);
        // `spans` keeps the tag empty as it was.
        let open = open.strip_suffix("/>").map_or(open.clone(), |o| format!("{o}>"));
        self.edits.push(Edit { span: tag.span.clone(), text: format!("{open}{cells}</{}>", tag.name()) });
    }

    /// The style under which an answer shows its digits, if it needs another
    /// than `base`.
    fn style(&mut self, answer: &Answer, base: u32) -> Option<u32> {
        let AnswerValue::Number { format: Some(digits), .. } = &answer.value else { return None };
        let look = self.sheet.shared.looks.get(base as usize)?;
        if !look.general {
            return None;
        }
        self.styles.as_mut()?.with_digits(base, digits).filter(|new| *new != base)
    }

    /// What follows the attributes of a cell up to its end.
    fn tail(&self, value: &AnswerValue, name: &str, extra: &str) -> String {
        let p = self.prefix;
        match value {
            AnswerValue::Number { value, .. } => {
                format!("><{p}v>{}</{p}v>{extra}</{name}>", number_text(*value))
            }
            AnswerValue::Text(text) => format!(
                " t=\"inlineStr\"><{p}is><{p}t xml:space=\"preserve\">{}</{p}t></{p}is>{extra}</{name}>",
                xstring(text)
            ),
            AnswerValue::Clear if extra.is_empty() => "/>".into(),
            AnswerValue::Clear => format!(">{extra}</{name}>"),
        }
    }

    fn replace(&mut self, cell: &CellItem<'a>) {
        let Some(answer) = self.answers.get(self.next).copied() else { return };
        self.next += 1;
        let style = self.style(answer, cell.style);
        let stands = stands_as_value(self.sheet, answer);
        if stands && style.is_none() {
            return;
        }
        let add = style.map_or(String::new(), |s| format!(" s=\"{s}\""));
        let old = |name: &str| name == "s" && style.is_some();
        if stands {
            let text = retag(&cell.tag, old, &add, cell.tag.kind == Kind::Open);
            self.edits.push(Edit { span: cell.tag.span.clone(), text });
            return;
        }
        let drop = |name: &str| matches!(name, "t" | "cm" | "vm") || old(name);
        let mut text = retag(&cell.tag, drop, &add, true);
        text.pop();
        let extra = cell.extra.clone().and_then(|range| self.xml.get(range)).unwrap_or("");
        text.push_str(&self.tail(&answer.value, cell.tag.name(), extra));
        self.edits.push(Edit { span: cell.tag.span.start..cell.end, text });
    }
}

/// The edit that lets a row's `spans` take in these columns, if it has any.
fn spans(row: &Tag<'_>, columns: (u32, u32)) -> Option<Edit> {
    let old = row.raw_attribute("spans")?;
    let (first, last) = old.split_once(':')?;
    let (first, last): (u32, u32) = (first.parse().ok()?, last.parse().ok()?);
    let new = (first.min(columns.0 + 1), last.max(columns.1 + 1));
    if new == (first, last) {
        return None;
    }
    let add = format!(" spans=\"{}:{}\"", new.0, new.1);
    let text = retag(row, |name| name == "spans", &add, row.kind == Kind::Open);
    Some(Edit { span: row.span.clone(), text })
}

/// The edit that lets the sheet's dimension take in the cells put in.
fn extend(tag: &Tag<'_>, (first, last): ((u32, u32), (u32, u32))) -> Option<Edit> {
    let old = super::cells::Block::parse(tag.raw_attribute("ref")?)?;
    let new = (
        (old.first.0.min(first.0), old.first.1.min(first.1)),
        (old.last.0.max(last.0), old.last.1.max(last.1)),
    );
    if new == (old.first, old.last) {
        return None;
    }
    let add = format!(" ref=\"{}:{}\"", a1(new.0.0, new.0.1), a1(new.1.0, new.1.1));
    let text = retag(tag, |name| name == "ref", &add, tag.kind == Kind::Open);
    Some(Edit { span: tag.span.clone(), text })
}

/// Text as a cell stores it: what looks like one of its escapes (`_x000D_`) is
/// escaped itself, and a carriage return is written as one.
fn xstring(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for (at, c) in text.char_indices() {
        let escape = c == '_'
            && text.as_bytes().get(at + 1) == Some(&b'x')
            && text.as_bytes().get(at + 6) == Some(&b'_')
            && text.as_bytes()[at + 2..at + 6].iter().all(u8::is_ascii_hexdigit);
        match c {
            '\r' => out.push_str("_x000D_"),
            '_' if escape => out.push_str("_x005F_"),
            c => out.push(c),
        }
    }
    escape_text(&out)
}

fn escape_text(text: &str) -> String {
    escape(text).replace("&quot;", "\"")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::document::patch::{Rewrite, apply};

    #[test]
    fn the_calculation_flag_is_set_once() {
        let set = |xml: &str| match apply(xml.as_bytes(), &calculation(xml).unwrap()).unwrap() {
            Rewrite::Unchanged => None,
            Rewrite::Patched(new) => Some(String::from_utf8(new).unwrap()),
        };
        let plain = "<workbook><sheets><sheet/></sheets><definedNames/><extLst/></workbook>";
        let flagged = set(plain).unwrap();
        assert!(flagged.contains("<definedNames/><calcPr fullCalcOnLoad=\"1\"/><extLst/>"), "{flagged}");
        assert_eq!(set(&flagged), None);
        let old = "<x:workbook><x:sheets/><x:calcPr calcId='1' fullCalcOnLoad='0'/></x:workbook>";
        assert!(set(old).unwrap().contains("<x:calcPr calcId='1' fullCalcOnLoad=\"1\"/>"));
    }

    #[test]
    fn escapes_stay_text() {
        assert_eq!(xstring("a_x000D_b<\"&\r"), "a_x005F_x000D_b&lt;\"&amp;_x000D_");
        assert_eq!(xstring("_x_ä_x12"), "_x_ä_x12");
    }
}
