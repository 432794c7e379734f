//! One panel of a band diagram: electrons above their edge, or holes, the other way up, below theirs; or both.

use super::axes::Scale;
use super::page::{ASCENT, Anchor, LABEL_PT, Page, Style};
use super::palette::{self, BODY, GUIDE, INK, Stroke};
use super::spread::spread;
use super::text::width_pt;
use crate::numerics::polyline::simplified;
use crate::subbands::StateCurves;

/// A squared envelope is drawn where it is above this part of its peak.
const TAIL: f64 = 0.004;
/// A deviation of a line that is not seen.
const INVISIBLE_PT: f64 = 0.03;
/// How opaque the area under a squared envelope is.
const TINT: f64 = 0.18;
/// A wider range of energy is given in eV.
const EV_AXIS_FROM: f64 = 2.0;
/// Decimals that may be added so that the energies of neighbours differ.
const MORE_DECIMALS: usize = 3;
/// From an envelope to the level's label.
const DOTTED: Stroke = Stroke {
    colour: GUIDE,
    width_pt: 0.4,
    dash: "0.8 1.6",
};
const FERMI: Stroke = Stroke {
    colour: INK,
    width_pt: 0.5,
    dash: "6 2.5",
};
/// Distance of the labels of levels.
pub(super) const LABEL_STEP_PT: f64 = 1.25 * LABEL_PT;

/// What a panel shows; energies are the electron's, in eV above the panel's zero.
#[derive(Clone, Debug)]
pub(super) struct Content {
    /// 1 for electrons, −1 for holes: which way is away from the gap. 1 where both are in one panel.
    pub sign: f64,
    /// The band edges in nm and eV: that of electrons where they are in the panel, that of heavy holes, that of light ones.
    pub edges: Vec<DrawnEdge>,
    /// Those nearest the gap first; those of both bands from the lowest.
    pub states: Vec<DrawnState>,
    pub fermi_ev: Option<f64>,
}

#[derive(Clone, Debug)]
pub(super) struct DrawnEdge {
    /// 1 for electrons, −1 for holes.
    pub sign: f64,
    /// Second lines of a band.
    pub dashed: bool,
    pub points: Vec<[f64; 2]>,
}

#[derive(Clone, Debug)]
pub(super) struct DrawnState {
    /// 1 where the squared envelope stands on the level, −1 where it hangs.
    pub sign: f64,
    pub energy_ev: f64,
    pub curves: StateCurves,
    /// What stands at the right: `1`, `hh 1`, or `v 1 hh`.
    pub label: String,
    /// The same in words: `heavy-hole 1`.
    pub name: String,
    pub stroke: Stroke,
    /// A sign that the caption explains.
    pub mark: &'static str,
}

impl DrawnState {
    fn line(&self, width_pt: f64) -> Stroke {
        Stroke {
            width_pt,
            ..self.stroke
        }
    }
}

/// A unit of energy on the axis.
#[derive(Clone, Copy)]
pub(super) struct Unit {
    pub name: &'static str,
    /// Units per eV.
    pub factor: f64,
    pub decimals: usize,
}

impl Content {
    pub fn unit(&self) -> Unit {
        let [low, high] = self.range_ev(0.0);
        if high - low > EV_AXIS_FROM {
            Unit {
                name: "eV",
                factor: 1.0,
                decimals: 4,
            }
        } else {
            Unit {
                name: "meV",
                factor: 1e3,
                decimals: 1,
            }
        }
    }

    /// The lowest and the highest energy, with `beyond_ev` of room for every squared envelope.
    fn range_ev(&self, beyond_ev: f64) -> [f64; 2] {
        let edges = self.edges.iter().flat_map(|edge| &edge.points);
        let levels = self.states.iter();
        let levels = levels.map(|state| state.energy_ev + state.sign * beyond_ev);
        let all = edges.map(|p| p[1]).chain(levels).chain(self.fermi_ev);
        all.chain([1e-3 * self.sign])
            .fold([0.0, 0.0], |[low, high], e| {
                [f64::min(low, e), f64::max(high, e)]
            })
    }

    /// The height of the highest peak: about the distance of neighbouring levels, within limits.
    fn peak_pt(&self, height: f64) -> f64 {
        let [low, high] = self.range_ev(0.0);
        let mut gaps: Vec<f64> = self
            .states
            .windows(2)
            .map(|pair| (pair[1].energy_ev - pair[0].energy_ev).abs())
            .collect();
        gaps.sort_by(f64::total_cmp);
        let gap_ev = gaps.get(gaps.len() / 2).copied().unwrap_or(high - low);
        (0.9 * gap_ev / (high - low)).clamp(0.11, 0.22) * height
    }

