//! The band edges along the growth direction with the squared envelopes at their energies: electrons, and with holes two
//! panels on one z axis, since the gap between them is many times as wide as what happens on either side. Where the gap is
//! broken there is nothing to cut out, and both stand in one panel.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, break_marks, left_axis, left_room};
use super::band_panel::{Content, DrawnEdge, DrawnState, LABEL_STEP_PT, Panel, StateLabels};
use super::key;
use super::ladder::{Ladder, Rung};
use super::layer_strip::{LayerStrip, StripLayer};
use super::page::{MARGIN_PT, Page, SMALL_PT};
use super::palette;
use super::text::{Run, formula, minus, plain, short, shortened};
use crate::constants::HC_EV_UM;
use crate::materials::Substance;
use crate::models::{model_name, valence_model_name};
use crate::optics::{band_transitions, interband};
use crate::report::table::significant;
use crate::structure::{BandName, ConductionModel, Item, Level, Stack, Structure, ValenceModel};
use crate::subbands::multiband::Shares;
use crate::subbands::{Bands, Curves, Hold, Place, State};

/// How finely the curves of a diagram are to be sampled: well below a line's width.
pub const FINENESS: f64 = 4e-4;
/// Transitions of electrons that are drawn when the file has no aims, and those between the bands.
const MOST_TRANSITIONS: usize = 4;
const MOST_BETWEEN_BANDS: usize = 2;
/// Of those, none weaker than this part of the strongest.
const WEAKEST: f64 = 0.05;
/// Names and materials in the key are cut to this.
const LONGEST_NAME_PT: f64 = 110.0;
/// From a level to where it ends at its label.
const LEADER_PT: f64 = 11.0;
/// A picture's panels grow to this height together for the labels of their levels; beyond it they are thinned out.
const TALLEST_PT: f64 = 560.0;
/// Between two panels.
const BREAK_PT: f64 = 16.0;
/// Hole edges that are nowhere farther apart than this are one line.
const ONE_EDGE_EV: f64 = 1e-4;

/// All that a band diagram shows.
#[derive(Clone, Debug)]
pub struct BandDiagram {
    title: String,
    caption: String,
    /// Electrons, then holes if they are solved; both in one where the gap is broken.
    panels: Vec<Content>,
    layers: Vec<StripLayer>,
    /// What each number in the strip stands for.
    meanings: Vec<Vec<Run>>,
    transitions: Vec<Drawn>,
    width_nm: f64,
    /// Of each panel, on the scale of the table of levels.
    zeros_ev: [f64; 2],
}

/// A transition between two states, each the number of its panel and its own there, the lower in energy first.
#[derive(Clone, Debug)]
struct Drawn {
    from: (usize, usize),
    to: (usize, usize),
    energy_ev: f64,
}

