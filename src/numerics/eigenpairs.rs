//! The lowest eigenpairs of a [`Pencil`]: bracketed by inertia counts, then refined by inverse iteration with the
//! Rayleigh quotient (Parlett 1980, ch. 4) inside the bracket. No level is missed and none is found twice.

use super::banded::{Banded, Factored};
use super::pencil::{Pencil, dot};
use nalgebra::{DMatrix, SymmetricEigen};

/// An eigenvalue with its nodal vector (both end nodes included, zero there), normalised so that x · N x = 1 and of
/// positive sign in its first lobe.
#[derive(Clone, Debug)]
pub struct Eigenpair {
    pub value: f64,
    pub vector: Vec<f64>,
}

/// Levels closer than this part of the searched range are taken as one cluster and separated together.
const CLUSTER: f64 = 1e-9;
/// A vector has converged when the other levels' part in it has shrunk to this.
const CONVERGED: f64 = 1e-12;
/// A ratio of convergence above this calls for a new shift.
const SLOW: f64 = 0.03;
/// With poles the shift must come this near, as a part of the searched range: the value is then exact to the square of
/// it, and the vector after its last step.
const NEAR: f64 = 1e-7;
/// Vectors of levels closer than this part of the searched range are made orthogonal to each other explicitly.
const NEIGHBOURS: f64 = 1e-3;

/// The `count` lowest eigenpairs in ascending order; fewer only when the mesh has fewer unknowns.
pub fn lowest(pencil: &Pencil, count: usize) -> Vec<Eigenpair> {
    let count = count.min(pencil.size());
    if count == 0 {
        return Vec::new();
    }
    let mut search = Search::new(pencil, count);
    let mut pairs: Vec<Eigenpair> = Vec::with_capacity(count);
    while pairs.len() < count {
        let found = search.next_pairs(pairs.len() + 1);
        pairs.extend(found);
    }
    pairs.truncate(count);
    orthonormalise(pencil, &mut pairs, NEIGHBOURS * search.range);
    for pair in &mut pairs {
        fix_sign(&mut pair.vector);
    }
    pairs
}

/// All eigenpairs from `low` up to `high`, in ascending order.
pub fn between(pencil: &Pencil, low: f64, high: f64) -> Vec<Eigenpair> {
    let floor = pencil.floor();
    let mut search = Search {
        pencil,
        known: vec![(floor, 0)],
        range: (high - floor).max(f64::MIN_POSITIVE),
        spare: None,
    };
    let mut below = 0;
    let mut all = 0;
    for (lambda, count) in [(low, &mut below), (high, &mut all)] {
        if lambda > floor {
            let factored = search.factor(lambda);
            *count = search.note(lambda, factored);
        }
    }
    let mut pairs: Vec<Eigenpair> = Vec::new();
    while below + pairs.len() < all {
        let found = search.next_pairs(below + pairs.len() + 1);
        pairs.extend(found);
    }
    pairs.truncate(all - below);
    orthonormalise(pencil, &mut pairs, NEIGHBOURS * search.range);
    for pair in &mut pairs {
        fix_sign(&mut pair.vector);
    }
    pairs
}

/// Number of levels below λ.
pub fn count_below(pencil: &Pencil, lambda: f64) -> usize {
    let mut matrix = pencil.storage();
    pencil.assemble(lambda, &mut matrix);
    matrix.factor().negative()
}

/// How much each eigenvalue changes on a finer mesh: the Rayleigh quotient of the transferred vector, minimised along
/// one step of inverse iteration. The step's matrix is the finer T at the floor of C. What a finer mesh adds to a vector
/// varies fast, so its energies lie far above the levels and one matrix serves for all of them.
pub fn improvements(pencil: &Pencil, pairs: &[Eigenpair], finer: &Pencil) -> Vec<f64> {
    let floor = finer.floor();
    let mut stiff = finer.storage();
    finer.assemble(floor, &mut stiff);
    let stiff = stiff.factor();
    let vectors: Vec<&[f64]> = pairs.iter().map(|pair| &pair.vector[..]).collect();
    let vectors = pencil.mesh.transfer(&vectors, &finer.mesh);
    let improved = pairs.iter().zip(vectors).map(|(pair, vector)| {
        let residual = finer.times(pair.value, &vector);
        let mut step = residual.clone();
        let inner = 1..vector.len() - 1;
        stiff.solve(&mut step[inner]);
        // x − c s has the form r·x − 2c r·s + c² s·T s; and T s = r − (λ − floor) s, but for what A changes in between.
        let gain = dot(&step, &residual);
        let masses = step.iter().zip(finer.weights());
        let weighted: f64 = masses.map(|(s, m)| m * s * s).sum();
        let curvature = (gain - (pair.value - floor) * weighted).max(0.1 * gain);
        let norm = finer.inner(pair.value, &vector, pair.value, &vector);
        (dot(&vector, &residual) - gain * gain / curvature) / norm
    });
    improved.collect()
}

