//! Eigenvalues of a [`Pencil`] that differs little from one whose eigenpairs are known: inverse iteration from the known
//! vectors, then one count that proves that no level was missed and none found twice.

use super::banded::Banded;
use super::eigenpairs::{self, Eigenpair, count_below};
use super::pencil::{Pencil, dot};

/// Shifts that are tried for one level before the search from scratch takes over.
const MAX_SHIFTS: usize = 6;
/// Solves with the factors of one shift.
const SOLVES: usize = 2;
/// Corrections of a value at one shift; each gains the ratio of the shift's distance to that of the poles.
const MAX_CORRECTIONS: usize = 4;
/// A correction beyond this multiple of the tolerance calls for a new shift.
const NEAR: f64 = 100.0;

/// As many of the lowest eigenvalues as there are known pairs, ascending, within `tolerance`.
///
/// The pencil must have the nodes of the one that the pairs solve. `guesses` are the expected values; wrong ones cost
/// time, never a wrong result.
pub fn lowest_near(
    pencil: &Pencil,
    known: &[Eigenpair],
    guesses: &[f64],
    tolerance: f64,
) -> Vec<f64> {
    followed(pencil, known, guesses, tolerance).unwrap_or_else(|| {
        eigenpairs::lowest(pencil, known.len())
            .iter()
            .map(|pair| pair.value)
            .collect()
    })
}

/// The values that the known pairs lead to, if these are the lowest ones.
fn followed(
    pencil: &Pencil,
    known: &[Eigenpair],
    guesses: &[f64],
    tolerance: f64,
) -> Option<Vec<f64>> {
    let mut values = Vec::with_capacity(known.len());
    let mut storage = None;
    for (pair, &guess) in known.iter().zip(guesses) {
        let value = refine(pencil, &mut storage, guess, &pair.vector, tolerance)?;
        values.push(value);
    }
    values.sort_by(f64::total_cmp);
    let distinct = values
        .windows(2)
        .all(|pair| pair[1] - pair[0] > 4.0 * tolerance);
    // That many different levels, and no more below the last of them: they are the lowest.
    let last = *values.last()?;
    (distinct && count_below(pencil, last + 2.0 * tolerance) == values.len()).then_some(values)
}

/// The level that inverse iteration with the Rayleigh quotient reaches from a vector.
fn refine(
    pencil: &Pencil,
    storage: &mut Option<Banded>,
    guess: f64,
    vector: &[f64],
    tolerance: f64,
) -> Option<f64> {
    let inner = 1..vector.len() - 1;
    let mut x = vector.to_vec();
    let mut shift = guess;
    for _ in 0..MAX_SHIFTS {
        let mut matrix = storage.take().unwrap_or_else(|| pencil.storage());
        pencil.assemble(shift, &mut matrix);
        let factored = matrix.factor();
        let mut weighted = pencil.weight(shift, shift, &x);
        let (mut form, mut value, mut before) = (0.0, shift, f64::INFINITY);
        for _ in 0..SOLVES {
            before = value;
            x.copy_from_slice(&weighted);
            factored.solve(&mut x[inner.clone()]);
            form = dot(&x, &weighted);
            weighted = pencil.weight(shift, shift, &x);
            value = shift + form / dot(&x, &weighted);
        }
        *storage = Some(factored.into_storage());
        // x · T(λ) x = x · T(shift) x − (λ − shift) x · N(λ, shift) x has its zero at λ. With poles the Rayleigh quotient,
        // which takes N(shift, shift), is off by the square of the distance to the shift.
        let mut exact = value;
        let mut moved = f64::INFINITY;
        for _ in 0..if pencil.is_linear() {
            0
        } else {
            MAX_CORRECTIONS
        } {
            let next = shift + form / pencil.inner(exact, &x, shift, &x);
            moved = (next - exact).abs();
            exact = next;
            if moved <= 0.1 * tolerance {
                break;
            }
        }
        if !exact.is_finite() {
            return None;
        }
        let settled = pencil.is_linear() || moved <= 0.1 * tolerance;
        // What the vector lacks for the same reason enters the value squared.
        let near = (exact - value).abs() <= NEAR * tolerance;
        if (value - before).abs() <= tolerance && settled && near {
            return Some(exact);
        }
        shift = exact;
        let scale = 1.0 / dot(&x, &weighted).abs().sqrt();
        x.iter_mut().for_each(|v| *v *= scale);
    }
    None
}

#[cfg(test)]
mod tests {
    use super::super::mesh::Mesh;
    use super::super::pencil::{Coefficient, Pole};
    use super::*;

    fn double_well(v: f64, poles: bool) -> Pencil {
        let lengths = [3.0, 1.0 + v, 0.5 - 0.3 * v, 1.1 - 0.5 * v, 3.0 + v];
        Pencil::new(Mesh::new(&lengths, &[2, 1, 1, 1, 2], 8), |_, e, _| {
            let barrier = e.segment % 2 == 0;
            let constant = if barrier { 60.0 } else { 0.0 };
            Coefficient {
                stiffness: 1.0 + 0.2 * v,
                poles: [
                    poles.then_some(Pole {
                        strength: 50.0,
                        position: constant - 100.0,
                        nearest: 10.0,
                        farthest: f64::INFINITY,
                    }),
                    None,
                ],
                constant,
            }
        })
    }

    /// Through an anticrossing of the two wells' levels, and from guesses that mean nothing, the values are those of the
    /// search from scratch.
    #[test]
    fn values_are_those_of_the_search_from_scratch() {
        for poles in [false, true] {
            let known = eigenpairs::lowest(&double_well(0.0, poles), 4);
            for v in [-0.2, -0.05, -0.01, 0.0, 0.003, 0.02, 0.1, 0.4] {
                let pencil = double_well(v, poles);
                let exact = eigenpairs::lowest(&pencil, 4);
                for guesses in [
                    [0.0; 4].map(|_| 20.0),
                    [0, 1, 2, 3].map(|k: usize| known[k].value),
                ] {
                    let near = lowest_near(&pencil, &known, &guesses, 1e-6);
                    for (value, pair) in near.iter().zip(&exact) {
                        assert!(
                            (value - pair.value).abs() < 1e-6,
                            "{poles} {v}: {value} for {}",
                            pair.value
                        );
                    }
                }
            }
        }
    }
}
