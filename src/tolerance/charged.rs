//! The slopes of levels whose charge answers to a wafer's being off.
//!
//! With the bands kept as they are (each layer takes its potential along) the slopes are exact; see `derivative`. What
//! the charge adds is taken from full solves of wafers that are off by a little.

use super::derivative::{level_slopes, offsets};
use crate::charge;
use crate::models::Band;
use crate::structure::{Cause, Charge, Design};
use crate::subbands::{Accuracy, Nearby, Place};

/// Slopes of the solved levels of each band in eV per unit of the cause.
#[derive(Clone, Debug, PartialEq)]
pub struct Slopes {
    /// The charge's answer included.
    pub whole: Vec<Vec<f64>>,
    /// What the charge's answer adds; 0 in flat bands.
    pub of_charge: Vec<Vec<f64>>,
}

/// The slopes of a design that carries its potential. `None` where the design has no room for the cause, or a wafer
/// nearby does not settle.
pub fn slopes(
    charge: &Charge,
    design: &Design,
    nearby: &[Nearby],
    cause: &Cause,
) -> Option<Slopes> {
    let still = nearby.iter().map(|band| level_slopes(design, band, cause));
    let still: Vec<Vec<f64>> = still.collect::<Option<_>>()?;
    let nothing: Vec<Vec<f64>> = still.iter().map(|band| vec![0.0; band.len()]).collect();
    if *charge == Charge::Flat {
        return Some(Slopes {
            whole: still,
            of_charge: nothing,
        });
    }
    let asked: Vec<(Band, usize)> = nearby
        .iter()
        .map(|band| (band.solved().band, band.solved().pairs.len()))
        .collect();
    let mut whole = nothing;
    let mut wafer = design.stack().clone();
    for (offset, weight) in offsets(design, cause)? {
        design
            .grow(&mut wafer, std::slice::from_ref(cause), &[offset])
            .ok()?;
        let solution = charge::solve(&wafer, charge, &asked, Accuracy::default()).ok()?;
        if !solution.equilibrium.as_ref()?.is_settled() {
            return None;
        }
        for (band, slopes) in whole.iter_mut().enumerate() {
            if solution.bands.level_count(band) < slopes.len() {
                return None;
            }
            for (state, slope) in slopes.iter_mut().enumerate() {
                *slope += weight * solution.bands.energy_ev(Place { band, state });
            }
        }
    }
    let added = |(whole, still): (&Vec<f64>, &Vec<f64>)| -> Vec<f64> {
        whole.iter().zip(still).map(|(w, s)| w - s).collect()
    };
    let of_charge = whole.iter().zip(&still).map(added).collect();
    Some(Slopes { whole, of_charge })
}
