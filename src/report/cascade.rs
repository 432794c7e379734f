//! The ladder of levels of a cascade's module.

use super::svg::{CascadePicture, CascadeState, Width};
use super::table::{error_mev, given, signed, significant, table};
use super::{Report, csv_table};
use crate::models::model_name;
use crate::structure::{Stack, Structure};
use crate::superlattice::{Alignment, Ladder};
use serde::Serialize;

/// Transitions between modules that overlap less are left to the other forms.
const LEAST_OVERLAP: f64 = 0.02;

/// Levels of one module and what joins them to the next.
#[derive(Debug, Serialize)]
pub struct Cascade {
    title: Option<String>,
    model: &'static str,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    module_nm: f64,
    module_layers: usize,
    modules: u32,
    #[serde(rename = "energy_per_module_meV")]
    energy_per_module_mev: f64,
    downstream: &'static str,
    states: Vec<StateRow>,
    transitions: Vec<TransitionRow>,
    alignments: Vec<AlignmentRow>,
    states_left_out: usize,
    window_modules: usize,
    gap_definition: &'static str,
    #[serde(skip)]
    picture: CascadePicture,
}

/// What a gap means; printed with it.
const GAP: &str =
    "full smallest distance of the two levels, 2ħΩ: twice the coupling that many papers state";

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct StateRow {
    state: usize,
    energy_eV: f64,
    above_lowest_meV: f64,
    from_edge_meV: f64,
    error_meV: f64,
    in_plane_mass: f64,
    centre_nm: f64,
    extent_nm: f64,
    layer: String,
    layer_share: f64,
    module_share: f64,
    ladder_residual_meV: f64,
    window_shift_meV: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct TransitionRow {
    upper: usize,
    lower: usize,
    lower_in: &'static str,
    energy_meV: f64,
    wavelength_um: f64,
    dipole_nm: f64,
    oscillator_strength: f64,
    overlap: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct AlignmentRow {
    first: usize,
    second: usize,
    second_in: &'static str,
    detuning_meV: f64,
    dipole_nm: f64,
    overlap: f64,
    resonance_field_kV_cm: Option<f64>,
    gap_meV: Option<f64>,
}

fn module_word(next: bool) -> &'static str {
    if next { "next module" } else { "same module" }
}

impl Cascade {
    /// `module` is the stack of one module, of which the structure holds `copies`.
    pub fn new(structure: &Structure, module: &Stack, copies: u32, ladder: &Ladder) -> Cascade {
        let lowest_ev = ladder
            .states
            .iter()
            .map(|s| s.energy_ev)
            .fold(f64::INFINITY, f64::min);
        let states = ladder.states.iter().enumerate().map(|(k, s)| StateRow {
            state: k + 1,
            energy_eV: s.energy_ev,
            above_lowest_meV: 1e3 * (s.energy_ev - lowest_ev),
            from_edge_meV: 1e3 * s.from_edge_ev,
            error_meV: 1e3 * s.error_ev,
            in_plane_mass: s.in_plane_mass_m0,
            centre_nm: s.centre_nm,
            extent_nm: s.extent_nm,
            layer: module.layers[s.layer].label.clone(),
            layer_share: s.layer_share,
            module_share: s.module_share,
            ladder_residual_meV: 1e3 * s.ladder_residual_ev,
            window_shift_meV: 1e3 * s.window_shift_ev,
        });
        let transitions = ladder.transitions.iter().map(|t| TransitionRow {
            upper: t.to + 1,
            lower: t.from + 1,
            lower_in: module_word(t.to_next_module),
            energy_meV: 1e3 * t.energy_ev,
            wavelength_um: t.wavelength_um(),
            dipole_nm: t.dipole_nm,
            oscillator_strength: t.oscillator_strength,
            overlap: t.overlap,
        });
        let alignment = |a: &Alignment| AlignmentRow {
            first: a.upstream + 1,
            second: a.downstream + 1,
            second_in: module_word(a.next_module),
            detuning_meV: 1e3 * a.detuning_ev,
            dipole_nm: a.dipole_nm,
            overlap: a.overlap,
            resonance_field_kV_cm: a.anticrossing.map(|c| 1e4 * c.field_v_per_nm),
            gap_meV: a.anticrossing.map(|c| 1e3 * c.gap_ev),
        };
        let direction = if ladder.along_growth {
            "along growth"
        } else {
            "against growth"
        };
        Cascade {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * ladder.field_v_per_nm,
            module_nm: ladder.period_nm,
            module_layers: module.layers.len(),
            modules: copies,
            energy_per_module_mev: 1e3 * ladder.drop_ev,
            downstream: direction,
            states: states.collect(),
            transitions: transitions.collect(),
            alignments: ladder.alignments.iter().map(alignment).collect(),
            states_left_out: ladder.left_out,
            window_modules: ladder.modules,
            gap_definition: GAP,
            picture: picture(structure, ladder),
        }
    }

    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        self.picture.svg(width)
    }

    /// Which state of a module the lowest one of the module before feeds.
    fn feeding(&self) -> String {
        let next = self
            .alignments
            .iter()
            .filter(|a| a.first == 1 && a.second_in == module_word(true))
            .min_by(|a, b| a.detuning_meV.abs().total_cmp(&b.detuning_meV.abs()));
        match next {
            Some(a) => format!(
                "State 1 of a module lies {} meV {} state {} of the next one.\n",
                significant(a.detuning_meV.abs(), 3),
                if a.detuning_meV > 0.0 {
                    "above"
                } else {
                    "below"
                },
                a.second
            ),
            None => String::new(),
        }
    }
}

