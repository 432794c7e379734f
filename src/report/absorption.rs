//! Absorption from one level: the spectrum of oscillator strength with its lines, peak and cut-off.

use super::lifetime::width_mev;
use super::svg::{Spectrum, SpectrumMark, Width};
use super::table::{given, significant, table};
use super::{Report, csv_table, verdict};
use crate::constants::HC_EV_UM;
use crate::models::model_name;
use crate::open_ends::{self, SUM_TO_EV};
use crate::structure::{ConductionModel, Stack, Structure};
use serde::Serialize;

const DEFINITION: &str =
    "df/d(ħω) with f = 2 m0 ħω |z|²/ħ², the free-electron mass, light polarised along growth";
/// Rows of the text table of the spectrum.
const MOST_ROWS: usize = 26;
/// The strengths of a parabolic band add up to the sum rule within this.
const SUM_RULE: f64 = 0.02;
/// With an energy-dependent mass the eliminated valence part takes some of it; beyond this the level is none that has a spectrum.
const SUM_RULE_OF_LAW: f64 = 1.0;
/// Lines weaker than this part of all strength get no mark.
const WEAKEST_MARK: f64 = 0.02;

/// The absorption of a stack from one level.
#[derive(Debug, Serialize)]
pub struct Absorption {
    title: Option<String>,
    model: &'static str,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    from: String,
    #[serde(rename = "from_energy_eV")]
    from_energy_ev: f64,
    #[serde(rename = "broadening_meV")]
    broadening_mev: f64,
    #[serde(rename = "continuum_from_meV")]
    continuum_from_mev: Option<f64>,
    peak_um: Option<f64>,
    #[serde(rename = "peak_meV")]
    peak_mev: Option<f64>,
    #[serde(rename = "peak_per_eV")]
    peak_per_ev: Option<f64>,
    cut_off_um: Option<f64>,
    #[serde(rename = "full_width_meV")]
    full_width_mev: Option<f64>,
    lines: Vec<LineRow>,
    spectrum: Vec<PointRow>,
    definition: &'static str,
    audit: AuditRow,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct LineRow {
    to: String,
    energy_meV: f64,
    wavelength_um: f64,
    escape_width_meV: f64,
    oscillator_strength: f64,
    bound: bool,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct PointRow {
    photon_meV: f64,
    wavelength_um: f64,
    strength_per_eV: f64,
}

#[derive(Debug, Serialize)]
struct AuditRow {
    to_bound_states: f64,
    to_continuum: f64,
    sum: f64,
    sum_rule: f64,
    faults: Vec<String>,
}

impl Absorption {
    /// `level` counts from 1; `broadening_ev` is a full width.
    pub fn new(
        structure: &Structure,
        stack: &Stack,
        level: usize,
        broadening_ev: f64,
        solved: &open_ends::Absorption,
    ) -> Absorption {
        let lines = solved.lines.iter().map(|line| LineRow {
            to: format!("conduction {}", line.to),
            energy_meV: 1e3 * line.energy_ev,
            wavelength_um: HC_EV_UM / line.energy_ev,
            escape_width_meV: 1e3 * line.width_ev,
            oscillator_strength: line.strength,
            bound: line.bound,
        });
        let spectrum = solved.points.iter().map(|[photon_ev, strength]| PointRow {
            photon_meV: 1e3 * photon_ev,
            wavelength_um: HC_EV_UM / photon_ev,
            strength_per_eV: *strength,
        });
        let leads = solved.states.leads_ev;
        let mut faults = super::open_levels::faults(&solved.states);
        let deviation = (solved.total / solved.sum_rule - 1.0).abs();
        let parabolic = structure.conduction.model == ConductionModel::Parabolic;
        // From a higher level the emission to lower ones belongs to the sum too.
        let allowed = if parabolic { SUM_RULE } else { SUM_RULE_OF_LAW };
        if level == 1 && (deviation.is_nan() || deviation > allowed) {
            faults.push(format!(
                "the oscillator-strength sum rule is missed (relative {deviation:.1e})"
            ));
        }
        let [below, above] = solved.half_ev;
        Absorption {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            from: format!("conduction {level}"),
            from_energy_ev: solved.from_energy_ev,
            broadening_mev: 1e3 * broadening_ev,
            continuum_from_mev: leads
                .map(|[a, b]| 1e3 * (a.min(b) - solved.from_energy_ev).max(0.0)),
            peak_um: solved.peak_um(),
            peak_mev: solved.peak.map(|[ev, _]| 1e3 * ev),
            peak_per_ev: solved.peak.map(|[_, strength]| strength),
            cut_off_um: solved.cut_off_um(),
            full_width_mev: below.zip(above).map(|(a, b)| 1e3 * (b - a)),
            lines: lines.collect(),
            spectrum: spectrum.collect(),
            definition: DEFINITION,
            audit: AuditRow {
                to_bound_states: solved.to_bound,
                to_continuum: solved.total - solved.to_bound,
                sum: solved.total,
                sum_rule: solved.sum_rule,
                faults,
            },
        }
    }

    /// What is off, in words.
    pub fn faults(&self) -> &[String] {
        &self.audit.faults
    }

    fn peak_words(&self) -> String {
        let Some(peak_um) = self.peak_um else {
            return "The spectrum has no peak inside this range.".to_owned();
        };
        let mut text = format!(
            "Peak at {} µm ({:.1} meV)",
            significant(peak_um, 4),
            self.peak_mev.unwrap_or(0.0)
        );
        if let Some(cut_off_um) = self.cut_off_um {
            text.push_str(&format!(
                ", 50 % cut-off at {} µm",
                significant(cut_off_um, 4)
            ));
        }
        if let Some(full_width_mev) = self.full_width_mev {
            text.push_str(&format!(", full width {full_width_mev:.1} meV"));
        }
        text + "."
    }

    fn continuum_words(&self) -> String {
        match self.continuum_from_mev {
            Some(mev) => format!("continuum from {mev:.1} meV"),
            None => "the field goes on outside".to_owned(),
        }
    }

    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let marked = self
            .lines
            .iter()
            .filter(|line| line.oscillator_strength > WEAKEST_MARK * self.audit.sum);
        Spectrum {
            title: self
                .title
                .clone()
                .unwrap_or_else(|| "Absorption".to_owned()),
            caption: format!(
                "From {}, {} mass, {} K, field {} kV/cm, {}; lines {} meV wide. {} Marks: levels that the light reaches.",
                self.from,
                self.model,
                given(self.temperature_k, 4),
                given(self.field_kv_cm, 4),
                self.continuum_words(),
                given(self.broadening_mev, 4),
                self.peak_words()
            ),
            across: "Photon energy (meV)".to_owned(),
            up: "Oscillator strength per energy (1/eV)".to_owned(),
            lowest: None,
            points: self
                .spectrum
                .iter()
                .map(|p| [p.photon_meV, p.strength_per_eV])
                .collect(),
            marks: marked
                .map(|line| SpectrumMark {
                    x: line.energy_meV,
                    label: line.to.trim_start_matches("conduction ").to_owned(),
                })
                .collect(),
        }
        .svg(width)
    }
}

impl Report for Absorption {
    fn text(&self) -> String {
        let title = self
            .title
            .as_ref()
            .map_or(String::new(), |title| format!("{title}\n"));
        let lines = self.lines.iter().map(|line| {
            vec![
                line.to.trim_start_matches("conduction ").to_owned(),
                format!("{:.2}", line.energy_meV),
                significant(line.wavelength_um, 4),
                if line.bound {
                    "bound".to_owned()
                } else {
                    width_mev(1e-3 * line.escape_width_meV, 1e-9)
                },
                thousandths(line.oscillator_strength),
            ]
        });
        let lines = if self.lines.is_empty() {
            "No level above: all light goes into the continuum.\n".to_owned()
        } else {
            table(
                &[
                    "to",
                    "energy meV",
                    "wavelength µm",
                    "escape width meV",
                    "strength",
                ],
                &[],
                lines.collect(),
            )
        };
        let every = self.spectrum.len().div_ceil(MOST_ROWS).max(1);
        let points = self.spectrum.iter().step_by(every).map(|p| {
            vec![
                format!("{:.2}", p.photon_meV),
                significant(p.wavelength_um, 4),
                significant(p.strength_per_eV, 4),
            ]
        });
        let a = &self.audit;
        let verdict = verdict(&a.faults);
        format!(
            "{title}{} K, field {} kV/cm, {} mass; from {} at {:.5} eV, {}; lines {} meV wide\n\n{}\n\n{lines}\n{}\
             Spectrum: {DEFINITION}.\n\
             Audit {verdict}: strength {:.3} to bound states and {:.3} to all others, together {:.3} up to {SUM_TO_EV} eV; sum rule {:.3}.\n",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
            self.from,
            self.from_energy_ev,
            self.continuum_words(),
            given(self.broadening_mev, 4),
            self.peak_words(),
            table(
                &["photon meV", "wavelength µm", "per eV"],
                &[],
                points.collect()
            ),
            a.to_bound_states,
            a.to_continuum,
            a.sum,
            a.sum_rule,
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}",
            csv_table(&self.lines)?,
            csv_table(&self.spectrum)?
        ))
    }
}

/// Three decimals; what rounds to zero has no sign.
fn thousandths(value: f64) -> String {
    let text = format!("{value:.3}");
    if text == "-0.000" {
        return "0.000".to_owned();
    }
    text
}
