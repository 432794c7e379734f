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
    let vectors: Vec<&[f64]> = pairs.map(|pair| &pair.vector[..]).collect();
    layer_values(&subbands.pencil.mesh, &vectors, stack)
}

/// The weighted values of functions at the same fractions of every layer, from their values at the nodes.
pub(super) fn layer_values(mesh: &Mesh, functions: &[&[f64]], stack: &Stack) -> Vec<Vec<f64>> {
    let points = Reference::of_order(POINTS_ORDER);
    let mut lists = vec![Vec::new(); functions.len()];
    for (layer, own) in stack.layers.iter().enumerate() {
        let places = layer_rows(mesh, layer, &points.nodes);
        for (place, weight) in places.iter().zip(&points.weights) {
            let scale = (0.5 * weight * own.width_nm).sqrt();
            for (list, nodal) in lists.iter_mut().zip(functions) {
                let value = place.as_ref().map_or(0.0, |(element, row)| {
                    let local = mesh.local(*element, nodal).iter();
                    row.iter().zip(local).map(|(m, v)| m * v).sum()
                });
                list.push(value * scale);
            }
        }
    }
    lists
}

/// The element at each of the given places of one layer (−1 its bottom, 1 its top), and what takes values at the element's
/// nodes to that place.
fn layer_rows(mesh: &Mesh, layer: usize, places: &[f64]) -> Vec<Option<(usize, Vec<f64>)>> {
    let own: Vec<usize> = (0..mesh.elements.len())
        .filter(|&e| mesh.elements[e].segment == layer)
        .collect();
    let rows = places.iter().map(|place| {
        let t = 0.5 * (1.0 + place);
        let e = own
            .iter()
            .copied()
            .rev()
            .find(|&e| mesh.elements[e].start_fraction <= t + 1e-12)?;
        let element = &mesh.elements[e];
        let x = 2.0 * (t - element.start_fraction) / element.length_fraction - 1.0;
        Some((e, mesh.reference.interpolation(&[x.clamp(-1.0, 1.0)])))
    });
    rows.collect()
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
