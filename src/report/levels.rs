//! Subband and transition tables of one stack.

use super::charge::ChargeReport;
use super::interband::Interbands;
use super::layer_edges::LayerEdges;
use super::table::{error_mev, given, significant, table};
use super::{Report, csv_table};
use crate::models::model_name;
use crate::optics::{Transition, transitions};
use crate::structure::{BandName, Stack, Structure};
use crate::subbands::{Audit, Bands, Hold, Place};
use serde::Serialize;

/// What the oscillator strengths mean; printed with them.
const STRENGTH_DEFINITION: &str = "2 m0 E |z|²/ħ² with the free-electron mass; normalised: with the in-plane mass of the lower state";
/// What the dipoles mean with an energy-dependent mass.
const DIPOLE_DEFINITION: &str =
    "|<from|z|to>|, of all components of the states where the mass depends on energy";

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
    subbands: Vec<SubbandRow>,
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

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct SubbandRow {
    band: &'static str,
    index: usize,
    energy_eV: f64,
    from_edge_meV: f64,
    error_meV: f64,
    in_plane_mass: f64,
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
    normalised_strength: f64,
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
        for (band, solved) in bands.all().iter().enumerate() {
            let states = solved.states();
            for (index, state) in states.iter().enumerate().take(shown[band]) {
                subbands.push(SubbandRow {
                    band: solved.band.name().word(),
                    index: index + 1,
                    energy_eV: state.energy_ev,
                    from_edge_meV: 1e3 * state.from_edge_ev,
                    error_meV: 1e3 * state.error_ev,
                    in_plane_mass: state.in_plane_mass_m0,
                    centre_nm: state.centre_nm,
                    extent_nm: state.extent_nm,
                    layer: stack.layers[state.layer].label.clone(),
                    layer_share: state.layer_share,
                    bound: state.hold != Hold::Walls,
                    held_by: held_by(state.hold),
                });
            }
        }
        let name = |state: usize| bands.level(Place { band: 0, state }).to_string();
        let transition = |t: &Transition| TransitionRow {
            from: name(t.from),
            to: name(t.to),
            energy_meV: 1e3 * t.energy_ev,
            wavelength_um: t.wavelength_um(),
            frequency_THz: t.frequency_thz(),
            dipole_nm: t.dipole_nm,
            oscillator_strength: t.oscillator_strength,
            normalised_strength: t.normalised_strength,
            overlap: t.overlap,
        };
        let audits = bands.all().iter().map(|band| band.audit());
        let audit = audits.reduce(Audit::with).unwrap_or(Audit::CLEAN);
        let Audit {
            orthonormality,
            velocity,
            force,
            sum_rule,
            returned,
            counted,
        } = audit;
        let bound = |band: BandName| -> usize {
            let own = bands.all().iter().filter(|b| b.band.name() == band);
            own.map(|b| b.bound_count()).sum()
        };
        Levels {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            valence_model: structure.valence.map(|_| "decoupled"),
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            width_nm: stack.total_width_nm(),
            bound_states: bound(BandName::Conduction),
            bound_hole_states: structure.valence.map(|_| BoundHoles {
                heavy: bound(BandName::HeavyHole),
                light: bound(BandName::LightHole),
            }),
            subbands,
            transitions: transitions(bands.conduction())
                .iter()
                .filter(|t| t.to < shown[0])
                .map(transition)
                .collect(),
            interband: structure
                .valence
                .map(|_| Interbands::new(stack, bands, shown)),
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
                .map(|s| {
                    vec![
                        match self.valence_model {
                            Some(_) => format!("{} {}", s.band, s.index),
                            None => s.index.to_string(),
                        },
                        format!("{:.5}", s.energy_eV),
                        format!("{:.2}", s.from_edge_meV),
                        error_mev(1e-3 * s.error_meV),
                        significant(s.in_plane_mass, 3),
                        format!("{:.2}", s.centre_nm),
                        format!("{:.2}", s.extent_nm),
                        format!("{} ({:.0} %)", s.layer, 100.0 * s.layer_share),
                        s.held_by.to_owned(),
                    ]
                })
                .collect(),
        );
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
            &[],
            self.transitions
                .iter()
                .map(|t| {
                    let number = |name: &str| name.trim_start_matches("conduction ").to_owned();
                    vec![
                        number(&t.from),
                        number(&t.to),
                        format!("{:.2}", t.energy_meV),
                        significant(t.wavelength_um, 4),
                        significant(t.frequency_THz, 4),
                        format!("{:.3}", t.dipole_nm),
                        format!("{:.3}", t.oscillator_strength),
                        format!("{:.3}", t.normalised_strength),
                        format!("{:.2}", t.overlap),
                    ]
                })
                .collect(),
        );
        let a = &self.audit;
        let verdict = if a.faults.is_empty() {
            "passed".to_owned()
        } else {
            a.faults.join("; ")
        };
        let interband = self
            .interband
            .as_ref()
            .map(|interband| format!("\n{}", interband.text()))
            .unwrap_or_default();
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
            "{subbands}\n{} below the lower outer barrier edge.{}\n\n{transitions}\nStrength: {STRENGTH_DEFINITION}.\nDipole: {DIPOLE_DEFINITION}.\n{interband}\n{charge}\
             Audit {verdict}: overlaps {:.0e}, velocity and position {:.0e}, mean force {:.0e}, sum rule {:.0e}; {} states found, {} counted.\n",
            match self.bound_states {
                1 => "One state lies".to_owned(),
                n => format!("{n} states lie"),
            },
            holes.unwrap_or_default(),
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
            "{title}{} K, field {} kV/cm, {} mass{}, {:.2} nm between walls\n\n{}{}",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
            match self.valence_model {
                Some(model) => format!(", {model} holes"),
                None => String::new(),
            },
            self.width_nm,
            self.tables(),
            self.edges_text()
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        let mut text = format!(
            "{}\n{}",
            csv_table(&self.subbands)?,
            csv_table(&self.transitions)?
        );
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