impl BandDiagram {
    /// Gathers the diagram of so many states of each band. The transitions are those that the file's aims name, else the
    /// strongest.
    pub fn new(
        structure: &Structure,
        stack: &Stack,
        bands: &Bands,
        curves: Vec<Curves>,
        shown: &[usize],
    ) -> BandDiagram {
        let with_holes = bands.count() > 1;
        let joined = with_holes && is_broken(stack, bands, &curves);
        let highest_hole = (1..bands.count()).map(|band| bands.edge_ev(band));
        let highest_hole = highest_hole.fold(f64::NEG_INFINITY, f64::max);
        let lowest_electron = bands.edge_ev(0);
        let zeros_ev = match joined {
            true => [lowest_electron; 2],
            false => [lowest_electron, highest_hole],
        };
        let panel_of = |place: Place| usize::from(place.band > 0 && !joined);
        let mut panels = vec![Content {
            sign: 1.0,
            edges: Vec::new(),
            states: Vec::new(),
            fermi_ev: None,
        }];
        if with_holes && !joined {
            panels.push(Content {
                sign: -1.0,
                ..panels[0].clone()
            });
        }
        let mut places: [Vec<Place>; 2] = Default::default();
        let conduction = (0..bands.level_count(0)).map(|state| Place { band: 0, state });
        for place in conduction.chain(bands.holes()) {
            if place.band < curves.len() && place.state < shown[place.band] {
                places[panel_of(place)].push(place);
            }
        }
        // A state keeps its look when those of both bands are put in order.
        let looks: Vec<Vec<Place>> = places.to_vec();
        if joined {
            places[0].sort_by(|a, b| bands.energy_ev(*a).total_cmp(&bands.energy_ev(*b)));
        }
        let states: Vec<Vec<State>> = (0..curves.len()).map(|band| bands.states(band)).collect();
        for (panel, content) in panels.iter_mut().enumerate() {
            for (band, curves) in curves.iter().enumerate() {
                if panel_of(Place { band, state: 0 }) == panel {
                    let sign = bands.band(band).sign();
                    for edge in &curves.edges {
                        let raised = |[z, ev]: &[f64; 2]| [*z, ev - zeros_ev[panel]];
                        content.edges.push(DrawnEdge {
                            sign,
                            dashed: content.edges.last().is_some_and(|edge| edge.sign == sign),
                            points: edge.iter().map(raised).collect(),
                        });
                    }
                }
            }
            content.edges.dedup_by(|one, other| alike(one, other));
            for place in &places[panel] {
                let state = &states[place.band][place.state];
                let level = bands.level(*place);
                let number = looks[panel].iter().position(|look| look == place);
                let number = number.unwrap_or(0);
                let light = match state.shares {
                    Some(shares) => shares.light > shares.heavy,
                    None => level.band == BandName::LightHole,
                };
                content.states.push(DrawnState {
                    sign: bands.band(place.band).sign(),
                    energy_ev: bands.energy_ev(*place) - zeros_ev[panel],
                    curves: curves[place.band].states[place.state].clone(),
                    label: label(level, state.shares.as_ref(), with_holes),
                    name: level.to_string(),
                    stroke: match level.band {
                        BandName::Conduction => palette::state(number, 0.9),
                        _ => palette::hole(number, light, 0.9),
                    },
                    mark: match state.hold {
                        Hold::Bound => "",
                        Hold::Leaky => "‡",
                        Hold::Walls => "†",
                    },
                });
            }
        }
        let drawn = |(from, to): (Place, Place)| {
            let find = |place: Place| {
                let panel = panel_of(place);
                let own = places[panel].iter().position(|p| *p == place)?;
                Some((panel, own))
            };
            Some(Drawn {
                from: find(from)?,
                to: find(to)?,
                energy_ev: bands.energy_ev(to) - bands.energy_ev(from),
            })
        };
        let chosen = chosen(structure, stack, bands, shown);
        BandDiagram {
            title: structure.title.clone().unwrap_or_default(),
            caption: caption(structure, stack, zeros_ev, &panels),
            layers: strip_layers(structure, stack),
            meanings: meanings(structure, stack),
            transitions: chosen.into_iter().filter_map(drawn).collect(),
            panels,
            width_nm: stack.total_width_nm(),
            zeros_ev,
        }
    }

    /// With a line at the Fermi level, given on the scale of the table of levels.
    pub fn with_fermi_level(mut self, fermi_ev: Option<f64>) -> BandDiagram {
        let Some(fermi_ev) = fermi_ev else {
            return self;
        };
        let above_ev = self.zeros_ev.map(|zero_ev| fermi_ev - zero_ev);
        // It is drawn where the carriers are.
        let electrons = self.panels.len() == 1 || above_ev[0].abs() <= above_ev[1].abs();
        let panel = usize::from(!electrons);
        self.panels[panel].fermi_ev = Some(above_ev[panel]);
        self.caption += " Long dashes: Fermi level.";
        self
    }

    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let (least_height, columns) = match width {
            Width::Column => (165.0_f64, 1),
            Width::Page => (215.0, 3),
        };
        // Of two panels the electrons' is the taller: they have more room in most stacks.
        let (parts, most): (&[f64], f64) = match self.panels.len() {
            1 => (&[1.0], TALLEST_PT),
            _ => (&[0.8, 0.65], 0.5 * TALLEST_PT),
        };
        let mut panels: Vec<Panel> = Vec::new();
        let mut height = 0.0;
        for (content, part) in self.panels.iter().zip(parts) {
            let labels_height = LABEL_STEP_PT * content.states.len() as f64;
            let own = (part * least_height).max(labels_height.min(most));
            let (mut vertical, pt_per_density) = content.vertical(own);
            if height > 0.0 {
                height += BREAK_PT;
            }
            vertical.range = vertical.range.map(|y| y + height);
            height += own;
            panels.push(Panel {
                content,
                horizontal: Scale {
                    domain: [0.0, self.width_nm],
                    range: [0.0, 1.0],
                },
                vertical,
                unit: content.unit(),
                pt_per_density,
            });
        }
        let labels: Vec<StateLabels> = self.panels.iter().map(Content::labels).collect();
        let rungs = self.transitions.iter().filter(|t| t.energy_ev > 0.0);
        let rungs = rungs.map(|t| self.rung(t, &panels));
        let (ladder, left_out) = Ladder::new(rungs.collect(), columns, height);

