//! The band edge along the growth direction with the squared envelopes at their energies.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, left_axis, left_room};
use super::key;
use super::ladder::{Ladder, Rung};
use super::layer_strip::{LayerStrip, StripLayer};
use super::page::{ASCENT, Anchor, LABEL_PT, MARGIN_PT, Page, SMALL_PT, Style};
use super::palette::{self, BODY, GUIDE, INK, Stroke};
use super::spread::spread;
use super::text::{Run, formula, minus, plain, short, shortened, width_pt};
use crate::materials::Substance;
use crate::models::model_name;
use crate::numerics::polyline::simplified;
use crate::optics::{Transition, transitions};
use crate::report::table::significant;
use crate::structure::{BandName, ConductionModel, Item, Stack, Structure};
use crate::subbands::{Curves, Hold, StateCurves, Subbands};

/// How finely the curves of a diagram are to be sampled: well below a line's width.
pub const FINENESS: f64 = 4e-4;
/// Transitions that are drawn when the file has no aims.
const MOST_TRANSITIONS: usize = 4;
/// Of those, none weaker than this part of the strongest.
const WEAKEST: f64 = 0.05;
/// A squared envelope is drawn where it is above this part of its peak.
const TAIL: f64 = 0.004;
/// A deviation of a line that is not seen.
const INVISIBLE_PT: f64 = 0.03;
/// How opaque the area under a squared envelope is.
const TINT: f64 = 0.18;
/// A wider range of energy is given in eV.
const EV_AXIS_FROM: f64 = 2.0;
/// Names and materials in the key are cut to this.
const LONGEST_NAME_PT: f64 = 110.0;
/// Decimals that may be added so that the energies of neighbours differ.
const MORE_DECIMALS: usize = 3;
/// From a level to where it ends at its label.
const LEADER_PT: f64 = 11.0;
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
const LABEL_STEP_PT: f64 = 1.25 * LABEL_PT;
/// A panel grows to this height for the labels of its levels; beyond it they are thinned out.
const TALLEST_PT: f64 = 560.0;

/// All that a band diagram shows.
#[derive(Clone, Debug)]
pub struct BandDiagram {
    title: String,
    caption: String,
    /// nm, eV above the zero.
    edge: Vec<[f64; 2]>,
    layers: Vec<StripLayer>,
    /// What each number in the strip stands for.
    meanings: Vec<Vec<Run>>,
    states: Vec<DrawnState>,
    transitions: Vec<Transition>,
    width_nm: f64,
    zero_ev: f64,
    /// Above the zero.
    fermi_ev: Option<f64>,
}

#[derive(Clone, Debug)]
struct DrawnState {
    /// Above the zero.
    energy_ev: f64,
    curves: StateCurves,
    /// A sign that the caption explains.
    mark: &'static str,
}

impl BandDiagram {
    /// Gathers the diagram of the lowest `shown` states. The transitions are those that the file's aims name, else the
    /// strongest.
    pub fn new(
        structure: &Structure,
        stack: &Stack,
        subbands: &Subbands,
        curves: Curves,
        shown: usize,
    ) -> BandDiagram {
        let zero_ev = subbands.pencil.floor();
        let states: Vec<DrawnState> = subbands
            .states()
            .iter()
            .zip(curves.states)
            .take(shown)
            .map(|(state, curves)| DrawnState {
                energy_ev: state.from_edge_ev,
                curves,
                mark: match state.hold {
                    Hold::Bound => "",
                    Hold::Leaky => "‡",
                    Hold::Walls => "†",
                },
            })
            .collect();
        BandDiagram {
            title: structure.title.clone().unwrap_or_default(),
            caption: caption(structure, stack, zero_ev, &states),
            edge: curves.edge.iter().map(|[z, v]| [*z, v - zero_ev]).collect(),
            layers: strip_layers(structure, stack),
            meanings: meanings(structure, stack),
            transitions: chosen(structure, subbands, states.len()),
            states,
            width_nm: stack.total_width_nm(),
            zero_ev,
            fermi_ev: None,
        }
    }

