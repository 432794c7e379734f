//! Envelopes of solved states outside the solver's own mesh.

use super::{Subbands, state};
use crate::numerics::mesh::Mesh;
use crate::numerics::quadrature::Reference;
use crate::structure::Stack;

/// Points per layer at which envelopes of different stacks are compared.
const POINTS_ORDER: usize = 10;

/// Every state's envelope at the same fractions of every layer, weighted so that the scalar product of two lists is
/// their overlap: lists of stacks that differ in widths only can be set against each other.
pub fn layer_envelopes(subbands: &Subbands, stack: &Stack) -> Vec<Vec<f64>> {
    let pairs = subbands.pairs.iter();
    pairs
        .map(|pair| layer_values(&subbands.pencil.mesh, &pair.vector, stack))
        .collect()
}

/// A function's weighted values at the same fractions of every layer, from its values at the nodes.
pub(super) fn layer_values(mesh: &Mesh, nodal: &[f64], stack: &Stack) -> Vec<f64> {
    let points = Reference::of_order(POINTS_ORDER);
    let mut list = Vec::with_capacity(stack.layers.len() * points.nodes.len());
    for (layer, own) in stack.layers.iter().enumerate() {
        let values = values_in(mesh, nodal, layer, &points.nodes);
        for (value, weight) in values.iter().zip(&points.weights) {
            list.push(value * (0.5 * weight * own.width_nm).sqrt());
        }
    }
    list
}

/// Values of a nodal vector at the given places of one layer (−1 its bottom, 1 its top).
fn values_in(mesh: &Mesh, vector: &[f64], layer: usize, places: &[f64]) -> Vec<f64> {
    let own: Vec<usize> = (0..mesh.elements.len())
        .filter(|&e| mesh.elements[e].segment == layer)
        .collect();
    places
        .iter()
        .map(|place| {
            let t = 0.5 * (1.0 + place);
            let holding = own
                .iter()
                .copied()
                .rev()
                .find(|&e| mesh.elements[e].start_fraction <= t + 1e-12);
            let Some(e) = holding else { return 0.0 };
            let element = &mesh.elements[e];
            let x = 2.0 * (t - element.start_fraction) / element.length_fraction - 1.0;
            let row = mesh.reference.interpolation(&[x.clamp(-1.0, 1.0)]);
            row.iter()
                .zip(mesh.local(e, vector))
                .map(|(m, v)| m * v)
                .sum()
        })
        .collect()
}

/// Every state's √(w ρ) at the nodes of each element, with ρ its probability density and w the quadrature weights: the
/// scalar product of two lists is the overlap ∫ √(ρ_i ρ_j) dz.
pub fn amplitudes(subbands: &Subbands) -> Vec<Vec<f64>> {
    let states = 0..subbands.pairs.len();
    states
        .map(|index| amplitude(&subbands.pencil.mesh, state::density(subbands, index)))
        .collect()
}

/// √(w ρ) of a density at the nodes of each element.
pub(super) fn amplitude(mesh: &Mesh, mut density: Vec<f64>) -> Vec<f64> {
    let nodes = density.chunks_exact_mut(mesh.order() + 1);
    for (values, element) in nodes.zip(&mesh.elements) {
        for (value, w) in values.iter_mut().zip(&mesh.reference.weights) {
            *value = (0.5 * element.length * w * *value).sqrt();
        }
    }
    density
}
