//! Eigenpairs of a [`MatrixPencil`] in the middle of its spectrum, by their number: Lanczos iteration with the inverse of
//! T − σ (Ericsson & Ruhe, Math. Comp. 35, 1251 (1980)), orthogonalised in full, and proved complete by inertia counts.
//!
//! A single starting vector shows one member of a multiple level only. The count tells that others are missing; they are
//! sought from new starts orthogonal to all that was found, so levels that coincide are all found.

use super::banded::{Banded, Factored};
use super::matrix_pencil::MatrixPencil;
use nalgebra::{DMatrix, SymmetricEigen};
use std::ops::Range;

/// A level with its vector of unknowns, scaled so that its squares add up to one.
#[derive(Clone, Debug)]
pub struct NearPair {
    pub value: f64,
    pub vector: Vec<f64>,
}

/// A vector is accepted when its residual, relative to its eigenvalue of the inverse, is below this.
const RESIDUAL: f64 = 1e-11;
/// Directions are exhausted when what is left of a new one is below this.
const EXHAUSTED: f64 = 1e-13;
/// Bisections that look for a shift amid the wanted levels; more are made only while the shift is outside of them.
const BISECTIONS: usize = 60;
/// Starts after which one that shows nothing new ends the search.
const MAX_FRUITLESS: usize = 8;
/// Steps of a run of iterations, and between two looks at what has converged.
const MAX_STEPS: usize = 160;
const LOOK_EVERY: usize = 6;

/// The levels with the numbers `wanted` (0 is the lowest of all) in ascending order; fewer only when the matrix is
/// smaller. `guess` and `scale` are where the levels may lie and how far from there: they change the time, not the result.
pub fn numbered(
    pencil: &MatrixPencil,
    wanted: Range<usize>,
    guess: f64,
    scale: f64,
) -> Vec<NearPair> {
    let wanted = wanted.start..wanted.end.min(pencil.size());
    if wanted.is_empty() {
        return Vec::new();
    }
    let mut search = Search {
        pencil,
        spare: None,
    };
    let (shift, factored) = search.shift(&wanted, guess, scale);
    let below = factored.negative();
    let mut found: Vec<NearPair> = Vec::new();
    let mut seed = 0;
    let mut sides = [
        below - wanted.start.min(below),
        wanted.end - below.min(wanted.end),
    ];
    loop {
        let before = found.len();
        found.extend(iterate(
            &factored,
            shift,
            &found,
            Sought::Sides(sides),
            seed,
        ));
        found.sort_by(|a, b| a.value.total_cmp(&b.value));
        seed += 1;
        match search.missing(&found, shift, below, &wanted) {
            Ok(first) => {
                found.drain(..first);
                found.truncate(wanted.len());
                return found;
            }
            // No new vector means that the space is exhausted, which the count cannot contradict but for rounding.
            Err(_) if found.len() == before && seed > MAX_FRUITLESS => {
                found.truncate(wanted.len());
                return found;
            }
            Err(missing) => sides = missing,
        }
    }
}

/// The `count` levels nearest to a shift, on both sides of it, in ascending order; fewer only when the matrix is smaller.
pub fn around(pencil: &MatrixPencil, shift: f64, count: usize) -> Vec<NearPair> {
    let count = count.min(pencil.size());
    let mut search = Search {
        pencil,
        spare: None,
    };
    let factored = search.factor(shift);
    let mut found: Vec<NearPair> = Vec::new();
    let mut lacking = count;
    for seed in 0.. {
        let before = found.len();
        found.extend(iterate(
            &factored,
            shift,
            &found,
            Sought::Nearest(lacking),
            seed,
        ));
        found.sort_by(|a, b| (a.value - shift).abs().total_cmp(&(b.value - shift).abs()));
        lacking = count.saturating_sub(found.len());
        if lacking == 0 && count > 0 {
            // As many levels as lie within the distance of the outermost must have been found within it.
            let reach = (found[count - 1].value - shift).abs();
            let reach = reach + margin(shift + reach, shift);
            let within = found.partition_point(|pair| (pair.value - shift).abs() < reach);
            let all = search.count(shift + reach) - search.count(shift - reach);
            lacking = all.saturating_sub(within);
        }
        if lacking == 0 || (found.len() == before && seed > MAX_FRUITLESS) {
            break;
        }
    }
    found.truncate(count);
    found.sort_by(|a, b| a.value.total_cmp(&b.value));
    found
}

