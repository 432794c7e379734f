//! Subband and transition tables of one stack.

use super::layer_edges::LayerEdges;
use super::table::{error_mev, given, significant, table};
use super::{Report, csv_table};
use crate::models::model_name;
use crate::optics::{Transition, transitions};
use crate::structure::{Stack, Structure};
use crate::subbands::{Audit, Hold, State, Subbands};
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
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    width_nm: f64,
    bound_states: usize,
    subbands: Vec<SubbandRow>,
    transitions: Vec<TransitionRow>,
    oscillator_strength_definition: &'static str,
    dipole_definition: &'static str,
    audit: AuditRow,
    #[serde(flatten)]
    edges: LayerEdges,
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
    /// Gathers the tables. `shown` limits the states that are listed: more may have been solved.
    pub fn new(structure: &Structure, stack: &Stack, subbands: &Subbands, shown: usize) -> Levels {
        let name = |index: usize| format!("conduction {}", index + 1);
        let row = |(index, state): (usize, &State)| SubbandRow {
            band: "conduction",
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
        };
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
        let Audit {
            orthonormality,
            velocity,
            force,
            sum_rule,
            returned,
            counted,
        } = subbands.audit();
        Levels {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            width_nm: stack.total_width_nm(),
            bound_states: subbands.bound_count(),
            subbands: subbands
                .states()
                .iter()
                .take(shown)
                .enumerate()
                .map(row)
                .collect(),
            transitions: transitions(subbands)
                .iter()
                .filter(|t| t.to < shown)
                .map(transition)
                .collect(),
            oscillator_strength_definition: STRENGTH_DEFINITION,
            dipole_definition: DIPOLE_DEFINITION,
            audit: AuditRow {
                orthonormality,
                velocity_position: velocity,
                mean_force: force,
                sum_rule,
                states_returned: returned,
                states_counted: counted,
                faults: subbands.audit().faults(),
            },
            edges: LayerEdges::new(structure, stack),
        }
    }

    /// Number of states that are listed.
    pub fn states(&self) -> usize {
        self.subbands.len()
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
                "conduction",
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
                        s.index.to_string(),
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
        format!(
            "{subbands}\n{} below the lower outer barrier edge.\n\n{transitions}\nStrength: {STRENGTH_DEFINITION}.\nDipole: {DIPOLE_DEFINITION}.\n\
             Audit {verdict}: overlaps {:.0e}, velocity and position {:.0e}, mean force {:.0e}, sum rule {:.0e}; {} states found, {} counted.\n",
            match self.bound_states {
                1 => "One state lies".to_owned(),
                n => format!("{n} states lie"),
            },
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
            "{title}{} K, field {} kV/cm, {} mass, {:.2} nm between walls\n\n{}{}",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
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
        if self.edges.are_strained() {
            text.push('\n');
            text.push_str(&csv_table(&self.edges.layers)?);
        }
        Ok(text)
    }
}
