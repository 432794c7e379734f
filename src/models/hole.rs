//! One hole band, apart from the others, with the hole's energy counted downwards.
//!
//! The diagonal of the Luttinger Hamiltonian at k∥ = 0 for growth along \[001] (Luttinger, Phys. Rev. 102, 1030 (1956)):
//! masses 1/(γ₁ ∓ 2γ₂) along growth, and in the plane 1/(γ₁ ± γ₂), the upper sign for heavy holes. The in-plane masses
//! are the diagonal approximation: the mixing of heavy and light holes away from k∥ = 0 is left out. Strain mixes light holes
//! with the split-off band, which multiplies γ₂ of the light holes (see [`light_hole_factor`]).

use super::Unsuitable;
use crate::constants::HBAR2_OVER_2M0;
use crate::materials::{Material, Number, hole_edges, light_hole_factor};
use crate::numerics::pencil::Coefficient;

/// Which of the two hole bands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Hole {
    Heavy,
    Light,
}

/// A = ħ²/2m along growth and C = −(strained edge): the eigenvalues are minus the electron's energies.
pub fn coefficient<T: Number>(
    hole: Hole,
    material: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> Result<Coefficient<T>, Unsuitable> {
    let missing = |key| Unsuitable::Missing {
        key,
        model: "decoupled",
    };
    let edges = hole_edges(material, substrate_lattice_nm).ok_or(missing("valence_edge"))?;
    let heavy = material.heavy_hole_mass_m0;
    let (mass, edge) = match hole {
        Hole::Heavy => (heavy.ok_or(missing("heavy_hole_mass"))?, edges.heavy_ev),
        Hole::Light => {
            let light = material.light_hole_mass_m0;
            let light = light.ok_or(missing("light_hole_mass"))?;
            let strained = heavy.map(|heavy| {
                let one = T::constant(1.0);
                let factor = light_hole_factor(material, substrate_lattice_nm);
                // 2γ₂ (f − 1), with 4γ₂ the difference of the inverse masses.
                let less = (one / light - one / heavy) * (factor - one) / T::constant(2.0);
                light / (one + light * less)
            });
            (strained.unwrap_or(light), edges.light_ev)
        }
    };
    Ok(Coefficient {
        stiffness: T::constant(HBAR2_OVER_2M0) / mass,
        poles: [None; 2],
        constant: -edge,
    })
}

/// ħ²/2m∥ in eV nm². γ₁ and γ₂ follow from the two masses along growth, so that masses which a file states count.
/// `None` when a mass is unknown, or when the approximation has none that is positive.
pub fn in_plane_stiffness(
    hole: Hole,
    material: &Material,
    substrate_lattice_nm: Option<f64>,
) -> Option<f64> {
    let (heavy, light) = (
        1.0 / material.heavy_hole_mass_m0?,
        1.0 / material.light_hole_mass_m0?,
    );
    let (gamma1, gamma2) = (0.5 * (light + heavy), 0.25 * (light - heavy));
    let inverse = match hole {
        Hole::Heavy => gamma1 + gamma2,
        Hole::Light => gamma1 - gamma2 * light_hole_factor(material, substrate_lattice_nm),
    };
    (inverse > 0.0).then_some(HBAR2_OVER_2M0 * inverse)
}
