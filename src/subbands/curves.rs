//! The band edge and the squared envelopes as lines for drawing.

use super::Subbands;
use crate::models::BandOperator;
use crate::numerics::pencil::Coefficient;
use crate::numerics::polyline::simplified;
use crate::numerics::quadrature::MAX_ORDER;

/// Lines through points of position in nm and value. At an interface two points share a position: the values below
/// and above it.
#[derive(Clone, Debug)]
pub struct Curves {
    /// The band edge with the field, in eV.
    pub edge: Vec<[f64; 2]>,
    /// The states, lowest first.
    pub states: Vec<StateCurves>,
}

/// The squared envelopes of one state, in 1/nm.
#[derive(Clone, Debug)]
pub struct StateCurves {
    /// ψ² of the conduction band's own envelope.
    pub envelope: Vec<[f64; 2]>,
    /// All components together, with an area of 1. `None` where the mass does not depend on energy: there the envelope
    /// is all. Else the eliminated components are added, which jump at an interface.
    pub sum: Option<Vec<[f64; 2]>>,
}

impl StateCurves {
    /// The line with an area of 1.
    pub fn whole(&self) -> &[[f64; 2]] {
        self.sum.as_ref().unwrap_or(&self.envelope)
    }
}

/// Points at which an element is sampled, per polynomial order.
const SAMPLES_PER_ORDER: usize = 4;

/// Samples the band edge and the lowest `count` states so that a straight line between neighbouring points is nowhere
/// off by more than `fineness` times the edge's range or the state's largest value.
pub fn curves(operator: &BandOperator, subbands: &Subbands, count: usize, fineness: f64) -> Curves {
    let mesh = &subbands.pencil.mesh;
    let samples = SAMPLES_PER_ORDER * mesh.order();
    let shares: Vec<f64> = (0..=samples).map(|k| k as f64 / samples as f64).collect();
    let sampled: Vec<(f64, Coefficient)> = mesh
        .elements
        .iter()
        .flat_map(|element| {
            shares.iter().map(move |share| {
                let t = element.start_fraction + element.length_fraction * share;
                let z_nm = element.start + element.length * share;
                (z_nm, operator.at(element.segment, t, z_nm))
            })
        })
        .collect();
    let sign = operator.band().sign();
    let edge: Vec<[f64; 2]> = sampled
        .iter()
        .map(|(z, at)| [*z, sign * at.constant])
        .collect();
    let low = edge.iter().fold(f64::INFINITY, |a, p| a.min(p[1]));
    let high = edge.iter().fold(f64::NEG_INFINITY, |a, p| a.max(p[1]));
    let places: Vec<f64> = shares.iter().map(|share| 2.0 * share - 1.0).collect();
    let interpolation = mesh.reference.interpolation(&places);
    let states = (0..count.min(subbands.pairs.len())).map(|state| {
        let (envelope, sum) = squares(subbands, state, &sampled, &interpolation);
        let largest = sum.iter().fold(0.0, |a: f64, p| a.max(p[1]));
        let line = |points| simplified(points, fineness * largest);
        StateCurves {
            envelope: line(&envelope),
            sum: (!subbands.pencil.is_linear()).then(|| line(&sum)),
        }
    });
    Curves {
        states: states.collect(),
        edge: simplified(&edge, fineness * (high - low)),
    }
}

/// ψ², and ψ² + Σ_r s_r ψ′²/(E − e_r)², at the sampled points: the interpolants of ψ and of its slope are exact inside
/// an element.
fn squares(
    subbands: &Subbands,
    state: usize,
    sampled: &[(f64, Coefficient)],
    interpolation: &[f64],
) -> (Vec<[f64; 2]>, Vec<[f64; 2]>) {
    let mesh = &subbands.pencil.mesh;
    let nodes = mesh.order() + 1;
    let pair = &subbands.pairs[state];
    let mut slopes = [0.0; MAX_ORDER + 1];
    let mut envelope = Vec::with_capacity(sampled.len());
    let mut sum = Vec::with_capacity(sampled.len());
    let mut places = sampled.chunks_exact(interpolation.len() / nodes);
    for (e, element) in mesh.elements.iter().enumerate() {
        let values = mesh.local(e, &pair.vector);
        mesh.reference.slopes(values, &mut slopes[..nodes]);
        let own = places.next().unwrap_or_default();
        for (row, (z_nm, at)) in interpolation.chunks_exact(nodes).zip(own) {
            let here = |nodal: &[f64]| row.iter().zip(nodal).map(|(m, v)| m * v).sum::<f64>();
            let square = here(values).powi(2);
            let slope = 2.0 / element.length * here(&slopes[..nodes]);
            envelope.push([*z_nm, square]);
            sum.push([
                *z_nm,
                square + at.divided(pair.value, pair.value) * slope * slope,
            ]);
        }
    }
    (envelope, sum)
}
