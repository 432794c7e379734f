//! Coherent growth on a (001) substrate.

use super::dual::Number;
use super::material::Material;

/// The strain of a layer that takes the in-plane lattice constant of its substrate; negative means compressed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Strain<T = f64> {
    /// ε∥ = (a_substrate − a)/a.
    pub in_plane: T,
    /// ε_zz = −2 (c₁₂/c₁₁) ε∥.
    pub growth: T,
}

impl<T: Number> Strain<T> {
    /// Tr ε, the relative change of volume.
    pub fn trace(&self) -> T {
        T::constant(2.0) * self.in_plane + self.growth
    }
}

/// The strain of a layer on a substrate of the given lattice constant at the same temperature; `None` when the layer's
/// lattice constant or elastic constants are unknown.
pub fn strain<T: Number>(layer: &Material<T>, substrate_lattice_nm: f64) -> Option<Strain<T>> {
    let lattice = layer.lattice_constant_nm?;
    let in_plane = (T::constant(substrate_lattice_nm) - lattice) / lattice;
    let growth = T::constant(-2.0) * layer.c12_gpa? / layer.c11_gpa? * in_plane;
    Some(Strain { in_plane, growth })
}

/// The material with both edges moved by the hydrostatic part of the strain: the conduction edge by a_c Tr ε, the mean
/// valence edge by −a_v Tr ε (a_v in the tabulated, negative sign).
///
/// The gap stays that without strain, and heavy and light holes stay together. An edge whose deformation potential is
/// unknown stays where it is, as does everything when [`strain`] has no answer.
pub fn strained<T: Number>(layer: &Material<T>, substrate_lattice_nm: f64) -> Material<T> {
    let mut moved = layer.clone();
    if let Some(strain) = strain(layer, substrate_lattice_nm) {
        let trace = strain.trace();
        if let (Some(edge), Some(a_c)) = (layer.conduction_edge_ev, layer.hydrostatic_conduction_ev)
        {
            moved.conduction_edge_ev = Some(edge + a_c * trace);
        }
        if let (Some(edge), Some(a_v)) = (layer.valence_edge_ev, layer.hydrostatic_valence_ev) {
            moved.valence_edge_ev = Some(edge - a_v * trace);
        }
    }
    moved
}

/// The thickness of one monolayer, half the lattice constant along the growth direction; that of the strained layer when
/// a substrate is given. `None` when the lattice constant, or on a substrate an elastic constant, is unknown.
pub fn monolayer_nm<T: Number>(
    layer: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> Option<T> {
    let half = layer.lattice_constant_nm? / T::constant(2.0);
    match substrate_lattice_nm {
        None => Some(half),
        Some(substrate) => Some(half * (T::constant(1.0) + strain(layer, substrate)?.growth)),
    }
}
