//! How a level bends when the matrix depends on a parameter k: T(k) = T + k T₁ + k² T₂.
//!
//! Second-order perturbation (Rayleigh–Schrödinger), exact for the discretised problem: the sum over the other states is
//! taken term by term over those at hand and by a solve over all the rest.

use super::matrix_pencil::MatrixPencil;
use super::nearest::{NearPair, dot, take_out};

/// Levels closer than this are taken as equal.
const EQUAL: f64 = 1e-9;
/// Solves with the shift beside the level; each brings what is missing down by the ratio of that distance to the
/// distance of the next unknown level.
const SOLVES: usize = 3;

/// Half the second derivative of the level `pair` with respect to k: the coefficient of k².
///
/// `known` are the solved pairs of T around the level, itself among them. `None` when T₁ couples the level to one that
/// coincides with it: there is no second derivative then.
pub fn curvature(
    pencil: &MatrixPencil,
    first: &MatrixPencil,
    second: &MatrixPencil,
    known: &[&NearPair],
    pair: &NearPair,
) -> Option<f64> {
    let image = first.matrix().times(&pair.vector);
    let bent = dot(&pair.vector, &second.matrix().times(&pair.vector));
    Some(bent - dot(&image, &respond(pencil, known, pair, &image)?))
}

/// The vector u that has nothing of `pair` in it and solves (T − λ) u = b for the pair's λ, what b has of the pair left
/// out. `None` when b has a part in another level of the same λ.
pub fn respond(
    pencil: &MatrixPencil,
    known: &[&NearPair],
    pair: &NearPair,
    b: &[f64],
) -> Option<Vec<f64>> {
    let scale = dot(b, b).sqrt();
    let mut rest = b.to_vec();
    let mut answer = vec![0.0; b.len()];
    for other in known {
        let part = take_out(&mut rest, &other.vector);
        if std::ptr::eq(*other, pair) {
            continue;
        }
        let apart = other.value - pair.value;
        if apart.abs() > EQUAL {
            for (u, x) in answer.iter_mut().zip(&other.vector) {
                *u += part / apart * x;
            }
        } else if part.abs() > EQUAL * scale {
            return None;
        }
    }
    let aside = 1e-7 * (1.0 + pair.value.abs());
    let factored = pencil.factor(pair.value + aside, None);
    let mut x = vec![0.0; rest.len()];
    for _ in 0..SOLVES {
        for (v, b) in x.iter_mut().zip(&rest) {
            *v = b - aside * *v;
        }
        factored.solve(&mut x);
        for other in known {
            take_out(&mut x, &other.vector);
        }
    }
    for (u, x) in answer.iter_mut().zip(&x) {
        *u += x;
    }
    Some(answer)
}