fn picture(structure: &Structure, ladder: &Ladder) -> CascadePicture {
    let low_ev = ladder
        .edge
        .iter()
        .map(|p| p[1])
        .fold(f64::INFINITY, f64::min);
    CascadePicture {
        title: structure
            .title
            .clone()
            .unwrap_or_else(|| "Cascade".to_owned()),
        caption: format!(
            "Three modules of {} nm, {} kV/cm, {} K, {} mass: {} meV per module. Black: conduction band edge. Lines: squared \
             envelopes of the conduction band, each standing on its energy; the numbers are those of the table of states. \
             The zero is the lowest band edge of the middle module.",
            given(ladder.period_nm, 5),
            given(1e4 * ladder.field_v_per_nm, 4).replace('-', "−"),
            given(structure.temperature_k, 4),
            model_name(structure.conduction.model),
            given(1e3 * ladder.drop_ev, 4),
        ),
        period_nm: ladder.period_nm,
        // Along the growth direction.
        step_ev: ladder.field_v_per_nm * ladder.period_nm,
        edge: ladder.edge.iter().map(|[z, e]| [*z, e - low_ev]).collect(),
        states: ladder
            .states
            .iter()
            .zip(&ladder.envelopes)
            .map(|(state, envelope)| CascadeState {
                energy_ev: state.energy_ev - low_ev,
                envelope: envelope.clone(),
            })
            .collect(),
    }
}

impl Report for Cascade {
    fn text(&self) -> String {
        let title = self.title.as_ref().map(|t| format!("{t}\n"));
        let states = table(
            &[
                "state",
                "above lowest meV",
                "from edge meV",
                "error meV",
                "mass m0",
                "centre nm",
                "extent nm",
                "mostly in",
                "in module %",
                "off ladder meV",
                "window meV",
            ],
            &[7],
            self.states
                .iter()
                .map(|s| {
                    vec![
                        s.state.to_string(),
                        format!("{:.2}", s.above_lowest_meV),
                        format!("{:.2}", s.from_edge_meV),
                        error_mev(1e-3 * s.error_meV),
                        significant(s.in_plane_mass, 3),
                        format!("{:.2}", s.centre_nm),
                        format!("{:.2}", s.extent_nm),
                        format!("{} ({:.0} %)", s.layer, 100.0 * s.layer_share),
                        format!("{:.0}", 100.0 * s.module_share),
                        error_mev(1e-3 * s.ladder_residual_meV.abs()),
                        error_mev(1e-3 * s.window_shift_meV),
                    ]
                })
                .collect(),
        );
        let shown = self
            .transitions
            .iter()
            .filter(|t| t.lower_in != module_word(true) || t.overlap >= LEAST_OVERLAP);
        let transitions = table(
            &[
                "upper",
                "lower",
                "of",
                "energy meV",
                "wavelength µm",
                "dipole nm",
                "strength",
                "overlap",
            ],
            &[2],
            shown
                .map(|t| {
                    vec![
                        t.upper.to_string(),
                        t.lower.to_string(),
                        t.lower_in.to_owned(),
                        format!("{:.2}", t.energy_meV),
                        significant(t.wavelength_um, 4),
                        format!("{:.3}", t.dipole_nm),
                        format!("{:.3}", t.oscillator_strength),
                        format!("{:.2}", t.overlap),
                    ]
                })
                .collect(),
        );
        let alignments = table(
            &[
                "state",
                "and",
                "of",
                "detuning meV",
                "dipole nm",
                "overlap",
                "nearest at kV/cm",
                "gap meV",
            ],
            &[2],
            self.alignments
                .iter()
                .map(|a| {
                    vec![
                        a.first.to_string(),
                        a.second.to_string(),
                        a.second_in.to_owned(),
                        signed(a.detuning_meV, 2),
                        format!("{:.3}", a.dipole_nm),
                        format!("{:.2}", a.overlap),
                        a.resonance_field_kV_cm
                            .map_or("far".to_owned(), |f| format!("{f:.3}")),
                        a.gap_meV.map_or("-".to_owned(), gap_text),
                    ]
                })
                .collect(),
        );
        let alignments = if self.alignments.is_empty() {
            String::new()
        } else {
            format!(
                "\nLevels within 10 meV of each other\n{alignments}Gap: {GAP}.\n{}",
                self.feeding()
            )
        };
        let left_out = match self.states_left_out {
            0 => String::new(),
            1 => " One more state among them is spread out or not on the ladder, and left out."
                .to_owned(),
            n => format!(
                " {n} more states among them are spread out or not on the ladder, and left out."
            ),
        };
        format!(
            "{}{} K, field {} kV/cm, {} mass; {} modules of {:.2} nm and {} layers\n\
             An electron loses {} meV from module to module, {}.\n\n{states}\n\
             Solved among {} modules; `window` is what two more would change.{left_out}\n\n{transitions}\n\
             Strength: 2 m0 E |z|²/ħ² with the free-electron mass. Pairs of neighbouring modules with an overlap below {LEAST_OVERLAP} are left to CSV and JSON.\n{alignments}",
            title.unwrap_or_default(),
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
            self.modules,
            self.module_nm,
            self.module_layers,
            given(self.energy_per_module_mev, 5),
            self.downstream,
            self.window_modules,
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}\n{}",
            csv_table(&self.states)?,
            csv_table(&self.transitions)?,
            csv_table(&self.alignments)?
        ))
    }
}

/// Gaps reach down to where a crossing is one for every purpose.
fn gap_text(mev: f64) -> String {
    if mev < 1e-3 {
        "<0.001".to_owned()
    } else {
        significant(mev, 3)
    }
}
