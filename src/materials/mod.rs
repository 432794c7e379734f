//! The material library: the nine zincblende III–V binaries, their alloys, temperature and coherent strain.
//!
//! A formula such as `Al0.26Ga0.74As` becomes a [`Composition`] (or a [`Family`], when a fraction is left to a lattice
//! match); the [`Library`], which holds the embedded tables together with a structure's own [`Definition`]s, resolves it
//! at a temperature into a [`Material`]. Resolution runs on `f64` and on [`Dual`], which carries the derivative with
//! respect to one element's fraction.
//!
//! Laws, in the order in which they act:
//! 1. A gap of a binary follows its temperature law (Varshni, Physica 34, 149 (1967), unless its table says otherwise);
//!    a lattice constant is linear in temperature. Nothing else depends on temperature, the valence edge included.
//! 2. A ternary is P(x) = x P(A) + (1 − x) P(B) − x(1 − x) C, where C may depend on x (Vurgaftman, Meyer and
//!    Ram-Mohan, J. Appl. Phys. 89, 5815 (2001)). Hole masses along \[001] are interpolated, and γ₃ − γ₂; the Luttinger
//!    parameters of an alloy follow from these, because the published bowings are those of the masses.
//! 3. A quaternary is the linear (bilinear) mean of its binaries with the bowing of its ternaries on it: Moon, Antypas and
//!    James, J. Electron. Mater. 3, 635 (1974), for two elements on each sublattice; Donati, Kaspi and Malloy, J. Appl.
//!    Phys. 94, 5814 (2003), for three on one. The weighted mean of ternaries (Glisson and others, J. Electron. Mater. 7,
//!    1 (1978)) was tried and put aside: it misses the measured gaps of AlGaInAs and GaInAsP on InP by up to 46 and
//!    61 meV, this form by 23 and 16 meV.
//! 4. conduction edge = valence edge + gap, on the scale whose zero is the unstrained valence edge of InSb.

mod band_edges;
mod composition;
mod data;
mod definition;
mod dual;
mod element;
mod error;
mod formula;
mod growth_coupling;
mod hole_edges;
mod interpolation;
mod keys;
mod library;
mod material;
mod report;
mod strain;
mod values;

pub use band_edges::{BandEdges, band_edges};
pub use composition::Composition;
pub use data::{Known, citation, source_keys};
pub use definition::{Definition, DefinitionProblem, Setting};
pub use dual::{Dual, Number};
pub use element::{Element, Sublattice};
pub use error::MaterialError;
pub use formula::{Family, Formula};
pub use growth_coupling::{GrowthCoupling, growth_coupling, light_hole_factor};
pub use hole_edges::{HoleEdges, hole_edges};
pub use keys::{KEYS, Key, Parameter};
pub use library::{Library, Substance};
pub use material::{Material, Valley};
pub use report::{Alternative, LibraryEntry, Origin, ReportRow, Selection};
pub use strain::{Strain, monolayer_nm, strain, strained};
