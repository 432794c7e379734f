//! A curve over energy with marked places, its heights linear or by decades.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, left_axis, left_room};
use super::page::{ASCENT, Anchor, LABEL_PT, MARGIN_PT, Page, SMALL_PT, Style};
use super::palette::{GUIDE, INK, STATES, Stroke};
use super::spread::spread;
use super::text::width_pt;
use crate::numerics::polyline::simplified;

/// A picture of one curve.
#[derive(Clone, Debug)]
pub struct Spectrum {
    pub title: String,
    pub caption: String,
    /// Names of the axes.
    pub across: String,
    pub up: String,
    /// The least height that is drawn on an axis of decades up to 1; `None` for a linear axis from 0.
    pub lowest: Option<f64>,
    /// Ascending in the first number.
    pub points: Vec<[f64; 2]>,
    pub marks: Vec<SpectrumMark>,
}

/// A place on the energy axis.
#[derive(Clone, Debug)]
pub struct SpectrumMark {
    pub x: f64,
    pub label: String,
}

const PANEL_PT: f64 = 210.0;
const LINE_PT: f64 = 1.1;
/// A deviation of the line that is not seen.
const INVISIBLE_PT: f64 = 0.03;
/// Room above the panel for the labels of marks.
const MARK_PT: f64 = 16.0;
const MARK: Stroke = Stroke {
    colour: GUIDE,
    width_pt: 0.5,
    dash: "1.4 1.6",
};
const TICK_PT: f64 = 3.0;
/// Decades have room for their number when they are this far apart.
const DECADE_PT: f64 = 14.0;

impl Spectrum {
    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let top = page.title(&self.title) + MARK_PT;
        let bottom = top + PANEL_PT;
        let height = |y: f64| match self.lowest {
            Some(lowest) => y.max(lowest).log10(),
            None => y,
        };
        let highest = self.points.iter().map(|p| p[1]).fold(0.0, f64::max);
        let domain = match self.lowest {
            Some(lowest) => {
                let least = self.points.iter().map(|p| p[1]).fold(1.0, f64::min);
                [least.max(lowest).log10().floor().min(-1.0), 0.0]
            }
            None => [0.0, 1.06 * highest.max(1e-9)],
        };
        let vertical = Scale {
            domain,
            range: [bottom, top],
        };
        let left = MARGIN_PT
            + match self.lowest {
                Some(_) => decade_room(domain),
                None => left_room(vertical),
            };
        let right = page.width - MARGIN_PT - 4.0;
        let low = self.points.first().map_or(0.0, |p| p[0]);
        let high = self.points.last().map_or(1.0, |p| p[0]).max(low + 1e-9);
        let across = Scale {
            domain: [low, high],
            range: [left, right],
        };
        match self.lowest {
            Some(_) => decade_axis(&mut page, vertical, left, &self.up),
            None => left_axis(&mut page, vertical, left, &self.up),
        }
        self.draw_marks(&mut page, across, [top, bottom]);
        let points: Vec<[f64; 2]> = self
            .points
            .iter()
            .map(|[x, y]| [across.at(*x), vertical.at(height(*y))])
            .collect();
        page.group("curve", |page| {
            page.polyline(
                &simplified(&points, INVISIBLE_PT),
                Stroke::solid(STATES[0], LINE_PT),
            );
        });
        bottom_axis(&mut page, across, bottom, &self.across);
        let y = page.caption(&self.caption, bottom + BOTTOM_ROOM);
        page.finish(y + 4.0, &self.title, &self.caption)
    }

    fn draw_marks(&self, page: &mut Page, across: Scale, [top, bottom]: [f64; 2]) {
        let [left, right] = across.range;
        let inside: Vec<&SpectrumMark> = self
            .marks
            .iter()
            .filter(|mark| mark.x >= across.domain[0] && mark.x <= across.domain[1])
            .collect();
        let wanted: Vec<f64> = inside.iter().map(|mark| across.at(mark.x)).collect();
        let sizes: Vec<f64> = inside
            .iter()
            .map(|mark| width_pt(&mark.label, SMALL_PT) + 3.0)
            .collect();
        // More labels than there is room for would run over one another.
        if sizes.iter().sum::<f64>() > right - left {
            return;
        }
        page.group("marks", |page| {
            let places = spread(&wanted, &sizes, left, right);
            for ((mark, x), place) in inside.iter().zip(&wanted).zip(places) {
                page.line([*x, top], [*x, bottom], MARK);
                page.line([*x, top], [place, top - 6.0], Stroke::solid(GUIDE, 0.4));
                page.text(
                    [place, top - 7.5],
                    Style::new(SMALL_PT, Anchor::Middle),
                    &mark.label,
                );
            }
        });
    }
}

/// 10 to a whole power.
fn decade(power: i32) -> String {
    if power == 0 {
        return "1".to_owned();
    }
    let raised = |c: char| match c {
        '-' => '⁻',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        '0' => '⁰',
        digit => char::from_u32(0x2070 + digit.to_digit(10).unwrap_or(0)).unwrap_or(digit),
    };
    format!(
        "10{}",
        power.to_string().chars().map(raised).collect::<String>()
    )
}

fn decade_room([low, _]: [f64; 2]) -> f64 {
    TICK_PT + 1.5 + width_pt(&decade(low as i32), LABEL_PT) + 2.0 + LABEL_PT * 1.2
}

/// A vertical axis whose scale runs over powers of ten.
fn decade_axis(page: &mut Page, scale: Scale, x: f64, name: &str) {
    const AXIS: Stroke = Stroke::solid(INK, 0.6);
    let [low, high] = scale.domain.map(|power| power.round() as i32);
    let room = (scale.at(f64::from(low)) - scale.at(f64::from(high))) / f64::from(high - low);
    let every = (DECADE_PT / room).ceil().max(1.0) as i32;
    page.group("axis-y", |page| {
        page.line([x, scale.range[0]], [x, scale.range[1]], AXIS);
        for power in low..=high {
            let y = scale.at(f64::from(power));
            let numbered = power % every == 0;
            let tick = if numbered { TICK_PT } else { 0.5 * TICK_PT };
            page.line([x - tick, y], [x, y], AXIS);
            if numbered {
                page.text(
                    [x - TICK_PT - 1.5, y + 0.5 * ASCENT * LABEL_PT],
                    Style::new(LABEL_PT, Anchor::End),
                    &decade(power),
                );
            }
        }
        let style = Style {
            upright: true,
            ..Style::new(LABEL_PT, Anchor::Middle)
        };
        let middle = 0.5 * (scale.range[0] + scale.range[1]);
        page.text(
            [
                x - decade_room(scale.domain) + ASCENT * LABEL_PT + 1.0,
                middle,
            ],
            style,
            name,
        );
    });
}
