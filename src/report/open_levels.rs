//! Quasi-bound states of a stack with open ends: energies with escape widths and lifetimes, and the transitions.

use super::lifetime::{leaves_through, lifetime, width_mev};
use super::table::{error_mev, given, significant, table};
use super::{Report, csv_table, verdict};
use crate::constants::{H_EV_PER_THZ, HBAR2_OVER_2M0, HC_EV_UM};
use crate::models::model_name;
use crate::open_ends::{QuasiBoundStates, moment};
use crate::structure::{Stack, Structure};
use serde::Serialize;

const STRENGTH_DEFINITION: &str = "2 m0 E |z|²/ħ² with the free-electron mass; normalised: with the in-plane mass of the lower state";
const DIPOLE_DEFINITION: &str = "|<from|z|to>| of outgoing states, the bilinear element without conjugation, all components included";
/// Widths taken as outflow and as −2 Im E may differ by this part.
const DEVIATION: f64 = 1e-6;

/// The levels of a stack with open ends.
#[derive(Debug, Serialize)]
pub struct OpenLevels {
    title: Option<String>,
    model: &'static str,
    ends: &'static str,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    width_nm: f64,
    bound_states: usize,
    #[serde(rename = "searched_to_meV")]
    searched_to_mev: f64,
    #[serde(rename = "searched_width_meV")]
    searched_width_mev: f64,
    subbands: Vec<StateRow>,
    transitions: Vec<TransitionRow>,
    oscillator_strength_definition: &'static str,
    dipole_definition: &'static str,
    audit: AuditRow,
    #[serde(skip)]
    asked: usize,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct StateRow {
    band: &'static str,
    index: usize,
    energy_eV: f64,
    from_edge_meV: f64,
    error_meV: f64,
    escape_width_meV: f64,
    width_relative_error: f64,
    /// Absent for a state that cannot leave, or so slowly that nothing is told of it.
    lifetime_ps: Option<f64>,
    width_through_bottom_meV: f64,
    width_through_top_meV: f64,
    in_plane_mass: f64,
    centre_nm: f64,
    extent_nm: f64,
    layer: String,
    layer_share: f64,
    bound: bool,
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
    /// Full width that the escape of both states gives to the line.
    escape_broadening_meV: f64,
}

#[derive(Debug, Serialize)]
struct AuditRow {
    width_as_outflow: f64,
    states_returned: usize,
    states_counted: usize,
    faults: Vec<String>,
}

impl OpenLevels {
    /// Gathers the tables of the lowest states, as many as the structure asks for.
    pub fn new(structure: &Structure, stack: &Stack, solved: &QuasiBoundStates) -> OpenLevels {
        let asked = structure.conduction.states;
        let shown = asked.min(solved.states.len());
        let states = &solved.states[..shown];
        let subbands = states.iter().enumerate().map(|(index, state)| StateRow {
            band: "conduction",
            index: index + 1,
            energy_eV: state.energy_ev,
            from_edge_meV: 1e3 * (state.energy_ev - solved.floor_ev),
            error_meV: 1e3 * state.error_ev,
            escape_width_meV: 1e3 * state.width_ev,
            width_relative_error: state.width_error,
            lifetime_ps: state.lifetime_ps(),
            width_through_bottom_meV: 1e3 * state.partial_widths_ev[0],
            width_through_top_meV: 1e3 * state.partial_widths_ev[1],
            in_plane_mass: state.in_plane_mass_m0,
            centre_nm: state.centre_nm,
            extent_nm: state.extent_nm,
            layer: stack.layers[state.layer].label.clone(),
            layer_share: state.layer_share,
            bound: state.bound,
        });
        let mut transitions = Vec::new();
        for (i, lower) in states.iter().enumerate() {
            for (j, upper) in states.iter().enumerate().skip(i + 1) {
                let energy_ev = upper.energy_ev - lower.energy_ev;
                let [from, to] = [i, j].map(|k| &solved.outgoing[k]);
                let dipole_nm = moment(&solved.line, from, to, lower.centre_nm).norm();
                let strength = energy_ev * dipole_nm * dipole_nm / HBAR2_OVER_2M0;
                transitions.push(TransitionRow {
                    from: format!("conduction {}", i + 1),
                    to: format!("conduction {}", j + 1),
                    energy_meV: 1e3 * energy_ev,
                    wavelength_um: HC_EV_UM / energy_ev,
                    frequency_THz: energy_ev / H_EV_PER_THZ,
                    dipole_nm,
                    oscillator_strength: strength,
                    normalised_strength: strength * lower.in_plane_mass_m0,
                    escape_broadening_meV: 1e3 * (lower.width_ev + upper.width_ev),
                });
            }
        }
        OpenLevels {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            ends: match solved.leads_ev {
                Some(_) => "open, flat outside",
                None => "open, the field goes on outside",
            },
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            width_nm: stack.total_width_nm(),
            bound_states: solved.states.iter().filter(|state| state.bound).count(),
            searched_to_mev: 1e3 * (solved.top_ev - solved.floor_ev),
            searched_width_mev: 1e3 * solved.widest_ev,
            subbands: subbands.collect(),
            transitions,
            oscillator_strength_definition: STRENGTH_DEFINITION,
            dipole_definition: DIPOLE_DEFINITION,
            audit: AuditRow {
                width_as_outflow: solved.width_deviation,
                states_returned: solved.found,
                states_counted: solved.counted,
                faults: faults(solved),
            },
            asked,
        }
    }

