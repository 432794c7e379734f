//! The growth chamber as the `growth` part of a structure file has it: the mounted group-III cells and the dopants.

use super::file::Spanned;
use crate::materials::Element;
use crate::units::Quantity;
use std::ops::Range;

/// The cells that are mounted.
#[derive(Clone, Debug, PartialEq)]
pub struct Growth {
    /// The group-III cells in the order of the file.
    pub cells: Vec<Cell>,
    pub donors: Option<Spanned<Dopant>>,
    pub acceptors: Option<Spanned<Dopant>>,
    /// The head of the block, where messages about the whole of it point.
    pub span: Range<usize>,
}

/// One group-III cell with its calibrated flux.
#[derive(Clone, Debug, PartialEq)]
pub struct Cell {
    pub name: String,
    pub element: Element,
    /// The calibrated rate as the file has it, in monolayers or in a length per time.
    pub calibrated: Quantity,
    /// The binary whose growth was measured.
    pub of: String,
    /// The flux in monolayers per second on the substrate: one monolayer is 2/a² atoms per area, a being the substrate's
    /// lattice constant. In this unit the rates of open cells add up to the growth rate of any coherent layer.
    pub rate_ml_per_s: f64,
    pub span: Range<usize>,
}

/// A dopant species.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Dopant {
    pub symbol: &'static str,
    /// Whether it is used as a donor.
    pub donor: bool,
    pub acceptor: bool,
}

/// The dopants of III–V crystals, the usual ones first; common practice. Si and Ge sit on either sublattice: donors in
/// arsenides and phosphides, acceptors in GaSb and AlSb.
pub const DOPANTS: [Dopant; 11] = [
    dopant("Si", true, true),
    dopant("Te", true, false),
    dopant("S", true, false),
    dopant("Se", true, false),
    dopant("Sn", true, false),
    dopant("Ge", true, true),
    dopant("Be", false, true),
    dopant("C", false, true),
    dopant("Zn", false, true),
    dopant("Mg", false, true),
    dopant("Cd", false, true),
];

const fn dopant(symbol: &'static str, donor: bool, acceptor: bool) -> Dopant {
    Dopant {
        symbol,
        donor,
        acceptor,
    }
}
