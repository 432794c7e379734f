//! The eigenproblem −(A(λ, z) ψ′)′ + (C(z) − λ) ψ = 0 on a mesh, ψ = 0 at both ends, as a banded matrix T(λ).
//!
//! A may depend on λ through poles, A = A₀ + Σ_r s_r/(λ − e_r). Each pole is one more component φ_r = √s_r ψ′/(λ − e_r)
//! of a larger problem that is linear in λ; T(λ) is the Schur complement of that problem on ψ, quadrature included. So
//! the norm, the matrix elements and the orthogonality of the larger problem hold exactly on the mesh: they are the
//! divided differences of −T, N(λ, μ) = −(T(λ) − T(μ))/(λ − μ).
//!
//! While every s_r is positive T(λ) falls as λ grows, so its negative eigenvalues count the levels below λ.

use super::banded::Banded;
use super::mesh::{Element, Mesh};
use super::quadrature::MAX_ORDER;

/// One pole s/(λ − e) of the coefficient A, with the range in which it is followed.
///
/// The distance λ − e is kept inside `nearest ..= farthest`; beyond, A stays what it is at that end.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pole<T = f64> {
    pub strength: T,
    pub position: T,
    pub nearest: T,
    pub farthest: T,
}

/// The coefficients at one place: A = `stiffness` + poles, and C = `constant`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Coefficient<T = f64> {
    pub stiffness: T,
    pub poles: [Option<Pole<T>>; 2],
    pub constant: T,
}

impl Pole {
    /// The distance λ − e within its range, and whether it is inside.
    #[inline]
    pub fn distance(&self, lambda: f64) -> (f64, bool) {
        let distance = lambda - self.position;
        if distance < self.nearest {
            (self.nearest, false)
        } else if distance > self.farthest {
            (self.farthest, false)
        } else {
            (distance, true)
        }
    }
}

impl Coefficient {
    /// A(λ).
    #[inline]
    pub fn a(&self, lambda: f64) -> f64 {
        let mut a = self.stiffness;
        for pole in self.poles.iter().flatten() {
            a += pole.strength / pole.distance(lambda).0;
        }
        a
    }

    /// The divided difference −(A(λ) − A(μ))/(λ − μ); for λ = μ the slope −dA/dλ.
    #[inline]
    pub fn divided(&self, lambda: f64, mu: f64) -> f64 {
        let mut sum = 0.0;
        for pole in self.poles.iter().flatten() {
            let (x, x_inside) = pole.distance(lambda);
            let (y, y_inside) = pole.distance(mu);
            sum += match (x_inside, y_inside) {
                (true, true) => pole.strength / (x * y),
                (false, false) => 0.0,
                _ => pole.strength / (x * y) * (x - y) / (lambda - mu),
            };
        }
        sum
    }

    /// Whether A depends on λ.
    pub fn has_poles(&self) -> bool {
        self.poles.iter().any(Option::is_some)
    }
}

/// The discretised problem.
#[derive(Clone, Debug)]
pub struct Pencil {
    pub mesh: Mesh,
    /// Coefficients at the nodes of each element, element by element: (order + 1) per element.
    pub coefficients: Vec<Coefficient>,
    /// The diagonal mass matrix at all nodes: quadrature weights.
    mass: Vec<f64>,
    /// T(0) of a problem without poles, where T(λ) = T(0) − λ M.
    linear: Option<Banded>,
    reach: Vec<usize>,
}

impl Pencil {
    /// Evaluates the coefficients with `at(mesh, element, local node)` and prepares the matrices.
    pub fn new(mesh: Mesh, mut at: impl FnMut(&Mesh, &Element, usize) -> Coefficient) -> Pencil {
        let p = mesh.order();
        let mut coefficients = Vec::with_capacity(mesh.elements.len() * (p + 1));
        for element in &mesh.elements {
            for q in 0..=p {
                coefficients.push(at(&mesh, element, q));
            }
        }
        let size = mesh.node_count() - 2;
        let reach = (1..=size)
            .map(|g| if g % p == 0 { p } else { p - g % p })
            .collect();
        let with_poles = coefficients.iter().any(Coefficient::has_poles);
        let mut pencil = Pencil {
            mass: quadrature_weights(&mesh),
            mesh,
            coefficients,
            linear: None,
            reach,
        };
        if !with_poles {
            let mut base = pencil.storage();
            pencil.assemble(0.0, &mut base);
            pencil.linear = Some(base);
        }
        pencil
    }

    /// Number of unknowns: the inner nodes.
    pub fn size(&self) -> usize {
        self.mesh.node_count() - 2
    }

