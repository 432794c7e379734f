//! Anderson's acceleration of a fixed point x = G(x) (Anderson, J. ACM 12, 547 (1965)).

use nalgebra::{DMatrix, DVector};

/// Earlier steps that are combined.
const DEPTH: usize = 6;
/// Singular values below this part of the largest carry no information.
const RANK: f64 = 1e-10;
/// A residual that grows by more than this takes the acceleration back and damps.
const GROWTH: f64 = 3.0;
const LEAST_STEP: f64 = 0.05;

/// The memory of the iteration.
#[derive(Default)]
pub struct Anderson {
    last: Option<(DVector<f64>, DVector<f64>)>,
    /// Differences of x, and of G(x) − x, between neighbouring steps.
    steps: Vec<(DVector<f64>, DVector<f64>)>,
    damping: f64,
    size: f64,
}

impl Anderson {
    pub fn new() -> Anderson {
        Anderson {
            damping: 1.0,
            size: f64::INFINITY,
            ..Anderson::default()
        }
    }

    /// The next x from the present one and G(x) − x.
    pub fn next(&mut self, x: &[f64], residual: &[f64]) -> Vec<f64> {
        let x = DVector::from_row_slice(x);
        let residual = DVector::from_row_slice(residual);
        let size = residual.amax();
        if size > GROWTH * self.size {
            self.steps.clear();
            self.last = None;
            self.damping = (0.5 * self.damping).max(LEAST_STEP);
        } else if size < self.size {
            self.damping = (1.5 * self.damping).min(1.0);
        }
        self.size = size;
        if let Some((x_before, residual_before)) = self.last.take() {
            self.steps
                .push((&x - x_before, &residual - residual_before));
            if self.steps.len() > DEPTH {
                self.steps.remove(0);
            }
        }
        let mut next = &x + self.damping * &residual;
        if !self.steps.is_empty() {
            let columns: Vec<DVector<f64>> = self.steps.iter().map(|s| s.1.clone()).collect();
            let matrix = DMatrix::from_columns(&columns);
            let svd = matrix.svd(true, true);
            let cut = RANK * svd.singular_values.max();
            if let Ok(shares) = svd.solve(&residual, cut) {
                for (share, (dx, dr)) in shares.iter().zip(&self.steps) {
                    next -= *share * (dx + self.damping * dr);
                }
            }
        }
        if next.iter().any(|value| !value.is_finite()) {
            next = &x + LEAST_STEP * &residual;
        }
        self.last = Some((x, residual));
        next.as_slice().to_vec()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A linear map that swings and grows without acceleration: x ← b − 3 x in two directions of different strength.
    #[test]
    fn a_diverging_linear_iteration_settles() {
        let map = |x: &[f64]| [1.0 - 3.0 * x[0] + 0.5 * x[1], 2.0 + 0.2 * x[0] - 1.5 * x[1]];
        let mut x = vec![0.0, 0.0];
        let mut anderson = Anderson::new();
        for _ in 0..20 {
            let image = map(&x);
            let residual = [image[0] - x[0], image[1] - x[1]];
            x = anderson.next(&x, &residual);
        }
        let image = map(&x);
        assert!((image[0] - x[0]).abs() < 1e-9 && (image[1] - x[1]).abs() < 1e-9);
    }
}