/// How far each level moves on a finer mesh: the vectors are transferred, improved by one inverse iteration, and
/// separated in the space they span.
pub fn improvements(pencil: &MatrixPencil, pairs: &[NearPair], finer: &MatrixPencil) -> Vec<f64> {
    let (Some(first), Some(last)) = (pairs.first(), pairs.last()) else {
        return Vec::new();
    };
    let shift = 0.5 * (first.value + last.value);
    let factored = finer.factor(shift, None);
    let mut basis: Vec<Vec<f64>> = Vec::with_capacity(pairs.len());
    for pair in pairs {
        let mut x = pencil.transfer(&pair.vector, finer);
        factored.solve(&mut x);
        orthogonalise(&mut x, &[&basis]);
        basis.push(x);
    }
    let count = basis.len();
    let images: Vec<Vec<f64>> = basis.iter().map(|x| finer.matrix().times(x)).collect();
    let form = DMatrix::from_fn(count, count, |i, j| {
        0.5 * (dot(&basis[i], &images[j]) + dot(&basis[j], &images[i]))
    });
    let mut values: Vec<f64> = SymmetricEigen::new(form)
        .eigenvalues
        .iter()
        .copied()
        .collect();
    values.sort_by(f64::total_cmp);
    let moves = values
        .iter()
        .zip(pairs)
        .map(|(finer, pair)| finer - pair.value);
    moves.collect()
}

/// What a run of iterations is to find.
#[derive(Clone, Copy)]
enum Sought {
    /// So many levels below and above the shift.
    Sides([usize; 2]),
    /// So many levels on either side.
    Nearest(usize),
}

struct Search<'p> {
    pencil: &'p MatrixPencil,
    spare: Option<Banded>,
}

impl Search<'_> {
    fn factor(&mut self, lambda: f64) -> Factored {
        self.pencil.factor(lambda, self.spare.take())
    }

    fn count(&mut self, lambda: f64) -> usize {
        let factored = self.factor(lambda);
        let count = factored.negative();
        self.spare = Some(factored.into_storage());
        count
    }

    /// A shift with some of the wanted levels on both sides of it, or, for a single level or a cluster, next to it.
    fn shift(&mut self, wanted: &Range<usize>, guess: f64, scale: f64) -> (f64, Factored) {
        let (mut low, mut high) = (None, None);
        let (mut lambda, mut step) = (guess, scale);
        for round in 0.. {
            let factored = self.factor(lambda);
            let count = factored.negative();
            let bracketed = low.is_some() && high.is_some();
            if (count > wanted.start && count < wanted.end) || (bracketed && step < 0.02 * scale) {
                return (lambda, factored);
            }
            if round == BISECTIONS {
                return (lambda, factored);
            }
            self.spare = Some(factored.into_storage());
            if count <= wanted.start {
                low = Some(lambda);
            } else {
                high = Some(lambda);
            }
            lambda = match (low, high) {
                (Some(low), Some(high)) => {
                    step = 0.5 * (high - low);
                    low + step
                }
                (Some(low), None) => {
                    step *= 2.0;
                    low + step
                }
                (None, Some(high)) => {
                    step *= 2.0;
                    high - step
                }
                (None, None) => guess,
            };
        }
        unreachable!("the loop returns at its last round")
    }

    /// Whether `found` holds all wanted levels without a gap. If so, the place of the first of them; otherwise how many
    /// below and above the shift are still to be sought.
    fn missing(
        &mut self,
        found: &[NearPair],
        shift: f64,
        below: usize,
        wanted: &Range<usize>,
    ) -> Result<usize, [usize; 2]> {
        let under = found.partition_point(|pair| pair.value < shift);
        let needed = [
            below - wanted.start.min(below),
            wanted.end - below.min(wanted.end),
        ];
        // Levels on the far side of the shift from all that is wanted do not matter.
        let mut lacking = [0; 2];
        if needed[0] > under {
            lacking[0] = needed[0] - under;
        } else if needed[0] > 0 {
            let outermost = found[under - needed[0]].value;
            let outside = self.count(outermost - margin(outermost, shift));
            if outside + needed[0] < below {
                // Not all of the levels between were found; those of the same value as the outermost count twice.
                let inside = found[..under]
                    .iter()
                    .filter(|pair| pair.value > outermost - margin(outermost, shift));
                lacking[0] = below - outside - inside.count();
            }
        }
        if needed[1] > found.len() - under {
            lacking[1] = needed[1] - (found.len() - under);
        } else if needed[1] > 0 {
            let outermost = found[under + needed[1] - 1].value;
            let edge = outermost + margin(outermost, shift);
            let up_to = self.count(edge);
            if up_to > below + needed[1] {
                let inside = found[under..].iter().filter(|pair| pair.value < edge);
                lacking[1] = up_to - below - inside.count();
            }
        }
        if lacking == [0, 0] {
            Ok(if needed[0] > 0 {
                under - needed[0]
            } else {
                under + (wanted.start - below)
            })
        } else {
            Err(lacking)
        }
    }
}