    /// Whether T is linear in λ: no coefficient has poles.
    pub fn is_linear(&self) -> bool {
        self.linear.is_some()
    }

    /// A zero matrix of the right shape.
    pub fn storage(&self) -> Banded {
        Banded::zeros(self.reach.clone())
    }

    /// The quadrature weights at all nodes: the diagonal mass matrix.
    pub fn weights(&self) -> &[f64] {
        &self.mass
    }

    /// Coefficients at the nodes of element number `index`.
    pub fn at(&self, index: usize) -> &[Coefficient] {
        let count = self.mesh.order() + 1;
        &self.coefficients[index * count..(index + 1) * count]
    }

    /// Fills `matrix` with T(λ) on the inner nodes.
    pub fn assemble(&self, lambda: f64, matrix: &mut Banded) {
        if let Some(base) = &self.linear {
            matrix.clone_from(base);
            for (k, m) in self.mass[1..=self.size()].iter().enumerate() {
                matrix.column_mut(k)[0] -= lambda * m;
            }
            return;
        }
        matrix.clear();
        let reference = self.mesh.reference;
        let p = reference.order;
        let last = self.mesh.node_count() - 1;
        let entries = (p + 1) * (p + 2) / 2;
        let mut buffer = [0.0; (MAX_ORDER + 1) * (MAX_ORDER + 2) / 2];
        let local = &mut buffer[..entries];
        let mut softness = [0.0; MAX_ORDER + 1];
        for (index, element) in self.mesh.elements.iter().enumerate() {
            let nodes = self.at(index);
            let scale = 2.0 / element.length;
            let first = nodes[0];
            if nodes
                .iter()
                .all(|c| c.stiffness == first.stiffness && !c.has_poles())
            {
                for (l, s) in local.iter_mut().zip(&reference.uniform_stiffness) {
                    *l = scale * first.stiffness * s;
                }
            } else {
                for (a, node) in softness.iter_mut().zip(nodes) {
                    *a = scale * node.a(lambda);
                }
                let (softness, terms) = (&softness[..=p], &reference.stiffness_terms);
                // The orders that solves use have loops of known length.
                match p {
                    6 => combine::<28>(softness, terms, local),
                    8 => combine::<45>(softness, terms, local),
                    10 => combine::<66>(softness, terms, local),
                    12 => combine::<91>(softness, terms, local),
                    _ => combine_any(softness, terms, local),
                }
            }
            let mut start = 0;
            for j in 0..=p {
                let g = index * p + j;
                if g != 0 && g != last {
                    let column = matrix.column_mut(g - 1);
                    let own = &local[start..start + column.len().min(p + 1 - j)];
                    for (target, value) in column.iter_mut().zip(own) {
                        *target += value;
                    }
                    column[0] +=
                        0.5 * element.length * reference.weights[j] * (nodes[j].constant - lambda);
                }
                start += p + 1 - j;
            }
        }
    }

    /// T(λ) x for a nodal vector x that vanishes at both ends; the result is set to zero there as well.
    pub fn times(&self, lambda: f64, x: &[f64]) -> Vec<f64> {
        let mut out = self.times_with_ends(lambda, x);
        out[0] = 0.0;
        out[x.len() - 1] = 0.0;
        out
    }

    /// T(λ) x with the end nodes taken in: where x solves the equation inside, the result is −A x′ at the start, A x′ at
    /// the end and zero between.
    pub fn times_with_ends(&self, lambda: f64, x: &[f64]) -> Vec<f64> {
        let reference = self.mesh.reference;
        let p = reference.order;
        let mut out = vec![0.0; x.len()];
        let mut slopes = [0.0; MAX_ORDER + 1];
        for (index, element) in self.mesh.elements.iter().enumerate() {
            let (local, nodes) = (self.mesh.local(index, x), self.at(index));
            reference.slopes(local, &mut slopes[..=p]);
            let target = &mut out[index * p..=(index + 1) * p];
            for q in 0..=p {
                let w = reference.weights[q];
                slopes[q] *= 2.0 / element.length * w * nodes[q].a(lambda);
                target[q] += 0.5 * element.length * w * (nodes[q].constant - lambda) * local[q];
            }
            reference.add_slopes_transposed(&slopes[..=p], target);
        }
        out
    }

