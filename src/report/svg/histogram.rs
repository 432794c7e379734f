//! The distribution of a sampled quantity beside its linear estimate, with the window that is wanted.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, left_axis, left_room};
use super::page::{ASCENT, Anchor, LABEL_PT, MARGIN_PT, Page, Style};
use super::palette::{self, BAR, BIN, GUIDE, INK, Stroke};
use super::text::{short, width_pt};
use std::f64::consts::TAU;

/// A normal distribution.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gaussian {
    pub mean: f64,
    /// More than 0.
    pub standard_deviation: f64,
}

/// The values that are wanted, and the share of the samples that lie there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Window {
    /// The lower and the upper limit, in the unit of the quantity.
    pub between: [f64; 2],
    /// From 0 to 1.
    pub share: f64,
    /// The confidence interval of the share.
    pub share_interval: [f64; 2],
}

/// A picture of a distribution.
#[derive(Clone, Debug, PartialEq)]
pub struct YieldHistogram {
    pub title: String,
    /// What was sampled, such as `Wavelength`.
    pub quantity: String,
    /// Its unit, such as `µm`.
    pub unit: String,
    pub caption: String,
    /// Borders of the bins, ascending: one more than there are counts.
    pub borders: Vec<f64>,
    pub counts: Vec<u64>,
    /// The linear estimate, in the unit of the quantity.
    pub linear: Option<Gaussian>,
    pub window: Option<Window>,
}

/// Points of the normal curve.
const CURVE_POINTS: usize = 161;
/// The panel reaches beyond the samples by at most this part of their range to show the window.
const WIDEST: f64 = 0.5;
const HATCH_STEP_PT: f64 = 4.5;
const LINEAR: Stroke = Stroke {
    colour: palette::STATES[2],
    width_pt: 1.1,
    dash: "4 1.8",
};
const HATCH: Stroke = Stroke::solid(GUIDE, 0.35);
const LIMIT: Stroke = Stroke {
    colour: INK,
    width_pt: 0.7,
    dash: "2 1.5",
};