    /// With a line at the Fermi level, given on the scale of the table of levels.
    pub fn with_fermi_level(mut self, fermi_ev: Option<f64>) -> BandDiagram {
        self.fermi_ev = fermi_ev.map(|fermi_ev| fermi_ev - self.zero_ev);
        if self.fermi_ev.is_some() {
            self.caption += " Long dashes: Fermi level.";
        }
        self
    }

    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let (least_height, columns) = match width {
            Width::Column => (165.0_f64, 1),
            Width::Page => (215.0, 3),
        };
        let labels_height = LABEL_STEP_PT * self.states.len() as f64;
        let height = least_height.max(labels_height.min(TALLEST_PT));
        let unit = self.unit();
        let (vertical, pt_per_density) = self.vertical(height);
        let mut panel = Panel {
            horizontal: Scale {
                domain: [0.0, self.width_nm],
                range: [0.0, 1.0],
            },
            vertical,
            unit,
            pt_per_density,
        };
        let labels = self.state_labels(unit);
        let rungs = self.transitions.iter().map(|t| self.rung(t, &panel));
        let (ladder, left_out) = Ladder::new(rungs.collect(), columns, height);

        let left = MARGIN_PT + left_room(vertical);
        let labels_left = page.width - MARGIN_PT - labels.width();
        let ladder_right = labels_left - LEADER_PT;
        let ladder_left = ladder_right - ladder.width();
        let right = ladder_left - if ladder.width() > 0.0 { 7.0 } else { 0.0 };
        panel.horizontal.range = [left, right];

        let below_title = if self.title.is_empty() {
            4.0
        } else {
            page.title(&self.title)
        };
        let strip = LayerStrip::new(&self.layers, panel.horizontal);
        strip.draw(&mut page, below_title);
        let top = below_title + strip.height() + 1.0;
        let bottom = top + height;
        panel.vertical.range = vertical.range.map(|y| y + top);

        self.draw_edge(&mut page, &panel);
        if let Some(fermi_ev) = self.fermi_ev {
            let y = panel.y(fermi_ev);
            page.group("fermi-level", |page| {
                page.line([left, y], [right, y], FERMI)
            });
        }
        self.draw_states(&mut page, &panel, [ladder_left, ladder_right]);
        ladder.draw(&mut page, ladder_left, top, bottom);
        self.draw_labels(&mut page, &panel, &labels, [ladder_right, labels_left]);
        let name = format!("Energy ({})", unit.name);
        left_axis(&mut page, panel.vertical, left, &name);
        bottom_axis(&mut page, panel.horizontal, bottom, "z (nm)");

