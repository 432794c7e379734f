//! Symmetric banded matrices: L D Lᵀ factorisation with inertia, and solves.

/// A symmetric matrix whose column k has `reach[k]` entries below the diagonal.
///
/// Columns have a common stride, and lie one after the other: entry (k + d, k) stands at `values[k * stride + d]`.
#[derive(Clone, Debug)]
pub struct Banded {
    stride: usize,
    reach: Vec<usize>,
    values: Vec<f64>,
}

/// The factors of a [`Banded`] matrix, in its storage: D on the diagonal, L below.
#[derive(Clone, Debug)]
pub struct Factored {
    matrix: Banded,
    negative: usize,
}

impl Banded {
    /// A zero matrix with these reaches. A reach beyond the last row is cut.
    pub fn zeros(mut reach: Vec<usize>) -> Banded {
        let size = reach.len();
        for (k, r) in reach.iter_mut().enumerate() {
            *r = (*r).min(size - 1 - k);
        }
        let stride = reach.iter().max().map_or(1, |r| r + 1);
        Banded {
            stride,
            values: vec![0.0; stride * size],
            reach,
        }
    }

    pub fn size(&self) -> usize {
        self.reach.len()
    }

    pub fn clear(&mut self) {
        self.values.fill(0.0);
    }

    /// The entries (k, k), (k + 1, k) … of column k.
    #[inline]
    pub fn column_mut(&mut self, k: usize) -> &mut [f64] {
        let start = k * self.stride;
        &mut self.values[start..=start + self.reach[k]]
    }

    /// The product with a vector.
    pub fn times(&self, x: &[f64]) -> Vec<f64> {
        let mut y = vec![0.0; x.len()];
        for k in 0..self.size() {
            let column = &self.values[k * self.stride..=k * self.stride + self.reach[k]];
            y[k] += column[0] * x[k];
            for (d, &value) in column.iter().enumerate().skip(1) {
                y[k + d] += value * x[k];
                y[k] += value * x[k + d];
            }
        }
        y
    }

    /// Makes row and column k those of the unit matrix.
    pub fn pin(&mut self, k: usize) {
        let stride = self.stride;
        for j in k.saturating_sub(stride)..k {
            if k - j <= self.reach[j] {
                self.values[j * stride + k - j] = 0.0;
            }
        }
        let column = self.column_mut(k);
        column.fill(0.0);
        column[0] = 1.0;
    }

    /// Factors the matrix as L D Lᵀ without exchanges, which keeps the band.
    ///
    /// By Sylvester's law of inertia the number of negative pivots is the number of negative eigenvalues. A pivot that
    /// vanishes within rounding is moved off zero by a rounding error's size: this changes an eigenvalue by no more.
    pub fn factor(mut self) -> Factored {
        let stride = self.stride;
        let mut negative = 0;
        for k in 0..self.size() {
            let reach = self.reach[k];
            let (head, tail) = self.values.split_at_mut((k + 1) * stride);
            let column = &mut head[k * stride..=k * stride + reach];
            let mut pivot = column[0];
            let smallest = 1e-30 + 1e-18 * column.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
            if pivot.abs() < smallest {
                pivot = smallest;
                column[0] = pivot;
            }
            negative += usize::from(pivot < 0.0);
            let inverse = 1.0 / pivot;
            for r in 1..=reach {
                let factor = column[r] * inverse;
                let target = &mut tail[(r - 1) * stride..(r - 1) * stride + reach - r + 1];
                for (t, c) in target.iter_mut().zip(&column[r..]) {
                    *t -= factor * c;
                }
            }
            for value in &mut column[1..] {
                *value *= inverse;
            }
        }
        Factored {
            matrix: self,
            negative,
        }
    }
}

impl Factored {
    /// Number of negative eigenvalues.
    pub fn negative(&self) -> usize {
        self.negative
    }

    /// Solves in place.
    pub fn solve(&self, x: &mut [f64]) {
        let Banded {
            stride,
            reach,
            values,
        } = &self.matrix;
        let size = reach.len();
        for k in 0..size {
            let x_k = x[k];
            let column = &values[k * stride + 1..=k * stride + reach[k]];
            for (target, l) in x[k + 1..].iter_mut().zip(column) {
                *target -= l * x_k;
            }
        }
        for k in (0..size).rev() {
            let column = &values[k * stride + 1..=k * stride + reach[k]];
            let sum: f64 = column.iter().zip(&x[k + 1..]).map(|(l, v)| l * v).sum();
            x[k] = x[k] / values[k * stride] - sum;
        }
    }

    /// Gives the storage back, for the next matrix of the same shape.
    pub fn into_storage(self) -> Banded {
        self.matrix
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{DMatrix, DVector, SymmetricEigen};
    use proptest::prelude::*;

    fn dense(banded: &Banded) -> DMatrix<f64> {
        let n = banded.size();
        let mut matrix = DMatrix::zeros(n, n);
        for k in 0..n {
            let mut unit = vec![0.0; n];
            unit[k] = 1.0;
            matrix.set_column(k, &DVector::from_vec(banded.times(&unit)));
        }
        matrix
    }

    proptest! {
        /// Inertia and solution against nalgebra's dense symmetric eigenvalues and LU, a general-purpose library.
        #[test]
        fn inertia_and_solution_are_those_of_the_dense_matrix(
            entries in prop::collection::vec(-1.0..1.0f64, 60),
            reach in prop::collection::vec(0usize..5, 12),
        ) {
            // A variable band without fill beyond it: the reach shrinks by one per column at most.
            let mut reach = reach;
            for k in 1..12 {
                reach[k] = reach[k].max(reach[k - 1].saturating_sub(1));
            }
            let mut banded = Banded::zeros(reach);
            let mut next = entries.into_iter();
            for k in 0..12 {
                for value in banded.column_mut(k) {
                    *value = next.next().unwrap_or(0.3);
                }
            }
            let matrix = dense(&banded);
            let eigenvalues = SymmetricEigen::new(matrix.clone()).eigenvalues;
            prop_assume!(eigenvalues.iter().all(|e| e.abs() > 1e-6));
            let factored = banded.factor();
            prop_assert_eq!(factored.negative(), eigenvalues.iter().filter(|e| **e < 0.0).count());
            let right: Vec<f64> = (0..12).map(|k| (k as f64).sin()).collect();
            let mut x = right.clone();
            factored.solve(&mut x);
            let residual = matrix * DVector::from_vec(x.clone()) - DVector::from_vec(right);
            let size = x.iter().fold(1.0_f64, |m, v| m.max(v.abs()));
            prop_assert!(residual.amax() < 1e-6 * size, "residual {}", residual.amax());
        }
    }
}