struct Search<'p> {
    pencil: &'p Pencil,
    /// Places where the count is known, ascending.
    known: Vec<(f64, usize)>,
    range: f64,
    spare: Option<Banded>,
}

impl<'p> Search<'p> {
    fn new(pencil: &'p Pencil, count: usize) -> Search<'p> {
        let low = pencil.floor();
        let mut search = Search {
            pencil,
            known: vec![(low, 0)],
            range: 0.0,
            spare: None,
        };
        let mut high = pencil.weyl_estimate(count as f64 + 0.25);
        loop {
            search.range = high - low;
            let below = search.factor(high);
            let negative = below.negative();
            search.spare = Some(below.into_storage());
            if negative >= count || search.range > 1e12 {
                search.known.push((high, negative.max(count)));
                return search;
            }
            search.known.push((high, negative));
            high = low + 1.3 * (high - low);
        }
    }

    fn factor(&mut self, lambda: f64) -> Factored {
        let mut matrix = self.spare.take().unwrap_or_else(|| self.pencil.storage());
        self.pencil.assemble(lambda, &mut matrix);
        matrix.factor()
    }

    /// Notes the count at λ and gives the storage back.
    fn note(&mut self, lambda: f64, factored: Factored) -> usize {
        let negative = factored.negative();
        let at = self.known.partition_point(|(known, _)| *known < lambda);
        self.known.insert(at, (lambda, negative));
        self.spare = Some(factored.into_storage());
        negative
    }

    /// The tightest known bracket of level number k (from 1): counts (low, high) with low < k <= high.
    fn bracket(&self, k: usize) -> ((f64, usize), (f64, usize)) {
        let at = self.known.partition_point(|(_, negative)| *negative < k);
        (self.known[at - 1], self.known[at])
    }

    /// Level number k and, when it sits in a cluster, the rest of the cluster.
    fn next_pairs(&mut self, k: usize) -> Vec<Eigenpair> {
        loop {
            let ((low, below), (high, above)) = self.bracket(k);
            let middle = 0.5 * (low + high);
            let narrow = high - low < CLUSTER * self.range || middle <= low || middle >= high;
            if narrow && (above > below + 1 || below + 1 < k) {
                return self.cluster(middle, above - below).split_off(k - 1 - below);
            }
            let isolated = below + 1 == k && above == k;
            let factored = self.factor(middle);
            if isolated && let Some(pair) = self.refine(middle, &factored, low, high) {
                self.spare = Some(factored.into_storage());
                // Nothing else lies in the bracket: the next level's begins here.
                let at = self.known.partition_point(|(_, negative)| *negative < k);
                self.known.insert(at, (pair.value.next_up(), k));
                return vec![pair];
            }
            if narrow {
                return self.cluster(middle, 1);
            }
            self.note(middle, factored);
        }
    }

    /// Inverse iteration with the Rayleigh quotient as shift; the level must be alone in its bracket, and stay there.
    ///
    /// Every other level lies outside the bracket, so a solve shrinks what is left of them in the vector at least by the
    /// ratio of the quotient to the distance of the bracket's ends (N is never less than M). While that ratio is small
    /// more solves with the same factors are cheaper than new factors.
    fn refine(
        &mut self,
        start: f64,
        factored: &Factored,
        low: f64,
        high: f64,
    ) -> Option<Eigenpair> {
        let mut iterate = Iterate::new(self.pencil, start_vector(self.pencil, 0));
        iterate.step(factored);
        let (quotient, _) = iterate.step(factored);
        let mut value = start + iterate.change(start, quotient);
        for _ in 0..20 {
            if !(value > low && value < high) {
                return None;
            }
            let shift = value;
            let factored = self.factor(shift);
            let mut rest = 1.0_f64;
            let mut quotient = 0.0;
            while rest > CONVERGED {
                let moved;
                (quotient, moved) = iterate.step(&factored);
                let ratio = quotient.abs() / (shift - low).min(high - shift);
                if !(0.0..SLOW).contains(&ratio) {
                    rest = 1.0;
                    break;
                }
                // What a step leaves is this part of what there was, and of what it took away.
                rest = (rest * ratio).min(moved * ratio / (1.0 - ratio));
            }
            value = shift + iterate.change(shift, quotient);
            let settled = self.pencil.is_linear() || (value - shift).abs() < NEAR * self.range;
            let done = rest <= CONVERGED && settled;
            if done && !self.pencil.is_linear() {
                iterate.last_step(&factored, shift, value);
            }
            self.spare = Some(factored.into_storage());
            if done {
                let vector = iterate.vector;
                return (value >= low && value <= high).then_some(Eigenpair { value, vector });
            }
        }
        None
    }

    /// Block inverse iteration for `count` levels that lie within rounding of each other, with a Rayleigh–Ritz
    /// separation at the end.
    fn cluster(&mut self, middle: f64, count: usize) -> Vec<Eigenpair> {
        let factored = self.factor(middle);
        let mut block: Vec<Vec<f64>> = (0..count)
            .map(|seed| start_vector(self.pencil, seed))
            .collect();
        let mut values = vec![middle; count];
        for _ in 0..4 {
            // Solving raises the cluster over all else; the Ritz step keeps its members apart.
            let right: Vec<Vec<f64>> = block
                .iter()
                .map(|x| self.pencil.weight(middle, middle, x))
                .collect();
            for (x, b) in block.iter_mut().zip(&right) {
                x.clone_from(b);
                let inner = x.len() - 1;
                factored.solve(&mut x[1..inner]);
            }
            let weighted: Vec<Vec<f64>> = block
                .iter()
                .map(|x| self.pencil.weight(middle, middle, x))
                .collect();
            let gram = DMatrix::from_fn(count, count, |i, j| dot(&block[i], &weighted[j]));
            let form = DMatrix::from_fn(count, count, |i, j| {
                0.5 * (dot(&block[i], &right[j]) + dot(&block[j], &right[i]))
            });
            let gram = SymmetricEigen::new(gram);
            let roots = gram
                .eigenvalues
                .map(|e| 1.0 / e.max(f64::MIN_POSITIVE).sqrt());
            let whiten = &gram.eigenvectors * DMatrix::from_diagonal(&roots);
            let ritz = SymmetricEigen::new(whiten.transpose() * form * &whiten);
            let mut order: Vec<usize> = (0..count).collect();
            order.sort_by(|&a, &b| ritz.eigenvalues[a].total_cmp(&ritz.eigenvalues[b]));
            let mix = whiten * &ritz.eigenvectors;
            block = order
                .iter()
                .map(|&c| {
                    let mut x = vec![0.0; block[0].len()];
                    for (member, vector) in block.iter().enumerate() {
                        for (sum, v) in x.iter_mut().zip(vector) {
                            *sum += mix[(member, c)] * v;
                        }
                    }
                    x
                })
                .collect();
            values = order
                .iter()
                .map(|&c| middle + ritz.eigenvalues[c])
                .collect();
        }
        self.spare = Some(factored.into_storage());
        values
            .into_iter()
            .zip(block)
            .map(|(value, vector)| Eigenpair { value, vector })
            .collect()
    }
}

/// A vector under inverse iteration with the mass matrix M, at a shift that is the caller's.
///
/// With poles the levels near a shift σ are those of T(σ) x = μ N x to first order in μ. Iterating with M, which is
/// diagonal, leads to the same vector as the shift closes in on the level; only the value needs N.
struct Iterate<'p> {
    pencil: &'p Pencil,
    vector: Vec<f64>,
    /// M x.
    weighted: Vec<f64>,
}

