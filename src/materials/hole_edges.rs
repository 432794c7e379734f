//! Heavy- and light-hole edges of a layer grown coherently on (001).
//!
//! G. L. Bir and G. E. Pikus, Symmetry and Strain-Induced Effects in Semiconductors (Wiley 1974); with the split-off
//! coupling in closed form as in C. Y.-P. Chao and S. L. Chuang, Phys. Rev. B 46, 4110 (1992), eqs. 25–27:
//!
//! E_hh = Ev − Q,  E_lh = Ev + (Q − Δ + √(Δ² + 2ΔQ + 9Q²))/2,  Q = −b (ε∥ − ε_zz),
//!
//! with Ev moved by −a_v Tr ε beforehand. Under compression Q < 0 and the heavy holes lie on top.

use super::dual::Number;
use super::material::Material;
use super::strain::strain;

/// The edges in eV, on the scale of the material's valence edge.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HoleEdges<T = f64> {
    pub heavy_ev: T,
    pub light_ev: T,
}

/// The hole edges of a material whose valence edge already carries the hydrostatic shift, as
/// [`strained`](super::strained) leaves it.
///
/// Both are that edge when there is no substrate, when the strain is unknown, or without `shear_b`. Without `spin_orbit`
/// the split-off band is taken to be far away: E_lh = Ev + Q. `None` without a valence edge.
pub fn hole_edges<T: Number>(
    material: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> Option<HoleEdges<T>> {
    let edge = material.valence_edge_ev?;
    let Some(q) = shear(material, substrate_lattice_nm) else {
        return Some(HoleEdges {
            heavy_ev: edge,
            light_ev: edge,
        });
    };
    let light_shift = match material.spin_orbit_ev {
        None => q,
        Some(split) => mixed_shifts(q, split).0,
    };
    Some(HoleEdges {
        heavy_ev: edge - q,
        light_ev: edge + light_shift,
    })
}

/// Q = −b (ε∥ − ε_zz) in eV; `None` when strain or `shear_b` is unknown.
pub(super) fn shear<T: Number>(
    material: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> Option<T> {
    let strain = strain(material, substrate_lattice_nm?)?;
    Some(-(material.shear_b_ev? * (strain.in_plane - strain.growth)))
}

/// How far light holes and split-off band lie from the heavy holes' edge without shear: their coupling by √2 Q included.
pub(super) fn mixed_shifts<T: Number>(q: T, split: T) -> (T, T) {
    let (two, nine) = (T::constant(2.0), T::constant(9.0));
    let root = (split * split + two * split * q + nine * q * q).sqrt();
    let centre = q - split;
    ((centre + root) / two, (centre - root) / two)
}
