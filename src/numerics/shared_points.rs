//! Quadrature points that serve two meshes of the same line at once.

use super::mesh::Mesh;
use super::quadrature::{MAX_ORDER, Reference};

/// A stretch of the line that lies in one element of either mesh.
#[derive(Clone, Copy, Debug)]
struct Interval {
    elements: [usize; 2],
    start: f64,
    length: f64,
}

/// Points whose weights integrate products of two functions, one of either mesh, exactly (polynomials up to degree
/// 2 × 14 − 1 between the borders of both meshes). Borders appear twice.
#[derive(Clone, Debug)]
pub struct SharedPoints {
    intervals: Vec<Interval>,
    pub positions: Vec<f64>,
    pub weights: Vec<f64>,
}

impl SharedPoints {
    /// The points of two meshes that cover the same line; no interval is longer than `longest`.
    pub fn new(meshes: [&Mesh; 2], longest: f64) -> SharedPoints {
        let rule = Reference::of_order(MAX_ORDER);
        let mut points = SharedPoints {
            intervals: Vec::new(),
            positions: Vec::new(),
            weights: Vec::new(),
        };
        let total = meshes[0]
            .elements
            .last()
            .map_or(0.0, |e| e.start + e.length);
        let mut elements = [0, 0];
        let mut start = 0.0;
        while let [Some(one), Some(other)] = [0, 1].map(|m| meshes[m].elements.get(elements[m])) {
            let ends = [one.start + one.length, other.start + other.length];
            let end = ends[0].min(ends[1]);
            // Borders that differ by rounding are one.
            let clear = 1e-12 * total;
            if end - start > clear {
                let pieces = ((end - start) / longest).ceil().max(1.0);
                let length = (end - start) / pieces;
                for piece in 0..pieces as usize {
                    points.add(rule, elements, start + piece as f64 * length, length);
                }
                start = end;
            }
            for (element, own) in elements.iter_mut().zip(ends) {
                *element += usize::from(own <= end + clear);
            }
        }
        points
    }

    fn add(&mut self, rule: &Reference, elements: [usize; 2], start: f64, length: f64) {
        self.intervals.push(Interval {
            elements,
            start,
            length,
        });
        for (node, weight) in rule.nodes.iter().zip(&rule.weights) {
            self.positions.push(start + 0.5 * (1.0 + node) * length);
            self.weights.push(0.5 * length * weight);
        }
    }

    /// Values at all points of functions given by their nodal values on one of the two meshes, the first (0) or the
    /// second (1).
    pub fn values(&self, which: usize, mesh: &Mesh, functions: &[&[f64]]) -> Vec<Vec<f64>> {
        let rule = Reference::of_order(MAX_ORDER);
        let mut out = vec![Vec::with_capacity(self.positions.len()); functions.len()];
        for interval in &self.intervals {
            let index = interval.elements[which];
            let element = &mesh.elements[index];
            let places: Vec<f64> = rule
                .nodes
                .iter()
                .map(|node| {
                    let z = interval.start + 0.5 * (1.0 + node) * interval.length;
                    (2.0 * (z - element.start) / element.length - 1.0).clamp(-1.0, 1.0)
                })
                .collect();
            let matrix = mesh.reference.interpolation(&places);
            for (values, function) in out.iter_mut().zip(functions) {
                let local = mesh.local(index, function);
                values.extend(
                    matrix
                        .chunks_exact(local.len())
                        .map(|row| row.iter().zip(local).map(|(m, v)| m * v).sum::<f64>()),
                );
            }
        }
        out
    }
}