impl<'p> Iterate<'p> {
    fn new(pencil: &'p Pencil, vector: Vec<f64>) -> Self {
        let weighted = pencil.weights().iter().zip(&vector).map(|(m, v)| m * v);
        Self {
            pencil,
            weighted: weighted.collect(),
            vector,
        }
    }

    /// x ← T⁻¹ M x, normalised under M. Returns the Rayleigh quotient of T under M, and how far the vector has moved.
    fn step(&mut self, factored: &Factored) -> (f64, f64) {
        let inner = 1..self.vector.len() - 1;
        self.vector.copy_from_slice(&self.weighted);
        let x = &mut self.vector[inner.clone()];
        factored.solve(x);
        let masses = &self.pencil.weights()[inner.clone()];
        let weighted = &mut self.weighted[inner];
        let (mut shifted, mut norm) = (0.0, 0.0);
        for ((v, w), m) in x.iter().zip(weighted.iter_mut()).zip(masses) {
            shifted += v * *w;
            *w = m * v;
            norm += *w * v;
        }
        let scale = 1.0 / norm.sqrt();
        for (v, w) in x.iter_mut().zip(weighted) {
            *v *= scale;
            *w *= scale;
        }
        // |x − x₀|² = 2 − 2 x·x₀, which rounding keeps from telling small moves apart.
        let apart = (1.0 - shifted.abs() * scale).max(f64::EPSILON);
        (shifted / norm, (2.0 * apart).sqrt())
    }

