//! Donors and acceptors on the nodes of a mesh.

use crate::constants::BOLTZMANN_EV_PER_K;
use crate::materials::{Material, hole_edges};
use crate::structure::{Bending, Ionisation, Stack};

/// Levels of dopants are full or empty over at least this temperature, in K: without any, their filling would be a jump.
const LEAST_TEMPERATURE_K: f64 = 1.0;

/// Dopants of one kind at one node of one element.
#[derive(Clone, Copy, Debug)]
pub struct Site {
    /// The mesh's node.
    pub node: usize,
    /// Dopants per area that the node stands for, in 1/nm².
    pub load: f64,
    /// The dopant's level without the charge's energy, in eV; it moves with the bands.
    pub level_ev: f64,
}

/// All dopants of one kind.
#[derive(Clone, Debug)]
pub struct Dopants {
    pub sites: Vec<Site>,
    /// +1 for donors, −1 for acceptors: their charge when ionised.
    pub charge: f64,
    /// Without, all are ionised.
    pub ionisation: Option<Ionisation>,
    pub temperature_k: f64,
}

impl Dopants {
    /// Calls `f` with the node, the charge in e/nm² and its slope with the energy of the bands there.
    ///
    /// N/(1 + g exp(±(E_F − E_d)/kT)), the upper sign for donors (Blakemore 1962, sections 3.2 and 3.4).
    pub fn each(
        &self,
        energy_ev: impl Fn(usize) -> f64,
        fermi_ev: f64,
        mut f: impl FnMut(usize, f64, f64),
    ) {
        let kt = BOLTZMANN_EV_PER_K * self.temperature_k.max(LEAST_TEMPERATURE_K);
        for site in &self.sites {
            let Some(ionisation) = self.ionisation else {
                f(site.node, self.charge * site.load, 0.0);
                continue;
            };
            let depth = self.charge * (fermi_ev - site.level_ev - energy_ev(site.node)) / kt;
            let full = ionisation.degeneracy * depth.min(600.0).exp();
            let ionised = site.load / (1.0 + full);
            // A rising band frees a donor's electron, and an acceptor's.
            let slope = ionised * full / (1.0 + full) / kt;
            f(site.node, self.charge * ionised, slope);
        }
    }
}

/// The levels of donors and acceptors in a material, in eV.
pub fn levels_of_dopants(
    bending: &Bending,
    material: &Material,
    stack: &Stack,
    conduction_ev: f64,
) -> [f64; 2] {
    let donor = conduction_ev - bending.donors.map_or(0.0, |level| level.binding_ev);
    let acceptor = bending.acceptors.map_or(conduction_ev, |level| {
        let edges = hole_edges(material, stack.substrate_lattice_nm());
        let gap_ev = edges.zip(material.conduction_edge_ev);
        // The edge with the field is as far below the conduction edge as without. Where it is not known no holes are solved,
        // and acceptors are ionised: their level lies far below any Fermi level of electrons.
        gap_ev.map_or(f64::NEG_INFINITY, |(edges, edge_ev)| {
            conduction_ev - edge_ev + edges.heavy_ev.max(edges.light_ev) + level.binding_ev
        })
    });
    [donor, acceptor]
}
