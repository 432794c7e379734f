//! Three modules of a cascade: the tilted band edge with the squared envelopes at their energies.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, left_axis, left_room};
use super::page::{ASCENT, Anchor, LABEL_PT, MARGIN_PT, Page, SMALL_PT, Style};
use super::palette::{self, BODY, GUIDE, INK, SOFT_INK, Stroke};
use super::spread::spread;
use super::text::width_pt;
use crate::numerics::polyline::simplified;

/// A picture of a cascade.
#[derive(Clone, Debug)]
pub struct CascadePicture {
    pub title: String,
    pub caption: String,
    pub period_nm: f64,
    /// What the energy gains from a module to the next one along growth.
    pub step_ev: f64,
    /// The band edge of the middle module: height above its lower face in nm, eV.
    pub edge: Vec<[f64; 2]>,
    pub states: Vec<CascadeState>,
}

/// A state of the middle module.
#[derive(Clone, Debug)]
pub struct CascadeState {
    pub energy_ev: f64,
    /// Height above the module's lower face in nm, 1/nm.
    pub envelope: Vec<[f64; 2]>,
}

const PANEL_PT: f64 = 260.0;
/// Height of the highest peak.
const PEAK_PT: f64 = 26.0;
/// A squared envelope is drawn where it is above this part of its peak.
const TAIL: f64 = 0.004;
/// A deviation of a line that is not seen.
const INVISIBLE_PT: f64 = 0.03;
const TINT: f64 = 0.18;
/// Distance of the labels of levels.
const LABEL_STEP_PT: f64 = 1.2 * LABEL_PT;

impl CascadePicture {
    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let top = page.title(&self.title) + 12.0;
        let bottom = top + PANEL_PT;
        let labels: Vec<String> = self
            .states
            .iter()
            .map(|state| format!("{:.1}", 1e3 * state.energy_ev))
            .collect();
        let widest = |texts: &[String]| {
            texts
                .iter()
                .map(|t| width_pt(t, LABEL_PT))
                .fold(0.0, f64::max)
        };
        let numbers: Vec<String> = (1..=self.states.len()).map(|n| n.to_string()).collect();
        let (number_width, label_width) = (widest(&numbers), widest(&labels));
        let right = page.width - MARGIN_PT - label_width - number_width - 26.0;