        let entries: Vec<key::Entry> = strip
            .keyed
            .iter()
            .map(|number| key::Entry {
                number: *number,
                meaning: self.meanings[number - 1].clone(),
            })
            .collect();
        let mut y = key::draw(&mut page, &entries, bottom + BOTTOM_ROOM);
        let mut caption = self.caption.clone();
        for rung in left_out {
            let [wavelength, energy] = rung.lines;
            caption += &format!(" Not drawn: {}, {wavelength}, {energy}.", rung.states);
        }
        y = page.caption(&caption, y + 1.0);
        let title = if self.title.is_empty() {
            "Band diagram"
        } else {
            &self.title
        };
        page.finish(y + 4.0, title, &self.description(unit))
    }

    fn rung(&self, transition: &Transition, panel: &Panel) -> Rung {
        Rung {
            upper_y: panel.y(self.states[transition.to].energy_ev),
            lower_y: panel.y(self.states[transition.from].energy_ev),
            lines: [
                wavelength(transition),
                format!("{} meV", significant(1e3 * transition.energy_ev, 4)),
            ],
            states: format!("{} to {}", transition.from + 1, transition.to + 1),
        }
    }

    fn draw_edge(&self, page: &mut Page, panel: &Panel) {
        let [left, right] = panel.horizontal.range;
        let [bottom, _] = panel.vertical.range;
        let edge: Vec<[f64; 2]> = self
            .edge
            .iter()
            .map(|[z, e]| [panel.horizontal.at(*z), panel.y(*e)])
            .collect();
        // Where the layers stand close, the line must leave room between its flanks.
        let width_pt = (0.25 * (right - left) / self.layers.len() as f64).clamp(0.25, 1.1);
        let mut body = edge.clone();
        body.extend([[right, bottom], [left, bottom]]);
        page.group("body", |page| page.area(&body, BODY));
        page.group("edge", |page| {
            page.polyline(&edge, Stroke::solid(INK, width_pt));
        });
    }

    /// The squared envelopes, the highest state first, so that the lower ones stand in front; then the levels.
    fn draw_states(&self, page: &mut Page, panel: &Panel, [ladder_left, ladder_right]: [f64; 2]) {
        let wholes: Vec<Vec<[f64; 2]>> = self
            .states
            .iter()
            .map(|state| panel.density(state.energy_ev, state.curves.whole()))
            .collect();
        let states = || self.states.iter().zip(&wholes).enumerate();
        page.group("guides", |page| {
            for (_, (state, whole)) in states() {
                let y = panel.y(state.energy_ev);
                let from = whole
                    .last()
                    .map_or(panel.horizontal.range[0], |point| point[0]);
                page.line([from, y], [ladder_left, y], DOTTED);
            }
        });
        page.group("densities", |page| {
            for (index, (state, whole)) in states().rev() {
                let stroke = palette::state(index, 0.9);
                if state.curves.sum.is_some() {
                    page.tinted(whole, TINT, Stroke::solid(stroke.colour, 0.25));
                    let envelope = panel.density(state.energy_ev, &state.curves.envelope);
                    page.polyline(&envelope, stroke);
                } else {
                    page.tinted(whole, TINT, stroke);
                }
            }
        });
        page.group("levels", |page| {
            for (index, (state, whole)) in states() {
                let y = panel.y(state.energy_ev);
                if let (Some(first), Some(last)) = (whole.first(), whole.last()) {
                    let stroke = Stroke::solid(palette::state(index, 0.5).colour, 0.5);
                    page.line([first[0], y], [last[0], y], stroke);
                }
            }
        });
        page.group("rungs", |page| {
            for (index, (state, _)) in states() {
                let y = panel.y(state.energy_ev);
                page.line(
                    [ladder_left, y],
                    [ladder_right, y],
                    palette::state(index, 0.9),
                );
            }
        });
    }

    fn unit(&self) -> Unit {
        let [low, high] = self.energies(0.0);
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

    /// The lowest and the highest energy of the picture, with `above_ev` of room above every level.
    fn energies(&self, above_ev: f64) -> [f64; 2] {
        let edge = self.edge.iter().map(|p| p[1]);
        let levels = self.states.iter().map(|state| state.energy_ev + above_ev);
        edge.chain(levels)
            .chain(self.fermi_ev)
            .fold([0.0, 1e-3], |[low, high], e| {
                [f64::min(low, e), f64::max(high, e)]
            })
    }

    /// The height of the highest peak: about the distance of neighbouring levels, within limits.
    fn peak_pt(&self, height: f64) -> f64 {
        let [low, high] = self.energies(0.0);
        let mut gaps: Vec<f64> = self
            .states
            .windows(2)
            .map(|pair| pair[1].energy_ev - pair[0].energy_ev)
            .collect();
        gaps.sort_by(f64::total_cmp);
        let gap_ev = gaps.get(gaps.len() / 2).copied().unwrap_or(high - low);
        (0.9 * gap_ev / (high - low)).clamp(0.11, 0.22) * height
    }

    /// The scale of energy from a panel's top at 0, and points per 1/nm of the squared envelopes.
    fn vertical(&self, height: f64) -> (Scale, f64) {
        let peak_pt = self.peak_pt(height);
        let [low, high] = self.energies(0.0);
        // A peak on the uppermost level must fit below the top.
        let above_ev = peak_pt / height * (high - low);
        let [low, high] = self.energies(1.15 * above_ev);
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
    fn state_labels(&self, unit: Unit) -> StateLabels {
        let narrowest = self
            .states
            .windows(2)
            .map(|pair| unit.factor * (pair[1].energy_ev - pair[0].energy_ev))
            .fold(f64::INFINITY, f64::min);
        let most = unit.decimals + MORE_DECIMALS;
        let decimals = (unit.decimals..most)
            .find(|d| narrowest >= 2.0 * 10f64.powi(-(*d as i32)))
            .unwrap_or(most);
        let energy = |state: &DrawnState| format!("{:.decimals$}", unit.factor * state.energy_ev);
        StateLabels {
            unit: unit.name,
            numbers: (1..=self.states.len()).map(|n| n.to_string()).collect(),
            energies: self.states.iter().map(energy).collect(),
            marks: self.states.iter().map(|state| state.mark).collect(),
        }
    }

    fn draw_labels(
        &self,
        page: &mut Page,
        panel: &Panel,
        labels: &StateLabels,
        [from, to]: [f64; 2],
    ) {
        let [bottom, top] = panel.vertical.range;
        let most = ((bottom - top) / LABEL_STEP_PT).floor().max(1.0) as usize;
        let every = self.states.len().div_ceil(most).max(1);
        let chosen: Vec<usize> = (0..self.states.len()).step_by(every).rev().collect();
        let wanted: Vec<f64> = chosen
            .iter()
            .map(|k| panel.y(self.states[*k].energy_ev))
            .collect();
        let sizes = vec![LABEL_STEP_PT; chosen.len()];
        let places = spread(&wanted, &sizes, top, bottom);
        let numbers_right = to + StateLabels::widest(&labels.numbers);
        let energies_right =
            numbers_right + StateLabels::GAP_PT + StateLabels::widest(&labels.energies);
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
                page.polyline(
                    &leader,
                    Stroke::solid(palette::state(index, 0.5).colour, 0.5),
                );
                let line = place + 0.5 * ASCENT * LABEL_PT;
                page.text([numbers_right, line], number, &labels.numbers[index]);
                page.text([energies_right, line], energy, &labels.energies[index]);
                if !labels.marks[index].is_empty() {
                    page.text([energies_right + 0.5, line], mark, labels.marks[index]);
                }
            }
        });
    }

    /// The picture in words.
    fn description(&self, unit: Unit) -> String {
        let states = self.states.iter().enumerate().map(|(index, state)| {
            format!(
                "conduction {} at {:.*} {}",
                index + 1,
                unit.decimals,
                unit.factor * state.energy_ev,
                unit.name
            )
        });
        let transitions = self.transitions.iter().map(|t| {
            format!(
                "{} to {}: {} meV, {}",
                t.from + 1,
                t.to + 1,
                significant(1e3 * t.energy_ev, 4),
                wavelength(t)
            )
        });
        let fermi = self.fermi_ev.map(|fermi_ev| {
            let (decimals, energy) = (unit.decimals, unit.factor * fermi_ev);
            format!("Fermi level at {energy:.decimals$} {}", unit.name)
        });
        let list: Vec<String> = states.chain(transitions).chain(fermi).collect();
        format!(
            "Band edge and squared envelopes along the growth direction. {}.",
            list.join("; ")
        )
    }
}

