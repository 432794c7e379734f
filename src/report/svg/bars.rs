//! Horizontal bars: how much one quantity changes with each of several causes.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis};
use super::page::{ASCENT, Anchor, LABEL_PT, MARGIN_PT, Page, SMALL_PT, Style};
use super::palette::{BAR, BAR_LIGHT, INK, SOFT_INK, Stroke};
use super::text::{short, shortened, width_pt};

/// One cause and its effect.
#[derive(Clone, Debug, PartialEq)]
pub struct SensitivityBar {
    /// What changes, such as `width of well`.
    pub name: String,
    /// By how much, such as `1 ML`.
    pub unit: String,
    /// The change of the quantity that follows, in meV.
    pub change_mev: f64,
}

/// A picture of sensitivities.
#[derive(Clone, Debug, PartialEq)]
pub struct SensitivityBars {
    pub title: String,
    /// What changes, such as `conduction 1 to 2`: the name of the axis.
    pub quantity: String,
    pub caption: String,
    /// In any order; the largest is drawn first.
    pub bars: Vec<SensitivityBar>,
}

const ROW_PT: f64 = 12.5;
const BAR_PT: f64 = 7.5;
/// Bars beyond this number are told in the caption only.
const MOST: usize = 40;

impl SensitivityBars {
    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let mut bars: Vec<&SensitivityBar> = self
            .bars
            .iter()
            .filter(|bar| bar.change_mev.is_finite())
            .collect();
        bars.sort_by(|a, b| b.change_mev.abs().total_cmp(&a.change_mev.abs()));
        let left_out = bars.len().saturating_sub(MOST);
        bars.truncate(MOST);

        let (longest_name, longest_unit) = match width {
            Width::Column => (76.0, 30.0),
            Width::Page => (150.0, 60.0),
        };
        let names: Vec<String> = bars
            .iter()
            .map(|bar| shortened(&bar.name, LABEL_PT, longest_name))
            .collect();
        let units: Vec<String> = bars
            .iter()
            .map(|bar| shortened(&bar.unit, SMALL_PT, longest_unit))
            .collect();
        let values: Vec<String> = bars.iter().map(|bar| signed(bar.change_mev)).collect();
        let widest = |texts: &[String], size| {
            texts
                .iter()
                .map(|text| width_pt(text, size))
                .fold(0.0, f64::max)
        };
        let names_right = MARGIN_PT + widest(&names, LABEL_PT);
        let units_left = names_right + 8.0;
        let left = units_left + widest(&units, SMALL_PT) + 8.0;

        let lowest = bars.iter().fold(0.0, |a: f64, bar| a.min(bar.change_mev));
        let highest = bars.iter().fold(0.0, |a: f64, bar| a.max(bar.change_mev));
        let values_room = widest(&values, SMALL_PT) + 4.0;
        let room = |needed: bool| if needed { values_room } else { 4.0 };
        let scale = Scale {
            domain: if highest > lowest {
                [lowest, highest]
            } else {
                [-1.0, 1.0]
            },
            range: [
                left + room(lowest < 0.0),
                page.width - MARGIN_PT - room(highest > 0.0),
            ],
        };
        let top = page.title(&self.title) + 2.0;
        let bottom = top + ROW_PT * bars.len() as f64 + 3.0;
        page.group("bars", |page| {
            for (row, bar) in bars.iter().enumerate() {
                let middle = top + ROW_PT * (row as f64 + 0.5);
                let (from, to) = (scale.at(0.0), scale.at(bar.change_mev));
                let (fill, anchor, beside) = if bar.change_mev < 0.0 {
                    (BAR_LIGHT, Anchor::End, to - 3.0)
                } else {
                    (BAR, Anchor::Start, to + 3.0)
                };
                let corners = [
                    [from, middle - 0.5 * BAR_PT],
                    [to, middle - 0.5 * BAR_PT],
                    [to, middle + 0.5 * BAR_PT],
                    [from, middle + 0.5 * BAR_PT],
                ];
                page.area(&corners, fill);
                page.polyline(&corners, Stroke::solid(BAR, 0.5));
                let line = |size: f64| middle + 0.5 * ASCENT * size;
                let name = Style::new(LABEL_PT, Anchor::End);
                page.text([names_right, line(LABEL_PT)], name, &names[row]);
                let small = Style::new(SMALL_PT, Anchor::Start);
                let unit = Style {
                    colour: SOFT_INK,
                    ..small
                };
                page.text([units_left, line(LABEL_PT)], unit, &units[row]);
                let value = Style { anchor, ..small };
                page.text([beside, line(SMALL_PT)], value, &values[row]);
            }
        });
        let zero = scale.at(0.0);
        page.line([zero, top - 1.0], [zero, bottom], Stroke::solid(INK, 0.6));
        bottom_axis(
            &mut page,
            scale,
            bottom,
            &format!("Change of {} (meV)", self.quantity),
        );
        let mut caption = self.caption.clone();
        if left_out > 0 {
            caption += &format!(" {left_out} smaller ones are not drawn.");
        }
        let y = page.caption(&caption, bottom + BOTTOM_ROOM);
        let list: Vec<String> = bars
            .iter()
            .zip(&values)
            .map(|(bar, value)| format!("{}, {}: {value} meV", bar.name, bar.unit))
            .collect();
        page.finish(y + 4.0, &self.title, &list.join("; "))
    }
}

/// Three significant digits with a sign.
fn signed(value: f64) -> String {
    let text = short(value, 3);
    if value > 0.0 {
        format!("+{text}")
    } else {
        text
    }
}