    /// What is off, in words.
    pub fn faults(&self) -> &[String] {
        &self.audit.faults
    }
}

/// What is off with a solution, in words; empty when all is well.
pub fn faults(solved: &QuasiBoundStates) -> Vec<String> {
    let mut faults = Vec::new();
    let deviation = solved.width_deviation;
    if deviation.is_nan() || deviation > DEVIATION {
        faults.push(format!(
            "widths as outflow and as -2 Im E differ (relative {deviation:.1e})"
        ));
    }
    if solved.found != solved.counted {
        faults.push(format!(
            "{} states were found where {} are counted",
            solved.found, solved.counted
        ));
    }
    if !solved.complete {
        faults.push(format!(
            "the search ended {:.0} meV above the lowest edge, before it would take too long: higher levels are not listed; shorter outer barriers or fewer periods take less",
            1e3 * (solved.top_ev - solved.floor_ev)
        ));
    }
    for (index, state) in solved.states.iter().enumerate() {
        if !(state.error_ev < 1e-6 && state.width_error < 1e-2) {
            faults.push(format!("conduction {} did not settle", index + 1));
        }
    }
    faults
}

impl Report for OpenLevels {
    fn text(&self) -> String {
        let title = self
            .title
            .as_ref()
            .map_or(String::new(), |title| format!("{title}\n"));
        let states = self.subbands.iter().map(|s| {
            let partial = [s.width_through_bottom_meV, s.width_through_top_meV];
            vec![
                s.index.to_string(),
                format!("{:.5}", s.energy_eV),
                format!("{:.2}", s.from_edge_meV),
                error_mev(1e-3 * s.error_meV),
                if s.bound {
                    "none".to_owned()
                } else {
                    width_mev(1e-3 * s.escape_width_meV, s.width_relative_error)
                },
                if s.bound {
                    "bound".to_owned()
                } else {
                    lifetime(s.lifetime_ps)
                },
                leaves_through(partial, s.bound),
                significant(s.in_plane_mass, 3),
                format!("{:.2}", s.centre_nm),
                format!("{:.2}", s.extent_nm),
                format!("{} ({:.0} %)", s.layer, 100.0 * s.layer_share),
            ]
        });
        let states = table(
            &[
                "conduction",
                "energy eV",
                "from edge meV",
                "error meV",
                "width meV",
                "lifetime",
                "leaves through",
                "mass m0",
                "centre nm",
                "extent nm",
                "mostly in",
            ],
            &[6, 10],
            states.collect(),
        );
        let transitions = self.transitions.iter().map(|t| {
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
                width_mev(1e-3 * t.escape_broadening_meV, 1e-9),
            ]
        });
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
                "escape width meV",
            ],
            &[],
            transitions.collect(),
        );
        let fewer = if self.subbands.len() < self.asked {
            format!(" {} asked for, {} there.", self.asked, self.subbands.len())
        } else {
            String::new()
        };
        let a = &self.audit;
        let verdict = verdict(&a.faults);
        format!(
            "{title}{} K, field {} kV/cm, {} mass, {:.2} nm, ends {}\n\n{states}\n\
             Levels searched up to {:.0} meV from the edge, narrower than {:.0} meV.{fewer} Lifetime: ħ over the width, of escape alone.\n\n\
             {transitions}\nStrength: {STRENGTH_DEFINITION}.\nDipole: {DIPOLE_DEFINITION}.\n\
             Audit {verdict}: widths as outflow and as −2 Im E {:.0e}; {} states found, {} counted.\n",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
            self.width_nm,
            self.ends,
            self.searched_to_mev,
            self.searched_width_mev,
            a.width_as_outflow,
            a.states_returned,
            a.states_counted,
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}",
            csv_table(&self.subbands)?,
            csv_table(&self.transitions)?
        ))
    }
}