/// Where energies, positions and squared envelopes are drawn.
struct Panel {
    horizontal: Scale,
    /// In the unit.
    vertical: Scale,
    unit: Unit,
    pt_per_density: f64,
}

impl Panel {
    fn y(&self, energy_ev: f64) -> f64 {
        self.vertical.at(self.unit.factor * energy_ev)
    }

    /// The part of a squared envelope that stands out, on the line of its energy.
    fn density(&self, energy_ev: f64, curve: &[[f64; 2]]) -> Vec<[f64; 2]> {
        let level = self.y(energy_ev);
        let points: Vec<[f64; 2]> = standing_out(curve)
            .iter()
            .map(|[z, value]| [self.horizontal.at(*z), level - self.pt_per_density * value])
            .collect();
        simplified(&points, INVISIBLE_PT)
    }
}

/// The vacuum wavelength in µm, or in mm from 1 mm on.
fn wavelength(transition: &Transition) -> String {
    let wavelength_um = transition.wavelength_um();
    if wavelength_um < 1e3 {
        format!("{} µm", significant(wavelength_um, 4))
    } else {
        format!("{} mm", significant(1e-3 * wavelength_um, 4))
    }
}

/// The texts at the right of a diagram.
struct StateLabels {
    unit: &'static str,
    numbers: Vec<String>,
    energies: Vec<String>,
    marks: Vec<&'static str>,
}

impl StateLabels {
    const GAP_PT: f64 = 5.0;

    fn widest(texts: &[String]) -> f64 {
        texts
            .iter()
            .map(|text| width_pt(text, LABEL_PT))
            .fold(0.0, f64::max)
    }

    fn width(&self) -> f64 {
        let marks = self.marks.iter().map(|mark| width_pt(mark, LABEL_PT));
        Self::widest(&self.numbers)
            + Self::GAP_PT
            + Self::widest(&self.energies)
            + marks.fold(0.0, f64::max)
    }
}

