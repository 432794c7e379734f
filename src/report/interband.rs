//! The part of the levels' report that is about light between the valence and the conduction band.

use super::csv_table;
use super::table::{significant, table};
use crate::constants::HC_EV_UM;
use crate::optics::{Alignment, Selection, interband, lowest_exciton};
use crate::structure::{Stack, ValenceModel};
use crate::subbands::{Bands, Place};
use serde::Serialize;

/// What TE and TM mean, by the model of the holes.
const MOMENTUM_DEFINITIONS: [(ValenceModel, &str); 3] = [
    (
        ValenceModel::Decoupled,
        "squared momentum matrix element 2|p|²/m0 in units of the bulk's E_P, one electron spin with both holes of the pair: overlap² × 1/2 (heavy, TE), 0 (heavy, TM), 1/6 (light, TE), 2/3 (light, TM)",
    ),
    (
        ValenceModel::SixBand,
        "squared momentum matrix element 2|p|²/m0 in units of the bulk's E_P, one electron spin with both holes of the pair: that of the hole's X part (TE) and Z part (TM) with the electron's envelope",
    ),
    (
        ValenceModel::EightBand,
        "squared element of ∂H/∂k over ħ²/2m0, one electron spin with both holes of the pair, in units of E_P as it is in use in the layer that holds most of the electron",
    ),
];
const EXCITON_DEFINITION: &str = "variational 1s state f_e(z) f_h(z) exp(−ρ/radius), static permittivity, parabolic in-plane masses (Bastard and others 1982)";

/// The pairs of hole and electron levels, and the exciton of the lowest.
#[derive(Debug, Serialize)]
pub struct Interbands {
    interband: Vec<PairRow>,
    exciton: Option<ExcitonRow>,
    #[serde(skip_serializing_if = "Option::is_none")]
    no_exciton: Option<String>,
    momentum_definition: &'static str,
    exciton_definition: &'static str,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct PairRow {
    from: String,
    to: String,
    energy_meV: f64,
    /// `None` where the hole lies above the electron: a broken gap gives no light.
    wavelength_um: Option<f64>,
    overlap: f64,
    te_Ep: f64,
    tm_Ep: f64,
    /// E_P in use, where it is not the bulk's own: with eight bands.
    #[serde(skip_serializing_if = "Option::is_none")]
    Ep_eV: Option<f64>,
    selection: &'static str,
    alignment: &'static str,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct ExcitonRow {
    from: String,
    to: String,
    binding_meV: f64,
    bohr_radius_nm: f64,
    reduced_mass: f64,
    permittivity: f64,
    photoluminescence_meV: f64,
    photoluminescence_um: Option<f64>,
}

fn selection(selection: Selection) -> &'static str {
    match selection {
        Selection::Allowed => "allowed",
        Selection::Suppressed => "suppressed",
        Selection::Forbidden => "forbidden",
    }
}

fn alignment(alignment: Alignment) -> &'static str {
    match alignment {
        Alignment::Direct => "same layer",
        Alignment::TypeTwo => "type II",
        Alignment::BrokenGap => "broken gap",
        Alignment::Apart => "apart",
    }
}

