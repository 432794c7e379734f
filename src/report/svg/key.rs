//! A key of numbered entries below a picture, in columns.

use super::page::{Anchor, LEADING, MARGIN_PT, Page, SMALL_PT, Style};
use super::text::{Run, plain, runs_width_pt};

/// Entries that are listed; a stack of hundreds of different layers does not fit a page.
const MOST: usize = 72;
const GAP_PT: f64 = 10.0;

/// One entry: the number, and what it stands for.
pub(super) struct Entry {
    pub number: usize,
    pub meaning: Vec<Run>,
}

/// Draws the entries from `top` on, column after column; returns the height below them.
pub(super) fn draw(page: &mut Page, entries: &[Entry], top: f64) -> f64 {
    let Some(last) = entries.last() else {
        return top;
    };
    let shown = &entries[..entries.len().min(MOST)];
    let indent = super::text::width_pt(&last.number.to_string(), SMALL_PT) + 4.0;
    let widest = shown
        .iter()
        .map(|entry| indent + runs_width_pt(&entry.meaning, SMALL_PT))
        .fold(0.0, f64::max);
    let room = page.width - 2.0 * MARGIN_PT;
    let columns = (((room + GAP_PT) / (widest + GAP_PT)).floor() as usize)
        .clamp(1, shown.len())
        .min(4);
    let rows = shown.len().div_ceil(columns);
    let line = SMALL_PT * LEADING;
    let style = Style::new(SMALL_PT, Anchor::Start);
    page.group("key", |page| {
        for (k, entry) in shown.iter().enumerate() {
            let x = MARGIN_PT + (k / rows) as f64 * (room + GAP_PT) / columns as f64;
            let y = top + line * (1 + k % rows) as f64;
            let number = Style {
                anchor: Anchor::End,
                bold: true,
                ..style
            };
            page.text([x + indent - 4.0, y], number, &entry.number.to_string());
            page.runs([x + indent, y], style, &entry.meaning);
        }
    });
    let mut bottom = top + line * rows as f64;
    if shown.len() < entries.len() {
        bottom += line;
        let rest = format!(
            "and {} more layers, as in the structure file",
            entries.len() - shown.len()
        );
        page.runs([MARGIN_PT + indent, bottom], style, &plain(rest));
    }
    bottom + 4.0
}
