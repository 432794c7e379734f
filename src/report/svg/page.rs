//! The sheet that a picture is drawn on.

use super::Width;
use super::palette::{self, INK, Stroke};
use super::text::{self, INDEX_SIZE, Run, escaped, plain, wrapped};
use std::fmt::Write;

/// Sizes of text in points.
pub(super) const TITLE_PT: f64 = 9.0;
pub(super) const LABEL_PT: f64 = 7.0;
pub(super) const SMALL_PT: f64 = 6.5;
/// Distance of lines against the size of the text.
pub(super) const LEADING: f64 = 1.3;
/// Room left at the sides.
pub(super) const MARGIN_PT: f64 = 3.0;
/// Height of a letter above its line, in parts of the size; the middle of digits lies at half of it.
pub(super) const ASCENT: f64 = 0.72;

/// Where a text stands against its anchor.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

/// How a text looks.
#[derive(Clone, Copy, Debug)]
pub(super) struct Style {
    pub size_pt: f64,
    pub anchor: Anchor,
    pub colour: &'static str,
    pub bold: bool,
    /// A rim of paper colour, for text that crosses lines.
    pub halo: bool,
    /// Written upwards.
    pub upright: bool,
}

impl Style {
    pub const fn new(size_pt: f64, anchor: Anchor) -> Style {
        Style {
            size_pt,
            anchor,
            colour: INK,
            bold: false,
            halo: false,
            upright: false,
        }
    }
}

/// A number of points with two decimals at most.
pub(super) fn number(value: f64) -> String {
    let text = format!("{value:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" {
        "0".to_owned()
    } else {
        text.to_owned()
    }
}

/// An SVG picture in the making. y points down, as in the format.
pub(super) struct Page {
    pub width: f64,
    body: String,
}

impl Page {
    pub fn new(width: Width) -> Page {
        Page {
            width: width.points(),
            body: String::new(),
        }
    }

    /// The whole file. `title` and `description` are for readers of the page that do not see it.
    pub fn finish(self, height: f64, title: &str, description: &str) -> String {
        let (w, h) = (number(self.width), number(height));
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{w}pt\" height=\"{h}pt\" viewBox=\"0 0 {w} {h}\" role=\"img\" \
             font-family=\"Helvetica, Arial, sans-serif\">\n<title>{}</title>\n<desc>{}</desc>\n\
             <rect width=\"{w}\" height=\"{h}\" fill=\"#ffffff\"/>\n{}</svg>\n",
            escaped(title),
            escaped(description),
            self.body
        )
    }

    /// Everything drawn by `content` in a group that a reader can find by `class`.
    pub fn group(&mut self, class: &str, content: impl FnOnce(&mut Page)) {
        let _ = writeln!(self.body, "<g class=\"{class}\">");
        content(self);
        self.body.push_str("</g>\n");
    }

    pub fn line(&mut self, [x1, y1]: [f64; 2], [x2, y2]: [f64; 2], stroke: Stroke) {
        let _ = writeln!(
            self.body,
            "<line x1=\"{}\" y1=\"{}\" x2=\"{}\" y2=\"{}\"{}/>",
            number(x1),
            number(y1),
            number(x2),
            number(y2),
            stroke_attributes(stroke)
        );
    }

    pub fn rectangle(&mut self, [x, y]: [f64; 2], [w, h]: [f64; 2], fill: &str) {
        let _ = writeln!(
            self.body,
            "<rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" fill=\"{fill}\"/>",
            number(x),
            number(y),
            number(w),
            number(h)
        );
    }

    /// A line through points, without a fill.
    pub fn polyline(&mut self, points: &[[f64; 2]], stroke: Stroke) {
        self.path(points, "none", None, Some(stroke));
    }

    /// The area inside points, without a rim.
    pub fn area(&mut self, points: &[[f64; 2]], fill: &str) {
        self.path(points, fill, None, None);
    }

    /// A line through points, with what lies between it and the straight line from its first to its last point tinted.
    pub fn tinted(&mut self, points: &[[f64; 2]], tint: f64, stroke: Stroke) {
        self.path(points, stroke.colour, Some(tint), Some(stroke));
    }

    fn path(
        &mut self,
        points: &[[f64; 2]],
        fill: &str,
        fill_opacity: Option<f64>,
        stroke: Option<Stroke>,
    ) {
        let _ = write!(self.body, "<path fill=\"{fill}\"");
        if let Some(opacity) = fill_opacity {
            let _ = write!(self.body, " fill-opacity=\"{}\"", number(opacity));
        }
        if let Some(stroke) = stroke {
            self.body.push_str(&stroke_attributes(stroke));
            self.body.push_str(" stroke-linejoin=\"round\"");
        }
        let _ = writeln!(self.body, " d=\"{}\"/>", path_data(points));
    }

    pub fn text(&mut self, at: [f64; 2], style: Style, text: &str) {
        self.runs(at, style, &plain(text));
    }

    /// Text with indices; `at` is a point of its base line.
    pub fn runs(&mut self, [x, y]: [f64; 2], style: Style, runs: &[Run]) {
        let (x, y) = (number(x), number(y));
        let _ = write!(
            self.body,
            "<text x=\"{x}\" y=\"{y}\" font-size=\"{}\" fill=\"{}\"",
            number(style.size_pt),
            style.colour
        );
        match style.anchor {
            Anchor::Start => {}
            Anchor::Middle => self.body.push_str(" text-anchor=\"middle\""),
            Anchor::End => self.body.push_str(" text-anchor=\"end\""),
        }
        if style.bold {
            self.body.push_str(" font-weight=\"bold\"");
        }
        if style.halo {
            self.body
                .push_str(" stroke=\"#ffffff\" stroke-width=\"2.4\" stroke-linejoin=\"round\" paint-order=\"stroke\"");
        }
        if style.upright {
            let _ = write!(self.body, " transform=\"rotate(-90 {x} {y})\"");
        }
        self.body.push('>');
        let mut lowered = false;
        for run in runs {
            if run.index || lowered {
                let drop = 0.22 * style.size_pt;
                let (dy, size) = if run.index {
                    (if lowered { 0.0 } else { drop }, INDEX_SIZE * style.size_pt)
                } else {
                    (-drop, style.size_pt)
                };
                let _ = write!(
                    self.body,
                    "<tspan dy=\"{}\" font-size=\"{}\">{}</tspan>",
                    number(dy),
                    number(size),
                    escaped(&run.text)
                );
                lowered = run.index;
            } else {
                self.body.push_str(&escaped(&run.text));
            }
        }
        self.body.push_str("</text>\n");
    }

    /// The title in bold at the top; returns the height below it.
    pub fn title(&mut self, title: &str) -> f64 {
        let style = Style {
            bold: true,
            ..Style::new(TITLE_PT, Anchor::Start)
        };
        let width = self.width - 2.0 * MARGIN_PT;
        let mut y = 2.0;
        for line in wrapped(title, TITLE_PT, width, 4) {
            y += TITLE_PT * LEADING;
            self.text([MARGIN_PT, y - 0.2 * TITLE_PT], style, &line);
        }
        y + 4.0
    }

    /// Caption lines from `top` on; returns the height below them.
    pub fn caption(&mut self, sentences: &str, top: f64) -> f64 {
        let style = Style {
            colour: palette::SOFT_INK,
            ..Style::new(SMALL_PT, Anchor::Start)
        };
        let width = self.width - 2.0 * MARGIN_PT;
        let mut y = top;
        for line in wrapped(sentences, SMALL_PT, width, 12) {
            y += SMALL_PT * LEADING;
            self.text([MARGIN_PT, y - 0.2 * SMALL_PT], style, &line);
        }
        y
    }

    /// A small triangle with its tip at a point, pointing up (−1) or down (1).
    pub fn arrow_head(&mut self, [x, y]: [f64; 2], direction: f64, colour: &str) {
        let back = y - direction * 3.6;
        self.area(&[[x, y], [x - 1.5, back], [x + 1.5, back]], colour);
    }
}

