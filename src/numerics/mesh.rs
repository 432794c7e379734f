//! Elements along a line that is made of segments; every border of two segments is a border of two elements.

use super::quadrature::Reference;

/// A part of one segment.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Element {
    /// The segment that the element belongs to.
    pub segment: usize,
    /// Start within the segment, as a fraction of its length.
    pub start_fraction: f64,
    /// Length as a fraction of the segment's length.
    pub length_fraction: f64,
    /// Position of the start.
    pub start: f64,
    pub length: f64,
}

/// Elements inside each segment, with one polynomial order throughout.
///
/// Neighbouring elements share their border node: with p the order, element e holds the global nodes
/// `e * p ..= (e + 1) * p`.
#[derive(Clone, Debug)]
pub struct Mesh {
    pub reference: &'static Reference,
    pub elements: Vec<Element>,
}

impl Mesh {
    /// Cuts segment k, of length `lengths[k]`, into `pieces[k]` equal elements. The line starts at 0.
    pub fn new(lengths: &[f64], pieces: &[usize], order: usize) -> Mesh {
        let parts = pieces.iter().map(|&count| {
            let fraction = 1.0 / count as f64;
            let starts = (0..count).map(|piece| piece as f64 * fraction);
            starts.map(|start| (start, fraction)).collect()
        });
        Mesh::of_parts(lengths, &parts.collect::<Vec<_>>(), order)
    }

    /// Cuts segment k, of length `lengths[k]`, into elements that start at fractions of it and have fractions of its
    /// length, `parts[k]`. The line starts at 0.
    pub fn of_parts(lengths: &[f64], parts: &[Vec<(f64, f64)>], order: usize) -> Mesh {
        let mut elements = Vec::with_capacity(parts.iter().map(Vec::len).sum());
        let mut start = 0.0;
        for (segment, (&length, parts)) in lengths.iter().zip(parts).enumerate() {
            for &(start_fraction, length_fraction) in parts {
                elements.push(Element {
                    segment,
                    start_fraction,
                    length_fraction,
                    start: start + start_fraction * length,
                    length: length_fraction * length,
                });
            }
            start += length;
        }
        Mesh {
            reference: Reference::of_order(order),
            elements,
        }
    }

    /// The same elements with another polynomial order.
    pub fn with_order(&self, order: usize) -> Mesh {
        Mesh {
            reference: Reference::of_order(order),
            elements: self.elements.clone(),
        }
    }

    /// Polynomial order p.
    pub fn order(&self) -> usize {
        self.reference.order
    }

    /// Number of global nodes, both ends of the line included.
    pub fn node_count(&self) -> usize {
        self.elements.len() * self.order() + 1
    }

    /// Fraction of its segment's length at which local node q of an element lies.
    pub fn fraction(&self, element: &Element, q: usize) -> f64 {
        element.start_fraction + element.length_fraction * 0.5 * (1.0 + self.reference.nodes[q])
    }

    /// Position of local node q of an element.
    pub fn position(&self, element: &Element, q: usize) -> f64 {
        element.start + element.length * 0.5 * (1.0 + self.reference.nodes[q])
    }

    /// The part of a global nodal vector that element number `index` holds.
    pub fn local<'v>(&self, index: usize, values: &'v [f64]) -> &'v [f64] {
        let p = self.order();
        &values[index * p..=(index + 1) * p]
    }

    /// Nodal values on `finer` (same elements, another order) of the functions with these nodal values here.
    pub fn transfer(&self, functions: &[&[f64]], finer: &Mesh) -> Vec<Vec<f64>> {
        let matrix = self.reference.interpolation(&finer.reference.nodes);
        let (from, to) = (self.order() + 1, finer.order());
        let transferred = functions.iter().map(|values| {
            let mut out = vec![0.0; finer.node_count()];
            for index in 0..self.elements.len() {
                let local = self.local(index, values);
                for (q, row) in matrix.chunks_exact(from).enumerate() {
                    out[index * to + q] = row.iter().zip(local).map(|(m, v)| m * v).sum();
                }
            }
            out
        });
        transferred.collect()
    }
}