/// Levels closer than this are not told apart by the count.
fn margin(value: f64, shift: f64) -> f64 {
    1e-10 * (value - shift).abs() + 1e-11
}

/// Lanczos iteration from a start orthogonal to `known` until what is sought has converged, at least one level on each
/// side that is there.
fn iterate(
    factored: &Factored,
    shift: f64,
    known: &[NearPair],
    sought: Sought,
    seed: usize,
) -> Vec<NearPair> {
    let size = factored.size();
    let room = size - known.len();
    let known: Vec<Vec<f64>> = known.iter().map(|pair| pair.vector.clone()).collect();
    let mut basis: Vec<Vec<f64>> = Vec::new();
    let (mut diagonal, mut below): (Vec<f64>, Vec<f64>) = (Vec::new(), Vec::new());
    let mut start = start_vector(size, seed);
    // One solve takes the stiffest part out of the start.
    factored.solve(&mut start);
    if orthogonalise(&mut start, &[&known]) == 0.0 {
        return Vec::new();
    }
    let first_look = 2 * match sought {
        Sought::Sides([under, over]) => under + over,
        Sought::Nearest(count) => count,
    };
    basis.push(start);
    loop {
        let last = basis.len() - 1;
        let mut next = basis[last].clone();
        factored.solve(&mut next);
        diagonal.push(dot(&next, &basis[last]));
        let length = norm(&next);
        // What is left of the last two directions in exact arithmetic goes first, then what rounding leaves of all.
        for direction in &basis[last.saturating_sub(1)..] {
            take_out(&mut next, direction);
        }
        let left = clean(&mut next, &[&known, &basis]);
        let steps = diagonal.len();
        let ended = left <= EXHAUSTED * length || steps >= room || steps >= MAX_STEPS;
        if ended || (steps > first_look && (steps - first_look) % LOOK_EVERY == 1) {
            let residual = if left <= EXHAUSTED * length || steps >= room {
                0.0
            } else {
                left
            };
            let (pairs, complete) = ritz(&basis, &diagonal, &below, residual, shift, sought);
            if ended || complete {
                return pairs;
            }
        }
        below.push(left);
        basis.push(next);
    }
}

