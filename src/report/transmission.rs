//! The part of an electron stream that crosses a stack, with its resonances.

use super::lifetime::{leaves_through, lifetime, width_mev};
use super::svg::{Spectrum, SpectrumMark, Width};
use super::table::{given, significant, table};
use super::{Report, csv_table, verdict};
use crate::models::model_name;
use crate::open_ends;
use crate::structure::{Stack, Structure};
use serde::Serialize;

/// Rows of the text table of points: more are in the other forms.
const MOST_ROWS: usize = 26;
/// T + R may differ from 1 by this.
const LOSS: f64 = 1e-6;
/// A lower transmission is drawn at the foot of the picture.
const LOWEST_DRAWN: f64 = 1e-18;

/// T(E) of a stack.
#[derive(Debug, Serialize)]
pub struct Transmission {
    title: Option<String>,
    model: &'static str,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    zero: &'static str,
    #[serde(rename = "edge_eV")]
    edge_ev: f64,
    #[serde(rename = "lower_lead_meV")]
    lower_lead_mev: f64,
    #[serde(rename = "upper_lead_meV")]
    upper_lead_mev: f64,
    resonances: Vec<ResonanceRow>,
    points: Vec<PointRow>,
    audit: AuditRow,
    /// Equal steps, of which the text shows some.
    #[serde(skip)]
    count: usize,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct ResonanceRow {
    number: usize,
    energy_meV: f64,
    width_meV: f64,
    width_relative_error: f64,
    lifetime_ps: Option<f64>,
    width_through_bottom_meV: f64,
    width_through_top_meV: f64,
    peak_transmission: f64,
    layer: String,
    layer_share: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct PointRow {
    energy_meV: f64,
    transmission: f64,
    reflection: f64,
}

#[derive(Debug, Serialize)]
struct AuditRow {
    current_lost: f64,
    relative_error: f64,
    levels_returned: usize,
    levels_counted: usize,
    faults: Vec<String>,
}

impl Transmission {
    /// Energies are counted from `edge_ev`, the lowest band edge of the stack; `count` is the number of equal steps.
    pub fn new(
        structure: &Structure,
        stack: &Stack,
        edge_ev: f64,
        solved: &open_ends::Transmission,
        count: usize,
    ) -> Transmission {
        let mev = |ev: f64| 1e3 * (ev - edge_ev);
        let resonances = solved.resonances.iter().enumerate();
        let resonances = resonances.map(|(index, resonance)| {
            let state = &resonance.state;
            ResonanceRow {
                number: index + 1,
                energy_meV: mev(state.energy_ev),
                width_meV: 1e3 * state.width_ev,
                width_relative_error: state.width_error,
                lifetime_ps: state.lifetime_ps(),
                width_through_bottom_meV: 1e3 * state.partial_widths_ev[0],
                width_through_top_meV: 1e3 * state.partial_widths_ev[1],
                peak_transmission: resonance.peak,
                layer: stack.layers[state.layer].label.clone(),
                layer_share: state.layer_share,
            }
        });
        let points = solved.points.iter().map(|point| PointRow {
            energy_meV: mev(point.energy_ev),
            transmission: point.crossing,
            reflection: point.returning,
        });
        let mut faults = Vec::new();
        if solved.lost.is_nan() || solved.lost > LOSS {
            faults.push(format!(
                "current is lost: |T + R - 1| = {:.1e}",
                solved.lost
            ));
        }
        if solved.error.is_nan() || solved.error > LOSS {
            faults.push(format!("T did not settle (relative {:.1e})", solved.error));
        }
        if solved.found != solved.counted {
            faults.push(format!(
                "{} levels were found where {} are counted",
                solved.found, solved.counted
            ));
        }
        if let Some(top_ev) = solved.searched_ev {
            faults.push(format!(
                "resonances were looked for up to {:.1} meV only, before it would take too long: a narrower range of energies takes less",
                mev(top_ev)
            ));
        }
        Transmission {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            zero: "energies from the lowest band edge of the stack",
            edge_ev,
            lower_lead_mev: mev(solved.leads_ev[0]),
            upper_lead_mev: mev(solved.leads_ev[1]),
            resonances: resonances.collect(),
            points: points.collect(),
            audit: AuditRow {
                current_lost: solved.lost,
                relative_error: solved.error,
                levels_returned: solved.found,
                levels_counted: solved.counted,
                faults,
            },
            count,
        }
    }

    /// What is off, in words.
    pub fn faults(&self) -> &[String] {
        &self.audit.faults
    }

    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let points = self.points.iter().filter(|p| p.transmission > 0.0);
        let marks = self.resonances.iter().map(|r| SpectrumMark {
            x: r.energy_meV,
            label: r.number.to_string(),
        });
        let words = self.resonances.iter().map(|r| {
            format!(
                " {}: {:.2} meV, width {} meV, peak {}.",
                r.number,
                r.energy_meV,
                width_mev(1e-3 * r.width_meV, r.width_relative_error),
                significant(r.peak_transmission, 3)
            )
        });
        Spectrum {
            title: self
                .title
                .clone()
                .unwrap_or_else(|| "Transmission".to_owned()),
            caption: format!(
                "{} mass, {} K, field {} kV/cm, flat leads at {:.0} and {:.0} meV; {}.{}",
                self.model,
                given(self.temperature_k, 4),
                given(self.field_kv_cm, 4),
                self.lower_lead_mev,
                self.upper_lead_mev,
                self.zero,
                words.collect::<String>()
            ),
            across: "Energy (meV)".to_owned(),
            up: "Transmission".to_owned(),
            lowest: Some(LOWEST_DRAWN),
            points: points.map(|p| [p.energy_meV, p.transmission]).collect(),
            marks: marks.collect(),
        }
        .svg(width)
    }
}

impl Report for Transmission {
    fn text(&self) -> String {
        let title = self
            .title
            .as_ref()
            .map_or(String::new(), |title| format!("{title}\n"));
        let resonances = self.resonances.iter().map(|r| {
            vec![
                r.number.to_string(),
                format!("{:.3}", r.energy_meV),
                width_mev(1e-3 * r.width_meV, r.width_relative_error),
                lifetime(r.lifetime_ps),
                significant(r.peak_transmission, 3),
                leaves_through([r.width_through_bottom_meV, r.width_through_top_meV], false),
                format!("{} ({:.0} %)", r.layer, 100.0 * r.layer_share),
            ]
        });
        let resonances = if self.resonances.is_empty() {
            "No resonance in this range.\n".to_owned()
        } else {
            table(
                &[
                    "resonance",
                    "energy meV",
                    "width meV",
                    "lifetime",
                    "peak T",
                    "leaves through",
                    "mostly in",
                ],
                &[5, 6],
                resonances.collect(),
            )
        };
        let (low, high) = (
            self.points.first().map_or(0.0, |p| p.energy_meV),
            self.points.last().map_or(0.0, |p| p.energy_meV),
        );
        let rows = MOST_ROWS.min(self.count).max(2);
        let shown = (0..rows).filter_map(|k| {
            let wanted = low + (high - low) * k as f64 / (rows - 1) as f64;
            self.points.iter().min_by(|a, b| {
                let off = |p: &PointRow| (p.energy_meV - wanted).abs();
                off(a).total_cmp(&off(b))
            })
        });
        let points = shown.map(|p| {
            vec![
                format!("{:.3}", p.energy_meV),
                significant(p.transmission, 4),
                significant(p.reflection, 4),
            ]
        });
        let a = &self.audit;
        let verdict = verdict(&a.faults);
        format!(
            "{title}{} K, field {} kV/cm, {} mass; flat leads with their edges at {:.2} meV (bottom) and {:.2} meV (top); {}, {:.5} eV\n\n\
             {resonances}\n{}All {} points, with more around each resonance, are in CSV and JSON.\n\
             Audit {verdict}: |T + R − 1| {:.0e}, T to a finer solution {:.0e}; {} levels found, {} counted; those without a peak are not listed.\n",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
            self.lower_lead_mev,
            self.upper_lead_mev,
            self.zero,
            self.edge_ev,
            table(
                &["energy meV", "transmission", "reflection"],
                &[],
                points.collect()
            ),
            self.points.len(),
            a.current_lost,
            a.relative_error,
            a.levels_returned,
            a.levels_counted,
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}",
            csv_table(&self.resonances)?,
            csv_table(&self.points)?
        ))
    }
}
