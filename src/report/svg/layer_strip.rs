//! The layers' names along the top of a band diagram.

use super::axes::Scale;
use super::page::{ASCENT, Anchor, Page, SMALL_PT, Style};
use super::palette::{GUIDE, INK, SOFT_INK, Stroke};
use super::spread::spread;
use super::text::{Run, runs_width_pt, width_pt};
use std::collections::BTreeSet;

const ROW_PT: f64 = 11.0;
const LEADER_PT: f64 = 5.0;
const NUMBER_ROW_PT: f64 = 9.0;
/// Interfaces closer than this are not marked in the strip.
const CLOSEST_PT: f64 = 1.5;
/// Room beside a text in the strip.
const SIDE_PT: f64 = 1.5;

/// One layer of the stack as the strip knows it.
#[derive(Clone, Debug)]
pub(super) struct StripLayer {
    pub bottom_nm: f64,
    pub top_nm: f64,
    /// The file's layer, counted from 1, which all copies of a repeat share.
    pub number: usize,
    pub name: Vec<Run>,
    /// Whether no copy of the same layer stands below.
    pub first: bool,
}

/// Which layer carries which text, and where.
pub(super) struct LayerStrip {
    scale: Scale,
    faces: Vec<f64>,
    in_place: Vec<(f64, Vec<Run>)>,
    /// Numbers above narrow layers: the layer's middle, the place of the number, the number.
    led: Vec<[f64; 2]>,
    numbers: Vec<String>,
    /// The numbers of layers that stand for a name.
    pub keyed: BTreeSet<usize>,
}

impl LayerStrip {
    /// A name where it fits, else the layer's number; where that does not fit either, above the strip with a leader
    /// line. When there are too many of those, only the lowest copy of each layer has one, and then every second,
    /// fifth, tenth and so on.
    pub fn new(layers: &[StripLayer], scale: Scale) -> LayerStrip {
        let mut strip = LayerStrip {
            scale,
            faces: layers
                .iter()
                .skip(1)
                .map(|l| scale.at(l.bottom_nm))
                .collect(),
            in_place: Vec::new(),
            led: Vec::new(),
            numbers: Vec::new(),
            keyed: BTreeSet::new(),
        };
        let mut narrow: Vec<&StripLayer> = Vec::new();
        for layer in layers {
            let (left, right) = (scale.at(layer.bottom_nm), scale.at(layer.top_nm));
            let room = right - left - 2.0 * SIDE_PT;
            let number = super::text::plain(layer.number.to_string());
            let middle = 0.5 * (left + right);
            if runs_width_pt(&layer.name, SMALL_PT) <= room {
                strip.in_place.push((middle, layer.name.clone()));
                continue;
            }
            strip.keyed.insert(layer.number);
            if runs_width_pt(&number, SMALL_PT) <= room {
                strip.in_place.push((middle, number));
            } else {
                narrow.push(layer);
            }
        }
        let width = |layer: &&StripLayer| width_pt(&layer.number.to_string(), SMALL_PT) + 2.0;
        let room = scale.range[1] - scale.range[0];
        let fits = |list: &[&StripLayer]| list.iter().map(width).sum::<f64>() <= room;
        if !fits(&narrow) {
            narrow.retain(|layer| layer.first);
        }
        let all = narrow.clone();
        for step in [2, 5, 10, 20, 50, 100, 1000, 10_000] {
            if fits(&narrow) {
                break;
            }
            narrow = all.iter().copied().step_by(step).collect();
        }
        let wanted: Vec<f64> = narrow
            .iter()
            .map(|l| scale.at(0.5 * (l.bottom_nm + l.top_nm)))
            .collect();
        let sizes: Vec<f64> = narrow.iter().map(width).collect();
        let places = spread(&wanted, &sizes, scale.range[0], scale.range[1]);
        strip.led = wanted.iter().zip(places).map(|(w, p)| [*w, p]).collect();
        strip.numbers = narrow.iter().map(|l| l.number.to_string()).collect();
        strip
    }

    pub fn height(&self) -> f64 {
        if self.led.is_empty() {
            ROW_PT
        } else {
            ROW_PT + LEADER_PT + NUMBER_ROW_PT
        }
    }

    /// Draws the strip with its upper border at `top`.
    pub fn draw(&self, page: &mut Page, top: f64) {
        let style = Style::new(SMALL_PT, Anchor::Middle);
        let row = top + self.height() - ROW_PT;
        page.group("layers", |page| {
            for ([middle, place], number) in self.led.iter().zip(&self.numbers) {
                let text_top = row - LEADER_PT;
                page.text([*place, text_top - 2.0], style, number);
                let guide = Stroke::solid(GUIDE, 0.4);
                page.polyline(
                    &[
                        [*place, text_top],
                        [*place, text_top + 1.5],
                        [*middle, row],
                        [*middle, row + ROW_PT - 4.0],
                    ],
                    guide,
                );
            }
            let [left, right] = self.scale.range;
            let rule = Stroke::solid(SOFT_INK, 0.4);
            let bottom = row + ROW_PT - 1.0;
            page.line([left, bottom], [right, bottom], rule);
            let apart = (right - left) / (self.faces.len() + 1) as f64 > CLOSEST_PT;
            let inner = self.faces.iter().copied().filter(|_| apart);
            for x in [left, right].into_iter().chain(inner) {
                page.line(
                    [x, bottom - 4.0],
                    [x, bottom],
                    Stroke::solid(SOFT_INK, 0.35),
                );
            }
            for (middle, runs) in &self.in_place {
                let y = bottom - 0.5 * ROW_PT + 0.5 * ASCENT * SMALL_PT;
                page.runs(
                    [*middle, y],
                    Style {
                        colour: INK,
                        ..style
                    },
                    runs,
                );
            }
        });
    }
}
