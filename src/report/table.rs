//! Plain text tables.

use comfy_table::{CellAlignment, ContentArrangement, LineStyle, Table, TableStyle};

/// A table with aligned columns, a rule under the header and none elsewhere. Columns listed in `words` are aligned to
/// the left, numbers to the right.
pub fn table(header: &[&str], words: &[usize], rows: Vec<Vec<String>>) -> String {
    let mut table = Table::new();
    table.load_style(TableStyle::new().header_separator(LineStyle::none().fill('-').junction('-')));
    table.set_content_arrangement(ContentArrangement::Disabled);
    table.set_header(header.to_vec());
    table.add_rows(rows);
    for (index, column) in table.column_iter_mut().enumerate() {
        let alignment = if words.contains(&index) {
            CellAlignment::Left
        } else {
            CellAlignment::Right
        };
        column.set_cell_alignment(alignment);
        column.set_padding((1, 1));
    }
    table
        .to_string()
        .lines()
        .map(|line| line.trim_end().to_owned() + "\n")
        .collect()
}

/// A table that stands in text as well as on a page.
#[derive(Debug)]
pub struct TitledTable {
    pub title: String,
    pub header: Vec<&'static str>,
    /// Columns of words; the others hold numbers.
    pub left: Vec<usize>,
    pub rows: Vec<Vec<String>>,
    /// A line below; empty when there is nothing to say.
    pub note: &'static str,
}

impl TitledTable {
    pub fn text(&self) -> String {
        let rows = table(&self.header, &self.left, self.rows.clone());
        let note = if self.note.is_empty() { "" } else { "\n" };
        format!("{}\n{rows}{}{note}", self.title, self.note)
    }
}

/// A number with `digits` significant digits, without an exponent where that reads well.
pub fn significant(value: f64, digits: usize) -> String {
    if value == 0.0 {
        return "0".to_owned();
    }
    if !value.is_finite() {
        return value.to_string();
    }
    let exponent = value.abs().log10().floor() as i32;
    if (-4..7).contains(&exponent) {
        let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
        let text = format!("{value:.decimals$}");
        // Rounding up may have added a digit in front: 9.996 -> 10.00.
        let rounded: f64 = text.parse().unwrap_or(value);
        if decimals > 0 && rounded.abs() >= 10f64.powi(exponent + 1) {
            return format!("{value:.*}", decimals - 1);
        }
        text
    } else {
        format!("{value:.*e}", digits - 1)
    }
}

/// A number with its sign and so many decimals; what rounds to zero has none.
pub fn signed(value: f64, decimals: usize) -> String {
    let text = format!("{value:+.decimals$}");
    if text.chars().any(|c| c.is_ascii_digit() && c != '0') {
        text
    } else {
        "0".to_owned()
    }
}

/// A given quantity as it was given: up to `digits` significant digits, none that say nothing.
pub fn given(value: f64, digits: usize) -> String {
    let text = significant(value, digits);
    if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// A numerical error in meV: its order of magnitude is all that matters.
pub fn error_mev(value_ev: f64) -> String {
    let mev = value_ev * 1e3;
    if mev < 1e-5 {
        "<0.00001".to_owned()
    } else {
        format!("{mev:.0e}")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn keeps_the_digits_that_were_asked_for() {
        assert_eq!(significant(8.6123, 4), "8.612");
        assert_eq!(significant(0.06712, 3), "0.0671");
        assert_eq!(significant(9.9996, 4), "10.00");
        assert_eq!(significant(123456.0, 3), "123456");
        assert_eq!(significant(5e17, 3), "5.00e17");
        assert_eq!(given(77.0, 4), "77");
        assert_eq!(given(300.0, 4), "300");
        assert_eq!(given(4.2, 4), "4.2");
    }
}
