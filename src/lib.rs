//! Wellwright: subband levels, transitions and layer-width tuning for quantum-well wafers of III–V crystals.
//!
//! The modules stand in the order in which they may use one another: a module uses those listed above it, never those
//! below. `tests/module_order.rs` holds this.

pub mod numerics;

pub mod constants;
pub mod diagnostics;
pub mod units;

pub mod materials;

pub mod structure;

pub mod epitaxy;

pub mod growth;

pub mod models;

pub mod subbands;

pub mod charge;

pub mod open_ends;

pub mod optics;

pub mod superlattice;

pub mod tune;

pub mod tolerance;

pub mod sweep;

pub mod report;

pub mod cli;
