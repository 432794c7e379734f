//! Subband and transition tables of one stack.

use super::charge::ChargeReport;
use super::interband::Interbands;
use super::layer_edges::LayerEdges;
use super::table::{error_mev, given, significant, table};
use super::{Report, csv_table, verdict};
use crate::models::{model_name, valence_model_name};
use crate::optics::{Transition, band_transitions};
use crate::structure::{BandName, ConductionModel, Stack, Structure, ValenceModel};
use crate::subbands::multiband::Shares;
use crate::subbands::{Audit, Bands, Hold, Place};
use serde::Serialize;

/// What the oscillator strengths mean; printed with them.
const STRENGTH_DEFINITION: &str = "2 m0 E |z|²/ħ² with the free-electron mass; normalised: with the in-plane mass of the lower state";
/// What the dipoles mean with an energy-dependent mass.
const DIPOLE_DEFINITION: &str = "|<from|z|to>|, of all components of the states where the mass depends on energy or bands are coupled";

/// The solved levels of a stack.
#[derive(Debug, Serialize)]
pub struct Levels {
    title: Option<String>,
    model: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    valence_model: Option<&'static str>,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    width_nm: f64,
    bound_states: usize,
    #[serde(skip_serializing_if = "Option::is_none")]
    bound_hole_states: Option<BoundHoles>,
    #[serde(skip_serializing_if = "Option::is_none")]
    bound_valence_states: Option<usize>,
    subbands: Vec<LevelRow>,
    transitions: Vec<TransitionRow>,
    #[serde(flatten)]
    interband: Option<Interbands>,
    oscillator_strength_definition: &'static str,
    dipole_definition: &'static str,
    audit: AuditRow,
    #[serde(skip_serializing_if = "Option::is_none")]
    charge: Option<ChargeReport>,
    #[serde(flatten)]
    edges: LayerEdges,
}

#[derive(Debug, Serialize)]
struct BoundHoles {
    heavy: usize,
    light: usize,
}

/// A subband, with what it is made of where bands are coupled.
#[derive(Debug, Serialize)]
struct LevelRow {
    #[serde(flatten)]
    level: SubbandRow,
    #[serde(flatten)]
    character: Option<CharacterRow>,
}

/// What a state of coupled bands is made of.
#[derive(Debug, Serialize)]
struct CharacterRow {
    /// The kind with the largest share.
    character: &'static str,
    conduction_share: f64,
    heavy_share: f64,
    light_share: f64,
    split_off_share: f64,
}

impl CharacterRow {
    fn new(shares: &Shares) -> CharacterRow {
        let kinds = [
            ("conduction", shares.conduction),
            ("heavy hole", shares.heavy),
            ("light hole", shares.light),
            ("split-off hole", shares.split_off),
        ];
        let largest = kinds.into_iter().max_by(|a, b| a.1.total_cmp(&b.1));
        CharacterRow {
            character: largest.map_or("", |(kind, _)| kind),
            conduction_share: shares.conduction,
            heavy_share: shares.heavy,
            light_share: shares.light,
            split_off_share: shares.split_off,
        }
    }
}

/// A row of the table of characters.
#[derive(Serialize)]
struct NamedCharacter<'r> {
    band: &'static str,
    index: usize,
    character: &'static str,
    conduction_share: &'r f64,
    heavy_share: &'r f64,
    light_share: &'r f64,
    split_off_share: &'r f64,
}

#[derive(Clone, Debug, Serialize)]
#[allow(non_snake_case)]
struct SubbandRow {
    band: &'static str,
    index: usize,
    energy_eV: f64,
    from_edge_meV: f64,
    error_meV: f64,
    /// `None` where two coupled levels that coincide leave k∥ = 0 in straight lines.
    in_plane_mass: Option<f64>,
    centre_nm: f64,
    extent_nm: f64,
    layer: String,
    layer_share: f64,
    bound: bool,
    held_by: &'static str,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct TransitionRow {
    from: String,
    to: String,
    energy_meV: f64,
    wavelength_um: f64,
    frequency_THz: f64,
    dipole_nm: f64,
    oscillator_strength: f64,
    /// `None` without a positive in-plane mass.
    normalised_strength: Option<f64>,
    overlap: f64,
}

#[derive(Debug, Serialize)]
struct AuditRow {
    orthonormality: f64,
    velocity_position: f64,
    mean_force: f64,
    sum_rule: f64,
    states_returned: usize,
    states_counted: usize,
    faults: Vec<String>,
}

fn held_by(hold: Hold) -> &'static str {
    match hold {
        Hold::Bound => "barriers",
        Hold::Leaky => "barriers, can tunnel out",
        Hold::Walls => "walls only, not bound",
    }
}