impl YieldHistogram {
    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let height = match width {
            Width::Column => 120.0,
            Width::Page => 160.0,
        };
        let vertical = Scale {
            domain: [0.0, self.highest()],
            range: [height, 0.0],
        };
        let left = MARGIN_PT + left_room(vertical);
        let horizontal = Scale {
            domain: self.domain(),
            range: [left, page.width - MARGIN_PT - 12.0],
        };
        let mut top = page.title(&self.title);
        top = self.legend(&mut page, top, left) + 3.0;
        let vertical = Scale {
            range: vertical.range.map(|y| y + top),
            ..vertical
        };
        let bottom = top + height;
        let bins: Vec<[[f64; 2]; 2]> = self
            .borders
            .windows(2)
            .zip(&self.counts)
            .map(|(borders, count)| {
                let y = vertical.at(*count as f64);
                [
                    [horizontal.at(borders[0]), y],
                    [horizontal.at(borders[1]), y],
                ]
            })
            .collect();
        let mut outline: Vec<[f64; 2]> = bins.concat();
        if let (Some(first), Some(last)) = (outline.first().copied(), outline.last().copied()) {
            outline.insert(0, [first[0], bottom]);
            outline.push([last[0], bottom]);
        }
        page.group("bins", |page| page.area(&outline, BIN));
        if let Some(window) = &self.window {
            let [low, high] = horizontal.domain;
            let inside = window
                .between
                .map(|value| horizontal.at(value.clamp(low, high)));
            page.group("window", |page| {
                hatch(page, inside, [top, bottom]);
                for (value, x) in window.between.iter().zip(inside) {
                    if (low..=high).contains(value) {
                        page.line([x, top], [x, bottom], LIMIT);
                    }
                }
            });
        }
        page.group("outline", |page| {
            page.polyline(&outline, Stroke::solid(BAR, 0.7));
        });
        if let Some(normal) = self.linear {
            let [low, high] = horizontal.domain;
            let curve: Vec<[f64; 2]> = (0..CURVE_POINTS)
                .map(|k| low + (high - low) * k as f64 / (CURVE_POINTS - 1) as f64)
                .map(|x| [horizontal.at(x), vertical.at(self.expected(normal, x))])
                .collect();
            page.group("linear", |page| page.polyline(&curve, LINEAR));
        }
        left_axis(&mut page, vertical, left, "Wafers");
        let name = format!("{} ({})", self.quantity, self.unit);
        bottom_axis(&mut page, horizontal, bottom, &name);
        let y = page.caption(&self.caption, bottom + BOTTOM_ROOM);
        page.finish(y + 4.0, &self.title, &self.words().join("; "))
    }

    /// Wafers that a normal distribution would put into a bin of the mean width around `x`.
    fn expected(&self, normal: Gaussian, x: f64) -> f64 {
        let total: u64 = self.counts.iter().sum();
        let span = match (self.borders.first(), self.borders.last()) {
            (Some(first), Some(last)) => last - first,
            _ => 0.0,
        };
        let bin = span / self.counts.len().max(1) as f64;
        let distance = (x - normal.mean) / normal.standard_deviation;
        total as f64 * bin * (-0.5 * distance * distance).exp()
            / (TAU.sqrt() * normal.standard_deviation)
    }

    /// The upper end of the axis of counts.
    fn highest(&self) -> f64 {
        let counted = self.counts.iter().copied().max().unwrap_or(0) as f64;
        let estimated = self
            .linear
            .map_or(0.0, |normal| self.expected(normal, normal.mean));
        1.08 * counted.max(estimated).max(1.0)
    }

    /// The samples and, unless it is far wider, the window.
    fn domain(&self) -> [f64; 2] {
        let (low, high) = match (self.borders.first(), self.borders.last()) {
            (Some(low), Some(high)) if high > low => (*low, *high),
            _ => (0.0, 1.0),
        };
        let most = WIDEST * (high - low);
        match &self.window {
            Some(Window {
                between: [from, to],
                ..
            }) => {
                let rim = 0.03 * (high - low);
                [
                    low.min((from - rim).max(low - most)),
                    high.max((to + rim).min(high + most)),
                ]
            }
            None => [low, high],
        }
    }

    /// What is drawn, in words.
    fn words(&self) -> Vec<String> {
        let total: u64 = self.counts.iter().sum();
        let mut words = vec![format!("{total} sampled wafers")];
        if let Some(normal) = self.linear {
            words.push(format!(
                "linear estimate, standard deviation {} {}",
                short(normal.standard_deviation, 3),
                self.unit
            ));
        }
        if let Some(window) = &self.window {
            words.push(format!(
                "wanted, {} to {} {}: {:.1} % inside ({:.1} to {:.1} %)",
                short(window.between[0], 5),
                short(window.between[1], 5),
                self.unit,
                100.0 * window.share,
                100.0 * window.share_interval[0],
                100.0 * window.share_interval[1]
            ));
        }
        words
    }

    /// Samples of the three looks with their words, wrapped; returns the height below them.
    fn legend(&self, page: &mut Page, top: f64, left: f64) -> f64 {
        const SAMPLE: [f64; 2] = [14.0, 6.0];
        let line = LABEL_PT * 1.5;
        let (mut x, mut y) = (left, top);
        let words = self.words();
        page.group("legend", |page| {
            for (k, text) in words.iter().enumerate() {
                let width = SAMPLE[0] + 4.0 + width_pt(text, LABEL_PT);
                if x > left && x + width > page.width - MARGIN_PT {
                    (x, y) = (left, y + line);
                }
                let middle = y + 0.5 * line;
                let (near, far) = (x, x + SAMPLE[0]);
                let (above, below) = (middle - 0.5 * SAMPLE[1], middle + 0.5 * SAMPLE[1]);
                if k == 0 {
                    page.rectangle([near, above], SAMPLE, BIN);
                    page.polyline(
                        &[[near, below], [near, above], [far, above], [far, below]],
                        Stroke::solid(BAR, 0.7),
                    );
                } else if k == 1 && self.linear.is_some() {
                    page.line([near, middle], [far, middle], LINEAR);
                } else {
                    hatch(page, [near, far], [above, below]);
                    for x in [near, far] {
                        page.line([x, above], [x, below], LIMIT);
                    }
                }
                page.text(
                    [far + 4.0, middle + 0.5 * ASCENT * LABEL_PT],
                    Style::new(LABEL_PT, Anchor::Start),
                    text,
                );
                x += width + 14.0;
            }
        });
        y + line
    }
}

/// Lines at 45 degrees across a rectangle.
fn hatch(page: &mut Page, [left, right]: [f64; 2], [top, bottom]: [f64; 2]) {
    let (w, h) = (right - left, bottom - top);
    let mut offset = 0.5 * HATCH_STEP_PT;
    while offset < w + h {
        // The line x − left + bottom − y = offset.
        let start = [left + (offset - h).max(0.0), bottom - offset.min(h)];
        let end = [left + offset.min(w), bottom - (offset - w).max(0.0)];
        page.line(start, end, HATCH);
        offset += HATCH_STEP_PT;
    }
}
