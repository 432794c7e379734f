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
    let mut sum = dot(&pair.vector, &second.matrix().times(&pair.vector));
    let mut image = first.matrix().times(&pair.vector);
    let scale = dot(&image, &image).sqrt();
    for other in known {
        let part = take_out(&mut image, &other.vector);
        if std::ptr::eq(*other, pair) {
            continue;
        }
        let apart = pair.value - other.value;
        if apart.abs() > EQUAL {
            sum += part * part / apart;
        } else if part.abs() > EQUAL * scale {
            return None;
        }
    }
    let aside = 1e-7 * (1.0 + pair.value.abs());
    let factored = pencil.factor(pair.value + aside, None);
    let mut x = vec![0.0; image.len()];
    for _ in 0..SOLVES {
        for (v, b) in x.iter_mut().zip(&image) {
            *v = b - aside * *v;
        }
        factored.solve(&mut x);
        for other in known {
            take_out(&mut x, &other.vector);
        }
    }
    Some(sum - dot(&image, &x))
}
