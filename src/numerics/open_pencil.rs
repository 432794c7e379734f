//! The eigenproblem of [`super::pencil`] on a line that lets waves out, as a complex symmetric banded matrix T(λ).
//!
//! Waves leave in one of two ways. At a flat end ψ′ = ±i k ψ with k = √((λ − C)/A) holds exactly (Siegert, Phys. Rev.
//! 56, 750 (1939)); in the weak form it adds −i √(A (λ − C)) to the end node's diagonal. On a stretched element the path
//! has left the real line, dz/ds = e^{iθ}: there an outgoing wave decays (exterior complex scaling: Simon, Phys. Lett.
//! A 71, 211 (1979); with element edges where the path turns: McCurdy & Martín, J. Phys. B 37, 917 (2004)).
//!
//! The bilinear form x · N(λ, λ) x, without conjugation, is the norm of an outgoing state; at a flat end the derivative
//! of the end's term is the part of the norm outside (Zel'dovich, Sov. Phys. JETP 12, 542 (1961)).

use super::complex_banded::{C64, ComplexBanded, ComplexFactored, I, ONE, ZERO};
use super::mesh::{Element, Mesh};
use super::pencil::{Coefficient, Pole};
use super::quadrature::MAX_ORDER;

/// The coefficients at one place, raised by an energy that is complex off the real line.
#[derive(Clone, Copy, Debug)]
pub struct Raised {
    pub own: Coefficient,
    pub raise: C64,
}

impl Raised {
    /// A(λ).
    pub fn a(&self, lambda: C64) -> C64 {
        let mut a = C64::from(self.own.stiffness);
        for pole in self.own.poles.iter().flatten() {
            a += pole.strength / distance(pole, lambda - self.raise).0;
        }
        a
    }

    /// −(A(λ) − A(μ))/(λ − μ), or −dA/dλ where both are one.
    pub fn divided(&self, lambda: C64, mu: C64) -> C64 {
        let mut sum = ZERO;
        for pole in self.own.poles.iter().flatten() {
            let (x, x_inside) = distance(pole, lambda - self.raise);
            let (y, y_inside) = distance(pole, mu - self.raise);
            sum += match (x_inside, y_inside) {
                (true, true) => pole.strength / (x * y),
                (false, false) => ZERO,
                _ => pole.strength / (x * y) * (x - y) / (lambda - mu),
            };
        }
        sum
    }

    /// C.
    pub fn constant(&self) -> C64 {
        self.raise + self.own.constant
    }
}

/// The distance to a pole within the range of its real part, and whether it is inside.
fn distance(pole: &Pole, lambda: C64) -> (C64, bool) {
    let distance = lambda - pole.position;
    if distance.re < pole.nearest {
        (C64::from(pole.nearest), false)
    } else if distance.re > pole.farthest {
        (C64::from(pole.farthest), false)
    } else {
        (distance, true)
    }
}

/// What is at one end of the line.
#[derive(Clone, Copy, Debug)]
pub enum End {
    /// ψ = 0.
    Wall,
    /// The same coefficients go on for ever: waves leave, or die out below the edge.
    Flat(Coefficient),
}

/// A k of a flat end with its derivative by λ. The branch is that of a wave leaving or dying out, also for λ slightly
/// below the real axis; the cut runs from the edge straight down.
pub fn conductance(lead: &Coefficient, lambda: C64) -> (C64, C64) {
    let flat = Raised {
        own: *lead,
        raise: ZERO,
    };
    let a = flat.a(lambda);
    let above = lambda - lead.constant;
    let square = a * above;
    let root = if above.re > 0.0 {
        square.sqrt()
    } else {
        I * (-square).sqrt()
    };
    let slope = (a - flat.divided(lambda, lambda) * above) / (2.0 * root);
    (root, slope)
}

/// ∫ (|ψ|² + …) from a flat end outwards over |ψ|² at the end: where the wave dies out.
fn tail_nm(lead: &Coefficient, lambda: C64) -> Option<f64> {
    let flat = Raised {
        own: *lead,
        raise: ZERO,
    };
    let k = conductance(lead, lambda).0 / flat.a(lambda);
    let components = 1.0 + flat.divided(lambda, lambda.conj()).re * k.norm_sqr();
    (k.im > 0.0).then(|| components / (2.0 * k.im))
}

/// The discretised problem.
#[derive(Clone, Debug)]
pub struct OpenPencil {
    pub mesh: Mesh,
    /// Coefficients at the nodes of each element, element by element: (order + 1) per element.
    pub nodes: Vec<Raised>,
    /// dz/ds of each element: 1 on the real line.
    pub stretches: Vec<C64>,
    pub ends: [End; 2],
    /// T(0) without the ends of a problem without poles.
    linear: Option<ComplexBanded>,
    mass: Vec<C64>,
}

