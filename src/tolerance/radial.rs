//! The levels from the centre of a wafer to its edge.

use super::followed;
use super::{ToleranceError, solved};
use crate::models::Band;
use crate::structure::{Cause, Charge, Design, Level, Radial};
use crate::subbands::Accuracy;

/// Rings from the centre to the stated radius, both included.
const RINGS: usize = 6;

/// The levels at one radius.
#[derive(Clone, Debug, PartialEq)]
pub struct Ring {
    pub radius_mm: f64,
    /// The missing part of every thickness.
    pub drop: f64,
    /// Of the followed levels.
    pub levels_ev: Vec<f64>,
}

/// All layers thin out alike, parabolically in the radius; compositions stay, as does the length of interfaces. The
/// file's widths are those at the centre.
pub fn rings(
    charge: &Charge,
    design: &Design,
    asked: &[(Band, usize)],
    names: &[Level],
    radial: Radial,
    accuracy: Accuracy,
) -> Result<Vec<Ring>, ToleranceError> {
    let mut rings = Vec::new();
    let mut wafer = design.stack().clone();
    for ring in 0..RINGS {
        let part = ring as f64 / (RINGS - 1) as f64;
        let drop = radial.drop * part * part;
        design
            .grow(&mut wafer, &[Cause::Rate], &[-drop])
            .map_err(|_| ToleranceError::NoLayer)?;
        let (_, bands) = solved(charge, &wafer, asked, accuracy)
            .map_err(|error| ToleranceError::of_design(design, error))?;
        rings.push(Ring {
            radius_mm: part * radial.radius_mm,
            drop,
            levels_ev: followed::energies_ev(&bands, names),
        });
    }
    Ok(rings)
}