/// Width and height of a text that is laid out before it is drawn.
pub(super) fn text_width(text: &str, size_pt: f64) -> f64 {
    text::width_pt(text, size_pt)
}

fn stroke_attributes(stroke: Stroke) -> String {
    let dash = if stroke.dash.is_empty() {
        String::new()
    } else {
        format!(" stroke-dasharray=\"{}\"", stroke.dash)
    };
    format!(
        " stroke=\"{}\" stroke-width=\"{}\"{dash}",
        stroke.colour,
        number(stroke.width_pt)
    )
}

/// Steps from point to point in hundredths of a point, each taken from where the one before has really ended, so that
/// rounding does not add up.
fn path_data(points: &[[f64; 2]]) -> String {
    let rounded = |p: &[f64; 2]| p.map(|v| (100.0 * v).round() as i64);
    let Some(first) = points.first().map(rounded) else {
        return String::new();
    };
    let step = |value: i64| {
        let text = number(value as f64 / 100.0);
        match text.strip_prefix("-0.") {
            Some(rest) => format!("-.{rest}"),
            None => text
                .strip_prefix("0.")
                .map_or(text.clone(), |rest| format!(".{rest}")),
        }
    };
    let mut data = format!(
        "M{} {}l",
        number(first[0] as f64 / 100.0),
        number(first[1] as f64 / 100.0)
    );
    let mut last = first;
    let mut begun = false;
    for point in points[1..].iter().map(rounded) {
        let [dx, dy] = [point[0] - last[0], point[1] - last[1]];
        if dx == 0 && dy == 0 {
            continue;
        }
        let (dx, dy) = (step(dx), step(dy));
        let gap = |text: &str| if text.starts_with('-') { "" } else { " " };
        if begun {
            data.push_str(gap(&dx));
        }
        let _ = write!(data, "{dx}{}{dy}", gap(&dy));
        (last, begun) = (point, true);
    }
    data
}