    /// N(λ, μ) x for a nodal vector x that vanishes at both ends; the result is set to zero there as well.
    pub fn weight(&self, lambda: f64, mu: f64, x: &[f64]) -> Vec<f64> {
        let reference = self.mesh.reference;
        let p = reference.order;
        let mut out: Vec<f64> = self.mass.iter().zip(x).map(|(m, v)| m * v).collect();
        if self.is_linear() {
            // x vanishes at the ends, and so does the product.
            return out;
        }
        let mut slopes = [0.0; MAX_ORDER + 1];
        for (index, element) in self.mesh.elements.iter().enumerate() {
            reference.slopes(self.mesh.local(index, x), &mut slopes[..=p]);
            for ((slope, coefficient), w) in slopes
                .iter_mut()
                .zip(self.at(index))
                .zip(&reference.weights)
            {
                *slope *= 2.0 / element.length * w * coefficient.divided(lambda, mu);
            }
            reference.add_slopes_transposed(&slopes[..=p], &mut out[index * p..=(index + 1) * p]);
        }
        out[0] = 0.0;
        out[x.len() - 1] = 0.0;
        out
    }

    /// The bilinear form x · N(λ, μ) y.
    pub fn inner(&self, lambda: f64, x: &[f64], mu: f64, y: &[f64]) -> f64 {
        let products = self.mass.iter().zip(x).zip(y);
        let mut sum = products.map(|((m, x), y)| m * x * y).sum();
        if self.is_linear() {
            return sum;
        }
        let reference = self.mesh.reference;
        let p = reference.order;
        let (mut left, mut right) = ([0.0; MAX_ORDER + 1], [0.0; MAX_ORDER + 1]);
        for (index, element) in self.mesh.elements.iter().enumerate() {
            reference.slopes(self.mesh.local(index, x), &mut left[..=p]);
            reference.slopes(self.mesh.local(index, y), &mut right[..=p]);
            let scale = 2.0 / element.length;
            for (q, node) in self.at(index).iter().enumerate() {
                let along = left[q] * right[q] * node.divided(lambda, mu);
                sum += scale * reference.weights[q] * along;
            }
        }
        sum
    }

    /// A λ at which the semiclassical phase ∫ √((λ − C)/A) dz reaches about π `count` (Weyl's law): a first guess above
    /// the level of that number. A is taken at the lowest C.
    pub fn weyl_estimate(&self, count: f64) -> f64 {
        let low = self.floor();
        let nodes = self
            .mesh
            .elements
            .iter()
            .enumerate()
            .flat_map(|(index, element)| {
                let weights = self.mesh.reference.weights.iter();
                weights.zip(self.at(index)).map(|(w, c)| {
                    let phase = 0.5 * element.length * w / (c.a(low).sqrt() * std::f64::consts::PI);
                    (phase, c.constant)
                })
            });
        let nodes: Vec<(f64, f64)> = nodes.collect();
        let phase = |lambda: f64| {
            nodes
                .iter()
                .map(|(w, c)| w * (lambda - c).max(0.0).sqrt())
                .sum::<f64>()
        };
        let span = nodes.iter().map(|(_, c)| c - low).fold(1e-6, f64::max);
        let (mut low, mut high) = (low, low + span);
        for _ in 0..200 {
            if phase(high) >= count {
                break;
            }
            (low, high) = (high, high + 2.0 * (high - low));
        }
        for _ in 0..10 {
            let middle = 0.5 * (low + high);
            if phase(middle) < count {
                low = middle;
            } else {
                high = middle;
            }
        }
        high
    }

    /// The smallest C: no level lies below it while A is positive.
    pub fn floor(&self) -> f64 {
        self.coefficients
            .iter()
            .map(|c| c.constant)
            .fold(f64::INFINITY, f64::min)
    }
}

/// The sum of the stiffness terms of all nodes, each with its A.
fn combine<const ENTRIES: usize>(softness: &[f64], terms: &[Vec<f64>], local: &mut [f64]) {
    let mut sum = [0.0; ENTRIES];
    for (a, term) in softness.iter().zip(terms) {
        for (l, s) in sum.iter_mut().zip(&term[..ENTRIES]) {
            *l += a * s;
        }
    }
    local.copy_from_slice(&sum);
}

fn combine_any(softness: &[f64], terms: &[Vec<f64>], local: &mut [f64]) {
    local.fill(0.0);
    for (a, term) in softness.iter().zip(terms) {
        for (l, s) in local.iter_mut().zip(term) {
            *l += a * s;
        }
    }
}

fn quadrature_weights(mesh: &Mesh) -> Vec<f64> {
    let p = mesh.order();
    let mut weights = vec![0.0; mesh.node_count()];
    for (index, element) in mesh.elements.iter().enumerate() {
        for (q, w) in mesh.reference.weights.iter().enumerate() {
            weights[index * p + q] += 0.5 * element.length * w;
        }
    }
    weights
}

/// The scalar product of two vectors.
#[inline]
pub fn dot(x: &[f64], y: &[f64]) -> f64 {
    x.iter().zip(y).map(|(a, b)| a * b).sum()
}
