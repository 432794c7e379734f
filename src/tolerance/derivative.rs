//! The slopes of the levels with respect to anything in which a wafer can be off.
//!
//! The energies' part is exact: first-order perturbation of the discretised problem (Hellmann and Feynman), as everywhere.
//! How the discretised problem itself changes is taken from wafers that are off by a little, with five-point
//! differences: lengths are linear in every cause, and coefficients are closed forms of the materials' laws, so that the
//! differences leave no more than rounding. In this way fluxes, compositions, interfaces and temperature follow the very code that
//! grows a sampled wafer.

use crate::models::{BandOperator, unchanging};
use crate::numerics::pencil::Coefficient;
use crate::numerics::sensitivity::{Change, value_slope};
use crate::structure::{Cause, Design};
use crate::subbands::Nearby;

/// Offsets in steps with their weights: the first derivative to fourth order (Abramowitz & Stegun 1964, table 25.2).
const CENTRAL: &[(f64, f64)] = &[
    (-2.0, 1.0 / 12.0),
    (-1.0, -2.0 / 3.0),
    (1.0, 2.0 / 3.0),
    (2.0, -1.0 / 12.0),
];
/// The same from one side, for a temperature near absolute zero.
const FORWARD: &[(f64, f64)] = &[
    (0.0, -25.0 / 12.0),
    (1.0, 4.0),
    (2.0, -3.0),
    (3.0, 4.0 / 3.0),
    (4.0, -1.0 / 4.0),
];

/// Steps, small against what bends the materials' laws and large against rounding.
const PART_STEP: f64 = 1e-3;
const FRACTION_STEP: f64 = 1e-3;
const FIELD_STEP_V_PER_NM: f64 = 1e-5;
const TEMPERATURE_STEP_K: f64 = 0.25;

fn step(design: &Design, cause: &Cause) -> f64 {
    match cause {
        Cause::Rate | Cause::Flux(_) | Cause::Doping => PART_STEP,
        Cause::Layer(_) | Cause::Entry(_) | Cause::Grading => PART_STEP * design.room(cause),
        // A quarter of the room keeps both steps inside.
        Cause::Fraction { .. } | Cause::Alloy { .. } => FRACTION_STEP.min(design.room(cause) / 4.0),
        Cause::Field => FIELD_STEP_V_PER_NM,
        Cause::Temperature => TEMPERATURE_STEP_K,
    }
}

/// Amounts of a cause, and the weights with which what is found there adds up to a slope. `None` when the design has no
/// room for the cause.
pub fn offsets(design: &Design, cause: &Cause) -> Option<Vec<(f64, f64)>> {
    let step = step(design, cause);
    if step.is_nan() || step <= 0.0 {
        return None;
    }
    let cold = *cause == Cause::Temperature && design.stack().temperature_k() < 2.0 * step;
    let stencil = if cold { FORWARD } else { CENTRAL };
    let scaled = stencil.iter();
    Some(
        scaled
            .map(|(offset, weight)| (offset * step, weight / step))
            .collect(),
    )
}

/// The slope of each solved level of a band in eV per unit of the cause (a part, nm, a fraction, V/nm or K).
///
/// `None` when the design has no room for the cause: a fraction that is zero, interfaces that are abrupt.
pub fn level_slopes(design: &Design, nearby: &Nearby, cause: &Cause) -> Option<Vec<f64>> {
    let offsets = offsets(design, cause)?;
    let solved = nearby.solved();
    let mut change = Change {
        elements: vec![(0.0, 0.0); solved.pencil.mesh.elements.len()],
        coefficients: solved.pencil.coefficients.iter().map(unchanging).collect(),
    };
    let mut wafer = design.stack().clone();
    for (offset, weight) in offsets {
        design
            .grow(&mut wafer, std::slice::from_ref(cause), &[offset])
            .ok()?;
        let operator = BandOperator::new(&wafer, solved.band).ok()?;
        let pencil = nearby.pencil(&operator);
        for ((start, length), element) in change.elements.iter_mut().zip(&pencil.mesh.elements) {
            *start += weight * element.start;
            *length += weight * element.length;
        }
        for (slope, at) in change.coefficients.iter_mut().zip(&pencil.coefficients) {
            add(slope, weight, at);
        }
    }
    Some(
        solved
            .pairs
            .iter()
            .map(|pair| solved.band.sign() * value_slope(&solved.pencil, &change, pair))
            .collect(),
    )
}

fn add(sum: &mut Coefficient, weight: f64, at: &Coefficient) {
    sum.stiffness += weight * at.stiffness;
    sum.constant += weight * at.constant;
    for (sum, at) in sum.poles.iter_mut().zip(&at.poles) {
        if let (Some(sum), Some(at)) = (sum, at) {
            sum.strength += weight * at.strength;
            sum.position += weight * at.position;
            sum.nearest += weight * at.nearest;
            // A range without end stays so.
            if at.farthest.is_finite() {
                sum.farthest += weight * at.farthest;
            }
        }
    }
}
