//! The band edge and the squared envelopes as lines for drawing.

use super::Subbands;
use crate::models::ConductionOperator;
use crate::numerics::pencil::Coefficient;
use crate::numerics::quadrature::MAX_ORDER;
use std::ops::Range;

/// Lines through points of position in nm and value. At an interface two points share a position: the values below
/// and above it.
#[derive(Clone, Debug)]
pub struct Curves {
    /// The band edge with the field, in eV.
    pub edge: Vec<[f64; 2]>,
    /// Of each state the squared envelopes in 1/nm, all components together, so that each area is 1. Where the mass
    /// depends on energy the eliminated components, and so their sum, jump at an interface.
    pub densities: Vec<Vec<[f64; 2]>>,
}

/// Points at which an element is sampled, per polynomial order.
const SAMPLES_PER_ORDER: usize = 4;

/// Samples the band edge and the lowest `count` states so that a straight line between neighbouring points is nowhere
/// off by more than `fineness` times the curve's range (its largest value, for a squared envelope).
pub fn curves(
    operator: &ConductionOperator,
    subbands: &Subbands,
    count: usize,
    fineness: f64,
) -> Curves {
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
    let edge: Vec<[f64; 2]> = sampled.iter().map(|(z, at)| [*z, at.constant]).collect();
    let low = edge.iter().fold(f64::INFINITY, |a, p| a.min(p[1]));
    let high = edge.iter().fold(f64::NEG_INFINITY, |a, p| a.max(p[1]));
    let places: Vec<f64> = shares.iter().map(|share| 2.0 * share - 1.0).collect();
    let interpolation = mesh.reference.interpolation(&places);
    let densities = (0..count.min(subbands.pairs.len())).map(|state| {
        let density = density(subbands, state, &sampled, &interpolation);
        let largest = density.iter().fold(0.0, |a: f64, p| a.max(p[1]));
        simplified(&density, fineness * largest)
    });
    Curves {
        densities: densities.collect(),
        edge: simplified(&edge, fineness * (high - low)),
    }
}

/// ψ² + Σ_r s_r ψ′²/(E − e_r)² at the sampled points: the interpolants of ψ and of its slope are exact inside an element.
fn density(
    subbands: &Subbands,
    state: usize,
    sampled: &[(f64, Coefficient)],
    interpolation: &[f64],
) -> Vec<[f64; 2]> {
    let mesh = &subbands.pencil.mesh;
    let nodes = mesh.order() + 1;
    let pair = &subbands.pairs[state];
    let mut slopes = [0.0; MAX_ORDER + 1];
    let mut points = Vec::with_capacity(sampled.len());
    let mut places = sampled.iter();
    for (e, element) in mesh.elements.iter().enumerate() {
        let values = mesh.local(e, &pair.vector);
        mesh.reference.slopes(values, &mut slopes[..nodes]);
        for (row, (z_nm, at)) in interpolation.chunks_exact(nodes).zip(&mut places) {
            let here = |nodal: &[f64]| row.iter().zip(nodal).map(|(m, v)| m * v).sum::<f64>();
            let slope = 2.0 / element.length * here(&slopes[..nodes]);
            let own = here(values).powi(2);
            points.push([
                *z_nm,
                own + at.divided(pair.value, pair.value) * slope * slope,
            ]);
        }
    }
    points
}

/// Leaves out the points that lie within `tolerance` of the straight line between those that stay (Douglas and Peucker,
/// Cartographica 10, 112 (1973), with the deviation taken along the value).
fn simplified(points: &[[f64; 2]], tolerance: f64) -> Vec<[f64; 2]> {
    let Some(last) = points.len().checked_sub(1) else {
        return Vec::new();
    };
    let mut kept = vec![false; points.len()];
    (kept[0], kept[last]) = (true, true);
    let mut open: Vec<Range<usize>> = vec![0..last];
    while let Some(range) = open.pop() {
        let ([z0, v0], [z1, v1]) = (points[range.start], points[range.end]);
        let (mut worst, mut at) = (tolerance, None);
        for (k, [z, v]) in points
            .iter()
            .enumerate()
            .take(range.end)
            .skip(range.start + 1)
        {
            let chord = if z1 > z0 {
                v0 + (v1 - v0) * (z - z0) / (z1 - z0)
            } else {
                v0
            };
            if (v - chord).abs() > worst {
                (worst, at) = ((v - chord).abs(), Some(k));
            }
        }
        if let Some(k) = at {
            kept[k] = true;
            open.extend([range.start..k, k..range.end]);
        }
    }
    let kept = points.iter().zip(kept).filter(|(_, kept)| *kept);
    kept.map(|(point, _)| *point).collect()
}
