//! How the discretised problem of a stack changes when one of its numbers does.

use crate::materials::Element;
use crate::models::{self, BandOperator};
use crate::numerics::pencil::{Coefficient, Pencil};
use crate::numerics::sensitivity::Change;
use crate::structure::Knob;

/// The change per nm of width, per unit of fraction, or per V/nm of field.
pub fn change(operator: &BandOperator, pencil: &Pencil, knob: Knob) -> Change {
    match knob {
        Knob::Width { entry } => width(operator, pencil, entry),
        Knob::Fraction { entry, element } => fraction(operator, pencil, entry, element),
        Knob::Field => field(operator, pencil),
    }
}

/// Elements of the layer stretch, those above it move up; the field's energy moves with the place.
fn width(operator: &BandOperator, pencil: &Pencil, entry: usize) -> Change {
    let stack = operator.stack();
    let slope = operator.band().sign() * stack.field_v_per_nm;
    let mut below = 0.0;
    let mut elements = Vec::with_capacity(pencil.mesh.elements.len());
    let mut coefficients = Vec::with_capacity(pencil.coefficients.len());
    let mut layer = 0;
    for (index, element) in pencil.mesh.elements.iter().enumerate() {
        while layer < element.segment {
            below += f64::from(u8::from(stack.layers[layer].entry == entry));
            layer += 1;
        }
        let own = f64::from(u8::from(stack.layers[layer].entry == entry));
        let (start, stretch) = (
            below + own * element.start_fraction,
            own * element.length_fraction,
        );
        elements.push((start, stretch));
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
