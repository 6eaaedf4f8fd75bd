//! What matters most in each asked system, with a chart.

use super::gather::Review;
use super::looks::{Looks, print_set_up, text};
use rust_xlsxwriter::{Chart, ChartType, Format, Worksheet, XlsxError};

/// Writes the sheet.
pub(super) fn ranking_sheet(sheet: &mut Worksheet, review: &Review, looks: &Looks) -> Result<(), XlsxError> {
    sheet.set_name("Ranking")?;
    text(sheet, (0, 0), "What matters most, by tieback's own values", &looks.title)?;
    print_set_up(sheet);
    sheet.set_column_width(0, 34)?;
    for column in 1..9 {
        sheet.set_column_width(column, 14)?;
    }
    sheet.set_freeze_panes(1, 1)?;
    let mut row = 2;
    for (name, table) in &review.rankings {
        text(sheet, (row, 0), name, &Format::new().set_bold())?;
        row += 1;
        let Some((head, things)) = table.split_first() else { continue };
        let first = row + 1;
        for (at, cells) in std::iter::once(head).chain(things).enumerate() {
            for (column, cell) in cells.iter().enumerate() {
                let place = (row, column as u16);
                match cell.parse::<f64>() {
                    Ok(number) if at > 0 => {
                        sheet.write_number_with_format(place.0, place.1, number, &looks.small)?;
                    }
                    _ => text(sheet, place, cell, if at == 0 { &looks.head } else { &looks.text })?,
                }
            }
            row += 1;
        }
        // The last row says what each column is.
        let last = (row - 2).min(first + 14);
        let mut chart = Chart::new(ChartType::Bar);
        chart
            .add_series()
            .set_categories(("Ranking", first, 0, last, 0))
            .set_values(("Ranking", first, 4, last, 4));
        chart.title().set_name(&format!("Fussell–Vesely importance in {name}"));
        chart.legend().set_hidden();
        chart.y_axis().set_reverse();
        let height = 80 + 22 * (last - first + 1);
        chart.set_width(760).set_height(height);
        sheet.insert_chart(row + 1, 0, &chart)?;
        row += 4 + height / 20;
    }
    if review.rankings.is_empty() {
        text(sheet, (2, 0), "no system of several things is asked about", &looks.note)?;
    }
    Ok(())
}
