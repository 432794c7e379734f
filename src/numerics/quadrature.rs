//! Gauss–Lobatto–Legendre nodes, weights and derivatives on the reference interval [−1, 1].
//!
//! Quadrature on p + 1 nodes is exact for polynomials up to degree 2p − 1 (Abramowitz & Stegun 1964, eq. 25.4.32).

use std::sync::OnceLock;

/// Highest polynomial order that is offered.
pub const MAX_ORDER: usize = 14;

/// Everything about polynomials of one order that does not depend on the element.
#[derive(Debug)]
pub struct Reference {
    /// Polynomial order p; there are p + 1 nodes.
    pub order: usize,
    /// Nodes in [−1, 1], ascending, both ends included.
    pub nodes: Vec<f64>,
    /// Quadrature weights; their sum is 2.
    pub weights: Vec<f64>,
    /// `derivative[q * (p + 1) + i]` is the slope of cardinal polynomial i at node q.
    pub derivative: Vec<f64>,
    /// For every node q the lower triangle, column by column, of w_q D_qi D_qj: a stiffness matrix is a linear
    /// combination of these.
    pub stiffness_terms: Vec<Vec<f64>>,
    /// The sum of the stiffness terms: the stiffness of a uniform element.
    pub uniform_stiffness: Vec<f64>,
}

impl Reference {
    /// The reference data of one order, made once per process.
    ///
    /// Orders outside 2..=[`MAX_ORDER`] are clamped into that range.
    pub fn of_order(order: usize) -> &'static Reference {
        static CACHE: [OnceLock<Reference>; MAX_ORDER + 1] =
            [const { OnceLock::new() }; MAX_ORDER + 1];
        let order = order.clamp(2, MAX_ORDER);
        CACHE[order].get_or_init(|| Reference::compute(order))
    }

    fn compute(order: usize) -> Reference {
        let p = order as f64;
        let count = order + 1;
        let mut nodes = vec![0.0; count];
        for (k, node) in nodes.iter_mut().enumerate() {
            // Chebyshev–Gauss–Lobatto points are close enough for Newton's method to converge to the right zero.
            let mut x = -(std::f64::consts::PI * k as f64 / p).cos();
            if k == 0 || k == order {
                x = x.signum();
            } else {
                for _ in 0..60 {
                    let (value, below) = legendre(order, x);
                    // (1 − x²) P'_p = p (P_{p−1} − x P_p) vanishes at the inner nodes; its slope is −p(p+1) P_p.
                    let step = (below - x * value) / ((p + 1.0) * value);
                    x += step;
                    if step.abs() < 1e-16 {
                        break;
                    }
                }
            }
            *node = x;
        }
        let legendre_at: Vec<f64> = nodes.iter().map(|&x| legendre(order, x).0).collect();
        let weights: Vec<f64> = legendre_at
            .iter()
            .map(|v| 2.0 / (p * (p + 1.0) * v * v))
            .collect();
        let mut derivative = vec![0.0; count * count];
        for q in 0..count {
            let mut diagonal = 0.0;
            for i in 0..count {
                if i != q {
                    let slope = legendre_at[q] / (legendre_at[i] * (nodes[q] - nodes[i]));
                    derivative[q * count + i] = slope;
                    diagonal -= slope;
                }
            }
            // Taking the diagonal from the row sum makes the derivative of a constant vanish exactly.
            derivative[q * count + q] = diagonal;
        }
        let mut stiffness_terms = Vec::with_capacity(count);
        for q in 0..count {
            let row = &derivative[q * count..(q + 1) * count];
            let mut term = Vec::with_capacity(count * (count + 1) / 2);
            for j in 0..count {
                for i in j..count {
                    term.push(weights[q] * row[i] * row[j]);
                }
            }
            stiffness_terms.push(term);
        }
        let mut uniform_stiffness = vec![0.0; count * (count + 1) / 2];
        for term in &stiffness_terms {
            for (sum, value) in uniform_stiffness.iter_mut().zip(term) {
                *sum += value;
            }
        }
        Reference {
            order,
            nodes,
            weights,
            derivative,
            stiffness_terms,
            uniform_stiffness,
        }
    }

    /// Slopes with respect to the reference coordinate at all nodes, of the polynomial with these nodal values.
    #[inline]
    pub fn slopes(&self, values: &[f64], slopes: &mut [f64]) {
        // The orders that solves use have loops of known length.
        match self.order {
            6 => slopes_of::<7>(&self.derivative, values, slopes),
            8 => slopes_of::<9>(&self.derivative, values, slopes),
            12 => slopes_of::<13>(&self.derivative, values, slopes),
            _ => {
                let rows = self.derivative.chunks_exact(self.order + 1);
                for (slope, row) in slopes.iter_mut().zip(rows) {
                    *slope = row.iter().zip(values).map(|(d, v)| d * v).sum();
                }
            }
        }
    }

    /// Adds the transpose of the slope map: `out_i += Σ_q D_qi g_q`.
    #[inline]
    pub fn add_slopes_transposed(&self, g: &[f64], out: &mut [f64]) {
        match self.order {
            6 => add_transposed::<7>(&self.derivative, g, out),
            8 => add_transposed::<9>(&self.derivative, g, out),
            12 => add_transposed::<13>(&self.derivative, g, out),
            _ => {
                let rows = self.derivative.chunks_exact(self.order + 1);
                for (&g_q, row) in g.iter().zip(rows) {
                    for (sum, d) in out.iter_mut().zip(row) {
                        *sum += d * g_q;
                    }
                }
            }
        }
    }

    /// The matrix that takes nodal values to values at the `points` of [−1, 1], row by row.
    pub fn interpolation(&self, points: &[f64]) -> Vec<f64> {
        let count = self.order + 1;
        let mut matrix = Vec::with_capacity(points.len() * count);
        for &x in points {
            for i in 0..count {
                let mut value = 1.0;
                for k in 0..count {
                    if k != i {
                        value *= (x - self.nodes[k]) / (self.nodes[i] - self.nodes[k]);
                    }
                }
                matrix.push(value);
            }
        }
        matrix
    }
}