/// The converged pairs of the projected matrix among those that are sought, none between left out, and whether these are
/// all.
fn ritz(
    basis: &[Vec<f64>],
    diagonal: &[f64],
    below: &[f64],
    residual: f64,
    shift: f64,
    sought: Sought,
) -> (Vec<NearPair>, bool) {
    let steps = diagonal.len();
    let projected = DMatrix::from_fn(steps, steps, |i, j| match i.abs_diff(j) {
        0 => diagonal[i],
        1 => below[i.min(j)],
        _ => 0.0,
    });
    let eigen = SymmetricEigen::new(projected);
    let inverse = &eigen.eigenvalues;
    // The nearer a level is to the shift, the larger is its eigenvalue of the inverse.
    let mut order: Vec<usize> = (0..steps).collect();
    order.sort_by(|&a, &b| inverse[b].abs().total_cmp(&inverse[a].abs()));
    let converged = |&k: &usize| {
        residual * eigen.eigenvectors[(steps - 1, k)].abs() <= RESIDUAL * inverse[k].abs()
    };
    let first = |side: Option<bool>, count: usize| -> Vec<usize> {
        let on_side = order.iter().copied();
        let on_side = on_side.filter(|&k| side.is_none_or(|over| (inverse[k] > 0.0) == over));
        on_side.take_while(converged).take(count).collect()
    };
    let (chosen, complete) = match sought {
        Sought::Nearest(count) => {
            let chosen = first(None, count.max(1));
            let complete = chosen.len() >= count.max(1);
            (chosen, complete)
        }
        Sought::Sides([under, over]) => {
            let (below, above) = (first(Some(false), under), first(Some(true), over));
            let complete = below.len() >= under && above.len() >= over;
            ([below, above].concat(), complete)
        }
    };
    let pairs = chosen.into_iter().map(|k| {
        let mut vector = vec![0.0; basis[0].len()];
        for (member, direction) in basis.iter().take(steps).enumerate() {
            let part = eigen.eigenvectors[(member, k)];
            for (sum, v) in vector.iter_mut().zip(direction) {
                *sum += part * v;
            }
        }
        let length = norm(&vector);
        vector.iter_mut().for_each(|v| *v /= length);
        NearPair {
            value: shift + 1.0 / inverse[k],
            vector,
        }
    });
    (pairs.collect(), complete)
}

/// Takes the parts along the orthonormal `sets` out of x, twice for full precision, and normalises it. Returns the length
/// that was left.
fn orthogonalise(x: &mut [f64], sets: &[&[Vec<f64>]]) -> f64 {
    let first = clean(x, sets);
    first * clean(x, sets)
}

/// The same once.
fn clean(x: &mut [f64], sets: &[&[Vec<f64>]]) -> f64 {
    for direction in sets.iter().flat_map(|set| set.iter()) {
        take_out(x, direction);
    }
    let length = norm(x);
    if length > 0.0 {
        x.iter_mut().for_each(|v| *v /= length);
    }
    length
}

/// x without its part along a unit vector; returns that part.
pub(super) fn take_out(x: &mut [f64], unit: &[f64]) -> f64 {
    let part = dot(unit, x);
    for (v, u) in x.iter_mut().zip(unit) {
        *v -= part * u;
    }
    part
}

/// The inner product, in four sums that run side by side.
pub(super) fn dot(x: &[f64], y: &[f64]) -> f64 {
    let (mut sums, mut rest) = ([0.0; 4], 0.0);
    let (x4, y4) = (x.chunks_exact(4), y.chunks_exact(4));
    for (a, b) in x4.remainder().iter().zip(y4.remainder()) {
        rest += a * b;
    }
    for (a, b) in x4.zip(y4) {
        for k in 0..4 {
            sums[k] += a[k] * b[k];
        }
    }
    (sums[0] + sums[1]) + (sums[2] + sums[3]) + rest
}

fn norm(x: &[f64]) -> f64 {
    dot(x, x).sqrt()
}

