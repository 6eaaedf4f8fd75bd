//! How the sheets of a review look, and how cells are written.

use super::sheet_formula::Part;
use crate::number::Chance;
use crate::source::Sources;
use crate::steps::Side;
use rust_xlsxwriter::{
    Color, Format, FormatAlign, FormatBorder, Formula as SheetFormula, Worksheet, XlsxError,
};

pub(super) struct Looks {
    pub(super) title: Format,
    pub(super) head: Format,
    pub(super) text: Format,
    pub(super) input: Format,
    pub(super) note: Format,
    pub(super) small: Format,
}

impl Looks {
    pub(super) fn new() -> Looks {
        let text = Format::new().set_text_wrap().set_align(FormatAlign::Top).set_indent(1);
        let line = Color::RGB(0x00C5_CED2);
        Looks {
            title: Format::new().set_bold().set_font_size(14).set_font_color(Color::RGB(0x0035_586C)),
            head: Format::new()
                .set_bold()
                .set_font_color(Color::White)
                .set_background_color(Color::RGB(0x0035_586C))
                .set_text_wrap()
                .set_align(FormatAlign::VerticalCenter),
            input: Format::new()
                .set_background_color(Color::RGB(0x00FF_F6DC))
                .set_border_bottom(FormatBorder::Thin)
                .set_border_color(line)
                .set_align(FormatAlign::Top),
            note: text.clone().set_italic(),
            small: Format::new().set_align(FormatAlign::Top).set_num_format("0.000000E+00"),
            text,
        }
    }

    /// A format that shows the nines of a probability.
    pub(super) fn nines(&self, other: f64) -> Format {
        let decimals = if other > 0.0 { (3.0 - other.log10()).ceil().clamp(4.0, 15.0) } else { 4.0 };
        let places = "0".repeat(decimals as usize);
        Format::new().set_align(FormatAlign::Top).set_num_format(format!("0.{places}"))
    }
}

pub(super) fn heads(
    sheet: &mut Worksheet,
    row: u32,
    heads: &[(&str, f64)],
    looks: &Looks,
) -> Result<(), XlsxError> {
    for (column, (head, width)) in heads.iter().enumerate() {
        sheet.write_with_format(row, column as u16, *head, &looks.head)?;
        sheet.set_column_width(column as u16, *width)?;
    }
    sheet.set_freeze_panes(row + 1, 0)?;
    sheet.set_repeat_rows(row, row)?;
    print_set_up(sheet);
    Ok(())
}

pub(super) fn print_set_up(sheet: &mut Worksheet) {
    sheet.set_landscape();
    sheet.set_paper_size(9);
    sheet.set_print_fit_to_pages(1, 0);
    sheet.set_footer("&L&F, &A&RPage &P of &N");
}

/// A text as a cell's text: none is taken for a formula.
pub(super) fn text(
    sheet: &mut Worksheet,
    at: (u32, u16),
    text: &str,
    format: &Format,
) -> Result<(), XlsxError> {
    // A cell holds 32767 characters.
    let cut: String = text.chars().take(32_000).collect();
    sheet.write_string_with_format(at.0, at.1, cut, format).map(|_| ())
}

pub(super) fn live(
    sheet: &mut Worksheet,
    at: (u32, u16),
    part: &Part,
    format: &Format,
) -> Result<(), XlsxError> {
    let formula = SheetFormula::new(format!("={}", part.text)).set_result(number_text(part.value));
    sheet.write_formula_with_format(at.0, at.1, formula, format).map(|_| ())
}

fn number_text(value: f64) -> String {
    format!("{value:e}")
}

/// Nines for the large side of a chance, an exponent for the small one.
pub(super) fn side_format(side: Side, chance: Chance, looks: &Looks) -> Format {
    let (value, rest) = (side.of(chance).to_f64(), side.of(chance.flip()).to_f64());
    if value >= rest { looks.nines(rest) } else { looks.small.clone() }
}

/// `line 12`, with its file where the document uses several.
pub(super) fn place_of(sources: &Sources, place: crate::source::Span) -> String {
    let words = sources.words(place);
    match sources.find(place) {
        Some((file, _)) if file.base != 0 => format!("{} {words}", file.name),
        _ => words,
    }
}

/// How high a row must be for its texts, given the width of each column.
pub(super) fn tall(texts: &[(u16, &str)], columns: &[(&str, f64)]) -> f64 {
    let lines = texts.iter().map(|(column, words)| {
        let width = columns.get(usize::from(*column)).map_or(20, |c| c.1 as usize);
        words.chars().count().div_ceil(width.saturating_sub(3).max(1))
    });
    15.0 * lines.max().unwrap_or(1).clamp(1, 20) as f64
}
