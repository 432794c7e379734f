//! Band edges of a coherently strained (001) layer.

use super::dual::Number;
use super::hole_edges::mixed_shifts;
use super::material::Material;
use super::strain::strain;

/// The edges at the zone centre, in eV on the scale whose zero is the unstrained valence edge of InSb. An edge is `None`
/// when a parameter that it needs is unknown; only a conduction edge without a_c stays where it is, as in the solver.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct BandEdges<T = f64> {
    pub conduction_ev: Option<T>,
    pub heavy_hole_ev: Option<T>,
    pub light_hole_ev: Option<T>,
    pub split_off_ev: Option<T>,
}

impl BandEdges {
    /// The higher one of heavy and light holes; `None` when either is unknown.
    pub fn valence_ev(&self) -> Option<f64> {
        Some(self.heavy_hole_ev?.max(self.light_hole_ev?))
    }

    /// From the higher hole edge to the conduction edge.
    pub fn gap_ev(&self) -> Option<f64> {
        Some(self.conduction_ev? - self.valence_ev()?)
    }
}

/// The edges of a material without strain, or of a layer on a substrate of the given lattice constant.
///
/// With Tr ε = 2ε∥ + ε_zz, P = a_v Tr ε (a_v in the tabulated, negative sign) and Q = −b (ε∥ − ε_zz):
///
///   E_c + a_c Tr ε,   E_hh = E_v − P − Q,   E_lh,so = E_v − P + ½ [Q − Δ ± √(Δ² + 2ΔQ + 9Q²)]
///
/// (G. L. Bir and G. E. Pikus, Symmetry and Strain-Induced Effects in Semiconductors, Wiley (1974); F. H. Pollak and
/// M. Cardona, Phys. Rev. 172, 816 (1968)). Light holes and split-off band are mixed by √2 Q; without that coupling the
/// light-hole edge would be E_v − P + Q.
pub fn band_edges<T: Number>(
    free: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> BandEdges<T> {
    let Some(strain) = substrate_lattice_nm.and_then(|lattice| strain(free, lattice)) else {
        let split_off = |(valence, delta): (T, T)| -> T { valence - delta };
        return BandEdges {
            conduction_ev: free.conduction_edge_ev,
            heavy_hole_ev: free.valence_edge_ev,
            light_hole_ev: free.valence_edge_ev,
            split_off_ev: free.valence_edge_ev.zip(free.spin_orbit_ev).map(split_off),
        };
    };
    let trace = strain.trace();
    let conduction = free.conduction_edge_ev.zip(free.hydrostatic_conduction_ev);
    let mean = free.valence_edge_ev.zip(free.hydrostatic_valence_ev);
    let mean = mean.map(|(edge, a_v)| edge - a_v * trace);
    let shear = free
        .shear_b_ev
        .map(|b| -b * (strain.in_plane - strain.growth));
    let mixed = mean.zip(shear).zip(free.spin_orbit_ev);
    let mixed = mixed.map(|((mean, q), delta)| {
        let (light, split_off) = mixed_shifts(q, delta);
        (mean + light, mean + split_off)
    });
    BandEdges {
        conduction_ev: conduction
            .map(|(edge, a_c)| edge + a_c * trace)
            .or(free.conduction_edge_ev),
        heavy_hole_ev: mean.zip(shear).map(|(mean, q)| mean - q),
        light_hole_ev: mixed.map(|(light, _)| light),
        split_off_ev: mixed.map(|(_, split_off)| split_off),
    }
}