        let shifts = [-1.0, 0.0, 1.0];
        let energies = shifts.iter().flat_map(|shift| {
            let edge = self.edge.iter().map(|p| p[1]);
            let states = self.states.iter().map(|s| s.energy_ev);
            edge.chain(states)
                .map(move |e| 1e3 * (e + shift * self.step_ev))
        });
        let (low, high) = energies.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), e| {
            (a.min(e), b.max(e))
        });
        let spare = 0.04 * (high - low).max(1e-3);
        let vertical = Scale {
            domain: [low - spare, high + spare],
            range: [bottom, top],
        };
        let left = MARGIN_PT + left_room(vertical);
        let horizontal = Scale {
            domain: [-self.period_nm, 2.0 * self.period_nm],
            range: [left, right],
        };
        let peak = self
            .states
            .iter()
            .flat_map(|s| &s.envelope)
            .map(|p| p[1])
            .fold(f64::MIN_POSITIVE, f64::max);
        let place = |[z, ev]: [f64; 2]| [horizontal.at(z), vertical.at(1e3 * ev)];

        let edge: Vec<[f64; 2]> = shifts
            .iter()
            .flat_map(|shift| {
                self.edge
                    .iter()
                    .map(move |[z, e]| [z + shift * self.period_nm, e + shift * self.step_ev])
            })
            .map(place)
            .collect();
        let mut body = edge.clone();
        body.extend([[right, bottom], [left, bottom]]);
        page.group("body", |page| page.area(&body, BODY));
        page.group("modules", |page| {
            let guide = Stroke {
                colour: GUIDE,
                width_pt: 0.5,
                dash: "2 2",
            };
            for module in [0.0, 1.0] {
                let x = horizontal.at(module * self.period_nm);
                page.line([x, top - 6.0], [x, bottom], guide);
            }
        });
        page.group("edge", |page| {
            page.polyline(&simplified(&edge, INVISIBLE_PT), Stroke::solid(INK, 0.8));
        });
        page.group("densities", |page| {
            for shift in shifts {
                for (index, state) in self.states.iter().enumerate() {
                    let level = vertical.at(1e3 * (state.energy_ev + shift * self.step_ev));
                    let own = state.envelope.iter().map(|p| p[1]).fold(0.0, f64::max);
                    let points: Vec<[f64; 2]> = state
                        .envelope
                        .iter()
                        .filter(|p| p[1] > TAIL * own)
                        .map(|[z, v]| {
                            let x = horizontal.at(z + shift * self.period_nm);
                            [x, level - PEAK_PT * v / peak]
                        })
                        .filter(|[x, _]| *x >= left && *x <= right)
                        .collect();
                    let weight = if shift == 0.0 { 0.9 } else { 0.6 };
                    let stroke = palette::state(index, weight);
                    let mut line = simplified(&points, INVISIBLE_PT);
                    // What the panel's side cuts off ends on its level.
                    if let (Some(first), Some(last)) = (points.first(), points.last()) {
                        line.insert(0, [first[0], level]);
                        line.push([last[0], level]);
                    }
                    page.tinted(&line, if shift == 0.0 { TINT } else { 0.5 * TINT }, stroke);
                }
            }
        });
        self.draw_labels(&mut page, vertical, [right, number_width], &labels);
        left_axis(&mut page, vertical, left, "Energy (meV)");
        bottom_axis(
            &mut page,
            horizontal,
            bottom,
            "z from the module's lower face (nm)",
        );
        page.group("names", |page| {
            let style = Style {
                colour: SOFT_INK,
                ..Style::new(SMALL_PT, Anchor::Middle)
            };
            let middle = horizontal.at(0.5 * self.period_nm);
            page.text([middle, top - 4.0], style, "module");
        });
        let y = page.caption(&self.caption, bottom + BOTTOM_ROOM);
        let list: Vec<String> = self
            .states
            .iter()
            .enumerate()
            .map(|(k, s)| format!("state {} at {:.1} meV", k + 1, 1e3 * s.energy_ev))
            .collect();
        page.finish(y + 4.0, &self.title, &list.join("; "))
    }

    /// The numbers and energies of the middle module's states.
    fn draw_labels(
        &self,
        page: &mut Page,
        vertical: Scale,
        [right, number_width]: [f64; 2],
        labels: &[String],
    ) {
        let [bottom, top] = vertical.range;
        // The lowest state stands lowest: y falls with the energy.
        let order: Vec<usize> = (0..self.states.len()).rev().collect();
        let wanted: Vec<f64> = order
            .iter()
            .map(|k| vertical.at(1e3 * self.states[*k].energy_ev))
            .collect();
        let places = spread(&wanted, &vec![LABEL_STEP_PT; order.len()], top, bottom);
        let widest = labels
            .iter()
            .map(|t| width_pt(t, LABEL_PT))
            .fold(0.0, f64::max);
        let numbers_right = right + 16.0 + number_width;
        let energies_right = numbers_right + 6.0 + widest;
        let bold = Style {
            bold: true,
            ..Style::new(LABEL_PT, Anchor::End)
        };
        page.group("energies", |page| {
            page.text(
                [energies_right, top - 4.0],
                Style::new(LABEL_PT, Anchor::End),
                "meV",
            );
            for ((&k, y), place) in order.iter().zip(&wanted).zip(places) {
                let leader = [
                    [right + 1.0, *y],
                    [right + 4.0, *y],
                    [right + 12.0, place],
                    [right + 14.0, place],
                ];
                page.polyline(&leader, palette::state(k, 0.6));
                let line = place + 0.5 * ASCENT * LABEL_PT;
                page.text([numbers_right, line], bold, &(k + 1).to_string());
                page.text(
                    [energies_right, line],
                    Style::new(LABEL_PT, Anchor::End),
                    &labels[k],
                );
            }
        });
    }
}