impl OpenPencil {
    /// Evaluates the coefficients with `at(mesh, element, local node)`.
    pub fn new(
        mesh: Mesh,
        stretches: Vec<C64>,
        ends: [End; 2],
        mut at: impl FnMut(&Mesh, &Element, usize) -> Raised,
    ) -> OpenPencil {
        let p = mesh.order();
        let mut nodes = Vec::with_capacity(mesh.elements.len() * (p + 1));
        for element in &mesh.elements {
            for q in 0..=p {
                nodes.push(at(&mesh, element, q));
            }
        }
        let mut mass = vec![ZERO; mesh.node_count()];
        for (index, (element, stretch)) in mesh.elements.iter().zip(&stretches).enumerate() {
            for (q, w) in mesh.reference.weights.iter().enumerate() {
                mass[index * p + q] += stretch * (0.5 * element.length * w);
            }
        }
        let with_poles = nodes.iter().any(|node| node.own.has_poles());
        let mut pencil = OpenPencil {
            mesh,
            nodes,
            stretches,
            ends,
            linear: None,
            mass,
        };
        if !with_poles {
            pencil.linear = Some(pencil.assembled(ZERO));
        }
        pencil
    }

    /// Number of nodes, both ends included; at a wall the vector is zero.
    pub fn size(&self) -> usize {
        self.mesh.node_count()
    }

    /// Coefficients at the nodes of element number `index`.
    pub fn at(&self, index: usize) -> &[Raised] {
        let count = self.mesh.order() + 1;
        &self.nodes[index * count..(index + 1) * count]
    }

    /// T(λ) without the ends.
    fn assembled(&self, lambda: C64) -> ComplexBanded {
        let reference = self.mesh.reference;
        let p = reference.order;
        let reach = (0..self.size())
            .map(|g| if g % p == 0 { p } else { p - g % p })
            .collect();
        let mut matrix = ComplexBanded::zeros(reach);
        let entries = (p + 1) * (p + 2) / 2;
        let mut local = [ZERO; (MAX_ORDER + 1) * (MAX_ORDER + 2) / 2];
        for (index, element) in self.mesh.elements.iter().enumerate() {
            let scale = 2.0 / (element.length * self.stretches[index]);
            local[..entries].fill(ZERO);
            for (node, term) in self.at(index).iter().zip(&reference.stiffness_terms) {
                let a = scale * node.a(lambda);
                for (sum, value) in local.iter_mut().zip(term) {
                    *sum += a * value;
                }
            }
            let mut start = 0;
            for j in 0..=p {
                let column = matrix.column_mut(index * p + j);
                for (target, value) in column.iter_mut().zip(&local[start..start + p + 1 - j]) {
                    *target += value;
                }
                let weight = self.stretches[index] * (0.5 * element.length * reference.weights[j]);
                column[0] += weight * (self.at(index)[j].constant() - lambda);
                start += p + 1 - j;
            }
        }
        matrix
    }

    /// T(λ), factored.
    pub fn factor(&self, lambda: C64) -> ComplexFactored {
        let mut matrix = match &self.linear {
            Some(base) => {
                let mut matrix = base.clone();
                for (k, m) in self.mass.iter().enumerate() {
                    matrix.column_mut(k)[0] -= lambda * m;
                }
                matrix
            }
            None => self.assembled(lambda),
        };
        for (end, node) in self.ends.iter().zip([0, self.size() - 1]) {
            match end {
                End::Wall => matrix.pin(node),
                End::Flat(lead) => {
                    matrix.column_mut(node)[0] -= I * conductance(lead, lambda).0;
                }
            }
        }
        matrix.factor()
    }

    /// ∫ √((C − λ)/A) dz along the line, of the growing branch, and ln A of every row: about what ln det T(λ) changes by
    /// away from its zeros. By Simpson's rule on each element.
    pub fn growth(&self, lambda: C64) -> C64 {
        let p = self.mesh.order();
        let places = [(0, 1.0 / 6.0), (p / 2, 4.0 / 6.0), (p, 1.0 / 6.0)];
        let mut sum = ZERO;
        for (index, element) in self.mesh.elements.iter().enumerate() {
            let nodes = self.at(index);
            let along = self.stretches[index] * element.length;
            for (q, weight) in places {
                let node = &nodes[q];
                let a = node.a(lambda);
                let step = along * ((node.constant() - lambda) / a).sqrt();
                sum += weight * if step.re < 0.0 { -step } else { step };
                if node.own.has_poles() {
                    sum += weight * p as f64 * a.ln();
                }
            }
        }
        sum
    }

