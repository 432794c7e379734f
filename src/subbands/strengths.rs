//! How strongly light couples the states of eight bands, across the gap and within a band.
//!
//! The element of ∂H/∂k squared over ħ²/2m₀ is the momentum element in the units of E_P = 2m₀P²/ħ² (Kane 1957): in bulk,
//! at the zone centre, E_P/2 for heavy holes and E_P/6 for light ones with the field in the plane (TE), and 2 E_P/3 for
//! light holes with the field along z (TM). E_P is that in use, after the reduction of the model.
//!
//! Along z the commutator gives ⟨i|∂H/∂kz|j⟩ = i (E_i − E_j) ⟨i|z|j⟩, which holds on the mesh exactly. Along k∥ it is the
//! derivative of the matrix. Both keep the part of H; the field across k∥ in the plane, which joins the two parts, gives
//! the same as along it at k∥ = 0.

use super::multiband::{MultibandSubbands, PartSolution, derivative};
use crate::constants::HBAR2_OVER_2M0;
use crate::models::multiband::{MultibandOperator, Part};
use crate::numerics::matrix_pencil::MatrixPencil;

/// The coupling of one conduction and one valence state of the first part.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Strength {
    /// Numbers of the states, from 1 at the gap.
    pub conduction: usize,
    pub valence: usize,
    pub energy_ev: f64,
    /// With the field in the plane, along k∥: eV.
    pub te_ev: f64,
    /// With the field along z: eV.
    pub tm_ev: f64,
}

/// All pairs of a conduction and a valence state of the first part. Empty where k∥ lies in no mirror plane.
pub fn interband_strengths(
    operator: &MultibandOperator,
    subbands: &MultibandSubbands,
) -> Vec<Strength> {
    let [part, _] = &subbands.parts[..] else {
        return Vec::new();
    };
    let slope = derivative(operator, &part.pencil.mesh, subbands.k_per_nm, Part::Plus);
    strengths(part, &slope)
}

/// All pairs of a conduction and a valence state of the first part, whose derivative with respect to k∥ is `slope`.
pub(super) fn strengths(part: &PartSolution, slope: &MatrixPencil) -> Vec<Strength> {
    let heights = heights(part);
    let mut strengths = Vec::new();
    for (c, upper) in part.conduction.iter().enumerate() {
        let moved = slope.matrix().times(&upper.vector);
        let lifted: Vec<f64> = upper
            .vector
            .iter()
            .zip(&heights)
            .map(|(x, z)| x * z)
            .collect();
        for (v, lower) in part.valence.iter().enumerate() {
            let element = |image: &[f64]| -> f64 {
                image.iter().zip(&lower.vector).map(|(a, b)| a * b).sum()
            };
            let energy_ev = upper.value - lower.value;
            strengths.push(Strength {
                conduction: c + 1,
                valence: v + 1,
                energy_ev,
                te_ev: element(&moved).powi(2) / HBAR2_OVER_2M0,
                tm_ev: (energy_ev * element(&lifted)).powi(2) / HBAR2_OVER_2M0,
            });
        }
    }
    strengths
}

/// z of every unknown, in nm.
fn heights(part: &PartSolution) -> Vec<f64> {
    let n = part.pencil.components();
    let places = part.pencil.positions();
    places.flat_map(|z| std::iter::repeat_n(z, n)).collect()
}