/// Numbers without pattern, always the same: a linear congruential sequence (Knuth 1997, vol. 2, sec. 3.3.4, line 26).
fn start_vector(size: usize, seed: usize) -> Vec<f64> {
    let mut state = 0x2545_f491_4f6c_dd1d_u64.wrapping_add(seed as u64);
    let numbers = (0..size).map(|_| {
        state = state
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
    });
    numbers.collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use without_physics::pencil;

    /// A pencil without physics: three functions, indefinite A, a coupling by G, and C that makes symmetric double wells.
    mod without_physics {
        use super::super::super::matrix_pencil::{MatrixCoefficient, MatrixPencil};
        use super::super::super::mesh::Mesh;
        use std::borrow::Cow;

        pub fn pencil(copies: usize) -> MatrixPencil {
            let mesh = Mesh::new(&[1.0, 2.0, 1.5, 2.0, 1.0], &[1, 2, 1, 2, 1], 6);
            MatrixPencil::new(mesh, 2 * copies, |element, _| {
                let mut at = MatrixCoefficient::zeros(2 * copies);
                let wall = if element.segment % 2 == 0 { 6.0 } else { 0.0 };
                for copy in 0..copies {
                    let [s, p] = [2 * copy, 2 * copy + 1];
                    at.a[(s, s)] = 1.0;
                    at.a[(p, p)] = -0.4;
                    at.g[(s, p)] = 0.8;
                    at.g[(p, s)] = -0.8;
                    at.c[(s, s)] = 1.0 + wall;
                    at.c[(p, p)] = -1.0 - 0.5 * wall;
                }
                Cow::Owned(at)
            })
        }
    }

    fn dense(pencil: &MatrixPencil) -> Vec<f64> {
        let n = pencil.size();
        let mut matrix = DMatrix::zeros(n, n);
        for k in 0..n {
            let mut unit = vec![0.0; n];
            unit[k] = 1.0;
            matrix.set_column(
                k,
                &nalgebra::DVector::from_vec(pencil.matrix().times(&unit)),
            );
        }
        let mut values: Vec<f64> = SymmetricEigen::new(matrix)
            .eigenvalues
            .iter()
            .copied()
            .collect();
        values.sort_by(f64::total_cmp);
        values
    }

    fn check(pencil: &MatrixPencil, pairs: &[NearPair], expected: &[f64]) {
        assert_eq!(pairs.len(), expected.len());
        for (pair, expected) in pairs.iter().zip(expected) {
            assert!(
                (pair.value - expected).abs() < 1e-9,
                "{} for {expected}",
                pair.value
            );
            let image = pencil.matrix().times(&pair.vector);
            let left = image
                .iter()
                .zip(&pair.vector)
                .map(|(t, x)| (t - pair.value * x).powi(2));
            assert!(left.sum::<f64>().sqrt() < 1e-8, "residual at {expected}");
        }
        for (i, a) in pairs.iter().enumerate() {
            for (j, b) in pairs.iter().enumerate() {
                let inner = dot(&a.vector, &b.vector);
                assert!(
                    (inner - f64::from(i == j)).abs() < 1e-10,
                    "{i} {j}: {inner}"
                );
            }
        }
    }

    /// Against nalgebra's dense eigenvalues, also where every level is threefold (three equal copies).
    #[test]
    fn numbered_and_nearest_levels_are_those_of_the_dense_matrix() {
        for copies in [1, 3] {
            let pencil = pencil(copies);
            let all = dense(&pencil);
            let gap = all.iter().filter(|e| **e < 0.0).count();
            for range in [
                gap..gap + 7,
                gap - 7..gap,
                gap - 2..gap + 5,
                0..3,
                gap + 3..gap + 4,
            ] {
                for guess in [0.0, 3.0, -40.0] {
                    let pairs = numbered(&pencil, range.clone(), guess, 0.5);
                    check(&pencil, &pairs, &all[range.clone()]);
                }
            }
            for shift in [0.1, 1.7, -2.0] {
                // A number of levels at which no multiple one is cut.
                let mut order = all.clone();
                order.sort_by(|a, b| (a - shift).abs().total_cmp(&(b - shift).abs()));
                let mut expected = order[..6].to_vec();
                expected.sort_by(f64::total_cmp);
                check(&pencil, &around(&pencil, shift, 6), &expected);
            }
        }
    }
}