impl Levels {
    /// Gathers the tables. `shown` limits the states of each band that are listed: more may have been solved.
    pub fn new(structure: &Structure, stack: &Stack, bands: &Bands, shown: &[usize]) -> Levels {
        let mut subbands = Vec::new();
        for (band, &shown) in shown.iter().enumerate() {
            let states = bands.states(band);
            for (index, state) in states.iter().enumerate().take(shown) {
                let mass_m0 = state.in_plane_mass_m0;
                subbands.push(LevelRow {
                    level: SubbandRow {
                        band: bands.band(band).name().word(),
                        index: index + 1,
                        energy_eV: state.energy_ev,
                        from_edge_meV: 1e3 * state.from_edge_ev,
                        error_meV: 1e3 * state.error_ev,
                        in_plane_mass: (mass_m0 != 0.0).then_some(mass_m0),
                        centre_nm: state.centre_nm,
                        extent_nm: state.extent_nm,
                        layer: stack.layers[state.layer].label.clone(),
                        layer_share: state.layer_share,
                        bound: state.hold != Hold::Walls,
                        held_by: held_by(state.hold),
                    },
                    character: state.shares.as_ref().map(CharacterRow::new),
                });
            }
        }
        let transition = |band: usize, t: &Transition| {
            let name = |state: usize| bands.level(Place { band, state }).to_string();
            TransitionRow {
                from: name(t.from),
                to: name(t.to),
                energy_meV: 1e3 * t.energy_ev,
                wavelength_um: t.wavelength_um(),
                frequency_THz: t.frequency_thz(),
                dipole_nm: t.dipole_nm,
                oscillator_strength: t.oscillator_strength,
                normalised_strength: (t.normalised_strength >= 0.0)
                    .then_some(t.normalised_strength),
                overlap: t.overlap,
            }
        };
        // Holes on their own have no table of this kind.
        let mut transitions = Vec::new();
        for (band, &shown) in shown.iter().enumerate() {
            if band == 0 || bands.band(band).coupled().is_some() {
                let own = band_transitions(bands, band);
                let own = own.iter().filter(|t| t.from.max(t.to) < shown);
                transitions.extend(own.map(|t| transition(band, t)));
            }
        }
        let audit = bands.audit();
        let Audit {
            orthonormality,
            velocity,
            force,
            sum_rule,
            returned,
            counted,
        } = audit;
        let bound = |name: BandName| -> usize {
            let own = (0..bands.count()).filter(|&band| bands.band(band).name() == name);
            own.map(|band| bands.bound_count(band)).sum()
        };
        let valence = structure.valence.map(|valence| valence.model);
        let decoupled = valence == Some(ValenceModel::Decoupled);
        Levels {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            valence_model: valence.map(valence_model_name),
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            width_nm: stack.total_width_nm(),
            bound_states: bound(BandName::Conduction),
            bound_hole_states: decoupled.then(|| BoundHoles {
                heavy: bound(BandName::HeavyHole),
                light: bound(BandName::LightHole),
            }),
            bound_valence_states: (valence.is_some() && !decoupled)
                .then(|| bound(BandName::Valence)),
            subbands,
            transitions,
            interband: valence.map(|model| Interbands::new(model, stack, bands, shown)),
            oscillator_strength_definition: STRENGTH_DEFINITION,
            dipole_definition: DIPOLE_DEFINITION,
            audit: AuditRow {
                orthonormality,
                velocity_position: velocity,
                mean_force: force,
                sum_rule,
                states_returned: returned,
                states_counted: counted,
                faults: audit.faults(),
            },
            charge: None,
            edges: LayerEdges::new(structure, stack),
        }
    }

    /// With what charge does to the stack.
    pub fn with_charge(self, charge: Option<ChargeReport>) -> Levels {
        Levels { charge, ..self }
    }

    /// The edges of strained layers, and what the band offsets rest on.
    fn edges_text(&self) -> String {
        let mut text = self.edges.offset_lines();
        if self.edges.are_strained() {
            text = format!("\nStrain and band edges\n{}{text}", self.edges.text());
        }
        text
    }

