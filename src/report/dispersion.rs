//! Subbands of coupled bands along an in-plane wave vector.

use super::svg::{DispersionCurves, Width};
use super::table::{error_mev, given, significant, table};
use super::{Report, csv_table};
use crate::models::multiband::MultibandModel;
use crate::structure::{Stack, Structure};
use crate::subbands::follow::FollowedBand;
use crate::subbands::multiband::{Band, MultibandSubbands};
use serde::Serialize;

/// The zone centre and the way from it.
#[derive(Debug, Serialize)]
pub struct Dispersion {
    title: Option<String>,
    model: &'static str,
    /// Direction of the wave vector: [100] or [110].
    along: &'static str,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    subbands: Vec<CentreRow>,
    points: Vec<PointRow>,
    #[serde(skip)]
    curves: DispersionCurves,
}

/// A subband at k∥ = 0.
#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct CentreRow {
    band: &'static str,
    index: usize,
    energy_eV: f64,
    error_meV: f64,
    /// From the second derivative at k∥ = 0; negative where an electron's energy falls or a hole's rises.
    in_plane_mass: Option<f64>,
    conduction_share: f64,
    heavy_share: f64,
    light_share: f64,
    split_off_share: f64,
}

/// A subband at one wave vector: both members of its pair.
#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct PointRow {
    band: &'static str,
    index: usize,
    k_per_nm: f64,
    energy_eV: f64,
    partner_energy_eV: f64,
    conduction_share: f64,
    heavy_share: f64,
    light_share: f64,
    split_off_share: f64,
}

/// Rows of the text table of energies: more are in the other forms.
const MOST_ROWS: usize = 26;

fn band_name(band: Band) -> &'static str {
    match band {
        Band::Conduction => "conduction",
        Band::Valence => "valence",
    }
}

impl Dispersion {
    /// `masses_m0` belong to the states of `centre`; `followed` runs over `k_per_nm`.
    pub fn new(
        (structure, stack): (&Structure, &Stack),
        model: MultibandModel,
        along: &'static str,
        centre: &MultibandSubbands,
        masses_m0: &[Option<f64>],
        k_per_nm: &[f64],
        followed: &[FollowedBand],
    ) -> Dispersion {
        let subbands = centre
            .states
            .iter()
            .zip(masses_m0)
            .map(|(state, mass)| CentreRow {
                band: band_name(state.band),
                index: state.number,
                energy_eV: state.energies_ev[0],
                error_meV: 1e3 * state.error_ev,
                in_plane_mass: *mass,
                conduction_share: state.shares.conduction,
                heavy_share: state.shares.heavy,
                light_share: state.shares.light,
                split_off_share: state.shares.split_off,
            });
        let points = followed.iter().flat_map(|band| {
            let places = k_per_nm.iter().zip(&band.energies_ev).zip(&band.shares);
            places.map(|((k, energies_ev), shares)| PointRow {
                band: band_name(band.band),
                index: band.number,
                k_per_nm: *k,
                energy_eV: energies_ev[0],
                partner_energy_eV: energies_ev[1],
                conduction_share: shares.conduction,
                heavy_share: shares.heavy,
                light_share: shares.light,
                split_off_share: shares.split_off,
            })
        });
        let title = structure.title.clone();
        let caption = format!(
            "{} model, k∥ along {along}, {} K, field {} kV/cm. Both members of a pair are drawn.",
            model.name(),
            given(structure.temperature_k, 4),
            given(1e4 * stack.field_v_per_nm, 4)
        );
        Dispersion {
            model: model.name(),
            along,
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            subbands: subbands.collect(),
            points: points.collect(),
            curves: DispersionCurves {
                title: title
                    .clone()
                    .unwrap_or_else(|| "In-plane dispersion".to_owned()),
                caption,
                k_per_nm: k_per_nm.to_vec(),
                bands: followed
                    .iter()
                    .map(|band| {
                        let name = format!("{} {}", band_name(band.band), band.number);
                        (name, band.band == Band::Valence, band.energies_ev.clone())
                    })
                    .collect(),
            },
            title,
        }
    }

    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        self.curves.svg(width)
    }
}

impl Report for Dispersion {
    fn text(&self) -> String {
        let title = self
            .title
            .as_ref()
            .map_or(String::new(), |t| format!("{t}\n"));
        let percent = |share: f64| format!("{:.1}", 100.0 * share);
        let centre = self.subbands.iter().map(|row| {
            vec![
                row.band.to_owned(),
                row.index.to_string(),
                format!("{:.5}", row.energy_eV),
                error_mev(1e-3 * row.error_meV),
                row.in_plane_mass
                    .map_or("-".to_owned(), |m| significant(m, 3)),
                percent(row.conduction_share),
                percent(row.heavy_share),
                percent(row.light_share),
                percent(row.split_off_share),
            ]
        });
        let mut text = format!(
            "{title}{} model, k∥ along {}, {} K, field {} kV/cm\n\nAt k∥ = 0\n{}\n",
            self.model,
            self.along,
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            table(
                &[
                    "band",
                    "no",
                    "energy eV",
                    "error meV",
                    "mass m0",
                    "conduction %",
                    "heavy %",
                    "light %",
                    "split-off %",
                ],
                &[0],
                centre.collect(),
            )
        );
        let curves = &self.curves;
        let names: Vec<String> = std::iter::once("k∥ 1/nm".to_owned())
            .chain(curves.bands.iter().map(|(name, ..)| name.clone()))
            .collect();
        let header: Vec<&str> = names.iter().map(|name| &**name).collect();
        let every = curves.k_per_nm.len().div_ceil(MOST_ROWS).max(1);
        let rows = (0..curves.k_per_nm.len()).step_by(every).map(|place| {
            let mut row = vec![format!("{:.4}", curves.k_per_nm[place])];
            for (_, _, energies_ev) in &curves.bands {
                let [a, b] = energies_ev[place];
                row.push(format!("{:.5}", 0.5 * (a + b)));
            }
            row
        });
        text.push_str(&format!(
            "Energies in eV, the mean of each pair\n{}",
            table(&header, &[], rows.collect())
        ));
        let split_ev = curves
            .bands
            .iter()
            .flat_map(|(_, _, energies_ev)| energies_ev)
            .map(|[a, b]| (a - b).abs())
            .fold(0.0, f64::max);
        // Less than the last digit of the table says nothing.
        if split_ev > 1e-5 {
            text.push_str(&format!(
                "Pairs split by up to {} meV: CSV, JSON and the picture hold both members.\n",
                significant(1e3 * split_ev, 2)
            ));
        }
        text
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}",
            csv_table(&self.subbands)?,
            csv_table(&self.points)?
        ))
    }
}