    /// The scale of energy from a panel's top at 0, and points per 1/nm of the squared envelopes.
    pub fn vertical(&self, height: f64) -> (Scale, f64) {
        let peak_pt = self.peak_pt(height);
        let [low, high] = self.range_ev(0.0);
        // A peak on the outermost level must fit inside.
        let beyond_ev = peak_pt / height * (high - low);
        let [low, high] = self.range_ev(1.15 * beyond_ev);
        let room = 0.04 * (high - low);
        let factor = self.unit().factor;
        let scale = Scale {
            domain: [factor * (low - room), factor * (high + room)],
            range: [height, 0.0],
        };
        let largest = self
            .states
            .iter()
            .flat_map(|state| state.curves.whole())
            .fold(0.0, |a: f64, p| a.max(p[1]));
        (
            scale,
            if largest > 0.0 {
                peak_pt / largest
            } else {
                0.0
            },
        )
    }

    /// The labels at the right, with so many decimals that neighbours differ.
    pub fn labels(&self) -> StateLabels {
        let unit = self.unit();
        let narrowest = self
            .states
            .windows(2)
            .map(|pair| unit.factor * (pair[1].energy_ev - pair[0].energy_ev).abs())
            .fold(f64::INFINITY, f64::min);
        let most = unit.decimals + MORE_DECIMALS;
        let decimals = (unit.decimals..most)
            .find(|d| narrowest >= 2.0 * 10f64.powi(-(*d as i32)))
            .unwrap_or(most);
        let energy = |state: &DrawnState| {
            super::text::minus(&format!("{:.decimals$}", unit.factor * state.energy_ev))
        };
        StateLabels {
            unit: unit.name,
            numbers: self
                .states
                .iter()
                .map(|state| state.label.clone())
                .collect(),
            energies: self.states.iter().map(energy).collect(),
            marks: self.states.iter().map(|state| state.mark).collect(),
        }
    }
}

/// Where the energies, positions and squared envelopes of a panel are drawn.
pub(super) struct Panel<'d> {
    pub content: &'d Content,
    pub horizontal: Scale,
    /// In the unit.
    pub vertical: Scale,
    pub unit: Unit,
    pub pt_per_density: f64,
}

