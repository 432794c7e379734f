//! The levels from the centre of a wafer to its edge.

use super::{ToleranceError, solved};
use crate::structure::{Cause, Design, Radial, Structure};
use crate::subbands::Accuracy;

/// Rings from the centre to the stated radius, both included.
const RINGS: usize = 6;

/// The levels at one radius.
#[derive(Clone, Debug, PartialEq)]
pub struct Ring {
    pub radius_mm: f64,
    /// The missing part of every thickness.
    pub drop: f64,
    pub levels_ev: Vec<f64>,
}

/// All layers thin out alike, parabolically in the radius; compositions stay, as does the length of interfaces. The
/// file's widths are those at the centre.
pub fn rings(
    structure: &Structure,
    design: &Design,
    radial: Radial,
    levels: usize,
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
        let (_, solved) = solved(structure, &wafer, levels, accuracy)
            .map_err(|error| ToleranceError::of_design(design, error))?;
        rings.push(Ring {
            radius_mm: part * radial.radius_mm,
            drop,
            levels_ev: solved.pairs.iter().map(|pair| pair.value).collect(),
        });
    }
    Ok(rings)
}