    /// x ← T(σ)⁻¹ N(σ, λ) x, which leaves the eigenvector of λ as it is: T(λ) x = 0 means T(σ) x = (λ − σ) N x.
    fn last_step(&mut self, factored: &Factored, shift: f64, value: f64) {
        self.vector = self.pencil.weight(shift, value, &self.vector);
        let inner = 1..self.vector.len() - 1;
        factored.solve(&mut self.vector[inner]);
    }

    /// The change of the level that a quotient under M at this shift stands for: Newton's step, x · T x / x · N x.
    fn change(&self, shift: f64, quotient: f64) -> f64 {
        if self.pencil.is_linear() {
            quotient
        } else {
            quotient / self.pencil.inner(shift, &self.vector, shift, &self.vector)
        }
    }
}

/// A vector without symmetry, so that it has a part of every eigenvector.
fn start_vector(pencil: &Pencil, seed: usize) -> Vec<f64> {
    let count = pencil.mesh.node_count();
    // Multiples of the golden ratio, modulo one, are spread evenly and never repeat.
    let mut x: Vec<f64> = (0..count)
        .map(|k| 0.5 + ((k * (seed + 1)) as f64 * 0.618_033_988_749_895).fract())
        .collect();
    x[0] = 0.0;
    x[count - 1] = 0.0;
    x
}

/// Makes neighbouring vectors orthonormal under N(λ_i, λ_j): rounding mixes close levels by its ratio to their gap.
fn orthonormalise(pencil: &Pencil, pairs: &mut [Eigenpair], near: f64) {
    for i in 0..pairs.len() {
        let (done, rest) = pairs.split_at_mut(i);
        let pair = &mut rest[0];
        for other in done
            .iter()
            .rev()
            .take_while(|other| pair.value - other.value < near)
        {
            let overlap = pencil.inner(other.value, &other.vector, pair.value, &pair.vector);
            for (v, o) in pair.vector.iter_mut().zip(&other.vector) {
                *v -= overlap * o;
            }
        }
        let scale = 1.0
            / pencil
                .inner(pair.value, &pair.vector, pair.value, &pair.vector)
                .sqrt();
        pair.vector.iter_mut().for_each(|v| *v *= scale);
    }
}

fn fix_sign(x: &mut [f64]) {
    let peak = x.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
    if x.iter()
        .find(|v| v.abs() > 0.05 * peak)
        .is_some_and(|v| *v < 0.0)
    {
        x.iter_mut().for_each(|v| *v = -*v);
    }
}

#[cfg(test)]
mod tests {
    use super::super::mesh::Mesh;
    use super::super::pencil::{Coefficient, Pole};
    use super::*;

    fn uniform(stiffness: f64, constant: f64) -> Coefficient {
        Coefficient {
            stiffness,
            poles: [None; 2],
            constant,
        }
    }