impl Interbands {
    /// Of the states that are listed: so many of each band.
    pub fn new(model: ValenceModel, stack: &Stack, bands: &Bands, shown: &[usize]) -> Interbands {
        let name = |place: Place| bands.level(place).to_string();
        let pairs = interband(stack, bands);
        let is_shown = |place: Place| place.state < shown[place.band];
        let rows = pairs
            .iter()
            .filter(|pair| is_shown(pair.electron) && is_shown(pair.hole))
            .map(|pair| PairRow {
                from: name(pair.hole),
                to: name(pair.electron),
                energy_meV: 1e3 * pair.energy_ev,
                wavelength_um: pair.wavelength_um(),
                overlap: pair.overlap,
                te_Ep: pair.te,
                tm_Ep: pair.tm,
                Ep_eV: pair.kane_energy_ev,
                selection: selection(pair.selection),
                alignment: alignment(pair.alignment),
            });
        let electron = Place { band: 0, state: 0 };
        let lowest = lowest_exciton(stack, bands);
        let no_exciton = lowest.as_ref().err().map(ToString::to_string);
        let exciton = lowest.ok().map(|(hole, exciton)| {
            let transition_ev = bands.energy_ev(electron) - bands.energy_ev(hole);
            let light_ev = transition_ev - exciton.binding_ev;
            ExcitonRow {
                from: name(hole),
                to: name(electron),
                binding_meV: 1e3 * exciton.binding_ev,
                bohr_radius_nm: exciton.radius_nm,
                reduced_mass: exciton.reduced_mass_m0,
                permittivity: exciton.permittivity,
                photoluminescence_meV: 1e3 * light_ev,
                photoluminescence_um: (light_ev > 0.0).then(|| HC_EV_UM / light_ev),
            }
        });
        let definition = MOMENTUM_DEFINITIONS.iter().find(|(of, _)| *of == model);
        Interbands {
            interband: rows.collect(),
            exciton,
            no_exciton,
            momentum_definition: definition.map_or("", |(_, words)| *words),
            exciton_definition: EXCITON_DEFINITION,
        }
    }

    pub fn text(&self) -> String {
        let pairs = table(
            &[
                "from",
                "to",
                "energy meV",
                "wavelength µm",
                "overlap",
                "TE",
                "TM",
                "envelopes",
                "where",
            ],
            &[0, 1, 7, 8],
            self.interband
                .iter()
                .map(|pair| {
                    vec![
                        pair.from.clone(),
                        pair.to.clone(),
                        format!("{:.2}", pair.energy_meV),
                        pair.wavelength_um
                            .map_or("-".to_owned(), |um| significant(um, 5)),
                        format!("{:.3}", pair.overlap),
                        format!("{:.3}", pair.te_Ep),
                        format!("{:.3}", pair.tm_Ep),
                        pair.selection.to_owned(),
                        pair.alignment.to_owned(),
                    ]
                })
                .collect(),
        );
        let exciton = match &self.exciton {
            Some(e) => format!(
                "Exciton of {} and {}: binding {:.1} meV, Bohr radius {:.1} nm (reduced mass {}, permittivity {}).\n\
                 Photoluminescence estimate, transition less binding: {:.1} meV, {}.\n\
                 Exciton: {EXCITON_DEFINITION}.\n",
                e.from,
                e.to,
                e.binding_meV,
                e.bohr_radius_nm,
                significant(e.reduced_mass, 3),
                significant(e.permittivity, 3),
                e.photoluminescence_meV,
                e.photoluminescence_um
                    .map_or("no light".to_owned(), |um| significant(um, 4) + " µm"),
            ),
            None => format!(
                "No exciton: {}.\n",
                self.no_exciton.as_deref().unwrap_or("nothing binds")
            ),
        };
        const MIXED: &str = "broken gap";
        let dark = |pair: &PairRow| pair.wavelength_um.is_none();
        let broken = if self.interband.iter().any(dark) {
            "Where the energy is negative, the hole lies above the electron: a broken gap, in which the two mix. Bands \
             that are solved apart do not show that.\n"
        } else {
            ""
        };
        let mixed = if self.interband.iter().any(|pair| pair.alignment == MIXED) {
            "Broken gap: the electron's layer has its conduction edge below the hole's valence edge, and the two bands mix; the \
             shares of the states tell how far. With eight bands levels are counted from the gap by their number, so that one \
             above it is called `conduction` even where it is mostly a hole: the bands are inverted there.\n"
        } else {
            ""
        };
        format!(
            "{pairs}\nTE, TM: {}.\n{broken}{mixed}{exciton}",
            self.momentum_definition
        )
    }

    pub fn csv(&self) -> Result<String, csv::Error> {
        let pairs = csv_table(&self.interband)?;
        match &self.exciton {
            Some(exciton) => Ok(format!(
                "{pairs}\n{}",
                csv_table(std::slice::from_ref(exciton))?
            )),
            None => Ok(pairs),
        }
    }
}
