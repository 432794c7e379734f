//! How solutions of −A ψ″ + (Gᵀ − G) ψ′ + (C − λ) ψ = 0 with constant matrices grow and decay.

use super::matrix_sensitivity::At;
use nalgebra::DMatrix;

/// |Re κ| of all solutions exp(κz) of the functions `kept`, the others left out; ascending. The roots of
/// det(−A κ² + (Gᵀ − G) κ + C − λ) are the eigenvalues of the companion matrix. `None` when A is singular.
pub fn decay_rates(at: &At, lambda: f64, kept: &[usize]) -> Option<Vec<f64>> {
    let m = kept.len();
    let pick =
        |of: &dyn Fn(usize, usize) -> f64| DMatrix::from_fn(m, m, |i, j| of(kept[i], kept[j]));
    let inverse = pick(&|i, j| at.a[(i, j)]).try_inverse()?;
    let linear = &inverse * pick(&|i, j| at.g[(j, i)] - at.g[(i, j)]);
    let shift = |i: usize, j: usize| if i == j { at.raised - lambda } else { 0.0 };
    let constant = &inverse * pick(&|i, j| at.c[(i, j)] + shift(i, j));
    let mut companion = DMatrix::zeros(2 * m, 2 * m);
    companion.view_mut((0, m), (m, m)).fill_with_identity();
    companion.view_mut((m, 0), (m, m)).copy_from(&constant);
    companion.view_mut((m, m), (m, m)).copy_from(&linear);
    let rates = companion.complex_eigenvalues();
    let mut rates: Vec<f64> = rates.iter().map(|rate| rate.re.abs()).collect();
    rates.sort_by(f64::total_cmp);
    Some(rates)
}
