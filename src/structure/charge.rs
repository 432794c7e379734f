//! What a file says about the charge of dopants and carriers.

use std::ops::Range;

/// Whether charge bends the bands.
#[derive(Clone, Debug, PartialEq)]
pub enum Charge {
    /// It does not: dopants are only grown.
    Flat,
    /// Bands, carriers and dopants are in equilibrium with one Fermi level.
    Bent(Bending),
}

/// How the bands are bent. By default every dopant is ionised, the stack is neutral as a whole, and electrons feel each
/// other's mean charge only (Hartree).
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Bending {
    /// The Fermi level is that of the bottom layer's neutral bulk.
    pub contact: bool,
    /// How far the Fermi level lies below the conduction edge at the top face, in eV, where surface states pin it.
    pub surface_ev: Option<f64>,
    /// Without, all donors are ionised.
    pub donors: Option<Ionisation>,
    /// Without, all acceptors are ionised.
    pub acceptors: Option<Ionisation>,
    /// Whether exchange and correlation of the electrons are taken in the local density approximation.
    pub exchange: bool,
    /// The bytes of the file's `charge`, where it has one.
    pub span: Option<Range<usize>>,
}

/// A dopant's level: full with probability 1/(1 + exp(…)/g).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ionisation {
    /// Distance from the band's edge, in eV.
    pub binding_ev: f64,
    /// g: ways in which the level can hold its carrier.
    pub degeneracy: f64,
}