        let rooms = panels.iter().map(|panel| left_room(panel.vertical));
        let left = MARGIN_PT + rooms.fold(0.0, f64::max);
        let widths = labels.iter().map(StateLabels::widths);
        let widths = widths.fold([0.0; 2], |[a, b], [c, d]| [f64::max(a, c), f64::max(b, d)]);
        let labels_room = labels.iter().map(|l| l.room(widths)).fold(0.0, f64::max);
        let labels_left = page.width - MARGIN_PT - labels_room;
        let ladder_right = labels_left - LEADER_PT;
        let ladder_left = ladder_right - ladder.width();
        let right = ladder_left - if ladder.width() > 0.0 { 7.0 } else { 0.0 };

        let below_title = if self.title.is_empty() {
            4.0
        } else {
            page.title(&self.title)
        };
        let horizontal = Scale {
            domain: [0.0, self.width_nm],
            range: [left, right],
        };
        let strip = LayerStrip::new(&self.layers, horizontal);
        strip.draw(&mut page, below_title);
        let top = below_title + strip.height() + 1.0;
        let bottom = top + height;
        for panel in &mut panels {
            panel.horizontal = horizontal;
            panel.vertical.range = panel.vertical.range.map(|y| y + top);
            panel.draw_edges(&mut page, self.layers.len());
            panel.draw_fermi_level(&mut page);
            panel.draw_states(&mut page, [ladder_left, ladder_right]);
        }
        ladder.draw(&mut page, ladder_left, top, bottom);
        for (panel, labels) in panels.iter().zip(&labels) {
            panel.draw_labels(&mut page, labels, [ladder_right, labels_left], widths);
            let name = match (self.panels.len(), panel.content.sign > 0.0) {
                (1, _) => format!("Energy ({})", panel.unit.name),
                (_, true) => format!("Electrons ({})", panel.unit.name),
                (_, false) => format!("Holes ({})", panel.unit.name),
            };
            left_axis(&mut page, panel.vertical, left, &name);
        }
        if let [upper, lower] = &panels[..] {
            break_marks(
                &mut page,
                left,
                upper.vertical.range[0],
                lower.vertical.range[1],
            );
        }
        bottom_axis(&mut page, horizontal, bottom, "z (nm)");

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
        for dark in self.transitions.iter().filter(|t| t.energy_ev <= 0.0) {
            caption += &format!(
                " No light: {}, {} meV.",
                self.words(dark),
                minus(&significant(1e3 * dark.energy_ev, 4))
            );
        }
        y = page.caption(&caption, y + 1.0);
        let title = if self.title.is_empty() {
            "Band diagram"
        } else {
            &self.title
        };
        page.finish(y + 4.0, title, &self.description())
    }

    fn state(&self, (panel, state): (usize, usize)) -> &DrawnState {
        &self.panels[panel].states[state]
    }

    fn words(&self, transition: &Drawn) -> String {
        let [from, to] = [transition.from, transition.to].map(|place| &self.state(place).label);
        format!("{from} to {to}")
    }

    fn rung(&self, transition: &Drawn, panels: &[Panel]) -> Rung {
        let y = |place: (usize, usize)| panels[place.0].y(self.state(place).energy_ev);
        Rung {
            upper_y: y(transition.to),
            lower_y: y(transition.from),
            lines: [
                wavelength(transition.energy_ev),
                format!("{} meV", significant(1e3 * transition.energy_ev, 4)),
            ],
            states: self.words(transition),
        }
    }

    /// The picture in words.
    fn description(&self) -> String {
        let states = self.panels.iter().flat_map(|panel| {
            let unit = panel.unit();
            panel.states.iter().map(move |state| {
                format!(
                    "{} at {:.*} {}",
                    state.name,
                    unit.decimals,
                    unit.factor * state.energy_ev,
                    unit.name
                )
            })
        });
        let transitions = self
            .transitions
            .iter()
            .filter(|t| t.energy_ev > 0.0)
            .map(|t| {
                format!(
                    "{}: {} meV, {}",
                    self.words(t),
                    significant(1e3 * t.energy_ev, 4),
                    wavelength(t.energy_ev)
                )
            });
        let fermi = self.panels.iter().filter_map(|panel| {
            let unit = panel.unit();
            let energy = unit.factor * panel.fermi_ev?;
            Some(format!(
                "Fermi level at {energy:.*} {}",
                unit.decimals, unit.name
            ))
        });
        let list: Vec<String> = states.chain(transitions).chain(fermi).collect();
        format!(
            "Band {} and squared envelopes along the growth direction. {}.",
            if self
                .panels
                .iter()
                .map(|panel| panel.edges.len())
                .sum::<usize>()
                > 1
            {
                "edges"
            } else {
                "edge"
            },
            list.join("; ")
        )
    }
}