impl Panel<'_> {
    pub fn y(&self, energy_ev: f64) -> f64 {
        self.vertical.at(self.unit.factor * energy_ev)
    }

    /// The part of a squared envelope of a state that stands out, on the line of its energy.
    fn density(&self, state: &DrawnState, curve: &[[f64; 2]]) -> Vec<[f64; 2]> {
        let level = self.y(state.energy_ev);
        let upwards = state.sign * self.pt_per_density;
        let points: Vec<[f64; 2]> = standing_out(curve)
            .iter()
            .map(|[z, value]| [self.horizontal.at(*z), level - upwards * value])
            .collect();
        simplified(&points, INVISIBLE_PT)
    }

    /// The edges, with the gap filled: that beside the first one, or that between those of electrons and of heavy holes.
    /// `layers` is their number.
    pub fn draw_edges(&self, page: &mut Page, layers: usize) {
        let [left, right] = self.horizontal.range;
        let [bottom, top] = self.vertical.range;
        let gap = if self.content.sign > 0.0 { bottom } else { top };
        // Where the layers stand close, the line must leave room between its flanks.
        let width_pt = (0.25 * (right - left) / layers as f64).clamp(0.25, 1.1);
        let edges = &self.content.edges;
        let line = |edge: &DrawnEdge| -> Vec<[f64; 2]> {
            let points = edge.points.iter();
            points
                .map(|[z, e]| [self.horizontal.at(*z), self.y(*e)])
                .collect()
        };
        let lines: Vec<Vec<[f64; 2]>> = edges.iter().map(line).collect();
        let Some(first) = lines.first() else {
            return;
        };
        let mut body = first.clone();
        match (1..lines.len()).find(|&other| edges[other].sign != edges[0].sign) {
            Some(facing) => body.extend(lines[facing].iter().rev()),
            None => body.extend([[right, gap], [left, gap]]),
        }
        page.group("body", |page| page.area(&body, BODY));
        page.group("edge", |page| {
            for (line, edge) in lines.iter().zip(edges) {
                let stroke = match edge.dashed {
                    false => Stroke::solid(INK, width_pt),
                    true => Stroke {
                        dash: palette::LIGHT_HOLES,
                        ..Stroke::solid(INK, 0.8 * width_pt)
                    },
                };
                page.polyline(line, stroke);
            }
        });
    }

    pub fn draw_fermi_level(&self, page: &mut Page) {
        let Some(fermi_ev) = self.content.fermi_ev else {
            return;
        };
        let ([left, right], y) = (self.horizontal.range, self.y(fermi_ev));
        page.group("fermi-level", |page| {
            page.line([left, y], [right, y], FERMI)
        });
    }

    /// The squared envelopes, the outermost state first, so that those near the gap stand in front; then the levels.
    pub fn draw_states(&self, page: &mut Page, [ladder_left, ladder_right]: [f64; 2]) {
        let wholes: Vec<Vec<[f64; 2]>> = self
            .content
            .states
            .iter()
            .map(|state| self.density(state, state.curves.whole()))
            .collect();
        let states = || self.content.states.iter().zip(&wholes);
        page.group("guides", |page| {
            for (state, whole) in states() {
                let y = self.y(state.energy_ev);
                let from = whole
                    .last()
                    .map_or(self.horizontal.range[0], |point| point[0]);
                page.line([from, y], [ladder_left, y], DOTTED);
            }
        });
        page.group("densities", |page| {
            for (state, whole) in states().rev() {
                let stroke = state.line(0.9);
                if state.curves.sum.is_some() {
                    page.tinted(whole, TINT, Stroke::solid(stroke.colour, 0.25));
                    let envelope = self.density(state, &state.curves.envelope);
                    page.polyline(&envelope, stroke);
                } else {
                    page.tinted(whole, TINT, stroke);
                }
            }
        });
        page.group("levels", |page| {
            for (state, whole) in states() {
                let y = self.y(state.energy_ev);
                if let (Some(first), Some(last)) = (whole.first(), whole.last()) {
                    let stroke = Stroke::solid(state.stroke.colour, 0.5);
                    page.line([first[0], y], [last[0], y], stroke);
                }
            }
        });
        page.group("rungs", |page| {
            for (state, _) in states() {
                let y = self.y(state.energy_ev);
                page.line([ladder_left, y], [ladder_right, y], state.line(0.9));
            }
        });
    }

    /// The labels, from the levels' ends at `from` to where the texts begin, with columns as wide as `widths` asks for.
    pub fn draw_labels(
        &self,
        page: &mut Page,
        labels: &StateLabels,
        [from, to]: [f64; 2],
        widths: [f64; 2],
    ) {
        let [bottom, top] = self.vertical.range;
        let states = &self.content.states;
        let most = ((bottom - top) / LABEL_STEP_PT).floor().max(1.0) as usize;
        let every = states.len().div_ceil(most).max(1);
        let mut chosen: Vec<usize> = (0..states.len()).step_by(every).collect();
        // From the top down.
        if self.content.sign > 0.0 {
            chosen.reverse();
        }
        let wanted: Vec<f64> = chosen
            .iter()
            .map(|k| self.y(states[*k].energy_ev))
            .collect();
        let sizes = vec![LABEL_STEP_PT; chosen.len()];
        let places = spread(&wanted, &sizes, top, bottom);
        let numbers_right = to + widths[0];
        let energies_right = numbers_right + StateLabels::GAP_PT + widths[1];
        let number = Style {
            bold: true,
            ..Style::new(LABEL_PT, Anchor::End)
        };
        let energy = Style::new(LABEL_PT, Anchor::End);
        let mark = Style::new(LABEL_PT, Anchor::Start);
        page.group("energies", |page| {
            page.text([energies_right, top - 3.0], energy, labels.unit);
            for ((&index, y), place) in chosen.iter().zip(&wanted).zip(places) {
                let leader = [
                    [from, *y],
                    [from + 2.0, *y],
                    [to - 3.0, place],
                    [to - 1.0, place],
                ];
                let stroke = Stroke::solid(states[index].stroke.colour, 0.5);
                page.polyline(&leader, stroke);
                let line = place + 0.5 * ASCENT * LABEL_PT;
                page.text([numbers_right, line], number, &labels.numbers[index]);
                page.text([energies_right, line], energy, &labels.energies[index]);
                if !labels.marks[index].is_empty() {
                    page.text([energies_right + 0.5, line], mark, labels.marks[index]);
                }
            }
        });
    }
}

/// The texts at the right of a panel.
pub(super) struct StateLabels {
    unit: &'static str,
    numbers: Vec<String>,
    energies: Vec<String>,
    marks: Vec<&'static str>,
}

impl StateLabels {
    const GAP_PT: f64 = 5.0;

    /// Widths of the columns of names and energies.
    pub fn widths(&self) -> [f64; 2] {
        [&self.numbers, &self.energies].map(|texts| {
            let widths = texts.iter().map(|text| width_pt(text, LABEL_PT));
            widths.fold(0.0, f64::max)
        })
    }

    /// The room that labels with such columns need.
    pub fn room(&self, widths: [f64; 2]) -> f64 {
        let marks = self.marks.iter().map(|mark| width_pt(mark, LABEL_PT));
        widths[0] + Self::GAP_PT + widths[1] + marks.fold(0.0, f64::max)
    }
}

/// The part of a curve between the places where it first and last rises above its tails.
fn standing_out(density: &[[f64; 2]]) -> &[[f64; 2]] {
    let peak = density.iter().fold(0.0, |a: f64, p| a.max(p[1]));
    let above = |p: &[f64; 2]| p[1] > TAIL * peak;
    match (
        density.iter().position(above),
        density.iter().rposition(above),
    ) {
        (Some(first), Some(last)) => {
            &density[first.saturating_sub(1)..(last + 2).min(density.len())]
        }
        _ => density,
    }
}
