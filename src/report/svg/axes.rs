//! Linear axes with round numbers at their ticks.

use super::page::{ASCENT, Anchor, LABEL_PT, Page, Style};
use super::palette::{INK, Stroke};
use super::text::{minus, width_pt};

const AXIS: Stroke = Stroke::solid(INK, 0.6);
const TICK_PT: f64 = 3.0;

/// From values to points of the page.
#[derive(Clone, Copy, Debug)]
pub(super) struct Scale {
    pub domain: [f64; 2],
    pub range: [f64; 2],
}

impl Scale {
    pub fn at(&self, value: f64) -> f64 {
        let [a, b] = self.domain;
        let [low, high] = self.range;
        low + (value - a) / (b - a) * (high - low)
    }

    /// Ticks at least `spacing` points apart.
    fn ticks(&self, spacing: f64) -> Ticks {
        let length = (self.range[1] - self.range[0]).abs();
        ticks(self.domain, (length / spacing).max(1.0))
    }
}

/// Values with the text that stands at them.
pub(super) struct Ticks {
    pub values: Vec<f64>,
    decimals: usize,
}

impl Ticks {
    pub fn label(&self, value: f64) -> String {
        // Zero may carry a rounding error, and then a sign.
        minus(&format!("{:.*}", self.decimals, value + 0.0)).replacen(
            &format!("−{:.*}", self.decimals, 0.0),
            &format!("{:.*}", self.decimals, 0.0),
            1,
        )
    }
}

/// Multiples of 1, 2 or 5 times a power of ten inside a domain, at most about `most` of them.
pub(super) fn ticks([low, high]: [f64; 2], most: f64) -> Ticks {
    let raw = (high - low) / most;
    let power = 10f64.powf(raw.log10().floor());
    let step = [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .map(|m| m * power)
        .find(|step| *step >= raw * (1.0 - 1e-9))
        .unwrap_or(10.0 * power);
    let first = (low / step - 1e-9).ceil();
    let count = ((high / step + 1e-9).floor() - first).clamp(-1.0, 1000.0) as i64;
    Ticks {
        values: (0..=count).map(|k| (first + k as f64) * step).collect(),
        decimals: (-(step * 1.000_001).log10().floor()).clamp(0.0, 12.0) as usize,
    }
}

/// A vertical axis at the left of a panel; returns nothing, since its room was set aside by [`left_room`].
pub(super) fn left_axis(page: &mut Page, scale: Scale, x: f64, name: &str) {
    let ticks = scale.ticks(28.0);
    page.group("axis-y", |page| {
        page.line([x, scale.range[0]], [x, scale.range[1]], AXIS);
        for &value in &ticks.values {
            let y = scale.at(value);
            page.line([x - TICK_PT, y], [x, y], AXIS);
            page.text(
                [x - TICK_PT - 1.5, y + 0.5 * ASCENT * LABEL_PT],
                Style::new(LABEL_PT, Anchor::End),
                &ticks.label(value),
            );
        }
        let style = Style {
            upright: true,
            ..Style::new(LABEL_PT, Anchor::Middle)
        };
        let middle = 0.5 * (scale.range[0] + scale.range[1]);
        page.text(
            [x - left_room(scale) + ASCENT * LABEL_PT + 1.0, middle],
            style,
            name,
        );
    });
}

/// Two slanted strokes across a vertical line between two axes that do not join.
pub(super) fn break_marks(page: &mut Page, x: f64, upper_end: f64, lower_end: f64) {
    const HALF_PT: f64 = 3.0;
    page.group("break", |page| {
        for y in [upper_end + 2.0, lower_end - 2.0] {
            page.line([x - HALF_PT, y + 1.5], [x + HALF_PT, y - 1.5], AXIS);
        }
    });
}

/// How much a left axis needs: its name, its numbers and its ticks.
pub(super) fn left_room(scale: Scale) -> f64 {
    let ticks = scale.ticks(28.0);
    let widest = ticks
        .values
        .iter()
        .map(|v| width_pt(&ticks.label(*v), LABEL_PT))
        .fold(0.0, f64::max);
    TICK_PT + 1.5 + widest + 2.0 + LABEL_PT * 1.2
}

/// Height below the panel that a bottom axis needs.
pub(super) const BOTTOM_ROOM: f64 = TICK_PT + 2.0 * LABEL_PT * 1.3 + 3.0;

/// A horizontal axis below a panel.
pub(super) fn bottom_axis(page: &mut Page, scale: Scale, y: f64, name: &str) {
    let ticks = roomy_ticks(scale);
    page.group("axis-x", |page| {
        page.line([scale.range[0], y], [scale.range[1], y], AXIS);
        for &value in &ticks.values {
            let x = scale.at(value);
            page.line([x, y], [x, y + TICK_PT], AXIS);
            page.text(
                [x, y + TICK_PT + 1.0 + LABEL_PT],
                Style::new(LABEL_PT, Anchor::Middle),
                &ticks.label(value),
            );
        }
        let middle = 0.5 * (scale.range[0] + scale.range[1]);
        page.text(
            [middle, y + TICK_PT + 1.0 + LABEL_PT * 2.3],
            Style::new(LABEL_PT, Anchor::Middle),
            name,
        );
    });
}

/// Ticks whose numbers have room beside one another; on a short axis nearer ones, so that there are at least two.
fn roomy_ticks(scale: Scale) -> Ticks {
    let has_room = |ticks: &Ticks| {
        let widest = ticks
            .values
            .iter()
            .map(|v| width_pt(&ticks.label(*v), LABEL_PT))
            .fold(0.0, f64::max);
        ticks.values.len() >= 2
            && scale.at(ticks.values[1]) - scale.at(ticks.values[0]) >= widest + 2.0
    };
    [34.0, 24.0, 17.0, 12.0, 48.0, 68.0]
        .into_iter()
        .map(|spacing| scale.ticks(spacing))
        .find(has_room)
        .unwrap_or_else(|| scale.ticks(100.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_numbers_inside() {
        let t = ticks([-3.0, 287.0], 6.0);
        assert_eq!(t.values, [0.0, 50.0, 100.0, 150.0, 200.0, 250.0]);
        let t = ticks([0.12, 0.31], 5.0);
        let labels: Vec<String> = t.values.iter().map(|v| t.label(*v)).collect();
        assert_eq!(labels, ["0.15", "0.20", "0.25", "0.30"]);
        let t = ticks([-1.0, 1.0], 5.0);
        let labels: Vec<String> = t.values.iter().map(|v| t.label(*v)).collect();
        assert_eq!(labels, ["−1.0", "−0.5", "0.0", "0.5", "1.0"]);
    }
}