/// Whether two edges are one line.
fn alike(one: &DrawnEdge, other: &DrawnEdge) -> bool {
    let mut pairs = one.points.iter().zip(&other.points);
    one.sign == other.sign
        && one.points.len() == other.points.len()
        && pairs.all(|(a, b)| (a[1] - b[1]).abs() < ONE_EDGE_EV)
}

/// Whether some layer has its conduction edge below the valence edge of another, the field left out.
fn is_broken(stack: &Stack, bands: &Bands, curves: &[Curves]) -> bool {
    let field = stack.field_v_per_nm;
    let heights = |sign: f64| {
        let own = curves.iter().enumerate();
        own.filter(move |(band, _)| bands.band(*band).sign() == sign)
            .flat_map(|(_, curves)| curves.edges.iter().flatten())
            .map(move |[z, ev]| ev - field * z)
    };
    heights(1.0).fold(f64::INFINITY, f64::min) < heights(-1.0).fold(f64::NEG_INFINITY, f64::max)
}

/// What stands beside a level: of coupled states with what holds most of them, where that is not the band's own.
fn label(level: Level, shares: Option<&Shares>, with_holes: bool) -> String {
    let index = level.index;
    let own = match level.band {
        _ if !with_holes => index.to_string(),
        BandName::HeavyHole => format!("hh {index}"),
        BandName::LightHole => format!("lh {index}"),
        BandName::Valence => format!("v {index}"),
        BandName::Conduction => format!("c {index}"),
    };
    let Some(shares) = shares else {
        return own;
    };
    let (_, most) = [
        (shares.conduction, "c"),
        (shares.heavy, "hh"),
        (shares.light, "lh"),
        (shares.split_off, "so"),
    ]
    .into_iter()
    .fold((0.0, ""), |a, b| if b.0 > a.0 { b } else { a });
    match (level.band, most) {
        (BandName::Conduction, "c") => own,
        _ => format!("{own} {most}"),
    }
}

/// The vacuum wavelength in µm, or in mm from 1 mm on.
fn wavelength(energy_ev: f64) -> String {
    let wavelength_um = HC_EV_UM / energy_ev;
    if wavelength_um < 1e3 {
        format!("{} µm", significant(wavelength_um, 4))
    } else {
        format!("{} mm", significant(1e-3 * wavelength_um, 4))
    }
}

