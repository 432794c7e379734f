//! The boundary value problem −(A u′)′ + d u = r on the elements of a mesh, with A u′ = 0 or a given u at the ends.

use super::banded::Banded;
use super::mesh::Mesh;

/// The stiffness matrix of A on all nodes, both ends included.
#[derive(Clone, Debug)]
pub struct BoundaryValue {
    matrix: Banded,
}

impl BoundaryValue {
    /// Evaluates A with `a(element, local node)`; it must be positive.
    pub fn new(mesh: &Mesh, a: impl Fn(usize, usize) -> f64) -> BoundaryValue {
        let p = mesh.order();
        let reach = (0..mesh.node_count()).map(|g| p - g % p).collect();
        let mut matrix = Banded::zeros(reach);
        for (index, element) in mesh.elements.iter().enumerate() {
            for (q, term) in mesh.reference.stiffness_terms.iter().enumerate() {
                let scale = 2.0 / element.length * a(index, q);
                let mut entries = term.iter();
                for j in 0..=p {
                    let column = matrix.column_mut(index * p + j);
                    for (value, entry) in column.iter_mut().zip(entries.by_ref().take(p + 1 - j)) {
                        *value += scale * entry;
                    }
                }
            }
        }
        BoundaryValue { matrix }
    }

    /// The stiffness matrix times nodal values.
    pub fn times(&self, u: &[f64]) -> Vec<f64> {
        self.matrix.times(u)
    }

    /// Solves with a diagonal added and the integrals of r with each node's polynomial on the right; ends that are `held`
    /// have u = 0, the others A u′ = 0. Without held ends the diagonal must not vanish altogether.
    pub fn solve(&self, diagonal: &[f64], right: &[f64], held: [bool; 2]) -> Vec<f64> {
        let mut matrix = self.matrix.clone();
        for (k, d) in diagonal.iter().enumerate() {
            matrix.column_mut(k)[0] += d;
        }
        let mut x = right.to_vec();
        let last = x.len() - 1;
        for (end, held) in [0, last].into_iter().zip(held) {
            if held {
                matrix.pin(end);
                x[end] = 0.0;
            }
        }
        matrix.factor().solve(&mut x);
        x
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// −(A u′)′ = 2 with A = 1 below and 4 above the middle, u = 0 at the bottom, A u′ = 0 at the top of the unit line:
    /// A u′ = 2 (1 − z), so u = 2z − z² below, and 3/4 + (2z − z² − 3/4)/4 above. In closed form.
    #[test]
    fn a_layered_line_has_its_closed_form() {
        let mesh = Mesh::new(&[0.5, 0.5], &[1, 2], 4);
        let problem = BoundaryValue::new(&mesh, |e, _| if e == 0 { 1.0 } else { 4.0 });
        let mut right = vec![0.0; mesh.node_count()];
        for (e, element) in mesh.elements.iter().enumerate() {
            for (q, w) in mesh.reference.weights.iter().enumerate() {
                right[e * 4 + q] += 2.0 * 0.5 * element.length * w;
            }
        }
        let u = problem.solve(&vec![0.0; right.len()], &right, [true, false]);
        for (e, element) in mesh.elements.iter().enumerate() {
            for q in 0..5 {
                let z = mesh.position(element, q);
                let below = 2.0 * z - z * z;
                let exact = if e == 0 {
                    below
                } else {
                    0.75 + 0.25 * (below - 0.75)
                };
                assert!((u[e * 4 + q] - exact).abs() < 1e-13, "{z}");
            }
        }
        let residual = problem.times(&u);
        for (k, (r, known)) in residual.iter().zip(&right).enumerate().skip(1) {
            assert!((r - known).abs() < 1e-12, "{k}");
        }
    }
}
