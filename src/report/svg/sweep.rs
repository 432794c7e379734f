//! Levels or transition energies against a swept number, lines named at their ends.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, left_axis, left_room};
use super::page::{ASCENT, Anchor, MARGIN_PT, Page, SMALL_PT, Style};
use super::palette::{self, Stroke};
use super::spread::spread;
use super::text::width_pt;

/// A picture of a sweep.
#[derive(Clone, Debug)]
pub struct SweepPicture {
    pub title: String,
    pub caption: String,
    /// Under the horizontal axis.
    pub axis: String,
    /// The ends of the horizontal axis.
    pub range: [f64; 2],
    /// One above the other.
    pub panels: Vec<SweepPanel>,
}

/// Lines with an energy axis of their own.
#[derive(Clone, Debug)]
pub struct SweepPanel {
    /// Beside the vertical axis.
    pub axis: String,
    pub lines: Vec<SweepLine>,
    /// Least gaps: place and both energies.
    pub gaps: Vec<(f64, [f64; 2])>,
}

/// One line.
#[derive(Clone, Debug)]
pub struct SweepLine {
    /// Which of the line styles.
    pub style: usize,
    /// May have several lines.
    pub name: String,
    /// Pieces without a break, each from left to right.
    pub pieces: Vec<Vec<[f64; 2]>>,
}

const PANEL_PT: f64 = 210.0;
const GAP_PT: f64 = 14.0;
const LINE_PT: f64 = 1.1;

impl SweepPicture {
    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let mut top = page.title(&self.title) + 6.0;
        let lines = || self.panels.iter().flat_map(|panel| &panel.lines);
        let widest = lines()
            .flat_map(|line| line.name.lines())
            .map(|name| width_pt(name, SMALL_PT))
            .fold(0.0, f64::max);
        let right = page.width - MARGIN_PT - widest - 14.0;
        let left = self
            .panels
            .iter()
            .map(|panel| left_room(panel.scale(0.0, PANEL_PT)))
            .fold(0.0, f64::max);
        let across = Scale {
            domain: self.range,
            range: [MARGIN_PT + left, right],
        };
        let mut bottom = top;
        for panel in &self.panels {
            bottom = top + PANEL_PT;
            panel.draw(&mut page, across, top, bottom);
            bottom_axis(&mut page, across, bottom, &self.axis);
            top = bottom + BOTTOM_ROOM + GAP_PT;
        }
        let y = page.caption(&self.caption, bottom + BOTTOM_ROOM + 4.0);
        let names: Vec<String> = lines().map(|line| line.name.replace('\n', " ")).collect();
        page.finish(y + 4.0, &self.title, &names.join("; "))
    }
}

impl SweepPanel {
    fn scale(&self, top: f64, bottom: f64) -> Scale {
        let points = || self.lines.iter().flat_map(|l| &l.pieces).flatten();
        let low = points().map(|p| p[1]).fold(f64::INFINITY, f64::min);
        let high = points().map(|p| p[1]).fold(f64::NEG_INFINITY, f64::max);
        let (low, high) = match low.is_finite() && high.is_finite() {
            true => (low, high),
            false => (0.0, 1.0),
        };
        let spare = 0.06 * (high - low).max(1.0);
        Scale {
            domain: [low - spare, high + spare],
            range: [bottom, top],
        }
    }

    fn draw(&self, page: &mut Page, across: Scale, top: f64, bottom: f64) {
        let vertical = self.scale(top, bottom);
        let [left, right] = across.range;
        left_axis(page, vertical, left, &self.axis);
        for &(at, [a, b]) in &self.gaps {
            let x = across.at(at);
            let ends = [vertical.at(a), vertical.at(b)];
            page.line([x, ends[0]], [x, ends[1]], Stroke::solid(palette::INK, 0.5));
        }
        for line in &self.lines {
            for piece in &line.pieces {
                let points: Vec<[f64; 2]> = piece
                    .iter()
                    .map(|[x, y]| [across.at(*x), vertical.at(*y)])
                    .collect();
                page.polyline(&points, palette::state(line.style, LINE_PT));
            }
        }
        let mut labels: Vec<(f64, f64, &str)> = Vec::new();
        for line in &self.lines {
            let last = line.pieces.iter().filter_map(|piece| piece.last());
            if let Some([x, y]) = last.max_by(|a, b| a[0].total_cmp(&b[0])) {
                labels.push((across.at(*x), vertical.at(*y), &line.name));
            }
        }
        labels.sort_by(|a, b| a.1.total_cmp(&b.1));
        let ends: Vec<f64> = labels.iter().map(|(_, y, _)| *y).collect();
        let height = |name: &str| name.lines().count() as f64 * SMALL_PT * 1.25;
        let sizes: Vec<f64> = labels.iter().map(|(.., name)| height(name)).collect();
        for ((x, end, name), y) in labels.iter().zip(spread(&ends, &sizes, top, bottom)) {
            page.line(
                [x + 1.0, *end],
                [right + 9.0, y],
                Stroke::solid(palette::GUIDE, 0.4),
            );
            let first = y - 0.5 * (height(name) - SMALL_PT * 1.25);
            for (k, line) in name.lines().enumerate() {
                let y = first + k as f64 * SMALL_PT * 1.25;
                page.text(
                    [right + 11.0, y + 0.5 * ASCENT * SMALL_PT],
                    Style::new(SMALL_PT, Anchor::Start),
                    line,
                );
            }
        }
    }
}