    /// N(λ, μ) x inside the line, with every node's contribution multiplied by `factor(element, local node)`.
    pub fn weighted(
        &self,
        lambda: C64,
        mu: C64,
        x: &[C64],
        mut factor: impl FnMut(usize, usize) -> C64,
    ) -> Vec<C64> {
        let reference = self.mesh.reference;
        let p = reference.order;
        let mut out = vec![ZERO; x.len()];
        for (index, element) in self.mesh.elements.iter().enumerate() {
            let half = self.stretches[index] * (0.5 * element.length);
            let local = &x[index * p..=(index + 1) * p];
            let target = &mut out[index * p..=(index + 1) * p];
            for (q, node) in self.at(index).iter().enumerate() {
                let times = factor(index, q);
                target[q] += half * reference.weights[q] * times * local[q];
                if !node.own.has_poles() {
                    continue;
                }
                let row = &reference.derivative[q * (p + 1)..(q + 1) * (p + 1)];
                let slope: C64 = row.iter().zip(local).map(|(d, v)| v * d).sum();
                let along = slope / half * reference.weights[q] * times * node.divided(lambda, mu);
                for (sum, d) in target.iter_mut().zip(row) {
                    *sum += along * d;
                }
            }
        }
        out
    }

    /// −T′(λ) x: the weight of the norm, what lies outside of flat ends included.
    pub fn weight(&self, lambda: C64, x: &[C64]) -> Vec<C64> {
        let mut out = self.weighted(lambda, lambda, x, |_, _| ONE);
        for (end, node) in self.ends.iter().zip([0, x.len() - 1]) {
            match end {
                End::Wall => out[node] = ZERO,
                End::Flat(lead) => {
                    out[node] += I * conductance(lead, lambda).1 * x[node];
                }
            }
        }
        out
    }

    /// Nodal slopes dψ/dz of one element.
    pub fn slopes(&self, index: usize, x: &[C64]) -> Vec<C64> {
        let reference = self.mesh.reference;
        let p = reference.order;
        let half = self.stretches[index] * (0.5 * self.mesh.elements[index].length);
        let local = &x[index * p..=(index + 1) * p];
        let rows = reference.derivative.chunks_exact(p + 1);
        rows.map(|row| {
            let slope: C64 = row.iter().zip(local).map(|(d, v)| v * d).sum();
            slope / half
        })
        .collect()
    }

    /// Im(ψ̄ A ψ′) of what flows out at the lower end of element `from` and at the upper end of element `to − 1`, over
    /// ∫ (|ψ|² + …) between: by the equation itself these are the parts of −Im λ (Siegert 1939), to as many digits as ψ
    /// has at the ends, however small they are. Nothing flows through a flat end in which the state dies out; what it has
    /// there is part of the integral.
    pub fn escape_rates(&self, lambda: C64, x: &[C64], [from, to]: [usize; 2]) -> [f64; 2] {
        let reference = self.mesh.reference;
        let p = reference.order;
        let mut norm = 0.0;
        for index in from..to {
            let half = 0.5 * self.mesh.elements[index].length;
            let slopes = self.slopes(index, x);
            for (q, node) in self.at(index).iter().enumerate() {
                let along = node.divided(lambda, lambda.conj()).re * slopes[q].norm_sqr();
                let density = x[index * p + q].norm_sqr() + along;
                norm += half * reference.weights[q] * density;
            }
        }
        let outflow = |end: &End, border: usize, outside: Option<usize>, up: bool| match end {
            End::Flat(lead) if outside.is_none() => match tail_nm(lead, lambda) {
                Some(_) => 0.0,
                None => x[border].norm_sqr() * conductance(lead, lambda).0.re,
            },
            _ => outside.map_or(0.0, |index| {
                // The flux from the equation of the element outside, tested with the border's own polynomial.
                let slopes = self.slopes(index, x);
                let half = self.stretches[index] * (0.5 * self.mesh.elements[index].length);
                let own = if up { 0 } else { p };
                let mut tested = ZERO;
                for (q, node) in self.at(index).iter().enumerate() {
                    let w = reference.weights[q];
                    let d = reference.derivative[q * (p + 1) + own];
                    tested += w * node.a(lambda) * slopes[q] * d;
                    if q == own {
                        tested += half * w * (node.constant() - lambda) * x[index * p + q];
                    }
                }
                -(x[border].conj() * tested).im
            }),
        };
        let lower = outflow(&self.ends[0], from * p, from.checked_sub(1), false);
        let above = (to < self.mesh.elements.len()).then_some(to);
        let upper = outflow(&self.ends[1], to * p, above, true);
        let beyond = [from.checked_sub(1), above];
        for ((end, outside), border) in self.ends.iter().zip(beyond).zip([from * p, to * p]) {
            if let (End::Flat(lead), None) = (end, outside) {
                norm += x[border].norm_sqr() * tail_nm(lead, lambda).unwrap_or(0.0);
            }
        }
        [lower / norm, upper / norm]
    }
}

/// The bilinear product, without conjugation.
pub fn product(x: &[C64], y: &[C64]) -> C64 {
    x.iter().zip(y).map(|(a, b)| a * b).sum()
}