fn slopes_of<const COUNT: usize>(derivative: &[f64], values: &[f64], slopes: &mut [f64]) {
    let (values, slopes) = (&values[..COUNT], &mut slopes[..COUNT]);
    for (slope, row) in slopes.iter_mut().zip(derivative.chunks_exact(COUNT)) {
        *slope = (0..COUNT).map(|k| row[k] * values[k]).sum();
    }
}

fn add_transposed<const COUNT: usize>(derivative: &[f64], g: &[f64], out: &mut [f64]) {
    let (g, out) = (&g[..COUNT], &mut out[..COUNT]);
    for (g_q, row) in g.iter().zip(derivative.chunks_exact(COUNT)) {
        for k in 0..COUNT {
            out[k] += row[k] * g_q;
        }
    }
}

/// P_p(x) and P_{p−1}(x) by the three-term recurrence.
fn legendre(order: usize, x: f64) -> (f64, f64) {
    let (mut below, mut value) = (1.0, x);
    for n in 2..=order {
        let n = n as f64;
        (below, value) = (value, ((2.0 * n - 1.0) * x * value - (n - 1.0) * below) / n);
    }
    (value, below)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Abramowitz & Stegun (1964), table 25.6: Lobatto abscissas and weights for n = 5 (order 4), from memory.
    #[test]
    fn nodes_of_order_four_are_the_tabulated_ones() {
        let reference = Reference::of_order(4);
        let nodes = [
            -1.0,
            -(3.0_f64 / 7.0).sqrt(),
            0.0,
            (3.0_f64 / 7.0).sqrt(),
            1.0,
        ];
        let weights = [0.1, 49.0 / 90.0, 32.0 / 45.0, 49.0 / 90.0, 0.1];
        for k in 0..5 {
            assert!((reference.nodes[k] - nodes[k]).abs() < 1e-15);
            assert!((reference.weights[k] - weights[k]).abs() < 1e-15);
        }
    }

    #[test]
    fn quadrature_and_slopes_are_exact_for_polynomials() {
        for order in 2..=MAX_ORDER {
            let reference = Reference::of_order(order);
            let degree = 2 * order as i32 - 2;
            let sum: f64 = reference
                .nodes
                .iter()
                .zip(&reference.weights)
                .map(|(x, w)| w * x.powi(degree))
                .sum();
            assert!(
                (sum - 2.0 / f64::from(degree + 1)).abs() < 1e-13,
                "order {order}"
            );
            let values: Vec<f64> = reference
                .nodes
                .iter()
                .map(|x| x.powi(order as i32))
                .collect();
            let mut slopes = vec![0.0; order + 1];
            reference.slopes(&values, &mut slopes);
            for (x, slope) in reference.nodes.iter().zip(&slopes) {
                assert!(
                    (slope - order as f64 * x.powi(order as i32 - 1)).abs() < 1e-10,
                    "order {order}"
                );
            }
        }
    }
}
