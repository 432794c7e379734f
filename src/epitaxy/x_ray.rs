//! Where the (004) reflections of a coherent stack are expected.
//!
//! Kinematic positions: peaks of thin layers are broad and pulled towards their neighbours, which this leaves out.

use super::layers::{Part, first_copies};
use super::mean::layer_mean;
use super::periods::periods;
use crate::materials::strain;
use crate::structure::{Stack, Structure};

/// Wavelength of Cu Kα₁, in nm (the value in use with silicon standards; common practice).
pub const CU_K_ALPHA_1_NM: f64 = 0.154_059_3;
/// Wafers are measured at room temperature.
const ROOM_TEMPERATURE_K: f64 = 300.0;

/// The Bragg angle θ of the (004) planes with the lattice constant a⊥ along the growth direction, in radians:
/// sin θ = λ/(2 a⊥/4). `None` when the wavelength is too long.
pub fn bragg_004_rad(perpendicular_nm: f64, wavelength_nm: f64) -> Option<f64> {
    let sine = 2.0 * wavelength_nm / perpendicular_nm;
    (sine <= 1.0).then(|| sine.asin())
}

/// The distance Δθ of neighbouring satellites of a period Λ near the Bragg angle θ, in radians: λ/(2 Λ cos θ), from
/// 2 Λ (sin θ₂ − sin θ₁) = λ.
pub fn satellite_spacing_rad(period_nm: f64, bragg_rad: f64, wavelength_nm: f64) -> f64 {
    wavelength_nm / (2.0 * period_nm * bragg_rad.cos())
}

/// The expected positions for Cu Kα₁ at 300 K.
#[derive(Clone, Debug, PartialEq)]
pub struct XRay {
    pub substrate_bragg_rad: f64,
    pub layers: Vec<LayerPeak>,
    pub periods: Vec<PeriodPeaks>,
}

/// The peak of one layer of the file, or of one face of a graded one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LayerPeak {
    pub entry: usize,
    pub part: Part,
    /// The lattice constant along the growth direction, in nm.
    pub perpendicular_nm: f64,
    pub bragg_rad: f64,
}

/// The satellites of one repeat.
#[derive(Clone, Debug, PartialEq)]
pub struct PeriodPeaks {
    pub count: u32,
    /// The first and the last entry of the period.
    pub entries: (usize, usize),
    pub period_nm: f64,
    /// Of the satellite of order zero, which lies at the mean lattice constant of the period.
    pub bragg_rad: f64,
    pub satellite_spacing_rad: f64,
}

/// The peaks of a stack; `None` without a substrate. A layer whose lattice or elastic constants are unknown is left out.
pub fn expected_x_ray(structure: &Structure, stack: &Stack) -> Option<XRay> {
    let stack = stack.at_temperature(ROOM_TEMPERATURE_K).ok()?;
    let substrate_nm = stack.substrate_lattice_nm()?;
    let bragg = |perpendicular_nm| bragg_004_rad(perpendicular_nm, CU_K_ALPHA_1_NM);
    let firsts = first_copies(&stack);
    let mut layers = Vec::new();
    for &(layer, entry, _) in &firsts {
        let parts: &[(Part, f64)] = if stack.is_uniform(layer) {
            &[(Part::Whole, 0.0)]
        } else {
            &[(Part::Bottom, 0.0), (Part::Top, 1.0)]
        };
        for &(part, t) in parts {
            let material = stack.free_material_at(layer, t);
            if let (Some(lattice), Some(strain)) = (
                material.lattice_constant_nm,
                strain(&material, substrate_nm),
            ) && let perpendicular_nm = lattice * (1.0 + strain.growth)
                && let Some(bragg_rad) = bragg(perpendicular_nm)
            {
                layers.push(LayerPeak {
                    entry,
                    part,
                    perpendicular_nm,
                    bragg_rad,
                });
            }
        }
    }
    let first_layer = |wanted: usize| {
        let found = firsts.iter().find(|(_, entry, _)| *entry == wanted);
        found.map(|(layer, ..)| *layer)
    };
    let peaks = |count: u32, entries: &[usize]| {
        let (mut period_nm, mut cells) = (0.0, 0.0);
        for entry in entries {
            let layer = first_layer(*entry)?;
            let width_nm = stack.layers[layer].width_nm;
            period_nm += width_nm;
            cells += width_nm / layer_mean(&stack, layer)?.perpendicular_nm;
        }
        let bragg_rad = bragg(period_nm / cells)?;
        Some(PeriodPeaks {
            count,
            entries: (*entries.first()?, *entries.last()?),
            period_nm,
            bragg_rad,
            satellite_spacing_rad: satellite_spacing_rad(period_nm, bragg_rad, CU_K_ALPHA_1_NM),
        })
    };
    Some(XRay {
        substrate_bragg_rad: bragg(substrate_nm)?,
        periods: periods(structure)
            .iter()
            .filter_map(|period| peaks(period.count, &period.entries))
            .collect(),
        layers,
    })
}