    /// What the coupled states are made of.
    fn characters(&self) -> Vec<NamedCharacter<'_>> {
        let rows = self.subbands.iter();
        rows.filter_map(|row| {
            let of = row.character.as_ref()?;
            Some(NamedCharacter {
                band: row.level.band,
                index: row.level.index,
                character: of.character,
                conduction_share: &of.conduction_share,
                heavy_share: &of.heavy_share,
                light_share: &of.light_share,
                split_off_share: &of.split_off_share,
            })
        })
        .collect()
    }

    /// The two tables and the audit, without the title.
    pub fn tables(&self) -> String {
        let subbands = table(
            &[
                if self.valence_model.is_some() {
                    "level"
                } else {
                    "conduction"
                },
                "energy eV",
                "from edge meV",
                "error meV",
                "mass m0",
                "centre nm",
                "extent nm",
                "mostly in",
                "held by",
            ],
            &[7, 8],
            self.subbands
                .iter()
                .map(|row| &row.level)
                .map(|s| {
                    vec![
                        match self.valence_model {
                            Some(_) => format!("{} {}", s.band, s.index),
                            None => s.index.to_string(),
                        },
                        format!("{:.5}", s.energy_eV),
                        format!("{:.2}", s.from_edge_meV),
                        error_mev(1e-3 * s.error_meV),
                        s.in_plane_mass
                            .map_or("-".to_owned(), |mass| significant(mass, 3)),
                        format!("{:.2}", s.centre_nm),
                        format!("{:.2}", s.extent_nm),
                        format!("{} ({:.0} %)", s.layer, 100.0 * s.layer_share),
                        s.held_by.to_owned(),
                    ]
                })
                .collect(),
        );
        let both_bands = self.bound_valence_states.is_some();
        let transitions = table(
            &[
                "from",
                "to",
                "energy meV",
                "wavelength µm",
                "THz",
                "dipole nm",
                "strength",
                "normalised",
                "overlap",
            ],
            if both_bands { &[0, 1] } else { &[] },
            self.transitions
                .iter()
                .map(|t| {
                    let number = |name: &str| match both_bands {
                        true => name.to_owned(),
                        false => name.trim_start_matches("conduction ").to_owned(),
                    };
                    vec![
                        number(&t.from),
                        number(&t.to),
                        format!("{:.2}", t.energy_meV),
                        significant(t.wavelength_um, 4),
                        significant(t.frequency_THz, 4),
                        format!("{:.3}", t.dipole_nm),
                        format!("{:.3}", t.oscillator_strength),
                        t.normalised_strength
                            .map_or("-".to_owned(), |f| format!("{f:.3}")),
                        format!("{:.2}", t.overlap),
                    ]
                })
                .collect(),
        );
        let a = &self.audit;
        let verdict = verdict(&a.faults);
        let interband = self
            .interband
            .as_ref()
            .map(|interband| format!("\n{}", interband.text()))
            .unwrap_or_default();
        let characters = self.characters();
        let characters = match characters.is_empty() {
            true => String::new(),
            false => format!(
                "\n{}",
                table(
                    &[
                        "level",
                        "mostly",
                        "conduction %",
                        "heavy %",
                        "light %",
                        "split-off %"
                    ],
                    &[0, 1],
                    characters
                        .iter()
                        .map(|row| {
                            let percent = |share: &f64| format!("{:.1}", 100.0 * share);
                            vec![
                                format!("{} {}", row.band, row.index),
                                row.character.to_owned(),
                                percent(row.conduction_share),
                                percent(row.heavy_share),
                                percent(row.light_share),
                                percent(row.split_off_share),
                            ]
                        })
                        .collect(),
                )
            ),
        };
        let coupled_holes = self.bound_valence_states.map(|states| {
            format!(
                " Of holes {states} lie above the higher outer valence edge; they are counted downwards from the highest valence \
                 edge of the stack. Masses in the plane: curvatures at k∥ = 0, negative where a hole's energy rises."
            )
        });
        let holes = self.bound_hole_states.as_ref().map(|holes| {
            format!(
                " Of heavy holes {} and of light holes {} lie above the higher one of their own; holes are counted downwards. \
                 Hole masses in the plane: diagonal approximation, 1/(γ1 + γ2) and 1/(γ1 − γ2).",
                holes.heavy, holes.light
            )
        });
        let charge = self
            .charge
            .as_ref()
            .map(|charge| format!("{}\n", charge.text()))
            .unwrap_or_default();
        format!(
            "{subbands}\n{} below the lower outer barrier edge.{}\n{characters}\n{transitions}\nStrength: {STRENGTH_DEFINITION}.\nDipole: {DIPOLE_DEFINITION}.\n{interband}\n{charge}\
             Audit {verdict}: overlaps {:.0e}, velocity and position {:.0e}, mean force {:.0e}, sum rule {:.0e}; {} states found, {} counted.\n",
            match self.bound_states {
                1 => "One state lies".to_owned(),
                n => format!("{n} states lie"),
            },
            holes.or(coupled_holes).unwrap_or_default(),
            a.orthonormality,
            a.velocity_position,
            a.mean_force,
            a.sum_rule,
            a.states_returned,
            a.states_counted,
        )
    }
}

impl Report for Levels {
    fn text(&self) -> String {
        let title = self
            .title
            .as_ref()
            .map(|t| format!("{t}\n"))
            .unwrap_or_default();
        format!(
            "{title}{} K, field {} kV/cm, {}, {:.2} nm between walls\n\n{}{}",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            match self.valence_model {
                _ if self.model == model_name(ConductionModel::EightBand) =>
                    "eight-band electrons and holes".to_owned(),
                Some(model) => format!("{} mass, {model} holes", self.model),
                None => format!("{} mass", self.model),
            },
            self.width_nm,
            self.tables(),
            self.edges_text()
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        let levels: Vec<&SubbandRow> = self.subbands.iter().map(|row| &row.level).collect();
        let mut text = csv_table(&levels)?;
        let characters = self.characters();
        if !characters.is_empty() {
            text.push_str(&format!("\n{}", csv_table(&characters)?));
        }
        text.push_str(&format!("\n{}", csv_table(&self.transitions)?));
        if let Some(interband) = &self.interband {
            text.push('\n');
            text.push_str(&interband.csv()?);
        }
        if let Some(charge) = &self.charge {
            text.push('\n');
            text.push_str(&charge.csv()?);
        }
        if self.edges.are_strained() {
            text.push('\n');
            text.push_str(&csv_table(&self.edges.layers)?);
        }
        Ok(text)
    }
}