/// A unit of energy on the axis.
#[derive(Clone, Copy)]
struct Unit {
    name: &'static str,
    /// Units per eV.
    factor: f64,
    decimals: usize,
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

/// Pairs of states, the lower first, that the aims name; without aims the strongest transitions.
fn chosen(structure: &Structure, subbands: &Subbands, shown: usize) -> Vec<Transition> {
    let mut all = transitions(subbands);
    all.retain(|t| t.to < shown);
    if let Some(tune) = &structure.tune {
        let named = |t: &Transition| {
            tune.aims.iter().any(|aim| {
                let levels = [aim.from, aim.to];
                let pair = levels.map(|level| level.index);
                levels.iter().all(|l| l.band == BandName::Conduction)
                    && (pair == [t.from + 1, t.to + 1] || pair == [t.to + 1, t.from + 1])
            })
        };
        all.retain(named);
        return all;
    }
    all.sort_by(|a, b| b.oscillator_strength.total_cmp(&a.oscillator_strength));
    let strongest = all.first().map_or(0.0, |t| t.oscillator_strength);
    all.retain(|t| t.oscillator_strength >= WEAKEST * strongest);
    all.truncate(MOST_TRANSITIONS);
    all
}

fn strip_layers(structure: &Structure, stack: &Stack) -> Vec<StripLayer> {
    let faces = stack.faces_nm();
    let mut seen = vec![false; structure.entries.len()];
    stack
        .layers
        .iter()
        .zip(faces.windows(2))
        .map(|(layer, faces)| StripLayer {
            bottom_nm: faces[0],
            top_nm: faces[1],
            number: layer.entry + 1,
            name: match &structure.entries[layer.entry].name {
                Some(name) => plain(name.as_str()),
                None => material(structure, stack, layer.entry),
            },
            first: !std::mem::replace(&mut seen[layer.entry], true),
        })
        .collect()
}

/// What each layer of the file is: its name, material and width.
fn meanings(structure: &Structure, stack: &Stack) -> Vec<Vec<Run>> {
    let meaning = |(index, entry): (usize, &crate::structure::LayerEntry)| {
        let mut runs = Vec::new();
        if let Some(name) = &entry.name {
            runs.extend(plain(shortened(name, SMALL_PT, LONGEST_NAME_PT) + ", "));
        }
        runs.extend(material(structure, stack, index));
        if let Some(width_nm) = stack.entry_width_nm(index) {
            runs.extend(plain(format!(", {} nm", short(width_nm, 4))));
        }
        runs
    };
    structure.entries.iter().enumerate().map(meaning).collect()
}

/// The material of a layer of the file; both ends of a grade.
fn material(structure: &Structure, stack: &Stack, entry: usize) -> Vec<Run> {
    let written = &structure.entries[entry];
    let mut runs = match stack.composition(entry) {
        Some(composition) => formula(&composition.formula()),
        None => substance(&written.material.value),
    };
    if let Some(to) = &written.to {
        runs.extend(plain(" to "));
        runs.extend(substance(&to.value));
    }
    runs
}

fn substance(substance: &Substance) -> Vec<Run> {
    match substance {
        Substance::Alloy(composition) => formula(&composition.formula()),
        Substance::Named(name) => plain(shortened(name, SMALL_PT, LONGEST_NAME_PT)),
        Substance::Family(family) => formula(&family.formula()),
    }
}

fn caption(structure: &Structure, stack: &Stack, zero_ev: f64, states: &[DrawnState]) -> String {
    let mut text = format!(
        "Black: conduction band edge. Lines: squared envelopes, each standing on its energy{}. \
         {} K, field {} kV/cm, {} mass. The zero is the lowest band edge, {} eV in the table of levels.",
        match structure.conduction.model {
            ConductionModel::Parabolic => ", all of the same area",
            ConductionModel::EnergyDependent => {
                "; shaded: the sum over all components of each state, all of the same area"
            }
        },
        short(structure.temperature_k, 4),
        short(1e4 * stack.field_v_per_nm, 4),
        model_name(structure.conduction.model),
        minus(&format!("{zero_ev:.4}")),
    );
    repeats(&structure.sequence, &mut text);
    for (mark, meaning) in [
        ("†", "held by the walls only, not bound"),
        ("‡", "can tunnel out at an end"),
    ] {
        if states.iter().any(|state| state.mark == mark) {
            text += &format!(" {mark} {meaning}.");
        }
    }
    text
}

/// A sentence for every repeat.
fn repeats(sequence: &[Item], text: &mut String) {
    for item in sequence {
        if let Item::Repeat { count, items } = item {
            let mut inside = Vec::new();
            entries(items, &mut inside);
            if let (Some(first), Some(last)) = (inside.iter().min(), inside.iter().max()) {
                if first == last {
                    *text += &format!(" Layer {} stands {count} times.", first + 1);
                } else {
                    *text += &format!(" Layers {} to {} stand {count} times.", first + 1, last + 1);
                }
            }
            repeats(items, text);
        }
    }
}

fn entries(items: &[Item], list: &mut Vec<usize>) {
    for item in items {
        match item {
            Item::Layer(entry) => list.push(*entry),
            Item::Plane(_) => {}
            Item::Repeat { items, .. } => entries(items, list),
        }
    }
}
