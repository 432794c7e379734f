//! How strain changes the masses: which valence edges the conduction band is coupled to, and how strongly, and the light
//! hole's mass.
//!
//! For k along \[001] the conduction band couples to Z alone, and at the zone centre Z mixes with (X ± iY)/√2. In these two
//! functions strain and spin–orbit splitting are, from the mean valence edge,
//!
//! ⎡ 2Q − Δ/3   √2Δ/3     ⎤
//! ⎣ √2Δ/3     −Q − 2Δ/3  ⎦
//!
//! (Bir and Pikus 1974). Its eigenvalues are the edges of light holes and split-off band; what they hold of Z is the residue
//! of the resolvent, w = ±(E + Q + 2Δ/3)/(E_lh − E_so): 2/3 and 1/3 without strain. For k in the plane, along X, the heavy
//! holes hold half of X, and the other two (1 − w)/2 each. (Bahder, Phys. Rev. B 41, 11992
//! (1990), has the whole matrix; Chuang, Physics of Optoelectronic Devices (1995), ch. 4.)

use super::dual::Number;
use super::hole_edges::{mixed_shifts, shear};
use super::material::Material;
use super::strain::strain;

/// The valence edges that the conduction band sees along growth.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GrowthCoupling<T = f64> {
    /// From the heavy holes' edge to the conduction edge, in eV: in the plane it couples too.
    pub heavy_gap_ev: T,
    /// From the light holes' edge to the conduction edge, in eV.
    pub light_gap_ev: T,
    /// From the split-off edge to the light holes', in eV.
    pub split_ev: T,
    /// Three times what the light-hole edge holds of Z: 2 without strain.
    pub light_thirds: T,
    /// Three times what the split-off edge holds of Z: 1 without strain.
    pub split_off_thirds: T,
}

/// The coupling in a layer whose gap and spin–orbit splitting without strain are given. Parts of the strain whose deformation
/// potentials are unknown are left out, as in the edges.
pub fn growth_coupling<T: Number>(
    material: &Material<T>,
    (gap_ev, spin_orbit_ev): (T, T),
    substrate_lattice_nm: Option<f64>,
) -> GrowthCoupling<T> {
    let mut coupling = GrowthCoupling {
        heavy_gap_ev: gap_ev,
        light_gap_ev: gap_ev,
        split_ev: spin_orbit_ev,
        light_thirds: T::constant(2.0),
        split_off_thirds: T::constant(1.0),
    };
    let Some(strain) = substrate_lattice_nm.and_then(|lattice| strain(material, lattice)) else {
        return coupling;
    };
    // Both potentials in their tabulated signs: Ec moves by a_c Tr ε, Ev by −a_v Tr ε.
    let potentials = [
        material.hydrostatic_conduction_ev,
        material.hydrostatic_valence_ev,
    ];
    for potential in potentials.into_iter().flatten() {
        coupling.light_gap_ev = coupling.light_gap_ev + potential * strain.trace();
    }
    coupling.heavy_gap_ev = coupling.light_gap_ev;
    if let Some(q) = shear(material, substrate_lattice_nm) {
        let (light, split_off) = mixed_shifts(q, spin_orbit_ev);
        coupling.heavy_gap_ev = coupling.heavy_gap_ev + q;
        coupling.light_gap_ev = coupling.light_gap_ev - light;
        coupling.split_ev = light - split_off;
        if coupling.split_ev.value() > 0.0 {
            let (two, three) = (T::constant(2.0), T::constant(3.0));
            let middle = three * q + two * spin_orbit_ev;
            coupling.light_thirds = (three * light + middle) / coupling.split_ev;
            coupling.split_off_thirds = -(three * split_off + middle) / coupling.split_ev;
        }
    }
    coupling
}

/// The factor f of the light hole's mass along growth, 1/m = γ₁ + 2γ₂ f, and in the plane, γ₁ − γ₂ f: 1 without strain, 2
/// where tension has made the edge pure Z, and −1 where compression has taken all Z out of it.
///
/// In Q the kinetic energy along growth has the same matrix as strain, so that f = dE_lh/dQ = ½ [1 + (Δ + 9Q)/√(Δ² + 2ΔQ +
/// 9Q²)], which is f₊ of Chao and Chuang, Phys. Rev. B 46, 4110 (1992). Without `spin_orbit` the split-off band is far.
pub fn light_hole_factor<T: Number>(
    material: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> T {
    let one = T::constant(1.0);
    let (Some(q), Some(split)) = (
        shear(material, substrate_lattice_nm),
        material.spin_orbit_ev,
    ) else {
        return one;
    };
    let (light, split_off) = mixed_shifts(q, split);
    let root = light - split_off;
    if root.value() <= 0.0 || root.value().is_nan() {
        return one;
    }
    (one + (split + T::constant(9.0) * q) / root) / T::constant(2.0)
}
