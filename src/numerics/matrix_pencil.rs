//! Symmetric systems −(A ψ′)′ − (G ψ)′ + Gᵀ ψ′ + C ψ = λ ψ for vectors ψ of n functions on a mesh, ψ = 0 at both ends,
//! as a banded matrix. A and C are symmetric, G is any real matrix; all may jump from element to element.
//!
//! The weak form is ∫ ψ′·A φ′ + ψ′·G φ + ψ·Gᵀ φ′ + ψ·C φ = λ ∫ ψ·φ. With quadrature on the nodes the mass matrix is
//! diagonal; unknowns are scaled by its square root, so that the matrix T − λ stands for an ordinary eigenproblem.
//! A Hermitian system kz A kz + kz B + B† kz + C, kz = −i d/dz, is of this form with G = i B where a basis makes A, C
//! and i B real.

use super::banded::{Banded, Factored};
use super::mesh::{Element, Mesh};
use nalgebra::DMatrix;

/// The coefficients at one place, each n × n.
#[derive(Clone, Debug, PartialEq)]
pub struct MatrixCoefficient {
    pub a: DMatrix<f64>,
    pub g: DMatrix<f64>,
    pub c: DMatrix<f64>,
}

impl MatrixCoefficient {
    /// All zero.
    pub fn zeros(n: usize) -> MatrixCoefficient {
        let zero = DMatrix::zeros(n, n);
        MatrixCoefficient {
            a: zero.clone(),
            g: zero.clone(),
            c: zero,
        }
    }
}

/// The discretised system.
#[derive(Clone, Debug)]
pub struct MatrixPencil {
    pub mesh: Mesh,
    components: usize,
    /// Square roots of the quadrature weights at the inner nodes.
    roots: Vec<f64>,
    matrix: Banded,
}

impl MatrixPencil {
    /// Evaluates the coefficients of `components` functions with `at(element, local node)` and assembles the matrix.
    pub fn new<'c>(
        mesh: Mesh,
        components: usize,
        mut at: impl FnMut(&Element, usize) -> std::borrow::Cow<'c, MatrixCoefficient>,
    ) -> MatrixPencil {
        let (n, p) = (components, mesh.order());
        let nodes = mesh.node_count() - 2;
        let mut reach = Vec::with_capacity(nodes * n);
        for g in 1..=nodes {
            let further = if g % p == 0 { p } else { p - g % p };
            reach.extend((0..n).map(|component| further * n + n - 1 - component));
        }
        let mut pencil = MatrixPencil {
            roots: square_roots(&mesh),
            components,
            matrix: Banded::zeros(reach),
            mesh,
        };
        let elements = pencil.mesh.elements.clone();
        for (index, element) in elements.iter().enumerate() {
            let coefficients: Vec<_> = (0..=p).map(|q| at(element, q)).collect();
            pencil.add_element(index, element, &coefficients);
        }
        for unknown in 0..pencil.size() {
            let root = pencil.roots[unknown / n];
            for (d, value) in pencil.matrix.column_mut(unknown).iter_mut().enumerate() {
                *value /= root * pencil.roots[(unknown + d) / n];
            }
        }
        pencil
    }

    /// The element's part of the weak form, column by column of the lower triangle.
    fn add_element(
        &mut self,
        index: usize,
        element: &Element,
        coefficients: &[std::borrow::Cow<MatrixCoefficient>],
    ) {
        let reference = self.mesh.reference;
        let (n, p) = (self.components, reference.order);
        let derivative = |q: usize, i: usize| reference.derivative[q * (p + 1) + i];
        let last = self.mesh.node_count() - 1;
        let uniform = coefficients[1..].iter().all(|c| c.a == coefficients[0].a);
        let mut block = DMatrix::zeros(n, n);
        let mut triangle = reference.uniform_stiffness.iter();
        for j in 0..=p {
            for i in j..=p {
                let whole = *triangle.next().unwrap_or(&0.0);
                let (row, column) = (index * p + i, index * p + j);
                if row == 0 || row == last || column == 0 || column == last {
                    continue;
                }
                block.fill(0.0);
                if uniform {
                    add(&mut block, 2.0 / element.length * whole, &coefficients[0].a);
                } else {
                    for (q, at) in coefficients.iter().enumerate() {
                        let factor = reference.weights[q] * derivative(q, i) * derivative(q, j);
                        add(&mut block, 2.0 / element.length * factor, &at.a);
                    }
                }
                // ψ′ G φ has φ at node j alone, ψ Gᵀ φ′ has ψ at node i alone.
                let (at_j, at_i) = (&coefficients[j].g, &coefficients[i].g);
                add(&mut block, reference.weights[j] * derivative(j, i), at_j);
                let factor = reference.weights[i] * derivative(i, j);
                for r in 0..n {
                    for c in 0..n {
                        block[(r, c)] += factor * at_i[(c, r)];
                    }
                }
                if i == j {
                    let factor = 0.5 * element.length * reference.weights[i];
                    add(&mut block, factor, &coefficients[i].c);
                }
                for c in 0..n {
                    let unknown = (column - 1) * n + c;
                    let below = self.matrix.column_mut(unknown);
                    for r in 0..n {
                        let target = (row - 1) * n + r;
                        if target >= unknown {
                            below[target - unknown] += block[(r, c)];
                        }
                    }
                }
            }
        }
    }

    /// Number of functions.
    pub fn components(&self) -> usize {
        self.components
    }

    /// Number of unknowns: the functions at the inner nodes, node by node.
    pub fn size(&self) -> usize {
        self.matrix.size()
    }

    /// The matrix T, scaled to unit mass.
    pub fn matrix(&self) -> &Banded {
        &self.matrix
    }

    /// Factors T − λ, in `storage` if given.
    pub fn factor(&self, lambda: f64, storage: Option<Banded>) -> Factored {
        let mut shifted = match storage {
            Some(mut storage) => {
                storage.clone_from(&self.matrix);
                storage
            }
            None => self.matrix.clone(),
        };
        for unknown in 0..shifted.size() {
            shifted.column_mut(unknown)[0] -= lambda;
        }
        shifted.factor()
    }

    /// Number of levels below λ.
    pub fn count_below(&self, lambda: f64) -> usize {
        self.factor(lambda, None).negative()
    }

    /// The values of one function at all nodes, both ends included, from a scaled vector of unknowns.
    pub fn function(&self, scaled: &[f64], component: usize) -> Vec<f64> {
        let inner = scaled
            .iter()
            .skip(component)
            .step_by(self.components)
            .zip(&self.roots)
            .map(|(x, root)| x / root);
        let ends = std::iter::once(0.0);
        ends.clone().chain(inner).chain(ends).collect()
    }

    /// The height of every inner node, each for all functions there.
    pub fn positions(&self) -> impl Iterator<Item = f64> + '_ {
        let p = self.mesh.order();
        let inner = 1..self.mesh.node_count() - 1;
        inner.map(move |g| self.mesh.position(&self.mesh.elements[g / p], g % p))
    }

    /// A linear form given by its values on the functions at all nodes, as it acts on scaled vectors.
    pub(super) fn scaled_form(&self, functions: &[Vec<f64>]) -> Vec<f64> {
        let nodes = self.roots.iter().enumerate();
        nodes
            .flat_map(|(node, root)| functions.iter().map(move |f| f[node + 1] / root))
            .collect()
    }

    /// The scaled vector of unknowns on `finer` (same elements, another order) of the functions that `scaled` stands for.
    pub fn transfer(&self, scaled: &[f64], finer: &MatrixPencil) -> Vec<f64> {
        let n = self.components;
        let functions: Vec<Vec<f64>> = (0..n).map(|k| self.function(scaled, k)).collect();
        let functions: Vec<&[f64]> = functions.iter().map(|f| &f[..]).collect();
        let mut out = vec![0.0; finer.size()];
        for (k, values) in self
            .mesh
            .transfer(&functions, &finer.mesh)
            .iter()
            .enumerate()
        {
            for (node, root) in finer.roots.iter().enumerate() {
                out[node * n + k] = values[node + 1] * root;
            }
        }
        out
    }
}

