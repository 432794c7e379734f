//! How many elements each layer gets.

use crate::models::BandOperator;
use crate::numerics::mesh::Mesh;
use crate::numerics::pencil::Pencil;

/// Largest phase (or decay exponent) that one element of order 8 has to follow. Measured on wells, double wells and
/// cascade modules: the energies are then within 1e-8 eV, so that the higher orders are seldom needed.
const MAX_PHASE: f64 = 5.0;
/// More elements than this in one layer are never needed: a longer decay has died out long before.
const MAX_PIECES: usize = 4000;

/// Layer widths in nm, and the number of elements in each.
pub fn pieces(operator: &BandOperator, count: usize) -> (Vec<f64>, Vec<usize>) {
    let lengths: Vec<f64> = operator
        .stack()
        .layers
        .iter()
        .map(|layer| layer.width_nm)
        .collect();
    let coarse = Mesh::new(&lengths, &vec![1; lengths.len()], 2);
    let sample = super::pencil_on(operator, coarse);
    let top_ev = sample.weyl_estimate(count as f64 + 1.0);
    let mut pieces = pieces_up_to(&sample, top_ev);
    for plane in &operator.stack().planes {
        // A plane inside of a layer lies on a border of elements: in its middle.
        if plane.fraction > 0.0 && plane.fraction < 1.0 {
            pieces[plane.layer] += pieces[plane.layer] % 2;
        }
    }
    (lengths, pieces)
}

/// The number of elements that each segment needs for levels up to an energy. The sample has one element per segment.
pub fn pieces_up_to(sample: &Pencil, top_ev: f64) -> Vec<usize> {
    let floor_ev = sample.floor();
    let elements = sample.mesh.elements.iter().enumerate();
    elements
        .map(|(index, element)| {
            let steepest = sample.at(index).iter().fold(0.0_f64, |most, c| {
                let above = (top_ev - c.constant).max(0.0) / c.a(top_ev);
                let below = (c.constant - floor_ev).max(0.0) / c.a(floor_ev);
                most.max(above).max(below)
            });
            ((steepest.sqrt() * element.length / MAX_PHASE).ceil() as usize).clamp(1, MAX_PIECES)
        })
        .collect()
}
