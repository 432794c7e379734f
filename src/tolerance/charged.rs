//! The slopes of levels whose charge answers to a wafer's being off.
//!
//! With the bands kept as they are (each layer takes its potential along) the slopes are exact; see `derivative`. What
//! the charge adds is taken from full solves of wafers that are off by a little.

use super::derivative::{level_slopes, offsets};
use crate::charge;
use crate::models::Band;
use crate::structure::{Cause, Charge, Design, Structure};
use crate::subbands::{Accuracy, Nearby};

/// Slopes of the solved levels in eV per unit of the cause.
pub struct Slopes {
    /// The charge's answer included.
    pub whole: Vec<f64>,
    /// What the charge's answer adds.
    pub of_charge: Vec<f64>,
}

/// The slopes of a design that carries its potential. `None` where the design has no room for the cause, or a wafer
/// nearby does not settle.
pub fn slopes(
    structure: &Structure,
    design: &Design,
    nearby: &Nearby,
    cause: &Cause,
) -> Option<Slopes> {
    let still = level_slopes(design, structure.conduction.model, nearby, cause)?;
    let count = still.len();
    if structure.charge == Charge::Flat {
        return Some(Slopes {
            whole: still,
            of_charge: vec![0.0; count],
        });
    }
    let mut whole = vec![0.0; count];
    let mut wafer = design.stack().clone();
    for (offset, weight) in offsets(design, cause)? {
        design
            .grow(&mut wafer, std::slice::from_ref(cause), &[offset])
            .ok()?;
        let solution = charge::solve(
            &wafer,
            &structure.charge,
            &bands(structure, count),
            Accuracy::default(),
        )
        .ok()?;
        if !solution.equilibrium.as_ref()?.is_settled() {
            return None;
        }
        for (level, slope) in whole.iter_mut().enumerate() {
            *slope += weight * solution.bands.conduction().pairs.get(level)?.value;
        }
    }
    let of_charge = whole.iter().zip(&still).map(|(w, s)| w - s).collect();
    Some(Slopes { whole, of_charge })
}

/// The bands to be solved for a number of electron levels: holes only where charge bends the bands.
pub fn bands(structure: &Structure, levels: usize) -> Vec<(Band, usize)> {
    let mut bands = Band::of(structure);
    if structure.charge == Charge::Flat {
        bands.truncate(1);
    }
    bands[0].1 = levels;
    bands
}