/// sum ← sum + factor · matrix.
fn add(sum: &mut DMatrix<f64>, factor: f64, matrix: &DMatrix<f64>) {
    for (s, m) in sum.iter_mut().zip(matrix.iter()) {
        *s += factor * m;
    }
}

fn square_roots(mesh: &Mesh) -> Vec<f64> {
    let p = mesh.order();
    let mut mass = vec![0.0; mesh.node_count()];
    for (index, element) in mesh.elements.iter().enumerate() {
        for (q, w) in mesh.reference.weights.iter().enumerate() {
            mass[index * p + q] += 0.5 * element.length * w;
        }
    }
    let inner = 1..mass.len() - 1;
    mass[inner].iter().map(|m| m.sqrt()).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::borrow::Cow;

    /// Two functions with A = 1, −1 coupled by P d/dz on an interval of length π, both zero at its ends, are no pair of
    /// sines; but with G antisymmetric and constant, φ = R(κ z) ψ turns the coupling into a constant: for A = 1 and
    /// G = g J the levels are those of the interval, n² + (g² taken off): −ψ″ − 2 g J ψ′ = λ ψ gives λ = n² − g².
    #[test]
    fn a_constant_rotation_moves_all_levels_by_its_square() {
        let g = 0.7;
        let mesh = Mesh::new(&[1.0, std::f64::consts::PI - 1.0], &[1, 2], 10);
        let pencil = MatrixPencil::new(mesh, 2, |_, _| {
            let mut at = MatrixCoefficient::zeros(2);
            at.a.fill_with_identity();
            at.g[(0, 1)] = g;
            at.g[(1, 0)] = -g;
            Cow::Owned(at)
        });
        for (level, exact) in [(1.0, 1.0 - g * g), (2.0, 4.0 - g * g), (3.0, 9.0 - g * g)] {
            let below = pencil.count_below(exact - 1e-8);
            let up_to = pencil.count_below(exact + 1e-8);
            assert_eq!((below, up_to), (2 * level as usize - 2, 2 * level as usize));
        }
    }
}