/// Pairs of states, the lower first, that the aims name; without aims the strongest transitions.
fn chosen(
    structure: &Structure,
    stack: &Stack,
    bands: &Bands,
    shown: &[usize],
) -> Vec<(Place, Place)> {
    let is_shown = |place: &Place| place.state < shown[place.band];
    if let Some(tune) = &structure.tune {
        let mut pairs: Vec<(Place, Place)> = Vec::new();
        for aim in &tune.aims {
            let mut pair = (bands.place(aim.from), bands.place(aim.to));
            let same_band = pair.0.band == pair.1.band;
            if same_band && bands.energy_ev(pair.0) > bands.energy_ev(pair.1) {
                pair = (pair.1, pair.0);
            }
            let named = |place: Place, level: crate::structure::Level| {
                level.band == BandName::Valence || bands.level(place) == level
            };
            let there =
                named(bands.place(aim.from), aim.from) && named(bands.place(aim.to), aim.to);
            if there && is_shown(&pair.0) && is_shown(&pair.1) && !pairs.contains(&pair) {
                pairs.push(pair);
            }
        }
        return pairs;
    }
    let mut inside = band_transitions(bands, 0);
    inside.retain(|t| t.to < shown[0]);
    inside.sort_by(|a, b| b.oscillator_strength.total_cmp(&a.oscillator_strength));
    let strongest = inside.first().map_or(0.0, |t| t.oscillator_strength);
    inside.retain(|t| t.oscillator_strength >= WEAKEST * strongest);
    inside.truncate(MOST_TRANSITIONS);
    let electron = |state: usize| Place { band: 0, state };
    let inside = inside.iter().map(|t| (electron(t.from), electron(t.to)));
    let mut between = Vec::new();
    if bands.count() > 1 {
        between = interband(stack, bands);
        between.retain(|pair| is_shown(&pair.hole) && is_shown(&pair.electron));
        // The light of both TE directions and TM together.
        between.sort_by(|a, b| b.overlap.abs().total_cmp(&a.overlap.abs()));
        let lowest = |pair: &crate::optics::Interband| pair.electron == electron(0);
        between.retain(lowest);
        between.truncate(MOST_BETWEEN_BANDS);
    }
    let between = between.iter().map(|pair| (pair.hole, pair.electron));
    between.chain(inside).collect()
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

fn caption(structure: &Structure, stack: &Stack, zeros_ev: [f64; 2], panels: &[Content]) -> String {
    let valence = structure.valence.map(|valence| valence.model);
    let eight_band = structure.conduction.model == ConductionModel::EightBand;
    let dashed = panels.iter().any(|p| p.edges.iter().any(|e| e.dashed));
    let joined = valence.is_some() && panels.len() == 1;
    let mut text = format!(
        "Black: {}. Lines: squared envelopes, each {} on its energy{}. {} K, field {} kV/cm, {} {}{}. ",
        match valence {
            None => "conduction band edge",
            Some(_) if dashed => "band edges, dashed that of light holes",
            Some(_) => "band edges",
        },
        match valence {
            Some(_) => "standing (electrons) or hanging (holes; light ones dashed)",
            None => "standing",
        },
        match (structure.conduction.model, valence) {
            (ConductionModel::EightBand, _) =>
                "; shaded: the sum over all components of each state, all of the same area, the line the largest of them",
            (ConductionModel::EnergyDependent, Some(ValenceModel::SixBand)) =>
                "; shaded: the sum over all components of each state, all of the same area, the line of a hole the largest of them",
            (ConductionModel::EnergyDependent, _) =>
                "; shaded: the sum over all components of each state, all of the same area",
            (ConductionModel::Parabolic, Some(ValenceModel::SixBand)) =>
                ", all of the same area; shaded: the sum over all components of each hole, the line the largest of them",
            (ConductionModel::Parabolic, _) => ", all of the same area",
        },
        short(structure.temperature_k, 4),
        short(1e4 * stack.field_v_per_nm, 4),
        model_name(structure.conduction.model),
        match (eight_band, valence) {
            (true, None) => "electrons",
            (true, Some(_)) => "electrons and holes",
            _ => "mass",
        },
        match valence {
            Some(model) if !eight_band => format!(", {} holes", valence_model_name(model)),
            _ => String::new(),
        },
    );
    if valence.is_some() {
        text += match valence {
            Some(ValenceModel::Decoupled) => "Levels: c conduction, hh heavy-hole, lh light-hole. ",
            _ => {
                "Levels: c conduction, v valence, counted from the gap, with what holds most of the state: hh heavy, lh \
                 light, so split-off hole, c conduction band. "
            }
        };
    }
    text += &match (valence, joined) {
        (None, _) => format!(
            "The zero is the lowest band edge, {} eV in the table of levels.",
            minus(&format!("{:.4}", zeros_ev[0]))
        ),
        (Some(_), true) => {
            let holes = panels[0].edges.iter().filter(|edge| edge.sign < 0.0);
            let highest = holes.flat_map(|edge| &edge.points);
            let highest = highest.fold(f64::NEG_INFINITY, |a, p| a.max(p[1]));
            format!(
                "The gap is broken: one axis for both. The zero is the lowest conduction edge, {} eV in the table of levels; \
                 the highest valence edge lies {:.0} meV above it. Grey between the edges: the gap of each layer.",
                minus(&format!("{:.4}", zeros_ev[0])),
                1e3 * highest
            )
        }
        (Some(_), false) => format!(
            "The axis is broken: zeros are the lowest conduction edge ({} eV in the table of levels) and the highest valence \
             edge ({} eV), {:.1} meV {} it; the panels have scales of their own.",
            minus(&format!("{:.4}", zeros_ev[0])),
            minus(&format!("{:.4}", zeros_ev[1])),
            1e3 * (zeros_ev[0] - zeros_ev[1]).abs(),
            match zeros_ev[0] < zeros_ev[1] {
                true => "above",
                false => "below",
            }
        ),
    };
    repeats(&structure.sequence, &mut text);
    for (mark, meaning) in [
        ("†", "held by the walls only, not bound"),
        ("‡", "can tunnel out at an end"),
    ] {
        let mut states = panels.iter().flat_map(|panel| &panel.states);
        if states.any(|state| state.mark == mark) {
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