    #[test]
    fn a_string_with_fixed_ends_has_the_squares() {
        let pencil = Pencil::new(Mesh::new(&[1.0], &[4], 10), |_, _, _| uniform(1.0, 0.0));
        for (k, pair) in lowest(&pencil, 6).iter().enumerate() {
            let exact = (std::f64::consts::PI * (k + 1) as f64).powi(2);
            assert!(
                (pair.value / exact - 1.0).abs() < 1e-9,
                "level {k}: {} for {exact}",
                pair.value
            );
        }
    }

    /// Two equal wells far apart: levels come in pairs that no arithmetic can separate.
    #[test]
    fn pairs_within_rounding_are_both_found_and_orthonormal() {
        let lengths = [3.0, 1.0, 12.0, 1.0, 3.0];
        let pencil = Pencil::new(Mesh::new(&lengths, &[3, 1, 9, 1, 3], 10), |_, e, _| {
            uniform(1.0, if e.segment % 2 == 0 { 80.0 } else { 0.0 })
        });
        let pairs = lowest(&pencil, 4);
        assert!(
            (pairs[0].value - pairs[1].value).abs() < 1e-8
                && (pairs[2].value - pairs[3].value).abs() < 1e-8
        );
        assert!(pairs[2].value - pairs[1].value > 1.0);
        for i in 0..4 {
            for j in 0..4 {
                let inner = pencil.inner(
                    pairs[i].value,
                    &pairs[i].vector,
                    pairs[j].value,
                    &pairs[j].vector,
                );
                assert!((inner - f64::from(i == j)).abs() < 1e-8, "{i} {j}: {inner}");
            }
        }
    }

    /// A pole is one more component: the levels equal those of the enlarged dense problem, solved by nalgebra.
    #[test]
    fn levels_with_a_pole_are_those_of_the_enlarged_linear_problem() {
        let (p, elements) = (6, 3);
        let mesh = Mesh::new(&[1.0, 0.7, 1.2], &[1, 1, 1], p);
        let coefficient = |segment: usize| Coefficient {
            stiffness: 0.2,
            poles: [
                Some(Pole {
                    strength: 2.0 + segment as f64,
                    position: -3.0 - 0.5 * segment as f64,
                    nearest: 0.1,
                    farthest: f64::INFINITY,
                }),
                None,
            ],
            constant: [1.0, 0.0, 2.0][segment],
        };
        let pencil = Pencil::new(mesh.clone(), |_, e, _| coefficient(e.segment));
        let nodes = mesh.node_count() - 2;
        let size = nodes + elements * (p + 1);
        let mass = pencil.weights();
        let mut matrix = DMatrix::zeros(size, size);
        for (index, element) in mesh.elements.iter().enumerate() {
            let c = coefficient(element.segment);
            let pole = c.poles[0].unwrap();
            for q in 0..=p {
                let w = 0.5 * element.length * mesh.reference.weights[q];
                let g = index * p + q;
                if g > 0 && g <= nodes {
                    matrix[(g - 1, g - 1)] += w * c.constant / mass[g];
                }
                let extra = nodes + index * (p + 1) + q;
                matrix[(extra, extra)] = pole.position;
                for i in 0..=p {
                    let gi = index * p + i;
                    if gi == 0 || gi > nodes {
                        continue;
                    }
                    let slope_i = mesh.reference.derivative[q * (p + 1) + i] * 2.0 / element.length;
                    let coupling = slope_i * (w * pole.strength).sqrt() / mass[gi].sqrt();
                    matrix[(gi - 1, extra)] += coupling;
                    matrix[(extra, gi - 1)] += coupling;
                    for j in 0..=p {
                        let gj = index * p + j;
                        if gj > 0 && gj <= nodes {
                            let slope_j =
                                mesh.reference.derivative[q * (p + 1) + j] * 2.0 / element.length;
                            matrix[(gi - 1, gj - 1)] +=
                                w * c.stiffness * slope_i * slope_j / (mass[gi] * mass[gj]).sqrt();
                        }
                    }
                }
            }
        }
        let mut exact: Vec<f64> = SymmetricEigen::new(matrix)
            .eigenvalues
            .iter()
            .copied()
            .filter(|e| *e > -1.0)
            .collect();
        exact.sort_by(f64::total_cmp);
        for (pair, exact) in lowest(&pencil, 5).iter().zip(exact) {
            assert!(
                (pair.value - exact).abs() < 1e-10,
                "{} for {exact}",
                pair.value
            );
        }
    }
}
