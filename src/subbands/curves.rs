//! Band edges and squared envelopes as lines for drawing.

use super::multiband::Band as Side;
use super::{Coupled, Subbands};
use crate::models::BandOperator;
use crate::numerics::pencil::Coefficient;
use crate::numerics::polyline::simplified;
use crate::numerics::quadrature::MAX_ORDER;

/// Lines through points of position in nm and value. At an interface two points share a position: the values below
/// and above it.
#[derive(Clone, Debug)]
pub struct Curves {
    /// The band edge with the field, in eV. Of coupled holes that of the heavy and that of the light ones.
    pub edges: Vec<Vec<[f64; 2]>>,
    /// The states, those nearest the gap first.
    pub states: Vec<StateCurves>,
}

/// The squared envelopes of one state, in 1/nm.
#[derive(Clone, Debug)]
pub struct StateCurves {
    /// ψ² of the band's own envelope; of coupled bands that of the component that holds most of the state.
    pub envelope: Vec<[f64; 2]>,
    /// All components together, with an area of 1. `None` where the envelope is all. With a mass that depends on energy
    /// the eliminated components are added, which jump at an interface.
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
    let [low, high] = range(&edge);
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
        edges: vec![simplified(&edge, fineness * (high - low))],
    }
}

/// As [`curves`], of one side of the gap of coupled bands.
pub fn coupled_curves(coupled: &Coupled, side: Side, count: usize, fineness: f64) -> Curves {
    let mesh = &coupled.pencil().mesh;
    let nodes = mesh.order() + 1;
    let samples = SAMPLES_PER_ORDER * mesh.order();
    let shares: Vec<f64> = (0..=samples).map(|k| k as f64 / samples as f64).collect();
    let places: Vec<f64> = shares.iter().map(|share| 2.0 * share - 1.0).collect();
    let interpolation = mesh.reference.interpolation(&places);
    // The interpolant of what is given at the nodes of each element.
    let sampled = |nodal: &dyn Fn(usize) -> Vec<f64>| -> Vec<[f64; 2]> {
        let elements = mesh.elements.iter().enumerate();
        let points = elements.flat_map(|(e, element)| {
            let values = nodal(e);
            let rows = interpolation.chunks_exact(nodes).zip(&shares);
            let points: Vec<[f64; 2]> = rows
                .map(|(row, share)| {
                    let value = row.iter().zip(&values).map(|(m, v)| m * v).sum();
                    [element.start + element.length * share, value]
                })
                .collect();
            points
        });
        points.collect()
    };
    let edges = coupled.edge_lines_ev(side).into_iter().map(|edge| {
        let points = sampled(&|e| edge[e * nodes..(e + 1) * nodes].to_vec());
        let [low, high] = range(&points);
        simplified(&points, fineness * (high - low))
    });
    let states = (0..count.min(coupled.pairs(side).len())).map(|state| {
        let squares: Vec<Vec<[f64; 2]>> = coupled
            .functions(side, state)
            .iter()
            .map(|function| {
                let mut points = sampled(&|e| mesh.local(e, function).to_vec());
                points.iter_mut().for_each(|point| point[1] *= point[1]);
                points
            })
            .collect();
        let mut sum = squares[0].clone();
        for square in &squares[1..] {
            for (sum, own) in sum.iter_mut().zip(square) {
                sum[1] += own[1];
            }
        }
        let shares = coupled.shares(side, state);
        let largest = (0..squares.len())
            .max_by(|a, b| shares[*a].total_cmp(&shares[*b]))
            .unwrap_or(0);
        let highest = range(&sum)[1];
        let line = |points: &[[f64; 2]]| simplified(points, fineness * highest);
        StateCurves {
            envelope: line(&squares[largest]),
            sum: Some(line(&sum)),
        }
    });
    Curves {
        states: states.collect(),
        edges: edges.collect(),
    }
}

/// The lowest and the highest value of a line.
fn range(points: &[[f64; 2]]) -> [f64; 2] {
    points
        .iter()
        .fold([f64::INFINITY, f64::NEG_INFINITY], |[low, high], p| {
            [low.min(p[1]), high.max(p[1])]
        })
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
