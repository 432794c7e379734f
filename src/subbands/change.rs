//! How the discretised problem of a stack changes when one of its numbers does.

use super::Coupled;
use crate::materials::Element;
use crate::models::multiband::{Direction, MultibandOperator};
use crate::models::{self, BandOperator, Unsuitable};
use crate::numerics::matrix_pencil::MatrixCoefficient;
use crate::numerics::matrix_sensitivity::{MatrixChange, NodeSlope};
use crate::numerics::mesh::Mesh;
use crate::numerics::pencil::{Coefficient, Pencil};
use crate::numerics::sensitivity::Change;
use crate::structure::{Knob, Stack};
use std::sync::Arc;

/// The change per nm of width, per unit of fraction, or per V/nm of field.
pub fn change(operator: &BandOperator, pencil: &Pencil, knob: Knob) -> Change {
    match knob {
        Knob::Width { entry } => width(operator, pencil, entry),
        Knob::Fraction { entry, element } => fraction(operator, pencil, entry, element),
        Knob::Field => field(operator, pencil),
    }
}

/// The field's energy moves with the place.
fn width(operator: &BandOperator, pencil: &Pencil, entry: usize) -> Change {
    let stack = operator.stack();
    let slope = operator.band().sign() * stack.field_v_per_nm;
    let elements = stretched(stack, &pencil.mesh, entry);
    let mut coefficients = Vec::with_capacity(pencil.coefficients.len());
    for (index, (start, stretch)) in elements.iter().enumerate() {
        for (at, node) in pencil.at(index).iter().zip(&pencil.mesh.reference.nodes) {
            let moved = start + stretch * 0.5 * (1.0 + node);
            coefficients.push(models::raising(at, slope * moved));
        }
    }
    Change {
        elements,
        coefficients,
    }
}

fn fraction(operator: &BandOperator, pencil: &Pencil, entry: usize, of: Element) -> Change {
    let stack = operator.stack();
    let mut coefficients = Vec::with_capacity(pencil.coefficients.len());
    let mut uniform: Option<(usize, Coefficient)> = None;
    for (index, element) in pencil.mesh.elements.iter().enumerate() {
        let layer = element.segment;
        let own = stack.layers[layer].entry == entry;
        for (q, at) in pencil.at(index).iter().enumerate() {
            coefficients.push(match uniform {
                _ if !own => models::unchanging(at),
                Some((known, slope)) if known == layer => slope,
                _ => {
                    let slope =
                        operator.fraction_slope(layer, pencil.mesh.fraction(element, q), of);
                    if stack.is_uniform(layer) {
                        uniform = Some((layer, slope));
                    }
                    slope
                }
            });
        }
    }
    Change {
        elements: vec![(0.0, 0.0); pencil.mesh.elements.len()],
        coefficients,
    }
}

fn field(operator: &BandOperator, pencil: &Pencil) -> Change {
    let sign = operator.band().sign();
    let mut coefficients = Vec::with_capacity(pencil.coefficients.len());
    for (index, element) in pencil.mesh.elements.iter().enumerate() {
        for (q, at) in pencil.at(index).iter().enumerate() {
            coefficients.push(models::raising(at, sign * pencil.mesh.position(element, q)));
        }
    }
    Change {
        elements: vec![(0.0, 0.0); pencil.mesh.elements.len()],
        coefficients,
    }
}

/// How the discretised problem of coupled bands changes, per nm of width, per unit of fraction, or per V/nm of field.
///
/// # Errors
/// As [`Coupled::solve`]: never for a stack that was solved.
pub fn coupled_change(
    stack: &Stack,
    coupled: &Coupled,
    knob: Knob,
) -> Result<MatrixChange, (usize, Unsuitable)> {
    let mesh = &coupled.pencil().mesh;
    let operator = MultibandOperator::new(stack, coupled.model, Direction::ALONG_100)
        .map_err(|(layer, reason)| (layer, reason.into()))?;
    let still = vec![(0.0, 0.0); mesh.elements.len()];
    let mut coefficients = Vec::with_capacity(mesh.elements.len() * (mesh.order() + 1));
    let raising = |raised: f64| NodeSlope {
        matrices: None,
        raised,
    };
    let elements = match knob {
        Knob::Width { entry } => {
            let elements = stretched(stack, mesh, entry);
            for (start, stretch) in &elements {
                for node in &mesh.reference.nodes {
                    let moved = start + stretch * 0.5 * (1.0 + node);
                    coefficients.push(raising(stack.field_v_per_nm * moved));
                }
            }
            elements
        }
        Knob::Fraction { entry, element: of } => {
            let mut uniform: Option<(usize, Arc<MatrixCoefficient>)> = None;
            for element in &mesh.elements {
                let layer = element.segment;
                for q in 0..=mesh.order() {
                    if stack.layers[layer].entry != entry {
                        coefficients.push(NodeSlope::default());
                        continue;
                    }
                    let known = uniform.as_ref().filter(|(known, _)| *known == layer);
                    let matrices = match known {
                        Some((_, matrices)) => matrices.clone(),
                        None => {
                            let t = mesh.fraction(element, q);
                            Arc::new(operator.fraction_slope(layer, t, of))
                        }
                    };
                    if stack.is_uniform(layer) {
                        uniform = Some((layer, matrices.clone()));
                    }
                    coefficients.push(NodeSlope {
                        matrices: Some(matrices),
                        raised: 0.0,
                    });
                }
            }
            still
        }
        Knob::Field => {
            for element in &mesh.elements {
                let nodes = 0..=mesh.order();
                coefficients.extend(nodes.map(|q| raising(mesh.position(element, q))));
            }
            still
        }
    };
    Ok(MatrixChange {
        elements,
        coefficients,
    })
}

/// Slopes of each element's start and length per nm of an entry's width: elements of its layers stretch, those above move
/// up.
fn stretched(stack: &Stack, mesh: &Mesh, entry: usize) -> Vec<(f64, f64)> {
    let mut below = 0.0;
    let mut layer = 0;
    let own = |layer: usize| f64::from(u8::from(stack.layers[layer].entry == entry));
    let elements = mesh.elements.iter();
    elements
        .map(|element| {
            while layer < element.segment {
                below += own(layer);
                layer += 1;
            }
            (
                below + own(layer) * element.start_fraction,
                own(layer) * element.length_fraction,
            )
        })
        .collect()
}
