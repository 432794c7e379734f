//! The levels from the centre of a wafer to its edge.

use super::ToleranceError;
use crate::models::BandOperator;
use crate::structure::{Cause, ConductionModel, Design, Radial};
use crate::subbands::{self, Accuracy};

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
    design: &Design,
    model: ConductionModel,
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
        let operator = BandOperator::conduction(&wafer, model)
            .map_err(|(layer, reason)| ToleranceError::interface(design, layer, reason))?;
        let solved = subbands::solve(&operator, levels, accuracy);
        rings.push(Ring {
            radius_mm: part * radial.radius_mm,
            drop,
            levels_ev: solved.pairs.iter().map(|pair| pair.value).collect(),
        });
    }
    Ok(rings)
}
